"""Numbers in sentences: a rounding never hides on which side of a limit a number lies (layer 7)."""

from __future__ import annotations

from decimal import ROUND_CEILING, ROUND_FLOOR, Decimal

__all__ = ["apart", "beyond"]

MOST_DIGITS = 17


def apart(number: float, limit: float, digits: int = 4) -> tuple[str, str]:
    """Print two numbers with at least ``digits`` significant digits, with more until the texts differ.

    Equal numbers come out equal.
    """
    while True:
        texts = f"{number:.{digits}g}", f"{limit:.{digits}g}"
        if number == limit or float(texts[0]) != float(texts[1]) or digits >= MOST_DIGITS:
            return texts
        digits += 1


def beyond(number: float, *, up: bool, digits: int = 4) -> str:
    """Print a limit rounded upwards or downwards only, to ``digits`` significant digits."""
    exact = Decimal(number)
    if exact == 0:
        return "0"
    step = Decimal(1).scaleb(exact.adjusted() - digits + 1)
    rounded = exact.quantize(step, rounding=ROUND_CEILING if up else ROUND_FLOOR)
    return f"{float(rounded):.{digits}g}"
