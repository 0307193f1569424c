"""The JSON Schemas editors use are current, accept every shipped file, and refuse what the program refuses."""

from __future__ import annotations

import datetime
import functools
import json
import shutil
import tomllib
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
from jsonschema import Draft202012Validator

from benchmark.catalogue import QUANTITIES
from benchmark.cli.new import KINDS, new_command
from benchmark.devices import MODEL_NAMES, model
from benchmark.record.check import check_paths
from tests.remake_schemas import FOLDER, described, schemas, text

ROOT = Path(__file__).resolve().parents[2]
Table = dict[str, Any]


def plain(value: Any) -> Any:
    """TOML as an editor hands it to a schema: dates are text."""
    if isinstance(value, dict):
        return {key: plain(item) for key, item in value.items()}
    if isinstance(value, list):
        return [plain(item) for item in value]
    return value.isoformat() if isinstance(value, datetime.date) else value


def read(path: Path) -> Table:
    found = plain(tomllib.loads(path.read_text(encoding="utf-8")))
    assert isinstance(found, dict)
    return found


@functools.cache
def validator(name: str) -> Draft202012Validator:
    return Draft202012Validator(json.loads((FOLDER / name).read_text(encoding="utf-8")))


def complaints(name: str, data: Table) -> list[str]:
    return [
        f"{'.'.join(map(str, error.absolute_path))}: {error.message}" for error in validator(name).iter_errors(data)
    ]


def schema_of(path: Path, data: Table) -> str:
    if "workload" in data:
        return "study.json"
    if path.name == "sources.toml" or path.parent.name == "tables":
        return "sources.json" if path.name == "sources.toml" else "table.json"
    if data.get("kind") == "curves":
        return "curves.json"
    if "net" in data:
        return "circuit.json"
    return "wires.json" if data.get("kind") == "wires" else f"technology-{data['model']}.json"


def shipped() -> list[Path]:
    folders = ("nodes", "reports", "tests/data/stress-hand", "tests/data/word-line")
    return [path for folder in folders for path in sorted((ROOT / folder).rglob("*.toml"))]


def test_committed_schemas_are_what_the_program_makes():
    made = schemas()
    assert {path.name for path in FOLDER.glob("*")} == set(made), "run tests/remake_schemas.py"
    for name, schema in made.items():
        assert (FOLDER / name).read_text(encoding="utf-8") == text(schema), f"run tests/remake_schemas.py: {name}"


def keys(schema: Any, where: str = "") -> Iterator[tuple[str, Any]]:
    """Every key of a file that a schema describes (refused ones are False)."""
    if isinstance(schema, list):
        for item in schema:
            yield from keys(item, where)
    elif isinstance(schema, dict):
        for key, item in schema.items():
            if key == "properties":
                for name, own in item.items():
                    yield f"{where}.{name}", own
            if key not in ("if", "then", "else", "allOf"):
                yield from keys(item, f"{where}.{key}")


def references(schema: Any) -> Iterator[str]:
    if isinstance(schema, list):
        for item in schema:
            yield from references(item)
    elif isinstance(schema, dict):
        if "$ref" in schema:
            yield schema["$ref"]
        for item in schema.values():
            yield from references(item)


@pytest.mark.parametrize("name", sorted(schemas()))
def test_schemas_are_schemas_and_every_key_says_what_it_means(name: str):
    schema = json.loads((FOLDER / name).read_text(encoding="utf-8"))
    Draft202012Validator.check_schema(schema)
    assert all(where.startswith("#/$defs/") for where in references(schema))  # editors read one file
    found = list(keys(schema))
    assert found
    assert [where for where, own in found if not own.get("description")] == []


def test_descriptions_carry_meaning_unit_and_usual_range():
    schema = json.loads((FOLDER / "technology-stress-gated.json").read_text(encoding="utf-8"))
    entry = schema["properties"]["value"]["properties"]["actuator_coefficient"]
    assert entry["description"] == described(QUANTITIES["actuator_coefficient"])
    assert entry["description"] == (
        "Strain per field of the actuator film, effective (d33), in pm/V or any unit of that dimension. "
        "Usually 1 to 3000 pm/V; above 0"
    )


@pytest.mark.parametrize("name", MODEL_NAMES)
def test_a_technology_may_state_exactly_what_its_model_reads(name: str):
    own = json.loads((FOLDER / f"technology-{name}.json").read_text(encoding="utf-8"))["properties"]
    device = model(name)
    assert set(own["value"]["properties"]) == {item.name for item in device.inputs} - {"reference_temperature"}
    assert {key: tuple(item["enum"]) for key, item in own["option"]["properties"].items()} == {
        option.name: option.allowed for option in device.options
    }


@pytest.mark.parametrize("path", shipped(), ids=lambda path: str(path.relative_to(ROOT)))
def test_every_shipped_file_validates(path: Path):
    data = read(path)
    assert complaints(schema_of(path, data), data) == []


def hinted(path: Path) -> Path:
    """The schema that the first line of a file names."""
    first = path.read_text(encoding="utf-8").splitlines()[0]
    assert first.startswith("#:schema "), path
    return (path.parent / first.removeprefix("#:schema ")).resolve()


@pytest.mark.parametrize("path", [p for p in shipped() if "tests" not in p.parts], ids=lambda path: path.stem)
def test_shipped_files_name_their_schema(path: Path):
    assert hinted(path) == FOLDER / schema_of(path, read(path))


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("model_name", MODEL_NAMES)
def test_new_files_validate_and_name_their_schema(kind: str, model_name: str, tmp_path: Path):
    if kind != "technology" and model_name != MODEL_NAMES[0]:
        return
    new_command(kind, tmp_path / "fresh.toml", model_name if kind == "technology" else None)
    files = sorted(tmp_path.rglob("*.toml"))
    assert files
    for path in files:
        data = read(path)
        name = schema_of(path, data)
        assert complaints(name, data) == []
        assert hinted(path) == FOLDER / name


# -- what is wrong: one change to a shipped file; the program refuses it as well ---------------------------------


def _set(*keys: Any, to: Any) -> Callable[[Table], None]:
    def change(data: Table) -> None:
        *path, last = keys
        for key in path:
            data = data[key]
        data[last] = to

    return change


def _drop(*keys: Any) -> Callable[[Table], None]:
    def change(data: Table) -> None:
        *path, last = keys
        for key in path:
            data = data[key]
        del data[last]

    return change


GIVEN = "nodes/technologies/demo-given.toml"
STRESS = "nodes/technologies/demo-stress-gated.toml"
ROWS = "nodes/technologies/demo-stage-table.toml"
TABLE = "nodes/technologies/demo-table.toml"
WIRES = "nodes/wires/wires-7nm.toml"
STUDY = "reports/always-on-hub/study.toml"
CIRCUIT = "tests/data/word-line/word-line.toml"
RESISTANCE = ("value", "on_resistance")

WRONG: dict[str, tuple[str, Callable[[Table], None]]] = {
    "unknown key": (GIVEN, _set("colour", to="blue")),
    "format of another version": (GIVEN, _set("schema", to=2)),
    "no id": (GIVEN, _drop("id")),
    "no nodes": (GIVEN, _set("nodes", to=[])),
    "node that is a length": (GIVEN, _set("nodes", to=["7nm"])),
    "unknown model": (GIVEN, _set("model", to="relay")),
    "value of another model": (GIVEN, _set("value", "channel_modulus", to={"value": 90, "unit": "GPa"})),
    "misspelt value": (GIVEN, _set("value", "on_resistence", to={"value": 1, "unit": "kohm"})),
    "missing value": (GIVEN, _drop(*RESISTANCE)),
    "number as text": (GIVEN, _set(*RESISTANCE, "value", to="100")),
    "truth value as number": (GIVEN, _set(*RESISTANCE, "value", to=True)),
    "negative resistance": (GIVEN, _set(*RESISTANCE, "value", to=-100.0)),
    "neither value nor by_node": (GIVEN, _drop(*RESISTANCE, "value")),
    "value and by_node": (GIVEN, _set(*RESISTANCE, "by_node", to={"g1": 1.0})),
    "no unit": (GIVEN, _drop(*RESISTANCE, "unit")),
    "unknown evidence": (GIVEN, _set(*RESISTANCE, "evidence", to="guessed")),
    "unknown bound": (GIVEN, _set(*RESISTANCE, "bound", to="about")),
    "spread of no shape": (GIVEN, _set(*RESISTANCE, "spread", to={"low": 1.0, "high": 200.0})),
    "spread of two widths": (GIVEN, _set(*RESISTANCE, "spread", to={"shape": "normal", "sd": 1.0, "percent": 1.0})),
    "spread of no width": (GIVEN, _set(*RESISTANCE, "spread", to={"shape": "lognormal"})),
    "unknown option": (GIVEN, _set("option", to={"pressure_law": "log-slope"})),
    "word an option lacks": (STRESS, _set("option", "pressure_law", to="linear")),
    "value the option makes idle": (STRESS, _set("value", "stack_thickness", to={"value": 100, "unit": "nm"})),
    "unknown anchor": (GIVEN, _set("anchor", to={"speed": {"value": 1, "unit": "ps", "source": "invented"}})),
    "stage results of another model": (GIVEN, _set("row", to=[read(ROOT / ROWS)["row"][0]])),
    "no stage results": (ROWS, _drop("row")),
    "stage result without a delay": (ROWS, _drop("row", 0, "delay")),
    "no measured table": (TABLE, _drop("table")),
    "unknown measured table": (TABLE, _set("table", "resistance", to={"file": "tables/demo-current.csv"})),
    "wires of no value": (WIRES, _drop("value", "wire_resistance_per_length")),
    "wires of a technology": (WIRES, _set("value", "on_resistance", to={"value": 1, "unit": "kohm"})),
    "unknown ambition": (GIVEN, _set("ambition", to="soon")),
    "study without contenders": (STUDY, _set("contender", to=[])),
    "study without a policy": (STUDY, _drop("policy")),
    "unknown policy": (STUDY, _set("policy", "primary", to="minimum-cost")),
    "unknown metric": (STUDY, _set("policy", "metric", to="price")),
    "unknown requirement": (STUDY, _set("requirements", "beauty", to={"kind": "report"})),
    "requirement of no kind": (STUDY, _drop("requirements", "deadline", "kind")),
    "cycle as a noise margin": (STUDY, _set("requirements", "noise_margin", "limit", to="cycle")),
    "endurance with a limit": (
        STUDY,
        _set("requirements", "endurance", to={"kind": "report", "limit": {"value": 1e15, "unit": "1"}}),
    ),
    "fan-in of a deadline": (STUDY, _set("requirements", "deadline", "fan_in", to=2)),
    "unknown product class": (STUDY, _set("product", "class", to="toaster")),
    "unknown timing": (STUDY, _set("workload", "timing", to="asynchronous")),
    "value by node in a study": (STUDY, _set("value", "activity", to={"by_node": {"n1": 0.1}})),
    "two net lengths": (STUDY, _set("value", "average_net_length", to={"value": 1.0, "unit": "um"})),
    "missing circuit value": (STUDY, _drop("value", "logic_depth")),
    "missing clock": (STUDY, _drop("value", "clock_frequency")),
    "missing idle time": (STUDY, _drop("value", "idle_time")),
    "overhead left out": (STUDY, _drop("candidate", "overhead", "supply_efficiency")),
    "gating left out": (STUDY, _drop("candidate", "gating")),
    "unknown knob": (STUDY, _set("candidate", "knobs", "temperature", to={"values": [1], "unit": "K"})),
    "date as a number": (STUDY, _set("declared", to=20260131)),
    "unknown driver": (CIRCUIT, _set("net", 0, "driver", to="xor2")),
    "negative count": (CIRCUIT, _set("net", 0, "count", to=-1)),
    "circuit without nets": (CIRCUIT, _set("net", to=[])),
}


@pytest.mark.parametrize("name", WRONG)
def test_wrong_files_are_refused_by_the_schema_and_by_the_program(name: str, tmp_path: Path):
    source, change = WRONG[name]
    data = read(ROOT / source)
    schema = schema_of(ROOT / source, data)
    assert complaints(schema, data) == []
    change(data)
    assert complaints(schema, data) != [], "the schema accepts it"
    path = _write(ROOT / source, data, tmp_path)
    assert check_paths([path]).problems, "the program accepts it"


@pytest.mark.parametrize("source", sorted({source for source, _ in WRONG.values()}))
def test_the_files_before_the_change_are_accepted(source: str, tmp_path: Path):
    path = _write(ROOT / source, read(ROOT / source), tmp_path)
    assert check_paths([path]).problems == ()


def _write(source: Path, data: Table, folder: Path) -> Path:
    """Write a changed file where the program finds what it refers to."""
    from tests.studies import toml

    place = folder / source.parent.name / source.name
    place.parent.mkdir()
    shutil.copytree(ROOT / "nodes" / "tables", folder / "tables")
    text = toml(data)
    for key in ("declared", "date"):
        text = _unquoted(text, key)
    place.write_text(text, encoding="utf-8")
    return place


def _unquoted(text: str, key: str) -> str:
    """Dates are written without quotes."""
    lines = [
        f"{key} = {line.split(chr(34))[1]}" if line.startswith(f'{key} = "') else line for line in text.splitlines()
    ]
    return "\n".join(lines) + "\n"


@pytest.mark.parametrize("name", ["source kind", "second-hand", "column meaning", "column unit", "scale"])
def test_wrong_sources_and_table_descriptions_are_refused_by_the_schema(name: str):
    sources, table = read(ROOT / "nodes" / "sources.toml"), read(ROOT / "nodes" / "tables" / "demo-charge.toml")
    entry = {"kind": "article", "authors": ["A"], "year": 2020, "title": "T", "read": "original"}
    changes: dict[str, tuple[str, Table, Callable[[Table], None]]] = {
        "source kind": ("sources.json", sources, _set("new", to=entry | {"kind": "rumour"})),
        "second-hand": ("sources.json", sources, _set("new", to=entry | {"read": "second-hand"})),
        "column meaning": ("table.json", table, _set("column", "temperature", "meaning", to="weather")),
        "column unit": ("table.json", table, _drop("column", "temperature", "unit")),
        "scale": ("table.json", table, _set("interpolate", "scale", to="square")),
    }
    schema, data, change = changes[name]
    assert complaints(schema, data) == []
    change(data)
    assert complaints(schema, data) != []


RAW_WRONG: dict[str, Callable[[Table], None]] = {
    "unknown key": _set("delimeter", to=";"),
    "unknown delimiter": _set("delimiter", to=":"),
    "negative rows": _set("skip_rows", to=-1),
    "one turn": _set("turns", to=["forward"]),
    "unknown axis": _set("along", to="gate"),
    "no columns": _set("column", to=[]),
    "column without place": _drop("column", 0, "header"),
    "column zero": _set("column", 0, "number", to=0),
    "unknown meaning": _set("column", 0, "meaning", to="gate_voltage"),
    "a quantity as label": _set("column", 2, "meaning", to="width"),
    "a label with a unit": _set("column", 2, "unit", to="V"),
    "words of numbers": _set("column", 0, "allowed", to=["0", "1"]),
    "floor of an axis": _set("column", 0, "floor", to={"value": 1.0, "unit": "mV"}),
    "floor without unit": _drop("column", 1, "floor", "unit"),
    "two signs of a voltage": _set("column", 0, "sign", to="both"),
    "voltage per width": _set("column", 0, "per_width", to=True),
    "unknown fixed value": _set("fixed", "gate", to={"value": 1.0, "unit": "V"}),
    "unknown quantity": _set("extract", 0, "quantity", to="slope"),
    "unknown evidence": _set("evidence", to="rumour"),
}


@pytest.mark.parametrize("name", RAW_WRONG)
def test_wrong_descriptions_of_raw_files_are_refused_by_the_schema_and_by_the_program(name: str, tmp_path: Path):
    from tests.studies import toml

    path = tmp_path / "raw.toml"
    new_command("curves", path)
    data = read(path)
    for wrong in (False, True):
        if wrong:
            RAW_WRONG[name](data)
        path.write_text(toml(data), encoding="utf-8")
        assert bool(complaints("curves.json", data)) == wrong
        assert bool(check_paths([path]).problems) == wrong
