"""Where to write labels (layer 9): a greedy search for free room, in pixels, with a fixed order and no chance.

Labels stand beside what they name, so charts need no legend. Text widths are estimated for the font the charts name;
the estimate is on the wide side.
"""

from __future__ import annotations

import itertools
import math
import re
import textwrap
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field

__all__ = ["Box", "Placed", "Placer", "cut", "fitted", "hatch", "text_width", "wrapped"]

LINE_HEIGHT = 13.0
#: advance widths of Liberation Sans in thousandths of the size, by group (metric-compatible with Arial)
_WIDTHS = {
    **dict.fromkeys("ijl'", 222),
    **dict.fromkeys(" ,.:;/!|I[]\\tf\u00a0\u202f", 278),
    **dict.fromkeys("r()-`", 333),
    **dict.fromkeys("ckvxyzsJ", 500),
    **dict.fromkeys("FTZ", 611),
    **dict.fromkeys("ABEKPSVXY&", 667),
    **dict.fromkeys("CDHNRUw", 722),
    **dict.fromkeys("GOQ", 778),
    **dict.fromkeys("mM", 833),
    **dict.fromkeys("%", 889),
    **dict.fromkeys("W", 944),
    **dict.fromkeys("@—…", 1015),
    **dict.fromkeys("⁻⁰¹²³⁴⁵⁶⁷⁸⁹°", 400),
}


def text_width(text: str, size: float = 11.0, *, bold: bool = False) -> float:
    """Estimate the width of one line in pixels; unknown characters count as wide as a digit, others 1.3 times that."""
    units = sum(_WIDTHS.get(char, 556 if char.isascii() or char in "µΩ−×÷≤≥" else 760) for char in text)
    return units * size / 1000.0 * (1.08 if bold else 1.02)


def wrapped(text: str, columns: int, lines: int = 3) -> list[str]:
    """Break text into short lines; what does not fit ends in an ellipsis (the tables have it whole)."""
    clean = re.sub(r"[\s\x00-\x1f]+", lambda gap: "\u00a0" if "\u00a0" in gap[0] else " ", text).strip()
    found = textwrap.wrap(
        clean, columns, break_long_words=True, break_on_hyphens=True, max_lines=lines, placeholder="…"
    )
    return found or [""]


def fitted(text: str, room: float, lines: int = 1, *, bold: bool = False) -> list[str]:
    """Break text into lines that fit ``room`` pixels; what does not fit ends in an ellipsis."""
    for columns in range(max(4, int(room / 3.0)), 3, -1):
        found = wrapped(text, columns, lines)
        if all(text_width(line, bold=bold) <= room for line in found):
            return found
    return ["…"]


def cut(text: str, room: float, *, bold: bool = False) -> str:
    """Return one line cut to ``room`` pixels, within a word if need be; what is cut ends in an ellipsis."""
    clean = re.sub(r"[\s\x00-\x1f]+", " ", text).strip()
    if text_width(clean, bold=bold) <= room:
        return clean
    while clean and text_width(clean + "…", bold=bold) > room:
        clean = clean[:-1]
    return clean + "…"


@dataclass(frozen=True)
class Box:
    """A rectangle in pixels."""

    left: float
    top: float
    right: float
    bottom: float

    def overlap(self, other: Box) -> float:
        """Return the shared area."""
        width = min(self.right, other.right) - max(self.left, other.left)
        height = min(self.bottom, other.bottom) - max(self.top, other.top)
        return width * height if width > 0.0 and height > 0.0 else 0.0

    def holds(self, x: float, y: float, slack: float = 2.0) -> bool:
        """Tell whether a point lies inside, with a little room."""
        return self.left - slack <= x <= self.right + slack and self.top - slack <= y <= self.bottom + slack


@dataclass(frozen=True)
class Placed:
    """A label with its box, the point it names, and whether a leader line is needed."""

    lines: tuple[str, ...]
    box: Box
    x: float
    y: float
    leader: bool

    @property
    def anchor(self) -> tuple[float, float]:
        """Where the leader meets the label."""
        return (
            min(max(self.x, self.box.left), self.box.right),
            min(max(self.y, self.box.top), self.box.bottom),
        )

    @property
    def align(self) -> str:
        """Left of its point a label ends there, elsewhere it begins there."""
        return "right" if self.box.right < self.x else "left"


_CELL = 24.0
#: directions tried, in order of preference
_DIRECTIONS = tuple(
    (math.cos(math.radians(a)), math.sin(math.radians(a))) for a in (-45, 45, -135, 135, 0, 180, -90, 90)
)


@dataclass
class Placer:
    """Free room inside ``area``; boxes are kept clear, points are avoided."""

    area: Box
    boxes: list[Box] = field(default_factory=list)
    cells: dict[tuple[int, int], list[tuple[float, float]]] = field(default_factory=dict)

    def avoid_point(self, x: float, y: float) -> None:
        """Keep labels off one point."""
        self.cells.setdefault((int(x // _CELL), int(y // _CELL)), []).append((x, y))

    def _crowd(self, box: Box) -> int:
        """Count the points under a box, looking only at the cells it touches."""
        return sum(
            box.holds(x, y)
            for i in range(int((box.left - 2.0) // _CELL), int((box.right + 2.0) // _CELL) + 1)
            for j in range(int((box.top - 2.0) // _CELL), int((box.bottom + 2.0) // _CELL) + 1)
            for x, y in self.cells.get((i, j), ())
        )

    def avoid_line(self, path: Sequence[tuple[float, float]], spacing: float = 4.0) -> None:
        """Keep labels off a polyline."""
        for (x0, y0), (x1, y1) in itertools.pairwise(path):
            steps = max(1, min(400, math.ceil(math.hypot(x1 - x0, y1 - y0) / spacing)))
            for step in range(steps + 1):
                share = step / steps
                self.avoid_point(x0 + share * (x1 - x0), y0 + share * (y1 - y0))
        if len(path) == 1:
            self.avoid_point(*path[0])

    def avoid_mark(self, x: float, y: float, radius: float = 6.0) -> None:
        """Keep labels off a mark."""
        self.boxes.append(Box(x - radius, y - radius, x + radius, y + radius))

    def _cost(self, box: Box) -> float:
        outside = (
            max(0.0, self.area.left - box.left)
            + max(0.0, box.right - self.area.right)
            + max(0.0, self.area.top - box.top)
            + max(0.0, box.bottom - self.area.bottom)
        )
        return 60.0 * outside + 4.0 * sum(box.overlap(other) for other in self.boxes) + 8.0 * self._crowd(box)

    def place(
        self,
        lines: Sequence[str],
        at: Iterable[tuple[float, float]],
        *,
        distances: Sequence[float] = (7.0, 12.0, 22.0, 36.0, 54.0, 76.0, 100.0),
        most: float = math.inf,
        size: float = 11.0,
        bold: bool = False,
    ) -> Placed | None:
        """Write ``lines`` beside the best of the points ``at``; None when the best place costs more than ``most``."""
        width = max(text_width(line, size, bold=bold) for line in lines) + 2.0
        height = LINE_HEIGHT * len(lines)
        best: tuple[float, Placed] | None = None
        for x, y in at:
            for reach in distances:
                for cosine, sine in _DIRECTIONS:
                    left = x + reach * cosine - width * 0.5 * (1.0 - cosine)
                    top = y + reach * sine - height * 0.5 * (1.0 - sine)
                    box = Box(left, top, left + width, top + height)
                    cost = self._cost(box) + 0.25 * reach
                    if best is None or cost < best[0] - 1e-9:
                        best = cost, Placed(tuple(lines), box, x, y, reach > 16.0)
        if best is None or best[0] > most:
            return None
        self.boxes.append(best[1].box)
        return best[1]


def hatch(box: Box, spacing: float = 9.0) -> list[tuple[float, float, float, float]]:
    """Return diagonal lines that fill a rectangle, as x0, y0, x1, y1 in pixels."""
    lines = []
    width, height = box.right - box.left, box.bottom - box.top
    offset = spacing
    while offset < width + height:
        x0, y0 = box.left + min(offset, width), box.top + max(0.0, offset - width)
        x1, y1 = box.left + max(0.0, offset - height), box.top + min(offset, height)
        lines.append((x0, y0, x1, y1))
        offset += spacing
    return lines
