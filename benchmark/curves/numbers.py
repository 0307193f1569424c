"""From the cells of one column to exact numbers in SI (layer 7.5)."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from decimal import Decimal, localcontext
from fractions import Fraction

import numpy as np

from benchmark.curves.columns import Column
from benchmark.curves.lines import MOST_SHOWN, Reading
from benchmark.curves.meanings import MEANINGS, ONE_SIGN
from benchmark.curves.record import Array, IntArray
from benchmark.sets.tables import cell_number
from benchmark.units import from_si

__all__ = ["Numbers", "read_numbers"]

#: what instruments send for "not a number" and "infinity": 9.91E37 and 9.9E37 of the Standard Commands for
#: Programmable Instruments; e.g. Rohde & Schwarz, SMC100A web help, "Special Numeric Values"
_NO_READING = (Decimal("9.9e37"), Decimal("9.91e37"))
#: digits of a power of ten before it is rounded once to the 16 of a float
_POWER_DIGITS = 40
_MOST_DECADES = Decimal(300)
_WITH_UNIT = re.compile(r"[+-]?[\d.,]+(?:[eE][+-]?\d+)?\s*[^\d\s.,eE+-].*")
#: numbers further outside the usual range than this are taken for a slip of the unit, as in every other file
_FAR = 1000.0


@dataclass(frozen=True)
class Numbers:
    """Numbers of one column. ``exact``: SI by row, 0 where nothing is read; ``si``: the same, rounded once."""

    exact: list[Fraction]
    si: Array


def _number(cell: str, column: Column, decimal: str) -> Fraction | None:
    """Read one cell; None when it holds no number of the program."""
    number = cell_number(cell, decimal)
    if number is None or abs(number) in _NO_READING:
        return None
    if column.spec.scale == "log10":
        if abs(number) > _MOST_DECADES:
            return None
        with localcontext() as context:
            context.prec = _POWER_DIGITS
            number = Decimal(10) ** number
    exact = Fraction(number) * column.unit.factor
    if column.unit.offset:
        exact += column.unit.offset
    return -exact if column.spec.sign == "negative" else exact


def read_numbers(column: Column, rows: IntArray, reading: Reading) -> Numbers:
    """Read the numbers of a column on some rows; every cell that holds none is a problem.

    Parameters
    ----------
    column : Column
        The column.
    rows : array of int
        Positions of the rows that are read.
    reading : Reading
        Description, table and collector.

    Returns
    -------
    Numbers
        For all rows of the table; 0 where nothing is read or a problem was found.
    """
    table, decimal = reading.table, reading.spec.decimal
    exact, si = [Fraction(0)] * len(table.rows), np.zeros(len(table.rows))
    good = []
    for row in rows.tolist():
        cell = table.rows[row].cells[column.position]
        number = _number(cell, column, decimal)
        if number is None:
            _refuse(cell, table.rows[row].line, column, reading)
            continue
        try:
            si[row] = float(number)
        except OverflowError:
            si[row] = np.inf
        if not np.isfinite(si[row]) or (si[row] == 0.0 and number != 0):
            where = (table.rows[row].line, column.header)
            table.refuse(where, "is beyond the range of the program", cell[:40], most=MOST_SHOWN)
            continue
        exact[row] = number
        good.append(row)
    _check_domain(column, si, good, reading)
    _check_range(column, si, good, reading)
    return Numbers(exact, si)


def _refuse(cell: str, line: int, column: Column, reading: Reading) -> None:
    decimal, where = reading.spec.decimal, (line, column.header)
    if not cell:
        hint = "leave out rows without a reading, or ignore the column"
        reading.table.refuse(where, "is empty", "", "a number", hint, most=MOST_SHOWN)
        return
    number = cell_number(cell, decimal)
    if number is not None and abs(number) in _NO_READING:
        allowed = "a reading; leave the row out"
        reading.table.refuse(
            where, "is what instruments send when they have no reading", cell[:40], allowed, most=MOST_SHOWN
        )
        return
    hint = ""
    other = "," if decimal == "." else "."
    if other in cell and cell_number(cell, other) is not None:
        hint = f"declare decimal = {other!r}".replace("'", '"')
    elif _WITH_UNIT.fullmatch(cell):
        hint = "a unit holds for the whole column: state it in the header, in a row of units or in the description"
    if number is not None:
        allowed = f"a logarithm from -{_MOST_DECADES} to {_MOST_DECADES}"
    else:
        allowed = f"a finite number with decimal {decimal!r}, at most 1e300"
    reading.table.refuse(where, "is not a number", repr(cell[:40]), allowed, hint, most=MOST_SHOWN)


def _check_domain(column: Column, si: Array, rows: Sequence[int], reading: Reading) -> None:
    """Refuse signs that a quantity cannot have; within the floor a reading may have either."""
    quantity, turned = MEANINGS[column.spec.meaning], column.spec.sign == "negative"
    if not rows:
        return
    one_sign = column.spec.meaning in ONE_SIGN and column.spec.sign != "both"
    values = si[list(rows)]
    if quantity.domain == "positive" or one_sign:
        wrong = (values <= 0.0) & (np.abs(values) > float(column.floor))
    else:
        wrong = (values < 0.0) & (quantity.domain == "nonnegative")
    hint = ""
    if one_sign and np.mean(wrong) > 0.5:
        hint = 'state sign = "positive"' if turned else 'state sign = "negative"'
    elif one_sign:
        hint = 'state the floor of the instrument, or sign = "both" if the current itself changes its sign'
    what = "must be below 0, as its sign is declared" if turned else f"must be {quantity.domain_text}"
    if one_sign and not turned:
        what = "must be above 0"
    if quantity.name == "temperature":
        what = "must be above absolute zero"
    for row in np.asarray(rows, dtype=np.int64)[wrong].tolist():
        cells = reading.table.rows[row]
        reading.table.refuse((cells.line, column.header), what, cells.cells[column.position], "", hint, most=MOST_SHOWN)


def _check_range(column: Column, si: Array, rows: Sequence[int], reading: Reading) -> None:
    """Refuse numbers that look like a slip of the unit; readings within the floor may be as small as they like."""
    quantity = MEANINGS[column.spec.meaning]
    if column.spec.unusual or not rows:
        return
    sizes = np.abs(si[list(rows)])
    seen = (sizes > max(float(column.floor), 0.0)) & (quantity.low > 0.0)
    far = (sizes > _FAR * quantity.high) | (seen & (sizes < quantity.low / _FAR))
    if not np.any(far):
        return
    row = rows[int(np.flatnonzero(far)[0])]
    cells = reading.table.rows[row]
    low, high = (f"{from_si(bound, column.unit):.3g}" for bound in (quantity.low, quantity.high))
    reading.table.refuse(
        (cells.line, column.header),
        "is more than a factor 1000 outside the usual range",
        f"{cells.cells[column.position]} {column.unit.text}",
        f"usually {low} to {high} {column.unit.text}",
        "check the prefix of the unit, or state unusual = true for the column",
    )
