"""Model ``table``: a switch known by its measured curves only (layer 4).

Tables (SI; ``current`` needed; columns may be per width or for the unit switch)
    current: control_voltage, path_current_per_width or path_current; optional path_voltage, temperature, and the label
    sweep (forward = rising, backward = falling control voltage).
    charge: control_voltage, input_capacitance_per_width or input_capacitance; optional temperature. Without it
    ``gate_capacitance_total`` (per width) or ``input_capacitance`` is taken as constant.

Reading (``benchmark.physics.measured_current``, ``benchmark.physics.interpolation``)
    log I monotone along the control voltage, log(I/V_path) across several path voltages, log I straight in 1/T; charge
    Q(V) = integral of C dV, monotone along V, straight in T. Nothing is extrapolated: supplies and temperatures
    beyond the data are outside, by reason; one temperature in the table means that temperature only. A table without
    path_voltage column was measured at the declared supply, one without temperature column at the reference
    temperature.
    With one path voltage the current falls towards 0 across the path as 1 - exp(-V/V_sat), and R is the path
    resistance V / I(V, V) with the switching level from I(w V, V) = I(V, V) / 2. With several path voltages
    R = V / (2 ln 2 I_eff), I_eff = [I(V, V/2) + I(V/2, V)] / 2, and the level is 0.5.
    Rows at or below the instrument floor are upper bounds and count as the floor.

Sweeps
    ``pessimistic``: the larger current at zero control, the smaller one at full control, in between
    I_larger^(1-u) I_smaller^u with u = control / supply. ``forward``, ``backward``: that sweep alone. The switch closes
    where the forward sweep, and opens where the backward sweep, carries half of the smaller on-current.

Charge
    Q(V) over the swing for energy. For delay Q(V)/V: the mean over the switching window of a mirrored pair, one half of
    the swing of the pull-down plus the other half of the pull-up, is the whole curve. The share
    ``drain_capacitance_share`` of it couples to the drain and counts as for the other transistors, with the same
    weight at input and output: 1.5 in energy, 2 in delay. Not stated: no coupling, with a warning.

Stacks: k closed ones k R. k open ones leak I(0, V/k) / I(0, V) of one: the measured law without credit for the
lifted sources of the upper switches (no data below zero control), so an upper bound for transistors.

References: F. N. Fritsch and J. Butland, SIAM J. Sci. Stat. Comput. 5, 300 (1984); M. H. Na et al., IEDM 2002 (memory).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from benchmark.devices.links.resistive import SUPPLY_LINK
from benchmark.devices.model import DeviceModel, Finding, ModelInputs, Prepared
from benchmark.devices.record import Array, BoolArray, Switch, SwitchPair
from benchmark.devices.standing import (
    array,
    beyond,
    effective_resistance,
    mirrored,
    option,
    stack_counts,
    standing_fields,
    supply_limits,
    values_of,
)
from benchmark.devices.table_checks import check
from benchmark.devices.table_inputs import (
    INPUTS,
    OPTIONS,
    REFERENCES,
    SWEEPS,
    TABLES,
    prepare_charge,
    prepare_surfaces,
)
from benchmark.devices.virtual_source import ENERGY_WEIGHT, OUTPUT_WEIGHT
from benchmark.physics.measured_current import CurrentSurface, blended_branches
from benchmark.physics.roots import falling_root

__all__ = ["MODEL"]


def _prepare(inputs: ModelInputs) -> Prepared:
    values = values_of(MODEL, inputs)
    surfaces, width, floor_currents = prepare_surfaces(inputs, values)
    terminal = values.get("terminal_capacitance")
    if terminal is None:
        terminal = values["terminal_capacitance_per_width"] * values["unit_width"]
    return {
        "values": values,
        "partner": option(MODEL, inputs, "partner"),
        "branch": option(MODEL, inputs, "branch"),
        "surfaces": surfaces,
        "width": width,
        "floor": floor_currents,
        "charge": prepare_charge(inputs, values),
        "terminal": terminal,
        "coupling": values.get("drain_capacitance_share", array(0.0)),
    }


@dataclass(frozen=True)
class _Current:
    """Path current at given conditions (arrays that broadcast to the shape of the record)."""

    surfaces: Mapping[str, CurrentSurface]
    branch: str
    width: Array
    saturation_voltage: Array | None
    supply: Array
    temperature: Array

    def sweep(self, name: str, control: Array, path: Array) -> Array:
        """Return the current of one sweep [A]; the only one there is when the table has no sweeps."""
        surface = self.surfaces.get(name) or self.surfaces["only"]
        return np.asarray(surface(control, path, self.temperature, self.saturation_voltage) * self.width)

    def at(self, control: Array, path: Array) -> Array:
        """Return the current of the chosen branch [A]; arguments broadcast against the conditions."""
        if "only" in self.surfaces:
            return self.sweep("only", control, path)
        if self.branch != "pessimistic":
            return self.sweep(self.branch, control, path)
        forward, backward = self.sweep("forward", control, path), self.sweep("backward", control, path)
        return blended_branches(forward, backward, control / self.supply)

    def __call__(self, control: Array, path: Array) -> Array:
        """Return the current as the record wants it: arguments with one trailing axis more."""
        wider = replace(
            self,
            width=self.width[..., None],
            saturation_voltage=None if self.saturation_voltage is None else self.saturation_voltage[..., None],
            supply=self.supply[..., None],
            temperature=self.temperature[..., None],
        )
        return wider.at(control, path)


def _switch(prepared: Prepared, supply: Array, temperature: Array, knobs: Mapping[str, Array]) -> SwitchPair:
    values: Mapping[str, Array] = prepared["values"]
    surfaces: Mapping[str, CurrentSurface] = prepared["surfaces"]
    v, kelvin = array(supply), array(temperature)
    measured = next(iter(surfaces.values())).measured_across
    scale = None if measured else values["saturation_voltage"]
    current = _Current(surfaces, prepared["branch"], prepared["width"], scale, v, kelvin)
    charge, charge_outside = prepared["charge"].at(v, kelvin)
    outside = _outside(surfaces, v, kelvin, charge_outside)
    on, off = current.at(v, v), current.at(0.0 * v, v)
    if measured:
        resistance = effective_resistance(v, current.at(v, 0.5 * v), current.at(0.5 * v, v))
        level = np.where(off < 0.5 * on, 0.5, np.nan)
    else:
        resistance = np.asarray(v / on)
        level = _control_at(lambda control: current.at(control, v), 0.5 * on, v) / v
    reference = 0.5 * _smallest([current.sweep(name, v, v) for name in surfaces])
    closing, opening = (
        _control_at(lambda control, name=name: current.sweep(name, control, v), reference, v)  # type: ignore[misc]
        for name in SWEEPS
    )
    mean, coupling, terminal = np.asarray(charge / v), prepared["coupling"], prepared["terminal"]
    count = stack_counts(values)
    shared = np.stack([current.at(0.0 * v, v / k) / off for k in count], axis=-1)
    down = Switch(
        technology=MODEL.name,
        polarity="down",
        partner="none" if prepared["partner"] == "none" else "mirrored",
        resistance_kind="effective" if measured else "path",
        stack_time="simultaneous",
        input_scales_with_size=True,
        resistance=resistance,
        switching_level=level,
        current=current,
        on_current=on,
        off_current_path=off,
        off_current_input_high=array(0.0),
        off_current_input_low=array(0.0),
        off_current_body=array(0.0),
        stack_on=count,
        stack_off=shared,
        input_charge=charge * (1.0 + (ENERGY_WEIGHT - 1.0) * coupling),
        input_capacitance_delay=mean * (1.0 + (OUTPUT_WEIGHT - 1.0) * coupling),
        terminal_capacitance=terminal + ENERGY_WEIGHT * coupling * mean,
        terminal_capacitance_delay=terminal + OUTPUT_WEIGHT * coupling * mean,
        extra_energy=values["extra_energy_per_cycle"],
        closing_time=values["transit_time"],
        opening_time=values["transit_time"],
        closing_voltage=closing,
        opening_voltage=opening,
        limits=supply_limits(values, v),
        outside=beyond(outside),
        intermediates=_floor_mark(prepared["floor"], off),
        **standing_fields(values),
    )
    return mirrored(down, v, kelvin)


def _smallest(currents: list[Array]) -> Array:
    found = currents[0]
    for other in currents[1:]:
        found = np.minimum(found, other)
    return found


def _control_at(sweep: Callable[[Array], Array], wanted: Array, supply: Array) -> Array:
    """Return the control voltage at which a rising current reaches ``wanted``; nan where it already has at zero."""
    zero = 0.0 * supply
    at_zero = sweep(zero)
    root = falling_root(lambda control: np.log(wanted) - np.log(sweep(control)), zero, supply)
    return np.where((at_zero < wanted) & np.isfinite(wanted), root, np.nan)


def _outside(
    surfaces: Mapping[str, CurrentSurface], supply: Array, temperature: Array, charge: Mapping[str, BoolArray]
) -> dict[str, BoolArray]:
    end = min(min(surface.control_high, surface.path_high) for surface in surfaces.values())
    beyond_supply, beyond_temperature = np.asarray(False), np.asarray(False)
    for surface in surfaces.values():
        beyond_supply = beyond_supply | surface.outside_voltage(supply)
        beyond_temperature = beyond_temperature | surface.outside_temperature(temperature)
    given = next(iter(surfaces.values())).temperatures - 273.15
    span = f"{given[0]:g} degC only" if given.size == 1 else f"{given[0]:g} to {given[-1]:g} degC"
    return {
        f"beyond the measured table (ends at {end:g} V)": beyond_supply,
        f"beyond the measured table (measured at {span})": beyond_temperature,
        **charge,
    }


def _floor_mark(floor: Array | None, off: Array) -> dict[str, tuple[Array, str]]:
    """Return a mark where the off-current is only an upper bound, set by the instrument."""
    if floor is None:
        return {}
    return {"off-current is an upper bound": (np.where(off <= floor * (1.0 + 1e-9), 1.0, 0.0), "1")}


def _check(inputs: ModelInputs) -> list[Finding]:
    return check(MODEL, inputs)


MODEL = DeviceModel(
    name="table",
    title="A switch known by its measured curves only",
    inputs=INPUTS,
    options=OPTIONS,
    prepare=_prepare,
    switch=_switch,
    check=_check,
    links=(SUPPLY_LINK,),
    tables=TABLES,
    references=REFERENCES,
)
