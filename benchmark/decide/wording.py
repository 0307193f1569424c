"""Numbers in sentences: a rounding never hides on which side of a limit a number lies (layer 7)."""

from __future__ import annotations

__all__ = ["apart"]

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
