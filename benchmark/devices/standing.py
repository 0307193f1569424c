"""What every device model reads besides its physics: size, endurance, thermal budget, stacking depth (layer 4)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any, Final

import numpy as np

from benchmark.devices.model import Default, DeviceModel, Input, ModelInputs
from benchmark.devices.record import Array, BoolArray, Capability, Limit, Switch, SwitchPair

__all__ = [
    "STANDING_INPUTS",
    "array",
    "beyond",
    "capabilities",
    "effective_resistance",
    "mirrored",
    "option",
    "stack_counts",
    "standing_fields",
    "supply_limits",
    "values_of",
]

#: read by every model; those that are neither required nor defaulted stay unknown when the file is silent
STANDING_INPUTS: Final[tuple[Input, ...]] = (
    Input("reference_temperature"),
    Input("declared_supply"),
    Input("footprint", required=False),
    Input("height", required=False),
    Input("bias_power", required=False, default=Default(0.0, "assumed", "no standing bias stated")),
    Input("retention_time", required=False),
    Input("endurance_cycles", required=False),
    Input("process_temperature", required=False),
    Input("supply_ceiling", required=False),
    Input(
        "series_switches_max",
        required=False,
        default=Default(4.0, "assumed", "four in series: common practice, no source"),
    ),
)

_CAPABILITIES: Final[dict[str, str]] = {"endurance_cycles": "1", "process_temperature": "K"}


def array(value: Any) -> Array:
    """Return ``value`` as float64."""
    return np.asarray(value, dtype=np.float64)


def values_of(model: DeviceModel, inputs: ModelInputs) -> dict[str, Array]:
    """Return the stated values plus the model's declared defaults for those that are absent and apply."""
    found = {name: array(value) for name, value in inputs.values.items()}
    for item in model.inputs:
        applies = item.when is None or inputs.options.get(item.when[0], _default(model, item.when[0])) in item.when[1]
        if item.name not in found and item.default is not None and applies:
            found[item.name] = array(item.default.value)
    return found


def _default(model: DeviceModel, option: str) -> str:
    return next(item.default for item in model.options if item.name == option)


def option(model: DeviceModel, inputs: ModelInputs, name: str) -> str:
    """Return the chosen value of an option, or its declared default."""
    return inputs.options.get(name, _default(model, name))


def standing_fields(values: Mapping[str, Array]) -> dict[str, Any]:
    """Return the fields of `Switch` that do not depend on supply or temperature; not stated is nan."""
    unknown = array(np.nan)
    return {
        "area": values.get("footprint", unknown),
        "height": values.get("height", unknown),
        "bias_power": values["bias_power"],
        "retention": values.get("retention_time", unknown),
        "natural_frequency": unknown,
        "quality": unknown,
        "capabilities": capabilities(values),
    }


def capabilities(values: Mapping[str, Array]) -> dict[str, Capability]:
    """Return the capabilities that are stated; an absent one is unknown, which is no pass."""
    return {name: Capability(values[name], unit, "", name) for name, unit in _CAPABILITIES.items() if name in values}


def supply_limits(values: Mapping[str, Array], supply: Array) -> tuple[Limit, ...]:
    """Return the hard limit on the supply, when a ceiling is stated."""
    if "supply_ceiling" not in values:
        return ()
    return (Limit("supply", supply, values["supply_ceiling"], "V", "hard", "supply_ceiling"),)


def stack_counts(values: Mapping[str, Array]) -> Array:
    """Return k = 1..k_max; with spread k_max the smallest one holds for all."""
    return np.arange(1.0, float(np.min(values["series_switches_max"])) + 0.5)


def effective_resistance(supply: Array, high: Array, low: Array) -> Array:
    """Return R of a current source, V / (2 ln 2 I_eff), so that ln 2 R C is the time of its 50 % step.

    I_eff is the mean of I(V, V/2) (``high``) and I(V/2, V) (``low``) [A]: M. H. Na, E. J. Nowak, W. Haensch and J. Cai,
    "The effective drive current in CMOS inverters", IEDM 2002 (from memory).
    """
    return np.asarray(supply / (np.log(2.0) * (high + low)), dtype=np.float64)


def mirrored(down: Switch, supply: Array, temperature: Array) -> SwitchPair:
    """Return the pair whose pull-up switch equals its pull-down switch, seen from the supply rail."""
    return SwitchPair(down=down, up=replace(down, polarity="up"), supply=supply, temperature=temperature)


def beyond(reasons: Mapping[str, BoolArray]) -> dict[str, BoolArray]:
    """Return the reasons that apply anywhere."""
    return {reason: mask for reason, mask in reasons.items() if bool(np.any(mask))}
