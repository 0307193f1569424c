"""Which column of a raw file each ``[[column]]`` of the description means (layer 7.5)."""

from __future__ import annotations

import re
from dataclasses import dataclass

from benchmark.curves.lines import Reading
from benchmark.errors import nearest

__all__ = ["Place", "match_columns"]

#: unit at the end of a header: ID (A), ID [A], ID / A
_WITH_UNIT = re.compile(r"(?P<name>.*?\S)\s*(?:\((?P<round>[^()]*)\)|\[(?P<square>[^\[\]]*)\]|\s/\s*(?P<slash>.*))\s*")


@dataclass(frozen=True)
class Place:
    """One column of the file: ``index`` of its description, ``position`` from 0, the unit the file itself states."""

    index: int
    position: int
    header: str
    unit: str
    group: int  # which of the groups side by side, from 0; -1: shared by all


def match_columns(reading: Reading) -> list[Place]:
    """Find every column of the description in the file, and refuse what is neither read nor ignored.

    A header that stands once is one column; under ``repeat`` it may stand once per word.
    """
    headers, units = _headers(reading)
    free = dict(enumerate(headers))
    found: list[Place] = []
    columns = reading.spec.column
    numbered = [index for index, column in enumerate(columns) if column.number is not None]
    for index in [*numbered, *(index for index in range(len(columns)) if index not in numbered)]:
        find = _by_number if index in numbered else _by_name
        positions = find(index, headers, free, reading)
        for group, position in enumerate(positions):
            alone = len(positions) == 1
            found.append(Place(index, position, headers[position], units[position], -1 if alone else group))
    _check_rest(headers, free, reading)
    return sorted(found, key=lambda place: (place.index, place.position))


def _headers(reading: Reading) -> tuple[list[str], list[str]]:
    """Names of the columns and the units that the file itself states ("" where it states none)."""
    spec, texts = reading.spec, reading.table.header.cells
    if spec.units == "row":
        cells = [text.strip("()[]") for text in reading.table.units.cells]
        return texts, [*cells, *[""] * len(texts)][: len(texts)]
    names, units = list(texts), [""] * len(texts)
    if spec.units == "header":
        whole = {column.header for column in spec.column} | set(spec.ignore)  # a name may be the whole header
        for position, text in enumerate(texts):
            match = _WITH_UNIT.fullmatch(text)
            if match is not None and text not in whole:
                names[position] = match["name"]
                units[position] = (match["round"] or match["square"] or match["slash"] or "").strip()
    return names, units


def _by_number(index: int, headers: list[str], free: dict[int, str], reading: Reading) -> list[int]:
    column, dotted = reading.spec.column[index], f"column.{index}"
    position = (column.number or 0) - 1
    if not 0 <= position < len(headers):
        reading.problem(f"{dotted}.number", "is no column of the file", str(column.number), f"1 to {len(headers)}")
        return []
    if column.header is not None and column.header != headers[position]:
        found, there = repr(column.header), repr(headers[position])
        reading.problem(f"{dotted}.header", "is not the header at that number", found, there)
        return []
    if position not in free:
        reading.problem(f"{dotted}.number", "describes a column twice", str(column.number))
        return []
    del free[position]
    return [position]


def _by_name(index: int, headers: list[str], free: dict[int, str], reading: Reading) -> list[int]:
    column, dotted, repeat = reading.spec.column[index], f"column.{index}", reading.spec.repeat
    if column.header is None:
        reading.problem(dotted, "says neither header nor number", "", 'header = "..." or number = 1')
        return []
    found = [position for position, header in free.items() if header == column.header]
    if not found and column.header in headers:
        reading.problem(f"{dotted}.header", "describes a column twice", repr(column.header))
        return []
    if not found:
        known, hint = ", ".join(dict.fromkeys(headers)), nearest(column.header, headers)
        reading.problem(f"{dotted}.header", "is no column of the file", repr(column.header), known, hint)
        return []
    for position in found:
        del free[position]
    if len(found) in (1, len(repeat.words) if repeat else 1):
        return found
    reading.table.refuse(
        (reading.table.header.line, column.header),
        "stands in the header several times",
        f"in columns {', '.join(str(position + 1) for position in found)}",
        f"once, or {len(repeat.words)} times: once per word of repeat" if repeat else "once",
        "" if repeat else "describe them by number, or state repeat",
    )
    return []


def _check_rest(headers: list[str], free: dict[int, str], reading: Reading) -> None:
    """Every column is read or ignored by name, and every ignored name stands in the file."""
    spec, table = reading.spec, reading.table
    names = [column.header for column in spec.column if column.header]
    for position, header in free.items():
        if header not in spec.ignore:
            where = (table.header.line, header or f"column {position + 1}")
            near = "" if header in names else nearest(header, names)
            hint = near or "describe it in a [[column]], or name it in ignore"
            if len(headers) == 1 and re.search(r"[,;|\t]", header):
                hint = "check the delimiter"
            if not header:
                hint = 'it has no name: describe it by number, or state ignore = [""]'
            table.refuse(where, "is neither read nor ignored", "", ", ".join(names), hint)
    for name in sorted({name for name in spec.ignore if spec.ignore.count(name) > 1}):
        reading.problem("ignore", "names a column twice", repr(name))
    for name in dict.fromkeys(spec.ignore):
        if name not in free.values():
            what = "ignores a column that is read" if name in headers else "ignores a column the file does not have"
            reading.problem("ignore", what, repr(name), "", nearest(name, free.values()))
