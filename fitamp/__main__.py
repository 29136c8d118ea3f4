"""`python -m fitamp`."""

from fitamp.cli import run

run()
