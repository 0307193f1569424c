"""Model ``given``: a switch stated directly by resistance, capacitance, delay and supply (layer 4).

All values belong to ONE switch. A complementary inverter has a pull-down and a pull-up switch, so a capacitance known
per inverter input is entered as half of it per switch; the leakage of an inverter is that of the one open switch.

Equations
    closed: R = R_on. Open: the path is R_on in series with the open gap, R_on + R_off, so a stated off-resistance
    leaks V / (R_on + R_off); a stated open-state current I_off at the declared supply V_d is carried by an ohmic path,
    I_off V / V_d; with ``off_state = none`` the open switch carries exactly nothing.
    Between open and closed log10 R falls linearly with the control voltage inside the widest window that has
    R(w V) = 2 R_on (``benchmark.physics.ohmic``).
    Input charge C_in V; extra energy, delays and capacitances as stated, at every temperature.

Supply
    ``fixed-point``: stated at the declared supply only; any other supply is outside. ``constant-resistance``:
    resistances, capacitances and delays hold at every supply. The switching level is a share of the supply, unless a
    closing voltage is stated: then the switch closes at that voltage whatever the supply, and a supply that does not
    exceed it does not close the switch.

References: definitions only; the window is an own convention.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from benchmark.devices.links.resistive import GIVEN_LINKS
from benchmark.devices.model import Default, DeviceModel, Finding, Input, ModelInputs, Option, Prepared
from benchmark.devices.netlist.ohmic import ohmic_text
from benchmark.devices.netlist.parts import Polarity, SubCircuits, SwitchText
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

__all__ = ["MODEL"]

#: supplies closer than this (relative) are the same supply
SAME_SUPPLY = 1.0e-9
STATED_ONLY = "stated at one supply only"


def _prepare(inputs: ModelInputs) -> Prepared:
    return {
        "values": values_of(MODEL, inputs),
        "options": {item.name: option(MODEL, inputs, item.name) for item in MODEL.options},
    }


def _switch(prepared: Prepared, supply: Array, temperature: Array, knobs: Mapping[str, Array]) -> SwitchPair:
    values: Mapping[str, Array] = prepared["values"]
    options: Mapping[str, str] = prepared["options"]
    v, declared = array(supply), values["declared_supply"]
    on, level, outside = values["on_resistance"], values["switching_level"], {}
    if "closing_voltage" in values:
        level = level * declared / v
        outside["supply does not exceed the closing voltage"] = level >= 1.0
        level = np.where(level < 1.0, level, np.nan)
    if options["supply_dependence"] == "fixed-point":
        outside[STATED_ONLY] = np.abs(v - declared) > SAME_SUPPLY * declared
    open_resistance = _open_resistance(values, options["off_state"])
    if open_resistance is not None:
        outside["open resistance not above twice the closed one"] = open_resistance <= 2.0 * on
    off_current = _off_current(values, v, open_resistance, options["off_state"])
    closing = np.where(np.isnan(level), np.nan, level) * v
    count = stack_counts(values)
    down = Switch(
        technology=MODEL.name,
        polarity="down",
        partner="none" if options["partner"] == "none" else "mirrored",
        resistance_kind="path",
        stack_time="simultaneous",
        input_scales_with_size=True,
        resistance=on,
        switching_level=level,
        current=OhmicLaw(v, on, open_resistance, array(level)),
        on_current=v / on,
        off_current_path=off_current,
        off_current_input_high=array(0.0),
        off_current_input_low=array(0.0),
        off_current_body=array(0.0),
        stack_on=count,
        stack_off=1.0 / count,
        input_charge=values["input_capacitance"] * v,
        input_capacitance_delay=values["input_capacitance"],
        terminal_capacitance=values["terminal_capacitance"],
        terminal_capacitance_delay=values["terminal_capacitance"],
        extra_energy=values["extra_energy_per_cycle"],
        closing_time=values["closing_delay"],
        opening_time=values["opening_delay"],
        closing_voltage=values.get("closing_voltage", closing),
        opening_voltage=values.get("opening_voltage", values.get("closing_voltage", closing)),
        limits=supply_limits(values, v),
        outside=beyond(outside),
        **standing_fields(values),
    )
    return mirrored(down, v, array(temperature))


def _open_resistance(values: Mapping[str, Array], off_state: str) -> Array | None:
    """Return the resistance of the open path [ohm]; None when it carries nothing."""
    if off_state == "resistance":
        return values["on_resistance"] + values["off_resistance"]
    if off_state == "current":
        return values["declared_supply"] / values["open_state_current"]
    return None


def _off_current(values: Mapping[str, Array], supply: Array, open_resistance: Array | None, off_state: str) -> Array:
    if open_resistance is None:
        return array(0.0)
    if off_state == "current":
        return values["open_state_current"] * (supply / values["declared_supply"])
    return supply / open_resistance


def _netlist(prepared: Prepared, pair: SwitchPair, knobs: Mapping[str, Array]) -> SubCircuits:
    values, off_state = prepared["values"], prepared["options"]["off_state"]

    def one(switch: Switch, polarity: Polarity) -> SwitchText:
        opened = _open_resistance(values, off_state)
        return ohmic_text(switch, polarity, pair.supply, switch.resistance, opened, switch.switching_level)

    return SubCircuits(one(pair.down, "down"), one(pair.up, "up"), ("Hysteresis is not in it: the closing branch.",))


def _check(inputs: ModelInputs) -> list[Finding]:
    values = values_of(MODEL, inputs)
    found: list[Finding] = []

    def refuse(name: str, what: str, wrong: BoolArray, allowed: str) -> None:
        if bool(np.any(wrong)):
            found.append(Finding("refuse", f"value.{name}", what, allowed=allowed))

    on, declared = values["on_resistance"], values["declared_supply"]
    off_state = option(MODEL, inputs, "off_state")
    if off_state == "resistance":
        refuse(
            "off_resistance", "is not above the on-resistance", values["off_resistance"] <= on, "above on_resistance"
        )
    if off_state == "current":
        current = values["open_state_current"]
        refuse("open_state_current", "is zero", current <= 0.0, 'above 0; for no leakage at all say off_state = "none"')
        refuse(
            "open_state_current",
            "is not below half the on-current",
            current * on >= 0.5 * declared,
            "below declared_supply / (2 on_resistance)",
        )
    level = values["switching_level"]
    refuse("switching_level", "lies outside the input swing", (level <= 0.0) | (level >= 1.0), "above 0 and below 1")
    if "closing_voltage" not in values:
        if "opening_voltage" in values:
            found.append(Finding("refuse", "value.opening_voltage", "is stated without a closing voltage"))
        found.append(
            Finding(
                "note",
                "value.closing_voltage",
                "not stated: closes and opens at switching_level times supply, no hysteresis",
            )
        )
        return found
    closing = values["closing_voltage"]
    opening = values.get("opening_voltage", closing)
    refuse("opening_voltage", "is above the closing voltage", opening > closing, "at or below closing_voltage")
    refuse(
        "opening_voltage",
        "makes a hysteresis window larger than the swing",
        closing - opening > declared,
        "closing_voltage minus opening_voltage at most declared_supply",
    )
    return found


MODEL = DeviceModel(
    name="given",
    title="A switch stated directly: resistance, capacitance, delay and supply, per switch",
    inputs=(
        *STANDING_INPUTS,
        Input("on_resistance"),
        Input("closed_state_current", required=False),
        Input("effective_drive_current", required=False),
        Input("off_resistance", when=("off_state", ("resistance",))),
        Input("open_state_current", when=("off_state", ("current",))),
        Input("switching_level"),
        Input("closing_voltage", required=False),
        Input("opening_voltage", required=False),
        Input("input_capacitance"),
        Input(
            "terminal_capacitance",
            required=False,
            default=Default(0.0, "assumed", "not stated: no capacitance of the conducting terminals"),
        ),
        Input("closing_delay"),
        Input("opening_delay"),
        Input(
            "extra_energy_per_cycle",
            required=False,
            default=Default(0.0, "assumed", "not stated: no loss beyond charge times supply"),
        ),
    ),
    options=(
        Option("off_state", ("resistance", "current", "none"), "resistance"),
        Option("partner", ("mirrored", "none"), "mirrored"),
        Option("supply_dependence", ("fixed-point", "constant-resistance"), "fixed-point"),
        Option("size_scaling", ("copies",), "copies"),
    ),
    prepare=_prepare,
    switch=_switch,
    netlist=_netlist,
    check=_check,
    links=GIVEN_LINKS,
    references=(
        "R(open) = R_on + R_off; I_off = V / (R_on + R_off), or I_off V / V_declared, or exactly 0",
        "log10 R linear in the control voltage inside the widest window with R(w V) = 2 R_on (own convention)",
        "valid at the declared supply only, unless supply_dependence = constant-resistance; no temperature dependence",
    ),
)
