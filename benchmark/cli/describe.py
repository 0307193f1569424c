"""Values, technologies and wires in words for ``evenload show`` (layer 10)."""

from __future__ import annotations

from collections.abc import Mapping

from benchmark.catalogue import EVIDENCE, QUANTITIES
from benchmark.cli.layout import Block, Facts, Note, Table
from benchmark.devices import model
from benchmark.devices.model import DeviceModel, Input
from benchmark.evaluate.anchors import AnchorResult, anchor_results
from benchmark.record.value_text import amount, each_number, number, spread_text, usual_range, valid_text
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.sources import Source
from benchmark.sets.values import PastValue, Value
from benchmark.units import from_si, parse_unit

__all__ = ["SUPPORT", "input_need", "option_blocks", "set_blocks", "value_blocks"]

SUPPORT = {
    "go": "may carry any verdict",
    "conditional": "may carry at most a conditional go",
    "none": "never carries a go alone",
    "demonstration": "carries a verdict only in a demonstration",
}


def input_need(item: Input) -> str:
    """Say whether a model needs an input, and when."""
    when = "" if item.when is None else f" when {item.when[0]} = {' or '.join(item.when[1])}"
    if item.default is not None:
        unit = QUANTITIES[item.name].unit
        shown = amount(from_si(item.default.value, parse_unit(unit)), unit)
        return f"default {shown}{when} ({item.default.evidence}: {item.default.origin})"
    return f"{'required' if item.required else 'optional'}{when}"


def _per_node(title: str, nodes: tuple[str, ...]) -> str:
    return title if len(nodes) == 1 else f"{title} ({' / '.join(nodes)})"


def _value_table(item: ParameterSet) -> Table:
    rows = [
        (
            name,
            QUANTITIES[name].symbol,
            " / ".join(each_number(value)),
            value.unit,
            spread_text(value),
            value.evidence,
            value.source or "-",
            value.where,
            "default" if value.is_default else "user",
        )
        for name, value in sorted(item.values.items())
    ]
    columns = (
        "name",
        "symbol",
        _per_node("value", item.nodes),
        "unit",
        "spread",
        "evidence",
        "source",
        "where",
        "set by",
    )
    return Table("Values", columns, rows)


def option_blocks(item: ParameterSet) -> list[Block]:
    """Every option of a technology with the words its model allows."""
    device = model(item.model)
    rows = [
        (
            option.name,
            item.options[option.name],
            "default" if option.name in item.default_options else "user",
            ", ".join(option.allowed),
        )
        for option in device.options
    ]
    return [Table("Options", ("name", "chosen", "set by", "allowed words"), rows)] if rows else []


def _anchor_rows(results: list[AnchorResult]) -> list[tuple[str, ...]]:
    rows: list[tuple[str, ...]] = []
    for result in results:
        unit = parse_unit(result.unit)
        published, predicted = from_si(result.published, unit), from_si(result.predicted, unit)
        span = (
            ""
            if result.low == result.high
            else f" ({number(from_si(result.low, unit), 4)} to {number(from_si(result.high, unit), 4)})"
        )
        rows.append(
            (
                result.name,
                result.node,
                f"{number(published, 4)}{span}",
                number(predicted, 4),
                result.unit,
                f"{100.0 * result.difference:+.2f} %",
                f"{number(result.supply, 4)} V",
                "solved for" if result.fitted else "predicted",
                result.source,
                result.where,
            )
        )
    return rows


def _anchor_blocks(item: ParameterSet) -> list[Block]:
    if not item.anchors and not model(item.model).calibrated_on:
        return []
    columns = (
        "anchor",
        "node",
        "published",
        "predicted",
        "unit",
        "difference",
        "supply",
        "how",
        "source",
        "where",
    )
    return [Table("Anchors: published against predicted", columns, _anchor_rows(anchor_results(item)))]


def _table_blocks(item: ParameterSet) -> list[Block]:
    rows = [
        (name, table.file, str(len(table.table.columns[table.table.value])), table.evidence, table.source, table.where)
        for name, table in item.tables.items()
    ]
    blocks: list[Block] = []
    if rows:
        blocks.append(Table("Measured tables", ("name", "file", "rows", "evidence", "source", "where"), rows))
    stages: list[tuple[str, ...]] = [(node, str(len(rows_of.columns["supply"]))) for node, rows_of in item.rows.items()]
    if stages:
        blocks.append(Table("Stage results", ("node", "rows"), stages))
    return blocks


def _not_stated(item: ParameterSet, device: DeviceModel) -> list[Block]:
    absent = [
        entry.name
        for entry in device.inputs
        if entry.name not in item.values and (entry.when is None or item.options.get(entry.when[0]) in entry.when[1])
    ]
    if not absent:
        return []
    return [Note(f"Not stated and without a default, so unknown: {', '.join(absent)}.")]


def set_blocks(item: ParameterSet) -> list[Block]:
    """Everything about one technology or wires set."""
    if item.kind == "wires":
        facts = [("title", item.title), ("nodes", ", ".join(item.nodes)), ("file", item.file)]
        return [Facts(f"Wires {item.id}", [*facts, *([("note", item.note)] if item.note else [])]), _value_table(item)]
    device = model(item.model)
    facts = [
        ("title", item.title),
        ("model", f"{item.model}: {device.title}"),
        ("nodes", ", ".join(item.nodes)),
        ("flavour", item.flavour or "-"),
        ("ambition", item.ambition),
        ("valid for", valid_text(item)),
        ("file", item.file),
    ]
    if item.note:
        facts.append(("note", item.note))
    return [
        Facts(f"Technology {item.id}", facts),
        *option_blocks(item),
        _value_table(item),
        *_not_stated(item, device),
        *_table_blocks(item),
        *_anchor_blocks(item),
    ]


def value_blocks(item: ParameterSet, name: str, sources: Mapping[str, Source]) -> list[Block]:
    """Full provenance of one value of a set; ``name`` may also be an option of its model."""
    if name not in item.values:
        return _absent_value(item, name)
    value, quantity = item.values[name], QUANTITIES[name]
    evidence, source = EVIDENCE[value.evidence], sources.get(value.source)
    facts = [
        ("set", f"{item.id} ({item.title})"),
        ("symbol", quantity.symbol),
        ("meaning", quantity.meaning),
        *_numbers(item, value),
        ("spread", spread_text(value)),
        ("evidence", f"{value.evidence}: {evidence.meaning}; {SUPPORT[evidence.support]}"),
        ("source", f"{value.source}: {source.citation}" if source else value.source or "none: set by the program"),
        ("where", value.where),
        ("conditions", value.conditions),
        ("set by", f"default: {value.origin}" if value.is_default else "user"),
        ("file", f"{value.file}:{value.line}" if value.line else value.file),
        ("usual range", f"{usual_range(quantity)}, {quantity.domain_text}"),
    ]
    for label, text in (
        ("note", value.note),
        ("owner", value.owner),
        ("bound", {"at-least": "a lower bound", "at-most": "an upper bound"}.get(value.bound, "")),
        ("formula", value.formula),
        ("read off", value.read_off),
        ("date", value.date),
    ):
        if text:
            facts.append((label, text))
    facts += [("superseded", _past_words(past)) for past in reversed(value.past)]
    if item.kind == "technology":
        facts += [("model", f"{item.model}: {input_need(x)}") for x in model(item.model).inputs if x.name == name]
    return [Facts(f"{item.id}.{name}", facts)]


def _past_words(past: PastValue) -> str:
    value = past.value
    source = f", {value.source}" if value.source else ""
    numbers = f"{' / '.join(each_number(value))} {value.unit}".removesuffix(" 1")
    return f"{numbers} from {value.date} ({value.evidence}{source}; {spread_text(value)}): {past.reason}"


def _numbers(item: ParameterSet, value: Value) -> list[tuple[str, str]]:
    nodes = item.nodes if value.si.size > 1 else ("",)
    return [
        (
            f"value at {node}" if node else "value",
            f"{amount(value.in_unit(float(si)), value.unit)} = {float(si)!r} in SI",
        )
        for node, si in zip(nodes, value.si, strict=True)
    ]


def _absent_value(item: ParameterSet, name: str) -> list[Block]:
    if item.kind == "technology":
        for option in model(item.model).options:
            if option.name == name:
                who = "default" if name in item.default_options else "user"
                facts = [
                    ("chosen", item.options[name]),
                    ("set by", who),
                    ("allowed words", ", ".join(option.allowed)),
                ]
                return [Facts(f"{item.id}.{name} (option)", facts)]
        for entry in model(item.model).inputs:
            if entry.name == name:
                facts = [
                    ("value", "not stated"),
                    ("model", f"{item.model}: {input_need(entry)}"),
                    ("meaning", QUANTITIES[name].meaning),
                ]
                return [Facts(f"{item.id}.{name}", facts)]
    return []
