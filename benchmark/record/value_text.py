"""Values of a set in words, for terminals and notebooks (layer 8)."""

from __future__ import annotations

import math
from fractions import Fraction

from benchmark.catalogue import Quantity
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.values import NORMAL_95, Spread, Value
from benchmark.units import from_si, parse_unit

__all__ = ["amount", "each_number", "number", "spread_text", "usual_range", "valid_text"]


def number(value: float, digits: int = 6) -> str:
    """Print a number with significant digits."""
    return f"{value:.{digits}g}"


def amount(value: float, unit: str) -> str:
    """Print a number with its unit; a plain number has none."""
    return number(value) if unit == "1" else f"{number(value)} {unit}"


def usual_range(quantity: Quantity) -> str:
    """Say the usual range of a catalogue entry."""
    return f"{quantity.low:g} to {quantity.high:g} {quantity.unit}".removesuffix(" 1")


def each_number(value: Value) -> list[str]:
    """Print the number of every node in order, in the unit of the file; one number holds for all nodes."""
    return [number(value.in_unit(float(si))) for si in value.si]


def spread_text(value: Value) -> str:
    """Say a spread in words, in the unit of the file."""
    spread = value.spread
    if spread is None:
        return "no range stated"
    if spread.shape == "normal":
        return f"normal, standard deviation {_deviation(value, spread)}"
    if spread.shape == "lognormal" and spread.scale is not None:
        factor = math.exp(NORMAL_95 * float(spread.scale[0]))
        return f"lognormal, central 95 % within a factor {number(factor, 4)}"
    low, high = value.in_unit(float(spread.low[0])), value.in_unit(float(spread.high[0]))
    return f"{spread.shape}, {number(low)} to {number(high)} {value.unit}".removesuffix(" 1")


def _deviation(value: Value, spread: Spread) -> str:
    factor = parse_unit(value.unit).factor
    scales = [] if spread.scale is None else [float(Fraction(float(scale)) / factor) for scale in spread.scale]
    return f"{' / '.join(number(scale, 4) for scale in scales)} {value.unit}".removesuffix(" 1")


def valid_text(item: ParameterSet) -> str:
    """Say where a set may be used."""
    parts = []
    if "supply" in item.valid:
        parts.append("supply {} to {} V".format(*(number(bound) for bound in item.valid["supply"])))
    if "temperature" in item.valid:
        low, high = (round(from_si(bound, parse_unit("degC")), 9) + 0.0 for bound in item.valid["temperature"])
        parts.append(f"temperature {number(low)} to {number(high)} degC")
    return ", ".join(parts) or "no range stated"
