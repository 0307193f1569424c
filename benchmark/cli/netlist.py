"""The command ``export --netlist``: one design point of one side as a deck that runs in ngspice (layer 10)."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import get_args

import numpy as np
import typer

import benchmark
from benchmark.circuits.deck import Capacitances
from benchmark.cli.chosen import ChosenPoint, choose_point, node_pair, study_inputs
from benchmark.cli.commands import check_folders
from benchmark.errors import EvenloadError, UsageError
from benchmark.evaluate.deck import side_deck
from benchmark.evaluate.points import Points, design_points
from benchmark.record.load import load_study
from benchmark.sets.study import Study

__all__ = ["netlist_command"]

#: how a deck of ours begins; no other file is overwritten
_TITLE = "* Deck for ngspice, written by evenload"


def netlist_command(
    study_path: Path,
    target: Path,
    *,
    side: str = "candidate",
    supply: float | None = None,
    node: str = "",
    net: str = "",
    capacitances: str = "delay",
    nodes: Sequence[Path] = (),
    overrides: Mapping[str, str] | None = None,
) -> None:
    """Write the deck of one design point; the temperature is the one that sets the delay there."""
    check_folders(nodes)
    chosen_capacitances = _capacitances(capacitances)
    _refuse_other_files(target)
    with study_inputs(study_path, overrides or {}, nodes) as (path, numbers):
        study, _ = load_study(path, nodes, numbers)
        chosen = choose_point(study, node_pair(study, node), side, supply)
        points = design_points(chosen.run.problem, np.array([[chosen.supply]]), *chosen.choice)
        kelvin = study.temperatures[int(points.slowest_temperature[0, 0])]
        text = side_deck(
            chosen.run.problem,
            (chosen.supply, chosen.choice.size, _shift(chosen)),
            kelvin,
            net=net,
            capacitances=chosen_capacitances,
            comments=[*_comments(study, chosen, kelvin, numbers), *_reservations(points)],
        )
    _write(target, text)
    typer.echo(f"{target}: {chosen.name} at {chosen.supply:g} V; run it with: ngspice -b {target}")


def _capacitances(name: str) -> Capacitances:
    for known in get_args(Capacitances):
        if name == known:
            return known  # type: ignore[no-any-return]
    message = f"--capacitances: {name!r} is not one of {', '.join(get_args(Capacitances))}"
    raise UsageError(message)


def _reservations(points: Points) -> list[str]:
    """Say why the study would not use this point; what no switch can do at all is refused later."""
    reasons = [reason for reason, mask in points.infeasible.items() if mask[0, 0]]
    return [f"The study does not permit this point: {'; '.join(reasons)}"] if reasons else []


def _shift(chosen: ChosenPoint) -> float:
    """Threshold shift of the devices, back bias included [V]."""
    shift = chosen.run.problem.device_shift(chosen.choice.threshold_shift, chosen.choice.back_bias)
    return float(np.ravel(shift)[0])


def _comments(study: Study, chosen: ChosenPoint, kelvin: float, numbers: Mapping[str, str]) -> list[str]:
    problem = chosen.run.problem
    size, shift = chosen.choice.size, _shift(chosen)
    return [
        f"{_TITLE.removeprefix('* ')} {benchmark.__version__}; run it with: ngspice -b FILE",
        f"Study {study.id}: {study.title}",
        *(f"What-if: {name} = {text}" for name, text in numbers.items()),
        f"Side {chosen.name}: technology {problem.side.technology.id}, node {problem.node} of pair {chosen.pair.label}",
        f"Point: {chosen.why}: {chosen.supply:.6g} V, size {size:g}, threshold shift {shift:g} V, "
        f"{kelvin - 273.15:g} degC (the slowest temperature of the study)",
    ]


def _refuse_other_files(target: Path) -> None:
    if not target.exists():
        return
    try:
        with target.open(encoding="utf-8", errors="replace") as file:
            ours = file.readline().startswith(_TITLE)
    except OSError as error:
        message = f"{target}: cannot be replaced ({error.strerror or error})"
        raise EvenloadError(message) from error
    if not ours:
        message = f"--netlist: {target} exists and is no deck of this program; it is not overwritten"
        raise UsageError(message)


def _write(target: Path, text: str) -> None:
    """Write the whole file or none."""
    try:
        with tempfile.TemporaryDirectory(prefix=".netlist-", dir=target.parent) as inside:
            made = Path(inside) / "deck"
            made.write_text(text, encoding="ascii", newline="\n")
            os.replace(made, target)  # noqa: PTH105 - both names on one file system
    except OSError as error:
        message = f"{target}: cannot be written ({error.strerror or error})"
        raise EvenloadError(message) from error
