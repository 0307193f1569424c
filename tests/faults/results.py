"""What a run finds, without what it only repeats from the files; and what of a file ought to matter."""

from __future__ import annotations

import json
import tomllib
from collections.abc import Mapping
from decimal import Decimal
from pathlib import Path
from typing import Any

import pytest

from benchmark.record.load import load_study
from benchmark.units import UnitError, parse_unit, to_si

__all__ = ["NEUTRAL", "differences", "found_by"]

#: parts of a record that are worked out; the others repeat files, or say what holds for every study
RESULTS = (
    "verdict",
    "requirements",
    "policies",
    "uncertainty",
    "ladder",
    "robustness",
    "curves",
    "advantage_against_time",
    "crossings",
    "nodes",
    "node_crossings",
    "anchors",
)
#: keys that say something to the reader and nothing to a result
NEUTRAL = frozenset(
    {
        "title",
        "note",
        "where",
        "conditions",
        "owner",
        "describe",
        "operation",
        "source",
        "date",
        "declared",
        "unusual",
        "reason",
    }
)
#: what takes most of the time and follows from the rest
SLOW = ("closed_form_differences", "node_steps", "self_checks")


def found_by(study: Path, *, moved: bool = True) -> str:
    """Run a study and return its results as text; without ``moved`` no input is moved over its range."""
    with pytest.MonkeyPatch.context() as patch:
        for name in SLOW:
            patch.setattr(f"benchmark.record.run.{name}", lambda *_: [])
        if not moved:
            patch.setattr("benchmark.record.run.move_inputs", lambda *_: (None, []))
            patch.setattr("benchmark.record.run.with_flips", lambda *_: [])
        from benchmark.record.run import run_study

        record = run_study(*load_study(study), created="then")
    return json.dumps({key: record[key] for key in RESULTS}, sort_keys=True)


def _plain(data: Any) -> Any:
    """The data of a file as it matters: numbers in SI, no neutral keys, no order of keys."""
    if isinstance(data, Mapping):
        unit = data.get("unit")
        kept = {key: _plain(item) for key, item in data.items() if key not in NEUTRAL or isinstance(item, dict)}
        if isinstance(unit, str):
            try:
                known = parse_unit(unit)
            except UnitError:
                return kept
            kept = {key: _in_si(item, known, key) for key, item in kept.items()} | {"unit": known.dimension_text}
        return kept
    if isinstance(data, list):
        return [_plain(item) for item in data]
    return float(data) if isinstance(data, (int, Decimal)) and not isinstance(data, bool) else data


def _in_si(item: Any, unit: Any, key: str) -> Any:
    if key in ("percent", "factor", "ln_sd"):
        return item
    if isinstance(item, float):
        return to_si(Decimal(repr(item)), unit)
    if isinstance(item, dict):
        return {name: _in_si(part, unit, name) for name, part in item.items()}
    return [_in_si(part, unit, key) for part in item] if isinstance(item, list) else item


def _flat(data: Any, place: str = "") -> dict[str, Any]:
    if isinstance(data, dict):
        return {name: part for key, item in data.items() for name, part in _flat(item, f"{place}.{key}").items()}
    if isinstance(data, list):
        return {name: part for at, item in enumerate(data) for name, part in _flat(item, f"{place}.{at}").items()}
    return {place.removeprefix("."): data}


def differences(before: str, after: str) -> set[str]:
    """Dotted names of what ought to matter and differs between two texts of a file."""
    one, two = (_flat(_plain(tomllib.loads(text, parse_float=Decimal))) for text in (before, after))
    return {name for name in one.keys() | two.keys() if one.get(name) != two.get(name)}
