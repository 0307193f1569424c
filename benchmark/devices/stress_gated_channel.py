"""Channel of the stress-gated switch: one resistance law at one temperature (layer 4)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from benchmark.devices.record import Array, BoolArray
from benchmark.physics import pressure_resistance as law

__all__ = ["Channel", "channel_at", "prepare_channel"]


@dataclass(frozen=True)
class Channel:
    """Resistance against pressure with the contacts in series, at fixed temperature.

    ``parameters``: arguments of the law by name; ``contact`` [ohm]; ``outside``: reason -> mask.
    """

    kind: str
    parameters: Mapping[str, Array]
    contact: Array
    outside: Mapping[str, BoolArray] = field(default_factory=dict)

    def resistance(self, pressure: Array) -> Array:
        """Return channel and contacts [ohm] at a pressure [Pa]."""
        p = self.parameters
        if self.kind == "log-slope":
            with np.errstate(divide="ignore", invalid="ignore"):  # masked: floor above the unstressed resistance
                own = law.log_slope_resistance(
                    pressure, p["unstressed"], p["floor"], p["onset"], p["saturation"], p["width"]
                )
        elif self.kind == "activated":
            energy = law.activation_energy(pressure, p["energy"], p["fall"], p["width"])
            own = law.activated_resistance(
                energy, p["temperature"], p["prefactor"], p["metallic"], p["leakage_conductance"]
            )
        else:
            own = law.exponential_resistance(pressure, p["unstressed"], p["slope"])
        return np.asarray(own + self.contact)

    def widened(self) -> Channel:
        """Return the same channel with one trailing axis on every parameter, for pressures that have one."""
        parameters = {name: value[..., None] for name, value in self.parameters.items()}
        return replace(self, parameters=parameters, contact=self.contact[..., None])


def prepare_channel(values: Mapping[str, Array], pressure_law: str, mechanics: str) -> dict[str, object]:
    """Return what `channel_at` needs: the law, its values by catalogue name, and the contact resistance."""
    contact = np.asarray(0.0)
    if mechanics == "force-balance":
        contact = law.contact_resistance(values["contact_resistivity"], values["channel_area"])
    return {"law": pressure_law, "values": values, "contact": contact}


def channel_at(prepared: Mapping[str, object], temperature: Array) -> Channel:
    """Return the channel at a temperature [K]."""
    v: Mapping[str, Array] = prepared["values"]  # type: ignore[assignment]
    contact: Array = prepared["contact"]  # type: ignore[assignment]
    make = {"log-slope": _log_slope, "activated": _activated, "exponential": _exponential}[str(prepared["law"])]
    parameters, outside = make(v, temperature)
    return Channel(str(prepared["law"]), parameters, contact, outside)


_Law = tuple[dict[str, Array], dict[str, BoolArray]]


def _log_slope(v: Mapping[str, Array], temperature: Array) -> _Law:
    """Ceiling activated, floor constant, the pressure of the floor fixed at its reference-temperature value."""
    floor, onset = v["resistance_floor"], v["onset_pressure"]
    saturation = law.floor_pressure(v["resistance_unstressed"], floor, onset, v["resistance_slope"])
    unstressed = law.arrhenius_resistance(
        v["resistance_unstressed"], v["unstressed_activation_energy"], temperature, v["reference_temperature"]
    )
    parameters = {
        "unstressed": unstressed,
        "floor": floor,
        "onset": onset,
        "saturation": saturation,
        "width": v["corner_width"],
    }
    mask = np.asarray((floor >= unstressed) | (floor >= v["resistance_unstressed"]))
    return parameters, {"the resistance floor is not below the unstressed resistance at this temperature": mask}


def _activated(v: Mapping[str, Array], temperature: Array) -> _Law:
    rise = temperature - v["reference_temperature"]
    metallic = np.asarray(v["metallic_resistance"] * (1.0 + v["metallic_temperature_coefficient"] * rise))
    parameters = {
        "energy": v["unstressed_activation_energy"],
        "fall": v["activation_energy_slope"],
        "width": v["activation_corner_width"],
        "temperature": temperature,
        "prefactor": v["resistance_prefactor"],
        "metallic": metallic,
        "leakage_conductance": v["parallel_leakage_conductance"],
    }
    return parameters, {
        "the linear temperature law makes the metallic resistance negative": np.asarray(metallic <= 0.0)
    }


def _exponential(v: Mapping[str, Array], temperature: Array) -> _Law:
    return {"unstressed": v["resistance_unstressed"], "slope": v["resistance_slope"]}, {}
