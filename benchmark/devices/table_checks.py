"""Reasons why measured curves, or the values beside them, cannot be used by the ``table`` model (layer 4)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Final

import numpy as np

from benchmark.devices.model import DeviceModel, Finding, ModelInputs
from benchmark.devices.record import Array, BoolArray
from benchmark.devices.standing import option, values_of
from benchmark.devices.table_inputs import PER_WIDTH, SWEEPS, sweep_rows
from benchmark.measured import MeasuredTable
from benchmark.physics.interpolation import conflicting_points, outside

__all__ = ["check"]

#: values equal to this relative difference are a plateau
PLATEAU: Final = 1.0e-3


def check(model: DeviceModel, inputs: ModelInputs) -> list[Finding]:
    """Return every reason why the curves or the values beside them cannot be used."""
    values = values_of(model, inputs)
    table = inputs.tables["current"]
    charge = inputs.tables.get("charge")
    found = _check_reading("current", table, "log", "monotone")
    if charge is not None:
        found += _check_reading("charge", charge, "linear", "charge")
    if found:
        return found
    found = _check_current(table)
    found += _check_sweeps(table, option(model, inputs, "branch"))
    found += _check_values(inputs, values)
    if charge is not None:
        found += _check_charge(charge)
    return found


def _refuse(name: str, what: str, found: str = "", allowed: str = "", hint: str = "") -> Finding:
    return Finding("refuse", name, what, found, allowed, hint)


def _check_reading(name: str, table: MeasuredTable, scale: str, method: str) -> list[Finding]:
    """The model reads curves in one way only; a description that says another one would have no effect."""
    said = {"along": table.along, "scale": table.scale, "method": table.method}
    read = {"along": "control_voltage", "scale": scale, "method": method}
    return [
        _refuse(f"table.{name}", f"is not read that way: {key} of its interpolation", repr(said[key]), repr(read[key]))
        for key in read
        if said[key] != read[key]
    ]


def _curves(table: MeasuredTable) -> dict[str, BoolArray]:
    """Return the rows of every single curve: one sweep, one temperature, one path voltage."""
    curves: dict[str, BoolArray] = {}
    for sweep, rows in sweep_rows(table).items():
        axes = [name for name in ("temperature", "path_voltage") if name in table.columns]
        points = np.stack([table.columns[name] for name in axes], axis=-1) if axes else np.zeros((rows.size, 1))
        for point in np.unique(points[rows], axis=0):
            place = ", ".join(f"{name} {value:g}" for name, value in zip(axes, point, strict=False))
            curves[f"{sweep} sweep, {place}" if place else f"{sweep} sweep"] = rows & (points == point).all(axis=-1)
    return curves


def _check_current(table: MeasuredTable) -> list[Finding]:
    found: list[Finding] = []
    if table.value not in ("path_current", "path_current_per_width"):
        return [
            _refuse("table.current", "is not a table of current", table.value, "path_current, path_current_per_width")
        ]
    control, raw = table.columns["control_voltage"], table.columns[table.value]
    floor = table.floor.get(table.value, 0.0)
    if floor <= 0.0 and bool(np.any(raw <= 0.0)):
        found.append(
            _refuse(
                "table.current",
                "has currents at or below 0",
                allowed="above 0, or an instrument floor",
                hint='p-type signs: say sign = "negative" for the column; noise: state the floor',
            )
        )
        return found
    if "path_voltage" in table.columns and bool(np.any(table.columns["path_voltage"] <= 0.0)):
        found.append(
            _refuse(
                "table.current",
                "has path voltages at or below 0",
                allowed="above 0",
                hint="leave out the rows at 0 V: the current there is known to be 0",
            )
        )
        return found
    at_floor = int(np.count_nonzero(raw <= floor))
    if at_floor:
        found.append(
            Finding("note", "table.current", f"{at_floor} rows at or below the instrument floor: upper bounds")
        )
    current = np.maximum(raw, floor) if floor > 0.0 else raw
    for place, rows in _curves(table).items():
        found += _check_curve(place, control[rows], current[rows])
    found += _check_grid(table)
    return found


def _check_curve(place: str, control: Array, current: Array) -> list[Finding]:
    name = "table.current"
    conflicts = conflicting_points(control, current)
    if conflicts.size:
        volts = ", ".join(f"{value:g} V" for value in conflicts)
        return [_refuse(name, "has two different currents at the same control voltage", f"{place}: {volts}")]
    xs, first = np.unique(control, return_index=True)
    ys = current[first]
    found: list[Finding] = []
    if xs.size < 2:
        found.append(_refuse(name, "has fewer than 2 points on a curve", place, "2 or more"))
    if bool(outside(0.0, float(xs[0]), float(xs[-1]))):
        found.append(
            _refuse(
                name,
                "does not reach zero control voltage",
                f"{place}: starts at {xs[0]:g} V",
                "curves that cover 0 V: the open state is never extrapolated",
            )
        )
    if bool(np.any(np.diff(ys) < 0.0)):
        found.append(Finding("warn", name, "the current falls somewhere with rising control voltage", place))
    if xs.size > 3 and bool(np.all(np.abs(ys[-3:] / ys[-1] - 1.0) < PLATEAU)) and ys[-1] > ys[0]:
        found.append(
            Finding(
                "warn",
                name,
                "ends in a flat top: instrument compliance?",
                place,
                hint="leave out the points that the instrument limited",
            )
        )
    return found


def _check_grid(table: MeasuredTable) -> list[Finding]:
    """Every sweep and temperature needs the same path voltages, every sweep the same temperatures."""
    paths = table.columns.get("path_voltage")
    temperatures = table.columns.get("temperature")
    seen = set()
    for rows in sweep_rows(table).values():
        steps = np.unique(temperatures[rows]) if temperatures is not None else np.array([0.0])
        for step in steps:
            at = rows & (temperatures == step) if temperatures is not None else rows
            seen.add((tuple(steps), tuple(np.unique(paths[at])) if paths is not None else ()))
    if len(seen) > 1:
        what = "has different temperatures or path voltages in its sweeps"
        return [_refuse("table.current", what, allowed="the same path voltages at every temperature of every sweep")]
    return []


def _check_sweeps(table: MeasuredTable, branch: str) -> list[Finding]:
    labels = set(table.labels.get("sweep", ()))
    if not labels <= set(SWEEPS):
        return [_refuse("table.current", "has an unknown sweep", ", ".join(sorted(labels)), ", ".join(SWEEPS))]
    if branch in SWEEPS and branch not in labels:
        return [
            _refuse(
                "option.branch",
                "names a sweep that the table does not have",
                branch,
                'a table with it, or "pessimistic"',
            )
        ]
    if len(labels) < len(SWEEPS):
        return [Finding("note", "table.current", "one sweep direction only: hysteresis is unknown and counts as none")]
    return []


def _check_values(inputs: ModelInputs, values: Mapping[str, Array]) -> list[Finding]:
    found: list[Finding] = []
    table, charge = inputs.tables["current"], inputs.tables.get("charge")
    paths = table.columns.get("path_voltage")
    several = paths is not None and np.unique(paths).size > 1
    if several and "saturation_voltage" in values:
        found.append(_refuse("value.saturation_voltage", "has no effect: the table has several path voltages"))
    if not several and "saturation_voltage" not in values:
        found.append(_refuse("value.saturation_voltage", "is missing: the table has one path voltage only"))
    for name, column in (("declared_supply", "path_voltage"), ("reference_temperature", "temperature")):
        if column not in table.columns and np.unique(values[name]).size > 1:
            found.append(_refuse(f"value.{name}", f"has a spread, but stands for the missing column {column}"))
    if len({"terminal_capacitance", "terminal_capacitance_per_width"} & set(values)) != 1:
        found.append(
            _refuse(
                "value.terminal_capacitance_per_width",
                "needs exactly one statement",
                allowed="terminal_capacitance or terminal_capacitance_per_width",
            )
        )
    ways = {"input_capacitance", "gate_capacitance_total"} & set(values)
    if len(ways) + (charge is not None) != 1:
        found.append(
            _refuse(
                "table.charge",
                "needs exactly one statement of the input capacitance",
                allowed="table charge, input_capacitance or gate_capacitance_total",
            )
        )
    names = {"gate_capacitance_total", "terminal_capacitance_per_width"} & set(values)
    scaled = bool(names) or any(t is not None and t.value.endswith(PER_WIDTH) for t in (table, charge))
    if scaled and "unit_width" not in values:
        found.append(_refuse("value.unit_width", "is missing: something is stated per width"))
    if not scaled and "unit_width" in values:
        found.append(_refuse("value.unit_width", "has no effect: nothing is stated per width"))
    if "drain_capacitance_share" not in values:
        found.append(
            Finding(
                "warn",
                "value.drain_capacitance_share",
                "not stated: no coupling between input and output is counted, which favours this switch",
                hint="state 0 if the input does not couple to the conducting path",
            )
        )
    return found


def _check_charge(table: MeasuredTable) -> list[Finding]:
    name = "table.charge"
    if table.value not in ("input_capacitance", "input_capacitance_per_width"):
        return [
            _refuse(
                name, "is not a table of capacitance", table.value, "input_capacitance, input_capacitance_per_width"
            )
        ]
    if table.labels:
        return [
            _refuse(
                name,
                "has label columns",
                ", ".join(table.labels),
                "one curve per temperature",
                "state a hysteresis loss as extra_energy_per_cycle",
            )
        ]
    voltage, capacitance = table.columns["control_voltage"], table.columns[table.value]
    temperature = table.columns.get("temperature", np.zeros(voltage.size))
    found: list[Finding] = []
    for step in np.unique(temperature):
        at = temperature == step
        if conflicting_points(voltage[at], capacitance[at]).size:
            found.append(_refuse(name, "has two different capacitances at the same control voltage"))
        if np.unique(voltage[at]).size < 2:
            found.append(_refuse(name, "has fewer than 2 points on a curve", allowed="2 or more"))
        if bool(outside(0.0, float(voltage[at].min()), float(voltage[at].max()))):
            found.append(_refuse(name, "does not reach zero control voltage", f"starts at {voltage[at].min():g} V"))
        if bool(np.any(capacitance[at] <= 0.0)):
            found.append(_refuse(name, "has capacitances at or below 0", allowed="above 0"))
    return found
