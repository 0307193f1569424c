"""Numbers and names as the page and the charts print them (layer 9).

Two significant digits in prose, three or more in tables; a space before the unit; a word where there is no number;
and a rounding never moves a number to the other side of a limit it is judged against.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from typing import Any, TypeGuard

from benchmark.record.shown_units import normalised

__all__ = [
    "amount",
    "flat_powers",
    "is_number",
    "listed",
    "number",
    "plural",
    "policy_name",
    "requirement_name",
    "scaled",
    "spaced",
    "state_word",
    "visible",
    "volts",
]

#: no-break space between number and unit
GAP = "\u00a0"
_SUPERSCRIPTS = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_FLAT = str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "-0123456789")
_PREFIXES = (
    (1e15, "P"),
    (1e12, "T"),
    (1e9, "G"),
    (1e6, "M"),
    (1e3, "k"),
    (1.0, ""),
    (1e-3, "m"),
    (1e-6, "µ"),
    (1e-9, "n"),
    (1e-12, "p"),
    (1e-15, "f"),
    (1e-18, "a"),
    (1e-21, "z"),
    (1e-24, "y"),
)
#: SI unit -> (shown unit, factor, offset): shown = si * factor + offset
_SHOWN = {"K": ("°C", 1.0, -273.15), "m^2": ("µm²", 1e12, 0.0), "W/m^2": ("W/cm²", 1e-4, 0.0)}


def visible(text: str) -> str:
    """Replace characters that cannot be shown or that would turn what stands beside them.

    Control characters, halves of pairs, non-characters, and marks that reverse the direction of writing (with them a
    text of an input could make a number of the report read backwards).
    """
    return _UNSHOWN.sub("\ufffd", text)


def flat_powers(text: str) -> str:
    """Write powers of ten as 1.8e-4: the chart font has no small digits."""

    def flat(match: re.Match[str]) -> str:
        return f"{match[1] or '1'}e{match[2].translate(_FLAT)}"

    return re.sub("(?:([0-9.]+)×)?10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)", flat, text)


_UNSHOWN = re.compile(
    "[\x00-\x08\x0b-\x1f\x7f-\x9f\u061c\u200e\u200f\u202a-\u202e\u2066-\u2069\ud800-\udfff\ufdd0-\ufdef\ufffe\uffff]"
)


def is_number(value: object) -> TypeGuard[float]:
    """Tell whether a record value is a finite number (not a word, not None, not a truth value)."""
    return isinstance(value, (int, float)) and not isinstance(value, bool) and math.isfinite(value)


def _rounded(value: float, digits: int) -> str:
    """Plain decimal notation where it is short, powers of ten elsewhere."""
    text = f"{value:.{digits - 1}e}"
    mantissa, exponent = text.split("e")
    power = int(exponent)
    if value == 0.0:
        return "0"
    if -4 < power < max(5, digits):
        decimals = max(0, digits - 1 - power)
        shown = f"{float(text):.{decimals}f}"
        shown = shown.rstrip("0").rstrip(".") if "." in shown else shown
        return shown.replace("-", "−")
    mantissa = mantissa.rstrip("0").rstrip(".") if "." in mantissa else mantissa
    head = "" if mantissa == "1" else f"{mantissa}×"
    return f"{head}10{str(power).translate(_SUPERSCRIPTS)}".replace("-", "−")


def _parsed(shown: float, digits: int) -> float:
    return float(f"{shown:.{digits - 1}e}")


def number(value: Any, digits: int = 2, beside: Iterable[float] = ()) -> str:
    """Print a plain number.

    Parameters
    ----------
    value : float, str or None
        Words pass through; None is "not stated".
    digits : int
        Significant digits.
    beside : iterable of float
        Limits the number is judged against: digits are added until rounding does not cross any of them.
    """
    if value is None:
        return "not stated"
    if not is_number(value):
        return str(value)
    wanted = digits
    for limit in beside:
        while wanted < 17 and _side(_parsed(value, wanted), limit) != _side(value, limit):
            wanted += 1
    return _rounded(value, wanted)


def _side(value: float, limit: float) -> int:
    return (value > limit) - (value < limit)


def scaled(value: float, unit: str) -> tuple[float, str]:
    """Return number and unit with a prefix, for example 2.5e-13 J -> (250.0, "fJ")."""
    if (symbol := normalised(unit)) is not None:
        return value, symbol
    if unit in _SHOWN:
        shown, factor, offset = _SHOWN[unit]
        return value * factor + offset, shown
    if unit == "1" or value == 0.0 or "/" in unit or "^" in unit:
        return value, "" if unit == "1" else unit
    size = abs(value)
    factor, prefix = next(((f, p) for f, p in _PREFIXES if size >= f * 0.99995), _PREFIXES[-1])
    return value / factor, prefix + unit


def amount(value: Any, unit: str, digits: int = 2, beside: Iterable[float] = ()) -> str:
    """Print an SI number with prefix and unit; words and None as words."""
    if not is_number(value):
        return number(value)
    if unit == "K":
        digits = max(digits, 3)
    shown, shown_unit = scaled(value, unit)
    limits = [limit * (shown / value) for limit in beside] if value and unit not in ("K",) else []
    text = number(shown, digits, limits)
    return f"{text}{GAP}{shown_unit}" if shown_unit else text


def spaced(value: Any, unit: str, digits: int = 3) -> str:
    """Print a number that is already in its unit (a ledger entry)."""
    text = number(value, digits)
    return text if unit == "1" or not is_number(value) else f"{text}{GAP}{unit}"


def listed(items: Iterable[str], last: str = "and") -> str:
    """Join words: "a, b and c"."""
    words = list(items)
    if len(words) < 2:
        return "".join(words)
    return f"{', '.join(words[:-1])} {last} {words[-1]}"


def plural(count: int, one: str, many: str = "") -> str:
    """Return "1 input", "3 inputs", "no inputs"."""
    return f"{count or 'no'} {one if count == 1 else (many or one + 's')}"


def requirement_name(name: str) -> str:
    """Turn a catalogue name into words."""
    return name.replace("_", " ")


_POLICIES = {
    "declared-point": "declared point",
    "minimum-energy": "minimum energy",
    "minimum-energy-delay": "minimum energy × delay",
    "same-supply": "same supply",
}


def policy_name(name: str) -> str:
    """Say a policy in words."""
    return _POLICIES.get(name, name)


def volts(value: Any, digits: int = 2) -> str:
    """Print a supply in volt, without prefix from 10 mV up: 0.35 V."""
    if is_number(value) and abs(value) >= 0.01 and normalised("V") is None:
        return f"{number(value, digits)}{GAP}V"
    return amount(value, "V", digits)


def state_word(feasible: bool) -> str:
    """Return the word for a point."""
    return "feasible" if feasible else "infeasible"
