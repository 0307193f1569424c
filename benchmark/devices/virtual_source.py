"""Model ``virtual-source``: the reference transistor, calibrated on its published currents (layer 4).

Current law: ``benchmark.physics.virtual_source`` (v1.0.1). The file states targets; threshold and injection velocity
(with an effective current as target: mobility too; with a switching capacitance: inversion capacitance too) are solved
in every draw by ``benchmark.physics.calibration``. Temperature: V_T linear, mobility and velocity as powers of T,
the slope factor constant, so the swing goes as T. The knob ``threshold_shift`` adds to V_T0 of both polarities.

    R = V / (2 ln 2 I_eff), I_eff = [I(V, V/2) + I(V/2, V)] / 2; switching level 0.5
    input charge (energy): [L Q(V, 0) + (1 + m_E) C_ov V] W, m_E = 1.5
    input capacitance (delay): [L Q(V, 0)/V + (1 + m) C_ov] W, m = 2.32 - 2.82 min(r, 0.52), r = I(3V/4, 3V/4)/I(V, V/2)
    terminal capacitance: (m_E C_ov + C_t) W (energy), (2 C_ov + C_t) W (delay)

Why these weights. Over one falling and one rising edge the charge that a driven input takes in the window of its driver
([Q(V) - Q(V/2)] + [Q(V/2) - Q(0)], one half per edge and polarity) sums to Q(V). The coupling to the drain counts once
at the input and once at the output; if input and output moved one after the other the weights would sum to 2, if they
moved together to 4. Energy: 1.40 to 1.56 each in circuit simulations of virtual-source inverters, 1.5 taken (-2 to
+4.5 %). Delay: the output's own coupling is swung by input and output in full (2); for the driven inputs see
``miller_weight``.

Stacks: balance of currents (``benchmark.physics.stacking``), all controls together: k open devices at the supply, and
the effective current of k closed ones. There F_pre of the current law uses the internal gate voltage (up to 0.3 %).

One footprint covers a unit inverter, each switch has half. Not modelled: gate and junction leakage, gate-induced
drain leakage (it is inside the published off-current and falls with the barrier lowering instead), body effect.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, fields, replace
from typing import Any, Literal

import numpy as np

from benchmark.devices.links.transistor import VIRTUAL_SOURCE_LINKS
from benchmark.devices.model import DeviceModel, Finding, ModelInputs, Option, Prepared
from benchmark.devices.netlist.parts import Polarity, SubCircuits, SwitchText
from benchmark.devices.netlist.virtual_source import transistor_text
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
from benchmark.devices.virtual_source_inputs import INPUTS, calibrated, findings
from benchmark.physics import drive
from benchmark.physics import virtual_source as vs
from benchmark.physics.drive import ENERGY_WEIGHT, OUTPUT_WEIGHT
from benchmark.physics.stacking import Law, Number, series_balance

__all__ = ["ENERGY_WEIGHT", "MODEL", "OUTPUT_WEIGHT"]

#: range of the temperature laws [K]
COLDEST, HOTTEST = 173.0, 423.0


def _prepare(inputs: ModelInputs) -> Prepared:
    values = values_of(MODEL, inputs)
    partner = option(MODEL, inputs, "partner")
    standing = standing_fields(values)
    standing["area"] = 0.5 * standing["area"]
    polarities = ("n", "p") if partner == "own" else ("n",)
    return {
        "values": values,
        "partner": partner,
        "standing": standing,
        "transistors": {polarity: calibrated(values, polarity) for polarity in polarities},
    }


def _at(t: vs.Transistor, values: Mapping[str, Array], kelvin: Array, shift: Array) -> vs.Transistor:
    """Return the transistor at another temperature, its threshold shifted."""
    reference = values["reference_temperature"]
    rise, ratio = kelvin - reference, kelvin / reference
    return replace(
        t,
        threshold=vs.threshold_at(t.threshold, values["threshold_temperature_slope"], rise) + shift,
        mobility=vs.power_law(t.mobility, values["mobility_temperature_exponent"], ratio),
        velocity=vs.power_law(t.velocity, values["velocity_temperature_exponent"], ratio),
        thermal_voltage=vs.thermal_voltage(kelvin),
    )


def _widened(t: vs.Transistor) -> vs.Transistor:
    """Return the transistor with one trailing axis more."""
    named = {item.name: getattr(t, item.name) for item in fields(t)}
    return replace(t, **{name: array(value)[..., None] for name, value in named.items() if value is not None})


class _Current:
    """Path current as the record wants it (one trailing axis); a class so that records can be pickled."""

    def __init__(self, transistor: vs.Transistor) -> None:
        self._transistor = _widened(transistor)

    def __call__(self, control: Array, path: Array) -> Array:
        return vs.drain_current(self._transistor, control, path)


def _stacks(t: vs.Transistor, supply: Array, twice_effective: Array, counts: Array) -> tuple[Array, Array]:
    """Return resistance of k closed and leakage of k open switches in series over those of one, trailing axis k."""

    def law(control: Array, path: Array) -> tuple[Array, Array, Array]:
        found = vs.intrinsic_slopes(t, control, path)
        return found.current, found.by_control, found.by_path

    access = (t.source_resistance / t.width, t.drain_resistance / t.width)
    # unknown elements stay nan
    whole = np.where(np.isfinite(twice_effective), supply + 0.0 * twice_effective, np.nan)
    single = series_balance(law, 0.0, whole, 1, access=access).current
    on, off = [np.ones_like(whole)], [np.ones_like(whole)]
    for count in range(2, counts.size + 1):
        together = _closed(law, supply, 0.5 * whole, count, access, t)
        together = together + _closed(law, 0.5 * supply, whole, count, access, t)
        on.append(np.asarray(twice_effective / together))
        start = [_first_guess(t, whole, count - lower) for lower in range(count - 1)]
        opened = series_balance(law, 0.0, whole, count, start, access).current
        off.append(np.asarray(opened / single))
    return np.stack(on, axis=-1), np.stack(off, axis=-1)


def _closed(
    law: Law, control: Array, whole: Array, count: int, access: tuple[Number, Number], t: vs.Transistor
) -> Array:
    """Return the current of ``count`` closed switches in series [A]."""
    # the lower ones take little: 0.6 phi + 0.06 V_GS is close enough to save a step or two
    lower = [0.6 * t.thermal_voltage + 0.06 * control + 0.0 * whole] * (count - 1)
    return series_balance(law, control, whole, count, lower, access).current


def _first_guess(t: vs.Transistor, supply: Array, above: int) -> Array:
    """First guess of the voltage across an open device with ``above - 1`` devices above it [V]."""
    delta = array(t.barrier_lowering)
    lifted = delta / (1.0 + 2.0 * delta) * supply if above == 2 else 0.0
    return np.asarray(lifted - np.log1p(-1.0 / above) * t.thermal_voltage)


@dataclass(frozen=True)
class _Solved:
    """What a polarity's currents come to: I(V, V), I(0, V), I(V, V/2), I(V/2, V), I(3V/4, 3V/4) [A]; stacks."""

    on: Array
    off: Array
    high: Array
    low: Array
    middle: Array
    stack_on: Array
    stack_off: Array


def _solved(transistors: list[vs.Transistor], supply: Array, counts: Array) -> list[_Solved]:
    """Solve currents and stacks of all polarities together: fewer and larger arrays are faster."""
    axes = max(supply.ndim, *(np.ndim(getattr(t, item.name)) for t in transistors for item in fields(t)))
    t = _joined(transistors, axes)
    v = supply[..., None]
    control = v * np.array([1.0, 0.0, 1.0, 0.5, 0.75])
    path = v * np.array([1.0, 1.0, 0.5, 1.0, 0.75])
    on, off, high, low, middle = np.moveaxis(vs.drain_current(_widened(t), control, path), -1, 0)
    stack_on, stack_off = _stacks(t, supply + 0.0 * on, high + low, counts)
    arrays = (on, off, high, low, middle, stack_on, stack_off)
    return [_Solved(*(array[i] for array in arrays)) for i in range(len(transistors))]


def _joined(transistors: list[vs.Transistor], axes: int) -> vs.Transistor:
    """Return transistors along a new first axis, before ``axes`` others."""

    def joined(values: list[Any]) -> Any:
        if values[0] is None:
            return None
        rows = np.stack(np.broadcast_arrays(*(array(value) for value in values)))
        return rows.reshape(rows.shape[:1] + (1,) * (axes + 1 - rows.ndim) + rows.shape[1:])

    return vs.Transistor(
        **{item.name: joined([getattr(t, item.name) for t in transistors]) for item in fields(vs.Transistor)}
    )


def _one(
    prepared: Prepared, polarity: str, t: vs.Transistor, found: _Solved, supply: Array, outside: dict[str, BoolArray]
) -> Switch:
    values: Mapping[str, Array] = prepared["values"]
    width, edge = values["unit_width"], values["overlap_capacitance"]
    weight = drive.miller_weight(found.middle / found.high)
    own_terminal = values["terminal_capacitance_per_width"] * width
    outside = {"no threshold and velocity meet the stated currents": ~prepared["transistors"][polarity][1], **outside}
    sense: Literal["down", "up"] = "down" if polarity == "n" else "up"
    return Switch(
        technology=MODEL.name,
        polarity=sense,
        partner="own" if prepared["partner"] == "own" else "mirrored",
        resistance_kind="effective",
        stack_time="simultaneous",
        input_scales_with_size=True,
        resistance=effective_resistance(supply, found.high, found.low),
        switching_level=array(0.5),
        current=_Current(t),
        on_current=found.on,
        off_current_path=found.off,
        off_current_input_high=array(0.0),
        off_current_input_low=array(0.0),
        off_current_body=array(0.0),
        stack_on=found.stack_on,
        stack_off=found.stack_off,
        input_charge=drive.switching_capacitance(t, supply, edge, ENERGY_WEIGHT) * supply,
        input_capacitance_delay=drive.switching_capacitance(t, supply, edge, weight),
        terminal_capacitance=ENERGY_WEIGHT * edge * width + own_terminal,
        terminal_capacitance_delay=OUTPUT_WEIGHT * edge * width + own_terminal,
        extra_energy=array(0.0),
        closing_time=array(0.0),
        opening_time=array(0.0),
        closing_voltage=0.5 * supply,
        opening_voltage=0.5 * supply,
        limits=supply_limits(values, supply),
        outside=beyond(outside),
        intermediates={
            "threshold V_T0": (array(t.threshold), "V"),
            "injection velocity": (array(t.velocity), "m/s"),
            "mobility": (array(t.mobility), "m^2/V/s"),
            "inversion capacitance": (array(t.inversion_capacitance), "F/m^2"),
            "effective current": (np.asarray(drive.effective_current(found.high, found.low)), "A"),
            "drain-edge weight in delay": (np.asarray(weight), "1"),
        },
        **prepared["standing"],
    )


def _switch(prepared: Prepared, supply: Array, temperature: Array, knobs: Mapping[str, Array]) -> SwitchPair:
    values: Mapping[str, Array] = prepared["values"]
    v, kelvin, shift = array(supply), array(temperature), array(knobs["threshold_shift"])
    # each further switch of a stack costs three current balances per point
    depth = int(np.max(knobs["stack_depth"])) if "stack_depth" in knobs else None
    transistors = {name: _at(t, values, kelvin, shift) for name, (t, _) in prepared["transistors"].items()}
    solved = _solved(list(transistors.values()), v, stack_counts(values)[:depth])
    outside: dict[str, BoolArray] = {
        f"temperature outside {COLDEST:g} K to {HOTTEST:g} K": (kelvin < COLDEST) | (kelvin > HOTTEST)
    }
    switches = [
        _one(prepared, name, t, found, v, outside) for (name, t), found in zip(transistors.items(), solved, strict=True)
    ]
    if prepared["partner"] == "mirrored":
        return mirrored(switches[0], v, kelvin)
    return SwitchPair(down=switches[0], up=switches[1], supply=v, temperature=kelvin)


def _netlist(prepared: Prepared, pair: SwitchPair, knobs: Mapping[str, Array]) -> SubCircuits:
    values: Mapping[str, Array] = prepared["values"]
    terminal = values["terminal_capacitance_per_width"] * values["unit_width"]

    def one(polarity: Polarity) -> SwitchText:
        own = "p" if polarity == "up" and prepared["partner"] == "own" else "n"
        t = _at(prepared["transistors"][own][0], values, array(pair.temperature), array(knobs["threshold_shift"]))
        return transistor_text(t, polarity, values["overlap_capacitance"], terminal)

    return SubCircuits(one("down"), one("up"))


def _check(inputs: ModelInputs) -> list[Finding]:
    return findings(values_of(MODEL, inputs), option(MODEL, inputs, "partner") == "own")


MODEL = DeviceModel(
    name="virtual-source",
    title="Reference transistor: virtual-source model calibrated on published currents",
    inputs=INPUTS,
    options=(Option("partner", ("own", "mirrored"), "own"),),
    prepare=_prepare,
    switch=_switch,
    netlist=_netlist,
    check=_check,
    links=VIRTUAL_SOURCE_LINKS,
    calibrated_on=(
        "on_current",
        "on_current_p",
        "off_current",
        "off_current_p",
        "effective_current",
        "effective_current_p",
    ),
    knobs=("threshold_shift",),
    references=(
        "current and charge: A. Khakifirooz, O. M. Nayfeh, D. Antoniadis, IEEE TED 56, 1674 (2009); "
        "released model v1.0.1; gate length above about 10 nm, 173 K to 423 K",
        "R = V / (2 ln 2 I_eff), I_eff = [I(V, V/2) + I(V/2, V)]/2: M. H. Na et al., IEDM 2002; constant load: -5 to "
        "+14 % against chains of inverters (own)",
        "drain-edge weights: 1.5 in energy (simulated), 2.32 - 2.82 min(r, 0.52) in delay (own fit, -5 to +6 %)",
        "V_T linear in T, mobility and velocity as powers of T (common practice, no source)",
        "no gate, junction or gate-induced drain leakage beyond the published off-current; no body effect",
    ),
)
