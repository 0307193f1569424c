"""Which files a batch has to look at again: those of its folders, and those its studies read elsewhere."""

from __future__ import annotations

import contextlib
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from benchmark.api.views import StudyView
    from benchmark.sets.values import Value

__all__ = ["Stamps", "files_read", "folders_read", "input_files", "stamps", "written_by_runs"]

#: name of a file -> time of its last change [ns] and size [bytes]
Stamps = dict[str, tuple[int, int]]
#: endings of files that a study may read
INPUTS = frozenset({".toml", ".csv", ".tsv", ".txt", ".dat"})


def stamps(names: Iterable[str | Path]) -> Stamps:
    """Return the stamp of each file that is there; an editor may just be exchanging one."""
    found = {}
    for name in names:
        with contextlib.suppress(OSError):
            told = Path(name).stat()
            found[str(name)] = (told.st_mtime_ns, told.st_size)
    return found


def written_by_runs(path: Path, records: Iterable[str | Path | None]) -> bool:
    """Tell whether a file lies in a folder of records: its tables are written by the runs themselves."""
    return any(path.resolve().is_relative_to(Path(place).resolve()) for place in records if place is not None)


def input_files(folders: Iterable[str | Path], records: Iterable[str | Path | None] = ()) -> Stamps:
    """Return the stamps of every file in some folders that a study may read; files of records are left out."""
    written = [place for place in records if place is not None]
    inside = (path for folder in folders for path in sorted(Path(folder).rglob("*")))
    return stamps(
        path
        for path in inside
        if path.suffix.lower() in INPUTS and path.is_file() and not written_by_runs(path, written)
    )


def folders_read(folder: Path, nodes: Sequence[Path]) -> list[Path]:
    """Return the folders in which sets are looked for: the batch itself, further ones, links inside, the shipped."""
    from benchmark.sets.library import shipped_nodes

    linked = [path.resolve() for path in folder.rglob("*") if path.is_symlink() and path.is_dir()]
    return list(dict.fromkeys([folder, *nodes, *linked, shipped_nodes()]))


def files_read(view: StudyView) -> list[Path]:
    """Return every file a loaded study was read from, wherever it lies: those its record lists, and measured data.

    A record names files without the place where they lie; a file of such a name that lies where it may have been read
    from is listed too.
    """
    found = [view.path, *(root / "sources.toml" for root in view.library.roots)]
    found += _data(view.path, view.study.values.values())
    for spec in view.study.circuit_specs:
        found += _named(view, spec.id)
    for name, item in view.sets.items():
        for place in _named(view, name):
            found += [place, *_beside(place, [table.file for table in item.parameters.tables.values()])]
            found += _data(place, item.parameters.values.values())
    return list(dict.fromkeys(path.resolve() for path in found if path.is_file()))


def _named(view: StudyView, name: str) -> list[Path]:
    """Return the files of an id."""
    kinds = ("technologies", "wires", "circuits")
    return [path for kind in kinds if (path := view.library.find(name, kind)) is not None]


def _beside(place: Path, tables: Iterable[str]) -> Iterator[Path]:
    """Return tables of a set, with their descriptions: beside it, or beside its folder."""
    for parts in (Path(name).parts for name in tables):
        for base in (place.parent, place.parent.parent):
            for first in range(len(parts)):
                path = base.joinpath(*parts[first:])
                yield from (path, path.with_suffix(".toml"))


def _data(place: Path, values: Iterable[Value]) -> Iterator[Path]:
    """Return the data that values were read off, by their path from the file that states them."""
    for value in values:
        name, found, _ = value.read_off.partition(", sha256 ")
        if found:
            yield place.parent / name
