"""From the lines of a raw file to its header and rows of cells, with the line each stands on (layer 7.5)."""

from __future__ import annotations

import csv
from collections.abc import Iterator
from dataclasses import dataclass, field

from benchmark.curves.description import CurvesFile
from benchmark.curves.text import counted, kept_lines
from benchmark.errors import Problem
from benchmark.sets.files import TomlFile
from benchmark.sets.problems import Collector
from benchmark.sets.tables import MAX_COLUMNS, MAX_ROWS, cell_number
from benchmark.units import UnitError, parse_unit

__all__ = ["MOST_SHOWN", "RawTable", "Reading", "Row", "is_unit", "read_rows"]

#: problems of one kind that are written out; the rest is counted
MOST_SHOWN = 10


@dataclass(frozen=True)
class Row:
    """Cells of one row and the line of the file it ends on, counted from 1."""

    line: int
    cells: list[str]


@dataclass
class RawTable:
    """Header, row of units (empty without one) and data rows, all of one length; ``notes``: what was left out."""

    name: str
    header: Row
    units: Row
    rows: list[Row]
    notes: list[str]
    collector: Collector
    _counts: dict[tuple[str, str], int] = field(default_factory=dict)

    def refuse(
        self, place: tuple[int, str], what: str, found: str = "", allowed: str = "", hint: str = "", *, most: int = 0
    ) -> None:
        """Report a problem at (line, column); of each kind and column ``most`` are written out and the rest counted."""
        line, column = place
        key = (column, what)
        self._counts[key] = self._counts.get(key, 0) + 1
        if not most or self._counts[key] <= most:
            self.collector.add(Problem(self.name, line, column, what, found, allowed, hint))
        elif self._counts[key] == most + 1:
            self.collector.add(Problem(self.name, line, column, f"{what} (further rows alike are not listed)"))


@dataclass(frozen=True)
class Reading:
    """A description, the raw table it describes, and where problems go."""

    spec: CurvesFile
    file: TomlFile
    table: RawTable
    collector: Collector

    def problem(self, dotted: str, what: str, found: str = "", allowed: str = "", hint: str = "") -> None:
        """Report a problem of the description."""
        self.collector.add(self.file.problem(dotted, what, found, allowed, hint))


def is_unit(text: str) -> bool:
    """Tell whether a cell is the spelling of a unit, perhaps in brackets."""
    if not text or cell_number(text, ".") is not None or cell_number(text, ",") is not None:
        return False
    try:
        parse_unit(text.strip("()[]"))
    except UnitError:
        return False
    return True


def _cells(
    kept: list[tuple[int, str]], spec: CurvesFile, name: str, collector: Collector
) -> Iterator[tuple[int, list[str]]]:
    """Divide lines into cells without blanks around them; a cell in quotes may go over several lines."""
    if spec.delimiter == "whitespace":
        for number, line in kept:
            yield number, line.split()
        return
    reader = csv.reader((line for _, line in kept), delimiter=spec.delimiter, strict=True, skipinitialspace=True)
    try:
        for cells in reader:
            yield kept[reader.line_num - 1][0], [cell.strip() for cell in cells]
    except csv.Error as error:
        number = kept[min(max(reader.line_num, 1), len(kept)) - 1][0]
        collector.add(Problem(name, number, "", f"is not a readable table ({error})"))


def read_rows(raw: bytes, spec: CurvesFile, name: str, collector: Collector) -> RawTable | None:
    """Divide a raw file into header, units and rows of cells.

    Parameters
    ----------
    raw : bytes
        The file.
    spec : CurvesFile
        Its description.
    name : str
        How messages call the file.
    collector : Collector
        Takes every problem.

    Returns
    -------
    RawTable or None
        None after a problem that leaves nothing to go on with; rows of another length are reported and left out.
    """
    notes: list[str] = []
    before = len(collector.problems)
    kept = kept_lines(raw, spec, name, collector, notes)
    if kept is None:
        return None
    rows, blank = [], 0
    for number, cells in _cells(kept, spec, name, collector):
        if not any(cells):
            blank += 1
            continue
        rows.append(Row(number, cells))
        if len(rows) > MAX_ROWS + spec.has_header:
            collector.add(Problem(name, number, "", "has too many rows", "", f"at most {MAX_ROWS}"))
            return None
    if len(collector.problems) > before:
        return None
    if blank:
        notes.append(counted(blank, "empty"))
    header = _header(rows, spec)
    units = rows.pop(0) if spec.units == "row" and rows else Row(0, [])
    if not rows:
        collector.add(Problem(name, 0, "", "has no data rows", "", "a header and rows of numbers"))
        return None
    table = RawTable(name, header, units, rows, notes, collector)
    _trim(table)
    if len(table.header.cells) > MAX_COLUMNS:
        count = str(len(table.header.cells))
        table.refuse((header.line, ""), "has too many columns", count, f"at most {MAX_COLUMNS}")
        return None
    if header.line:
        units_too = f", units on line {units.line}" if units.line else ""
        notes.append(f"names of the columns on line {header.line}{units_too}")
    return table if _check_shape(table, spec) else None


def _header(rows: list[Row], spec: CurvesFile) -> Row:
    """Take the header off the rows; without one the columns are called 1, 2, 3 and so on."""
    if spec.has_header:
        return rows.pop(0) if rows else Row(0, [])
    first = next((row for row in rows), Row(0, []))
    return Row(0, [str(position) for position in range(1, len(first.cells) + 1)])


def _trim(table: RawTable) -> None:
    """Take off empty cells after the last column, as spreadsheets and trailing delimiters leave them."""
    rows = [table.units, *table.rows] if table.units.line else table.rows
    width = max(len(table.header.cells), 1)
    while width > 1 and not table.header.cells[width - 1] and not any(any(row.cells[width - 1 :]) for row in rows):
        width -= 1
    del table.header.cells[width:]
    trimmed = 0
    for row in rows:
        if len(row.cells) > width and not any(row.cells[width:]):
            del row.cells[width:]
            trimmed += 1
    if trimmed:
        table.notes.append(f"empty cells after the last column left out in {trimmed} line(s)")


def _check_shape(table: RawTable, spec: CurvesFile) -> bool:
    """Refuse rows of another length, and rows of units where none or one was declared; False: nothing to go on with."""
    width = len(table.header.cells)
    rows = [*([table.units] if table.units.line else []), *table.rows]
    alike = len({len(row.cells) for row in rows}) == 1 and len(rows) > 1
    for row in rows:
        if len(row.cells) != width:
            hint = ""
            if alike:
                hint = f"is line {table.header.line} the header? state header_starts, skip_rows, or another delimiter"
            elif spec.delimiter == "," and len(row.cells) > width:
                hint = "decimal commas need another delimiter, or quotes"
            found = f"{len(row.cells)} cell{'' if len(row.cells) == 1 else 's'}"
            table.refuse((row.line, ""), "row and header differ in length", found, str(width), hint, most=MOST_SHOWN)
    table.rows[:] = [row for row in table.rows if len(row.cells) == width]
    if any(cell_number(cell, spec.decimal) is not None for cell in table.units.cells):
        where, text = (table.units.line, ""), ", ".join(table.units.cells)
        table.refuse(where, "holds numbers where a row of units is declared", text, "", 'leave out units = "row"')
        return False
    first = table.rows[0] if table.rows else Row(0, [])
    no_numbers = all(cell_number(cell, spec.decimal) is None for cell in first.cells)
    if not no_numbers or not any(is_unit(cell) for cell in first.cells):
        return bool(table.rows)
    text = ", ".join(cell for cell in first.cells if cell)
    if spec.units == "row":
        table.refuse((first.line, ""), "is a second row of units", text, "one row of units after the header")
    else:
        table.refuse((first.line, ""), "looks like a row of units", text, "rows of numbers", 'state units = "row"')
    return False
