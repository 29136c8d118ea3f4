"""The environment that `scripts/demo` and `scripts/test` share: `.venv` in the checkout, made when needed.

Standard library only, and nothing newer than Python 3.7 in the syntax, so that an old Python reaches the line
that refuses it. A stamp inside `.venv` remembers what was installed; while it fits, a run starts at once.
"""

from __future__ import annotations

import hashlib
import os
import subprocess
import sys
import textwrap
from pathlib import Path

__all__ = ["ROOT", "command", "prepare", "python", "run", "say", "stop"]

ROOT = Path(__file__).resolve().parent.parent
_VENV = ROOT / ".venv"
_BINARIES = _VENV / ("Scripts" if os.name == "nt" else "bin")
_SUFFIX = ".exe" if os.name == "nt" else ""
_OLDEST = (3, 11)  # as requires-python in pyproject.toml


def say(text: str) -> None:
    """Print one line of progress, ahead of whatever a child process prints next."""
    print(f"{_name()}: {text}", flush=True)


def stop(text: str, exit_code: int = 1) -> SystemExit:
    """Print one line to stderr; raise what this returns to end with `exit_code`."""
    sys.stdout.flush()
    print(f"{_name()}: {text}", file=sys.stderr, flush=True)
    return SystemExit(exit_code)


def python() -> str:
    """Path of the environment's interpreter."""
    return str(_BINARIES / f"python{_SUFFIX}")


def command(name: str) -> str:
    """Path of a command that is installed in the environment."""
    return str(_BINARIES / f"{name}{_SUFFIX}")


def run(arguments: list[str]) -> int:
    """Run a command at the top of the checkout, showing its output, and return its exit code."""
    try:
        return subprocess.run(arguments, cwd=ROOT, check=False).returncode
    except KeyboardInterrupt:
        raise stop("interrupted", 130) from None
    except OSError as error:
        raise stop(f"cannot start {arguments[0]}: {error.strerror}; delete {_VENV} and try again") from None


def prepare(extra: str = "") -> None:
    """Have fitamp installed in `.venv`, from the checkout, with the optional dependencies called `extra`.

    Raises
    ------
    SystemExit
        After one line on stderr: Python is too old, the environment cannot be made, or pip failed.
    """
    if sys.version_info[:2] < _OLDEST:
        found = ".".join(str(part) for part in sys.version_info[:3])
        raise stop(
            f"needs Python {_OLDEST[0]}.{_OLDEST[1]} or newer, but this is {found}; "
            f"start it with a newer one, such as: python3.12 {_name()}"
        )
    fingerprint = _fingerprint()
    stamps = [_stamp(extra), _stamp("test")]  # with the test tools in, everything else is in too
    if Path(python()).exists() and any(_read(stamp) == fingerprint for stamp in stamps):
        return
    try:
        _make_environment()
        _install(extra)
    except KeyboardInterrupt:
        raise stop("interrupted; run it again to finish the installation", 130) from None
    _stamp(extra).write_text(fingerprint, encoding="utf-8")


def _make_environment() -> None:
    if _version_inside() == sys.version_info[:2]:
        return
    say(f"making the environment {_VENV}")
    # --clear: what a broken environment or another Python left there would be mixed into the new one.
    exit_code, output = _capture([sys.executable, "-m", "venv", "--clear", str(_VENV)])
    if exit_code:
        complaint = _complaint(output, otherwise=0)
        raise stop(f"python -m venv could not make {_VENV} (exit code {exit_code}): {complaint}")


def _install(extra: str) -> None:
    what = f".[{extra}]" if extra else "."
    say(f"installing {what} into .venv with pip (some minutes the first time)")
    options = ["--no-input", "--disable-pip-version-check", "--progress-bar", "off"]
    exit_code, output = _capture([python(), "-m", "pip", "install", *options, "-e", what])
    log = _VENV / "pip.log"
    log.write_text(output, encoding="utf-8")
    if exit_code:
        raise stop(
            f"pip could not install {what} (exit code {exit_code}): {_complaint(output, otherwise=-1)}; "
            f"see {log}, check the network or the package index, then run this again"
        )


def _capture(arguments: list[str]) -> tuple[int, str]:
    """Exit code, and standard output with standard error, of a command at the top of the checkout."""
    try:
        done = subprocess.run(
            arguments,
            cwd=ROOT,
            stdin=subprocess.DEVNULL,
            stdout=subprocess.PIPE,
            stderr=subprocess.STDOUT,
            check=False,
        )
    except OSError as error:
        raise stop(f"cannot start {arguments[0]}: {error.strerror}") from None
    return done.returncode, done.stdout.decode("utf-8", errors="replace")


def _complaint(output: str, *, otherwise: int) -> str:
    """The line of a failed command's output that says most: its first error, or else line `otherwise`."""
    lines = [line.strip() for line in output.splitlines() if line.strip()] or ["it said nothing"]
    errors = [line for line in lines if line.lower().startswith("error:")]
    return textwrap.shorten((errors or [lines[otherwise]])[0].rstrip(".;"), 200, placeholder=" ...")


def _version_inside() -> tuple[int, ...] | None:
    """Python version of `.venv`, or None where there is no environment that works."""
    question = "import sys, pip; print(sys.version_info[0], sys.version_info[1])"
    try:
        answer = subprocess.run([python(), "-c", question], capture_output=True, check=False, text=True)
    except OSError:
        return None
    return tuple(int(part) for part in answer.stdout.split()) if answer.returncode == 0 else None


def _fingerprint() -> str:
    """Changes when the dependencies, the Python or the place of the checkout change."""
    digest = hashlib.sha256((ROOT / "pyproject.toml").read_bytes())
    digest.update(f"\n{sys.version}\n{ROOT}".encode())
    return digest.hexdigest()


def _stamp(extra: str) -> Path:
    return _VENV / f"installed-{extra or 'plain'}.stamp"


def _read(stamp: Path) -> str:
    return stamp.read_text(encoding="utf-8") if stamp.is_file() else ""


def _name() -> str:
    return f"scripts/{Path(sys.argv[0]).name}"
