"""The source list: every ``source`` of a set, sidecar or study is a key of it (layer 2)."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from pydantic import TypeAdapter, ValidationError

from benchmark.sets.files import TomlFile, read_toml, shown
from benchmark.sets.problems import Collector
from benchmark.sets.schema import SourceEntry, validate_part

__all__ = ["Source", "read_sources"]


@dataclass(frozen=True)
class Source:
    """One source as printed in ledgers and source lists."""

    key: str
    kind: str
    authors: tuple[str, ...]
    year: int
    title: str
    venue: str
    doi: str
    read: str  # original | abstract | second-hand | memory
    via: str
    note: str

    @property
    def citation(self) -> str:
        """One line: authors, title, venue, year, how it was read."""
        people = ", ".join(self.authors)
        place = f", {self.venue}" if self.venue else ""
        how = {"original": "read", "abstract": "abstract read", "second-hand": "second-hand", "memory": "from memory"}
        via = f" via {self.via}" if self.via else ""
        return f"{people}: {self.title}{place} ({self.year}) [{how[self.read]}{via}]"


def read_sources(path: Path, collector: Collector, name: str | None = None) -> dict[str, Source]:
    """Read a source list; an unreadable one gives an empty dictionary and problems."""
    file = read_toml(path, collector, name)
    if file is None:
        return {}
    found: dict[str, Source] = {}
    if file.data.get("schema") != 1:
        version = shown(file.data.get("schema")) if "schema" in file.data else "none"
        collector.add(file.problem("schema", "is not a file format this version reads", version, "1"))
        return {}
    for key, table in file.data.items():
        if key == "schema":
            continue
        entry = _entry(file, key, table, collector)
        if entry is None:
            continue
        if entry.read == "second-hand" and not entry.via:
            collector.add(file.problem(key, "is second-hand and must say via what", "", 'via = "..."'))
        found[key] = Source(
            key,
            entry.kind,
            tuple(entry.authors),
            entry.year,
            entry.title,
            entry.venue,
            entry.doi,
            entry.read,
            entry.via,
            entry.note,
        )
    return found


def _entry(file: TomlFile, key: str, table: Any, collector: Collector) -> SourceEntry | None:
    if not isinstance(table, dict):
        collector.add(file.problem(key, "a source is a table", shown(table)))
        return None
    try:
        return TypeAdapter(SourceEntry).validate_python(table)
    except ValidationError as error:
        validate_part(SourceEntry, file, (key,), error, collector)
        return None
