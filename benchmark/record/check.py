"""Checking files of every kind in one pass (layer 8)."""

from __future__ import annotations

import datetime
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from benchmark.circuits.library import BUILT_IN
from benchmark.errors import Problem
from benchmark.record.load import check_physics, check_study, open_library
from benchmark.sets.circuit_file import read_circuit
from benchmark.sets.files import is_folder, read_toml
from benchmark.sets.history import as_it_was
from benchmark.sets.library import Library
from benchmark.sets.problems import Collector
from benchmark.sets.study_builder import build_study

__all__ = ["CheckResult", "check_paths", "roots_of"]


@dataclass(frozen=True)
class CheckResult:
    """What was found; ``files`` counts the files read."""

    files: int
    problems: tuple[Problem, ...]
    warnings: tuple[Problem, ...]


def _listed(paths: Sequence[Path], collector: Collector) -> list[Path]:
    """Every TOML file named or inside a named folder; table descriptions are checked with the set that uses them."""
    found: list[Path] = []
    for path in paths:
        if is_folder(path):
            inside = [item for item in sorted(path.rglob("*.toml")) if item.parent.name != "tables"]
            if not inside:
                collector.add(Problem(str(path), 0, "", "has no TOML file"))
            found += inside
        elif _may_be_read(path):
            found.append(path)
        else:
            collector.add(Problem(str(path), 0, "", "does not exist"))
    return found


def _may_be_read(path: Path) -> bool:
    try:
        return path.exists()
    except OSError:
        return True  # reading it will say why not


def roots_of(path: Path) -> list[Path]:
    """Return the folders in which what a file names is looked for first."""
    parent = path.parent
    root = parent.parent if parent.name in ("technologies", "wires", "circuits") else parent
    return [folder for folder in (root, root / "nodes") if is_folder(folder)]


def check_paths(paths: Sequence[Path], nodes: Sequence[Path] = (), as_of: datetime.date | None = None) -> CheckResult:
    """Check files and folders, sets as they are or as they were on a day; nothing is run."""
    collector = Collector()
    files = _listed(paths, collector)
    for path in files:
        library = open_library(*nodes, *roots_of(path), collector=collector, as_of=as_of)
        _check_one(path, library, collector)
    return CheckResult(len(files), tuple(sorted(set(collector.problems))), tuple(sorted(set(collector.warnings))))


def _check_one(path: Path, library: Library, collector: Collector) -> None:
    file = read_toml(path, collector, str(path))
    if file is None:
        return
    if path.name == "sources.toml":
        return  # read, with its problems, when the library was opened
    if "workload" in file.data or "contender" in file.data:
        study = build_study(file, library, BUILT_IN)
        if study is not None:
            check_study(study, file, collector)
    elif file.data.get("kind") == "curves":
        _check_curves(path, library, collector)
    elif "net" in file.data:
        read_circuit(path, library, collector)
    else:
        then = file if library.as_of is None else as_it_was(file, library.as_of, collector)
        built = None if then is None else library.build(then)
        if built is not None and built.kind == "technology":
            check_physics(built, collector)


def _check_curves(path: Path, library: Library, collector: Collector) -> None:
    """Read a raw file and answer what its description asks; the numbers are not shown."""
    from benchmark.curves.extraction import extract_all
    from benchmark.curves.read import read_curves  # brings pandas, which is slow to import

    curves = read_curves(path, collector, frozenset(library.sources))
    if curves is not None:
        extract_all(curves, collector)
