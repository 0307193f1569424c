"""Re-make the JSON Schemas of every file kind: ``.venv/bin/python tests/remake_schemas.py``.

Written to ``nodes/schema/`` from what the program itself reads by: the file models, the catalogue, the declarations of
device models and circuits. A schema is for editors and is coarser than ``evenload check``: units, ranges, sources,
formulas and physics are judged there alone. A test compares the committed files with what this makes.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Callable, Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any

from pydantic import BaseModel
from pydantic.json_schema import GenerateJsonSchema

from benchmark.catalogue import (
    EVIDENCE,
    PRODUCT_CLASSES,
    QUANTITIES,
    STUDY_QUANTITIES,
    WIRE_QUANTITIES,
    Quantity,
)
from benchmark.circuits.library import BUILT_IN
from benchmark.curves.description import CurvesFile
from benchmark.curves.meanings import MEANINGS, ONE_SIGN, PER_WIDTH
from benchmark.devices import MODEL_NAMES, model
from benchmark.devices.model import DeviceModel, Input
from benchmark.sets.circuit_file import CELL
from benchmark.sets.schema import SourceEntry, TechnologyFile, WiresFile
from benchmark.sets.set_parts import ANCHOR_UNITS
from benchmark.sets.study import REQUIREMENTS
from benchmark.sets.study_builder import GATING, LENGTHS, MITIGATION, OPTIONAL_OVERHEADS, OVERHEADS
from benchmark.sets.study_schema import CircuitFile, StudyFile
from benchmark.sets.tables import COLUMN_UNITS, Sidecar
from benchmark.units import parse_unit

FOLDER = Path(__file__).resolve().parent.parent / "nodes" / "schema"
DIALECT = "https://json-schema.org/draft/2020-12/schema"
Schema = dict[str, Any]


class _Generator(GenerateJsonSchema):
    """TOML has numbers but no null, and its dates reach a schema as text."""

    def decimal_schema(self, schema: Any) -> Schema:
        return {"type": "number"}

    def nullable_schema(self, schema: Any) -> Schema:
        return self.generate_inner(schema["schema"])

    def field_title_should_be_set(self, schema: Any) -> bool:
        return False


def _tidy(node: Any, *, names: bool = False) -> Any:
    """Drop what editors do not need. ``names``: the keys of this level are names of the file, not keywords."""
    if isinstance(node, list):
        return [_tidy(item) for item in node]
    if not isinstance(node, dict):
        return node
    found: Schema = {}
    for key, item in node.items():
        if not names and key in ("title", "discriminator", "maxLength"):
            continue
        if not names and key == "default" and (item is None or isinstance(item, (dict, list)) or item == ""):
            continue
        if not names and key == "description":
            found[key] = item.replace("``", "")
            continue
        found[key] = _tidy(item, names=not names and key in ("properties", "patternProperties", "$defs"))
    return found if names else _settled(found)


def _settled(found: Schema) -> Schema:
    """One type for numbers, a part for a reference with words of its own, no other key beside named patterns."""
    if [item.get("type") for item in found.get("anyOf", [])] == ["number", "integer"]:
        del found["anyOf"]
        found["type"] = "number"
    if "$ref" in found and len(found) > 1:
        found["allOf"] = [{"$ref": found.pop("$ref")}]
    if "patternProperties" in found:
        found.setdefault("additionalProperties", False)
    return found


def _raw(file_model: type[BaseModel]) -> Schema:
    made = file_model.model_json_schema(by_alias=True, schema_generator=_Generator, mode="validation")
    found: Schema = _tidy(made)
    tables = found.setdefault("$defs", {})
    for name, keys in (("Normal", ("sd", "percent")), ("LogNormal", ("factor", "ln_sd"))):
        if name in tables:
            tables[name]["oneOf"] = [{"required": [key]} for key in keys]
    tables.update(_kinds())
    return found


def _ref(name: str) -> Schema:
    return {"$ref": f"#/$defs/{name}"}


def _part(name: str) -> Schema:
    """A reference that stands beside words of its own."""
    return {"allOf": [_ref(name)]}


def _closed(properties: Mapping[str, Any], required: Iterable[str] = (), **more: Any) -> Schema:
    """An object with these names and no others."""
    found: Schema = {"type": "object", "additionalProperties": False, "properties": dict(properties)}
    if sorted(required):
        found["required"] = sorted(required)
    return {**more, **found}


def _when(path: Sequence[str], words: Sequence[str], *, also_absent: bool = False) -> Schema:
    """A condition: the text at a path is one of the words."""
    condition: Schema = {"enum": list(words)}
    for key in reversed(path):
        condition = {"properties": {key: condition}, **({} if also_absent else {"required": [key]})}
    return condition


def _evidence() -> Schema:
    words = [
        f"{name}: {item.meaning}" + (f" (states its {' and '.join(item.must_state)})" if item.must_state else "")
        for name, item in EVIDENCE.items()
    ]
    return {"description": f"What the number is worth. {'; '.join(words)}", "enum": list(EVIDENCE)}


_DOMAINS: dict[str, Schema] = {
    "positive": {"exclusiveMinimum": 0},
    "nonnegative": {"minimum": 0},
    "fraction": {"minimum": 0},
    "share": {"exclusiveMinimum": 0},
    "count": {"exclusiveMinimum": 0},
    "any": {},
}


def described(quantity: Quantity) -> str:
    """Meaning, symbol, unit, usual range and domain of a catalogue entry."""
    plain = quantity.unit == "1"
    unit = "a plain number" if plain else f"in {quantity.unit} or any unit of that dimension"
    span = f"{quantity.low:g} to {quantity.high:g}" + ("" if plain else f" {quantity.unit}")
    meaning = quantity.meaning[0].upper() + quantity.meaning[1:]
    return f"{meaning} ({quantity.symbol}), {unit}. Usually {span}; {quantity.domain_text}"


def _kind(quantity: Quantity, by_node: bool) -> str:
    """Name of the definition that a value follows."""
    temperature = parse_unit(quantity.unit).dimension == parse_unit("K").dimension  # may be stated below zero, in degC
    domain = "any" if temperature else quantity.domain
    what = "Number" if quantity.unit == "1" else "Amount"
    return f"{domain.capitalize()}{what}{'' if by_node else 'Alone'}"


def _kinds() -> Schema:
    """Value tables by domain, with or without a unit, with or without nodes."""
    found = {}
    for domain, number in _DOMAINS.items():
        for what, unit in (("Number", []), ("Amount", ["unit"])):
            head = {"properties": {"value": number, "by_node": {"additionalProperties": number}}}
            need = {"required": unit} if unit else {}
            choice = {"oneOf": [{"required": ["value"]}, {"required": ["by_node"]}]}
            found[f"{domain.capitalize()}{what}"] = {"allOf": [_ref("ValueTable"), {**head, **need, **choice}]}
            alone = {"properties": {"value": number, "by_node": False}, "required": ["value", *unit]}
            found[f"{domain.capitalize()}{what}Alone"] = {"allOf": [_ref("ValueTable"), alone]}
    return found


def _value(quantity: Quantity, by_node: bool) -> Schema:
    """One value table: a number within its domain, with a unit unless it is a plain number."""
    return {"description": described(quantity), "allOf": [_ref(_kind(quantity, by_node))]}


def _values(names: Iterable[str], by_node: bool) -> Schema:
    return {name: _value(QUANTITIES[name], by_node) for name in sorted(names)}


def _evidence_everywhere(schema: Schema) -> None:
    for table in [schema, *schema.get("$defs", {}).values()]:
        if "evidence" in table.get("properties", {}):
            table["properties"]["evidence"] = _evidence()


def _finish(schema: Schema, title: str) -> Schema:
    _evidence_everywhere(schema)
    used: set[str] = set()

    def follow(node: Any) -> None:
        if isinstance(node, list):
            for item in node:
                follow(item)
        elif isinstance(node, dict):
            name = str(node.get("$ref", "")).removeprefix("#/$defs/")
            if name in schema.get("$defs", {}) and name not in used:
                used.add(name)
                follow(schema["$defs"][name])
            for item in node.values():
                follow(item)

    follow({key: item for key, item in schema.items() if key != "$defs"})
    head = {"$schema": DIALECT, "title": title, **{k: v for k, v in schema.items() if k != "$defs"}}
    return {**head, "$defs": {name: schema["$defs"][name] for name in sorted(used)}} if used else head


# -- sets ---------------------------------------------------------------------------------------------------------


def _is_needed(item: Input) -> bool:
    return item.required and item.default is None


def _conditions(device: DeviceModel) -> list[Schema]:
    """Values that an option asks for, and that mean nothing without it."""
    found = []
    defaults = {option.name: option.default for option in device.options}
    groups = dict.fromkeys(item.when for item in device.inputs if item.when is not None)
    for option, words in groups:
        mine = [item for item in device.inputs if item.when == (option, words)]
        needed = sorted(item.name for item in mine if _is_needed(item))
        then = {"required": ["value"], "properties": {"value": {"required": needed}}} if needed else {}
        found.append(
            {
                "if": _when(["option", option], words, also_absent=defaults[option] in words),
                "then": then,
                "else": {"properties": {"value": {"properties": dict.fromkeys((i.name for i in mine), False)}}},
            }
        )
    return found


def technology_schema(name: str) -> Schema:
    """The schema of technology sets of one device model."""
    device, schema = model(name), _raw(TechnologyFile)
    inputs = [item for item in device.inputs if item.name != "reference_temperature"]
    needed = [item.name for item in inputs if _is_needed(item) and item.when is None]
    own = schema["properties"]
    own["model"] = {"description": f"Device model: {device.title}", "const": name}
    own["value"] = _closed(
        _values((item.name for item in inputs), True), needed, description=own["value"]["description"]
    )
    own["option"] = _closed(
        {
            item.name: {
                "description": f"Choice of the model; without it: {item.default}",
                "enum": list(item.allowed),
                "default": item.default,
            }
            for item in device.options
        },
        description=own["option"]["description"],
    )
    tables = {table: required for table, required in device.tables.items() if table != "rows"}
    own["table"] = _closed(
        {table: {"description": f"Measured {table} of the model", **_part("TableReference")} for table in tables},
        (table for table, required in tables.items() if required),
        description=own["table"]["description"],
    )
    own["anchor"] = _anchors(own["anchor"]["description"])
    required = [key for key, there in (("value", needed), ("table", any(tables.values()))) if there]
    if "rows" in device.tables:
        own["row"]["minItems"] = 1
        required.append("row")
    else:
        own["row"] = {"description": f"Stage results are not read by the model {name}", "maxItems": 0, "type": "array"}
    schema["required"] = [*schema["required"], *required]
    if _conditions(device):
        schema["allOf"] = _conditions(device)
    return _finish(schema, f"Technology set of the model {name}")


def _anchors(description: str) -> Schema:
    more = "several of a kind: name__anything"
    return {
        "description": f"{description}; {more}",
        "type": "object",
        "additionalProperties": False,
        "properties": {
            name: {"description": f"Published {name} [{unit}]; {more}", **_part("AnchorTable")}
            for name, unit in ANCHOR_UNITS.items()
        },
        "patternProperties": {f"^({'|'.join(ANCHOR_UNITS)})__": _ref("AnchorTable")},
    }


def wires_schema() -> Schema:
    """The schema of wires sets."""
    schema = _raw(WiresFile)
    names = [quantity.name for quantity in WIRE_QUANTITIES]
    schema["properties"]["value"] = _closed(
        _values(names, True), names, description=schema["properties"]["value"]["description"]
    )
    schema["required"] = [*schema["required"], "value"]
    return _finish(schema, "Wires set")


def sources_schema() -> Schema:
    """The schema of the source list."""
    entry = _raw(SourceEntry)
    del entry["$defs"]
    entry["allOf"] = [{"if": _when(["read"], ["second-hand"]), "then": {"required": ["via"]}}]
    schema = {
        "description": "Where values come from, by key.",
        "type": "object",
        "properties": {"schema": {"description": "Version of the file format: 1", "const": 1}},
        "additionalProperties": _ref("SourceEntry"),
        "$defs": {"SourceEntry": entry},
    }
    return _finish(schema, "Source list")


def table_schema() -> Schema:
    """The schema of the description of a measured table."""
    schema = _raw(Sidecar)
    column = schema["$defs"]["ColumnTable"]
    listed = "; ".join(f"{name} [{unit}]" for name, unit in COLUMN_UNITS.items())
    column["properties"]["meaning"]["description"] = f"What the column holds. {listed}; labels: a name of your own"
    column["allOf"] = [
        {
            "if": _when(["kind"], ["axis", "value"]),
            "then": {"required": ["unit"], "properties": {"meaning": {"enum": list(COLUMN_UNITS)}}},
        }
    ]
    return _finish(schema, "Description of a measured table")


def curves_schema() -> Schema:
    """The schema of the description of a raw measured file."""
    schema = _raw(CurvesFile)
    own, column = schema["properties"], schema["$defs"]["ColumnTable"]
    listed = "; ".join(f"{name} [{quantity.unit}]" for name, quantity in MEANINGS.items())
    column["properties"]["meaning"]["description"] = f"What the column holds. {listed}; labels: a name of your own"
    own["along"] = {"description": own["along"]["description"], "enum": list(MEANINGS)}
    own["turns"]["minItems"] = 2
    column["properties"]["number"]["minimum"] = 1
    column["anyOf"] = [{"required": ["header"]}, {"required": ["number"]}]
    words = dict.fromkeys(("unit", "scale", "floor", "compliance"), False)
    axis = dict.fromkeys(("floor", "compliance"), False)
    column["allOf"] = [
        {
            "if": _when(["kind"], ["axis", "value"]),
            "then": {"properties": {"meaning": {"enum": list(MEANINGS)}, "allowed": False}},
            "else": {"properties": {**words, "meaning": {"not": {"enum": list(MEANINGS)}}}},
        },
        {"if": _when(["kind"], ["axis"]), "then": {"properties": axis}},
        {"if": _when(["sign"], ["both"]), "then": {"properties": {"meaning": {"enum": sorted(ONE_SIGN)}}}},
        {
            "if": {"properties": {"per_width": {"const": True}}, "required": ["per_width"]},
            "then": {"properties": {"meaning": {"enum": list(PER_WIDTH)}}},
        },
    ]
    for table in (own, column["properties"], schema["$defs"]["GivenTable"]["properties"]):
        table["fixed"]["propertyNames"] = {"enum": list(MEANINGS)}
    return _finish(schema, "Description of a raw measured file")


# -- studies and circuits -----------------------------------------------------------------------------------------


def _requirement(name: str, unit: str, meaning: str) -> Schema:
    functional, own = name in ("noise_margin", "voltage_gain"), {}
    own["fan_in"] = {"minimum": 1, "maximum": 16} if functional else False
    if name == "endurance":
        own |= {"limit": False}
    else:
        words = [{"const": "cycle"}] if name == "deadline" else []
        own |= {"life": False, "limit": {"anyOf": [_ref("Measure"), *words]}}
    required = ["life" if name == "endurance" else "limit"]
    text = f"{meaning[0].upper()}{meaning[1:]} [{unit}]" if unit != "1" else f"{meaning[0].upper()}{meaning[1:]}"
    return {"description": text, "allOf": [_ref("RequirementTable"), {"required": required, "properties": own}]}


def _scenario_rules() -> list[Schema]:
    """Values that the circuit, the timing and the idle mode ask for."""
    found = [
        {"if": _when(["workload", "circuit"], [name]), "then": _needs(which.required)}
        for name, which in BUILT_IN.items()
    ]
    found.append({"if": _when(["workload", "timing"], ["clocked"]), "then": _needs(["clock_frequency"])})
    idle = ["idle_time", "active_cycles"]
    found.append({"if": _when(["workload", "idle"], ["ungated", "gated"]), "then": _needs(idle)})
    gated = {"required": ["gating"], "properties": {"gating": {"required": list(GATING)}}}
    sides = {"properties": {"candidate": gated, "contender": {"items": gated}}}
    return [*found, {"if": _when(["workload", "idle"], ["gated"]), "then": sides}]


def _needs(names: Iterable[str]) -> Schema:
    return {"properties": {"value": {"required": sorted(names)}}}


def study_schema() -> Schema:
    """The schema of studies."""
    schema = _raw(StudyFile)
    tables, own = schema["$defs"], schema["properties"]
    costs = [name for names in MITIGATION.values() for name in names]
    ledger = {*OVERHEADS, *OPTIONAL_OVERHEADS, *GATING, *costs}
    names = [quantity.name for quantity in STUDY_QUANTITIES if quantity.name not in ledger]
    own["value"] = _closed(_values(names, False), description=own["value"]["description"])
    own["value"]["not"] = {"required": list(LENGTHS)}
    own["requirements"] = _closed(
        {name: _requirement(name, *rest) for name, rest in REQUIREMENTS.items()},
        description=own["requirements"]["description"],
    )
    side = tables["SideTable"]["properties"]
    side["overhead"] = _closed(
        _values([*OVERHEADS, *OPTIONAL_OVERHEADS], False), OVERHEADS, description=side["overhead"]["description"]
    )
    side["gating"] = _closed(_values(GATING, False), description=side["gating"]["description"])
    side["mitigation"] = _closed(_values(costs, False), description=side["mitigation"]["description"])
    tables["SideTable"]["allOf"] = [
        {"if": _when(["knobs"], [knob]), "then": {"properties": {"mitigation": {"required": list(names)}}}}
        for knob, names in MITIGATION.items()
    ]
    usual = "; ".join(f"{name}: {text}" for name, text in PRODUCT_CLASSES.items())
    tables["ProductTable"]["properties"]["class"] = {
        "description": f"Product class and what usually decides. {usual}",
        "enum": list(PRODUCT_CLASSES),
    }
    listed = "; ".join(f"{name}: {which.title}" for name, which in BUILT_IN.items())
    tables["WorkloadTable"]["properties"]["circuit"] = {
        "description": f"A built-in circuit, or the id of a circuit file. {listed}",
        "anyOf": [{"enum": list(BUILT_IN)}, {"type": "string"}],
    }
    schema["allOf"] = _scenario_rules()
    return _finish(schema, "Study")


def circuit_schema() -> Schema:
    """The schema of circuits a user writes."""
    schema = _raw(CircuitFile)
    tables = schema["$defs"]
    net, load, wire = (tables[name]["properties"] for name in ("NetTable", "LoadTable", "WireTable"))
    for table, key in ((net, "driver"), (load, "cell")):
        table[key]["pattern"] = f"^(inverter|{CELL.pattern})$"
    load["input"]["pattern"] = "^[a-h]$"
    counts = ("rising_per_operation", "busiest_per_operation", "count", "on_critical_path")
    for table, key in (*((net, key) for key in counts), (load, "count"), (wire, "length")):
        table[key]["minimum"] = 0
    layer = tables["LayerTable"]["properties"]
    for key, quantity in (
        ("resistance_per_length", "wire_resistance_per_length"),
        ("capacitance_per_length", "wire_capacitance_per_length"),
    ):
        layer[key] = _value(QUANTITIES[quantity], False)
    return _finish(schema, "Circuit")


def schemas() -> dict[str, Schema]:
    """File name -> schema, for every kind of file."""
    made: dict[str, Callable[[], Schema]] = {
        "wires.json": wires_schema,
        "sources.json": sources_schema,
        "table.json": table_schema,
        "curves.json": curves_schema,
        "study.json": study_schema,
        "circuit.json": circuit_schema,
    }
    own = {f"technology-{name}.json": technology_schema(name) for name in MODEL_NAMES}
    return {name: make() for name, make in made.items()} | own


def text(schema: Schema) -> str:
    """Serialise a schema as it is committed."""
    return json.dumps(schema, indent=1, ensure_ascii=False) + "\n"


def main() -> None:
    FOLDER.mkdir(exist_ok=True)
    made = schemas()
    for stale in sorted(set(FOLDER.glob("*.json")) - {FOLDER / name for name in made}):
        stale.unlink()
    for name, schema in made.items():
        (FOLDER / name).write_text(text(schema), encoding="utf-8", newline="\n")
    sys.stdout.write(f"{len(made)} schemas\n")


if __name__ == "__main__":
    main()
