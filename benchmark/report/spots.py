"""Places of a drawing that lead to the rows of their numbers (layer 9): where, how large, and what they are called.

A mark is smaller than a finger. Its place grows to ``TARGET`` pixels as far as its neighbours leave room, so that
neither hides the other.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from benchmark.report.placing import Box

__all__ = ["LEAST", "TARGET", "Spot", "Spots"]

#: wished side of a place to touch [pixel of the drawing]; the page shows drawings at 0.83 of their size or larger
TARGET = 30.0
#: least side of a place; marks nearer than this lie on one another
LEAST = 6.0


@dataclass(frozen=True)
class Spot:
    """One place: ``box`` in pixels of the whole drawing, row of the chart's data, words, and another place to lead to.

    Without ``href`` it leads to the row of the data.
    """

    box: Box
    row: int
    name: str
    href: str = ""


@dataclass
class Spots:
    """Collects the places of one chart, given in pixels of its plane, whose corner lies at (``left``, ``top``)."""

    left: float
    top: float
    _marks: list[tuple[float, float, int, str, str]] = field(default_factory=list)
    _bars: list[Spot] = field(default_factory=list)

    def mark(self, x: float, y: float, row: int, name: str, href: str = "") -> None:
        """Add a mark with its middle at a place."""
        self._marks.append((x + self.left, y + self.top, row, name, href))

    def bar(self, box: Box, row: int, name: str, href: str = "") -> None:
        """Add a bar or a band as it is."""
        moved = Box(box.left + self.left, box.top + self.top, box.right + self.left, box.bottom + self.top)
        self._bars.append(Spot(moved, row, name, href))

    def found(self) -> tuple[Spot, ...]:
        """Return bars, then marks, each mark as large as its nearest neighbour allows."""
        places = [(x, y) for x, y, *_ in self._marks]
        grown = []
        for index, (x, y, row, name, href) in enumerate(self._marks):
            half = 0.5 * min(TARGET, max(LEAST, _room(places, index)))
            grown.append(Spot(Box(x - half, y - half, x + half, y + half), row, name, href))
        return (*self._bars, *grown)


def _room(places: Sequence[tuple[float, float]], index: int) -> float:
    """Return the distance to the nearest other place, the larger of both directions (squares touch at that side)."""
    x, y = places[index]
    return min(
        (max(abs(x - a), abs(y - b)) for other, (a, b) in enumerate(places) if other != index),
        default=TARGET,
    )
