"""Anchors: what a set predicts beside what was published, fitted or not (layer 6)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Load, Net, Wires
from benchmark.circuits.operation import estimate
from benchmark.devices import model
from benchmark.devices.model import ModelInputs
from benchmark.devices.record import Switch, SwitchPair
from benchmark.evaluate.batch import Batch, resolve
from benchmark.sets.parameters import Anchor, ParameterSet

__all__ = ["AnchorResult", "anchor_results", "fan_out_4"]


@dataclass(frozen=True)
class AnchorResult:
    """Published and predicted value of one anchor (SI), with the relative difference."""

    technology: str
    node: str
    name: str
    published: float
    low: float
    high: float
    predicted: float
    difference: float
    unit: str
    supply: float
    fitted: bool
    source: str
    where: str
    conditions: str


def _pair(technology: ParameterSet, node: str, supply: float | None) -> tuple[SwitchPair, float]:
    device = model(technology.model)
    values = resolve(technology.id, technology.at(node), Batch.best_estimate())
    tables = {name: table.table for name, table in technology.tables.items()}
    if technology.rows:
        tables["rows"] = technology.rows[node]
    prepared = device.prepare(ModelInputs(values, technology.options, tables))
    volt = float(values["declared_supply"].ravel()[0]) if supply is None else supply
    temperature = values["reference_temperature"].reshape(1, 1, 1)
    knobs = {"threshold_shift": np.zeros((1, 1, 1))}
    return device.switch(prepared, np.full((1, 1, 1), volt), temperature, knobs), volt


def fan_out_4(pair: SwitchPair, rule: str = "chain") -> tuple[float, float]:
    """Return delay [s] and energy per cycle [J] of an inverter driving four alike: no wire, no layout parasitic."""
    inverter = cell("inverter")
    net = Net("stage", inverter, loads=(Load(inverter, "a", 4.0),), rising_per_operation=1.0, on_critical_path=1.0)
    circuit = Circuit(
        "fan-out-4", "Inverter with fan-out 4", "one full cycle", (net,), stage="inverter, fan-out 4, no wire"
    )
    metrics = estimate(circuit, pair, Wires(0.0, 0.0), rule)
    return float(metrics.path_delay.ravel()[0]), float(metrics.dynamic_energy.ravel()[0])


def _effective_current(switch: Switch, supply: float) -> float:
    """I_eff = [I(V, V/2) + I(V/2, V)] / 2 (Na et al., IEDM 2002)."""
    control = np.array([[[[supply, supply / 2]]]])
    path = np.array([[[[supply / 2, supply]]]])
    current: NDArray[np.float64] = switch.current(control, path)
    return float(np.mean(current.ravel()[-2:]))


def _predict(anchor_name: str, pair: SwitchPair, supply: float, width: float) -> float:
    switch = pair.up if anchor_name.endswith("_p") else pair.down
    kind = anchor_name.removesuffix("_p")
    if kind == "on_current":
        return float(switch.on_current.ravel()[0]) / width
    if kind == "off_current":
        return float(switch.off_current_path.ravel()[0]) / width
    if kind == "effective_current":
        return _effective_current(switch, supply) / width
    delay, energy = fan_out_4(pair)
    return delay if kind == "fan_out_4_delay" else energy


def anchor_results(technology: ParameterSet) -> list[AnchorResult]:
    """Evaluate every anchor of a set, and the calibration targets it was solved for."""
    results: list[AnchorResult] = []
    # an anchor is predicted even when it bears the name of a calibration target: the set did not solve for it
    listed: list[tuple[Anchor, bool]] = [(anchor, False) for anchor in technology.anchors]
    for node in technology.nodes:
        values = technology.at(node)
        for name in model(technology.model).calibrated_on:
            value = values.get(name)
            if value is not None:
                si = float(value.si[0])
                target = Anchor(
                    name, node, si, si, si, value.unit, None, value.source, value.where, value.conditions, ""
                )
                listed.append((target, True))
    for anchor, fitted in listed:
        pair, supply = _pair(technology, anchor.node, anchor.supply)
        width_value = technology.at(anchor.node).get("unit_width")
        width = float(width_value.si[0]) if width_value is not None else 1.0
        predicted = _predict(anchor.name, pair, supply, width)
        results.append(
            AnchorResult(
                technology.id,
                anchor.node,
                anchor.name,
                anchor.si,
                anchor.low,
                anchor.high,
                predicted,
                predicted / anchor.si - 1.0,
                anchor.unit,
                supply,
                fitted,
                anchor.source,
                anchor.where,
                anchor.conditions,
            )
        )
    return results
