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
from numpy.typing import NDArray

from benchmark.decide.axes import Axis
from benchmark.decide.profile import Crossing, Edge, Line, Profile, profiles
from benchmark.decide.trials import REQUIRED_TIME, TEMPERATURE, Trials
from benchmark.sets.study import NodePair, Study

__all__ = ["Need", "Reach", "find_needs", "side_of"]

#: decades beyond the range at which the way to an ideal limit is looked at
OUTWARD = (1.0, 2.0, 3.0, 4.0, 6.0, 8.0, 10.0, 12.0)
#: the advantage has settled when the last two looks differ by less
SETTLED = 1.0e-6
#: a relative change of the advantage below this over the whole range counts as none
NO_EFFECT = 1.0e-9
#: how near (in ln advantage) an end of the range must lie to the level to count as being on it
ON_BOUND = 1.0e-9
#: values whose limit lies in neither direction
_NO_LIMIT = (TEMPERATURE, REQUIRED_TIME)


@dataclass(frozen=True)
class Reach:
    """Largest advantage on the way to the ideal limits of an axis.

    ``end``: ``towards 0``, ``towards 1``, ``ever larger``, or "inside the range" when the largest advantage lies there.
    ``settled``: the advantage no longer changes at the end. ``limit``: the largest term of the candidate's delay or
    energy there.
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
                looks = _look(trials, profile.line) if looks is None else looks
                need = _followed(trials, profile, need, looks)
            found.append(need)
    return found


#: one way outwards: its name, the values looked at, and the advantages up to where a side has no permitted point
_Look = tuple[str, list[float], NDArray[np.float64]]


def _look(trials: Trials, line: Line) -> list[_Look]:
    """Evaluate the ways to the ideal limits of an axis."""
    found = []
    for end, values in _ways(line.axis):
        answers = trials([line.trial(x) for x in values]).advantage
        stop = int(np.argmax(np.isnan(answers))) if np.isnan(answers).any() else len(values)
        found.append((end, values[:stop], answers[:stop]))
    return found


def _ways(axis: Axis) -> list[tuple[str, list[float]]]:
    """Ways to the ideal limits, each as its name and the values looked at, nearest first; none without limits."""
    if axis.name in _NO_LIMIT or axis.domain == "any" or axis.high <= 0.0:
        return []
    ways: list[tuple[str, list[float]]] = []
    if axis.domain == "count":
        ways.append(("towards 1", [1.0] if axis.low > 1.0 else []))
    elif axis.low > 0.0:
        down = [axis.low / 10.0**decades for decades in OUTWARD]
        ways.append(("towards 0", [*down, 0.0] if axis.domain in ("nonnegative", "fraction") else down))
    if axis.domain not in ("fraction", "share"):
        ways.append(("ever larger", [axis.high * 10.0**decades for decades in OUTWARD]))
    elif axis.high < 1.0 and axis.value is not None:
        ways.append(("towards 1", [1.0]))
    return [(name, values) for name, values in ways if values]


def _followed(trials: Trials, profile: Profile, need: Need, looks: Sequence[_Look]) -> Need:
    """Return the nearest value beyond the range that reaches the level, or how far the axis goes."""
    reaching = [
        (int(np.argmax(found >= need.level)), values) for _, values, found in looks if (found >= need.level).any()
    ]
    if reaching:
        first, values = min(reaching, key=lambda item: item[0])
        return _beyond(trials, need, values, first)
    inside = int(np.nanargmax(profile.advantage))
    best = Reach(float(profile.x[inside]), float(profile.advantage[inside]), "inside the range", True, "")
    for end, values, advantages in looks:
        if values and float(advantages.max()) >= best.advantage:
            furthest = int(np.flatnonzero(advantages == advantages.max())[-1])
            change = abs(advantages[-1] / advantages[-2] - 1.0) if len(values) > 1 else np.inf
            settled = bool(values[-1] in (0.0, 1.0) or change <= SETTLED)
            best = Reach(values[furthest], float(advantages[furthest]), end, settled, "")
    limit = trials([profile.line.trial(best.x)]).limit(0, trials.study.policy.metric)
    return dataclasses.replace(need, kind="unreachable", reach=dataclasses.replace(best, limit=limit))


def _beyond(trials: Trials, need: Need, values: Sequence[float], first: int) -> Need:
    """Solve for the crossing between the last value below the level and the first one that reaches it."""
    axis = need.axis
    nearest = axis.high if values[0] > axis.high else axis.low
    ends = sorted((nearest if first == 0 else values[first - 1], values[first]))
    (profile,) = profiles(trials, [Line(axis.over(*ends))], [need.level], 2, name_edges=False)
    return dataclasses.replace(need, kind="beyond", crossings=profile.crossings)
