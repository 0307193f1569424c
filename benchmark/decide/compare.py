"""Candidate against every contender, for every row of a batch, under one policy (layer 7).

advantage = metric of the strongest contender / metric of the candidate (all metrics are costs), so above 1 always
favours the candidate. The strongest contender is the one with the lowest metric among those that meet the
requirements: the lower envelope. Where a side has no permitted point the advantage is not a number.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.infeasible import why_infeasible
from benchmark.decide.policies import PolicyInputs, metric_of, optimum
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.points import cycle_time
from benchmark.evaluate.search import Alteration, Optimum, SideRun
from benchmark.evaluate.side import build_side, keys_of
from benchmark.sets.study import Choice, NodePair, Side, Study

__all__ = ["Comparison", "Outcome", "SideOutcome", "choice_of", "ratio"]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]


@dataclass(frozen=True)
class SideOutcome:
    """One side under one policy; arrays over the rows of the whole batch."""

    id: str
    optimum: Optimum  # over the side's own rows; row 0 is the best estimate
    metric: Array
    found: Mask
    energy: Array
    time: Array
    area: Array
    supply: Array
    why: str  # why the best estimate has no permitted point; empty when it has one


@dataclass(frozen=True)
class Outcome:
    """All sides under one policy. ``strongest`` indexes ``contenders`` (-1: no contender has a permitted point).

    ``unknown``: why the best estimate cannot be compared, when a value that the metric or the required time needs is
    not known.
    """

    policy: str
    candidate: SideOutcome
    contenders: tuple[SideOutcome, ...]
    strongest: NDArray[np.intp]
    advantage: Array
    unknown: tuple[str, ...] = ()

    @property
    def strongest_side(self) -> SideOutcome | None:
        """The strongest contender at the best estimate."""
        return None if self.strongest[0] < 0 else self.contenders[int(self.strongest[0])]

    def advantage_over(self, position: int) -> float:
        """Advantage over one contender at the best estimate; nan when undefined."""
        contender = self.contenders[position]
        if not (contender.found[0] and self.candidate.found[0]):
            return float("nan")
        return float(ratio(contender.metric[:1], self.candidate.metric[:1])[0])


class Comparison:
    """A study at one node pair over a batch. Each side evaluates only the rows that can change it.

    Parameters
    ----------
    study : Study
    pair : NodePair
    batch : Batch
    frozen : mapping, optional
        Choice of every side that is to be kept.
    alter : callable, optional
        Applied to every side as it is built.
    """

    def __init__(
        self,
        study: Study,
        pair: NodePair,
        batch: Batch,
        *,
        frozen: Mapping[str, Choice] | None = None,
        alter: Alteration | None = None,
    ) -> None:
        self.study, self.pair, self.batch, self.alter = study, pair, batch, alter
        self.frozen = dict(frozen or {})
        self._position: dict[str, NDArray[np.intp]] = {}
        self.candidate = self._run(study.candidate, "candidate")
        self.contenders = {
            side.id: self._run(side, "contender") for side in study.contenders if side.id in pair.reference
        }

    def _key(self, side: Side, role: str) -> str:
        return f"{role} {side.id}"

    def _run(self, side: Side, role: str) -> SideRun:
        rows, position = self.batch.distinct(keys_of(self.pair, side, role))
        self._position[self._key(side, role)] = position
        return SideRun(build_side(self.study, side, role, self.pair, self.batch.take(rows)), self.pair, self.alter)

    def key(self, run: SideRun) -> str:
        """Return the key of a side among the frozen choices."""
        return self._key(run.problem.side, run.problem.role)

    def own_rows(self, run: SideRun, mask: Mask) -> Mask:
        """Return which of a side's own rows a mask over all rows of the batch asks for."""
        own = np.zeros(run.problem.batch.rows, dtype=bool)
        own[self._position[self.key(run)][mask]] = True
        return own

    def widen(self, run: SideRun, array: Array) -> Array:
        """Spread an array over a side's own rows (or one row) to all rows of the batch."""
        if array.shape[0] == 1:
            return np.broadcast_to(array, (self.batch.rows, *array.shape[1:]))
        return np.asarray(array[self._position[self.key(run)]])

    def required_time(self) -> Array | None:
        """Return T* (1 or row, 1), nan where it is not known, or None when the study has none."""
        required = self.study.policy.required_time
        if required == "":
            return None
        if isinstance(required, float):
            return np.asarray([[required]])
        if required == "cycle":
            return None if (cycle := cycle_time(self.candidate.problem)) is None else self.widen(self.candidate, cycle)
        run = self.contenders[required.removeprefix("contender:")]
        points = run.declared()
        # where the declared point does not work its time means nothing
        return self.widen(run, np.where(points.able, points.interval, np.nan))

    def policy_inputs(self) -> PolicyInputs:
        """Collect what the study's policies need."""
        policy = self.study.policy
        first = next(iter(self.contenders.values()))
        return PolicyInputs(
            required_time=self.required_time(),
            required_energy=policy.required_energy,
            exponent=policy.exponent,
            same_supply=self.widen(first, first.problem.declared_supply[:, 0, :]),
        )

    def side_outcome(self, policy: str, run: SideRun, inputs: PolicyInputs, *, floor: bool = True) -> SideOutcome:
        """Optimise one side; ``floor=False`` leaves the functional floor aside."""
        frozen = self.frozen.get(self.key(run))
        found = self.widened(run, optimum(policy, run, inputs, frozen, floor=floor))
        why = "" if found.found[0] or self.batch.rows > 1 else why_infeasible(policy, run, inputs)
        return dataclasses.replace(found, why=why)

    def widened(self, run: SideRun, best: Optimum) -> SideOutcome:
        """Spread an optimum over a side's own rows to all rows of the batch."""
        points = best.points
        found = self.widen(run, best.found.astype(np.float64)) > 0.0
        return SideOutcome(
            run.problem.side.id,
            best,
            self.widen(run, metric_of(self.study.policy.metric, points)[:, 0]),
            np.asarray(found),
            self.widen(run, points.energy[:, 0]),
            self.widen(run, points.time[:, 0]),
            self.widen(run, points.area[:, 0]),
            self.widen(run, points.supply[:, 0]),
            "",
        )

    def outcome(self, policy: str, *, enforce: bool = True) -> Outcome:
        """Compare all sides under one policy; ``enforce=False`` sets the hard requirements aside."""
        inputs = dataclasses.replace(self.policy_inputs(), enforce_requirements=enforce)
        candidate = self.side_outcome(policy, self.candidate, inputs)
        contenders = tuple(self.side_outcome(policy, run, inputs) for run in self.contenders.values())
        return self.compared(policy, inputs, candidate, contenders)

    def compared(
        self, policy: str, inputs: PolicyInputs, candidate: SideOutcome, contenders: tuple[SideOutcome, ...]
    ) -> Outcome:
        """Find the strongest contender of every row and the advantage over it."""
        costs = costs_of(contenders)
        strongest = np.argmin(costs, axis=0)
        lowest = costs[strongest, np.arange(self.batch.rows)]
        defined = np.isfinite(lowest) & candidate.found
        advantage = np.full(self.batch.rows, np.nan)
        advantage[defined] = ratio(lowest[defined], candidate.metric[defined])
        return Outcome(
            policy,
            candidate,
            contenders,
            np.where(np.isfinite(lowest), strongest, -1),
            advantage,
            tuple(self._unknown(inputs, (candidate, *contenders))),
        )

    def _unknown(self, inputs: PolicyInputs, sides: tuple[SideOutcome, ...]) -> list[str]:
        """Say what is missing for a comparison at the best estimate."""
        metric = self.study.policy.metric.replace("-", " ")
        found = [
            f"{side.id}: its {metric} is not known (a value it needs is not stated)"
            for side in sides
            if side.found[0] and np.isnan(side.metric[0])
        ]
        if inputs.required_time is not None and np.isnan(inputs.required_time[0, 0]):
            required = str(self.study.policy.required_time).removeprefix("contender:")
            found.append(f"the required time is not known: {required} cannot be evaluated at its declared supply")
        return found

    def frozen_choices(self, outcome: Outcome) -> dict[str, Choice]:
        """Return what each side chose at the best estimate; its frozen parts are meant to be kept."""
        found = {f"candidate {outcome.candidate.id}": choice_of(outcome.candidate)}
        found |= {f"contender {side.id}": choice_of(side) for side in outcome.contenders}
        return found


def costs_of(contenders: Sequence[SideOutcome]) -> Array:
    """Return the metric of every contender (contender, row), infinite where it has no permitted point."""
    return np.stack([np.where(side.found & ~np.isnan(side.metric), side.metric, np.inf) for side in contenders])


def ratio(reference: Array, candidate: Array) -> Array:
    """Reference over candidate; nothing against nothing is a tie, something against nothing is infinite."""
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = reference / candidate
    return np.asarray(np.where((reference == 0.0) & (candidate == 0.0), 1.0, ratio))


def choice_of(side: SideOutcome) -> Choice:
    """Return what a side chose at the best estimate, besides its supply."""
    points = side.optimum.points
    return Choice(points.size, points.threshold_shift, points.copies, float(points.back_bias[0, 0]))
