"""Which design point of which side a command is about: from a study file, or from a record's own inputs (layer 10)."""

from __future__ import annotations

import math
import tempfile
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from benchmark.decide.compare import Comparison, SideOutcome, choice_of
from benchmark.errors import UsageError, nearest
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.search import SideRun
from benchmark.record.rerun import recreate
from benchmark.record.write import read_record
from benchmark.sets.study import Choice, NodePair, Study

__all__ = ["ChosenPoint", "choose_point", "node_pair", "study_inputs"]


@contextmanager
def study_inputs(
    path: Path, overrides: Mapping[str, str], nodes: Sequence[Path] = ()
) -> Iterator[tuple[Path, dict[str, str]]]:
    """A study file as it is, or the inputs of a record folder written into a temporary one."""
    if not (path.is_dir() or path.name == "record.json"):
        yield path, dict(overrides)
        return
    if nodes:
        message = f"--nodes has no effect on {path}: a record holds all its inputs; name the study file instead"
        raise UsageError(message)
    record = read_record(path)
    with tempfile.TemporaryDirectory(prefix="evenload-") as folder:
        study, numbers = recreate(record, Path(folder))
        yield study, {**numbers, **overrides}


def node_pair(study: Study, label: str) -> NodePair:
    """Return the node pair of that label; the headline pair for an empty one."""
    labels = [pair.label for pair in study.pairs]
    if label and label not in labels:
        message = f"--node: there is no pair {label!r}; known are {', '.join(labels)}"
        raise UsageError(message)
    return study.pair(label or study.headline)


@dataclass(frozen=True)
class ChosenPoint:
    """A side at one design point; ``choice``: all but the supply; ``why`` in words."""

    name: str
    pair: NodePair
    run: SideRun
    supply: float
    choice: Choice
    why: str


def choose_point(study: Study, pair: NodePair, side: str, supply: float | None) -> ChosenPoint:
    """Find the side and the point: the supply asked for, or the optimum of the primary policy."""
    if supply is not None and not (math.isfinite(supply) and supply > 0.0):
        message = f"--supply needs a positive number of volts, found {supply:g}"
        raise UsageError(message)
    comparison = Comparison(study, pair, Batch.best_estimate())
    known = ["candidate", *comparison.contenders]
    if side not in known:
        message = (
            f"--side: there is no {side!r} at pair {pair.label}; known are {', '.join(known)}; {nearest(side, known)}"
        )
        raise UsageError(message.removesuffix("; "))
    run = comparison.candidate if side == "candidate" else comparison.contenders[side]
    outcome = comparison.side_outcome(study.policy.primary, run, comparison.policy_inputs())
    choice = choice_of(outcome)
    found = bool(outcome.found[0])
    if supply is None and not found:
        message = f"{side} has no permitted design point under {study.policy.primary}; name one with --supply"
        raise UsageError(message)
    if supply is None:
        return ChosenPoint(side, pair, run, float(outcome.supply[0]), choice, _optimum(study, run, outcome))
    why = f"supply {supply:g} V as asked for, frozen choices of the optimum under {study.policy.primary}"
    if not found:
        choice = run.combinations[0]
        why = f"supply {supply:g} V as asked for, first of the frozen choices"
    return ChosenPoint(side, pair, run, supply, choice, why)


def _optimum(study: Study, run: SideRun, outcome: SideOutcome) -> str:
    low, high = run.problem.side.supply
    if low == high:
        place = "the only supply allowed"
    elif outcome.optimum.at_lower[0]:
        place = "at the lower end of the supply range"
    elif outcome.optimum.at_upper[0]:
        place = "at the upper end of the supply range"
    elif outcome.optimum.at_limit[0]:
        place = "where a requirement or limit stops the search"
    else:
        place = "inside the supply range"
    return f"optimum under {study.policy.primary}, {place}"
