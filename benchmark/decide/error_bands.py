"""What the closed forms of a verdict are worth: measured bands of both sides, and of the advantage (layer 7).

For the candidate and the strongest contender every stage of the circuit is looked up at the design point the verdict
rests on (``benchmark.evaluate.bands``): delay at the temperature that sets it, energy and leakage at the highest. Over
stages whose parts x_i have bands a_i .. b_i (closed over simulated) the total lies in::

    sum(x_i) / sum(x_i / a_i)  ..  sum(x_i) / sum(x_i / b_i)

as if all stages erred alike, the widest case. Stages without a band count as exact there, their share is stated, and
the reason is a warning. Energy per operation is put together from dynamic energy, leakage (over a time that errs too
where the cycle is the path delay), and parts no closed form has a hand in (overheads).

Advantage in energy: the candidate's energy errs one way and the reference's the other. Where the policy asks for a
required time T, a delay that is really t / r must be r T by the closed form, so each side's energy is taken at that
other time from the curve of the study.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from benchmark.circuits.operation import estimate
from benchmark.circuits.sized import Sized
from benchmark.circuits.stage import StageDetail
from benchmark.decide.compare import Comparison, Outcome, SideOutcome
from benchmark.decide.curves import Envelope
from benchmark.evaluate.bands import find, stage_facts
from benchmark.evaluate.points import Points
from benchmark.evaluate.search import SideRun
from benchmark.sets.study import Study

__all__ = ["AdvantageBand", "SideBand", "advantage_band", "band_warnings", "side_bands"]

#: a share of a total below this is not worth a warning
_LEAST_SHARE = 1e-3
#: models whose numbers are stated stage results: no closed form stands between them and the verdict
_STATED = frozenset({"stage-table"})


@dataclass(frozen=True)
class SideBand:
    """Band of one quantity of one side.

    low, high [1]
        Closed over simulated; nan when nothing is covered.
    covered [1]
        Share of the quantity that has a band.
    points
        Measured points behind it.
    over
        Where they were measured.
    missing
        (share, reason) of what has none.
    """

    side: str
    role: str
    quantity: str
    low: float
    high: float
    covered: float
    points: int
    over: str
    missing: tuple[tuple[float, str], ...] = ()

    @property
    def ends(self) -> tuple[float, float]:
        """Both ends, 1 where there is no band."""
        return (self.low, self.high) if self.points else (1.0, 1.0)


@dataclass(frozen=True)
class AdvantageBand:
    """Advantage if the closed forms err as they were measured to; ``low`` 0: the required time may be missed."""

    low: float
    high: float
    straddles: bool


def _sides(comparison: Comparison, outcome: Outcome) -> list[tuple[str, SideOutcome, SideRun]]:
    sides = [("candidate", outcome.candidate, comparison.candidate)]
    strongest = outcome.strongest_side
    if strongest is not None:
        sides.append(("contender", strongest, comparison.contenders[strongest.id]))
    return [(role, side, run) for role, side, run in sides if side.found[0] and run.problem.device.name not in _STATED]


def _stages(run: SideRun, points: Points, kelvin: float) -> tuple[tuple[StageDetail, ...], Sized]:
    """Estimate the circuit at the chosen point and one temperature."""
    problem = run.problem
    supply = points.supply[:1]
    shift = problem.device_shift(points.threshold_shift, points.back_bias[:1])
    pair = problem.switches(supply, shift, (kelvin,))
    metrics = estimate(
        problem.circuit_at(supply, points.size, shift),
        pair,
        problem.wires,
        problem.study.delay_rule,
        size=points.size,
        size_as=problem.size_as,
        short_circuit=problem.study.short_circuit == "estimated",
    )
    return metrics.stages, Sized(pair, points.size, problem.size_as)


def _band(
    names: tuple[str, str, str, str],
    run: SideRun,
    sized: Sized,
    kelvin: float,
    parts: Iterable[tuple[StageDetail, Any]],
) -> SideBand:
    """Put the bands of all stages together. ``names``: side, role, quantity shown, quantity looked up."""
    side, role, shown, quantity = names
    model, rule = run.problem.device.name, run.problem.study.delay_rule
    covered = least = most = 0.0
    counted: dict[str, int] = {}
    missing: dict[str, float] = {}
    for stage, value in parts:
        part = float(np.max(value))
        if not part > 0.0:
            continue
        cell = stage.net.driver.name
        if stage.net.gated:
            found = find(quantity, model, rule, cell, stage_facts(stage, sized, kelvin))
            why, over = found.why, f"{cell}: {found.over}"
        else:
            why = f"net {stage.net.name} is driven by no gate"
        if why:
            missing[why] = missing.get(why, 0.0) + part
            continue
        covered, least, most = covered + part, least + part / found.high, most + part / found.low
        counted[over] = found.points
    total = covered + sum(missing.values())
    return SideBand(
        side,
        role,
        shown,
        covered / most if covered else math.nan,
        covered / least if covered else math.nan,
        covered / total if total > 0.0 else 1.0,
        sum(counted.values()),
        "; ".join(counted),
        tuple((part / total, why) for why, part in missing.items()),
    )


def side_bands(comparison: Comparison, outcome: Outcome) -> list[SideBand]:
    """Return the bands of delay, dynamic energy, leakage and energy per operation of both sides, best estimate."""
    return [band for role, side, run in _sides(comparison, outcome) for band in _of_side(role, side, run)]


def _of_side(role: str, side: SideOutcome, run: SideRun) -> list[SideBand]:
    points, study = side.optimum.points, run.problem.study
    slowest = study.temperatures[int(points.slowest_temperature[0, 0])]
    stages, sized = _stages(run, points, slowest)
    timed = [(stage, stage.net.on_critical_path * stage.delay) for stage in stages]
    delay = _band((side.id, role, "delay", "delay"), run, sized, slowest, timed)
    hot = study.temperatures[-1]
    stages, sized = _stages(run, points, hot)
    charged = [(stage, stage.net.count * stage.net.rising_per_operation * stage.energy) for stage in stages]
    quantity = "energy" if study.short_circuit == "estimated" else "energy without short circuit"
    dynamic = _band((side.id, role, "dynamic energy", quantity), run, sized, hot, charged)
    leaking = [(stage, stage.net.count * stage.leakage_power) for stage in stages]
    leakage = _band((side.id, role, "leakage", "leakage"), run, sized, hot, leaking)
    return [delay, dynamic, leakage, _operation(points, delay, dynamic, leakage)]


def _operation(points: Points, delay: SideBand, dynamic: SideBand, leakage: SideBand) -> SideBand:
    """Return the band of the energy per operation."""

    def share(value: Any) -> float:
        return float(np.ravel(value)[0] / points.efficiency.ravel()[0] / points.energy[0, 0])

    switched = share(sum(points.dynamic_parts.values()))
    running, idle = share(points.energy_parts["leakage"]), share(points.energy_parts["idle"])
    follows = bool(points.cycle[0, 0] == points.time[0, 0])  # the cycle is the path delay
    found = []
    for end in (0, 1):
        late = delay.ends[end] if follows else 1.0
        true = switched / dynamic.ends[end] + (running / late + idle) / leakage.ends[end]
        found.append(1.0 / (true + 1.0 - switched - running - idle))
    covered = 1.0 - switched * (1.0 - dynamic.covered) - (running + idle) * (1.0 - leakage.covered)
    whole = dynamic.points + leakage.points
    low, high = found
    return SideBand(delay.side, delay.role, "energy per operation", low, high, covered, whole, "as its parts")


def advantage_band(
    comparison: Comparison, outcome: Outcome, envelope: Envelope, bands: list[SideBand]
) -> AdvantageBand | None:
    """Return what the bands of both sides make of the advantage; None where there is none to speak of.

    For the metrics energy, time and leakage; an area has no closed form.
    """
    study = comparison.study
    advantage = float(outcome.advantage[0])
    quantity = {
        "energy-per-operation": "energy per operation",
        "time-per-operation": "delay",
        "leakage-power": "leakage",
    }.get(study.policy.metric)
    if quantity is None or not math.isfinite(advantage):
        return None
    candidate = {band.quantity: band.ends for band in bands if band.role == "candidate"}
    reference = {band.quantity: band.ends for band in bands if band.role == "contender"}
    exact = (1.0, 1.0)
    mine, theirs = candidate.get(quantity, exact), reference.get(quantity, exact)
    low, high = advantage * mine[0] / theirs[1], advantage * mine[1] / theirs[0]
    if quantity == "energy per operation" and outcome.policy in ("iso-delay", "minimum-energy"):
        required = comparison.required_time()
        if required is not None:
            at = float(required[0, 0])
            mine, theirs = candidate.get("delay", exact), reference.get("delay", exact)
            low *= _dearer(envelope, envelope.reference_energy, at, theirs[1])
            low /= _dearer(envelope, envelope.candidate_energy, at, mine[0])
            high *= _dearer(envelope, envelope.reference_energy, at, theirs[0])
            high /= _dearer(envelope, envelope.candidate_energy, at, mine[1])
    low, high = min(low, advantage), max(high, advantage)
    limit = study.required_advantage
    return AdvantageBand(low, high, (low >= limit) != (high >= limit))


def _dearer(envelope: Envelope, energy: Any, time: float, ratio: float) -> float:
    """Return energy at ``ratio`` x the required time over energy at that time; infinite where it is out of reach."""
    known = np.isfinite(energy)
    if not known.any():
        return 1.0
    at, values = np.log(envelope.time[known]), np.log(energy[known])
    wanted, start = math.log(time * ratio), math.log(time)
    if wanted < at[0]:
        return math.inf
    return float(np.exp(np.interp(wanted, at, values) - np.interp(max(start, at[0]), at, values)))


def band_warnings(study: Study, bands: list[SideBand], advantage: AdvantageBand | None) -> list[str]:
    """Say what the closed forms were not measured for, and whether their error can turn the answer."""
    found = []
    for side in dict.fromkeys(band.side for band in bands):
        reasons: dict[str, list[str]] = {}
        for band in bands:
            if band.side == side:
                for share, why in band.missing:
                    if share >= _LEAST_SHARE:
                        part = "" if share > 1.0 - _LEAST_SHARE else f" ({100.0 * share:.2g} %)"
                        reasons.setdefault(why, []).append(f"{band.quantity}{part}")
        found += [
            f"{side}: closed form not measured here for {' and '.join(parts)}: {why}" for why, parts in reasons.items()
        ]
    if advantage is not None and advantage.straddles:
        found.append(
            f"the measured error of the closed forms can turn the answer: they leave the advantage between "
            f"{advantage.low:.3g} and {advantage.high:.3g}, required {study.required_advantage:g}"
        )
    return found
