"""Strength of the reference: the advantage as one side is allowed one more mitigation after another (layer 7).

Rungs, each keeping what the rungs before it allow:

declared point          the first contender of the study (the candidate) at its declared supply
own best supply         supplies from ``SCALED`` of the declared one upwards: usual supply scaling
best flavour            every contender of the study, every size and threshold shift of a side
near-threshold supply   the whole supply range of the study
parallel copies         the copies of the study
power gating            the supply may be cut while idle
back bias               the back biases of the study; from here on everything the study offers is allowed

The other side keeps everything the study offers it, so the last rung is the answer of the study. Points are chosen by
the primary policy with the same limits on every rung: what a rung allows is a subset of what the next one allows, so
a rung never weakens the side it is given to, as long as the policy makes small what the study compares.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

import numpy as np

from benchmark.decide.compare import Comparison, Outcome, ratio
from benchmark.decide.infeasible import why_infeasible
from benchmark.decide.moves import reaches
from benchmark.decide.policies import PolicyInputs, metric_of, optimum
from benchmark.evaluate.search import Optimum, SideRun
from benchmark.sets.study import Side, Study

__all__ = ["RUNGS", "SCALED", "Ladder", "Liberties", "Rung", "climb", "ladders"]

Role = Literal["reference", "candidate"]
State = Literal["lost", "reached", "kept", "never", "undefined"]
#: lowest supply of the rung "own best supply" over the declared supply (common practice, no source)
SCALED = 0.7


@dataclass(frozen=True)
class Liberties:
    """What a side may choose on a rung."""

    supply: Literal["declared", "scaled", "whole"] = "declared"
    flavours: bool = False
    copies: bool = False
    gating: bool = False
    back_bias: bool = False


def _rungs() -> Iterator[tuple[str, Liberties]]:
    allowed = Liberties()
    yield "declared point", allowed
    for name, change in (
        ("own best supply", {"supply": "scaled"}),
        ("best flavour", {"flavours": True}),
        ("near-threshold supply", {"supply": "whole"}),
        ("parallel copies", {"copies": True}),
        ("power gating", {"gating": True}),
        ("back bias", {"back_bias": True}),
    ):
        allowed = dataclasses.replace(allowed, **change)
        yield name, allowed


#: name and liberties of every rung, in order
RUNGS: tuple[tuple[str, Liberties], ...] = tuple(_rungs())


@dataclass(frozen=True)
class Rung:
    """One rung at the best estimate. ``advantage`` is nan where a side has no permitted point: ``why`` says which.

    ``offered``: the study offers this mitigation to the side; otherwise nothing changes on this rung. ``side`` is the
    strongest permitted one, with its supply [V], copies, back bias [V] and whether it is gated while idle.
    """

    name: str
    offered: bool
    advantage: float
    side: str
    supply: float
    copies: float
    back_bias: float
    gated: bool
    why: str


@dataclass(frozen=True)
class Ladder:
    """All rungs of one side, and what becomes of the required advantage on the way up.

    ``state``: it is lost or reached at the rung ``turn``; kept on all rungs or reached never (``turn`` empty);
    undefined: on no rung do both sides have a permitted point.
    """

    of: Role
    rungs: tuple[Rung, ...]
    state: State
    turn: str


@dataclass(frozen=True)
class _Chosen:
    """What one side chose on one rung; ``metric`` is nan when it has no permitted point."""

    name: str
    run: SideRun | None
    best: Optimum | None
    metric: float
    why: str = ""


def restricted(side: Side, declared: float, allowed: Liberties, *, gates: bool) -> Side | None:
    """Return a side with some of its liberties only; None where the declared supply is missing or not in its range.

    ``gates``: the study has a block that may be gated.
    """
    low, high = side.supply
    if allowed.supply != "whole":
        if not low * (1.0 - 1e-12) <= declared <= high * (1.0 + 1e-12):  # nan: no declared supply
            return None
        low, high = (declared, declared) if allowed.supply == "declared" else (max(low, SCALED * declared), high)
    return dataclasses.replace(
        side,
        supply=(low, high),
        sizes=side.sizes if allowed.flavours else side.sizes[:1],
        threshold_shifts=side.threshold_shifts if allowed.flavours else side.threshold_shifts[:1],
        copies=side.copies if allowed.copies else (1.0,),
        back_biases=side.back_biases if allowed.back_bias else (0.0,),
        may_gate=side.may_gate and (allowed.gating or not gates),
    )


def _offered(study: Study, sides: list[Side], name: str) -> bool:
    """Tell whether the study offers the mitigation of a rung to any of these sides."""
    supplies = any(side.supply[0] < side.supply[1] for side in sides)
    return {
        "declared point": True,
        "own best supply": supplies,
        "best flavour": len(sides) > 1 or any(len(side.sizes) * len(side.threshold_shifts) > 1 for side in sides),
        "near-threshold supply": supplies,
        "parallel copies": any(side.copies != (1.0,) for side in sides),
        "power gating": study.idle == "gated",
        "back bias": any(side.back_biases != (0.0,) for side in sides),
    }[name]


class _Climber:
    """Evaluates sides with fewer liberties, each distinct set of them once."""

    def __init__(self, comparison: Comparison, outcome: Outcome) -> None:
        self.study, self.policy = comparison.study, outcome.policy
        self.inputs: PolicyInputs = comparison.policy_inputs()
        self.candidate = comparison.candidate
        self.contenders = list(comparison.contenders.values())
        self._found: dict[tuple[object, ...], _Chosen] = {}
        sides = (outcome.candidate, *outcome.contenders)
        for run, side in zip((self.candidate, *self.contenders), sides, strict=True):
            metric = float(side.metric[0]) if side.found[0] else float("nan")
            self._found[_key(run, run.problem.side)] = _Chosen(side.id, run, side.optimum, metric, side.why)

    def chosen(self, run: SideRun, allowed: Liberties) -> _Chosen:
        """Return what a side chooses with these liberties."""
        problem = run.problem
        declared = float(problem.declared_supply[0, 0, 0])
        side = restricted(problem.side, declared, allowed, gates=self.study.idle == "gated")
        if side is None:
            why = "no supply is declared" if np.isnan(declared) else "the declared supply is outside the supply range"
            return _Chosen(problem.side.id, None, None, float("nan"), why)
        key = _key(run, side)
        if key not in self._found:
            own = SideRun(dataclasses.replace(problem, side=side), run.pair)
            best = optimum(self.policy, own, self.inputs)
            metric = metric_of(self.study.policy.metric, best.points)[0, 0] if best.found[0] else np.nan
            self._found[key] = _Chosen(side.id, own, best, float(metric))
        return self._found[key]

    def reason(self, listed: list[_Chosen]) -> str:
        """Say why none of these sides has a number."""
        found = []
        for chosen in listed:
            why = chosen.why
            if not why and chosen.run is not None and chosen.best is not None:
                unknown = f"its {self.study.policy.metric.replace('-', ' ')} is not known"
                why = unknown if chosen.best.found[0] else why_infeasible(self.policy, chosen.run, self.inputs)
            found.append(f"{chosen.name}: {why or 'no permitted point'}")
        return "; ".join(found)


def _key(run: SideRun, side: Side) -> tuple[object, ...]:
    liberties = (side.supply, side.sizes, side.threshold_shifts, side.copies, side.back_biases, side.may_gate)
    return (run.problem.role, side.id, *liberties)


def _rung(climber: _Climber, of: Role, name: str, offered: bool, allowed: Liberties) -> Rung:
    """Evaluate one rung."""
    whole = RUNGS[-1][1]
    first_only = of == "reference" and not allowed.flavours
    rivals = [
        climber.chosen(run, allowed if of == "reference" else whole)
        for run in (climber.contenders[:1] if first_only else climber.contenders)
    ]
    candidate = climber.chosen(climber.candidate, allowed if of == "candidate" else whole)
    known = [rival for rival in rivals if not np.isnan(rival.metric)]
    strongest = min(known, key=lambda rival: rival.metric) if known else None
    shown = strongest if of == "reference" else candidate
    advantage, why = float("nan"), ""
    if np.isnan(candidate.metric):
        why = climber.reason([candidate])
    elif strongest is None:
        why = climber.reason(rivals)
    else:
        advantage = float(ratio(np.asarray(strongest.metric), np.asarray(candidate.metric)))
    if shown is None or shown.best is None or not shown.best.found[0]:
        nan = float("nan")
        return Rung(name, offered, advantage, "", nan, nan, nan, False, why)
    points = shown.best.points
    return Rung(
        name,
        offered,
        advantage,
        shown.name,
        float(points.supply[0, 0]),
        points.copies,
        float(points.back_bias[0, 0]),
        bool(points.gated[0, 0]),
        why,
    )


def climb(comparison: Comparison, outcome: Outcome, of: Role) -> Ladder:
    """Evaluate all rungs of one side at the best estimate.

    Parameters
    ----------
    comparison, outcome
        The study at one node pair (one row), and its outcome under the policy to use.
    of : "reference" or "candidate"
        Whose liberties grow; the other side keeps all of its own.
    """
    return _climb(_Climber(comparison, outcome), of)


def _climb(climber: _Climber, of: Role) -> Ladder:
    runs = climber.contenders if of == "reference" else [climber.candidate]
    sides = [run.problem.side for run in runs]
    rungs: list[Rung] = []
    for name, allowed in RUNGS:
        offered = _offered(climber.study, sides, name)
        if offered or not rungs:
            rungs.append(_rung(climber, of, name, offered, allowed))
        else:
            rungs.append(dataclasses.replace(rungs[-1], name=name, offered=False))
    return Ladder(of, tuple(rungs), *_turn(of, rungs, climber.study.required_advantage))


def _turn(of: Role, rungs: list[Rung], required: float) -> tuple[State, str]:
    """Tell what becomes of the required advantage on the way up, and on which rung."""
    known = [rung for rung in rungs if not np.isnan(rung.advantage)]
    reached = [reaches(rung.advantage, required) for rung in known]
    if not known:
        return "undefined", ""
    if len(set(reached)) > 1:
        turning = next(rung for rung, reach in zip(known, reached, strict=True) if reach != reached[0])
        return ("lost" if reached[0] else "reached"), turning.name
    return ("kept" if reached[0] else "never"), ""


def ladders(comparison: Comparison, outcome: Outcome) -> tuple[Ladder, Ladder]:
    """Return the ladder of the reference and that of the candidate; see ``climb``."""
    climber = _Climber(comparison, outcome)
    return _climb(climber, "reference"), _climb(climber, "candidate")
