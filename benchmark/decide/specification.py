"""Specification sheet: what the values of the candidate must be for the required advantage (layer 7).

Each value alone, the rest at the best estimate. A value is decisive when moving it over its range changes on which side
of the required advantage the answer lies, or when it has no range, moves the advantage, and rests on evidence that does
not carry any verdict. Values with a range that move the advantage without crossing stand below the decisive ones: far
from the required advantage nothing crosses, and the sheet still has to say how far each of them would have to go.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from benchmark.catalogue import EVIDENCE
from benchmark.decide.axes import Axis, known_axes
from benchmark.decide.break_even import NO_EFFECT, Need, find_needs
from benchmark.decide.moves import range_of
from benchmark.decide.need_words import need_text, range_text
from benchmark.decide.tolerance import Tolerance, Tolerances
from benchmark.decide.trials import Trials
from benchmark.errors import UsageError

__all__ = [
    "SHEET_COLUMNS",
    "TOLERANCE_COLUMNS",
    "Sheet",
    "most_effective",
    "sheet_rows",
    "specification",
    "spread_effects",
]

#: where the values of a set hold: a condition, no parameter
CONDITIONS = ("reference_temperature",)
#: relative step by which a value without range is moved to see whether anything rests on it
PROBE = 0.01
SHEET_COLUMNS = (
    "name",
    "unit",
    "today",
    "evidence",
    "decisive",
    "required",
    "bound",
    "factor",
    "reachable",
    "limit",
    "advantage_with_it",
    "range",
    "words",
)
#: further columns when a probability is asked for
TOLERANCE_COLUMNS = (
    "probability",
    "probability_today",
    "probability_error",
    "required_at_probability",
    "spread_factor",
)


@dataclass(frozen=True)
class Sheet:
    """``needs``: one per value, at the required advantage; ``advantage``: today's; ``decisive``: names of such values.

    ``tolerances``: name -> required value and spread at a probability, when one was asked for.
    """

    level: float
    advantage: float
    needs: tuple[Need, ...]
    decisive: frozenset[str] = frozenset()
    tolerances: Mapping[str, Tolerance] = field(default_factory=dict)


def specification(
    trials: Trials,
    level: float,
    count: int = 17,
    *,
    chosen: Sequence[Axis] = (),
    probability: float | None = None,
    draws: int = 256,
    seed: int = 0,
) -> Sheet:
    """Return the required values of the candidate's parameters.

    Parameters
    ----------
    trials : Trials
    level : float
        Required advantage.
    count : int
        Grid points per value.
    chosen : sequence of Axis, optional
        Values to be on the sheet; by default the decisive ones of the candidate and those with a range that matter.
    probability : float, optional
        Also state the required value and spread at which the level is reached with this probability, all stated ranges
        drawn together.
    draws, seed : int
        How many draws (a power of two), and from which seed.

    Raises
    ------
    UsageError
        When the best estimate has no advantage, so that nothing can be called decisive, or when a probability is asked
        for and no value has a spread.
    """
    today = float(trials.best.advantage[0])
    if np.isnan(today):
        message = f"no specification sheet: {trials.best.state(0)} at the best estimate ({trials.why({})})"
        raise UsageError(message)
    effects = _effects(trials, level, chosen or _own(trials))
    decisive = [axis for axis, crosses, _ in effects if crosses]
    axes = list(chosen) or [*decisive, *(axis for axis, crosses, moves in effects if moves and not crosses)]
    drawn = None if probability is None else Tolerances(trials, level, probability, draws, seed)
    needs = find_needs(trials.study, trials.pair, axes, [level], trials=trials, count=count)
    if not chosen:
        needs = [need for need in needs if need.kind != "no effect"]
    # what the best estimates cannot reach is not looked for in the draws
    open_ones = [need for need in needs if need.kind not in ("unreachable", "never", "undefined")]
    tolerances = {} if drawn is None else {need.axis.name: drawn.of(need.axis) for need in open_ones}
    return Sheet(level, today, tuple(needs), frozenset(axis.name for axis in decisive), tolerances)


def most_effective(trials: Trials, count: int = 2) -> list[Axis]:
    """Return the values of the candidate that move the advantage most over their range, the largest effect first.

    Values with a stated range come before others, which are moved a little, and values of the set before overheads;
    defaults and values of 0 are left out. Where an end has no advantage, the other end counts.
    """
    axes = [
        axis
        for axis in _own(trials)
        if axis.domain != "count" and axis.best != 0.0 and axis.value is not None and not axis.value.is_default
    ]
    ends = [_ends(axis) for axis in axes]
    log = trials([{}, *(axis.place(x, {}) for axis, pair in zip(axes, ends, strict=True) for x in pair)]).log
    swing = np.nan_to_num(np.abs(log[1:] - log[0]), nan=0.0, posinf=0.0).reshape(-1, 2).max(axis=1)
    ranged = [axis.value is not None and range_of(axis.value) is not None for axis in axes]
    beside = [axis.name.startswith("candidate.") for axis in axes]
    order = sorted(range(len(axes)), key=lambda k: (not ranged[k], beside[k], -swing[k]))
    return [axes[k] for k in order if swing[k] > NO_EFFECT][:count]


def spread_effects(trials: Trials, level: float) -> list[Axis]:
    """Return the values of the candidate with a stated spread that move the advantage."""
    drawn = [axis for axis in _own(trials) if axis.value is not None and axis.value.spread is not None]
    return [axis for axis, _, moves in _effects(trials, level, drawn) if moves] if drawn else []


def _own(trials: Trials) -> list[Axis]:
    """Return the values that belong to the candidate alone and are parameters of it."""
    candidate = trials.study.candidate.technology.id
    shared = candidate in {side.technology.id for side in trials.study.contenders}
    own = ("candidate.",) if shared else ("candidate.", f"{candidate}.")
    return [
        axis
        for name, axis in known_axes(trials).items()
        if name.startswith(own) and axis.value is not None and axis.value.name not in CONDITIONS
    ]


def _effects(trials: Trials, level: float, axes: Sequence[Axis]) -> list[tuple[Axis, bool, bool]]:
    """Tell of each value whether it is decisive, and whether it has a range and moves the advantage."""
    ends = [_ends(axis) for axis in axes]
    answers = trials([{}, *(axis.place(x, {}) for axis, pair in zip(axes, ends, strict=True) for x in pair)])
    today, moved = answers.advantage[0], answers.advantage[1:].reshape(-1, 2)
    found = []
    for axis, pair in zip(axes, moved, strict=True):
        ranged = axis.value is not None and range_of(axis.value) is not None
        # what makes the candidate lose its last permitted point is on the other side too
        crosses = bool(np.any((pair >= level) != (today >= level)))
        moves = bool(np.any(~(np.abs(pair / today - 1.0) <= NO_EFFECT)))
        evidence = EVIDENCE.get(axis.value.evidence if axis.value is not None else "", EVIDENCE["assumed"])
        found.append((axis, crosses if ranged else moves and evidence.support != "go", moves and ranged))
    return found


def _ends(axis: Axis) -> tuple[float, float]:
    """Return the ends of a stated range; without one, the best estimate moved a little both ways inside its domain."""
    if axis.value is not None and (stated := range_of(axis.value)) is not None:
        return stated
    if axis.domain == "count":
        return max(axis.best - 1.0, 1.0), axis.best + 1.0
    above = 1.0 if axis.domain in ("fraction", "share") else 1.0 + PROBE
    # a value of 0 is moved to where its usual range starts
    return (axis.best * (1.0 - PROBE), axis.best * above) if axis.best != 0.0 else (0.0, axis.smallest)


def _reachable(need: Need) -> str:
    if need.kind == "crossings":
        return "yes, inside the range" if all(crossing.kind == "root" for crossing in need.crossings) else "only a jump"
    return {
        "beyond": "only beyond the range",
        "unreachable": "no",
        "never": "no",
        "always": "met over the whole range",
        "no effect": "does not matter over the range",
        "undefined": "cannot be judged",
    }[need.kind]


def _limit(need: Need) -> str:
    """Say what a value runs into: where a side loses its last permitted point, else its ideal limit."""
    axis = need.axis
    cuts = [
        f"{'up to' if edge.defined_below else 'from'} {axis.text(edge.x)} ({edge.why or 'no permitted point beyond'})"
        for edge in need.edges
    ]
    if need.reach is not None:
        by = f", limited by {need.reach.limit}" if need.reach.limit else ""
        cuts.append(f"largest advantage {need.reach.advantage:.4g} ({need.reach.end}){by}")
    return "; ".join(cuts) or "none inside the range"


def sheet_rows(sheet: Sheet) -> list[dict[str, Any]]:
    """Return one row per required value, and one where there is none."""
    rows = []
    for need in sheet.needs:
        axis = need.axis
        listed: Sequence[Any] = need.crossings or (None,)
        for crossing in listed:
            x = float("nan") if crossing is None else crossing.x
            rows.append(
                {
                    "name": axis.name,
                    "unit": axis.unit,
                    "today": axis.shown(axis.best),
                    "evidence": "" if axis.value is None else axis.value.evidence,
                    "decisive": "yes" if axis.name in sheet.decisive else "no",
                    "required": axis.shown(x),
                    "bound": "" if crossing is None else ("at most" if crossing.above_below else "at least"),
                    "factor": x / axis.best if axis.best > 0.0 and axis.unit != "degC" else float("nan"),
                    "reachable": _reachable(need),
                    "limit": _limit(need),
                    "advantage_with_it": float("nan") if crossing is None else crossing.advantage,
                    "range": range_text(axis),
                    "words": need_text(need),
                }
                | (_at_probability(sheet.tolerances.get(axis.name)) if sheet.tolerances else {})
            )
    return rows


def _at_probability(found: Tolerance | None) -> dict[str, Any]:
    if found is None:
        return dict.fromkeys(TOLERANCE_COLUMNS, float("nan"))
    return {
        "probability": found.probability,
        "probability_today": found.today,
        "probability_error": found.error,
        "required_at_probability": found.axis.shown(found.value),
        "spread_factor": found.spread,
    }
