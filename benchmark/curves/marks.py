"""Floor and compliance of a measured column: which readings are only bounds (layer 7.5)."""

from __future__ import annotations

import numpy as np

from benchmark.curves.columns import Column
from benchmark.curves.lines import Reading
from benchmark.curves.meanings import ONE_SIGN
from benchmark.curves.record import Array, BoolArray, IntArray
from benchmark.units import from_si

__all__ = ["at_compliance", "at_floor", "check_flat_top"]

#: columns that an instrument limits
_LIMITED = ONE_SIGN | {"control_voltage", "path_voltage"}
#: readings this close to the largest one, as a share, are one flat top; and a round number is met this closely
_FLAT = 1e-3
_FLAT_POINTS = 3


def at_floor(column: Column, si: Array) -> BoolArray:
    """Tell which readings (SI, in the dimension of the file) are only upper bounds of the size."""
    return np.abs(si) <= float(column.floor)


def at_compliance(column: Column, si: Array) -> BoolArray:
    """Tell which readings (SI, in the dimension of the file) are only lower bounds of the size."""
    return (np.abs(si) >= float(column.compliance)) & (column.compliance > 0)


def check_flat_top(column: Column, si: Array, lines: IntArray, reading: Reading) -> None:
    """Ask about a flat top that looks like a compliance nobody declared.

    Three or more neighbouring readings within 0.1 % of the largest one of the curve, which lies within 0.1 % of a
    number of two digits in the unit of the file. Readings at a declared compliance are not asked about.
    """
    if column.spec.meaning not in _LIMITED or column.spec.saturates or len(si) < _FLAT_POINTS:
        return
    sizes = np.abs(si)
    top = float(np.max(sizes))
    found = from_si(top, column.unit)
    near = (sizes >= (1.0 - _FLAT) * top) & ~at_compliance(column, si)
    if top == 0.0 or abs(float(f"{found:.1e}") - found) > _FLAT * abs(found):
        return
    starts = np.flatnonzero(np.diff(np.concatenate(([False], near, [False])).astype(int)))
    first, end = starts[::2], starts[1::2]
    long = np.flatnonzero(end - first >= _FLAT_POINTS)
    if not long.size:
        return
    one, last = int(first[long[0]]), int(end[long[0]]) - 1
    low, high = sorted((int(lines[one]), int(lines[last])))
    reading.table.refuse(
        (low, column.header),
        "has a flat top at a round value that no compliance explains",
        f"{found:.3g} {column.unit.text} on lines {low} to {high}",
        "",
        "was the instrument limited? state compliance in its [[column]]; if the sample saturates, saturates = true",
        most=1,
    )
