"""One side at one node pair: from a study to something that can be evaluated at any supply (layer 6)."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Layer, Load, Net, Wires
from benchmark.circuits.library import build as build_built_in
from benchmark.circuits.rules import rule_by_name
from benchmark.circuits.sized import EDGES, Sized
from benchmark.devices import model
from benchmark.devices.model import DeviceModel, ModelInputs, Prepared
from benchmark.devices.record import SwitchPair
from benchmark.evaluate.batch import Batch, resolve
from benchmark.sets.circuit_file import CircuitSpec
from benchmark.sets.joints import Joint
from benchmark.sets.study import NodePair, Side, Study
from benchmark.sets.values import Value

__all__ = ["SideProblem", "build_side", "joints_by_owner", "keys_of", "values_by_key"]

Array = NDArray[np.float64]


@dataclass(frozen=True)
class SideProblem:
    """Everything needed to evaluate one side for every row of a batch.

    ``scenario`` etc. are arrays of shape (row or 1, 1, 1).
    """

    study: Study
    side: Side
    role: str  # "candidate" or "contender"
    node: str
    batch: Batch
    device: DeviceModel
    prepared: Prepared
    circuit: Circuit
    wires: Wires
    scenario: Mapping[str, Array]
    overhead: Mapping[str, Array]
    gating: Mapping[str, Array]
    declared_supply: Array
    mitigation: Mapping[str, Array] = field(default_factory=dict)

    @property
    def size_as(self) -> Literal["width", "copies"]:
        """What the size knob multiplies: the width of a switch, or the number of unit switches."""
        return "copies" if self.side.technology.options.get("size_scaling") == "copies" else "width"

    @property
    def circuit_depth(self) -> int:
        """Longest series stack of the circuit."""
        return max(1, *(net.driver.depth(edge) for net in self.circuit.nets for edge in EDGES))

    @property
    def stack_depth(self) -> int:
        """Longest series stack of the circuit and of the functional requirements."""
        return max(self.circuit_depth, *(requirement.fan_in for requirement in self.study.requirements.values()), 1)

    def switches(
        self,
        supply: Array,
        threshold_shift: float | Array,
        temperatures: tuple[float, ...] | None = None,
        depth: int | None = None,
    ) -> SwitchPair:
        """Switch records at supplies of shape (row or 1, supply), at all temperatures of the study unless given.

        ``threshold_shift`` [V]: of the device, back bias included; one number, or an array (row or 1, 1 or supply).
        ``depth``: longest series stack wanted; that of circuit and functional requirements unless given.
        """
        temperature = np.asarray(self.study.temperatures if temperatures is None else temperatures)[None, :, None]
        stack = np.asarray(self.stack_depth if depth is None else depth)
        knobs = {"threshold_shift": np.atleast_2d(threshold_shift)[:, None, :], "stack_depth": stack}
        return self.device.switch(self.prepared, np.atleast_2d(supply)[:, None, :], temperature, knobs)

    def device_shift(self, threshold_shift: float, back_bias: float | Array) -> float | Array:
        """Threshold shift of the device [V]: the frozen one, less body factor times back bias.

        Linear in the bias, the same for both polarities (common practice for back gates, no source). Without a back
        bias it is the frozen shift itself; a bias (row, supply) gives a shift of that shape.
        """
        if not np.any(back_bias):
            return threshold_shift
        return np.asarray(threshold_shift - self.mitigation["body_factor"][:, 0, :] * back_bias)

    def circuit_at(self, supply: Array, size: float, threshold_shift: float | Array) -> Circuit:
        """The circuit at supplies of shape (row or 1, supply): as built, or fitted to the technology there.

        A fitted circuit is one design for all temperatures, made at the highest.
        """
        fit = self.circuit.fit
        if fit is None:
            return self.circuit
        pair = self.switches(supply, threshold_shift, self.study.temperatures[-1:], self.circuit_depth)
        made = fit(Sized(pair, size, self.size_as), self.wires, rule_by_name(self.study.delay_rule))
        return dataclasses.replace(made, operation=self.circuit.operation)


def owner_of_overhead(side: Side, role: str) -> str:
    """Ledger owner of a side's overheads."""
    return "candidate" if role == "candidate" else f"contender {side.id}"


def values_by_key(study: Study, pair: NodePair) -> dict[str, Value]:
    """Every value the study uses at one node pair, by ledger key: owners in the study's order, names in order."""
    found: dict[str, Value] = {f"study.{name}": value for name, value in sorted(study.values.items())}
    if study.circuit_spec is not None:
        for layer, table in sorted(study.circuit_spec.layers.items()):
            found |= {f"circuit.{layer}.{name}": value for name, value in sorted(table.items())}
    found |= {f"{pair.wires.id}.{name}": value for name, value in sorted(pair.wires.at(pair.wires_node).items())}
    for side, role, node in _sides(study, pair):
        owner = owner_of_overhead(side, role)
        found |= {f"{side.technology.id}.{name}": value for name, value in sorted(side.technology.at(node).items())}
        found |= {f"{owner}.overhead.{name}": value for name, value in sorted(side.overhead.items())}
        found |= {f"{owner}.gating.{name}": value for name, value in sorted(side.gating.items())}
        found |= {f"{owner}.mitigation.{name}": value for name, value in sorted(side.mitigation.items())}
    return found


def joints_by_owner(study: Study, pair: NodePair) -> dict[str, tuple[Joint, ...]]:
    """Return owner of ledger keys -> values of it that are not independent."""
    found = {"study": study.joints, pair.wires.id: pair.wires.joints}
    return found | {side.technology.id: side.technology.joints for side, _, _ in _sides(study, pair)}


def _sides(study: Study, pair: NodePair) -> list[tuple[Side, str, str]]:
    listed = [(study.candidate, "candidate", pair.candidate)]
    listed += [(side, "contender", pair.reference[side.id]) for side in study.contenders if side.id in pair.reference]
    return listed


def keys_of(pair: NodePair, side: Side, role: str) -> Callable[[str], bool]:
    """Return a test telling whether a ledger key can influence this side."""
    owner = owner_of_overhead(side, role)
    prefixes = (
        "study.",
        "circuit.",
        f"{pair.wires.id}.",
        f"{side.technology.id}.",
        f"{owner}.overhead.",
        f"{owner}.gating.",
        f"{owner}.mitigation.",
    )
    return lambda key: key.startswith(prefixes)


def build_side(study: Study, side: Side, role: str, pair: NodePair, batch: Batch) -> SideProblem:
    """Prepare one side: resolve the batch, calibrate the device, build the circuit."""
    node = pair.candidate if role == "candidate" else pair.reference[side.id]
    technology = side.technology
    device = model(technology.model)
    values = resolve(technology.id, technology.at(node), batch)
    tables: dict[str, Any] = {name: table.table for name, table in technology.tables.items()}
    if technology.rows:
        tables["rows"] = technology.rows[node]
    prepared = device.prepare(ModelInputs(values, technology.options, tables))
    scenario = resolve("study", study.values, batch)
    wire_values = resolve(pair.wires.id, pair.wires.at(pair.wires_node), batch)
    wires = Wires(
        resistance_per_length=wire_values["wire_resistance_per_length"],
        capacitance_per_length=wire_values["wire_capacitance_per_length"],
        layout_capacitance_per_pin=wire_values["layout_capacitance_per_pin"],
    )
    owner = owner_of_overhead(side, role)
    declared = values.get("declared_supply", np.full((1, 1, 1), np.nan))
    return SideProblem(
        study,
        side,
        role,
        node,
        batch,
        device,
        prepared,
        build_circuit(study, scenario, batch, side),
        wires,
        scenario,
        resolve(f"{owner}.overhead", side.overhead, batch, study.values),
        resolve(f"{owner}.gating", side.gating, batch, study.values),
        declared,
        resolve(f"{owner}.mitigation", side.mitigation, batch, study.values),
    )


def build_circuit(study: Study, scenario: Mapping[str, Array], batch: Batch, side: Side | None = None) -> Circuit:
    """Build a side's circuit, or the one all sides share: a built-in one from scenario values, or a user's nets."""
    name, spec = (study.circuit, study.circuit_spec) if side is None else study.circuit_of(side)
    if spec is not None:
        return _from_spec(spec, batch)
    return dataclasses.replace(build_built_in(name, scenario), operation=study.operation)


def _from_spec(spec: CircuitSpec, batch: Batch) -> Circuit:
    layers = {}
    for name, table in spec.layers.items():
        values = resolve(f"circuit.{name}", table, batch)
        layers[name] = Layer(values["resistance_per_length"], values["capacitance_per_length"])
    nets = tuple(
        Net(
            name=net.name,
            driver=cell(net.driver),
            loads=tuple(Load(cell(load.cell), load.input, load.count) for load in net.loads),
            fixed_load=net.fixed_load,
            wire_length=net.wire_length,
            length_unit="gate_pitch" if net.length_unit == "gate_pitch" else "m",
            layer=net.layer,
            swing=net.swing,
            rising_per_operation=net.rising_per_operation,
            busiest_per_operation=net.busiest_per_operation,
            count=net.count,
            on_critical_path=net.on_critical_path,
        )
        for net in spec.nets
    )
    return Circuit(spec.id, spec.title, spec.operation, nets, layers)
