"""What a notebook shows of a set, a study and a result. Every text is escaped; numbers are those of the reports."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.api.html import bullets, frame, heading, note, table
from benchmark.catalogue import QUANTITIES
from benchmark.record.text import answer_sentence, engineering
from benchmark.record.value_text import each_number, number, spread_text, valid_text
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.sources import Source
from benchmark.sets.study import Side, Study
from benchmark.sets.values import Value
from benchmark.units import format_si

__all__ = ["result_html", "set_html", "study_html"]

Record = Mapping[str, Any]
#: design point -> heading and unit
_POINT = {"supply": ("supply", "V"), "time": ("time", "s"), "energy": ("energy", "J"), "area": ("area", "m^2")}


def _at_nodes(item: ParameterSet, value: Value) -> list[str]:
    """One number per node; a number that holds for all nodes is repeated."""
    shown = each_number(value)
    return shown if len(shown) == len(item.nodes) else shown * len(item.nodes)


def set_html(item: ParameterSet, sources: Mapping[str, Source]) -> str:
    """Show a set: its values by node with unit, spread, evidence and source, then its options and its sources."""
    rows = [
        (
            name,
            QUANTITIES[name].symbol,
            *_at_nodes(item, value),
            value.unit,
            spread_text(value),
            value.evidence,
            value.source or "-",
            value.where,
            f"default: {value.origin}" if value.is_default else "user",
        )
        for name, value in sorted(item.values.items())
    ]
    columns = ("name", "symbol", *item.nodes, "unit", "spread", "evidence", "source", "where", "set by")
    used = sorted({value.source for value in item.values.values() if value.source})
    known = [(key, sources[key].citation) for key in used if key in sources]
    options = [
        (name, word, "default" if name in item.default_options else "user")
        for name, word in sorted(item.options.items())
    ]
    facts = f"{item.id}: {item.kind}" + (f", model {item.model}, {item.ambition}" if item.model else "")
    return frame(
        heading(item.title, facts),
        note(f"Valid for {valid_text(item)}." if item.valid else ""),
        note(item.note),
        table("Values", columns, rows),
        table("Options", ("name", "chosen", "set by"), options),
        table("Sources", ("key", "source"), known),
    )


def _side_row(role: str, side: Side) -> tuple[str, ...]:
    item = side.technology
    low, high = (number(bound) for bound in side.supply)
    return role, side.id, item.title, item.model, ", ".join(item.nodes), f"{low} to {high} V"


def study_html(study: Study, what_if: Mapping[str, str]) -> str:
    """Show a study: the question, both sides, node pairs, requirements and the scenario values."""
    policy = study.policy
    question = (
        f"{study.product_class}: {study.product}. One operation: {study.operation}. Circuit {study.circuit}, "
        f"{study.timing}. Policy {policy.primary}, metric {policy.metric.replace('-', ' ')}, "
        f"required advantage {study.required_advantage:g}. Criteria fixed on {study.declared}."
    )
    sides = [_side_row("candidate", study.candidate), *(_side_row("contender", side) for side in study.contenders)]
    pairs = [
        (
            f"{pair.label}{' (headline)' if pair.label == study.headline else ''}",
            pair.candidate,
            ", ".join(f"{side}: {node}" for side, node in pair.reference.items()),
            f"{pair.wires.id} {pair.wires_node}",
        )
        for pair in study.pairs
    ]
    values = [
        (name, ", ".join(each_number(value)), value.unit, spread_text(value), value.evidence)
        for name, value in study.values.items()
    ]
    limits = [
        (
            name.replace("_", " "),
            f"{format_si(demand.life, 'year', 4)} of life" if demand.life else _limit(demand.limit, demand.unit),
            demand.kind,
        )
        for name, demand in study.requirements.items()
    ]
    return frame(
        heading(study.title, f"{study.id}{' (demonstration with invented inputs)' if study.demonstration else ''}"),
        note(question),
        bullets("What if:", (f"{name} = {value}" for name, value in what_if.items())),
        table("Sides", ("role", "side", "title", "model", "nodes", "supply"), sides),
        table("Node pairs", ("pair", "candidate", "contenders", "wires"), pairs),
        table("Scenario", ("name", "value", "unit", "spread", "evidence"), values),
        table("Requirements", ("requirement", "limit", "kind"), limits),
    )


def _limit(limit: float | None, unit: str) -> str:
    return "the cycle time" if limit is None else engineering(limit, unit)


def _requirements(record: Record) -> list[tuple[str, ...]]:
    return [
        (
            row["name"].replace("_", " "),
            row["kind"],
            row["state"],
            engineering(row["demanded"], row["unit"]),
            engineering(row["offered"], row["unit"]),
            engineering(row["margin"], "1"),
            row["note"],
        )
        for row in record["requirements"]
    ]


def _advantage(value: float | str | None) -> str:
    return "infeasible" if value is None else engineering(value, "1")


def _points(record: Record) -> list[tuple[str, ...]]:
    """Design points of the primary policy: the candidate, then every contender with the advantage over it."""
    primary = record["policies"][0]
    rows = []
    for role, side in [("candidate", primary["candidate"]), *(("contender", side) for side in primary["contenders"])]:
        point, rival = side["point"], role == "contender"
        shown = [engineering(point[key], unit) if point else "infeasible" for key, (_, unit) in _POINT.items()]
        name = f"{role}, strongest" if rival and side["id"] == primary["strongest"] else role
        over = _advantage(side["advantage"]) if rival else ""
        rows.append((name, side["id"], *shown, over, side["at"] or side["why"]))
    return rows


def _policies(record: Record) -> list[tuple[str, ...]]:
    return [
        (
            f"{row['policy']}{' (diagnostic)' if row['diagnostic'] else ''}",
            _advantage(row["advantage"]),
            row["strongest"] or "none",
        )
        for row in record["policies"]
    ]


def result_html(record: Record) -> str:
    """Show a result: the answer with its reasons and conditions, design points, requirements, other policies."""
    verdict, study = record["verdict"], record["study"]
    counts = (
        f"{verdict['inputs_with_effect']} inputs move the result, {verdict['inputs_without_range']} of them have no "
        f"stated range, {verdict['inputs_of_judgement']} are judgement or invented."
    )
    measure = [] if verdict["measure_next"] == verdict["reasons"] else verdict["measure_next"]
    changes = (f"{name} = {value}" for name, value in record.get("what_if", {}).items())
    headings = tuple(heading for heading, _ in _POINT.values())
    return frame(
        heading(verdict["word"], study["title"]),
        note(answer_sentence(record)),
        bullets("What if:", changes),
        bullets("Why:", verdict["reasons"]),
        bullets("Conditions:", verdict["conditions"]),
        bullets("To measure:", measure),
        table(
            f"Design points, policy {study['primary_policy']}",
            ("role", "side", *headings, "advantage over it", "where"),
            _points(record),
        ),
        table(
            "Requirements",
            ("requirement", "kind", "state", "demanded", "offered", "margin", "note"),
            _requirements(record),
        ),
        table("Policies", ("policy", "advantage", "strongest contender"), _policies(record)),
        note(counts),
        bullets("Warnings:", record["warnings"]),
        note(record["cautions"][0] if record["cautions"] else ""),
    )
