"""Circuits a user writes, as plain numbers in SI (layer 2); the evaluator turns them into nets."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from benchmark.catalogue import QUANTITIES
from benchmark.errors import nearest
from benchmark.sets.files import TomlFile, read_toml
from benchmark.sets.parameters import check_formulas
from benchmark.sets.problems import Collector
from benchmark.sets.schema import DefaultsTable, Measure, validate
from benchmark.sets.study_schema import CircuitFile, NetTable
from benchmark.sets.values import Place, Value, convert_measure, convert_value

if TYPE_CHECKING:
    from benchmark.sets.library import Library

__all__ = ["CELL", "CircuitSpec", "LoadSpec", "NetSpec", "cell_inputs", "read_circuit"]

#: cells beside the inverter, with the number of inputs
CELL = re.compile(r"(?:nand|nor)([2-8])|(?:aoi|oai)([1-4]{2,4})")
_CELLS = "inverter, nand2 to nand8, nor2 to nor8, aoi or oai with digits such as aoi21, at most 8 inputs"


def cell_inputs(cell: str) -> tuple[str, ...]:
    """Return the input names of a cell of the library; none when there is no such cell."""
    if cell == "inverter":
        return ("a",)
    found = CELL.fullmatch(cell)
    count = 0 if found is None else int(found[1]) if found[1] else sum(int(digit) for digit in found[2])
    return tuple("abcdefgh"[:count]) if count <= 8 else ()


@dataclass(frozen=True)
class LoadSpec:
    """Driven inputs."""

    cell: str
    input: str
    count: float


@dataclass(frozen=True)
class NetSpec:
    """One net in SI; ``length_unit`` is m or gate_pitch."""

    name: str
    driver: str
    loads: tuple[LoadSpec, ...]
    fixed_load: float
    wire_length: float
    length_unit: str
    layer: str
    swing: float | None
    swing_reason: str
    rising_per_operation: float
    busiest_per_operation: float
    count: float
    on_critical_path: float


@dataclass(frozen=True)
class CircuitSpec:
    """A circuit file, checked."""

    id: str
    title: str
    operation: str
    nets: tuple[NetSpec, ...]
    layers: Mapping[str, Mapping[str, Value]]
    file: str
    sha256: str
    text: str
    function: str = ""


def read_circuit(path: Path, library: Library, collector: Collector) -> CircuitSpec | None:
    """Read one circuit file; None after recording problems."""
    before = len(collector.problems)
    file = read_toml(path, collector, library.shown(path))
    if file is None:
        return None
    parsed = validate(CircuitFile, file, collector)
    if parsed is None:
        return None
    if parsed.id != path.stem:
        collector.add(file.problem("id", "differs from the file name", repr(parsed.id), repr(path.stem)))
    sources = frozenset(library.sources)
    layers: dict[str, dict[str, Value]] = {}
    for name, table in parsed.layer.items():
        found = {}
        for key, quantity in (
            ("resistance_per_length", "wire_resistance_per_length"),
            ("capacitance_per_length", "wire_capacitance_per_length"),
        ):
            place = Place(file, f"layer.{name}.{key}", parsed.default, sources)
            value = convert_value(QUANTITIES[quantity], getattr(table, key), [""], place, collector)
            if value is not None:
                found[key] = value
        check_formulas(found, file, {key: getattr(table, key) for key in found}, collector, f"layer.{name}")
        layers[name] = found
    nets = tuple(_net(net, position, file, layers, collector) for position, net in enumerate(parsed.net))
    if not any(net.on_critical_path > 0 for net in nets):
        collector.add(
            file.problem("net", "no net is on the critical path", "", "on_critical_path above 0 on at least one")
        )
    names = [net.name for net in nets]
    for repeated in sorted({name for name in names if names.count(name) > 1}):
        collector.add(file.problem("net", "two nets have the same name", repr(repeated)))
    used = {net.layer for net in nets}
    for name in layers:
        if name not in used:
            collector.add(file.problem(f"layer.{name}", "is not used by any net"))
    if len(collector.problems) > before:
        return None
    return CircuitSpec(
        parsed.id, parsed.title, parsed.operation, nets, layers, file.name, file.sha256, file.text, parsed.function
    )


def _net(net: NetTable, position: int, file: TomlFile, layers: Mapping[str, object], collector: Collector) -> NetSpec:
    dotted = f"net.{position}"

    def refuse(key: str, what: str, found: str = "", allowed: str = "", hint: str = "") -> None:
        collector.add(file.problem(f"{dotted}.{key}", what, found, allowed, hint))

    def place(key: str) -> Place:
        return Place(file, f"{dotted}.{key}", DefaultsTable(), frozenset())

    if not cell_inputs(net.driver):
        refuse("driver", "is not a known cell", repr(net.driver), _CELLS)
    loads = []
    for load in net.loads:
        inputs = cell_inputs(load.cell)
        if not inputs:
            refuse("loads", "is not a known cell", repr(load.cell), _CELLS)
        elif load.input not in inputs:
            refuse("loads", f"is not an input of {load.cell}", repr(load.input), ", ".join(inputs))
        if load.count < 0:
            refuse("loads", "has a negative count", str(load.count))
        loads.append(LoadSpec(load.cell, load.input, float(load.count)))
    fixed = 0.0
    if net.fixed_load is not None:
        fixed = convert_measure(net.fixed_load, "F", 0.0, place("fixed_load"), collector) or 0.0
    length, unit, layer = 0.0, "m", "local"
    if net.wire is not None:
        layer = net.wire.layer or "local"
        if net.wire.length_unit == "gate-pitch":
            length, unit = float(net.wire.length), "gate_pitch"
        else:
            measure = Measure(value=net.wire.length, unit=net.wire.length_unit)
            length = convert_measure(measure, "m", 0.0, place("wire"), collector, "length", "length_unit") or 0.0
        if length < 0.0:
            refuse("wire", "has a negative length", str(net.wire.length))
        if layer != "local" and layer not in layers:
            refuse(
                "wire",
                "names a layer the circuit does not state",
                repr(layer),
                ", ".join(["local", *layers]),
                nearest(layer, ["local", *layers]),
            )
    swing = None
    if net.swing is not None:
        swing = convert_measure(
            Measure(value=net.swing.value, unit=net.swing.unit), "V", 1e-6, place("swing"), collector
        )
    if net.count <= 0:
        refuse("count", "must be above 0", str(net.count))
    for key in ("rising_per_operation", "busiest_per_operation", "on_critical_path"):
        number = getattr(net, key)
        if number is not None and number < 0:
            refuse(key, "is negative", str(number), "0 or above")
    busiest = net.busiest_per_operation if net.busiest_per_operation is not None else net.rising_per_operation
    return NetSpec(
        net.name,
        net.driver,
        tuple(loads),
        fixed,
        length,
        unit,
        layer,
        swing,
        net.swing.reason if net.swing else "",
        float(net.rising_per_operation),
        float(busiest),
        float(net.count),
        float(net.on_critical_path),
    )
