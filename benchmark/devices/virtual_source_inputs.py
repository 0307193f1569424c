"""What the model ``virtual-source`` reads, how it is solved for its targets, and what is refused (layer 4)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Final

import numpy as np

from benchmark.devices.model import Default, Finding, Input
from benchmark.devices.record import Array, BoolArray
from benchmark.devices.standing import STANDING_INPUTS, array
from benchmark.physics import virtual_source as vs
from benchmark.physics.calibration import Targets, calibrate

__all__ = ["INPUTS", "calibrated", "findings"]

#: first guesses of solved values (they do not influence the result)
_FIRST_VELOCITY, _FIRST_MOBILITY, _FIRST_CAPACITANCE = 1.0e5, 0.02, 0.025
#: injection velocity beyond which a set is warned about [m/s]
_FASTEST: Final = 2.0e5

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


def calibrated(values: Mapping[str, Array], polarity: str) -> tuple[vs.Transistor, BoolArray]:
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


def findings(values: Mapping[str, Array], own: bool) -> list[Finding]:
    """Return what is wrong or worth saying about a set; ``own``: it has its own p type."""
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
    transistor, solved = calibrated(values, polarity)
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
    if velocity > _FASTEST:
        found.append(
            Finding(
                "warn",
                f"value.on_current{suffix}",
                "needs an injection velocity beyond what silicon shows",
                found=f"{velocity * 100.0:.3g} cm/s",
                allowed="usually below 2e7 cm/s",
            )
        )


INPUTS: Final[tuple[Input, ...]] = (
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
)
