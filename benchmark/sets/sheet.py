"""A set as one flat table for spreadsheets, out and in again (layer 2).

One row per value and node. The first rows carry the id and the digest of the set; the last column tells of each row
whether the file still says what it said.
"""

from __future__ import annotations

import csv
import hashlib
import io
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from benchmark.catalogue import QUANTITIES
from benchmark.errors import Problem, nearest
from benchmark.sets.cells import is_day_number, looks_like_date
from benchmark.sets.files import TomlFile
from benchmark.sets.problems import Collector
from benchmark.sets.spread_words import spread_words

__all__ = ["COLUMNS", "SHARED", "Cell", "Sheet", "SheetRow", "exported_rows", "read_sheet", "sheet_text"]

COLUMNS = (
    *("name", "meaning", "node", "value", "unit", "low", "high", "spread shape", "evidence", "source", "where"),
    *("conditions", "date", "comment", "check"),
)
#: what the file states once for all nodes of a value
SHARED = ("unit", "low", "high", "spread shape", "evidence", "source", "where", "conditions", "date", "comment")
NEEDED = ("name", "node", "value", "unit", "check")
_FIRST, _DIGEST = "Evenload set", "digest"
_HELP = (
    "change",
    "value, unit, low, high, spread shape, evidence, source, where, conditions, date, comment; leave the rest",
)
_START = re.compile(r'"?Evenload set"?([,;\t])')
#: what a spreadsheet would compute
_ACTIVE = re.compile(r"[=+@\t\r]|-(?!\d+([.,]\d*)?([eE][+-]?\d+)?$|$)")
_GUARDED = re.compile(r"'(?=[=+@\t\r-])")
Key = tuple[str, str]


@dataclass(frozen=True)
class Cell:
    """Text of one cell, without spaces around it, and where it stands: ``row 17, column value, cell D17``."""

    text: str
    row: int
    place: str


@dataclass(frozen=True)
class SheetRow:
    """One row of a sheet by column; ``number`` as a spreadsheet counts."""

    number: int
    cells: Mapping[str, Cell]

    def text(self, column: str) -> str:
        """Return the text of a column; empty when the sheet does not have it."""
        return self.cells[column].text if column in self.cells else ""


@dataclass(frozen=True)
class Sheet:
    """A sheet as it was read; rows by name and node."""

    file: str
    set_id: str
    digest: str
    delimiter: str
    rows: Mapping[Key, SheetRow] = field(default_factory=dict)

    def problem(self, cell: Cell, what: str, found: str = "", allowed: str = "", hint: str = "") -> Problem:
        """Build a problem at a cell."""
        return Problem(self.file, cell.row, cell.place, what, found, allowed, hint)


def exported_rows(file: TomlFile) -> dict[Key, dict[str, str]]:
    """Return the rows of a set that the check found fine, by name and node (empty: one number for all nodes)."""
    defaults = file.data.get("default", {})
    found: dict[Key, dict[str, str]] = {}
    for name, table in file.data.get("value", {}).items():
        shape, low, high = spread_words(table.get("spread"))
        shared = {key: table.get(key) or defaults.get(key) or "" for key in ("evidence", "source")}
        shared |= {key: table.get(key) or defaults.get(key) or "-" for key in ("where", "conditions")}
        shared |= {"unit": table.get("unit", "1"), "low": low, "high": high, "spread shape": shape}
        shared |= {"date": str(table.get("date", "")), "comment": table.get("note") or defaults.get("note") or ""}
        for node, number in table.get("by_node", {"": table.get("value")}).items():
            row = {"name": name, "meaning": QUANTITIES[name].meaning, "node": node, "value": str(number)} | shared
            row = {column: _guarded(" ".join(text.split())) for column, text in row.items()}
            found[name, node] = row | {"check": _digest(row)}
    return found


def _digest(row: Mapping[str, str]) -> str:
    """A letter first, so that no spreadsheet takes it for a number."""
    text = "\x1f".join(row.get(column, "") for column in COLUMNS if column not in ("meaning", "check"))
    return "r" + hashlib.sha256(text.encode()).hexdigest()[:12]


def _guarded(text: str) -> str:
    """Keep a spreadsheet from computing a text."""
    return f"'{text}" if _ACTIVE.match(text) else text


def unguarded(text: str) -> str:
    """Take the guard off again."""
    return _GUARDED.sub("", text, count=1)


def sheet_text(file: TomlFile) -> str:
    """Return a set as the text of a comma-separated file."""
    written = io.StringIO()
    writer = csv.writer(written, lineterminator="\n")
    writer.writerow([_FIRST, file.data["id"]])
    writer.writerow([_DIGEST, f"sha256 {file.sha256}"])
    writer.writerow(_HELP)
    writer.writerow(COLUMNS)
    writer.writerows([row[column] for column in COLUMNS] for row in exported_rows(file).values())
    return written.getvalue()


def read_sheet(raw: bytes, name: str, collector: Collector) -> Sheet | None:
    """Read a sheet that a spreadsheet has saved.

    Commas, semicolons or tabs stand between the cells, as the first row shows; a byte order mark is nothing.

    Parameters
    ----------
    raw : bytes
    name : str
        The file, for messages.
    collector : Collector
        Receives every problem of the layout; the sheet is None when it cannot be told what its cells are.
    """
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError:
        collector.add(Problem(name, 0, "", "is not UTF-8 text", hint="save it from the spreadsheet as CSV UTF-8"))
        return None
    start = _START.match(text)
    if start is None:
        collector.add(Problem(name, 1, "", f"does not begin with {_FIRST!r} as an exported sheet does"))
        return None
    delimiter = start.group(1)
    try:
        lines = list(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True))
    except csv.Error as error:
        collector.add(Problem(name, 0, "", f"is not readable as cells ({error})"))
        return None
    return _sheet([[cell.strip() for cell in line] for line in lines], name, delimiter, collector)


def _sheet(lines: Sequence[Sequence[str]], name: str, delimiter: str, collector: Collector) -> Sheet | None:
    head = {line[0]: line[1] for line in lines[:3] if len(line) > 1}
    if len(lines) < 4 or _DIGEST not in head:
        collector.add(Problem(name, 0, "", "lacks its first rows (set, digest, change) or the row of column names"))
        return None
    sheet = Sheet(name, head[_FIRST], head[_DIGEST].removeprefix("sha256 "), delimiter)
    columns = _columns(lines[3], sheet, collector)
    if columns is None:
        return None
    rows: dict[Key, SheetRow] = {}
    for number, line in enumerate(lines[4:], start=5):
        if not any(line):
            continue
        for position, text in enumerate(line):
            if text and (position >= len(lines[3]) or not lines[3][position]):
                place = f"row {number}, cell {_letters(position)}{number}"
                collector.add(Problem(name, number, place, "stands in a column without a name", repr(text)))
        padded = [*line, *[""] * (len(lines[3]) - len(line))]
        cells = {
            column: Cell(padded[at], number, f"row {number}, column {column}, cell {_letters(at)}{number}")
            for column, at in columns.items()
        }
        row = SheetRow(number, cells)
        key = (row.text("name"), row.text("node"))
        if key in rows:
            problem = sheet.problem(cells["name"], "stands twice", " at ".join(filter(None, key)))
            collector.add(_with_hint(problem, f"also in row {rows[key].number}"))
            continue
        rows[key] = row
    return Sheet(sheet.file, sheet.set_id, sheet.digest, delimiter, rows)


def _with_hint(problem: Problem, hint: str) -> Problem:
    return Problem(problem.file, problem.line, problem.name, problem.what, problem.found, problem.allowed, hint)


def _columns(header: Sequence[str], sheet: Sheet, collector: Collector) -> dict[str, int] | None:
    """Return the position of every column; None when one that is needed is missing."""
    columns: dict[str, int] = {}
    for position, column in enumerate(header):
        cell = Cell(column, 4, f"row 4, cell {_letters(position)}4")
        if not column:
            continue
        if column not in COLUMNS:
            allowed, hint = ", ".join(COLUMNS), nearest(column, COLUMNS)
            collector.add(sheet.problem(cell, "is not a known column", repr(column), allowed, hint))
        elif column in columns:
            collector.add(sheet.problem(cell, "is a column that stands twice", repr(column)))
        else:
            columns[column] = position
    missing = [column for column in NEEDED if column not in columns]
    if missing:
        collector.add(Problem(sheet.file, 4, "", "lacks a column that is needed", "", ", ".join(missing)))
        return None
    return columns


def _letters(position: int) -> str:
    """Return the letters of a column: A to Z, AA and so on."""
    letters = ""
    position += 1
    while position:
        position, rest = divmod(position - 1, 26)
        letters = chr(ord("A") + rest) + letters
    return letters


def mangled(text: str) -> str:
    """Say what a spreadsheet may have made of a text; empty when it looks untouched."""
    if looks_like_date(text):
        return "looks like a date that a spreadsheet made of a text"
    return "looks like a day number that a spreadsheet made of a text" if is_day_number(text) else ""
