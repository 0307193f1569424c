"""Derived values that follow when the values their formulas name are changed (layer 2)."""

from __future__ import annotations

from collections.abc import Mapping
from decimal import Decimal

import numpy as np
from numpy.typing import NDArray

from benchmark.sets.formulas import evaluate_formula, names_in
from benchmark.sets.values import Value
from benchmark.units import from_si, parse_unit

__all__ = ["followers", "in_file_digits"]

#: significant digits of a derived value written by the program; a file number of more would not be met by its formula
_DIGITS = 12


def followers(values: Mapping[str, Value], moved: Mapping[str, NDArray[np.float64]]) -> dict[str, NDArray[np.float64]]:
    """Return the derived values whose formulas lead to a moved value, computed anew [SI, by node or one for all].

    ``moved`` values themselves do not follow. The formulas must not run in a circle, which the check of a set ensures.
    """
    arrays = {name: value.si for name, value in values.items()} | dict(moved)
    formulas = {name: value.formula for name, value in values.items() if value.formula and name not in moved}
    found: dict[str, NDArray[np.float64]] = {}
    waiting = dict(formulas)
    while waiting:
        ready = {name for name, formula in waiting.items() if not names_in(formula) & waiting.keys()}
        if not ready:
            return found
        for name in sorted(ready):
            if names_in(waiting.pop(name)) & (moved.keys() | found.keys()):
                arrays[name] = found[name] = evaluate_formula(formulas[name], arrays)
    return found


def in_file_digits(si: float, unit: str) -> Decimal:
    """Return an SI number in a unit with the digits in which a file states it."""
    number = Decimal(f"{from_si(si, parse_unit(unit)):.{_DIGITS}g}")
    return number if number.as_tuple().exponent != 0 else number + Decimal("0.0")
