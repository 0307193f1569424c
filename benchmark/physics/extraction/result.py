"""What an extraction gives: a number with its uncertainty in parts, or a bound (layer 3).

Uncertainties are standard uncertainties combined as in JCGM 100:2008, "Guide to the expression of uncertainty in
measurement": independent parts add as squares (5.1.2), a quantity known only to lie within +-a has the standard
uncertainty a/sqrt(3) (4.3.7), effective degrees of freedom follow Welch and Satterthwaite (G.4). From memory.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from typing import Literal

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "Accuracy",
    "Array",
    "Bound",
    "CannotExtract",
    "Extracted",
    "Part",
    "Told",
    "combined",
    "half_width",
    "opposite",
]

Array = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
IntArray = NDArray[np.int64]
Bound = Literal["", "at-least", "at-most"]

#: names of the parts of an uncertainty
SCATTER, SPACING, READING, SETTING = "scatter of the points", "spacing of the points", "reading", "setting"
SWEEPS = "difference of the sweeps"


@dataclass(frozen=True)
class Told:
    """A text with numbers in it, one for each ``{}``: all of the abscissa ("x") or all of the readings ("y")."""

    template: str
    axis: Literal["x", "y"]
    numbers: tuple[float, ...]

    def text(self, write: Callable[[str, float], str] | None = None) -> str:
        """Return the text; ``write`` puts an axis and an SI number into words, SI without it."""
        shown = [write(self.axis, one) if write else f"{one:.6g} (SI)" for one in self.numbers]
        return self.template.format(*shown)


def listed(axis: Literal["x", "y"], numbers: Iterable[float], before: str = "") -> Told:
    """Return numbers with commas between them."""
    found = tuple(float(one) for one in numbers)
    return Told(before + ", ".join("{}" for _ in found), axis, found)


class CannotExtract(ValueError):
    """A curve from which a number cannot be read; ``at`` are the places of the points it is about."""

    def __init__(
        self,
        what: str,
        found: str | Told = "",
        allowed: str | Told = "",
        hint: str = "",
        at: Iterable[int] | None = None,
    ) -> None:
        super().__init__(what)
        self.what, self.found, self.allowed, self.hint = what, found, allowed, hint
        self.at = () if at is None else tuple(int(one) for one in at)


@dataclass(frozen=True)
class Part:
    """One part of an uncertainty: its standard uncertainty, and degrees of freedom (inf: stated, not estimated)."""

    name: str
    size: float
    freedom: float = math.inf


@dataclass(frozen=True)
class Accuracy:
    """Stated standard uncertainties: ``reading`` of the measured column, relative [1]; ``setting`` of the abscissa."""

    reading: float = 0.0
    setting: float = 0.0


@dataclass(frozen=True)
class Extracted:
    """A number read off a curve.

    Attributes
    ----------
    value : float
        SI.
    parts : tuple of Part
        What the uncertainty is made of; empty for a bound, of which only the side is known.
    points : int
        Points of the curve that the number rests on.
    span : tuple of float
        Abscissa between which it was read.
    bound : str
        "": a number; "at-least", "at-most": a bound.
    line_x, line_y : array, shape (n,)
        The line to draw over the points.
    used : array of int, shape (points,)
        Places of those points in the arrays handed in.
    remarks : tuple of str
        What a reader must know about the number.
    """

    value: float
    parts: tuple[Part, ...]
    points: int
    span: tuple[float, float]
    bound: Bound = ""
    line_x: Array = field(default_factory=lambda: np.empty(0))
    line_y: Array = field(default_factory=lambda: np.empty(0))
    used: IntArray = field(default_factory=lambda: np.empty(0, dtype=np.int64))
    remarks: tuple[str, ...] = ()

    @property
    def uncertainty(self) -> float | None:
        """Combined standard uncertainty, SI; None for a bound."""
        return None if self.bound else combined(self.parts).size

    @property
    def freedom(self) -> float:
        """Effective degrees of freedom of the uncertainty."""
        return combined(self.parts).freedom


def combined(parts: Iterable[Part], name: str = "") -> Part:
    """Add independent parts as squares; degrees of freedom by Welch and Satterthwaite.

    Parameters
    ----------
    parts : iterable of Part
        Sizes in one unit.
    name : str
        Name of the sum.

    Returns
    -------
    Part
        ``size`` = sqrt(sum u^2); ``freedom`` = u^4 / sum(u_i^4 / nu_i), inf when nothing is estimated.
    """
    sizes = [(float(part.size), float(part.freedom)) for part in parts]
    total = math.hypot(*(size for size, _ in sizes))
    if total == 0.0:
        return Part(name, 0.0, min((freedom for _, freedom in sizes), default=math.inf))
    shares = sum((size / total) ** 4 / freedom for size, freedom in sizes)
    return Part(name, total, math.inf if shares == 0.0 else 1.0 / shares)


def half_width(width: float) -> float:
    """Return the standard uncertainty of a quantity known only to lie within +-``width``: width / sqrt(3)."""
    return abs(width) / math.sqrt(3.0)


def opposite(bound: Bound) -> Bound:
    """Return the bound of a quantity that falls when the bounded one rises."""
    return {"at-least": "at-most", "at-most": "at-least"}.get(bound, "")  # type: ignore[return-value]


def gathered(parts: Iterable[Part], factor: float = 1.0) -> tuple[Part, ...]:
    """Combine parts of the same name, times a factor; parts of size 0 without a claim to freedom are left out."""
    names: dict[str, list[Part]] = {}
    for part in parts:
        names.setdefault(part.name, []).append(part)
    found = [combined(group, name) for name, group in names.items()]
    return tuple(
        Part(one.name, one.size * abs(factor), one.freedom)
        for one in found
        if one.size > 0.0 or math.isfinite(one.freedom)
    )
