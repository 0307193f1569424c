"""The command ``trace``: the arithmetic of one design point, from the switch record to the energy (layer 10)."""

from __future__ import annotations

import math
import tempfile
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

import typer

from benchmark.cli.commands import check_folders
from benchmark.cli.layout import printable
from benchmark.cli.trace_point import trace_point
from benchmark.decide.compare import Comparison, SideOutcome
from benchmark.errors import UsageError, nearest
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.search import SideRun
from benchmark.record.load import load_study
from benchmark.record.rerun import recreate
from benchmark.record.write import read_record
from benchmark.sets.study import NodePair, Study

__all__ = ["trace_command"]


def trace_command(
    study_path: Path,
    side: str,
    supply: float | None,
    node: str,
    nodes: Sequence[Path],
    overrides: Mapping[str, str],
) -> None:
    """Print the arithmetic of one design point of one side."""
    check_folders(nodes)
    with _inputs(study_path, overrides) as (path, numbers):
        study, _ = load_study(path, nodes, numbers)
        chosen = _choose(study, _pair(study, node), side, supply)
        lines = [
            f"Study {study.id}: {study.title}",
            *(f"What-if: {name} = {text}" for name, text in numbers.items()),
            f"Side: {chosen.name}, technology {chosen.run.problem.side.technology.id}, "
            f"node {chosen.run.problem.node} of pair {chosen.pair.label}",
            f"Point: {chosen.why}",
            *trace_point(chosen.run.problem, chosen.supply, *chosen.frozen),
        ]
    typer.echo("\n".join(printable(line) for line in lines))


@contextmanager
def _inputs(path: Path, overrides: Mapping[str, str]) -> Iterator[tuple[Path, dict[str, str]]]:
    """A study file as it is, or the inputs of a record folder written into a temporary one."""
    if not (path.is_dir() or path.name == "record.json"):
        yield path, dict(overrides)
        return
    record = read_record(path)
    with tempfile.TemporaryDirectory(prefix="evenload-") as folder:
        study, numbers = recreate(record, Path(folder))
        yield study, {**numbers, **overrides}


def _pair(study: Study, label: str) -> NodePair:
    labels = [pair.label for pair in study.pairs]
    if label and label not in labels:
        message = f"--node: there is no pair {label!r}; known are {', '.join(labels)}"
        raise UsageError(message)
    return study.pair(label or study.headline)


@dataclass(frozen=True)
class _Chosen:
    name: str
    pair: NodePair
    run: SideRun
    supply: float
    frozen: tuple[float, float]
    why: str


def _choose(study: Study, pair: NodePair, side: str, supply: float | None) -> _Chosen:
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
    frozen = (outcome.optimum.points.size, outcome.optimum.points.threshold_shift)
    found = bool(outcome.found[0])
    if supply is None and not found:
        message = f"{side} has no permitted design point under {study.policy.primary}; name one with --supply"
        raise UsageError(message)
    if supply is None:
        return _Chosen(side, pair, run, float(outcome.supply[0]), frozen, _optimum(study, run, outcome))
    why = f"supply {supply:g} V as asked for, frozen choices of the optimum under {study.policy.primary}"
    if not found:
        frozen = run.combinations[0]
        why = f"supply {supply:g} V as asked for, first of the frozen choices"
    return _Chosen(side, pair, run, supply, frozen, why)


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
