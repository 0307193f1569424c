"""What a link between stated values is, and how it is judged (layer 4)."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from benchmark.devices.record import Array, BoolArray

__all__ = ["Judged", "Link", "judged"]

#: deviation that is rounding of the numbers of a file
ROUNDING = 1.0e-9
Values = Mapping[str, Array]


@dataclass(frozen=True)
class Link:
    """Two sides that stated values give for the same thing, or for a thing and its bound.

    ``kind``: ``equal`` (the left side is stated, the right one follows from the others; the deviation is right over
    left minus 1) or ``at most`` (the left side must not exceed the right; the deviation is left over right minus 1).
    ``warned``, ``refused``: deviations beyond which the link is warned about, and beyond which the values contradict
    each other or physics; None: never. ``place``: the value the finding is written at; ``names``: all values the sides
    are made of; ``when``: options with the words under which the link holds. ``unit``: of both sides.
    """

    name: str
    formula: str
    place: str
    names: tuple[str, ...]
    left: Callable[[Values], Array]
    right: Callable[[Values], Array]
    unit: str
    kind: Literal["equal", "at most"]
    warned: float | None
    refused: float | None
    source: str
    hint: str = ""
    when: Mapping[str, tuple[str, ...]] | None = None

    def applies(self, values: Values, options: Mapping[str, str]) -> bool:
        """Tell whether all its values are stated, under options for which it holds."""
        if any(options.get(name) not in words for name, words in (self.when or {}).items()):
            return False
        return all(name in values for name in self.names)


@dataclass(frozen=True)
class Judged:
    """A link with its numbers, arrays of one shape (by node): sides [SI], deviation [1], what it is for each."""

    link: Link
    left: Array
    right: Array
    deviation: Array
    warned: BoolArray
    refused: BoolArray


def judged(links: Sequence[Link], values: Values, options: Mapping[str, str]) -> tuple[Judged, ...]:
    """Judge every link that applies.

    Parameters
    ----------
    links : sequence of Link
    values : mapping
        Stated values [SI], arrays that broadcast against each other, such as one entry per node.
    options : mapping
        Options of the model.

    Returns
    -------
    tuple of Judged
    """
    return tuple(_judge(link, values) for link in links if link.applies(values, options))


def _judge(link: Link, values: Values) -> Judged:
    with np.errstate(all="ignore"):  # numbers far out of any range: what is not finite does not fit
        left, right = np.broadcast_arrays(
            np.asarray(link.left(values), dtype=np.float64), np.asarray(link.right(values), dtype=np.float64)
        )
        above, below = (right, left) if link.kind == "equal" else (left, right)
        deviation = np.asarray(np.where(above == below, 0.0, above / below - 1.0))
    size = np.abs(deviation) if link.kind == "equal" else deviation
    size = np.where(np.isnan(size), np.inf, size)

    def beyond(limit: float | None) -> BoolArray:
        return np.asarray(np.zeros(size.shape, dtype=bool) if limit is None else size > max(limit, ROUNDING))

    refused = beyond(link.refused)
    return Judged(link, left, right, deviation, np.asarray(beyond(link.warned) & ~refused), refused)
