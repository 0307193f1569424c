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
from dataclasses import fields, replace
from typing import Final, Literal

import numpy as np

from benchmark.devices.model import Default, DeviceModel, Finding, Input, ModelInputs, Option, Prepared
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
from benchmark.physics import virtual_source as vs
from benchmark.physics.calibration import Targets, calibrate
from benchmark.physics.stacking import series_balance

__all__ = ["MODEL"]

#: weight of the drain edge in energy, at the input and at the output alike
ENERGY_WEIGHT: Final = 1.5
#: weight of the drain edge in delay, at the output
OUTPUT_WEIGHT: Final = 2.0
#: range of the temperature laws [K]
COLDEST, HOTTEST = 173.0, 423.0
#: first guesses of solved values (they do not influence the result)
_FIRST_VELOCITY, _FIRST_MOBILITY, _FIRST_CAPACITANCE = 1.0e5, 0.02, 0.025

_OWN_PARTNER = ("partner", ("own",))
#: p-type names that fall back on the n-type value, with a note
_LIKE_N = ("subthreshold_swing", "drain_barrier_lowering", "saturation_exponent")
_BY_POLARITY = ("on_current", "off_current", "effective_current", "channel_mobility", *_LIKE_N)


def _of(values: Mapping[str, Array], name: str, polarity: str) -> Array | None:
    """Return a value of one polarity, or None when it is not stated."""
    return values.get(name if polarity == "n" else f"{name}_p")


def _polarity_values(values: Mapping[str, Array], polarity: str) -> dict[str, Array]:
    """Return the values that differ between polarities, p like n where the model allows it."""
    found = {name: value for name in _BY_POLARITY if (value := _of(values, name, polarity)) is not None}
    for name in _LIKE_N:
        found.setdefault(name, values[name])
    if polarity == "p" and "channel_mobility" not in found and "effective_current" not in found:
        found.update({name: values[name] for name in ("channel_mobility",) if name in values})
    return found


def _calibrated(values: Mapping[str, Array], polarity: str) -> tuple[vs.Transistor, BoolArray]:
    """Return the unit transistor at the reference temperature, and where its targets could be met."""
    own = _polarity_values(values, polarity)
    temperature = values["reference_temperature"]
    template = vs.Transistor(
        width=values["unit_width"],
        length=values["gate_length"] - values["gate_length_correction"],
        inversion_capacitance=values.get("inversion_capacitance", array(_FIRST_CAPACITANCE)),
        source_resistance=values["access_resistance"],
        drain_resistance=values["access_resistance"],
        velocity=array(_FIRST_VELOCITY),
        mobility=own.get("channel_mobility", array(_FIRST_MOBILITY)),
        threshold=array(0.0),
        slope_factor=vs.slope_factor(own["subthreshold_swing"], temperature),
        barrier_lowering=own["drain_barrier_lowering"],
        fermi_width=values["fermi_width"],
        saturation_exponent=own["saturation_exponent"],
        thermal_voltage=vs.thermal_voltage(temperature),
    )
    targets = Targets(
        supply=values["declared_supply"],
        on_current=own["on_current"],
        off_current=own["off_current"],
        effective_current=own.get("effective_current"),
        switching_capacitance=values.get("gate_capacitance_total"),
        edge_capacitance=values["overlap_capacitance"],
    )
    result = calibrate(template, targets)
    return result.applied_to(template), result.solved


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
        "transistors": {polarity: _calibrated(values, polarity) for polarity in polarities},
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
        together = series_balance(law, supply, 0.5 * whole, count, access=access).current
        together = together + series_balance(law, 0.5 * supply, whole, count, access=access).current
        on.append(np.asarray(twice_effective / together))
        start = [_first_guess(t, whole, count - lower) for lower in range(count - 1)]
        opened = series_balance(law, 0.0, whole, count, start, access).current
        off.append(np.asarray(opened / single))
    return np.stack(on, axis=-1), np.stack(off, axis=-1)


def _first_guess(t: vs.Transistor, supply: Array, above: int) -> Array:
    """First guess of the voltage across an open device with ``above - 1`` devices above it [V]."""
    delta = array(t.barrier_lowering)
    lifted = delta / (1.0 + 2.0 * delta) * supply if above == 2 else 0.0
    return np.asarray(lifted - np.log1p(-1.0 / above) * t.thermal_voltage)


def _one(prepared: Prepared, polarity: str, supply: Array, kelvin: Array, shift: Array) -> Switch:
    values: Mapping[str, Array] = prepared["values"]
    calibrated, solved = prepared["transistors"][polarity]
    t = _at(calibrated, values, kelvin, shift)
    v = supply[..., None]
    # I(V, V), I(0, V), I(V, V/2), I(V/2, V), I(3V/4, 3V/4)
    control = v * np.array([1.0, 0.0, 1.0, 0.5, 0.75])
    path = v * np.array([1.0, 1.0, 0.5, 1.0, 0.75])
    law = _Current(t)
    on, off, high, low, middle = np.moveaxis(law(control, path), -1, 0)
    width, edge = values["unit_width"], values["overlap_capacitance"]
    weight = vs.miller_weight(middle / high)
    own_terminal = values["terminal_capacitance_per_width"] * width
    stack_on, stack_off = _stacks(t, supply + 0.0 * on, high + low, stack_counts(values))
    outside: dict[str, BoolArray] = {
        "no threshold and velocity meet the stated currents": ~solved,
        f"temperature outside {COLDEST:g} K to {HOTTEST:g} K": (kelvin < COLDEST) | (kelvin > HOTTEST),
    }
    sense: Literal["down", "up"] = "down" if polarity == "n" else "up"
    return Switch(
        technology=MODEL.name,
        polarity=sense,
        partner="own" if prepared["partner"] == "own" else "mirrored",
        resistance_kind="effective",
        stack_time="simultaneous",
        input_scales_with_size=True,
        resistance=effective_resistance(supply, high, low),
        switching_level=array(0.5),
        current=law,
        on_current=on,
        off_current_path=off,
        off_current_input_high=array(0.0),
        off_current_input_low=array(0.0),
        off_current_body=array(0.0),
        stack_on=stack_on,
        stack_off=stack_off,
        input_charge=vs.switching_capacitance(t, supply, edge, ENERGY_WEIGHT) * supply,
        input_capacitance_delay=vs.switching_capacitance(t, supply, edge, weight),
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
            "effective current": (np.asarray(vs.effective_current(high, low)), "A"),
            "drain-edge weight in delay": (np.asarray(weight), "1"),
        },
        **prepared["standing"],
    )


def _switch(prepared: Prepared, supply: Array, temperature: Array, knobs: Mapping[str, Array]) -> SwitchPair:
    v, kelvin, shift = array(supply), array(temperature), array(knobs["threshold_shift"])
    down = _one(prepared, "n", v, kelvin, shift)
    if prepared["partner"] == "mirrored":
        return mirrored(down, v, kelvin)
    return SwitchPair(down=down, up=_one(prepared, "p", v, kelvin, shift), supply=v, temperature=kelvin)


def _exactly_one(values: Mapping[str, Array], pair: tuple[str, str], found: list[Finding], needed: bool = True) -> None:
    first, second = pair
    if first in values and second in values:
        found.append(
            Finding(
                "refuse",
                f"value.{second}",
                f"and {first} fix the same thing: one would be ignored",
                allowed=f"{first} or {second}, not both",
            )
        )
    elif needed and first not in values and second not in values:
        found.append(
            Finding(
                "refuse",
                f"value.{first}",
                "is missing, and so is what it could be solved from",
                allowed=f"{first} or {second}",
            )
        )


def _check(inputs: ModelInputs) -> list[Finding]:
    values = values_of(MODEL, inputs)
    own = option(MODEL, inputs, "partner") == "own"
    found: list[Finding] = []
    _exactly_one(values, ("channel_mobility", "effective_current"), found)
    _exactly_one(values, ("inversion_capacitance", "gate_capacitance_total"), found)
    if own:
        stated = "channel_mobility" in values
        _exactly_one(values, ("channel_mobility_p", "effective_current_p"), found, needed=not stated)
    if not bool(np.all(values["gate_length"] > values["gate_length_correction"])):
        found.append(
            Finding("refuse", "value.gate_length_correction", "leaves no channel", allowed="below gate_length")
        )
    polarities = ("n", "p") if own else ("n",)
    for polarity in polarities:
        _check_polarity(values, polarity, found)
    if found and any(item.level == "refuse" for item in found):
        return found
    for polarity in polarities:
        _check_solution(values, polarity, found)
    return found


def _check_polarity(values: Mapping[str, Array], polarity: str, found: list[Finding]) -> None:
    suffix = "" if polarity == "n" else "_p"
    on, off = _of(values, "on_current", polarity), _of(values, "off_current", polarity)
    if on is not None and off is not None and not bool(np.all(off < on)):
        found.append(Finding("refuse", f"value.off_current{suffix}", "is not below the on-current", allowed="below it"))
    swing = _of(values, "subthreshold_swing", polarity)
    if swing is not None:
        factor = np.asarray(vs.slope_factor(swing, values["reference_temperature"]))
        if not bool(np.all(factor >= 1.0 - 1.0e-9)):
            limit = float(np.max(swing / factor)) * 1e3
            found.append(
                Finding(
                    "refuse",
                    f"value.subthreshold_swing{suffix}",
                    "is below the thermionic limit",
                    found=f"{float(np.min(swing)) * 1e3:.4g} mV/decade",
                    allowed=f"at least {limit:.4g} mV/decade",
                )
            )
    if polarity == "p":
        missing = [name for name in _LIKE_N if f"{name}_p" not in values]
        if "channel_mobility_p" not in values and "effective_current_p" not in values:
            missing.append("channel_mobility")
        found.extend(Finding("note", f"value.{name}_p", "not stated: taken like the n type") for name in missing)


def _check_solution(values: Mapping[str, Array], polarity: str, found: list[Finding]) -> None:
    suffix = "" if polarity == "n" else "_p"
    transistor, solved = _calibrated(values, polarity)
    if not bool(np.all(solved)):
        own = _polarity_values(values, polarity)
        numbers = [f"on {float(np.min(own['on_current'])):.4g} A/m", f"off {float(np.min(own['off_current'])):.4g} A/m"]
        if "effective_current" in own:
            numbers.append(f"effective {float(np.min(own['effective_current'])):.4g} A/m")
        found.append(
            Finding(
                "refuse",
                f"value.on_current{suffix}",
                f"no threshold and velocity meet the stated {polarity}-type currents together",
                found=", ".join(numbers),
                allowed="currents that the stated length, capacitance, mobility and access resistance can carry",
            )
        )
        return
    velocity = float(np.max(transistor.velocity))
    if velocity > 2.0e5:
        found.append(
            Finding(
                "warn",
                f"value.on_current{suffix}",
                "needs an injection velocity beyond what silicon shows",
                found=f"{velocity * 100.0:.3g} cm/s",
                allowed="usually below 2e7 cm/s",
            )
        )


MODEL = DeviceModel(
    name="virtual-source",
    title="Reference transistor: virtual-source model calibrated on published currents",
    inputs=(
        *STANDING_INPUTS,
        Input("unit_width"),
        Input("gate_length"),
        Input(
            "gate_length_correction",
            required=False,
            default=Default(0.0, "assumed", "no difference between gate and channel length stated"),
        ),
        Input("on_current"),
        Input("off_current"),
        Input("on_current_p", when=_OWN_PARTNER),
        Input("off_current_p", when=_OWN_PARTNER),
        Input("effective_current", required=False),
        Input("effective_current_p", required=False, when=_OWN_PARTNER),
        Input("channel_mobility", required=False),
        Input("channel_mobility_p", required=False, when=_OWN_PARTNER),
        Input("subthreshold_swing"),
        Input("subthreshold_swing_p", required=False, when=_OWN_PARTNER),
        Input("drain_barrier_lowering"),
        Input("drain_barrier_lowering_p", required=False, when=_OWN_PARTNER),
        Input("inversion_capacitance", required=False),
        Input("gate_capacitance_total", required=False),
        Input("overlap_capacitance"),
        Input(
            "terminal_capacitance_per_width",
            required=False,
            default=Default(0.0, "assumed", "no junction capacitance stated: the terminal carries its overlap only"),
        ),
        Input("access_resistance"),
        Input("saturation_exponent"),
        Input("saturation_exponent_p", required=False, when=_OWN_PARTNER),
        Input("fermi_width"),
        Input("threshold_temperature_slope"),
        Input("mobility_temperature_exponent"),
        Input("velocity_temperature_exponent"),
        Input("cell_height", required=False),
        Input("contacted_gate_pitch", required=False),
    ),
    options=(Option("partner", ("own", "mirrored"), "own"),),
    prepare=_prepare,
    switch=_switch,
    check=_check,
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
