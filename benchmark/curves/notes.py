"""What was done to a raw file, in plain sentences (layer 7.5)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from benchmark.curves.columns import Column
from benchmark.curves.description import CurvesFile
from benchmark.curves.meanings import MEANINGS, MULTIPLIED
from benchmark.curves.record import Sweep
from benchmark.units import format_si

__all__ = ["column_note", "curve_notes", "mark_notes"]

#: words of a label that are written out
_MOST_WORDS = 6


def column_note(column: Column, spec: CurvesFile) -> str:
    """Say how the numbers of a column became SI."""
    said = column.spec
    name = f"column {column.position + 1} ({column.header})"
    if said.kind == "label":
        return f"{name}: label {said.meaning}"
    quantity, unit = MEANINGS[said.meaning], column.unit
    parts = [f"{name}: {quantity.meaning} in {unit.text if unit.text != '1' else 'plain numbers'}"]
    if said.scale == "log10":
        parts.append("ten to the power of the number")
    if unit.offset:
        parts.append(f"{float(unit.offset):g} added for K")
    elif unit.factor != 1:
        parts.append(f"times {float(unit.factor):g} for SI")
    if said.sign == "negative":
        parts.append("sign turned round")
    if said.per_width:
        parts.append("times the width" if said.meaning in MULTIPLIED else "divided by the width")
    if said.kind == "axis" and said.meaning != spec.along:
        parts.append("tells curves apart")
    return ", ".join(parts)


def curve_notes(sweeps: Sequence[Sweep], spec: CurvesFile, units: Mapping[str, str]) -> list[str]:
    """Say how many curves of how many points were found, and what tells them apart."""
    points = [len(sweep.rows) for sweep in sweeps]
    span = f"{min(points)}" if min(points) == max(points) else f"{min(points)} to {max(points)}"
    curves = "1 curve" if len(sweeps) == 1 else f"{len(sweeps)} curves"
    notes = [f"{sum(points)} points in {curves} of {span} points along {spec.along}"]
    names = dict.fromkeys(name for sweep in sweeps for name in sweep.labels)
    for name in names:
        words = list(dict.fromkeys(sweep.labels[name] for sweep in sweeps if name in sweep.labels))
        more = f" and {len(words) - _MOST_WORDS} more" if len(words) > _MOST_WORDS else ""
        notes.append(f"{name}: {', '.join(words[:_MOST_WORDS])}{more}")
    for name in dict.fromkeys(name for sweep in sweeps for name in sweep.fixed):
        values = list(dict.fromkeys(sweep.fixed[name] for sweep in sweeps if name in sweep.fixed))
        shown = ", ".join(format_si(value, units[name], 6) for value in values[:_MOST_WORDS])
        more = f" and {len(values) - _MOST_WORDS} more" if len(values) > _MOST_WORDS else ""
        notes.append(f"fixed along a curve: {name} {shown}{more}")
    if spec.sort:
        notes.append(f"rows sorted along {spec.along}")
    if spec.turns and any(sweep.labels.get("sweep") != spec.turns[0] for sweep in sweeps):
        notes.append(
            f"cut where {spec.along} turns back; a single reading at the turn ends one part and begins the next"
        )
    if spec.hero:
        notes.append("the file says that it is one chosen device, not a typical one")
    return notes


def mark_notes(sweeps: Sequence[Sweep], columns: Sequence[Column]) -> list[str]:
    """Say how many readings are only bounds."""
    notes = []
    for meaning in dict.fromkeys(column.meaning for column in columns if column.spec.kind == "value"):
        mine = [column for column in columns if column.meaning == meaning]
        for key, marks, words in (
            ("floor", "at_floor", "at or below the floor: upper bounds of the size"),
            ("compliance", "at_compliance", "at or above the compliance: lower bounds of the size"),
        ):
            stated = [getattr(column.spec, key) for column in mine]
            limits = {f"{measure.value} {measure.unit}" for measure in stated if measure is not None}
            if limits:
                count = sum(int(np.sum(getattr(sweep, marks)[meaning])) for sweep in sweeps if meaning in sweep.columns)
                notes.append(f"{meaning}: {count} reading(s) {words} ({', '.join(sorted(limits))})")
    return notes
