"""A range in a few words, as a command or a cell of a spreadsheet states it (layer 2)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.errors import nearest
from benchmark.sets.cells import CellError, read_number

__all__ = ["SHAPES", "read_spread", "spread_words"]

#: shape -> what may be stated of it; two limits, or one of several numbers
SHAPES: dict[str, tuple[str, ...]] = {
    "uniform": ("low", "high"),
    "loguniform": ("low", "high"),
    "triangular": ("low", "high"),
    "normal": ("sd", "percent"),
    "lognormal": ("factor", "ln_sd"),
}
_LIMITS = ("low", "high")


def spread_words(spread: Mapping[str, Any] | None) -> tuple[str, str, str]:
    """Return shape with its number, low and high of the spread of a file; empty where there is none."""
    if spread is None:
        return "", "", ""
    number = [f"{key} {spread[key]}" for key in ("sd", "percent", "factor", "ln_sd") if key in spread]
    low, high = (str(spread.get(key, "")) for key in _LIMITS)
    return " ".join([str(spread["shape"]), *number]), low, high


def read_spread(text: str, low: str = "", high: str = "", decimal: str = "point") -> dict[str, Any] | None:
    """Read a range, the inverse of ``spread_words``.

    Parameters
    ----------
    text : str
        A shape with its number: ``lognormal factor 1.25``, ``normal percent 5``, ``normal sd 3``; ``uniform``,
        ``loguniform`` and ``triangular`` with their limits, here (``uniform 160 180``) or in ``low`` and ``high``;
        empty or ``none`` for no range.
    low, high : str
        Limits, where they stand apart.
    decimal : str
        Decimal sign in use: ``point`` or ``comma``.

    Raises
    ------
    CellError
        With what is wrong.
    """
    words = text.replace("=", " ").split()
    if not words or words == ["none"]:
        if low.strip() or high.strip():
            message = "is missing, but low or high are stated"
            raise CellError(message, f"one of {', '.join(SHAPES)}")
        return None
    shape, rest = words[0].lower(), words[1:]
    if shape not in SHAPES:
        message = f"{words[0]!r} is not a shape of a range"
        hint = nearest(shape, SHAPES)
        raise CellError(message, f"one of none, {', '.join(SHAPES)}" + (f"; {hint}" if hint else ""))
    keys = SHAPES[shape]
    if keys == _LIMITS:
        return {"shape": shape, **_limits(rest, low, high, decimal)}
    if low.strip() or high.strip():
        message = f"{shape} has no limits of its own, but low or high are stated"
        raise CellError(message, f"state {keys[0]} or {keys[1]} behind the shape")
    if len(rest) != 2 or rest[0] not in keys:
        message = f"{shape} needs one number with its name"
        raise CellError(message, f"such as {shape} {keys[0]} 1.25, or {keys[1]}")
    # a number inside words is not turned by a spreadsheet, whatever its decimal sign is
    sign = decimal if "," in rest[1] else "point"
    return {"shape": shape, rest[0]: read_number(rest[1], sign)}


def _limits(rest: list[str], low: str, high: str, decimal: str) -> dict[str, Any]:
    numbers = [word for word in rest if word not in _LIMITS] or [low, high]
    if len(numbers) != 2 or (rest and (low.strip() or high.strip())):
        message = "needs exactly one low and one high"
        raise CellError(message, "such as uniform 160 180, or the two in their own places")
    return {key: read_number(number, decimal) for key, number in zip(_LIMITS, numbers, strict=True)}
