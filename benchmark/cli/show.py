"""The command ``show``: what there is, and where every number of it comes from (layer 10)."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from benchmark.catalogue import EVIDENCE, QUANTITIES, STUDY_QUANTITIES, WIRE_QUANTITIES
from benchmark.circuits.library import BUILT_IN
from benchmark.cli.describe import SUPPORT, input_need, set_blocks, value_blocks
from benchmark.cli.layout import Block, Facts, Note, Table, show_blocks
from benchmark.cli.listing import LISTS, choice_words
from benchmark.devices import MODEL_NAMES, model
from benchmark.errors import Problem, UsageError, nearest
from benchmark.record.listing import FOLDERS, files_of
from benchmark.record.load import check_physics, open_library
from benchmark.record.value_text import usual_range
from benchmark.sets.circuit_file import CircuitSpec, read_circuit
from benchmark.sets.library import Library
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.study import REQUIREMENTS
from benchmark.units import parse_unit

__all__ = ["show_command"]


def show_command(what: str, nodes: Sequence[Path]) -> None:
    """Print a list, or everything about one name."""
    from benchmark.cli.commands import check_folders

    check_folders(nodes)
    library = open_library(*nodes)
    library.collector.raise_if_any()
    listing = LISTS.get(what)
    blocks = listing(library) if listing is not None else _named(library, what)
    library.collector.raise_if_any()
    if not blocks:
        raise UsageError(_unknown(library, what))
    show_blocks(blocks)


def _load(library: Library, name: str, kind: str) -> ParameterSet | None:
    item = library.load(name, FOLDERS[kind], Problem("", 0, name, ""))
    if item is not None and item.kind == "technology":
        check_physics(item, library.collector)
    return item


def _set(library: Library, name: str, value: str = "") -> list[Block]:
    """A technology or wires set, or one value of it; the problems of its file go to the collector."""
    blocks: list[Block] = []
    for kind in ("technology", "wires"):
        if name not in files_of(library, kind):
            continue
        item = _load(library, name, kind)
        if item is None or library.collector.problems:
            return []
        found = value_blocks(item, value, library.sources) if value else set_blocks(item)
        if value and not found:
            inputs = [entry.name for entry in model(item.model).inputs] if item.kind == "technology" else []
            known = [*item.values, *item.options, *inputs]
            hint = nearest(value, known) or f"evenload show {name} lists them"
            message = f"{name} has no value {value!r}; {hint}"
            raise UsageError(message)
        blocks += found
    return blocks


def _named(library: Library, what: str) -> list[Block]:
    blocks = _set(library, what)
    if not library.collector.problems:
        for describe in (_circuit, _model, _quantity, _requirement, _source, _evidence_class):
            blocks += describe(library, what)
    owner, dot, value = what.rpartition(".")
    if not blocks and dot and not library.collector.problems:
        blocks = _set(library, owner, value)
    return blocks


def _circuit(library: Library, name: str) -> list[Block]:
    if name in BUILT_IN:
        return _built_in(name)
    if files_of(library, "circuit").get(name) is None:
        return []
    path = library.find(name, "circuits")
    spec = None if path is None else read_circuit(path, library, library.collector)
    return [] if spec is None else _circuit_file(spec)


def _built_in(name: str) -> list[Block]:
    which = BUILT_IN[name]
    facts = [("title", which.title), ("one operation", which.operation)]
    if which.function:
        facts.append(("function", which.function))
    facts += [("stated", words) for words in choice_words(which)]
    needs = (
        ("needed", which.required),
        ("when asked for", which.optional),
        *(("one of these", group) for group in which.one_of),
        *(("at most one of these", group) for group in which.at_most_one_of),
    )
    rows = [
        (value, need, QUANTITIES[value].meaning, QUANTITIES[value].unit) for need, values in needs for value in values
    ]
    columns = ("scenario value", "need", "meaning", "unit")
    return [Facts(f"Built-in circuit {name}", facts), Table("", columns, rows)]


def _circuit_file(spec: CircuitSpec) -> list[Block]:
    facts = [("title", spec.title), ("one operation", spec.operation), ("file", spec.file)]
    rows = []
    for net in spec.nets:
        loads = ", ".join(f"{load.count:g} x {load.cell}.{load.input}" for load in net.loads) or "-"
        length = f"{net.wire_length:g} pitches" if net.length_unit == "gate_pitch" else f"{net.wire_length * 1e6:g} um"
        swing = "supply" if net.swing is None else f"{net.swing:g} V ({net.swing_reason})"
        rows.append(
            (
                net.name,
                net.driver,
                loads,
                f"{net.fixed_load * 1e15:g} fF",
                f"{length} on {net.layer}",
                swing,
                f"{net.rising_per_operation:g}",
                f"{net.count:g}",
                f"{net.on_critical_path:g}",
            )
        )
    columns = ("net", "driver", "loads", "fixed load", "wire", "swing", "rising", "count", "on path")
    return [Facts(f"Circuit {spec.id}", facts), Table("Nets", columns, rows)]


def _model(library: Library, name: str) -> list[Block]:
    if name not in MODEL_NAMES:
        return []
    device = model(name)
    facts = [
        ("title", device.title),
        ("solved for", ", ".join(device.calibrated_on) or "nothing"),
        ("knobs", ", ".join(("supply", "size", *device.knobs))),
    ]
    inputs = [
        (item.name, QUANTITIES[item.name].symbol, QUANTITIES[item.name].unit, input_need(item))
        for item in device.inputs
    ]
    blocks: list[Block] = [
        Facts(f"Device model {name}", facts),
        Table("Inputs", ("name", "symbol", "unit", "need"), inputs),
    ]
    options = [(item.name, ", ".join(item.allowed), item.default) for item in device.options]
    if options:
        blocks.append(Table("Options", ("name", "allowed words", "when the file is silent"), options))
    tables = [(table, "required" if needed else "optional") for table, needed in device.tables.items()]
    if tables:
        blocks.append(Table("Tables", ("name", "need"), tables))
    blocks += [Note(f"Reference: {text}") for text in device.references]
    return blocks


def _quantity(library: Library, name: str) -> list[Block]:
    item = QUANTITIES.get(name)
    if item is None:
        return []
    dimension = parse_unit(item.unit).dimension_text
    facts = [
        ("symbol", item.symbol),
        ("meaning", item.meaning),
        ("unit", "1: a plain number" if item.unit == "1" else f"{item.unit}, or any other of dimension {dimension}"),
        ("usual range", usual_range(item)),
        ("allowed", item.domain_text),
    ]
    users = [
        (f"model {which}", input_need(entry))
        for which in MODEL_NAMES
        for entry in model(which).inputs
        if entry.name == name
    ]
    users += [
        (f"circuit {which}", "needed" if name in built_in.required else "may be used")
        for which, built_in in BUILT_IN.items()
        if name in built_in.reads
    ]
    if name in {quantity.name for quantity in WIRE_QUANTITIES}:
        users.append(("wires sets", "required"))
    if name in {quantity.name for quantity in STUDY_QUANTITIES} and not users:
        users.append(("studies", "by timing, idle mode, overheads and requirements"))
    return [Facts(f"Value {name}", facts), Table("Used by", ("what", "need"), users)]


def _requirement(library: Library, name: str) -> list[Block]:
    if name not in REQUIREMENTS:
        return []
    unit, meaning = REQUIREMENTS[name]
    facts = [("demands", meaning), ("unit", unit)]
    if name == "endurance":
        facts.append(("keys", "life, kind"))
    else:
        facts.append(("keys", "limit, kind" + (", fan_in" if name in ("noise_margin", "voltage_gain") else "")))
    if name == "deadline":
        facts.append(("limit", 'a time, or "cycle" in a clocked study'))
    facts.append(("kind", "hard: bounds the search; report: judged at the optimum"))
    return [Facts(f"Requirement {name}", facts)]


def _source(library: Library, key: str) -> list[Block]:
    item = library.sources.get(key)
    if item is None:
        return []
    facts = [("citation", item.citation), ("kind", item.kind)]
    facts += [(label, text) for label, text in (("doi", item.doi), ("via", item.via), ("note", item.note)) if text]
    citing = [
        (name, kind)
        for kind in ("technology", "wires")
        for name, file in files_of(library, kind).items()
        if file is not None and _cites(file.data, key)
    ]
    return [Facts(f"Source {key}", facts), Table("Cited by", ("set", "kind"), citing or [("none of the sets", "")])]


def _cites(data: Any, key: str) -> bool:
    if isinstance(data, dict):
        return data.get("source") == key or any(_cites(item, key) for item in data.values())
    return isinstance(data, list) and any(_cites(item, key) for item in data)


def _evidence_class(library: Library, name: str) -> list[Block]:
    item = EVIDENCE.get(name)
    if item is None:
        return []
    facts = [("meaning", item.meaning), ("a decisive value", SUPPORT[item.support])]
    facts.append(("must state", ", ".join(item.must_state) or "nothing beyond evidence and source"))
    return [Facts(f"Evidence class {name}", facts)]


def _unknown(library: Library, what: str) -> str:
    known = [
        *LISTS,
        *files_of(library, "technology"),
        *files_of(library, "wires"),
        *files_of(library, "circuit"),
        *BUILT_IN,
        *MODEL_NAMES,
        *QUANTITIES,
        *REQUIREMENTS,
        *library.sources,
        *EVIDENCE,
    ]
    hint = nearest(what, known)
    lists = ", ".join(LISTS)
    return f"there is nothing named {what!r}; {hint + ' ' if hint else ''}lists are {lists}"
