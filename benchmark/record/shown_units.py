"""How units are said while words, charts or tables of one record are made (layer 8).

An ordinary record holds SI numbers. In a ratio-only record every time is a multiple of T0, every energy of E0 and so
on; the symbols then stand where the units would. ``in_units_of_record`` marks the functions at the outside: what they
call sees the units of the record they were given.
"""

from __future__ import annotations

import functools
from collections.abc import Callable, Mapping
from contextvars import ContextVar
from typing import Any, Concatenate, ParamSpec, TypeVar

__all__ = ["NORMALISED", "in_units_of_record", "normalised", "unit_words"]

#: SI unit -> symbol of the base value in a ratio-only record
NORMALISED = {"s": "T0", "J": "E0", "V": "V0", "W": "P0", "m^2": "A0", "W/m^2": "D0"}
_RATIOS: ContextVar[bool] = ContextVar("_RATIOS", default=False)
_Rest = ParamSpec("_Rest")
_Found = TypeVar("_Found")
_Record = Mapping[str, Any]


def normalised(unit: str) -> str | None:
    """Return the symbol of the base value that stands for a unit, or None when numbers are SI."""
    return NORMALISED.get(unit) if _RATIOS.get() else None


def unit_words(unit: str) -> str:
    """Return the unit, or the symbol that stands for it."""
    return normalised(unit) or unit


def in_units_of_record(
    make: Callable[Concatenate[_Record, _Rest], _Found],
) -> Callable[Concatenate[_Record, _Rest], _Found]:
    """Let everything ``make(record, ...)`` calls say units as its record needs them."""

    @functools.wraps(make)
    def inside(record: _Record, /, *rest: _Rest.args, **named: _Rest.kwargs) -> _Found:
        token = _RATIOS.set(bool(record.get("ratio_only")))
        try:
            return make(record, *rest, **named)
        finally:
            _RATIOS.reset(token)

    return inside
