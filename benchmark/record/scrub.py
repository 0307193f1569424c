"""Free texts without absolute numbers (layer 8), for ratio-only records."""

from __future__ import annotations

import re
from collections.abc import Iterable

from benchmark.units import UnitError, parse_unit

__all__ = ["LEFT_OUT", "printed_forms", "scrubbed"]

#: stands where a number was
LEFT_OUT = "[left out]"
_NUMBER = re.compile(
    r"(?<![\w./_-])[-+−]?(?:\d+(?:[ \u202f,]\d{3})+|\d+)(?:[.,]\d+)?"
    r"(?:[eE][-+−]?\d+|[ \u00a0]?[×x·][ \u00a0]?10\^?[-+−]?[⁻⁰¹²³⁴⁵⁶⁷⁸⁹\d]+)?"
    r"(?P<unit>[\u00a0 ]?[A-Za-zµμΩ°%][\w/^²³µμΩ°·*-]*)?"
)
#: words that are spelled like units
_WORDS = frozenset({"a", "as", "at", "in", "is", "of", "or", "to", "and", "h", "inputs", "input", "more", "x", "%"})


def _is_unit(word: str) -> bool:
    if word in _WORDS:
        return False
    try:
        parse_unit(word)
    except (UnitError, ValueError):
        return False
    return True


def printed_forms(values: Iterable[object]) -> frozenset[str]:
    """Return how numbers that may be told are printed in texts: with two to six significant digits."""
    numbers = [value for value in values if isinstance(value, (int, float)) and not isinstance(value, bool)]
    forms = {f"{value:.{digits}g}" for value in numbers for digits in range(2, 18)}
    return frozenset(forms)


def scrubbed(text: str, told: frozenset[str] = frozenset()) -> str:
    """Replace every number that has a unit, and every other number but counts below 1000 and those ``told``."""

    def replaced(match: re.Match[str]) -> str:
        unit = match["unit"] or ""
        number = match[0][: len(match[0]) - len(unit)]
        word = unit.strip("\u00a0 ")
        glued = bool(word) and unit == word and word != "%"
        if glued or (word and _is_unit(word)):
            return LEFT_OUT
        plain = number.lstrip("+")
        if plain in told or re.fullmatch(r"\d{1,3}", plain):
            return match[0]
        return LEFT_OUT + unit

    return _NUMBER.sub(replaced, text)
