"""Numbers read off measured data: whether the data are still what they were, and a typical sample (layer 2)."""

from __future__ import annotations

import hashlib
from pathlib import PurePosixPath, PureWindowsPath

from benchmark.sets.files import TomlFile, is_file, read_bytes
from benchmark.sets.problems import Collector
from benchmark.sets.schema import ExtractedFrom

__all__ = ["check_data"]


def check_data(said: ExtractedFrom, file: TomlFile, dotted: str, collector: Collector) -> None:
    """Compare the data a number was read off with their digest; data that are not there are not missed.

    Parameters
    ----------
    said : ExtractedFrom
        File, by its path from the set, and digest.
    file : TomlFile
        The set.
    dotted : str
        Dotted name of the value.
    collector : Collector
        Receives a warning when the data have changed.
    """
    inside = f"{dotted}.extracted_from.file"
    if PurePosixPath(said.file).is_absolute() or PureWindowsPath(said.file).anchor:
        collector.add(
            file.problem(inside, "is not a path from this file", repr(said.file), "such as ../tables/name.csv")
        )
        return
    if said.hero:
        what = "was read off a hero device: one chosen sample, not a typical one"
        collector.warn(file.problem(dotted, what, repr(said.file), "", "take the median of many devices"))
    path = file.path.parent / said.file
    if not is_file(path):
        return
    raw = read_bytes(path, said.file, collector)
    if raw is None:
        return
    digest = hashlib.sha256(raw).hexdigest()
    if digest != said.digest:
        collector.warn(
            file.problem(
                inside,
                "names data that have changed since the number was read off them",
                f"digest {digest[:12]}..., then {said.digest[:12]}...",
                "",
                "read the number off again: evenload extract",
            )
        )
