"""What a sheet says against what its set says: the values that are to be restated (layer 8)."""

from __future__ import annotations

import dataclasses
import datetime
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from decimal import Context, Decimal
from typing import Any

from benchmark.errors import Problem, nearest
from benchmark.record.editing import KEEP, OpenSet, Restated
from benchmark.sets.cells import CellError, read_day, read_number
from benchmark.sets.problems import Collector
from benchmark.sets.sheet import SHARED, Cell, Key, Sheet, SheetRow, exported_rows, mangled, unguarded
from benchmark.sets.spread_words import read_spread
from benchmark.units import UnitError, parse_unit

__all__ = ["Told", "restated_by"]

#: a cell with so many digits that agrees with a longer number of the file was cut by a spreadsheet
_SPREADSHEET_DIGITS = 9
_RANGE = ("spread shape", "low", "high")
_ORIGIN = ("evidence", "source", "where", "conditions")
Rows = Mapping[Key, Mapping[str, str]]


@dataclass(frozen=True)
class Told:
    """What the user says besides the sheet; ``decimal``: point, comma, or empty to go by the sheet."""

    date: datetime.date | None = None
    old_date: datetime.date | None = None
    reason: str = ""
    decimal: str = ""


@dataclass
class _Reading:
    """One pass over a sheet."""

    sheet: Sheet
    opened: OpenSet
    told: Told
    collector: Collector
    decimal: str
    now: Rows
    notes: list[str] = field(default_factory=list)
    restating: list[str] = field(default_factory=list)
    undated: list[str] = field(default_factory=list)

    def refuse(self, cell: Cell, what: str, found: str = "", allowed: str = "", hint: str = "") -> None:
        self.collector.add(self.sheet.problem(cell, what, found or repr(cell.text), allowed, hint))


def restated_by(
    sheet: Sheet, opened: OpenSet, told: Told, collector: Collector
) -> tuple[list[Restated], tuple[str, ...]]:
    """Return the values that a sheet changes, and notes for the reader.

    Parameters
    ----------
    sheet : Sheet
    opened : OpenSet
        The set it was exported from.
    told : Told
        Date, reason and the like for changed values.
    collector : Collector
        Receives every problem, each with its cell.
    """
    now = exported_rows(opened.file)
    if not _same_set(sheet, opened, now, collector):
        return [], ()
    reading = _Reading(sheet, opened, told, collector, told.decimal or _decimal_sign(sheet, now), now)
    known = [row for key, row in sheet.rows.items() if _known(reading, key, row)]
    names = dict.fromkeys(row.text("name") for row in known)
    found = [
        one
        for name in names
        if (one := _value(reading, name, [row for row in known if row.text("name") == name])) is not None
    ]
    absent = [key for key in now if key not in sheet.rows]
    if absent:
        reading.notes.append(f"{len(absent)} rows of the set are not in the sheet and stay as they are")
    _complete(reading)
    return found, tuple(reading.notes)


def _same_set(sheet: Sheet, opened: OpenSet, now: Rows, collector: Collector) -> bool:
    """Tell whether the set is as it was when the sheet was exported; else name the values that are not."""
    item = opened.item
    if sheet.set_id != item.id:
        collector.add(Problem(sheet.file, 1, "", "is a sheet of another set", repr(sheet.set_id), repr(item.id)))
        return False
    if sheet.digest == opened.file.sha256:
        return True
    moved = [
        " at ".join(filter(None, key))
        for key in dict.fromkeys([*sheet.rows, *now])
        if key not in now or (key in sheet.rows and sheet.rows[key].text("check") != now[key]["check"])
    ]
    found = (
        f"changed since: {', '.join(moved)}" if moved else "changed since: no value of the sheet, another part of it"
    )
    hint = "export it again and put the changes into the new sheet"
    what = "was exported from another state of the set"
    collector.add(Problem(sheet.file, 2, "digest", what, found, "", hint))
    return False


def _decimal_sign(sheet: Sheet, now: Rows) -> str:
    """Return the decimal sign of a sheet: with semicolons it may be the comma, where the cells leave no doubt."""
    if sheet.delimiter != ";":
        return "point"
    texts = [row.text(column) for row in sheet.rows.values() for column in ("value", "low", "high")]
    if any("." in text for text in texts):
        return "point"
    for key, row in sheet.rows.items():
        exported = now.get(key, {}).get("value", "")
        text = row.text("value")
        if "," in text and "." in exported and _number(text, "comma") == Decimal(exported):
            return "comma"  # an untouched number shows the sign
    return "point"


def _number(text: str, decimal: str) -> Decimal | None:
    try:
        return read_number(text, decimal)
    except CellError:
        return None


def _known(reading: _Reading, key: Key, row: SheetRow) -> bool:
    """Tell whether the set has the value and node of a row."""
    name, node = key
    if key in reading.now:
        return True
    names, nodes = [known for known, _ in reading.now], reading.opened.item.nodes
    if name not in names:
        why = mangled(name)
        hint = why or nearest(name, names) or "new values are written in the file"
        reading.refuse(
            row.cells["name"], "is not a value of the set", allowed=", ".join(dict.fromkeys(names)), hint=hint
        )
    elif (name, "") in reading.now:
        what = "is not used: the file states one number for all nodes"
        reading.refuse(row.cells["node"], what, hint="supersede --node states one apart")
    else:
        hint = mangled(node) or nearest(node, nodes)
        reading.refuse(row.cells["node"], "is not a node of the set", allowed=", ".join(nodes), hint=hint)
    return False


def _value(reading: _Reading, name: str, rows: Sequence[SheetRow]) -> Restated | None:
    """Return what the rows of one value change; None when they change nothing or are not right."""
    before = len(reading.collector.problems)
    first = rows[0]
    was = reading.now[name, first.text("node")]
    for row in rows:
        _unchangeable(reading, row)
    for column in SHARED:
        for row in rows[1:]:
            if row.text(column) != first.text(column):
                what = f"differs from row {first.number}: the nodes of one value share one {column}"
                reading.refuse(row.cells[column], what)
    numbers = {row.text("node"): _read_value(reading, row) for row in rows}
    changed = {column for column in SHARED if column in first.cells and first.text(column) != was[column]}
    unit = _unit(reading, first, was) if "unit" in changed else was["unit"]
    spread = _spread(reading, first) if changed & set(_RANGE) else KEEP
    told = {column: _text(reading, first.cells[column]) for column in _ORIGIN if column in changed}
    day = _day(reading, first.cells["date"]) if "date" in changed else None
    note = _text(reading, first.cells["comment"]) if "comment" in changed else None
    if len(reading.collector.problems) > before:
        return None
    if spread != KEEP and spread == reading.opened.table(name).get("spread"):
        spread = KEEP
    stated = {node: Decimal(reading.now[name, node]["value"]) for node in numbers}
    moved = {node: number for node, number in numbers.items() if number is not None and number != stated[node]}
    respelled = unit != was["unit"] and not moved and _same_unit(unit, was["unit"])
    restates = bool(moved) or spread != KEEP or bool(told) or (unit != was["unit"] and not respelled)
    if not restates and not changed & {"unit", "date", "comment"}:
        return None
    new = {node: number if number is not None else stated[node] for node, number in numbers.items()}
    words: dict[str, str | None] = {**told, **({"note": note or None} if "comment" in changed else {})}
    if not restates:
        return Restated(name, new if unit != was["unit"] else stated, unit, KEEP, words, day, "")
    reading.restating.append(name)
    if day is None and reading.told.date is None:
        reading.undated.append(name)
    return Restated(
        name,
        moved if moved and unit == was["unit"] else new,
        unit,
        spread,
        words,
        day or reading.told.date,
        " ".join(reading.told.reason.split()) or "not said",
        reading.told.old_date,
    )


def _complete(reading: _Reading) -> None:
    """Ask for what a superseded value needs."""
    told, names = reading.told, reading.restating
    missing = ["--reason"] if names and not told.reason.strip() else []
    missing += ["--date"] if reading.undated else []
    if missing:
        what = f"changes {', '.join(names)}; say also {' and '.join(missing)}"
        hint = "why the old numbers are no longer used, and the day from which the new ones hold"
        reading.collector.add(Problem(reading.sheet.file, 0, "", what, hint=hint))


def _unchangeable(reading: _Reading, row: SheetRow) -> None:
    now = reading.now[row.text("name"), row.text("node")]
    for column in ("meaning", "check"):
        if column in row.cells and row.text(column) != now[column]:
            reading.refuse(row.cells[column], "is not changed in a sheet", allowed=repr(now[column]))


def _read_value(reading: _Reading, row: SheetRow) -> Decimal | None:
    """Return the number of a row; None when it is wrong."""
    cell, stated = row.cells["value"], Decimal(reading.now[row.text("name"), row.text("node")]["value"])
    try:
        number = read_number(unguarded(cell.text), reading.decimal)
    except CellError as error:
        reading.refuse(cell, str(error), hint=error.hint)
        return None
    digits = len(number.as_tuple().digits)
    if number != stated and digits >= _SPREADSHEET_DIGITS and Context(prec=digits).plus(stated) == number:
        reading.notes.append(f"{cell.place}: the file has more digits ({stated}); taken as unchanged")
        return stated
    return number


def _unit(reading: _Reading, row: SheetRow, was: Mapping[str, str]) -> str:
    cell = row.cells["unit"]
    if not cell.text:
        reading.refuse(cell, "is missing: a value has a unit", "nothing", f"a unit such as {was['unit']}")
        return was["unit"]
    return _text(reading, cell)


def _same_unit(one: str, two: str) -> bool:
    try:
        first, second = parse_unit(one), parse_unit(two)
    except UnitError:
        return False
    return dataclasses.replace(first, text="") == dataclasses.replace(second, text="")


def _spread(reading: _Reading, row: SheetRow) -> dict[str, Any] | None:
    low, high = (unguarded(row.text(column)) for column in ("low", "high"))
    cell = row.cells.get("spread shape", row.cells["value"])
    try:
        return read_spread(row.text("spread shape"), low, high, reading.decimal)
    except CellError as error:
        reading.refuse(cell, str(error), f"{row.text('spread shape')!r}, low {low!r}, high {high!r}", hint=error.hint)
        return None


def _text(reading: _Reading, cell: Cell) -> str:
    if why := mangled(cell.text):
        reading.refuse(cell, why, hint="format the column as text and write it again")
    return unguarded(cell.text)


def _day(reading: _Reading, cell: Cell) -> datetime.date | None:
    try:
        return read_day(cell.text)
    except CellError as error:
        reading.refuse(cell, str(error), hint=error.hint)
        return None
