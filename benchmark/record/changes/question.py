"""What besides values differs between two studies: the question, the criteria, the method, the program (layer 8)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.record.changes.inputs import text_changes
from benchmark.record.changes.states import State
from benchmark.record.ledger import technologies
from benchmark.sets.study import Side, Study

__all__ = ["asked_changes", "other_changes"]

_QUESTION = (
    "product_class",
    "operation",
    "timing",
    "leakage_accounting",
    "idle",
    "temperatures",
    "delay_rule",
    "short_circuit",
    "guard_band_delay",
    "guard_band_leakage",
    "topology",
)


def other_changes(old: State, new: State) -> list[dict[str, str]]:
    """Return every difference that is not a value: ``kind``, ``name``, ``old``, ``new``.

    Kinds: question and criteria (then the two answer different questions), option, file, method, draws, constant,
    program.
    """
    rows = asked_changes(old.study, new.study)
    for kind, make in (("option", _options), ("file", _files), ("method", _method)):
        rows += text_changes(make(old.study), make(new.study), kind)
    rows += text_changes(_draws(old.record), _draws(new.record), "draws")
    rows += text_changes(*_constants(old.record, new.record), "constant")
    return rows + text_changes(_program(old.record), _program(new.record), "program")


def asked_changes(old: Study, new: Study) -> list[dict[str, str]]:
    """Return what makes it another question: the question itself, and the criteria of its answer."""
    return [
        row
        for kind, make in (("question", _question), ("criteria", _criteria))
        for row in text_changes(make(old), make(new), kind)
    ]


def _question(study: Study) -> dict[str, str]:
    rows = {name.replace("_", " "): _words(getattr(study, name)) for name in _QUESTION}
    rows["contenders"] = ", ".join(sorted(side.id for side in study.contenders))
    for side in study.sides:
        rows[f"circuit of {'the candidate' if side is study.candidate else side.id}"] = study.circuit_of(side)[0]
    pair = study.pair(study.headline)
    rows["headline nodes"] = f"candidate {pair.candidate}; " + ", ".join(
        f"{side} {node}" for side, node in sorted(pair.reference.items())
    )
    return rows


def _criteria(study: Study) -> dict[str, str]:
    from benchmark.record.criteria import criteria_of

    return {name: _words(value) for name, value in criteria_of(study).items()}


def _options(study: Study) -> dict[str, str]:
    rows: dict[str, str] = {}
    for item in technologies(study):
        rows |= {f"{item.id}.{name}": text for name, text in item.options.items()} | {f"{item.id} model": item.model}
    return rows


def _files(study: Study) -> dict[str, str]:
    """Measured tables and circuit files, by digest."""
    rows = {f"circuit {spec.file}": spec.sha256 for spec in study.circuit_specs}
    for item in technologies(study):
        for table in item.tables.values():
            rows |= {table.file: table.sha256, f"description of {table.file}": table.sidecar_sha256}
    return rows


def _side(side: Side) -> dict[str, str]:
    return {
        "supply range": _words(side.supply),
        "sizes": _words(side.sizes),
        "threshold shifts": _words(side.threshold_shifts),
        "copies": _words(side.copies),
        "back biases": _words(side.back_biases),
        "technology": side.technology.id,
    }


def _method(study: Study) -> dict[str, str]:
    rows = {
        "supply points": _words(study.supply_points),
        "refinement": _words(study.refine_relative),
        "pairs": ", ".join(pair.label for pair in study.pairs),
        "wires": ", ".join(item.id for item in study.wires_sets),
    }
    for side in study.sides:
        name = "candidate" if side is study.candidate else side.id
        rows |= {f"{key} of {name}": text for key, text in _side(side).items()}
    return rows


def _draws(record: Mapping[str, Any]) -> dict[str, str]:
    """What was drawn, which may be other than the study file states."""
    drawn = record.get("uncertainty")
    return {name: "none" if drawn is None else str(drawn[name]) for name in ("draws", "seed")}


def _program(record: Mapping[str, Any]) -> dict[str, str]:
    return {name: str(version) for name, version in record["software"].items()}


def _constants(old: Mapping[str, Any], new: Mapping[str, Any]) -> tuple[dict[str, str], dict[str, str]]:
    """Physical constants of the program that made each record, where both state them."""
    stated = [record.get("constants") for record in (old, new)]
    if None in stated:
        return {}, {}
    first, second = ({name: repr(value) for name, value in (row or {}).items()} for row in stated)
    return first, second


def _words(value: Any) -> str:
    if isinstance(value, tuple):
        return ", ".join(map(_words, value))
    return f"{value:.12g}" if isinstance(value, float) else str(value)
