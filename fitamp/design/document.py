"""From a file's bytes to TOML tables with known names, and the faults found on the way."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from fitamp.design.entries import unknown_name
from fitamp.errors import DesignError

__all__ = ["Faults", "Table", "file_bytes", "home_of", "known_tables", "parse_toml"]

# A design is a page of text; a file beyond this is something else, given by mistake.
LARGEST_FILE_BYTES = 1_000_000

Table = dict[str, Any]


class Faults:
    """Collects faults, so that one run shows how many there are."""

    def __init__(self) -> None:
        self.found: list[str] = []

    def add(self, text: str) -> None:
        """Take up one fault."""
        self.found.append(text)

    @contextmanager
    def at(self, table: str, key: str = "") -> Iterator[None]:
        """Take up what is raised about an entry of the file."""
        try:
            yield
        except (ValueError, DesignError) as error:
            self.add(f"[{table}] {key}: {error}" if key else f"[{table}]: {error}")

    def error(self, file: str) -> DesignError:
        """The first fault, and how many more there are, as one error."""
        first, more = self.found[0], len(self.found) - 1
        rest = f" (and {more} more {'fault' if more == 1 else 'faults'} in this file)" if more else ""
        return DesignError(f"{file}, {first}{rest}")


def file_bytes(file: str) -> bytes:
    """Return what is in the file; DesignError when it cannot be read or is too large for a design."""
    if not file.strip():
        raise DesignError("the name of the design file is empty; name one TOML file")
    try:
        if Path(file).is_dir():
            raise DesignError(f"{file}: is a directory; give the design file itself")
        with Path(file).open("rb") as stream:
            data = stream.read(LARGEST_FILE_BYTES + 1)
    except FileNotFoundError:
        raise DesignError(f"{file}: no such file; check the path of the design file") from None
    except OSError as error:
        raise DesignError(f"{file}: cannot be read ({error.strerror}); check the path of the design file") from error
    except ValueError as error:
        raise DesignError(f"{file!r}: is not a path ({error}); check the path of the design file") from error
    if len(data) > LARGEST_FILE_BYTES:
        raise DesignError(f"{file}: is larger than 1 MB; a design file is a page of TOML text")
    return data


def parse_toml(file: str, data: bytes) -> Table:
    """Return the TOML document; DesignError with the place when it is none."""
    try:
        return tomllib.loads(data.decode("utf-8-sig"))
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        byte = data[error.start]
        raise DesignError(
            f"{file}, line {line}: byte 0x{byte:02X} is not UTF-8 text; save the file as UTF-8"
        ) from error
    except RecursionError:
        raise DesignError(f"{file}: is nested too deeply; a design file has tables of plain entries") from None
    except ValueError as error:  # tomllib.TOMLDecodeError, or Python's refusal of endless integers
        text = " ".join(str(error).split())
        place = re.search(r"\s*\(at (line \d+, column \d+|end of document)\)$", text)
        where = f"{file}, {place[1]}" if place else file
        what = text[: place.start()] if place else text
        raise DesignError(
            f'{where}: not TOML: {what}; text and values with unit go in quotes, as in Rz = "1.3 kOhm"'
        ) from error


def home_of(name: str, document: Mapping[str, object], keys: Mapping[str, Sequence[str]]) -> str | None:
    """The table that an entry without heading belongs to, where keys that only this table has say so."""
    for table in ("elements", "designed"):
        own = set(keys[table]).difference(*(keys[other] for other in keys if other != table))
        if name in keys[table] and own & document.keys():
            return table
    return None


def _headless(table: str, name: str, *, is_there: bool) -> str:
    if is_there:
        return f"{name} stands above the heading [{table}]; move it below"
    return f"[{table}] is missing above {name}; write that heading on a line of its own"


def known_tables(document: Table, keys: Mapping[str, Sequence[str]], faults: Faults) -> dict[str, Table]:
    """Return the tables named in `keys` with the entries named there; everything else is a fault."""
    tables: dict[str, Table] = {}
    headless: set[str] = set()
    for name, table in document.items():
        home = home_of(name, document, keys)
        if home is not None:
            if home not in headless:
                faults.add(_headless(home, name, is_there=home in document))
            headless.add(home)
        elif name not in keys:
            kind = "table" if isinstance(table, dict) else "entry before the first table,"
            faults.add(unknown_name(kind, name, [f"[{known}]" for known in keys]))
        elif not isinstance(table, dict):
            faults.add(f"{name} is not a table; expected one heading [{name}] with entries below it")
        else:
            for key in table:
                if key not in keys[name]:
                    faults.add(f"[{name}]: {unknown_name('key', key, keys[name])}")
            tables[name] = {key: value for key, value in table.items() if key in keys[name]}
    return tables
