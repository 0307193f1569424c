"""Where sets are found (layer 2): beside the study, in folders the user names, then the sets shipped here."""

from __future__ import annotations

import datetime
import os
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from decimal import Decimal
from pathlib import Path

import benchmark
from benchmark.errors import Problem, nearest
from benchmark.sets.files import TomlFile, is_file, read_toml
from benchmark.sets.history import as_it_was
from benchmark.sets.parameters import ModelDeclaration, ParameterSet, build_technology, build_wires
from benchmark.sets.problems import Collector
from benchmark.sets.sources import Source, read_sources

__all__ = ["Library", "shipped_nodes", "shipped_reports"]


def _shipped(folder: str, packed: str) -> Path:
    package = Path(benchmark.__file__).parent
    checkout = package.parent / folder
    return checkout if (package.parent / "pyproject.toml").exists() and checkout.is_dir() else package / packed


def shipped_nodes() -> Path:
    """Folder of the sets that come with the program (a checkout's own, or the wheel's copy)."""
    return _shipped("nodes", "_nodes")


def shipped_reports() -> Path:
    """Folder of the worked studies that come with the program."""
    return _shipped("reports", "_reports")


@dataclass
class Library:
    """Sets, circuits and sources by id. ``roots``: folders searched in order; the shipped one is the last."""

    declarations: Callable[[str], ModelDeclaration]
    model_names: Sequence[str]
    roots: tuple[Path, ...]
    collector: Collector
    sources: dict[str, Source] = field(default_factory=dict)
    #: sets are read as they were on this day; None: as they are
    as_of: datetime.date | None = None
    _sets: dict[str, ParameterSet | None] = field(default_factory=dict)
    _overrides: dict[str, dict[str, Decimal | int]] = field(default_factory=dict)

    def __post_init__(self) -> None:
        """Read the source lists of all roots; a nearer root adds to the shipped list."""
        for root in reversed(self.roots):
            path = root / "sources.toml"
            if os.path.lexists(path):  # a link to nowhere is a mistake, not an absence
                self.sources.update(read_sources(path, self.collector, self.shown(path)))

    def shown(self, path: Path) -> str:
        """Name a path relative to its root, so that records do not depend on where the program is installed."""
        for root in self.roots:
            try:
                inside = (path.parent.resolve() / path.name).relative_to(root.resolve())  # a link has its own name
            except ValueError:
                continue
            return str(Path(root.name.removeprefix("_")) / inside) if root == self.roots[-1] else str(inside)
        return path.name

    def paths(self, folder: str) -> Iterator[Path]:
        """Every TOML file of one kind over all roots."""
        for root in self.roots:
            for place in (root / folder, root):
                if place.is_dir() and (place != root or root != self.roots[-1]):
                    yield from sorted(place.glob("*.toml"))

    def find(self, name: str, folder: str) -> Path | None:
        """Find the file of an id, or None."""
        if "/" in name or "\\" in name or name.startswith("."):
            return None
        for root in self.roots:
            for place in (root / folder, root):
                path = place / f"{name}.toml"
                if is_file(path):
                    return path
        return None

    def ids(self, folder: str) -> list[str]:
        """Every id of one kind."""
        skip = {"sources", "study"}
        return sorted({path.stem for path in self.paths(folder)} - skip)

    def load(self, name: str, folder: str, where: Problem) -> ParameterSet | None:
        """Load a technology or wires set by id; ``where`` is the place that asked, for the message."""
        key = f"{folder}/{name}"
        if key not in self._sets:
            path = self.find(name, folder)
            if path is None:
                known = self.ids(folder)
                self.collector.add(
                    Problem(
                        where.file,
                        where.line,
                        where.name,
                        f"there is no such set in {folder}",
                        repr(name),
                        ", ".join(known),
                        nearest(name, known),
                    )
                )
                self._sets[key] = None
            else:
                self._sets[key] = self.read(path)
        return self._sets[key]

    def read(self, path: Path) -> ParameterSet | None:
        """Read one set file of either kind."""
        file = read_toml(path, self.collector, self.shown(path))
        if file is not None and self.as_of is not None:
            file = as_it_was(file, self.as_of, self.collector)
        return None if file is None else self.build(file)

    def override(self, name: str, key: str, number: Decimal | int) -> None:
        """Use another number for one value of a set (what-if); it must exist in the set's file."""
        if self.find(name, "technologies") is None and self.find(name, "wires") is None:
            known = [*self.ids("technologies"), *self.ids("wires")]
            self.collector.add(
                Problem("--set", 0, f"{name}.{key}", "there is no such set", repr(name), "", nearest(name, known))
            )
            return
        self._overrides.setdefault(name, {})[key] = number

    def _apply(self, file: TomlFile) -> None:
        values = file.data.get("value")
        for key, number in self._overrides.get(file.path.stem, {}).items():
            table = values.get(key) if isinstance(values, dict) else None
            if not isinstance(table, dict):
                known = list(values) if isinstance(values, dict) else []
                self.collector.add(
                    Problem(
                        "--set",
                        0,
                        f"{file.path.stem}.{key}",
                        "is not a value of the set",
                        "",
                        ", ".join(known),
                        nearest(key, known),
                    )
                )
                continue
            if isinstance(table.get("by_node"), dict):
                table["by_node"] = dict.fromkeys(table["by_node"], number)
            else:
                table["value"] = number
            table.pop("spread", None)

    def build(self, file: TomlFile) -> ParameterSet | None:
        """Build a set from a parsed file."""
        self._apply(file)
        sources = frozenset(self.sources)
        if file.data.get("kind") == "wires":
            return build_wires(file, sources, self.collector)
        return build_technology(file, self.declarations, self.model_names, sources, self.collector)
