"""Break-even and required values: where the advantage is 1, and where it is the required one (layer 7).

For every axis the answer is one of

crossings     one value or several, each with the side that wins below and above it
always, never every value of the range that has an advantage lies on one side of the level; with ``no effect`` the
              axis does not move the advantage at all
undefined     no value of the range has an advantage

When the level is never reached inside the range, the axis is followed outwards to its ideal limit (0, 1 or ever more,
as the domain of the value allows): a value beyond the range that reaches the level is ``beyond``; without one the
level is ``unreachable`` and the largest advantage on the way is stated with what limits it there.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from benchmark.catalogue import QUANTITIES
from benchmark.decide.axes import Axis
from benchmark.decide.profile import Crossing, Edge, Line, Profile, profiles
from benchmark.decide.trials import REQUIRED_TIME, TEMPERATURE, Trials
from benchmark.sets.study import NodePair, Study

__all__ = ["CUT", "Need", "Reach", "find_needs", "ideal_ways", "side_of"]

#: decades beyond the range at which the way to an ideal limit is looked at
OUTWARD = (0.25, 0.5, 1.0, 1.5, 2.0, 3.0, 4.0, 6.0, 9.0, 12.0)
#: the advantage has settled when the last two looks differ by less
SETTLED = 1.0e-6
#: a relative change of the advantage below this over the whole range counts as none
NO_EFFECT = 1.0e-9
#: how near (in ln advantage) an end of the range must lie to the level to count as being on it
ON_BOUND = 1.0e-9
CUT = "where a side loses its last permitted point"
#: values whose limit lies in neither direction
_NO_LIMIT = (TEMPERATURE, REQUIRED_TIME)


@dataclass(frozen=True)
class Reach:
    """Largest advantage on the way to the ideal limits of an axis.

    ``end``: ``towards 0``, ``towards 1``, ``ever larger``; ``CUT`` when a side loses its last permitted point there;
    "inside the range" or "on the way" when the largest advantage lies there. ``settled``: the advantage no longer
    changes at the end. ``limit``: the largest term of the candidate's delay or energy there.
    """

    x: float
    advantage: float
    end: str
    settled: bool
    limit: str


@dataclass(frozen=True)
class Need:
    """The answer for one axis and one level; see the module docstring for ``kind``."""

    axis: Axis
    level: float
    today: float  # advantage at the best estimate
    kind: str
    crossings: tuple[Crossing, ...]
    edges: tuple[Edge, ...]
    lowest: float
    highest: float
    on_bound: str = ""  # "low" or "high": the advantage at that end of the range is the level itself
    reach: Reach | None = None


def side_of(profile: Profile, level: float) -> str:
    """Say on which side of a level a profile without crossings lies: always, never, no effect or undefined."""
    known = profile.defined
    if not known.size:
        return "undefined"
    low, high = float(known.min()), float(known.max())
    if high - low <= NO_EFFECT * abs(high) or low == high:
        return "no effect"
    return "always" if low >= level else "never"


def _on_bound(profile: Profile, level: float) -> str:
    for position, name in ((0, "low"), (-1, "high")):
        advantage = float(profile.advantage[position])
        if advantage > 0.0 and abs(np.log(advantage / level)) <= ON_BOUND:
            return name
    return ""


def find_needs(
    study: Study,
    pair: NodePair,
    axes: Sequence[Axis],
    levels: Sequence[float],
    *,
    trials: Trials | None = None,
    count: int = 17,
    ideal: bool = True,
) -> list[Need]:
    """Answer for every axis and every level, in that order.

    Parameters
    ----------
    study, pair
    axes : sequence of Axis
    levels : sequence of float
        Advantages above 0, usually the required one and 1.
    trials : Trials, optional
        Of the same study and pair, when there is one already.
    count : int
        Grid points per axis.
    ideal : bool
        Follow an axis to its ideal limits where the level is never reached in its range.
    """
    trials = trials or Trials(study, pair)
    today = float(trials.best.advantage[0])
    found = []
    for profile in profiles(trials, [Line(axis) for axis in axes], levels, count):
        looks: list[_Look] | None = None
        for level in dict.fromkeys(levels):
            crossings = profile.crossings_of(level)
            known = profile.defined
            need = Need(
                profile.line.axis,
                level,
                today,
                "crossings" if crossings else side_of(profile, level),
                tuple(crossings),
                profile.edges,
                float(known.min()) if known.size else float("nan"),
                float(known.max()) if known.size else float("nan"),
                _on_bound(profile, level),
            )
            if ideal and need.kind == "never":
                looks = _look(trials, profile.line, levels) if looks is None else looks
                need = _followed(trials, profile, need, looks)
            found.append(need)
    return found


@dataclass(frozen=True)
class _Look:
    """One way outwards: its name and direction, and what was found on it from the end of the range on."""

    end: str
    upward: bool
    profile: Profile

    @property
    def furthest(self) -> int:
        """Position of the furthest value that has an advantage."""
        known = np.flatnonzero(~np.isnan(self.profile.advantage))
        return int(known[-1] if self.upward else known[0])


def _look(trials: Trials, line: Line, levels: Sequence[float]) -> list[_Look]:
    """Search the ways to the ideal limits of an axis as the range itself was searched."""
    ways = ideal_ways(line.axis)
    outward = [
        Line(dataclasses.replace(line.axis, low=min(values), high=max(values), steps=tuple(sorted(values))), line.held)
        for _, values in ways
    ]
    found = profiles(trials, outward, levels, name_edges=False)
    return [
        _Look(end, values[-1] > values[0], profile)
        for (end, values), profile in zip(ways, found, strict=True)
        if profile.defined.size
    ]


def ideal_ways(axis: Axis) -> list[tuple[str, list[float]]]:
    """Ways to the ideal limits, each as its name and the values looked at, from the end of the range on."""
    if axis.name in _NO_LIMIT or axis.domain == "any" or axis.high <= 0.0:
        return []
    ways: list[tuple[str, list[float]]] = []
    if axis.domain == "count":
        if axis.low > 1.0:
            ways.append(("towards 1", [axis.low, 1.0]))
    elif axis.low > 0.0:
        down = [axis.low / 10.0**decades for decades in (0.0, *OUTWARD)]
        ways.append(("towards 0", [*down, 0.0] if axis.domain in ("nonnegative", "fraction") else down))
    if axis.domain not in ("fraction", "share"):
        ways.append(("ever larger", [axis.high * 10.0**decades for decades in (0.0, *OUTWARD)]))
    elif axis.high < 1.0 and axis.value is not None and QUANTITIES[axis.value.name].high >= 1.0:
        # a share whose usual range ends below 1 has a limit of its own (Poisson's ratio)
        ways.append(("towards 1", [axis.high, 1.0]))
    return ways


def _followed(trials: Trials, profile: Profile, need: Need, looks: Sequence[_Look]) -> Need:
    """Return the nearest value beyond the range that reaches the level, or how far the axis goes."""
    beyond = [crossing for look in looks for crossing in look.profile.crossings_of(need.level)]
    if beyond:
        nearest = min(beyond, key=lambda crossing: abs(crossing.x - need.axis.best))
        return dataclasses.replace(need, kind="beyond", crossings=(nearest,))
    inside = int(np.nanargmax(profile.advantage))
    best = Reach(float(profile.x[inside]), float(profile.advantage[inside]), "inside the range", True, "")
    for look in looks:
        found, x = look.profile.advantage, look.profile.x
        if float(np.nanmax(found)) < best.advantage:
            continue
        # what no longer changes is equal: the furthest of them is meant
        largest = np.flatnonzero(found >= np.nanmax(found) * (1.0 - SETTLED))
        furthest = look.furthest
        position = furthest if furthest in largest else int(largest[0])
        cut = any(edge.x == x[furthest] for edge in look.profile.edges)
        end = "on the way" if position != furthest else (CUT if cut else look.end)
        best = Reach(float(x[position]), float(found[position]), end, _settled(look, furthest), "")
    limit = trials([profile.line.trial(best.x)]).limit(0, trials.study.policy.metric)
    return dataclasses.replace(need, kind="unreachable", reach=dataclasses.replace(best, limit=limit))


def _settled(look: _Look, furthest: int) -> bool:
    """Tell whether the advantage no longer changes at the end of a way."""
    found, x = look.profile.advantage, look.profile.x
    if x[furthest] in (0.0, 1.0) or any(edge.x == x[furthest] for edge in look.profile.edges):
        return True
    before = furthest - 1 if look.upward else furthest + 1
    inside = 0 <= before < len(found) and not np.isnan(found[before])
    return bool(inside and abs(found[furthest] / found[before] - 1.0) <= SETTLED)
