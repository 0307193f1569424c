"""A circuit made of one technology: time, energy, leakage and area per operation (layer 5).

Entry point::

    estimate(circuit: Circuit, pair: SwitchPair, wires: Wires, rule: str | StageRule = "chain", *,
             size: Value = 1.0, size_as: "width" | "copies" = "width", sizing: "unit" | "equal-drive" = "unit",
             guard_delay: Value = 1.0, guard_leakage: Value = 1.0,
             internal_nodes: bool = True, short_circuit: bool = True) -> OperationMetrics

All arrays of the result have the shape S, the common shape of the records, the circuit's numbers, the wires and the
knobs. Energy per operation = sum over nets of count x rising transitions x energy per rising transition; leakage is
a power of its own (leakage x time is added by whoever knows the cycle time) and is never divided by activity.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from benchmark.circuits.cells import Sizing
from benchmark.circuits.circuit import Circuit, Value, Wires
from benchmark.circuits.motion import motion_charges
from benchmark.circuits.rules import StageRule, rule_by_name
from benchmark.circuits.sized import EDGES, SizeAs, Sized
from benchmark.circuits.stage import (
    DELAY_PARTS,
    ENERGY_PARTS,
    LEAKAGE_PARTS,
    StageDetail,
    StageSettings,
    short_circuit_currents,
    stage,
)
from benchmark.constants import BOLTZMANN
from benchmark.devices.record import Array, BoolArray, SwitchPair

__all__ = ["OperationMetrics", "estimate"]


@dataclass(frozen=True)
class OperationMetrics:
    """Result of ``estimate``; every array has the shape S.

    path_delay [s]
        Mean-edge delay of the critical path, guard-band included; ``path_delay_parts`` (names ``DELAY_PARTS``) add
        up to it. ``worst_edge_path_delay``: as if every stage made its slower edge.
    dynamic_energy [J]
        Per operation, without leakage; ``dynamic_energy_parts`` (``ENERGY_PARTS``) add up to it, and so does
        ``dynamic_energy_by_group`` (groups of the nets: logic, register, clock ...).
    leakage_power [W]
        Averaged over input states, guard-band included; ``leakage_power_parts`` (``LEAKAGE_PARTS``) add up to it.
    bias_power [W]
        Standing power of the switches' own bias.
    area [m^2], gate_pitch [m], cell_count [1], switch_count [1]
        Sum of the cell areas; square root of the mean cell area; number of driving cells; number of switches
        (times ``size`` when size means copies).
    switched_capacitance [F], input_capacitance [F]
        Sum over all nets of their capacitance; of the driven inputs alone (both energy-averaged).
    busiest_rising_per_operation, quietest_rising_per_operation [1]
        Largest and smallest number of rising transitions per operation over the nets.
    half_swing_over_noise [1]
        Smallest half swing over sqrt(kT/C) of all nets; infinite at T = 0.
    stages
        The detail of every net, per single net and without guard-bands, for a trace.
    unable
        Reason -> mask of the points where the number means nothing.
    """

    circuit: str
    operation: str
    supply: Array
    path_delay: Array
    path_delay_parts: Mapping[str, Array]
    worst_edge_path_delay: Array
    dynamic_energy: Array
    dynamic_energy_parts: Mapping[str, Array]
    dynamic_energy_by_group: Mapping[str, Array]
    leakage_power: Array
    leakage_power_parts: Mapping[str, Array]
    bias_power: Array
    area: Array
    gate_pitch: Array
    cell_count: Array
    switch_count: Array
    switched_capacitance: Array
    input_capacitance: Array
    busiest_rising_per_operation: Array
    quietest_rising_per_operation: Array
    half_swing_over_noise: Array
    stages: tuple[StageDetail, ...]
    unable: Mapping[str, BoolArray]


def estimate(
    circuit: Circuit,
    pair: SwitchPair,
    wires: Wires,
    rule: str | StageRule = "chain",
    *,
    size: Value = 1.0,
    size_as: SizeAs = "width",
    sizing: Sizing = "unit",
    guard_delay: Value = 1.0,
    guard_leakage: Value = 1.0,
    internal_nodes: bool = True,
    short_circuit: bool | SwitchPair = True,
) -> OperationMetrics:
    """Return what one operation of the circuit costs when it is made of this pair of switches.

    Parameters
    ----------
    circuit, pair, wires
        Nets, switch records (any broadcast shape) and the wire set shared by both sides of a study. A circuit that
        fits itself to a technology is fitted at every point of the arrays on its own.
    rule
        ``chain``, ``step``, or a function with the signature of ``rules.StageRule``.
    size, size_as, sizing, internal_nodes
        See ``sized.Sized``.
    guard_delay, guard_leakage [1]
        Multipliers of every delay part and of every leakage part.
    short_circuit
        False leaves the short-circuit energy out, as the hand equations do. A pair that broadcasts against ``pair``
        (the same switches at one of its temperatures) gives the currents behind it: who wants the energy at one
        temperature need not integrate them at all.
    """
    sized = Sized(pair, size, size_as, sizing, internal_nodes)
    stage_rule = rule_by_name(rule) if isinstance(rule, str) else rule
    if circuit.fit is not None:
        circuit = circuit.fit(sized, wires, stage_rule)
    cells = _total(net.count for net in circuit.nets)
    area = _total(net.count * net.copies * sized.area(net.driver) for net in circuit.nets)
    pitch = np.asarray(np.sqrt(area / cells))
    crossing = (pair if short_circuit else None) if isinstance(short_circuit, bool) else short_circuit
    settings = StageSettings(
        sized=sized,
        wires=wires,
        layers=circuit.layers,
        rule=stage_rule,
        gate_pitch=pitch,
        short_circuit=None if crossing is None else short_circuit_currents(crossing),
        motion={} if crossing is None else motion_charges(crossing),
    )
    stages = tuple(stage(net, settings) for net in circuit.nets)

    path = {
        name: _total(s.net.on_critical_path * s.delay_parts[name] * guard_delay for s in stages) for name in DELAY_PARTS
    }
    energy = {
        name: _total(s.net.count * s.net.rising_per_operation * s.energy_parts[name] for s in stages)
        for name in ENERGY_PARTS
    }
    groups = {
        group: _total(s.net.count * s.net.rising_per_operation * s.energy for s in stages if s.net.group == group)
        for group in dict.fromkeys(net.group for net in circuit.nets)
    }
    leakage = {
        name: _total(s.net.count * s.leakage_power_parts[name] * guard_leakage for s in stages)
        for name in LEAKAGE_PARTS
    }
    switches = _total(net.count * net.copies * net.driver.switch_count for net in circuit.nets)
    results: dict[str, Any] = {
        "supply": pair.supply,
        "path_delay": _total(path.values()),
        "path_delay_parts": path,
        "worst_edge_path_delay": _total(s.net.on_critical_path * s.worst_delay * guard_delay for s in stages),
        "dynamic_energy": _total(energy.values()),
        "dynamic_energy_parts": energy,
        "dynamic_energy_by_group": groups,
        "leakage_power": _total(leakage.values()),
        "leakage_power_parts": leakage,
        "bias_power": _total(s.net.count * s.bias_power for s in stages),
        "area": area,
        "gate_pitch": pitch,
        "cell_count": cells,
        "switch_count": switches * size if size_as == "copies" else switches,
        "switched_capacitance": _total(s.net.count * s.node_capacitance for s in stages),
        "input_capacitance": _total(s.net.count * s.input_capacitance for s in stages),
        "busiest_rising_per_operation": _extreme(np.maximum, [net.busiest for net in circuit.nets]),
        "quietest_rising_per_operation": _extreme(np.minimum, [net.rising_per_operation for net in circuit.nets]),
        "half_swing_over_noise": _extreme(np.minimum, [_noise_ratio(s, pair) for s in stages]),
        "unable": _unable(circuit, sized, stages),
    }
    shape = np.broadcast_shapes(*(array.shape for value in results.values() for array in _arrays(value)))
    return OperationMetrics(
        circuit=circuit.name,
        operation=circuit.operation,
        stages=stages,
        **{name: _spread(value, shape) for name, value in results.items()},
    )


def _total(values: Any) -> Array:
    total: Array = np.asarray(0.0)
    for value in values:
        total = total + value
    return np.asarray(total)


def _extreme(pick: Any, values: list[Any]) -> Array:
    found = np.asarray(values[0], dtype=np.float64)
    for value in values[1:]:
        found = pick(found, value)
    return np.asarray(found)


def _arrays(value: Any) -> list[Any]:
    return [np.asarray(x) for x in (value.values() if isinstance(value, Mapping) else [value])]


def _spread(value: Any, shape: tuple[int, ...]) -> Any:
    if isinstance(value, Mapping):
        return {name: np.broadcast_to(array, shape) for name, array in value.items()}
    return np.broadcast_to(value, shape)


def _noise_ratio(detail: StageDetail, pair: SwitchPair) -> Array:
    """Return half the swing over sqrt(kT/C) [1] (thermal noise of a capacitor; Kish, IEE Proc. 151 (2004) 190)."""
    with np.errstate(divide="ignore"):
        return np.asarray(
            0.5 * detail.swing * np.sqrt(detail.node_capacitance / (BOLTZMANN * np.asarray(pair.temperature)))
        )


def _unable(circuit: Circuit, sized: Sized, stages: tuple[StageDetail, ...]) -> dict[str, BoolArray]:
    """Return reason -> mask of the points where the estimate means nothing."""
    pair = sized.pair
    shape = np.broadcast_shapes(np.shape(pair.supply), np.shape(pair.down.resistance), np.shape(pair.up.resistance))
    everywhere, nowhere = np.full(shape, True), np.full(shape, False)
    found: dict[str, BoolArray] = {}

    def add(reason: str, mask: Any) -> None:
        found[reason] = np.asarray(found.get(reason, nowhere) | mask)

    for edge in EDGES:
        switch = sized.switch(edge)
        level = np.asarray(switch.switching_level)
        closes = np.isfinite(switch.resistance) & (level < 1.0) & (np.asarray(pair.supply) > 0.0)  # nan: False
        add("does not switch at this supply", ~closes)
        if switch.partner == "none":
            add("no complementary partner: the cells need both polarities", everywhere)
        if switch.stage_only and (other := np.asarray(circuit.stage) != switch.stage_only).any():
            add(f"known only at one stage ({switch.stage_only}); this circuit has other ones", other)
        deepest = max(net.driver.depth(edge) for net in circuit.nets)
        if deepest > switch.stack_on.shape[-1]:
            add(f"{deepest} switches in series are more than the technology states", everywhere)
        for reason, mask in switch.outside.items():
            add(reason, mask)
    for detail in stages:
        for reason, mask in detail.unable.items():
            add(reason, mask)
    return {reason: mask for reason, mask in found.items() if mask.any()}
