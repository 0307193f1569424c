"""Reading TOML files with exact numbers and line numbers (layer 2).

tomllib gives no positions, so a small scan of the table headers and keys builds an index from dotted name to
line; it is used for messages only, never for values.
"""

from __future__ import annotations

import bisect
import codecs
import functools
import hashlib
import re
import stat
import tomllib
from dataclasses import dataclass
from decimal import Decimal
from pathlib import Path
from typing import Any

from benchmark.errors import Problem
from benchmark.sets.problems import Collector

__all__ = ["TomlFile", "is_file", "is_folder", "read_bytes", "read_toml", "shown"]

#: a parameter file is written by hand; anything larger is not one
MAX_BYTES = 4_000_000
#: longer dotted names are looked up by their beginning
MAX_NAME = 2_000
#: a whole number of more bits is shown by its size, for Python refuses to write out thousands of digits
MAX_BITS = 1_000
#: a name of so many parts is no name; the reader of TOML would take minutes over it
_ENDLESS = re.compile(r"(?<![\w\-])(?:[\w\-]++[ \t]*+\.[ \t]*+){200}")
_HEADER = re.compile(r"^\s*(\[\[?)\s*([^\[\]]+?)\s*\]\]?\s*(?:#.*)?$")
_OPENS = re.compile(r"\s*(\"\"\"|''')")
_KEY = re.compile(r"^\s*([A-Za-z0-9_\-]+|\"[^\"]*\")(?:\s*\.\s*([A-Za-z0-9_\-.]+))?\s*=")


@dataclass(frozen=True)
class TomlFile:
    """A parsed file: ``name`` as shown to the user, the data with numbers as ``Decimal`` or ``int``, digest, lines."""

    name: str
    path: Path
    data: dict[str, Any]
    text: str
    sha256: str
    lines: dict[str, int]

    def line(self, dotted: str) -> int:
        """Return the line of a dotted name, else of the first thing inside it, else of the nearest enclosing table.

        0 if the name stands nowhere.
        """
        dotted = dotted[:MAX_NAME]
        if dotted not in self.lines:
            names = self._sorted_names
            start, end = (bisect.bisect_left(names, f"{dotted}{sign}") for sign in "./")  # "/" follows "."
            if start < end:
                return min(self.lines[name] for name in names[start:end])
        while dotted:
            found = self.lines.get(dotted)
            if found:
                return found
            dotted = dotted.rpartition(".")[0]
        return 0

    @functools.cached_property
    def _sorted_names(self) -> list[str]:
        return sorted(self.lines)

    def problem(self, dotted: str, what: str, found: str = "", allowed: str = "", hint: str = "") -> Problem:
        """Build a problem at the line of ``dotted``."""
        return Problem(self.name, self.line(dotted), dotted, what, found, allowed, hint)


def shown(value: Any) -> str:
    """Print a value of the file the way the user wrote it, at most 60 characters."""
    if isinstance(value, bool):
        text = "true" if value else "false"
    elif isinstance(value, int) and value.bit_length() > MAX_BITS:
        text = f"a whole number of about {value.bit_length() * 0.30103:.0f} digits"
    elif isinstance(value, (Decimal, int)):
        text = str(value)
    elif isinstance(value, str):
        text = repr(value)
    elif isinstance(value, dict):
        text = "a table"
    elif isinstance(value, list):
        text = "a list"
    else:
        text = str(value)
    return text if len(text) <= 60 else text[:57] + "..."


def _index(text: str) -> dict[str, int]:
    lines: dict[str, int] = {}
    counts: dict[str, int] = {}
    prefix, quotes = "", ""
    for number, line in enumerate(text.split("\n"), start=1):  # TOML has no other line ends
        if quotes:  # inside a string of several lines
            quotes = "" if quotes in line else quotes
            continue
        header = _HEADER.match(line)
        if header and "=" not in header.group(2):
            name = header.group(2).replace('"', "").replace(" ", "")
            if header.group(1) == "[[":
                position = counts.get(name, 0)
                counts[name] = position + 1
                name = f"{name}.{position}"
            else:
                parts = name.split(".")
                if parts[0] in counts and len(parts) > 1 and not parts[1].isdigit():
                    name = ".".join([parts[0], str(counts[parts[0]] - 1), *parts[1:]])
            prefix = name
            lines.setdefault(name, number)
            continue
        key = _KEY.match(line)
        if key:
            name = key.group(1).strip('"') + (f".{key.group(2)}" if key.group(2) else "")
            lines.setdefault(f"{prefix}.{name}" if prefix else name, number)
            opened = _OPENS.match(line[key.end() :])
            quotes = opened.group(1) if opened and opened.group(1) not in line[key.end() + opened.end() :] else ""
    return lines


def is_file(path: Path) -> bool:
    """Tell whether there is such a file; a name the system cannot hold is none."""
    try:
        return path.is_file()
    except OSError:
        return False


def is_folder(path: Path) -> bool:
    """Tell whether there is such a folder; a name the system cannot hold is none."""
    try:
        return path.is_dir()
    except OSError:
        return False


def read_bytes(path: Path, name: str, collector: Collector) -> bytes | None:
    """Read a file; problems (missing, a folder, unreadable, too large) go to the collector."""
    try:
        if path.is_dir():
            collector.add(Problem(name, 0, "", "is a folder, a file is needed"))
            return None
        status = path.stat()
        if not stat.S_ISREG(status.st_mode):
            collector.add(Problem(name, 0, "", "is not a regular file"))
            return None
        if status.st_size > MAX_BYTES:
            collector.add(Problem(name, 0, "", "is too large", f"{status.st_size} bytes", f"at most {MAX_BYTES} bytes"))
            return None
        return path.read_bytes()
    except FileNotFoundError:
        collector.add(Problem(name, 0, "", "does not exist"))
    except OSError as error:
        collector.add(Problem(name, 0, "", f"cannot be read ({error.strerror or error})"))
    except ValueError:
        collector.add(Problem(name, 0, "", "is not a usable path"))
    return None


def read_toml(path: Path, collector: Collector, name: str | None = None) -> TomlFile | None:
    """Read one TOML file.

    Returns None after recording a problem when the file cannot be read, is not UTF-8, is binary, or is not TOML.
    """
    name = name or str(path)
    raw = read_bytes(path, name, collector)
    if raw is None:
        return None
    if not raw.strip():
        collector.add(Problem(name, 0, "", "is empty"))
        return None
    if raw.startswith(codecs.BOM_UTF8):
        collector.add(Problem(name, 1, "", "starts with a byte order mark", "", "UTF-8 text without it"))
        return None
    try:
        text = raw.decode("utf-8")
    except UnicodeDecodeError as error:
        collector.add(Problem(name, 0, "", "is not UTF-8 text", f"byte {raw[error.start]:#04x} at {error.start}"))
        return None
    return parse_toml(path, text, name, collector)


def parse_toml(path: Path, text: str, name: str, collector: Collector) -> TomlFile | None:
    """Parse the text of a file; None after recording a problem."""
    endless = _ENDLESS.search(text)
    if endless is not None:
        collector.add(Problem(name, text.count("\n", 0, endless.start()) + 1, "", "is nested too deeply"))
        return None
    try:
        data = tomllib.loads(text, parse_float=Decimal)
    except tomllib.TOMLDecodeError as error:
        message = str(error)
        match = re.search(r"at line (\d+)", message)
        line = int(match.group(1)) if match else text.removesuffix("\n").count("\n") + 1
        collector.add(Problem(name, line, "", f"is not TOML: {message}"))
        return None
    except (RecursionError, ValueError, ArithmeticError) as error:
        collector.add(Problem(name, 0, "", f"is not usable TOML ({type(error).__name__})"))
        return None
    return TomlFile(name, path, data, text, hashlib.sha256(text.encode()).hexdigest(), _index(text))
