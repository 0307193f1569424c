"""Opening sets and studies: one place where files, models and built-in circuits meet (layer 8)."""

from __future__ import annotations

import datetime
import tomllib
from collections.abc import Mapping, Sequence
from decimal import Decimal
from pathlib import Path
from typing import Any

import numpy as np

from benchmark.circuits.library import BUILT_IN
from benchmark.devices import MODEL_NAMES, model
from benchmark.devices.model import Finding, ModelInputs
from benchmark.errors import InputRefused, Problem, UsageError
from benchmark.evaluate.batch import Batch, resolve
from benchmark.evaluate.links import FITS, REFUSED, LinkRow, link_rows
from benchmark.evaluate.side import build_circuit
from benchmark.sets.files import TomlFile, is_folder, read_toml
from benchmark.sets.history import as_it_was
from benchmark.sets.library import Library, shipped_nodes
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.problems import Collector
from benchmark.sets.study import Side, Study
from benchmark.sets.study_builder import build_study
from benchmark.sets.values import amount

__all__ = ["check_physics", "check_study", "load_study", "load_technology", "open_library", "open_set"]


def open_library(*folders: Path, collector: Collector | None = None, as_of: datetime.date | None = None) -> Library:
    """Open the shipped sets, with ``folders`` searched first; ``as_of``: as they were on a day."""
    roots = tuple(dict.fromkeys([*(folder.resolve() for folder in folders), shipped_nodes().resolve()]))
    return Library(model, MODEL_NAMES, roots, collector if collector is not None else Collector(), as_of=as_of)


def open_set(name: str, *folders: Path) -> tuple[ParameterSet, Library]:
    """Load one technology or wires set by id, with the library it was found in.

    Raises
    ------
    InputRefused
        With every problem of the file.
    """
    library = open_library(*folders)
    folder = "technologies" if library.find(name, "technologies") else "wires"
    found = library.load(name, folder, Problem("", 0, name, ""))
    if found is not None and found.kind == "technology":
        check_physics(found, library.collector)
    library.collector.raise_if_any()
    if found is None:
        raise InputRefused([Problem("", 0, name, "could not be loaded")])
    return found, library


def load_technology(name: str, *folders: Path) -> ParameterSet:
    """Load one technology or wires set by id.

    Raises
    ------
    InputRefused
        With every problem of the file.
    """
    return open_set(name, *folders)[0]


def load_study(
    path: Path,
    nodes: Sequence[Path] = (),
    overrides: Mapping[str, str] | None = None,
    as_of: datetime.date | None = None,
) -> tuple[Study, Library]:
    """Load a study with everything it refers to.

    Parameters
    ----------
    path : Path
        Study file; sets beside it (and in its ``nodes`` folder) are found first.
    nodes : sequence of Path
        Further folders of sets.
    overrides : mapping, optional
        What-if values: a study value name, or technology.name, to a number in the unit of the file.
    as_of : date, optional
        Read sets as they were on this day: values with a history have the number of then.

    Raises
    ------
    InputRefused
        With every problem of every file, in one pass.
    """
    collector = Collector()
    beside = [folder for folder in (path.parent, path.parent / "nodes") if is_folder(folder)]
    library = open_library(*nodes, *beside, collector=collector, as_of=as_of)
    file = read_toml(path, collector, path.name)
    if file is None:
        collector.raise_if_any()
        raise UsageError("the study could not be read")  # noqa: EM101 - the collector has said why
    if as_of is not None:
        file = as_it_was(file, as_of, collector)
    if file is None:
        collector.raise_if_any()
        raise UsageError("the study has no such state")  # noqa: EM101 - the collector has said why
    file = _override(file, overrides or {}, library, collector)
    study = build_study(file, library, BUILT_IN)
    if study is not None:
        check_study(study, file, collector)
    collector.raise_if_any()
    if study is None:
        raise UsageError("the study could not be built")  # noqa: EM101 - the collector has said why
    return study, library


def check_study(study: Study, file: TomlFile, collector: Collector) -> None:
    """Judge what a study alone cannot know: the physics of its sets, and whether its circuit can be made."""
    for technology in {side.technology.id: side.technology for side in (study.candidate, *study.contenders)}.values():
        check_physics(technology, collector)
    ends = [
        (name, float(end[0]))
        for name, value in study.values.items()
        if value.spread is not None
        for end in (value.spread.low, value.spread.high)
    ]
    scenario = {name: value.si.reshape(1, 1, 1) for name, value in study.values.items()}
    for place, side in _own_circuits(study):
        for name, end in [("", 0.0), *ends]:
            moved = {**scenario, name: np.full((1, 1, 1), end)} if name else scenario
            try:
                build_circuit(study, moved, Batch.best_estimate(), side)
            except UsageError as error:
                dotted = f"value.{name}.spread" if name else place
                collector.add(file.problem(dotted, f"cannot be made with these values: {error}"))
                return


def _own_circuits(study: Study) -> list[tuple[str, Side | None]]:
    """Return the built-in circuits of a study, each once: its place in the file, and the side that has it."""
    found: dict[str, tuple[str, Side | None]] = {}
    if study.circuit_spec is None:
        found[study.circuit] = ("workload.circuit", None)
    places = ["candidate", *(f"contender.{position}" for position in range(len(study.contenders)))]
    for place, side in zip(places, study.sides, strict=True):
        name, spec = study.circuit_of(side)
        if spec is None:
            found.setdefault(name, (f"{place}.circuit", side))
    return list(found.values())


def check_physics(technology: ParameterSet, collector: Collector) -> None:
    """Let the device model judge the values of every node; equal findings of several nodes become one.

    Refusals and warnings go to the collector, and so do notes (defaults a model takes), marked as such.
    """
    device = model(technology.model)
    nodes_of: dict[Finding, list[str]] = {}
    for node in technology.nodes:
        values = resolve(technology.id, technology.at(node), Batch.best_estimate())
        tables: dict[str, Any] = {name: table.table for name, table in technology.tables.items()}
        if technology.rows:
            tables["rows"] = technology.rows[node]
        for finding in device.check(ModelInputs(values, technology.options, tables)):
            nodes_of.setdefault(finding, []).append(node)
    for finding, nodes in nodes_of.items():
        dotted = finding.name if "." in finding.name else f"value.{finding.name}"
        where = "" if len(technology.nodes) == 1 else f" (node {', '.join(nodes)})"
        problem = Problem(
            technology.file,
            _line(technology, dotted),
            dotted,
            f"{finding.what}{where}",
            finding.found,
            finding.allowed,
            finding.hint,
        )
        {"refuse": collector.add, "warn": collector.warn}.get(finding.level, collector.note)(problem)
    _check_links(technology, collector)


def _check_links(technology: ParameterSet, collector: Collector) -> None:
    """Report stated values that do not fit each other, with the numbers of both sides; one problem for each link."""
    broken: dict[str, list[LinkRow]] = {}
    for row in link_rows(technology):
        if row.state != FITS:
            broken.setdefault(row.formula, []).append(row)
    for rows in broken.values():
        refused = any(row.state == REFUSED for row in rows)
        dotted = f"value.{rows[0].place}"
        found = "; ".join(
            f"{amount(f'{row.left:.5g}', row.unit)} against {amount(f'{row.right:.5g}', row.unit)}"
            f"{f' at {row.node}' if row.node else ''}, ratio {row.ratio:.4g}"
            for row in rows
        )
        what = f"{'contradicts' if refused else 'does not fit'} other values of the set: {rows[0].formula}"
        line = _line(technology, dotted)
        problem = Problem(technology.file, line, dotted, what, found, rows[0].tolerance, rows[0].hint)
        (collector.add if refused else collector.warn)(problem)


def _line(technology: ParameterSet, dotted: str) -> int:
    parts = dotted.split(".")
    while parts:
        if ".".join(parts) in technology.lines:
            return technology.lines[".".join(parts)]
        parts.pop()
    return 0


def _number(text: str) -> Decimal | int | None:
    try:
        parsed = tomllib.loads(f"x = {text}", parse_float=Decimal)
    except (tomllib.TOMLDecodeError, ValueError, ArithmeticError):
        return None
    value = parsed["x"] if list(parsed) == ["x"] else None
    return value if isinstance(value, (Decimal, int)) and not isinstance(value, bool) else None


def _override(file: TomlFile, overrides: Mapping[str, str], library: Library, collector: Collector) -> TomlFile:
    """Apply what-if numbers to the parsed study, or to the set they name."""
    for name, text in overrides.items():
        number = _number(text)
        if number is None:
            collector.add(Problem("--set", 0, name, "needs a number", repr(text)))
            continue
        owner, _, key = name.rpartition(".")
        if not owner:
            table = file.data.get("value", {})
            if not isinstance(table, dict) or not isinstance(table.get(name), dict):
                known = ", ".join(table) if isinstance(table, dict) else ""
                collector.add(Problem("--set", 0, name, "is not a value of the study", "", known))
                continue
            table[name]["value"] = number
            table[name].pop("spread", None)
        else:
            library.override(owner, key, number)
    return file
