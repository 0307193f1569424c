"""One look for every chart (layer 9): palette, fonts, fixed style per technology, axes with known geometry.

All charts have fixed width, height and padding, so a data point's place in pixels is known here and labels can be
placed without a browser. Colours have at least 3:1 contrast on white for lines and marks and 4.5:1 for text, and are
never the only code: every series also has its own dash or marker and is named in words beside it.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from benchmark.report.words import is_number, number, scaled

__all__ = [
    "FONT",
    "GREY",
    "INK",
    "LinearAxis",
    "LogAxis",
    "Look",
    "Row",
    "looks",
    "positive",
    "spec",
]

Row = dict[str, Any]

FONT = "Liberation Sans, Arial, Helvetica, sans-serif"
INK = "#1a1a1a"
GREY = "#767676"
PALE = "#e4e4e4"
TEXT_SIZE = 11

#: line and mark colour, text colour of the same hue (contrast on white in brackets)
_COLOURS = (
    ("#0072B2", "#005A8D"),  # blue (5.2, 7.3): the candidate, always
    ("#D55E00", "#A34800"),  # vermillion (3.9, 6.1)
    ("#000000", "#1a1a1a"),  # black
    ("#009E73", "#00694D"),  # green (3.4, 6.7)
    ("#A0508C", "#84366F"),  # purple (5.1, 7.6)
)
_DASHES: tuple[tuple[int, ...], ...] = ((), (14, 3), (9, 3, 2, 3), (20, 3, 3, 3))
_MARKERS = ("square", "triangle-up", "diamond", "triangle-down", "cross", "triangle-right", "triangle-left")


@dataclass(frozen=True)
class Look:
    """How one technology is drawn in every chart."""

    colour: str
    ink: str
    dash: tuple[int, ...]
    marker: str
    width: float


def looks(record: Mapping[str, Any]) -> dict[str, Look]:
    """Return side id -> style: the candidate first, contenders in the order of the study.

    A contender may carry the same id as the candidate (self-comparison), so keys are "role id".
    """
    found: dict[str, Look] = {}
    position = 0
    for side in record["sides"]:
        key = f"{side['role']} {side['id']}"
        if side["role"] == "candidate":
            found[key] = Look(*_COLOURS[0], (), "circle", 2.6)
            continue
        colour = _COLOURS[1 + position % (len(_COLOURS) - 1)]
        dash = _DASHES[(position // (len(_COLOURS) - 1)) % len(_DASHES)]
        found[key] = Look(*colour, dash, _MARKERS[position % len(_MARKERS)], 1.3)
        position += 1
    return found


def positive(rows: Sequence[Row], *fields: str) -> tuple[list[Row], int]:
    """Keep rows whose fields are numbers above zero; return them and how many were dropped (log axes)."""
    kept = [row for row in rows if all(is_number(row[field]) and row[field] > 0.0 for field in fields)]
    return kept, len(rows) - len(kept)


@dataclass(frozen=True)
class LogAxis:
    """A logarithmic axis of known length, from ``low`` to ``high`` over ``size`` pixels."""

    low: float
    high: float
    size: float
    unit: str
    title: str
    vertical: bool = False

    @classmethod
    def around(
        cls, values: Sequence[float], size: float, unit: str, title: str, *, vertical: bool = False, room: float = 0.06
    ) -> LogAxis:
        """Fit an axis around positive values, with a margin of ``room`` of its length and at least half a decade."""
        low, high = math.log10(min(values)), math.log10(max(values))
        if high - low < 0.5:
            middle = 0.5 * (low + high)
            low, high = middle - 0.25, middle + 0.25
        margin = room * (high - low)
        return cls(10.0 ** (low - margin), 10.0 ** (high + margin), size, unit, title, vertical)

    def pixel(self, value: float) -> float:
        """Pixels from the left, or from the top."""
        share = math.log(value / self.low) / math.log(self.high / self.low)
        return self.size * (1.0 - share if self.vertical else share)

    def value(self, pixel: float) -> float:
        """Return the inverse of ``pixel``; outside the axis too."""
        share = pixel / self.size
        share = 1.0 - share if self.vertical else share
        return float(self.low * math.exp(share * math.log(self.high / self.low)))

    def holds(self, value: float) -> bool:
        """Tell whether a value lies on the axis."""
        return self.low <= value <= self.high

    def ticks(self) -> tuple[list[float], list[float]]:
        """Return labelled and unlabelled ticks: decades with 2..9 between them; 1-2-5 when decades are few."""
        first, last = math.floor(math.log10(self.low)), math.ceil(math.log10(self.high))
        decades = [float(f"1e{k}") for k in range(first, last + 1)]
        inside = [tick for tick in decades if self.holds(tick)]
        minor = [m * tick for tick in decades for m in range(2, 10)]
        minor = [float(f"{tick:.6g}") for tick in minor if self.holds(tick)]
        if len(inside) < 3:
            steps = (1, 2, 5) if last - first > 1 else (1, 2, 3, 5, 7)
            major = [float(f"{m * tick:.6g}") for tick in decades for m in steps]
            major = [tick for tick in major if self.holds(tick)]
            return major, [tick for tick in minor if tick not in major]
        room = 26.0 if self.vertical else 46.0
        stride = max(1, math.ceil(room / (self.size / math.log10(self.high / self.low))))
        major = [tick for tick in inside if round(math.log10(tick)) % stride == 0]
        minor = sorted({*minor, *inside} - set(major)) if stride == 1 else sorted(set(inside) - set(major))
        return major, minor

    def axis(self) -> Row:
        """Return the axis of the specification: labels in words made here, never from data."""
        major, minor = self.ticks()
        labels = [self.label(tick) for tick in major]
        return {
            "title": self.title,
            "values": sorted([*major, *minor]),
            "labelExpr": f"indexof({major!r}, datum.value) < 0 ? '' : {labels!r}[indexof({major!r}, datum.value)]",
            "tickSize": {"condition": {"test": f"indexof({major!r}, datum.value) < 0", "value": 3}, "value": 7},
            "gridOpacity": {"condition": {"test": f"indexof({major!r}, datum.value) < 0", "value": 0}, "value": 1},
            "labelOverlap": False,
        }

    def label(self, tick: float) -> str:
        """Name one tick."""
        if self.unit == "1":
            return number(tick, 1)
        shown, unit = scaled(tick, self.unit)
        return f"{number(shown, 1)} {unit}"

    def scale(self) -> Row:
        """Return the scale of the specification."""
        return {"type": "log", "domain": [self.low, self.high], "nice": False, "clamp": False}

    def encode(self, field: str, *, axis: bool = False) -> Row:
        """Return the channel definition for a field on this axis."""
        return {
            "field": field,
            "type": "quantitative",
            "scale": self.scale(),
            "axis": self.axis() if axis else None,
        }


@dataclass(frozen=True)
class LinearAxis:
    """A linear axis of known length; with ``ticks`` it is drawn, without it is only room to place things."""

    low: float
    high: float
    size: float
    title: str = ""
    ticks: tuple[tuple[float, str], ...] = ()
    vertical: bool = False
    title_gap: float = 8.0

    def pixel(self, value: float) -> float:
        """Pixels from the left, or from the top."""
        share = (value - self.low) / (self.high - self.low)
        return self.size * (1.0 - share if self.vertical else share)

    def value(self, pixel: float) -> float:
        """Return the inverse of ``pixel``."""
        share = pixel / self.size
        return self.low + (self.high - self.low) * (1.0 - share if self.vertical else share)

    def axis(self) -> Row | None:
        """Return the axis of the specification, or None."""
        if not self.ticks:
            return None
        values, labels = [value for value, _ in self.ticks], [text for _, text in self.ticks]
        return {
            "title": self.title,
            "values": values,
            "labelExpr": f"{labels!r}[indexof({values!r}, datum.value)]",
            "titlePadding": self.title_gap,
            "labelOverlap": False,
        }

    def encode(self, field: str, *, axis: bool = False) -> Row:
        """Return the channel definition for a field on this axis."""
        scale = {"type": "linear", "domain": [self.low, self.high], "nice": False, "zero": False}
        return {"field": field, "type": "quantitative", "scale": scale, "axis": self.axis() if axis else None}


def spec(layers: Sequence[Row], width: float, height: float, padding: tuple[float, float, float, float]) -> Row:
    """Return a complete specification; ``padding`` is left, top, right, bottom.

    No title inside the figure: the caption says it. Nothing is interactive and no text is a link.
    """
    import altair

    left, top, right, bottom = padding
    return {
        "$schema": altair.SCHEMA_URL,
        "width": width,
        "height": height,
        "autosize": {"type": "none"},
        "padding": {"left": left, "top": top, "right": right, "bottom": bottom},
        "background": "white",
        "layer": list(layers),
        "resolve": {"axis": {"x": "independent", "y": "independent"}},
        "config": {
            "aria": False,
            "font": FONT,
            "view": {"stroke": "#8a8a8a", "strokeWidth": 0.8},
            "axis": {
                "labelFontSize": TEXT_SIZE,
                "titleFontSize": 12,
                "titleFontWeight": "normal",
                "labelColor": INK,
                "titleColor": INK,
                "tickColor": "#6b6b6b",
                "domainColor": "#6b6b6b",
                "domainWidth": 0.8,
                "tickWidth": 0.8,
                "gridColor": PALE,
                "gridWidth": 0.8,
                "titlePadding": 8,
            },
            "text": {"font": FONT, "color": INK},
            "legend": {"disable": True},
        },
    }
