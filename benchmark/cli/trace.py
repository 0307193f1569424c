"""The command ``trace``: the arithmetic of one design point, from the switch record to the energy (layer 10)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path

import typer

from benchmark.cli.chosen import choose_point, node_pair, study_inputs
from benchmark.cli.commands import check_folders
from benchmark.cli.layout import printable
from benchmark.cli.trace_point import trace_point
from benchmark.record.load import load_study

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
    with study_inputs(study_path, overrides, nodes) as (path, numbers):
        study, _ = load_study(path, nodes, numbers)
        chosen = choose_point(study, node_pair(study, node), side, supply)
        lines = [
            f"Study {study.id}: {study.title}",
            *(f"What-if: {name} = {text}" for name, text in numbers.items()),
            f"Side: {chosen.name}, technology {chosen.run.problem.side.technology.id}, "
            f"node {chosen.run.problem.node} of pair {chosen.pair.label}",
            f"Point: {chosen.why}",
            *trace_point(chosen.run.problem, chosen.supply, *chosen.choice),
        ]
    typer.echo("\n".join(printable(line) for line in lines))
