"""Model ``stage-table``: a technology known only by stage results against supply (layer 4).

Rows (table ``rows``, SI): supply, temperature, delay, energy_per_cycle, leakage_power of one stage (an inverter and the
load that the option ``stage`` names), optional drive_resistance, input_capacitance and area. The energy is what a full
cycle draws, leakage apart. Input capacitance and area belong to the inverter, so a switch has half of each.

Reading
    At each temperature every column is interpolated monotonically in log(value) along the supply, exact at the rows;
    between temperatures log(value) is straight in 1/T. Nothing is extrapolated: one row means that supply only, one
    temperature that temperature only.

Without drive resistance and input capacitance
    The switch is usable at the stated stage only (``stage_only``). Its terminals carry the whole node: C = E / V^2,
    R = t / (ln 2 C), input capacitance 0.
With both
    It works under any load. With fan-out n of the stated stage, the output's own capacitance is what is left:
    t / (ln 2 R) - n C_in for delay, E / V^2 - n C_in for energy.

The current law is not known. It is taken as ohmic with R at full control, V^2 / P_leak at zero control (P_leak = 0:
no current) and R(V/2) = 2 R: gain and noise margin follow from that assumption, not from the rows.

References: definitions only (50 % delay ln 2 R C, energy per cycle C V^2).
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Final

import numpy as np

from benchmark.devices.links.resistive import SUPPLY_LINK
from benchmark.devices.model import DeviceModel, Finding, ModelInputs, Option, Prepared
from benchmark.devices.ohmic_law import OhmicLaw
from benchmark.devices.record import Array, BoolArray, Switch, SwitchPair
from benchmark.devices.standing import (
    STANDING_INPUTS,
    array,
    beyond,
    mirrored,
    option,
    stack_counts,
    standing_fields,
    supply_limits,
    values_of,
)
from benchmark.measured import MeasuredTable
from benchmark.physics.interpolation import Curve, conflicting_points, curve, inverse_temperature_weights

__all__ = ["MODEL"]

LN2: Final = math.log(2.0)
#: stage text -> its fan-out; the text is the one by which circuits call the stage
STAGES: Final = {f"inverter, fan-out {n}, no wire": float(n) for n in range(1, 9)}
ALWAYS: Final = ("delay", "energy_per_cycle", "leakage_power")
LOADED: Final = ("drive_resistance", "input_capacitance")
#: a self capacitance this much below zero (of the node) counts as zero: rounding of published rows, not a load
SELF_SLACK: Final = 1.0e-9


class _Rows:
    """The interpolants of every column; answers nan outside the rows."""

    def __init__(self, table: MeasuredTable) -> None:
        columns = table.columns
        self.temperatures = np.unique(columns["temperature"])
        self.loaded = bool(np.isfinite(columns["drive_resistance"]).all())
        self.leaks = bool(np.any(columns["leakage_power"] > 0.0))
        names = [name for name in ALWAYS if self.leaks or name != "leakage_power"]
        names += list(LOADED) if self.loaded else []
        self._curves: dict[str, list[Curve]] = {}
        for name in names:
            at = [columns["temperature"] == kelvin for kelvin in self.temperatures]
            self._curves[name] = [curve(columns["supply"][rows], columns[name][rows], "log") for rows in at]

    def at(self, name: str, supply: Array, temperature: Array) -> Array:
        """Return one column at supplies [V] and temperatures [K]."""
        weights, outside = inverse_temperature_weights(temperature, self.temperatures)
        single = (weights == 1.0).any(axis=0)
        exact, logarithm = array(0.0), array(0.0)
        for weight, item in zip(weights, self._curves[name], strict=True):
            value = item(supply)
            exact = exact + np.where(weight == 1.0, value, 0.0)
            logarithm = logarithm + np.where(weight > 0.0, weight * np.log(value), 0.0)
        return np.where(outside, np.nan, np.where(single, exact, np.exp(logarithm)))

    def outside(self, supply: Array, temperature: Array) -> dict[str, BoolArray]:
        """Return by reason where the rows do not reach."""
        weights, beyond_temperature = inverse_temperature_weights(temperature, self.temperatures)
        beyond_supply: BoolArray = np.asarray(False)
        for weight, item in zip(weights, self._curves["delay"], strict=True):
            beyond_supply = beyond_supply | ((weight > 0.0) & item.outside(supply))
        low = min(item.low for item in self._curves["delay"])
        high = max(item.high for item in self._curves["delay"])
        first, last = self.temperatures[0] - 273.15, self.temperatures[-1] - 273.15
        volts = f"at {low:g} V only" if low == high else f"{low:g} to {high:g} V"
        kelvin = f"at {first:g} degC only" if first == last else f"{first:g} to {last:g} degC"
        return {
            f"beyond the stated rows (known {volts})": beyond_supply & ~beyond_temperature,
            f"beyond the stated rows (known {kelvin})": beyond_temperature,
        }


def _prepare(inputs: ModelInputs) -> Prepared:
    table = inputs.tables["rows"]
    return {
        "values": values_of(MODEL, inputs),
        "stage": option(MODEL, inputs, "stage"),
        "rows": _Rows(table),
        "area": array(0.5 * table.columns["area"][0]),
    }


def _switch(prepared: Prepared, supply: Array, temperature: Array, knobs: Mapping[str, Array]) -> SwitchPair:
    values: Mapping[str, Array] = prepared["values"]
    rows: _Rows = prepared["rows"]
    v, kelvin = array(supply), array(temperature)
    outside = rows.outside(v, kelvin)
    delay, per_cycle = rows.at("delay", v, kelvin), rows.at("energy_per_cycle", v, kelvin)
    energy_node = per_cycle / v**2
    if rows.loaded:
        resistance, inputs_node = rows.at("drive_resistance", v, kelvin), rows.at("input_capacitance", v, kelvin)
        load = STAGES[prepared["stage"]] * inputs_node
        own, own_delay = energy_node - load, delay / (LN2 * resistance) - load
        short = (own < -SELF_SLACK * energy_node) | (own_delay < -SELF_SLACK * energy_node)
        outside["own capacitance would be negative between the stated rows"] = short
        own, own_delay = (np.where(np.abs(c) <= SELF_SLACK * energy_node, 0.0, c) for c in (own, own_delay))
    else:
        inputs_node = array(0.0)
        own = own_delay = energy_node
        resistance = delay / (LN2 * energy_node)
    leakage = rows.at("leakage_power", v, kelvin) if rows.leaks else None
    off_current = array(0.0) if leakage is None else leakage / v
    level = array(0.5)
    count = stack_counts(values)
    down = Switch(
        technology=MODEL.name,
        polarity="down",
        partner="mirrored",
        resistance_kind="effective",
        stack_time="simultaneous",
        input_scales_with_size=True,
        resistance=resistance,
        switching_level=level,
        current=OhmicLaw(v, resistance, None if leakage is None else v / off_current, level),
        on_current=v / resistance,
        off_current_path=off_current,
        off_current_input_high=array(0.0),
        off_current_input_low=array(0.0),
        off_current_body=array(0.0),
        stack_on=count,
        stack_off=1.0 / count,
        input_charge=0.5 * inputs_node * v,
        input_capacitance_delay=0.5 * inputs_node,
        terminal_capacitance=0.5 * own,
        terminal_capacitance_delay=0.5 * own_delay,
        extra_energy=array(0.0),
        closing_time=array(0.0),
        opening_time=array(0.0),
        closing_voltage=0.5 * v,
        opening_voltage=0.5 * v,
        limits=supply_limits(values, v),
        outside=beyond(outside),
        stage_only="" if rows.loaded else prepared["stage"],
        **{**standing_fields(values), "area": prepared["area"]},
    )
    return mirrored(down, v, kelvin)


def _refuse(name: str, what: str, found: str = "", allowed: str = "", hint: str = "") -> Finding:
    return Finding("refuse", name, what, found, allowed, hint)


def _check(inputs: ModelInputs) -> list[Finding]:
    table = inputs.tables["rows"]
    found = _check_columns(table)
    if found:
        return found
    columns = table.columns
    for kelvin in np.unique(columns["temperature"]):
        at = columns["temperature"] == kelvin
        for name in (*ALWAYS, *LOADED, "area"):
            if conflicting_points(columns["supply"][at], np.nan_to_num(columns[name][at])).size:
                found.append(_refuse("row", f"states {name} twice at one supply and temperature, differently"))
        order = np.argsort(columns["supply"][at])
        if bool(np.any(np.diff(columns["delay"][at][order]) > 0.0)):
            found.append(Finding("warn", "row", "the delay rises with the supply somewhere"))
    declared = values_of(MODEL, inputs)["declared_supply"]
    if bool(np.any((declared < columns["supply"].min()) | (declared > columns["supply"].max()))):
        found.append(_refuse("value.declared_supply", "lies outside the stated rows"))
    found += _check_self(columns, STAGES[option(MODEL, inputs, "stage")])
    found.append(Finding("note", "row", "current law not known: gain and noise margin follow from an ohmic assumption"))
    return found


def _check_columns(table: MeasuredTable) -> list[Finding]:
    columns = table.columns
    found = [
        _refuse("row", f"has a {name} at or below 0", allowed="above 0")
        for name in ("supply", "temperature", "delay", "energy_per_cycle")
        if bool(np.any(~(columns[name] > 0.0)))
    ]
    leakage = columns["leakage_power"]
    if bool(np.any(~(leakage >= 0.0))) or (bool(np.any(leakage > 0.0)) and bool(np.any(leakage == 0.0))):
        found.append(
            _refuse(
                "row",
                "has a leakage_power that is negative or 0 in some rows only",
                allowed="above 0 in all rows, or 0 in all",
            )
        )
    stated = [np.isfinite(columns[name]) for name in LOADED]
    if not (all(bool(s.all()) for s in stated) or not any(bool(s.any()) for s in stated)):
        found.append(
            _refuse(
                "row",
                "states drive_resistance or input_capacitance in part",
                allowed="both in every row, or neither in any",
            )
        )
    elif bool(stated[0].all()) and bool(np.any((columns[LOADED[0]] <= 0.0) | (columns[LOADED[1]] <= 0.0))):
        found.append(_refuse("row", "has a drive_resistance or input_capacitance at or below 0", allowed="above 0"))
    if np.unique(np.nan_to_num(columns["area"])).size > 1:
        found.append(_refuse("row", "states different areas at one node", allowed="the same area in every row"))
    return found


def _check_self(columns: Mapping[str, Array], fan_out: float) -> list[Finding]:
    supply, delay = columns["supply"], columns["delay"]
    node = columns["energy_per_cycle"] / supply**2
    found: list[Finding] = []
    resistance = delay / (LN2 * node)
    if bool(np.isfinite(columns["drive_resistance"]).all()):
        resistance = columns["drive_resistance"]
        load = fan_out * columns["input_capacitance"]
        for what, total in (
            ("delay / (ln 2 drive_resistance)", delay / (LN2 * resistance)),
            ("energy_per_cycle / supply^2", node),
        ):
            worst = int(np.argmin(total - load))
            if total[worst] < load[worst] * (1.0 - SELF_SLACK):
                found.append(
                    _refuse(
                        "row",
                        f"leaves a negative own capacitance: {what} is below the stated load",
                        f"{total[worst] * 1e15:.4g} fF",
                        f"at least {fan_out:g} x {columns['input_capacitance'][worst] * 1e15:.4g} fF",
                    )
                )
    if bool(np.any(columns["leakage_power"] * 2.0 * resistance >= supply**2)):
        found.append(_refuse("row", "leaks more than half of what the closed switch carries"))
    return found


MODEL = DeviceModel(
    name="stage-table",
    title="A technology known by the delay, energy and leakage of one stage against supply",
    inputs=tuple(item for item in STANDING_INPUTS if item.name != "footprint"),
    options=(Option("stage", tuple(STAGES), "inverter, fan-out 4, no wire"),),
    prepare=_prepare,
    switch=_switch,
    check=_check,
    links=(SUPPLY_LINK,),
    tables={"rows": True},
    references=(
        "ln 2 R C = delay, C V^2 = energy per cycle (definitions); own capacitance = node minus fan-out times input",
        "log(value) monotone along the supply, exact at the rows; straight in 1/T; nothing outside the rows",
        "current law assumed ohmic with R(V/2) = 2 R: gain and noise margin are not in the rows",
    ),
)
