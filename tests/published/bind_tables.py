"""Check rows of the blend of a steep switch, of table interpolation and of the fundamental limits."""

from __future__ import annotations

import numpy as np

from benchmark.constants import BOLTZMANN
from benchmark.physics import interpolation, limits, regeneration, steep_swing
from tests.published.rows import Binding

BLEND = "benchmark.physics.steep_swing:"
LIMITS = "benchmark.physics.limits:"
VOLTS = [0.0, 0.1, 0.2, 0.3, 0.4, 0.5]
DECADES = [-9.0, -7.5, -6.0, -5.0, -4.6, -4.5]


def _table(volts: float) -> float:
    return float(np.log10(interpolation.interpolate(VOLTS, 10.0 ** np.array(DECADES), "log", volts)))


BINDINGS = [
    Binding("dev.G1-Vmin", (BLEND + "minimum_supply",), lambda: steep_swing.minimum_supply(0.05953, 1e4)),
    Binding(
        "dev.G1-gain",
        ("benchmark.physics.regeneration:log_linear_gain",),
        lambda: regeneration.log_linear_gain(1e4, 1.0),
    ),
    *(
        Binding(
            f"dev.{row}",
            (BLEND + "blend_current",),
            lambda volts=volts: steep_swing.blend_current(volts, 0.030, 1e-4, 1e-9),
        )
        for row, volts in (("G1-generic", 0.05), ("G1-generic.2", 0.1))
    ),
    *(
        Binding(
            f"dev.G2-pchip.{number}",
            ("benchmark.physics.interpolation:interpolate",),
            lambda volts=volts: _table(volts),
        )
        for number, volts in ((2, 0.15), (3, 0.25), (5, 0.45))
    ),
    Binding("dev.L1-Landauer", (LIMITS + "landauer_energy",), lambda: limits.landauer_energy(300.0)),
    Binding("dev.L2-sigma", (LIMITS + "thermal_noise_voltage",), lambda: limits.thermal_noise_voltage(10e-18, 300.0)),
    Binding("dev.L2-Pe", (LIMITS + "error_probability",), lambda: limits.error_probability(10e-18, 0.3, 300.0)),
    *(
        Binding(
            f"dev.L2-CV2{suffix}",
            (LIMITS + "switching_energy_for_error",),
            lambda chance=chance: limits.switching_energy_for_error(chance, 300.0),
        )
        for suffix, chance in (("", 1e-9), (".2", 1e-15), (".3", 1e-24))
    ),
    *(
        Binding(
            f"dev.L2-CV2-kT{suffix}",
            (LIMITS + "switching_energy_for_error",),
            lambda chance=chance: limits.switching_energy_for_error(chance, 300.0) / (BOLTZMANN * 300.0),
        )
        for suffix, chance in (("", 1e-9), (".2", 1e-15), (".3", 1e-24))
    ),
    Binding("dev.L3-sound", (LIMITS + "sound_transit_time",), lambda: limits.sound_transit_time(100e-9, 3851.0)),
    Binding("dev.L4-light", (LIMITS + "light_transit_time",), lambda: limits.light_transit_time(1e-3, 2.7)),
    Binding("dev.L5-ML", (LIMITS + "margolus_levitin_time",), lambda: limits.margolus_levitin_time(1e-18)),
    Binding("dev.L5-Heis", (LIMITS + "heisenberg_time",), lambda: limits.heisenberg_time(1e-18)),
]
