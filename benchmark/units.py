"""Units at the edge (layer 1): any common spelling in, one exactly rounded SI float out.

pint parses the spelling and gives the factor to SI base units as an exact fraction; the number arrives as the
decimal text of the file. Their product is rounded once, so 0.1 mA/um and 100 A/m give the same bits.
A decade is a counting unit of its own: a swing is volt per decade and never mixes with a voltage.
"""

from __future__ import annotations

import functools
import re
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from typing import Any

__all__ = ["Unit", "UnitError", "format_si", "from_si", "parse_unit", "to_si"]

#: spellings of the one unit with an offset that files may use
_CELSIUS = frozenset({"degC", "°C", "celsius", "degree_Celsius"})
_DIMENSIONLESS = frozenset({"1", "", "dimensionless"})
#: symbols that pint reads as something an engineer would not mean in these files
_MISLEADING = {"a": "year", "c": "speed of light", "h": "hour", "u": "atomic mass unit", "mil": "milli-inch"}
#: units that pint knows and that would change a number unseen: a cycle is a turn of 2 pi to it, a decibel a plain one
_MISREAD = {
    "turn": "a turn of 2 pi; plain counts have the unit 1",
    "revolution": "turns of 2 pi; plain counts have the unit 1",
    "decibel": "a plain number; write the ratio itself",
    "neper": "a plain number; write the ratio itself",
    "octave": "a plain number; write the ratio itself",
    "byte": "8 bit; plain counts have the unit 1",
}
_LONGEST = 100
_RAISED = "⁰¹²³⁴⁵⁶⁷⁸⁹"
_EXPONENT = r"[+-]?\d{1,2}(?:\.\d{1,2})?"
#: what a unit is made of; pint would drop signs it does not know, and compute a tower of powers of any height
_TOKEN = re.compile(
    rf"\s+|[^\W\d{_RAISED}][^\W{_RAISED}]*|°\w|[%‰](?!\w)|\d{{1,9}}(?:\.\d{{1,9}})?(?:[eE][+-]?\d{{1,2}})?(?![\w.])"
    rf"|[/.·×()](?!/)|\*(?!\*)|(?P<power>(?:\^|\*\*)\s*(?:{_EXPONENT}|\({_EXPONENT}\))(?!\s*[\w.^{_RAISED}]|\s*\*\*)"
    rf"|[⁻⁺]?[{_RAISED}]{{1,2}}(?!\s*[\^{_RAISED}]|\s*\*\*))"
)


class UnitError(ValueError):
    """A unit that cannot be read; the text says why and what to write."""


@dataclass(frozen=True)
class Unit:
    """``si = number * factor + offset``; ``dimension`` is a sorted tuple of (base dimension, exponent)."""

    text: str
    factor: Fraction
    offset: Fraction
    dimension: tuple[tuple[str, Fraction], ...]

    @property
    def dimension_text(self) -> str:
        """The dimension in words for messages, e.g. current length^-1."""
        if not self.dimension:
            return "dimensionless"
        return " ".join(
            f"{name.strip('[]')}" if power == 1 else f"{name.strip('[]')}^{power}" for name, power in self.dimension
        )


@functools.cache
def _registry() -> Any:
    import pint  # slow to import, and only needed once a file is read

    registry: Any = pint.UnitRegistry(non_int_type=Fraction, cache_folder=None)
    registry.define("decade = [decade] = dec")
    return registry


@functools.cache
def parse_unit(text: str) -> Unit:
    """Parse a unit spelling.

    Parameters
    ----------
    text : str
        For example "uA/um", "ohm m^2", "mV/decade", "degC" or "1".

    Raises
    ------
    UnitError
        Unknown symbol, malformed expression, or a symbol that means something else in physics.
    """
    stripped = text.strip()
    if stripped in _DIMENSIONLESS:
        return Unit(stripped or "1", Fraction(1), Fraction(0), ())
    if stripped in _CELSIUS:
        return Unit(stripped, Fraction(1), Fraction(27315, 100), (("[temperature]", Fraction(1)),))
    if stripped in _MISLEADING:
        message = f"{stripped!r} would be read as {_MISLEADING[stripped]}"
        raise UnitError(message)
    if len(stripped) > _LONGEST or not _is_shaped(stripped):
        message = f"{stripped[:_LONGEST]!r} is not a unit"
        raise UnitError(message)
    registry = _registry()
    try:
        unit = registry.parse_units(stripped)
        factor, base = registry.get_base_units(unit)
        dimension = registry.get_dimensionality(base)
    except Exception as error:  # pint raises many kinds; every one means the text is no unit
        message = f"{stripped!r} is not a unit"
        raise UnitError(message) from error
    if any("delta" in str(part) or "degree" in str(part) for part in unit._units):
        message = f"{stripped!r} mixes an offset temperature with other units; write K"
        raise UnitError(message)
    for part in map(str, unit._units):
        for name, reading in _MISREAD.items():
            if name in part:
                message = f"{stripped!r} would be read as {reading}"
                raise UnitError(message)
    return Unit(
        stripped,
        Fraction(factor),
        Fraction(0),
        tuple(sorted((str(name), Fraction(power)) for name, power in dimension.items())),
    )


def _is_shaped(text: str) -> bool:
    """Tell whether a text is made of what units are made of, with plain powers."""
    at, brackets_raised = 0, 0
    while at < len(text):
        token = _TOKEN.match(text, at)
        if token is None:
            return False
        brackets_raised += token["power"] is not None and text[:at].rstrip().endswith(")")
        at = token.end()
    return brackets_raised <= 1


def to_si(number: Decimal | int, unit: Unit) -> float:
    """Convert one number to SI, rounded once.

    Raises
    ------
    OverflowError
        The SI value is beyond float64.
    """
    return float(Fraction(number) * unit.factor + unit.offset)


def from_si(si: float, unit: Unit) -> float:
    """Convert an SI float back for display."""
    return float((Fraction(si) - unit.offset) / unit.factor)


def format_si(si: float, unit_text: str, digits: int = 3) -> str:
    """Print an SI value in the given unit with significant digits, a space and the unit (nothing for 1)."""
    shown = f"{from_si(si, parse_unit(unit_text)):.{digits}g}"
    return shown if unit_text == "1" else f"{shown} {unit_text}"
