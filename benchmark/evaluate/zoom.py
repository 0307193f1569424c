"""Where to look next for the best supply, row by row (layer 6).

A row knows its best permitted supply and the nearest supplies seen on both sides of it; the best one lies between
those. The points of a round stand around an aim:

* a better supply next to the best one is refused: the limit, from a straight line through ln(margin) over the supply;
* the best supply is an end of the range: that end;
* else: the vertex of the parabola through the three.

Margins are close to exponentials, so their aim is sharp: points stand 1/64 and 1/8 of the interval from it. A cost may
have a kink where it is least (a path as long as the clock period), so points stand 1/16 and 1/4 from a vertex. An aim
that holds shrinks the interval 32 or 8 times with five points. Where there is no aim, or the last one did not shrink
the interval to a quarter, the points are spread evenly.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["FIRST_POINTS", "Near", "Seen"]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
#: points of the first round, ends included: nothing is known between the points of a grid
FIRST_POINTS = 9
#: points of every further round, in parts of the interval from the aim, and spread evenly
AT_LIMIT = np.array([-1.0 / 8.0, -1.0 / 64.0, 0.0, 1.0 / 64.0, 1.0 / 8.0])
AT_VERTEX = np.array([-1.0 / 4.0, -1.0 / 16.0, 0.0, 1.0 / 16.0, 1.0 / 4.0])
EVENLY = np.arange(1.0, 6.0) / 6.0
#: points closer than this part of the interval are the same point, which came up twice
APART = 1.0e-6
#: an aim is kept up while it shrinks the interval at least so much
ENOUGH = 0.25


@dataclass(frozen=True)
class Seen:
    """Points that were evaluated, arrays (row, point).

    Supply [V], what is made small (infinite where it has no value), whether the point is permitted, and the margin of
    the conditions (infinite where nobody asked).
    """

    supply: Array
    score: Array
    permitted: Mask
    margin: Array

    def beside(self, other: Seen) -> Seen:
        """Return the points of both."""
        return Seen(
            np.concatenate([self.supply, other.supply], axis=1),
            np.concatenate([self.score, other.score], axis=1),
            np.concatenate([self.permitted, other.permitted], axis=1),
            np.concatenate([self.margin, other.margin], axis=1),
        )

    def take(self, place: NDArray[np.intp]) -> Seen:
        """Return the points at some places, (row, k)."""
        return Seen(
            np.take_along_axis(self.supply, place, axis=1),
            np.take_along_axis(self.score, place, axis=1),
            np.take_along_axis(self.permitted, place, axis=1),
            np.take_along_axis(self.margin, place, axis=1),
        )


@dataclass(frozen=True)
class Near:
    """The nearest point below, the best one, and the nearest above, (row, 3); ``even``: rows without a good aim."""

    seen: Seen
    even: Mask

    @classmethod
    def around(cls, best: Array, value: Array, margin: Array, reach: float, ends: tuple[float, float]) -> Near:
        """Start around the best point of a grid; nothing is known of what lies ``reach`` away.

        All arrays (row,); ``value`` infinite where nothing is permitted.
        """
        low, high = np.maximum(best - reach, ends[0]), np.minimum(best + reach, ends[1])
        unknown = np.full(best.shape, np.nan)
        known = np.isfinite(value)
        seen = Seen(
            np.stack([low, best, high], axis=1),
            np.stack([unknown, value, unknown], axis=1),
            np.stack([~known & known, known, ~known & known], axis=1),
            np.stack([unknown, margin, unknown], axis=1),
        )
        return cls(seen, np.ones(best.shape, dtype=bool))

    def where(self, rows: Mask, other: Near) -> Near:
        """Return ``other`` in some rows, and this in the rest."""
        use, old, new = rows[:, None], self.seen, other.seen
        seen = Seen(
            np.where(use, new.supply, old.supply),
            np.where(use, new.score, old.score),
            np.where(use, new.permitted, old.permitted),
            np.where(use, new.margin, old.margin),
        )
        return Near(seen, np.where(rows, other.even, self.even))

    def rows(self, rows: NDArray[np.intp]) -> Near:
        """Return some rows."""
        seen = self.seen
        some = Seen(seen.supply[rows], seen.score[rows], seen.permitted[rows], seen.margin[rows])
        return Near(some, self.even[rows])

    @property
    def width(self) -> Array:
        """Width of the interval [V] (row,)."""
        return np.asarray(self.seen.supply[:, 2] - self.seen.supply[:, 0])

    @property
    def top(self) -> Array:
        """Upper end of the interval [V] (row,)."""
        return np.asarray(self.seen.supply[:, 2])

    @property
    def at_limit(self) -> Mask:
        """Tell where a neighbour of the best point would be better but is not permitted."""
        return np.asarray(self._refused.any(axis=1))

    @property
    def _refused(self) -> Mask:
        """Which of both neighbours are refused though they would be better, (row, 2); without a value counts too."""
        score, beside = self.seen.score[:, [0, 2]], ~self.seen.permitted[:, [0, 2]]
        return np.asarray(beside & ((score < self.seen.score[:, 1:2]) | np.isposinf(score)))

    def first(self) -> Array:
        """Supplies of the first round, (row, point)."""
        low = self.seen.supply[:, :1]
        return np.asarray(low + self.width[:, None] * np.linspace(0.0, 1.0, FIRST_POINTS))

    def following(self, ends: tuple[float, float]) -> Array:
        """Supplies of a further round, (row, point)."""
        low, high = self.seen.supply[:, :1], self.seen.supply[:, 2:]
        aim = self._aim(ends)[:, None]
        spread = low + (high - low) * EVENLY
        steps = np.where(self.at_limit[:, None], AT_LIMIT, AT_VERTEX)
        aimed = np.clip(aim + (high - low) * steps, low, high)
        return np.where(self.even[:, None] | np.isnan(aim), spread, aimed)

    def _aim(self, ends: tuple[float, float]) -> Array:
        """Where the best supply should lie; nan where that cannot be told."""
        supply, score, margin = self.seen.supply, self.seen.score, self.seen.margin
        refused = self._refused
        side = np.where(refused[:, 0] & ~(refused[:, 1] & (score[:, 2] < score[:, 0])), 0, 2)[:, None]
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            inner, outer = np.log(margin[:, 1]), np.log(np.take_along_axis(margin, side, axis=1)[:, 0])
            away = np.take_along_axis(supply, side, axis=1)[:, 0] - supply[:, 1]
            limit = supply[:, 1] + away * inner / (inner - outer)
            below = (score[:, 1] - score[:, 0]) / (supply[:, 1] - supply[:, 0])
            above = (score[:, 2] - score[:, 1]) / (supply[:, 2] - supply[:, 1])
            bend = (above - below) / (supply[:, 2] - supply[:, 0])
            vertex = 0.5 * (supply[:, 0] + supply[:, 1]) - 0.5 * below / bend
        aim = np.where(refused.any(axis=1), limit, vertex)
        at_end = ~refused.any(axis=1) & ((supply[:, 1] <= ends[0]) | (supply[:, 1] >= ends[1]))
        aim = np.where(at_end, supply[:, 1], aim)
        inside = (aim >= supply[:, 0]) & (aim <= supply[:, 2])
        return np.where(inside, aim, np.nan)

    def narrowed(self, round_: Seen) -> tuple[Near, NDArray[np.intp]]:
        """Return the neighbourhood after a round, and the place of the best point in the round (-1: as before)."""
        together = self.seen.beside(round_)
        cost = np.where(together.permitted, together.score, np.inf)
        cost[:, [0, 2]] = np.inf  # known already, and not better than the best one
        best = np.argmin(cost, axis=1)[:, None]
        best = np.where(np.isfinite(np.take_along_axis(cost, best, axis=1)), best, 1)
        at = np.take_along_axis(together.supply, best, axis=1)
        known, apart = ~np.isnan(together.score), APART * self.width[:, None]
        left = _nearest(known, at - together.supply, apart, best)
        right = _nearest(known, together.supply - at, apart, best)
        seen = together.take(np.concatenate([left, best, right], axis=1))
        made = Near(seen, np.zeros(self.even.shape, dtype=bool))
        even = ~self.even & (made.width > ENOUGH * self.width)
        return Near(seen, even), np.where(best[:, 0] >= 3, best[:, 0] - 3, -1)


def _nearest(known: Mask, distance: Array, apart: Array, best: NDArray[np.intp]) -> NDArray[np.intp]:
    """Return the place of the nearest point at positive distances (row, 1); at an end of the range the best one itself.

    What is not apart is the best point over again; it counts where there is nothing else.
    """
    far = np.where(known & (distance > apart), distance, np.inf)
    close = np.where(known & (distance > 0.0), distance, -np.inf)
    place = np.where(np.isfinite(far).any(axis=1), np.argmin(far, axis=1), np.argmax(close, axis=1))[:, None]
    return np.where(np.isfinite(close).any(axis=1, keepdims=True), place, best)
