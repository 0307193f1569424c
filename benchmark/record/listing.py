"""What sets and circuits there are, from their files without checking them (layer 8)."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from benchmark.sets.files import TomlFile, read_toml
from benchmark.sets.library import Library
from benchmark.sets.problems import Collector

__all__ = ["FOLDERS", "TECHNOLOGY_COLUMNS", "file_rows", "files_of", "technology_rows"]

#: kind of a file -> folder of the sets
FOLDERS = {"technology": "technologies", "wires": "wires", "circuit": "circuits"}
TECHNOLOGY_COLUMNS = ("title", "model", "nodes", "flavour", "ambition")


def _kind(data: dict[str, Any]) -> str:
    if "workload" in data or "contender" in data:
        return "study"
    if "net" in data:
        return "circuit"
    return str(data["kind"]) if data.get("kind") in ("wires", "curves") else "technology"


def files_of(library: Library, kind: str) -> dict[str, TomlFile | None]:
    """Every file of a kind by id; the nearest folder wins. None: the file is not TOML."""
    found: dict[str, TomlFile | None] = {}
    for path in library.paths(FOLDERS[kind]):
        if path.name == "sources.toml" or path.stem in found:
            continue
        file = read_toml(path, Collector(), library.shown(path))
        if file is None and path.parent.name != FOLDERS[kind]:
            continue
        if file is None or _kind(file.data) == kind:
            found[path.stem] = file
    return dict(sorted(found.items()))


def _words(value: Any) -> str:
    return ", ".join(str(item) for item in value) if isinstance(value, list) else str(value)


def file_rows(library: Library, kind: str, keys: Sequence[str]) -> list[tuple[str, ...]]:
    """Return id and some keys of every file of a kind, as words."""
    rows = []
    for name, file in files_of(library, kind).items():
        if file is None:
            rows.append((name, "not readable: evenload check says why", *("" for _ in keys[1:])))
        else:
            rows.append((name, *(_words(file.data.get(key, "-")) for key in keys)))
    return rows


def technology_rows(library: Library) -> list[tuple[str, ...]]:
    """Return id and ``TECHNOLOGY_COLUMNS`` of every technology set."""
    rows = file_rows(library, "technology", TECHNOLOGY_COLUMNS)
    return [(*row[:-1], "today" if row[-1] == "-" else row[-1]) for row in rows]
