"""Two parameters against each other: the value of the second that each value of the first asks for (layer 7).

Every point lies on the curve advantage = level, with both sides optimised anew. Where the second value would have to
lie beyond what a side can bear (field limit, deadline, supply range), the curve is cut there and the limit is named.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from benchmark.decide.axes import Axis
from benchmark.decide.break_even import side_of
from benchmark.decide.profile import Line, Profile, profiles
from benchmark.decide.trials import Trials
from benchmark.draws.plan import plan_of
from benchmark.draws.values import draw_values
from benchmark.errors import UsageError
from benchmark.evaluate.side import joints_by_owner

__all__ = ["TRADE_COLUMNS", "TradeCurve", "trade_curve", "trade_rows", "trade_samples"]

#: columns of the rows, in order; values in the units of the columns beside them
TRADE_COLUMNS = (
    "first",
    "first_unit",
    "first_value",
    "second",
    "second_unit",
    "second_value",
    "level",
    "answer",
    "at_or_above_level",
    "advantage",
    "meets_requirements",
    "second_low",
    "second_high",
    "cut_by",
    "cut_below",
    "cut_above",
)


@dataclass(frozen=True)
class TradeCurve:
    """Profiles of the second axis, one for each value of the first.

    ``today``: both best estimates, and the advantage there.
    """

    first: Axis
    second: Axis
    level: float
    values: tuple[float, ...]
    profiles: tuple[Profile, ...]
    today: tuple[float, float, float]


def trade_curve(trials: Trials, first: Axis, second: Axis, level: float, count: int = 17, scan: int = 17) -> TradeCurve:
    """Solve for the second value at every value of the first.

    Parameters
    ----------
    trials : Trials
    first, second : Axis
    level : float
        Advantage to be met.
    count, scan : int
        Values of the first axis; grid points of the second axis in every search.

    Raises
    ------
    UsageError
        When both axes move the same value.
    """
    if set(first.place(first.best, {})) & set(second.place(second.best, {})):
        message = f"a trade curve needs two different values, found {first.name} and {second.name}"
        raise UsageError(message)
    values = first.grid(count)
    lines = [Line(second, {first: float(x)}) for x in values]
    found = profiles(trials, lines, [level], scan)
    today = first.best, second.best, float(trials.best.advantage[0])
    return TradeCurve(first, second, level, tuple(map(float, values)), tuple(found), today)


def trade_samples(trials: Trials, curve: TradeCurve, draws: int = 64, seed: int = 0) -> list[dict[str, Any]]:
    """Draw both values from their stated spreads, the rest at the best estimate: today's cloud beside the curve.

    Parameters
    ----------
    trials : Trials
    curve : TradeCurve
    draws, seed : int
        How many draws (a power of two from 16), and from which seed.

    Returns
    -------
    list of dict
        Rows with ``answer`` "sample"; none when neither value has a stated spread.
    """
    plan = plan_of(draws, seed)
    joints = joints_by_owner(trials.study, trials.pair)
    blocks = [draw_values(trials.values, plan, block, joints=joints)[1] for block in range(plan.blocks)]
    drawn = {
        axis: np.concatenate([block[axis.name] for block in blocks])
        for axis in (curve.first, curve.second)
        if axis.name in blocks[0]
    }
    if not drawn:
        return []
    table = [np.broadcast_to(drawn.get(axis, axis.best), draws) for axis in (curve.first, curve.second)]
    pairs = [(float(x), float(y)) for x, y in zip(*table, strict=True)]
    answers = trials([Line(curve.second, {curve.first: x}).trial(y) for x, y in pairs])
    return [
        _row(
            curve,
            x,
            None,
            second=y,
            answer="sample",
            advantage=float(answers.advantage[k]),
            meets_requirements="yes" if answers.meets[k] else "no",
        )
        for k, (x, y) in enumerate(pairs)
    ]


def trade_rows(curve: TradeCurve) -> list[dict[str, Any]]:
    """Return rows ready for drawing: today's point first, then the curve in the order of the first value.

    ``answer``: "today", "root", "jump", or why there is no value: "always" and "never" (all that have an advantage lie
    on one side), "undefined". ``second_low`` and ``second_high``: the stretch in which both sides have a permitted
    point; ``cut_by`` says what ends it inside the range.
    """
    rows = [_row(curve, curve.today[0], None, second=curve.today[1], answer="today", advantage=curve.today[2])]
    for x, profile in zip(curve.values, curve.profiles, strict=True):
        roots = [
            _row(
                curve,
                x,
                profile,
                second=crossing.x,
                answer=crossing.kind,
                at_or_above_level="below" if crossing.above_below else "above",
                advantage=crossing.advantage,
                meets_requirements="yes" if crossing.meets else "no",
            )
            for crossing in profile.crossings
        ]
        rows += roots or [_row(curve, x, profile, answer=side_of(profile, curve.level))]
    return rows


def _row(
    curve: TradeCurve, x: float, profile: Profile | None, *, second: float = float("nan"), **more: Any
) -> dict[str, Any]:
    first, other = curve.first, curve.second
    low, high, cut, beyond = float("nan"), float("nan"), "", {True: "", False: ""}
    if profile is not None and profile.defined.size:
        has = profile.x[~np.isnan(profile.advantage)]
        low, high = other.shown(float(has.min())), other.shown(float(has.max()))
        cut = "; ".join(
            f"{'above' if edge.defined_below else 'below'} {other.text(edge.x)}: {edge.why}" for edge in profile.edges
        )
        beyond = {
            above: "; ".join(edge.why for edge in profile.edges if edge.defined_below == above)
            for above in (True, False)
        }
    row = dict.fromkeys(TRADE_COLUMNS, "") | {
        "first": first.name,
        "first_unit": first.unit,
        "first_value": first.shown(x),
        "second": other.name,
        "second_unit": other.unit,
        "second_value": other.shown(second),
        "level": curve.level,
        "advantage": float("nan"),
        "second_low": low,
        "second_high": high,
        "cut_by": cut,
        "cut_below": beyond[False],
        "cut_above": beyond[True],
    }
    return row | more
