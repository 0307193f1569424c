"""What a study answers at trial values: the advantage, who has no permitted point, and what limits (layer 7).

A trial is a mapping from keys to SI numbers; everything it does not name keeps its best estimate. A key is a ledger key
(``owner.name``), ``required_time`` (the required time of the policy) or ``temperature`` (the highest temperature of the
study; listed temperatures above it are left out). In every trial both sides are optimised anew, with the frozen
choices of the best estimate kept.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.compare import Comparison, Outcome
from benchmark.decide.limiting import DELAY_GROUPS, ENERGY_GROUPS, groups_of
from benchmark.decide.moves import permitted_advantage
from benchmark.decide.strongest import strongest_outcome
from benchmark.devices.model import ModelInputs
from benchmark.errors import EvenloadError, UsageError
from benchmark.evaluate.batch import Batch, resolve
from benchmark.evaluate.search import Alteration
from benchmark.evaluate.side import values_by_key
from benchmark.measured import MeasuredTable
from benchmark.sets.study import Choice, NodePair, Study

__all__ = ["REQUIRED_TIME", "TEMPERATURE", "Answers", "Timed", "Trial", "Trials", "study_at"]

Array = NDArray[np.float64]
Trial = Mapping[str, float]
REQUIRED_TIME = "required_time"
TEMPERATURE = "temperature"
#: rows evaluated at once: bounds the memory, changes no number
ROWS_AT_ONCE = 300
_TIME_COLUMN = f"study.{REQUIRED_TIME}"


class Timed(Comparison):
    """A comparison in which the required time may differ from row to row."""

    def required_time(self) -> Array | None:
        """Return the trial values of the required time, if the batch has some."""
        column = self.batch.columns.get(_TIME_COLUMN)
        return super().required_time() if column is None else np.asarray(column)[:, None]


@dataclass(frozen=True)
class Answers:
    """Answers to trials, arrays over them.

    ``advantage`` is nan where a side has no permitted point; ``meets``: the candidate misses none of the listed
    requirements there. ``strongest``: which contender counts, -1 where none has a permitted point; ``contenders``:
    (contender, trial) which of them have one, certain only in answers of ``Trials.whole``. ``delay_shares`` and
    ``energy_shares`` belong to the candidate's optimum, nan without one. ``refused``: why a trial cannot be evaluated
    at all, empty where it can.
    """

    advantage: Array
    meets: NDArray[np.bool_]
    candidate: NDArray[np.bool_]
    contenders: NDArray[np.bool_]
    names: tuple[str, ...]
    strongest: NDArray[np.intp]
    delay_shares: Mapping[str, Array]
    energy_shares: Mapping[str, Array]
    refused: tuple[str, ...]

    @property
    def log(self) -> Array:
        """ln(advantage): minus infinity for 0, nan where there is none."""
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.asarray(np.log(self.advantage))

    def state(self, row: int) -> str:
        """Who has no permitted point in one trial; empty when both sides have one."""
        if self.refused[row]:
            return self.refused[row]
        if not self.candidate[row]:
            return "the candidate has no permitted point"
        if self.strongest[row] < 0:
            return "no contender has a permitted point"
        return "" if np.isfinite(self.advantage[row]) else "the advantage is not a number"

    def limit(self, row: int, metric: str) -> str:
        """What limits the candidate in one trial, as the metric asks: largest share of delay or of energy."""
        shares = self.delay_shares if metric == "time-per-operation" else self.energy_shares
        known = {name: float(share[row]) for name, share in shares.items() if np.isfinite(share[row])}
        return max(known, key=lambda name: known[name]) if known else ""


def study_at(study: Study, temperature: float) -> Study:
    """Return the study with another highest temperature [K]; listed ones above it are left out."""
    kept = [kelvin for kelvin in study.temperatures[:-1] if kelvin < temperature]
    return dataclasses.replace(study, temperatures=(*kept, temperature))


class Trials:
    """Evaluates trials of one study at one node pair under one policy.

    Parameters
    ----------
    study : Study
    pair : NodePair
    policy : str
        By default the study's primary policy.
    alter : callable, optional
        Applied to every side as it is built.
    frozen : mapping, optional
        Frozen choice of every side to keep; by default those of the best estimate.
    told : callable
        Told how many trials have been evaluated.
    """

    def __init__(
        self,
        study: Study,
        pair: NodePair,
        policy: str = "",
        *,
        alter: Alteration | None = None,
        frozen: Mapping[str, Choice] | None = None,
        told: Callable[[int], None] | None = None,
    ) -> None:
        self.study, self.pair = study, pair
        self.values = values_by_key(study, pair)
        self.best_values = {key: float(value.si[0]) for key, value in self.values.items()}
        if isinstance(study.policy.required_time, float):
            self.best_values[REQUIRED_TIME] = study.policy.required_time
        self.best_values[TEMPERATURE] = study.temperatures[-1]
        self.policy = policy or study.policy.primary
        self._alter = alter
        self._told = told
        self._whole = False
        first = Timed(study, pair, Batch.best_estimate(), alter=alter)
        self.frozen = first.frozen_choices(first.outcome(self.policy)) if frozen is None else dict(frozen)
        self.problems = {"candidate": first.candidate.problem} | {
            name: run.problem for name, run in first.contenders.items()
        }
        self.best = self([{}])

    def __call__(self, trials: Sequence[Trial]) -> Answers:
        """Evaluate trials, in the order given."""
        groups: dict[float | None, list[int]] = {}
        for row, trial in enumerate(trials):
            groups.setdefault(trial.get(TEMPERATURE), []).append(row)
        parts: list[tuple[list[int], Answers]] = []
        for kelvin, rows in groups.items():
            study = self.study if kelvin is None else study_at(self.study, kelvin)
            for start in range(0, len(rows), ROWS_AT_ONCE):
                chunk = rows[start : start + ROWS_AT_ONCE]
                parts.append((chunk, self._evaluate(study, [trials[row] for row in chunk])))
                if self._told is not None:
                    self._told(len(chunk))
        return _in_order(parts, len(trials))

    def whole(self, trials: Sequence[Trial]) -> Answers:
        """Evaluate trials with every contender held to all conditions, not only the strongest."""
        self._whole = True
        try:
            return self(trials)
        finally:
            self._whole = False

    def why(self, trial: Trial) -> str:
        """Say why a side has no permitted point in one trial, with the nearest it can reach."""
        kelvin = trial.get(TEMPERATURE)
        study = self.study if kelvin is None else study_at(self.study, kelvin)
        try:
            with np.errstate(all="ignore"):
                batch = _batch([trial], self.best_values)
                self._judge(batch)
                comparison = Timed(study, self.pair, batch, frozen=self.frozen, alter=self._alter)
                outcome = comparison.outcome(self.policy)
        except EvenloadError as error:
            return f"cannot be evaluated: {error}"
        # a contender without a permitted point matters where no other has one either
        sides = outcome.contenders if outcome.candidate.found[0] else (outcome.candidate,)
        return "; ".join(f"{side.id}: {side.why}" for side in sides if side.why and not side.found[0])

    def _evaluate(self, study: Study, trials: Sequence[Trial]) -> Answers:
        """Evaluate as one batch; where the program refuses a value, find the rows it refuses by halving."""
        try:
            # values far from the best estimate may overflow; what is then not finite has no permitted point
            with np.errstate(all="ignore"):
                batch = _batch(trials, self.best_values)
                self._judge(batch)
                comparison = Timed(study, self.pair, batch, frozen=self.frozen, alter=self._alter)
                if self._whole:
                    return _answers(comparison, comparison.outcome(self.policy))
                return _answers(comparison, strongest_outcome(comparison, self.policy))
        except EvenloadError as error:
            if len(trials) == 1:
                return _nothing(self.best, str(error))
        middle = len(trials) // 2
        halves = [self._evaluate(study, trials[:middle]), self._evaluate(study, trials[middle:])]
        rows = [list(range(middle)), list(range(middle, len(trials)))]
        return _in_order(list(zip(rows, halves, strict=True)), len(trials))

    def _judge(self, batch: Batch) -> None:
        """Let the device models judge the values of a batch, as they judge those of a file.

        Raises
        ------
        UsageError
            With what a model refuses in any of the rows.
        """
        for problem in self.problems.values():
            technology = problem.side.technology
            if not any(key.startswith(f"{technology.id}.") for key in batch.columns):
                continue
            values = resolve(technology.id, technology.at(problem.node), batch)
            tables: dict[str, MeasuredTable] = {name: table.table for name, table in technology.tables.items()}
            if technology.rows:
                tables["rows"] = technology.rows[problem.node]
            findings = problem.device.check(ModelInputs(values, technology.options, tables))
            refused = [finding for finding in findings if finding.level == "refuse"]
            if refused:
                first = refused[0]
                message = f"{technology.id}: {first.name} {first.what}"
                raise UsageError(message + (f"; allowed: {first.allowed}" if first.allowed else ""))


def _batch(trials: Sequence[Trial], best: Mapping[str, float]) -> Batch:
    """One row per trial; the comparison's own row 0 plays no special part, for the choices are frozen."""
    keys = {key for trial in trials for key in trial if key != TEMPERATURE}
    columns = {
        (_TIME_COLUMN if key == REQUIRED_TIME else key): np.array([trial.get(key, best[key]) for trial in trials])
        for key in sorted(keys)
    }
    return Batch(len(trials), columns)


def _shares(
    parts: Mapping[str, Array], groups: Mapping[str, tuple[str, ...]], found: NDArray[np.bool_]
) -> dict[str, Array]:
    listed = {name: np.asarray(part)[:, 0] for name, part in groups_of(parts, groups).items()}
    total = np.asarray(sum(listed.values()))
    return {name: np.where(found & (total > 0.0), part / total, np.nan) for name, part in listed.items()}


def _answers(comparison: Comparison, outcome: Outcome) -> Answers:
    run, points = comparison.candidate, outcome.candidate.optimum.points
    found = outcome.candidate.found

    def wide(parts: Mapping[str, Array]) -> dict[str, Array]:
        shape = points.energy.shape
        return {name: comparison.widen(run, np.broadcast_to(part, shape)) for name, part in parts.items()}

    missed = np.isnan(permitted_advantage(comparison, outcome)) & ~np.isnan(outcome.advantage)
    return Answers(
        outcome.advantage,
        ~missed & ~np.isnan(outcome.advantage),
        np.asarray(found),
        np.stack([side.found for side in outcome.contenders]),
        tuple(side.id for side in outcome.contenders),
        outcome.strongest,
        _shares(wide(points.time_parts), DELAY_GROUPS, found),
        _shares(wide(points.energy_parts), ENERGY_GROUPS, found),
        ("",) * comparison.batch.rows,
    )


def _nothing(like: Answers, why: str) -> Answers:
    """One trial that cannot be evaluated."""
    nan, none = np.full(1, np.nan), np.zeros(1, dtype=bool)
    return Answers(
        nan,
        none,
        none,
        np.zeros((len(like.names), 1), dtype=bool),
        like.names,
        np.full(1, -1),
        dict.fromkeys(like.delay_shares, nan),
        dict.fromkeys(like.energy_shares, nan),
        (f"cannot be evaluated: {why}",),
    )


def _in_order(parts: Sequence[tuple[Sequence[int], Answers]], count: int) -> Answers:
    """Put the answers to parts of a list of trials back into its order."""
    if len(parts) == 1:
        return parts[0][1]
    order = np.argsort(np.concatenate([np.asarray(rows, dtype=np.intp) for rows, _ in parts]))
    answers = [part for _, part in parts]

    def join(pick: Callable[[Answers], NDArray[np.generic]]) -> NDArray[np.generic]:
        return np.concatenate([pick(part) for part in answers], axis=-1)[..., order]

    def shares(pick: Callable[[Answers], Mapping[str, Array]]) -> dict[str, Array]:
        names = dict.fromkeys(name for part in answers for name in pick(part))
        size = [part.advantage.size for part in answers]
        return {
            name: np.concatenate([pick(part).get(name, np.zeros(n)) for part, n in zip(answers, size, strict=True)])[
                order
            ]
            for name in names
        }

    refused = [text for part in answers for text in part.refused]
    return Answers(
        np.asarray(join(lambda part: part.advantage), dtype=np.float64),
        np.asarray(join(lambda part: part.meets), dtype=bool),
        np.asarray(join(lambda part: part.candidate), dtype=bool),
        np.asarray(join(lambda part: part.contenders), dtype=bool),
        answers[0].names,
        np.asarray(join(lambda part: part.strongest), dtype=np.intp),
        shares(lambda part: part.delay_shares),
        shares(lambda part: part.energy_shares),
        tuple(refused[position] for position in order),
    )
