"""Who must improve: the largest advantage that perfecting one physical term of the candidate could give (layer 7).

A term is perfected in the switch record, the wires or the overheads of the side, and everything above runs as always:
both sides are optimised anew and every requirement binds. So an answer is what the engine says of such a side, not a
formula. Times, losses and leakage become nothing; the resistance and the capacitances of the switch are made smaller
and smaller, and the largest advantage on the way counts. Wires belong to the pair: they are perfected for both sides.
"""

from __future__ import annotations

import dataclasses
import functools
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from benchmark.circuits.circuit import Layer
from benchmark.decide.trials import Trials
from benchmark.devices.record import Switch, SwitchPair
from benchmark.evaluate.side import SideProblem

__all__ = ["GAP_COLUMNS", "Improvement", "Perfected", "gap_rows", "improvements"]

#: factors by which resistance and capacitances are made smaller
SMALLER = (1.0e-12, 1.0e-9, 1.0e-3, 1.0e-1)
#: an advantage that grows by more than this from the second smallest to the smallest factor grows without limit
GROWS = 2.0
GAP_COLUMNS = ("perfected", "side", "advantage", "factor", "share_of_gap", "reaches", "limit", "state")

Change = Callable[[Switch, float], dict[str, Any]]


def _nothing(like: Any) -> Any:
    return np.zeros(np.shape(like))


def _transit(switch: Switch, factor: float) -> dict[str, Any]:
    none = np.full(np.shape(switch.natural_frequency), np.nan)
    return {
        "closing_time": _nothing(switch.closing_time),
        "opening_time": _nothing(switch.opening_time),
        "natural_frequency": none,
        "quality": none,
    }


def _resistance(switch: Switch, factor: float) -> dict[str, Any]:
    return {"resistance": switch.resistance * factor}


def _capacitance(switch: Switch, factor: float) -> dict[str, Any]:
    names = ("input_charge", "input_capacitance_delay", "terminal_capacitance", "terminal_capacitance_delay")
    return {name: getattr(switch, name) * factor for name in names}


def _losses(switch: Switch, factor: float) -> dict[str, Any]:
    return {"extra_energy": _nothing(switch.extra_energy)}


def _leakage(switch: Switch, factor: float) -> dict[str, Any]:
    names = ("off_current_path", "off_current_input_high", "off_current_input_low", "off_current_body", "bias_power")
    return {name: _nothing(getattr(switch, name)) for name in names}


SWITCH_TERMS: dict[str, Change] = {
    "transit": _transit,
    "device resistance": _resistance,
    "device capacitance": _capacitance,
    "losses beyond charge": _losses,
    "leakage and bias": _leakage,
}
#: overhead -> its perfect value
OVERHEADS: dict[str, dict[str, float]] = {
    "level shifters": {"level_shifter_energy": 0.0, "level_shifter_delay": 0.0},
    "supply loss": {"supply_efficiency": 1.0},
    "standing overheads": {"overhead_power": 0.0},
}
WIRE = "wire"
DRIVER, SWITCH, CANDIDATE = "resistance and transit", "the whole switch", "everything of the candidate"
#: what is perfected together
TOGETHER: dict[str, tuple[str, ...]] = {
    DRIVER: ("transit", "device resistance"),
    SWITCH: tuple(SWITCH_TERMS),
    CANDIDATE: (*SWITCH_TERMS, *OVERHEADS),
}


@dataclass(frozen=True)
class Perfected:
    """Terms that are perfect, with the factor of those that are only made smaller."""

    terms: tuple[str, ...]
    factor: float

    def __call__(self, problem: SideProblem) -> SideProblem:
        """Return a side with the terms perfected; of contenders only the wires."""
        if WIRE in self.terms:
            problem = _without_wires(problem)
        if problem.role != "candidate":
            return problem
        changes = [SWITCH_TERMS[term] for term in self.terms if term in SWITCH_TERMS]
        if changes:
            switch = functools.partial(_perfect_switches, problem.device.switch, changes, self.factor)
            problem = dataclasses.replace(problem, device=dataclasses.replace(problem.device, switch=switch))
        overhead = dict(problem.overhead)
        for term in self.terms:
            for name, value in OVERHEADS.get(term, {}).items():
                if name in overhead:
                    overhead[name] = np.full_like(overhead[name], value)
        return dataclasses.replace(problem, overhead=overhead)


def _perfect_switches(
    model: Callable[..., SwitchPair], changes: Sequence[Change], factor: float, *arguments: Any
) -> SwitchPair:
    """Switch records of a model with some of their fields perfect."""
    pair = model(*arguments)

    def perfect(switch: Switch) -> Switch:
        return dataclasses.replace(switch, **{k: v for change in changes for k, v in change(switch, factor).items()})

    return dataclasses.replace(pair, down=perfect(pair.down), up=perfect(pair.up))


def _without_wires(problem: SideProblem) -> SideProblem:
    layers = {name: Layer(0.0, 0.0) for name in problem.circuit.layers}
    zero = np.zeros((1, 1, 1))
    return dataclasses.replace(
        problem,
        wires=dataclasses.replace(problem.wires, resistance_per_length=zero, capacitance_per_length=zero),
        circuit=dataclasses.replace(problem.circuit, layers=layers),
    )


@dataclass(frozen=True)
class Improvement:
    """The largest advantage with some terms perfect.

    ``limit``: the largest term of the candidate's delay or energy that is left; ``state``: who has no permitted point.
    """

    name: str
    side: str
    advantage: float
    limit: str
    state: str


def improvements(trials: Trials) -> list[Improvement]:
    """Perfect every term alone, then the terms of the switch and of the candidate together.

    Parameters
    ----------
    trials : Trials
        Of the study and pair asked about.

    Returns
    -------
    list of Improvement
        Today's state first; then one for each term the candidate has, the largest advantage first; then what is
        perfected together.
    """
    metric = trials.study.policy.metric
    today = float(trials.best.advantage[0])
    shared = trials.study.candidate.technology.id in {side.technology.id for side in trials.study.contenders}
    note = "candidate, whose set is also a contender's" if shared else "candidate"
    overhead = trials.problems["candidate"].overhead
    single = list(SWITCH_TERMS)
    single += [
        term
        for term, perfect in OVERHEADS.items()
        if any(name in overhead and np.any(overhead[name] != value) for name, value in perfect.items())
    ]
    alone = [_perfected(trials, term, (term,), note) for term in single]
    alone.append(_perfected(trials, WIRE, (WIRE,), "both, the wires are shared"))
    alone.sort(key=lambda item: -np.nan_to_num(item.advantage, nan=-1.0, posinf=np.finfo(float).max))
    together = [_perfected(trials, name, terms, note) for name, terms in TOGETHER.items()]
    start = Improvement("nothing, as it is today", "", today, trials.best.limit(0, metric), trials.best.state(0))
    return [start, *alone, *together]


def _perfected(trials: Trials, name: str, terms: tuple[str, ...], side: str) -> Improvement:
    """Return the largest advantage on the way to perfect terms; infinite where it grows without limit."""
    smaller = SMALLER if {"device resistance", "device capacitance"} & set(terms) else SMALLER[:1]
    found = []
    for factor in smaller:
        perfect = Perfected(terms, factor)
        with np.errstate(all="ignore"):
            best = Trials(trials.study, trials.pair, trials.policy, alter=perfect, frozen=trials.frozen).best
        found.append(best)
    advantages = np.array([answers.advantage[0] for answers in found])
    if len(found) > 1 and advantages[0] > GROWS * advantages[1]:
        limit = found[0].limit(0, trials.study.policy.metric)
        return Improvement(name, side, float("inf"), limit, "grows without limit")
    known = np.nan_to_num(advantages, nan=-1.0)
    # of nearly equal ones the most perfect counts
    chosen = found[int(np.flatnonzero(known >= known.max() * (1.0 - 1e-9))[0])] if known.max() > 0.0 else found[0]
    limit = chosen.limit(0, trials.study.policy.metric)
    return Improvement(name, side, float(chosen.advantage[0]), limit, chosen.state(0))


def gap_rows(found: Sequence[Improvement], level: float) -> list[dict[str, Any]]:
    """Return one row per improvement.

    ``share_of_gap``: ln of the factor over ln of the factor with everything of the candidate perfect; nan where one of
    them is not finite.
    """
    today = found[0].advantage
    ideal = next(item.advantage for item in found if item.name == CANDIDATE)
    gap = _log(ideal, today)
    return [
        {
            "perfected": item.name,
            "side": item.side,
            "advantage": item.advantage,
            "factor": item.advantage / today if today > 0.0 else float("nan"),
            "share_of_gap": _log(item.advantage, today) / gap if np.isfinite(gap) and gap > 0.0 else float("nan"),
            "reaches": "yes" if item.advantage >= level else "no",
            "limit": item.limit,
            "state": item.state,
        }
        for item in found
    ]


def _log(advantage: float, today: float) -> float:
    """Return ln(advantage / today); nan where one is not a positive finite number."""
    usable = np.isfinite(advantage) and advantage > 0.0 and np.isfinite(today) and today > 0.0
    return float(np.log(advantage / today)) if usable else float("nan")
