"""The smallest set of inputs that, moved together inside their ranges, changes the side of the required advantage (7).

Every input with a range counts: a stated spread, or the open side of a bound. First each is moved alone to both ends of
its range. When one of them changes the side, sets of one are the answer. Otherwise all pairs of ends are evaluated, and
on request all triples; both sides of the comparison are optimised anew every time. What is exact is said with the
answer: ends of ranges and the straight lines to them are looked at, not every point inside.

An input without any effect at either end alone is left out of the larger sets. Where more than ``EXHAUSTIVE``
combinations of ends are left, those whose effects alone, added in ln(advantage), come to less than a third of the
distance to the level are left out too, and their number is said. How implausible a set is: the root of the sum of the
squared distances from the best estimates, in standard deviations of the stated spreads, at the nearest point found that
changes the side. That point is solved for every combination of ends that changes the side: the order of the points at
the ends is another one. Only where there are more than ``MOST_SOLVED`` combinations are those left that look furthest
on a straight line in ln(advantage), and their number is said.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.axes import Axis, deviations, known_axes
from benchmark.decide.break_even import NO_EFFECT
from benchmark.decide.moves import range_of
from benchmark.decide.profile import shares_on_side
from benchmark.decide.trials import Trials
from benchmark.errors import UsageError

__all__ = ["FLIP_COLUMNS", "Flip", "FlippingSets", "flip_rows", "flipping_sets"]

Array = NDArray[np.float64]
#: rows evaluated for one size of set, at most; more would take hours
MOST_ROWS = 20_000
#: combinations of ends up to which every one is evaluated
EXHAUSTIVE = 1_000
#: effects together may be this many times the sum of the effects alone before a set is missed
TOGETHER = 3.0
#: directions tried for each set that changes the side: shares of the way to the end of each input but one
DIRECTIONS = (0.25, 0.5, 0.75, 1.0)
#: tolerance of the share of the way along a direction
TOLERANCE = 1.0e-7
#: combinations of ends whose nearest point is solved, at most
MOST_SOLVED = 400
#: sets that are listed, of those solved
LISTED = 5
FLIP_COLUMNS = (
    "set",
    "inputs",
    "implausibility",
    "name",
    "unit",
    "today",
    "moved_to",
    "standard_deviations",
    "evidence",
)


@dataclass(frozen=True)
class Flip:
    """Inputs moved together to the nearest point found on the other side.

    ``implausibility``: distance in standard deviations; ``values`` in SI, ``distances`` in standard deviations.
    """

    axes: tuple[Axis, ...]
    values: tuple[float, ...]
    distances: tuple[float, ...]
    implausibility: float
    advantage: float


@dataclass(frozen=True)
class FlippingSets:
    """The sets of the smallest size, the least implausible first; none when ``flips`` is empty.

    ``up_to``: sizes looked at; ``inputs``: inputs with a range; ``left_out``: names without effect alone; ``pruned``:
    combinations that were not evaluated because their effects alone are far too small; ``sets``: sets of inputs that
    change the side, listed or not; ``unsolved``: combinations of ends that do, whose nearest point was not solved.
    """

    level: float
    today: float
    flips: tuple[Flip, ...]
    up_to: int
    inputs: int
    left_out: tuple[str, ...]
    pruned: int = 0
    sets: int = 0
    unsolved: int = 0

    @property
    def text(self) -> str:
        """Say the answer in one sentence."""
        side = "reached" if self.today >= self.level else "missed"
        head = f"advantage {self.level:.4g} is {side} today ({self.today:.4g})"
        if not self.flips:
            word = {1: "single input", 2: "pair of inputs", 3: "triple of inputs"}[self.up_to]
            idle = f"; {len(self.left_out)} without effect alone" if self.left_out else ""
            if self.pruned:
                idle += f"; {self.pruned} combinations whose effects alone add up to less than a third of it left out"
            return f"{head}: no {word} changes that inside the {self.inputs} ranges (their ends were tried{idle})"
        best = self.flips[0]
        moved = " and ".join(
            f"{axis.name} at {axis.text(value)} ({distance:+.3g} standard deviations)"
            for axis, value, distance in zip(best.axes, best.values, best.distances, strict=True)
        )
        size = len(best.axes)
        word = {1: "one input", 2: "two inputs", 3: "three inputs"}[size]
        change = "alone changes" if size == 1 else "together change"
        many = f", the least implausible of {self.sets} such sets" if self.sets > 1 else ""
        many += f" ({len(self.flips)} listed)" if self.sets > len(self.flips) else ""
        rest = f"; nearest points of {self.unsolved} further combinations of ends not solved" if self.unsolved else ""
        return f"{head}: {word} {change} that{many}: {moved}{rest}"


#: inputs, and the ends they are moved to
_Set = tuple[tuple[Axis, ...], tuple[float, ...]]


def _on_other_side(
    trials: Trials, moved: Sequence[Mapping[str, float]], level: float, reached: bool
) -> tuple[NDArray[np.bool_], Array]:
    """Tell which trials lie on the other side of the level; an input that makes a side infeasible does not reach it."""
    answers = trials(moved)
    counted = np.where(answers.meets, answers.advantage, np.nan)
    return (counted >= level) != reached, counted


def flipping_sets(trials: Trials, level: float, up_to: int = 2) -> FlippingSets:
    """Find the smallest sets of inputs that change the side of a level.

    Parameters
    ----------
    trials : Trials
    level : float
        Advantage, usually the required one. Where a listed requirement is missed it does not count as reached.
    up_to : int
        Largest size of a set that is looked for: 1, 2 or 3.

    Raises
    ------
    UsageError
        When ``up_to`` is another number, or a size would need more rows than can be evaluated.
    """
    if up_to not in (1, 2, 3):
        message = f"sets of 1, 2 or 3 inputs can be looked for, found {up_to}"
        raise UsageError(message)
    axes = [axis for axis in known_axes(trials).values() if _ends(axis) is not None]
    today = float(trials.best.advantage[0]) if trials.best.meets[0] else float("nan")
    reached = bool(today >= level)
    ends = {axis: tuple(end for end in _ends(axis) or () if end != axis.best) for axis in axes}
    single: list[_Set] = [((axis,), (end,)) for axis in axes for end in ends[axis]]
    if not single:
        return FlippingSets(level, float(trials.best.advantage[0]), (), up_to, 0, ())
    other, counted = _on_other_side(trials, [_trial(*item) for item in single], level, reached)
    same = np.abs(counted / today - 1.0) <= NO_EFFECT if np.isfinite(today) else np.isnan(counted)
    idle = {axis for axis in axes if all(same[k] for k, item in enumerate(single) if item[0][0] is axis)}
    left_out = tuple(axis.name for axis in axes if axis in idle)
    found = [(item, float(end)) for item, flips, end in zip(single, other, counted, strict=True) if flips]
    # effect of each end alone in ln(advantage) towards the level; what is not a number there may do anything
    with np.errstate(divide="ignore", invalid="ignore"):
        towards = (np.log(counted) - math.log(today)) * (-1.0 if reached else 1.0) if today > 0.0 else counted
    effects = {item: float(effect) for item, effect in zip(single, np.nan_to_num(towards, nan=np.inf), strict=True)}
    size, pruned = 1, 0
    active = [axis for axis in axes if axis not in idle]
    while not found and size < up_to:
        size += 1
        moved = [
            (chosen, values)
            for chosen in itertools.combinations(active, size)
            for values in itertools.product(*(ends[axis] for axis in chosen))
        ]
        if not moved:
            break
        if len(moved) > EXHAUSTIVE and np.isfinite(today):
            kept = [item for item in moved if _could(item, effects, abs(math.log(level / today)))]
            pruned += len(moved) - len(kept)
            moved = kept
        if not moved:
            continue
        if len(moved) > MOST_ROWS:
            message = f"sets of {size} of {len(active)} inputs need {len(moved)} comparisons; at most {MOST_ROWS}"
            raise UsageError(message)
        other, counted = _on_other_side(trials, [_trial(*item) for item in moved], level, reached)
        found = [(item, float(end)) for item, flips, end in zip(moved, other, counted, strict=True) if flips]
    if len(found) > MOST_SOLVED:
        found.sort(key=lambda pair: _straight(pair[0], pair[1], today, level))
    flips = _nearest(trials, [item for item, _ in found[:MOST_SOLVED]], level, reached)
    best = {flip.axes: flip for flip in sorted(flips, key=lambda flip: -_known(flip.implausibility))}
    ordered = sorted(best.values(), key=lambda flip: _known(flip.implausibility))
    return FlippingSets(
        level,
        float(trials.best.advantage[0]),
        tuple(ordered[:LISTED]),
        up_to,
        len(axes),
        left_out,
        pruned,
        len({item[0] for item, _ in found}),
        max(len(found) - MOST_SOLVED, 0),
    )


def _known(distance: float) -> float:
    """A distance that no spread tells comes last."""
    return distance if np.isfinite(distance) else math.inf


def _straight(item: _Set, end: float, today: float, level: float) -> float:
    """Distance at the level on a straight line in ln(advantage) from today to the ends; that of the ends if unknown."""
    whole = _known(_distance(*item))
    if not (today > 0.0 and end > 0.0 and math.isfinite(end)):
        return whole
    return whole * math.log(level / today) / math.log(end / today)


def _could(item: _Set, effects: Mapping[_Set, float], distance: float) -> bool:
    """Tell whether the effects alone of some ends add up to enough of the distance, in ln(advantage), to be tried."""
    alone = sum(max(effects[(axis,), (end,)], 0.0) for axis, end in zip(*item, strict=True))
    return TOGETHER * alone >= distance


def _ends(axis: Axis) -> tuple[float, float] | None:
    return None if axis.value is None else range_of(axis.value)


def _trial(axes: Sequence[Axis], values: Sequence[float]) -> dict[str, float]:
    found: dict[str, float] = {}
    for axis, value in zip(axes, values, strict=True):
        found |= axis.place(value, found)
    return found


def _distance(axes: Sequence[Axis], values: Sequence[float]) -> float:
    return float(np.sqrt(sum(deviations(axis.value, value) ** 2 for axis, value in zip(axes, values, strict=True))))


def _between(axis: Axis, end: float, share: float) -> float:
    """Return the value a share of the way from the best estimate to an end, on the scale of its spread."""
    shape = axis.value.spread.shape if axis.value is not None and axis.value.spread is not None else "loguniform"
    if shape in ("lognormal", "loguniform") and axis.best > 0.0 and end > 0.0:
        return float(axis.best * (end / axis.best) ** share)
    return float(axis.best + (end - axis.best) * share)


def _nearest(trials: Trials, sets: Sequence[_Set], level: float, reached: bool) -> list[Flip]:
    """Return the least implausible point found of each set: solve along directions from the best estimates outwards."""

    def at(item: _Set, direction: Sequence[float], share: float) -> tuple[float, ...]:
        return tuple(_between(axis, end, share * d) for axis, end, d in zip(*item, direction, strict=True))

    ways = [
        (item, direction)
        for item in sets
        for direction in itertools.product(DIRECTIONS, repeat=len(item[0]))
        if max(direction) == 1.0
    ]
    if not ways:
        return []
    other, _ = _on_other_side(trials, [_trial(item[0], at(item, way, 1.0)) for item, way in ways], level, reached)
    ways = [way for way, flips in zip(ways, other, strict=True) if flips]

    def difference(share: Array, which: NDArray[np.intp]) -> Array:
        asked = [(*ways[int(i)], float(s)) for s, i in zip(share, which, strict=True)]
        moved = [_trial(item[0], at(item, direction, s)) for item, direction, s in asked]
        _, counted = _on_other_side(trials, moved, level, reached)
        with np.errstate(divide="ignore"):
            return np.asarray(np.log(counted) - np.log(level))

    shares = shares_on_side(difference, len(ways), not reached, xtol=TOLERANCE)
    found: dict[_Set, tuple[float, ...]] = {}
    for (item, direction), share in zip(ways, shares, strict=True):
        values = at(item, direction, float(share))
        if item not in found or _known(_distance(item[0], values)) < _known(_distance(item[0], found[item])):
            found[item] = values
    answers = trials([_trial(item[0], values) for item, values in found.items()])
    return [
        Flip(
            item[0],
            values,
            tuple(deviations(axis.value, value) for axis, value in zip(item[0], values, strict=True)),
            _distance(item[0], values),
            float(advantage),
        )
        for (item, values), advantage in zip(found.items(), answers.advantage, strict=True)
    ]


def flip_rows(found: FlippingSets) -> list[dict[str, Any]]:
    """Return one row per input of every set, the least implausible set first."""
    rows = []
    for number, flip in enumerate(found.flips, start=1):
        for axis, value, distance in zip(flip.axes, flip.values, flip.distances, strict=True):
            rows.append(
                {
                    "set": number,
                    "inputs": len(flip.axes),
                    "implausibility": flip.implausibility,
                    "name": axis.name,
                    "unit": axis.unit,
                    "today": axis.shown(axis.best),
                    "moved_to": axis.shown(value),
                    "standard_deviations": distance,
                    "evidence": "" if axis.value is None else axis.value.evidence,
                }
            )
    return rows
