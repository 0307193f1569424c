"""Parameter sets: a validated file as SI arrays by node, with provenance (layer 2)."""

from __future__ import annotations

import dataclasses
from collections import Counter
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from benchmark.catalogue import QUANTITIES, TECHNOLOGY_QUANTITIES, WIRE_QUANTITIES
from benchmark.errors import nearest
from benchmark.measured import MeasuredTable
from benchmark.sets.files import TomlFile
from benchmark.sets.formulas import FormulaError, evaluate_formula, names_in
from benchmark.sets.joints import Joint, read_joints
from benchmark.sets.problems import Collector
from benchmark.sets.schema import TechnologyFile, WiresFile, validate_values
from benchmark.sets.set_parts import Anchor, ModelDeclaration, read_anchors, read_rows, read_tables
from benchmark.sets.tables import TableFile
from benchmark.sets.values import Place, Value, amount, convert_measure, convert_range, convert_value
from benchmark.units import parse_unit

__all__ = ["Anchor", "ModelDeclaration", "ParameterSet", "build_technology", "build_wires", "check_formulas"]


@dataclass(frozen=True)
class ParameterSet:
    """One technology or wires set. ``values`` holds user values and defaults; ``options`` likewise."""

    id: str
    title: str
    kind: str
    model: str
    nodes: tuple[str, ...]
    flavour: str
    ambition: str
    note: str
    options: Mapping[str, str]
    default_options: frozenset[str]
    values: Mapping[str, Value]
    tables: Mapping[str, TableFile]
    rows: Mapping[str, MeasuredTable]  # by node, for sets known by stage results
    anchors: tuple[Anchor, ...]
    valid: Mapping[str, tuple[float, float]]
    file: str
    sha256: str
    text: str
    path: Path
    lines: Mapping[str, int] = field(default_factory=dict)
    rows_rest_on: frozenset[tuple[str, str]] = frozenset()  # (evidence, source) of the stage results
    joints: tuple[Joint, ...] = ()

    def position(self, node: str) -> int:
        """Return the index of a node label."""
        return self.nodes.index(node)

    def at(self, node: str) -> dict[str, Value]:
        """Return every value at one node."""
        position = self.position(node)
        return {name: value.at(position) for name, value in self.values.items()}


def _quantity_names(kind: str) -> list[str]:
    quantities = WIRE_QUANTITIES if kind == "wires" else TECHNOLOGY_QUANTITIES
    return [quantity.name for quantity in quantities]


def _convert_values(
    tables: Mapping[str, Any],
    allowed: Iterable[str],
    nodes: Sequence[str],
    file: TomlFile,
    defaults: Any,
    sources: frozenset[str],
    collector: Collector,
    owner: str,
) -> dict[str, Value]:
    allowed = list(allowed)
    values: dict[str, Value] = {}
    for name, table in tables.items():
        dotted = f"value.{name}"
        if name not in allowed:
            known = name in QUANTITIES
            collector.add(
                file.problem(
                    dotted,
                    f"is not used by {owner}" if known else "is not a known name",
                    "",
                    ", ".join(sorted(allowed)),
                    nearest(name, allowed),
                )
            )
            continue
        place = Place(file, dotted, defaults, sources)
        value = convert_value(QUANTITIES[name], table, nodes, place, collector)
        if value is not None:
            values[name] = value
    return values


def check_formulas(
    values: Mapping[str, Value],
    file: TomlFile,
    tables: Mapping[str, Any],
    collector: Collector,
    prefix: str = "value",
    others: Mapping[str, Value] | None = None,
) -> None:
    """Recompute every derived value; it must agree within half a unit of its last printed digit.

    ``values`` are those of the tables at ``prefix`` that could be read; ``others`` are further names to use.
    """
    known = {**(others or {}), **values}
    arrays = {name: value.si for name, value in known.items()}
    uses = {name: names_in(value.formula) for name, value in values.items() if value.formula}
    for name, value in values.items():
        dotted = f"{prefix}.{name}"
        if value.evidence == "derived" and not value.formula:
            collector.add(file.problem(dotted, "is derived and must state its formula", "", 'formula = "..."'))
        if not value.formula:
            continue
        if value.evidence != "derived":
            collector.add(
                file.problem(
                    f"{dotted}.formula", "belongs to derived values only", value.evidence, 'evidence = "derived"'
                )
            )
            continue
        circle = _circle(name, uses)
        if circle:
            collector.add(file.problem(f"{dotted}.formula", "leads back to the value itself", " <- ".join(circle)))
            continue
        if any(used in tables and used not in values for used in uses[name]):
            continue  # a value it needs has a problem of its own
        try:
            computed = evaluate_formula(value.formula, arrays)
        except FormulaError as error:
            collector.add(file.problem(f"{dotted}.formula", str(error), repr(value.formula)))
            continue
        _check_formula(value, computed, file, tables[name], dotted, collector)


def _circle(name: str, uses: Mapping[str, frozenset[str]]) -> list[str]:
    """Follow the formulas from a value back to itself; empty when they do not lead there."""
    paths = [[name]]
    seen: set[str] = set()
    while paths:
        path = paths.pop()
        for used in sorted(uses.get(path[-1], ())):
            if used == name:
                return [*path, name]
            if used not in seen:
                seen.add(used)
                paths.append([*path, used])
    return []


def _check_formula(value: Value, computed: Any, file: TomlFile, table: Any, dotted: str, collector: Collector) -> None:
    printed = table.by_node.values() if table.by_node is not None else [table.value]
    half_digit = np.array([0.5 * 10.0 ** int(_exponent(number)) for number in printed])
    tolerance = half_digit * float(parse_unit(value.unit).factor) * 1.000001
    computed, expected = np.broadcast_arrays(computed, value.si)
    if np.any(np.abs(computed - expected) > tolerance):
        worst = int(np.argmax(np.abs(computed - expected)))
        collector.add(
            file.problem(
                dotted,
                "is stale: its formula gives another number",
                amount(f"{value.in_unit(float(expected.flat[worst])):.6g}", value.unit),
                amount(f"{value.in_unit(float(computed.flat[worst])):.6g}", value.unit),
                f"formula: {value.formula}",
            )
        )


def _exponent(number: Any) -> int:
    return number.as_tuple().exponent if hasattr(number, "as_tuple") else 0


def _resolve_defaults(
    declaration: ModelDeclaration,
    options: Mapping[str, str],
    values: dict[str, Value],
    stated: frozenset[str],
    file: TomlFile,
    collector: Collector,
) -> None:
    """Fill declared defaults, and report required names that are absent."""
    words = {option.name: option.allowed for option in declaration.options}
    for item in declaration.inputs:
        if item.when is not None and options.get(item.when[0]) not in words[item.when[0]]:
            continue  # the option itself is refused
        if item.name in values or item.name in stated:
            if item.when is not None and options.get(item.when[0]) not in item.when[1]:
                collector.add(
                    file.problem(
                        f"value.{item.name}",
                        "has no effect with this option",
                        f"{item.when[0]} = {options.get(item.when[0])!r}",
                        f"{item.when[0]} = " + " or ".join(item.when[1]),
                    )
                )
            continue
        if item.when is not None and options.get(item.when[0]) not in item.when[1]:
            continue
        if item.default is not None:
            values[item.name] = Value(
                item.name,
                np.array([item.default.value]),
                QUANTITIES[item.name].unit,
                None,
                item.default.evidence,
                "",
                origin=item.default.origin,
                file=file.name,
            )
        elif item.required:
            quantity = QUANTITIES[item.name]
            collector.add(
                file.problem(
                    f"value.{item.name}",
                    f"is missing ({quantity.meaning})",
                    "",
                    quantity.example,
                    f"the model {declaration.name} needs it",
                )
            )


def build_technology(
    file: TomlFile,
    declarations: Callable[[str], ModelDeclaration],
    model_names: Sequence[str],
    sources: frozenset[str],
    collector: Collector,
) -> ParameterSet | None:
    """Validate and convert a technology file.

    Parameters
    ----------
    file : TomlFile
    declarations : callable
        From model name to its declaration.
    model_names : sequence of str
    sources : frozenset of str
        Known source keys.
    collector : Collector
        Receives every problem; when it received any from this file, None is returned.
    """
    before = len(collector.problems)
    parsed, spoiled = validate_values(TechnologyFile, file, collector)
    if parsed is None:
        return None
    _check_identity(parsed, file, collector)
    if parsed.model not in model_names:
        collector.add(
            file.problem(
                "model",
                "is not a known model",
                repr(parsed.model),
                ", ".join(model_names),
                nearest(parsed.model, model_names),
            )
        )
        return None
    declaration = declarations(parsed.model)
    options, default_options = _options(parsed.option, declaration, file, collector)
    allowed = [item.name for item in declaration.inputs if item.name != "reference_temperature"]
    values = _convert_values(
        parsed.value, allowed, parsed.nodes, file, parsed.default, sources, collector, f"the model {parsed.model}"
    )
    temperature = convert_measure(
        parsed.reference_temperature, "K", 1.0, Place(file, "reference_temperature", parsed.default, sources), collector
    )
    if temperature is not None:
        values["reference_temperature"] = Value(
            "reference_temperature",
            np.array([temperature]),
            parsed.reference_temperature.unit,
            None,
            "choice",
            "",
            conditions="temperature at which the values of the set hold",
            file=file.name,
            line=file.line("reference_temperature"),
        )
    stated = frozenset({*parsed.value, *spoiled, "reference_temperature"})
    _resolve_defaults(declaration, options, values, stated, file, collector)
    tables_named = {**dict.fromkeys(spoiled), **parsed.value}
    check_formulas({name: v for name, v in values.items() if not v.is_default}, file, tables_named, collector)
    stated_values = {name: value for name, value in values.items() if name in parsed.value}
    joints, with_samples = read_joints(parsed.joint, stated_values, file, collector)
    values |= with_samples
    tables = read_tables(parsed, declaration, file, sources, collector)
    rows, rows_rest_on = read_rows(parsed.row, parsed.nodes, file, sources, parsed.default, collector)
    if "rows" in declaration.tables:
        for node in parsed.nodes:
            if node not in rows:
                collector.add(file.problem("row", f"has no entry for node {node!r}"))
    elif parsed.row:
        collector.add(file.problem("row", f"is not used by the model {parsed.model}"))
    valid: dict[str, tuple[float, float]] = {}
    for key, unit in (("supply", "V"), ("temperature", "K")):
        table = getattr(parsed.valid, key)
        if table is not None:
            found = convert_range(table, unit, Place(file, f"valid.{key}", parsed.default, sources), collector)
            if found is not None:
                valid[key] = found
    anchors = read_anchors(parsed.anchor, parsed.nodes, file, sources, collector)
    if len(collector.problems) > before:
        return None
    return ParameterSet(
        parsed.id,
        parsed.title,
        "technology",
        parsed.model,
        tuple(parsed.nodes),
        parsed.flavour,
        parsed.ambition,
        parsed.note,
        options,
        default_options,
        values,
        tables,
        rows,
        anchors,
        valid,
        file.name,
        file.sha256,
        file.text,
        file.path,
        file.lines,
        rows_rest_on,
        joints,
    )


def _check_identity(parsed: Any, file: TomlFile, collector: Collector) -> None:
    if parsed.id != file.path.stem:
        collector.add(file.problem("id", "differs from the file name", repr(parsed.id), repr(file.path.stem)))
    repeated = sorted(node for node, times in Counter(parsed.nodes).items() if times > 1)
    for node in repeated:
        collector.add(file.problem("nodes", "names a node twice", repr(node)))


def _options(
    given: Mapping[str, str], declaration: ModelDeclaration, file: TomlFile, collector: Collector
) -> tuple[dict[str, str], frozenset[str]]:
    known = {option.name: option for option in declaration.options}
    for name, text in given.items():
        if name not in known:
            collector.add(
                file.problem(
                    f"option.{name}",
                    f"is not an option of the model {declaration.name}",
                    "",
                    ", ".join(known),
                    nearest(name, known),
                )
            )
        elif text not in known[name].allowed:
            collector.add(
                file.problem(
                    f"option.{name}",
                    "is not one of the allowed words",
                    repr(text),
                    ", ".join(known[name].allowed),
                    nearest(text, known[name].allowed),
                )
            )
    options = {name: given.get(name, option.default) for name, option in known.items()}
    return options, frozenset(name for name in known if name not in given)


def build_wires(file: TomlFile, sources: frozenset[str], collector: Collector) -> ParameterSet | None:
    """Validate and convert a wires file; all three wire values are required."""
    before = len(collector.problems)
    parsed, spoiled = validate_values(WiresFile, file, collector)
    if parsed is None:
        return None
    _check_identity(parsed, file, collector)
    names = _quantity_names("wires")
    values = _convert_values(parsed.value, names, parsed.nodes, file, parsed.default, sources, collector, "wires sets")
    for name in names:
        if name not in parsed.value and name not in spoiled:
            collector.add(file.problem(f"value.{name}", "is missing", "", QUANTITIES[name].example))
    check_formulas(values, file, {**dict.fromkeys(spoiled), **parsed.value}, collector)
    joints, values = read_joints(parsed.joint, values, file, collector)
    if len(collector.problems) > before:
        return None
    return ParameterSet(
        parsed.id,
        parsed.title,
        "wires",
        "",
        tuple(parsed.nodes),
        "",
        "today",
        parsed.note,
        {},
        frozenset(),
        values,
        {},
        {},
        (),
        {},
        file.name,
        file.sha256,
        file.text,
        file.path,
        file.lines,
        joints=joints,
    )


def replace_values(original: ParameterSet, values: Mapping[str, Value]) -> ParameterSet:
    """Return the set with some values replaced (what-if)."""
    return dataclasses.replace(original, values={**original.values, **values})
