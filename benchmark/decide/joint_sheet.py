"""Joint specification sheet: required values and spreads of several parameters at once (layer 7).

The rule: moving a best estimate by one standard deviation of its stated spread counts as hard as halving that spread,
and every parameter goes the same number t of such steps towards what helps the candidate,

    value     best + t d sd        or, on a logarithmic scale,   best exp(t d sd)         d = 1 or -1
    spread    stated spread times 2^-t, around the moved value, its shape kept

so the sheet is one line through all values and spreads, with today at t = 0; below 0 it tells what may be given up. On
it there are two answers: the t at which the best estimates alone give the required advantage, and the t at which it is
reached with a stated probability when all stated ranges are drawn, those of the sheet narrowed as it says. The points
of the draws are the same for every t and those of a study with the sheet's values in its files, so putting the values
back gives the probability of the sheet with the same draws, and within the sampling error with others. Choices that are
frozen at the best estimate (size, threshold shift) stay as they are today.
"""

from __future__ import annotations

import dataclasses
import itertools
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.catalogue import QUANTITIES
from benchmark.decide.axes import Axis
from benchmark.decide.break_even import NO_EFFECT
from benchmark.decide.profile import Line, profiles, shares_on_side
from benchmark.decide.tolerance import LOGARITHMIC, Tolerances
from benchmark.decide.trials import Trials
from benchmark.draws.values import value_at
from benchmark.errors import UsageError
from benchmark.evaluate.batch import Batch, resolve
from benchmark.evaluate.side import joints_by_owner
from benchmark.sets.values import Spread, Value

__all__ = ["JointSheet", "Moved", "joint_sheet", "moved_value"]

Array = NDArray[np.float64]
#: steps looked at, at most, towards what helps and towards what may be given up
FURTHEST, BACK = 8.0, -3.0
#: steps at which the probability is looked at on the way
LOOKS = (0.5, 1.0, 2.0, 4.0, 8.0)
#: step by which it is seen which direction helps
PROBE = 0.1
#: tolerance of t
TOLERANCE = 1.0e-6
#: how finely it is looked where a value or its spread would leave its domain
DOMAIN_STEP = 0.125


@dataclass(frozen=True)
class Moved:
    """One parameter of the sheet, and which way helps: 1 for larger, -1 for smaller."""

    axis: Axis
    value: Value
    towards: float

    def at(self, steps: float) -> Value:
        """Return the value so many steps away."""
        return moved_value(self.value, self.towards, steps)


@dataclass(frozen=True)
class JointSheet:
    """``steps``: t at which the best estimates give the level; ``steps_drawn``: at which the probability is reached.

    Both are nan where there is none between ``BACK`` and ``FURTHEST`` steps inside the domains of the values.
    ``today``, ``reached``: probability today and on the sheet; ``advantage``: at the best estimates of the sheet with
    that probability. ``span``: the steps that were looked at; ``follows``: derived values, by ledger key, with unit and
    number on the sheet.
    """

    level: float
    moved: tuple[Moved, ...]
    steps: float
    span: tuple[float, float]
    best: float
    probability: float | None = None
    today: float = float("nan")
    steps_drawn: float = float("nan")
    reached: float = float("nan")
    error: float = float("nan")
    advantage: float = float("nan")
    draws: int = 0
    follows: tuple[tuple[str, str, float], ...] = ()


def moved_value(value: Value, towards: float, steps: float) -> Value:
    """Return a value with a spread moved by some steps of the rule.

    Parameters
    ----------
    value : Value
        At one node, with a spread.
    towards : float
        1 for larger, -1 for smaller.
    steps : float
        Number t of steps [1].

    Returns
    -------
    Value
        Best estimate [SI] t standard deviations away, on the logarithmic scale for log-normal and log-uniform spreads;
        its spread times 2^-t. The standard deviation of a uniform spread is its width over sqrt(12), of a triangular
        one that of the triangle.

    Notes
    -----
    Standard deviations of the distributions: common practice, no source.
    """
    spread = value.spread
    if spread is None:
        message = f"{value.name} has no spread"
        raise ValueError(message)
    narrower = 2.0**-steps
    best, low, high = value.si[:1], spread.low[:1], spread.high[:1]
    if spread.shape in LOGARITHMIC:
        deviation = np.log(high / low) / np.sqrt(12.0) if spread.scale is None else spread.scale[:1]
        moved = best * np.exp(towards * steps * deviation)
        ends = moved * (low / best) ** narrower, moved * (high / best) ** narrower
    else:
        if spread.scale is not None:
            deviation = spread.scale[:1]
        elif spread.shape == "triangular":
            squares = low**2 + best**2 + high**2 - low * best - low * high - best * high
            deviation = np.sqrt(squares / 18.0)
        else:
            deviation = (high - low) / np.sqrt(12.0)
        moved = best + towards * steps * deviation
        ends = moved + narrower * (low - best), moved + narrower * (high - best)
    scale = None if spread.scale is None else spread.scale[:1] * narrower
    return dataclasses.replace(value, si=np.asarray(moved), spread=Spread(spread.shape, ends[0], ends[1], scale))


def joint_sheet(
    trials: Trials,
    level: float,
    axes: Sequence[Axis],
    *,
    probability: float | None = None,
    draws: int = 256,
    seed: int = 0,
    count: int = 17,
) -> JointSheet:
    """Solve for the steps at which the level is met, by the best estimates and with a probability.

    Parameters
    ----------
    trials : Trials
    level : float
        Required advantage, above 0.
    axes : sequence of Axis
        Parameters with a stated spread, each moving the advantage.
    probability : float, optional
        Also solve for this probability.
    draws, seed : int
        How many draws (a power of two), and from which seed.
    count : int
        Grid points on which the steps are scanned.

    Raises
    ------
    UsageError
        When a parameter has no stated spread or does not move the advantage, none is named, or the best estimate has
        no advantage.
    """
    best = float(trials.best.advantage[0])
    if np.isnan(best):
        message = f"no specification sheet: {trials.best.state(0)} at the best estimate ({trials.why({})})"
        raise UsageError(message)
    moved = _moved(trials, axes)
    span = _span(moved)
    line = Line(_together(moved, span))
    crossings = profiles(trials, [line], [level], count, name_edges=False)[0].crossings
    roots = [crossing.x for crossing in crossings if crossing.kind == "root"]
    steps = min(roots, key=abs) if roots else float("nan")
    sheet = JointSheet(level, moved, steps, span, best)
    if probability is None:
        return dataclasses.replace(sheet, follows=_follows(trials, moved, steps))
    drawn = Tolerances(trials, level, probability, draws, seed)
    found = _drawn_steps(drawn, moved, span)
    reached = float("nan") if np.isnan(found) else float(np.mean(_reaching(drawn, moved, found) >= 0.0))
    put = {} if np.isnan(found) else line.trial(found)
    return dataclasses.replace(
        sheet,
        probability=probability,
        today=drawn.share(),
        steps_drawn=found,
        reached=reached,
        error=drawn.error,
        advantage=float(trials([put]).advantage[0]) if put else float("nan"),
        draws=draws,
        follows=_follows(trials, moved, found),
    )


def _moved(trials: Trials, axes: Sequence[Axis]) -> tuple[Moved, ...]:
    """Return the parameters with the direction that helps, all looked at in one batch."""
    if not axes:
        message = "a joint sheet needs values with a stated spread that move the advantage; the candidate has none"
        raise UsageError(message)
    joints = joints_by_owner(trials.study, trials.pair)
    listed = ((owner, joint) for owner, group in joints.items() for joint in group)
    sampled = {f"{owner}.{name}" for owner, joint in listed if joint.samples is not None for name in joint.names}
    stated: list[tuple[Axis, Value]] = []
    for axis in axes:
        value = axis.value
        if value is None or value.spread is None or value.spread.high[0] <= value.spread.low[0]:
            message = (
                f"{axis.name} has no stated spread, so a joint sheet cannot say how it is to be narrowed; state one"
            )
            raise UsageError(message)
        if axis.name in sampled:
            message = f"{axis.name} is known by samples, which a joint sheet cannot narrow; leave it out"
            raise UsageError(message)
        stated.append((axis, value))
    probes = [
        axis.place(float(moved_value(value, sign, PROBE).si[0]), {}) for axis, value in stated for sign in (1.0, -1.0)
    ]
    log = trials(probes).log.reshape(-1, 2)
    gain = np.nan_to_num(log[:, 0], nan=-np.inf) - np.nan_to_num(log[:, 1], nan=-np.inf)
    for (axis, _), change in zip(stated, gain, strict=True):
        if not abs(change) > NO_EFFECT:
            message = f"{axis.name} does not move the advantage; leave it out of the joint sheet"
            raise UsageError(message)
    return tuple(Moved(axis, value, float(np.sign(change))) for (axis, value), change in zip(stated, gain, strict=True))


def _span(moved: Sequence[Moved]) -> tuple[float, float]:
    """Return the steps over which every value and the ends of its spread stay in their domain."""

    def inside(steps: float) -> bool:
        values = [item.at(steps) for item in moved]
        return all(
            QUANTITIES[value.name].allows(float(x[0]))
            for value in values
            if value.spread is not None
            for x in (value.si, value.spread.low, value.spread.high)
        )

    ends = []
    for furthest in (BACK, FURTHEST):
        steps = 0.0
        while abs(steps) < abs(furthest) and inside(steps + math.copysign(DOMAIN_STEP, furthest)):
            steps += math.copysign(DOMAIN_STEP, furthest)
        ends.append(steps)
    return ends[0], ends[1]


def _together(moved: Sequence[Moved], span: tuple[float, float]) -> Axis:
    """Return the axis of the steps: one number places all values."""
    meaning = "steps of the joint sheet: standard deviations of every value at once"
    return Axis(
        "steps",
        meaning,
        "1",
        "any",
        0.0,
        *span,
        "domains of the values",
        lambda steps, other: {
            key: x for item in moved for key, x in item.axis.place(float(item.at(steps).si[0]), other).items()
        },
    )


def _reaching(drawn: Tolerances, moved: Sequence[Moved], steps: float) -> Array:
    """Return ln(advantage / M) of every draw with the values and spreads so many steps away, sorted."""
    columns = {item.axis.name: value_at(item.at(steps), drawn.points[item.axis.name]) for item in moved}
    return drawn.ranked(columns)


def _drawn_steps(drawn: Tolerances, moved: Sequence[Moved], span: tuple[float, float]) -> float:
    """Return the steps nearest to today at which the probability is just reached; nan without any."""

    def margin(steps: float) -> float:
        return float(_reaching(drawn, moved, steps)[drawn.place])

    here = margin(0.0)
    sign = -1.0 if here >= 0.0 else 1.0
    end = span[0] if sign < 0.0 else span[1]
    looks = [0.0, *(sign * look for look in LOOKS if look < abs(end)), *([end] if end else [])]
    for low, high in itertools.pairwise(looks):
        if (margin(high) >= 0.0) != (here >= 0.0):
            return _edge(margin, low, high)
    return float("nan")


def _edge(margin: Callable[[float], float], low: float, high: float) -> float:
    """Return where the margin changes sign, on the side on which it is not below 0."""

    def difference(share: Array, which: NDArray[np.intp]) -> Array:
        return np.array([margin(low + (high - low) * float(s)) for s in share])

    return low + (high - low) * float(shares_on_side(difference, 1, True, xtol=TOLERANCE)[0])


def _follows(trials: Trials, moved: Sequence[Moved], steps: float) -> tuple[tuple[str, str, float], ...]:
    """Return the derived values that follow the sheet: ledger key, unit of the file's catalogue, number in SI."""
    if np.isnan(steps):
        return ()
    columns = {
        key: np.array([x]) for item in moved for key, x in item.axis.place(float(item.at(steps).si[0]), {}).items()
    }
    problem = trials.problems["candidate"]
    owner = problem.side.technology.id
    values = problem.side.technology.at(problem.node)
    arrays = resolve(owner, values, Batch(1, columns))
    return tuple(
        (f"{owner}.{name}", QUANTITIES[name].unit, float(arrays[name].ravel()[0]))
        for name, value in values.items()
        if value.formula and f"{owner}.{name}" not in columns and arrays[name].ravel()[0] != value.si[0]
    )
