"""Model ``steep-swing``: a transistor known by swing, ceiling and floor (layer 4).

Equations (per unit width W; V_G counts from the source, dV is the knob ``threshold_shift``)
    I(V_G, V_D) = blend(V_G - dV) (1 - exp(-V_D / V_sat)), blend of ``benchmark.physics.steep_swing``: it has the stated
    swing S, ceiling I_on and floor I_off at zero gate voltage. ``on_current`` is the ceiling: the current at a supply
    near it is smaller. Below zero gate voltage the exponential goes on (needed by threshold shifts and stacks only).
    Temperature: S(T) = S + c (T - T_ref); the threshold stays, so the floor moves with the swing and the ceiling does
    not. Without a stated coefficient c is S / T_ref for thermionic conduction (S in proportion to T) and 0 otherwise.
    R = V / (2 ln 2 I_eff) with I_eff = [I(V, V/2) + I(V/2, V)] / 2, so the switching level is 0.5.
    Capacitance: the share s_d of the gate capacitance C_g couples to the drain, which moves against the gate. As for
    the reference transistor it counts with the same weight at the input and at the output: 1.5 in energy, 2 in delay,
        input    C_g W (1 + (weight - 1) s_d),    terminal    (C_t + weight s_d C_g) W,
    and C_t is what the terminal has beside its gate coupling.
    Accuracy, own simulation of inverter chains with this law (supplies of 4 to 8 swings with 7 decades between floor
    and ceiling, V_sat 30 to 120 mV, S 20 to 65 mV/decade, fan-out 1.5 and 4): energy -12 to +9 % of the simulated one;
    delay by C V / (2 I_eff) -25 to +13 % without drain coupling, -37 to +36 % at s_d = 0.3 and -42 to +56 % at 0.8: too
    short below the knee of the blend, too long above it. The transient rule is the better answer for such switches.
    Stacks: exact balance of currents (``benchmark.physics.stacking``), for k open switches at the supply and for the
    effective current of k closed ones.

Conduction
    ``thermionic``: a swing below ln(10) k T / q is refused (at the reference temperature) or outside (at another
    temperature or in a draw). ``tunnelling``, ``other``: no such limit.

Not modelled: ambipolar branch, drain-induced barrier lowering, gate leakage, junction leakage, hysteresis.

References: own blend; effective current after M. H. Na et al., IEDM 2002 (from memory).
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from benchmark.devices.links.transistor import STEEP_SWING_LINKS
from benchmark.devices.model import DeviceModel, Finding, Input, ModelInputs, Option, Prepared
from benchmark.devices.netlist.parts import SubCircuits
from benchmark.devices.netlist.steep_swing import blend_text
from benchmark.devices.record import Array, BoolArray, Switch, SwitchPair
from benchmark.devices.standing import (
    STANDING_INPUTS,
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
from benchmark.devices.virtual_source import ENERGY_WEIGHT, OUTPUT_WEIGHT
from benchmark.physics.limits import boltzmann_swing
from benchmark.physics.stacking import Law, series_balance
from benchmark.physics.steep_swing import blend_law, off_current_at_swing

__all__ = ["MODEL"]

#: relative slack of the thermionic limit: rounding only
AT_LIMIT = 1.0e-9


def _coefficient(values: Mapping[str, Array], conduction: str) -> Array:
    """Return dS/dT [V/decade/K]."""
    if "swing_temperature_coefficient" in values:
        return values["swing_temperature_coefficient"]
    if conduction == "thermionic":
        return values["subthreshold_swing"] / values["reference_temperature"]
    return array(0.0)


def _prepare(inputs: ModelInputs) -> Prepared:
    values = values_of(MODEL, inputs)
    conduction = option(MODEL, inputs, "conduction")
    width = values["unit_width"]
    return {
        "values": values,
        "partner": option(MODEL, inputs, "partner"),
        "conduction": conduction,
        "coefficient": _coefficient(values, conduction),
        "ceiling": values["on_current"] * width,
        "floor": values["off_current"] * width,
        "gate": values["gate_capacitance_total"] * width,
        "terminal": values["terminal_capacitance_per_width"] * width,
    }


def _switch(prepared: Prepared, supply: Array, temperature: Array, knobs: Mapping[str, Array]) -> SwitchPair:
    values: Mapping[str, Array] = prepared["values"]
    v, kelvin, shift = array(supply), array(temperature), array(knobs["threshold_shift"])
    reference = values["subthreshold_swing"]
    stated = reference + prepared["coefficient"] * (kelvin - values["reference_temperature"])
    swing = np.where(stated > 0.0, stated, np.nan)
    outside: dict[str, BoolArray] = {"swing not above 0 at this temperature": ~(stated > 0.0)}
    if prepared["conduction"] == "thermionic":
        outside["swing below the thermionic limit at this temperature"] = stated < boltzmann_swing(kelvin) * (
            1.0 - AT_LIMIT
        )
    parts = _parts(prepared, swing, shift)
    law = _law(*parts)
    whole = np.broadcast_arrays(v, *parts)[0]
    high, low = law(whole, 0.5 * whole)[0], law(0.5 * whole, whole)[0]
    stack_on, stack_off = _stacks(law, whole, high + low, stack_counts(values))
    gate, coupled = prepared["gate"], prepared["gate"] * values["drain_capacitance_share"]
    down = Switch(
        technology=MODEL.name,
        polarity="down",
        partner="none" if prepared["partner"] == "none" else "mirrored",
        resistance_kind="effective",
        stack_time="simultaneous",
        input_scales_with_size=True,
        resistance=effective_resistance(v, high, low),
        switching_level=array(0.5),
        current=_Current(parts),
        on_current=law(whole, whole)[0],
        off_current_path=law(0.0 * whole, whole)[0],
        off_current_input_high=array(0.0),
        off_current_input_low=array(0.0),
        off_current_body=array(0.0),
        stack_on=stack_on,
        stack_off=stack_off,
        input_charge=(gate + (ENERGY_WEIGHT - 1.0) * coupled) * v,
        input_capacitance_delay=gate + (OUTPUT_WEIGHT - 1.0) * coupled,
        terminal_capacitance=prepared["terminal"] + ENERGY_WEIGHT * coupled,
        terminal_capacitance_delay=prepared["terminal"] + OUTPUT_WEIGHT * coupled,
        extra_energy=array(0.0),
        closing_time=values["transit_time"],
        opening_time=values["transit_time"],
        closing_voltage=0.5 * v,
        opening_voltage=0.5 * v,
        limits=supply_limits(values, v),
        outside=beyond(outside),
        intermediates={"swing": (swing, "V/decade"), "effective current": (0.5 * (high + low), "A")},
        **standing_fields(values),
    )
    return mirrored(down, v, kelvin)


def _parts(prepared: Prepared, swing: Array, shift: Array) -> tuple[Array, Array, Array, Array, Array]:
    """Return swing, ceiling, floor, saturation voltage and threshold shift of the unit switch at one temperature."""
    values: Mapping[str, Array] = prepared["values"]
    floor = off_current_at_swing(prepared["floor"], prepared["ceiling"], values["subthreshold_swing"], swing)
    return swing, prepared["ceiling"], floor, values["saturation_voltage"], shift


def _netlist(prepared: Prepared, pair: SwitchPair, knobs: Mapping[str, Array]) -> SubCircuits:
    parts = _parts(prepared, pair.down.intermediates["swing"][0], array(knobs["threshold_shift"]))
    coupled = prepared["gate"] * prepared["values"]["drain_capacitance_share"]
    gate = (prepared["gate"] - coupled, coupled)
    return SubCircuits(
        blend_text(pair.down, "down", parts, gate, prepared["terminal"]),
        blend_text(pair.up, "up", parts, gate, prepared["terminal"]),
    )


def _law(swing: Array, ceiling: Array, floor: Array, saturation_voltage: Array, shift: Array) -> Law:
    unshifted = blend_law(swing, ceiling, floor, saturation_voltage)

    def law(control: Array, path: Array) -> tuple[Array, Array, Array]:
        return unshifted(control - shift, path)

    return law


class _Current:
    """Path current as the record wants it (one trailing axis); a class so that records can be pickled."""

    def __init__(self, parts: tuple[Array, ...]) -> None:
        self._parts = tuple(part[..., None] for part in parts)

    def __call__(self, control: Array, path: Array) -> Array:
        swing, ceiling, floor, saturation_voltage, shift = self._parts
        return _law(swing, ceiling, floor, saturation_voltage, shift)(control, path)[0]


def _stacks(law: Law, supply: Array, twice_effective: Array, counts: Array) -> tuple[Array, Array]:
    """Return resistance of k closed and leakage of k open switches in series over those of one, trailing axis k.

    Closed: the effective current of the stack, all gates together at (V across V/2) and (V/2 across V).
    """
    single = law(0.0 * supply, supply)[0]
    on: list[Any] = [np.ones_like(supply)]
    off: list[Any] = [np.ones_like(supply)]
    known = np.isfinite(single)
    filled = np.where(known, supply, np.nan)
    for count in range(2, counts.size + 1):
        stacked = series_balance(law, supply, 0.5 * filled, count).current
        stacked = stacked + series_balance(law, 0.5 * supply, filled, count).current
        on.append(twice_effective / stacked)
        off.append(series_balance(law, 0.0 * supply, filled, count).current / single)
    return np.stack(on, axis=-1), np.stack(off, axis=-1)


def _check(inputs: ModelInputs) -> list[Finding]:
    values = values_of(MODEL, inputs)
    conduction = option(MODEL, inputs, "conduction")
    found: list[Finding] = []
    if bool(np.any(values["off_current"] >= values["on_current"])):
        found.append(Finding("refuse", "value.off_current", "is not below the on-current", allowed="below on_current"))
    if bool(np.any(values["off_current"] <= 0.0)):
        found.append(Finding("refuse", "value.off_current", "is not above 0", allowed="above 0"))
    swing, limit = values["subthreshold_swing"], boltzmann_swing(values["reference_temperature"])
    if conduction == "thermionic" and bool(np.any(swing < limit * (1.0 - AT_LIMIT))):
        found.append(
            Finding(
                "refuse",
                "value.subthreshold_swing",
                "is below the thermionic limit at the reference temperature",
                found=f"{float(np.min(swing)) * 1e3:.4g} mV/decade",
                allowed=f"at least {float(np.max(limit)) * 1e3:.4g} mV/decade",
                hint='say conduction = "tunnelling" or "other" if no barrier is crossed thermally',
            )
        )
    if "swing_temperature_coefficient" not in values:
        what = "in proportion to the temperature" if conduction == "thermionic" else "independent of temperature"
        found.append(Finding("note", "value.swing_temperature_coefficient", f"not stated: the swing is {what}"))
    return found


MODEL = DeviceModel(
    name="steep-swing",
    title="A transistor known by swing, current ceiling and current floor",
    inputs=(
        *STANDING_INPUTS,
        Input("subthreshold_swing"),
        Input("swing_temperature_coefficient", required=False),
        Input("on_current"),
        Input("off_current"),
        Input("saturation_voltage"),
        Input("gate_capacitance_total"),
        Input("drain_capacitance_share"),
        Input("terminal_capacitance_per_width"),
        Input("transit_time"),
        Input("unit_width"),
    ),
    options=(
        Option("conduction", ("thermionic", "tunnelling", "other"), "thermionic"),
        Option("partner", ("mirrored", "none"), "mirrored"),
        Option("size_scaling", ("width",), "width"),
    ),
    prepare=_prepare,
    switch=_switch,
    netlist=_netlist,
    check=_check,
    links=STEEP_SWING_LINKS,
    knobs=("threshold_shift",),
    references=(
        "I = {I_off + [1/I_on + 1/(I_off (10^(V/S) - 1))]^-1} (1 - exp(-V_DS/V_sat)) (own blend)",
        "R = V / (2 ln 2 I_eff), I_eff = [I(V, V/2) + I(V/2, V)]/2: M. H. Na et al., IEDM 2002 (from memory)",
        "thermionic limit ln(10) k T / q",
        "gate-drain coupling at input and output alike: weight 1.5 in energy, 2 in delay (own simulations)",
        "no ambipolar branch, no barrier lowering, no gate leakage, no hysteresis",
    ),
)
