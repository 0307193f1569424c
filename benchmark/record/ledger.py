"""The assumption ledger: every number used, its origin, and whether the user or the program set it (layer 8)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.catalogue import QUANTITIES
from benchmark.decide.moves import InputMove
from benchmark.evaluate.side import owner_of_overhead
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.sources import Source
from benchmark.sets.study import Study
from benchmark.sets.values import Value

__all__ = ["ledger_rows", "option_rows", "set_rows", "technologies"]


def technologies(study: Study) -> list[ParameterSet]:
    """Every technology set of a study once, candidate first, then those it is shown beside."""
    sets = [study.candidate.technology, *(side.technology for side in study.contenders), *study.candidate.outlook]
    return list({item.id: item for item in sets}.values())


def _row(
    owner: str, value: Value, nodes: Sequence[str], moves: Mapping[str, InputMove], sources: Mapping[str, Source]
) -> dict[str, Any]:
    quantity = QUANTITIES[value.name]
    key = f"{owner}.{value.name}"
    move = moves.get(key)
    numbers = [value.in_unit(float(si)) for si in value.si]
    spread = None
    if value.spread is not None:
        spread = {
            "shape": value.spread.shape,
            "low": [value.in_unit(float(x)) for x in value.spread.low],
            "high": [value.in_unit(float(x)) for x in value.spread.high],
            "meaning": "hard limits"
            if value.spread.shape in ("uniform", "loguniform", "triangular")
            else "central 95 %",
        }
    source = sources.get(value.source)
    return {
        "key": key,
        "owner": owner,
        "name": value.name,
        "symbol": quantity.symbol,
        "meaning": quantity.meaning,
        "nodes": list(nodes) if len(numbers) > 1 else [],
        "value": numbers,
        "unit": value.unit,
        "spread": spread,
        "evidence": value.evidence,
        "source": value.source,
        "source_read": source.read if source else "",
        "where": value.where,
        "conditions": value.conditions,
        "note": value.note,
        "owner_of_choice": value.owner,
        "bound": value.bound,
        "formula": value.formula,
        "date": value.date,
        "set_by": "default" if value.is_default else "user",
        "origin": value.origin,
        "file": value.file,
        "line": value.line,
        "matters": None if move is None else move.matters,
        "decisive": None if move is None else move.decisive,
    }


def set_rows(
    item: ParameterSet, sources: Mapping[str, Source], moves: Mapping[str, InputMove] | None = None
) -> list[dict[str, Any]]:
    """Every value of one set in the order of their names; ``moves`` by key, where a run has moved its inputs."""
    return [_row(item.id, value, item.nodes, moves or {}, sources) for _, value in sorted(item.values.items())]


def ledger_rows(study: Study, moves: Sequence[InputMove], sources: Mapping[str, Source]) -> list[dict[str, Any]]:
    """Every value of the study, its circuit, its wires and its technologies, in a fixed order."""
    by_key = {move.key: move for move in moves}
    rows = [_row("study", value, [], by_key, sources) for value in study.values.values()]
    if study.circuit_spec is not None:
        for layer, table in study.circuit_spec.layers.items():
            rows += [_row(f"circuit.{layer}", value, [], by_key, sources) for value in table.values()]
    for side, role in [(study.candidate, "candidate"), *((side, "contender") for side in study.contenders)]:
        owner = owner_of_overhead(side, role)
        rows += [_row(f"{owner}.overhead", value, [], by_key, sources) for value in side.overhead.values()]
        rows += [_row(f"{owner}.gating", value, [], by_key, sources) for value in side.gating.values()]
        rows += [_row(f"{owner}.mitigation", value, [], by_key, sources) for value in side.mitigation.values()]
    for item in (*study.wires_sets, *technologies(study)):
        rows += set_rows(item, sources, by_key)
    return rows


def option_rows(study: Study) -> list[dict[str, Any]]:
    """Every non-numeric choice, with whether the file or the program made it."""
    rows = []
    for item in technologies(study):
        for name, text in sorted(item.options.items()):
            rows.append(
                {
                    "owner": item.id,
                    "name": name,
                    "value": text,
                    "set_by": "default" if name in item.default_options else "user",
                }
            )
    return rows
