"""From the rows of a raw file to single curves (layer 7.5)."""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pandas as pd

from benchmark.curves.blocks import Block
from benchmark.curves.columns import Column, fixed_values
from benchmark.curves.lines import MOST_SHOWN, Reading
from benchmark.curves.marks import at_compliance, at_floor, check_flat_top
from benchmark.curves.meanings import MULTIPLIED, PER_WIDTH
from benchmark.curves.numbers import Numbers
from benchmark.curves.record import Array, IntArray, Sweep
from benchmark.errors import nearest

__all__ = ["LEAST_POINTS", "given_values", "make_sweeps"]

#: fewer points make no curve
LEAST_POINTS = 2

#: labels -> what is fixed for the curves that have them
Given = list[tuple[Mapping[str, str], Mapping[str, Fraction]]]


@dataclass(frozen=True)
class _Curve:
    """Rows of one curve before it is cut where the axis turns: labels, fixed values, positions of the rows."""

    labels: dict[str, str]
    fixed: dict[str, Fraction]
    rows: IntArray


def given_values(reading: Reading) -> Given:
    """Convert the fixed values of the file (no labels) and those that hold for certain labels."""
    return [
        ({}, fixed_values(reading.spec.fixed, "fixed", reading)),
        *(
            (table.labels, fixed_values(table.fixed, f"given.{index}.fixed", reading))
            for index, table in enumerate(reading.spec.given)
        ),
    ]


def make_sweeps(
    block: Block, rows: IntArray, numbers: Mapping[int, Numbers], given: Given, reading: Reading
) -> list[Sweep]:
    """Cut the rows of a block into curves and convert them.

    Parameters
    ----------
    block : Block
        The columns.
    rows : array of int
        Positions of the rows on which the block has readings.
    numbers : mapping of int to Numbers
        Position of a column -> its numbers.
    given : list
        Labels -> fixed values.
    reading : Reading
        Description, table and collector; takes every problem.
    """
    found: list[Sweep] = []
    for curve in _curves(block, rows, numbers, reading):
        fixed = _fixed(curve, given, reading)
        along = next(column for column in block.of_kind("axis") if column.meaning == reading.spec.along)
        for labels, part in _parts(curve, numbers[along.position].si, along, reading):
            kept = _distinct(part, along, block, numbers, reading)
            if kept is not None:
                sweep = _sweep(labels, fixed, kept, along, block, numbers, reading)
                found += [] if sweep is None else [sweep]
    return found


def _curves(block: Block, rows: IntArray, numbers: Mapping[int, Numbers], reading: Reading) -> list[_Curve]:
    """Rows with the same words in the label columns and the same numbers in the other axes, in order of appearance."""
    labels = block.of_kind("label")
    axes = [column for column in block.of_kind("axis") if column.meaning != reading.spec.along]
    keys: dict[str, object] = {"": np.zeros(len(rows))}
    for column in labels:
        keys[column.meaning] = [reading.table.rows[row].cells[column.position] for row in rows.tolist()]
    for column in axes:
        keys[column.meaning] = numbers[column.position].si[rows]
    group = pd.DataFrame(keys).groupby(list(keys), sort=False).ngroup().to_numpy()
    found = []
    for number in range(int(group.max()) + 1 if len(group) else 0):
        mine = rows[group == number]
        first = int(mine[0])
        words = {column.meaning: reading.table.rows[first].cells[column.position] for column in labels}
        fixed = {column.meaning: numbers[column.position].exact[first] for column in axes}
        found.append(_Curve({**block.labels, **words}, {**block.fixed, **fixed}, mine))
    return found


def _named(labels: Mapping[str, str]) -> str:
    """Name a curve in messages."""
    return ", ".join(f"{name} {word}" for name, word in labels.items())


def _fixed(curve: _Curve, given: Given, reading: Reading) -> dict[str, Fraction]:
    """Collect what is fixed along a curve from all the places that may say so; nothing twice."""
    line = reading.table.rows[int(curve.rows[0])].line
    fixed = dict(curve.fixed)
    stated = [values for labels, values in given if labels.items() <= curve.labels.items()]
    for name, number in itertools.chain(*(values.items() for values in stated)):
        if name in fixed:
            hint = "a column, fixed or given: one of them"
            reading.table.refuse((line, name), "is stated twice for a curve", _named(curve.labels), "", hint, most=1)
        fixed[name] = number
    if "temperature" not in fixed and not any(column.meaning == "temperature" for column in reading.spec.column):
        hint = "state fixed.temperature, or describe its column"
        reading.table.refuse((line, "temperature"), "is not stated for a curve", _named(curve.labels), "", hint, most=1)
    return fixed


def _parts(curve: _Curve, si: Array, along: Column, reading: Reading) -> list[tuple[dict[str, str], IntArray]]:
    """Cut a curve where its axis turns back, or sort it; undeclared, a turn is refused."""
    spec, rows = reading.spec, curve.rows
    if spec.sort:
        return [(curve.labels, rows[np.argsort(si[rows], kind="stable")])]
    steps = np.sign(np.diff(si[rows]))
    moving = np.flatnonzero(steps)
    turned = np.flatnonzero(np.diff(steps[moving]))
    if not turned.size:
        return [(curve.labels if not spec.turns else {**curve.labels, "sweep": spec.turns[0]}, rows)]
    ends = moving[turned] + 2
    # one reading where the axis turns belongs to both parts; of two, each part has its own
    starts = np.where(moving[turned + 1] == moving[turned] + 1, ends - 1, ends)
    if not spec.turns:
        row = reading.table.rows[int(rows[ends[0]])]
        reading.table.refuse(
            (row.line, along.header),
            "turns back within a curve",
            row.cells[along.position],
            "",
            'state turns = ["forward", "backward"], or sort = true for rows in any order, or a label column that tells '
            "curves apart",
            most=MOST_SHOWN,
        )
        return []
    parts = [rows[one:end] for one, end in zip([0, *starts.tolist()], [*ends.tolist(), len(rows)], strict=True)]
    found = []
    for number, part in enumerate(parts):
        turn, name = divmod(number, len(spec.turns))
        again = {"pass": str(turn + 1)} if len(parts) > len(spec.turns) else {}
        found.append(({**curve.labels, "sweep": spec.turns[name], **again}, part))
    return found


def _distinct(
    rows: IntArray, along: Column, block: Block, numbers: Mapping[int, Numbers], reading: Reading
) -> IntArray | None:
    """Leave out rows that repeat their neighbour; two different readings at one point are refused."""
    table, si = reading.table, numbers[along.position].si
    repeated = np.flatnonzero(np.diff(si[rows]) == 0.0) + 1
    values = block.of_kind("value")
    wrong = False
    for position in repeated.tolist():
        one, other = int(rows[position - 1]), int(rows[position])
        differing = [c for c in values if numbers[c.position].exact[one] != numbers[c.position].exact[other]]
        for column in differing:
            wrong = True
            cells = (table.rows[one].cells[column.position], table.rows[other].cells[column.position])
            table.refuse(
                (table.rows[other].line, column.header),
                "has two different values at the same point of one curve",
                f"{cells[0]} on line {table.rows[one].line} and {cells[1]}",
                "",
                "tell the curves apart by a label, or leave one out",
                most=MOST_SHOWN,
            )
    if wrong:
        return None
    if repeated.size:
        lines = ", ".join(str(table.rows[row].line) for row in rows[repeated].tolist()[:MOST_SHOWN])
        table.notes.append(f"{repeated.size} row(s) left out that repeat the row before them: line {lines}")
    kept = np.delete(rows, repeated)
    if len(kept) < LEAST_POINTS:
        line = table.rows[int(kept[0])].line
        found = f"{len(kept)} at {table.rows[int(kept[0])].cells[along.position]}"
        others = [column.header for column in (*block.of_kind("label"), *block.of_kind("axis")) if column is not along]
        hint = (
            f"{', '.join(others)} tell curves apart: read what changes with every row as kind value" if others else ""
        )
        what = f"a curve has fewer than {LEAST_POINTS} points"
        table.refuse((line, along.header), what, found, "", hint, most=MOST_SHOWN)
        return None
    return kept


def _sweep(
    labels: Mapping[str, str],
    fixed: Mapping[str, Fraction],
    rows: IntArray,
    along: Column,
    block: Block,
    numbers: Mapping[int, Numbers],
    reading: Reading,
) -> Sweep | None:
    """Convert one curve; numbers per width are divided before they are rounded."""
    table = reading.table
    lines = np.array([table.rows[row].line for row in rows.tolist()], dtype=np.int64)
    _check_widths(fixed, int(lines[0]), block, reading)
    columns = {along.meaning: numbers[along.position].si[rows]}
    floors, tops, floor, compliance = {}, {}, {}, {}
    for column in block.of_kind("value"):
        read = numbers[column.position]
        factor = _factor(column, fixed, int(lines[0]), labels, reading)
        if factor is None:
            return None
        si = read.si[rows]
        check_flat_top(column, si, lines, reading)
        floors[column.meaning], tops[column.meaning] = at_floor(column, si), at_compliance(column, si)
        if column.floor > 0:
            floor[column.meaning] = _rounded(column.floor * factor)
        if column.compliance > 0:
            compliance[column.meaning] = _rounded(column.compliance * factor)
        if column.spec.per_width:
            si = np.array([_rounded(read.exact[row] * factor) for row in rows.tolist()])
        limits = [*floor.values(), *compliance.values()]
        if not np.all(np.isfinite([*si.tolist(), *limits])):
            where, width = (int(lines[0]), column.header), f"{float(fixed['width']):g} m"
            table.refuse(where, "is beyond the range of the program with this width", width, "", "", most=1)
            return None
        columns[column.meaning] = si
    also = {name: float(number) for name, number in fixed.items()}
    return Sweep(labels, also, columns, lines, floors, tops, floor, compliance)


def _rounded(number: Fraction) -> float:
    """Round to a float; not a number where the program has none of that size."""
    try:
        si = float(number)
    except OverflowError:
        return math.nan
    return math.nan if si == 0.0 and number != 0 else si


def _check_widths(fixed: Mapping[str, Fraction], line: int, block: Block, reading: Reading) -> None:
    """Absolute numbers beside numbers per width can only be used together when the width is known."""
    values = block.of_kind("value")
    absolute = [column.header for column in values if column.meaning in PER_WIDTH]
    if "width" in fixed or not absolute or not any(column.meaning in PER_WIDTH.values() for column in values):
        return
    hint = "state fixed.width, or a column with the width"
    reading.table.refuse(
        (line, absolute[0]), "is absolute beside numbers per width, but no width is stated", "", "", hint, most=1
    )


def _factor(
    column: Column, fixed: Mapping[str, Fraction], line: int, labels: Mapping[str, str], reading: Reading
) -> Fraction | None:
    """What the numbers of a column are multiplied by: 1, the width, or one over it."""
    if not column.spec.per_width:
        return Fraction(1)
    if "width" not in fixed:
        hint = nearest("width", fixed) or "state fixed.width, a column with the width, or given for each device"
        reading.table.refuse(
            (line, column.header), "is to be per width, but no width is stated", _named(labels), "", hint, most=1
        )
        return None
    return fixed["width"] if column.spec.meaning in MULTIPLIED else 1 / fixed["width"]
