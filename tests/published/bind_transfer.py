"""Check rows of level restoration, thermal noise, the chain factor and the transient of chains."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from benchmark.circuits import chain_rule, functional, integral, transfer, transient
from benchmark.devices.record import Array
from benchmark.physics import drive, limits, noise, regeneration, two_pole, virtual_source
from tests.factories import ohmic_pair
from tests.published.rows import Binding
from tests.soft_window import C_NODE, RC, soft_pair
from tests.soft_window import two_pole as two_pole_fields

NOISE = "benchmark.physics.noise:"
REGENERATION = "benchmark.physics.regeneration:"
TEN_YEARS = 10.0 * 365.25 * 86400.0


def _noise_need() -> float:
    frequency = noise.pole_frequency(1.0e4, 0.1e-15)
    return float(noise.threshold_for_rate(1.0 / (1.0e9 * TEN_YEARS), frequency))


# The tolerance of NOISE-rate and NOISE-Q is larger than the number itself: tests/unit/test_noise.py holds them.
_NOISE_ROWS = [
    Binding(
        "cir.NOISE-Un",
        ("benchmark.physics.limits:thermal_noise_voltage",),
        lambda: 1e3 * limits.thermal_noise_voltage(0.1e-15, 300.0),
    ),
    Binding("cir.NOISE-need", (NOISE + "threshold_for_rate", NOISE + "pole_frequency"), _noise_need),
]


def _log_linear(ratio: float) -> list[float]:
    pair = ohmic_pair(on_resistance=1e4, off_resistance=1e4 * ratio, window=(0.0, 1.0))
    curve = transfer.transfer_curve(pair, points=401)
    low, high = regeneration.log_linear_levels(ratio)
    margin = functional.functional(pair, 1, "accurate").noise_margin
    square = transfer.largest_square(curve.v_in, curve.v_out)
    return [float(x) for x in (regeneration.log_linear_gain(ratio), low, high, margin, square)]


def _divider(ratio: float) -> list[float]:
    """Ends of the transfer curve: inputs at the rails."""
    curve = transfer.transfer_curve(ohmic_pair(on_resistance=1e4, off_resistance=1e4 * ratio), points=3)
    return [float(curve.v_out[-1]), float(curve.v_out[0])]


def _square_law(supply: float, threshold: float) -> list[float]:
    """Unity-gain inputs of a pair of long-channel square-law switches; 1e-12 of conductance keeps them defined."""

    def current(control: Array, path: Array) -> Array:
        over = np.maximum(control - threshold, 0.0)
        inside = np.minimum(path, over)
        return np.asarray((over - 0.5 * inside) * inside + 1e-12 * path)

    pair = ohmic_pair(supply=supply, current=current)
    found = functional.functional(pair, 1, "accurate")
    return [float(found.v_il), float(found.v_ih)]


def _piecewise(gain: float) -> float:
    half = 0.5 / gain
    return float(transfer.largest_square([0.0, 0.5 - half, 0.5 + half, 1.0], [1.0, 1.0, 0.0, 0.0]))


_REGENERATION_ROWS = [
    *(
        Binding(
            f"cir.RINV-{name}",
            (
                REGENERATION + "log_linear_gain",
                REGENERATION + "log_linear_levels",
                "benchmark.circuits.functional:corner",
                "benchmark.circuits.transfer:largest_square",
            ),
            lambda ratio=ratio: _log_linear(ratio),
        )
        for name, ratio in (("10", 10.0), ("100", 100.0), ("1000", 1e3), ("10000", 1e4), ("1e+06", 1e6))
    ),
    Binding("cir.VTC-SYM", ("benchmark.circuits.functional:corner",), lambda: _square_law(5.0, 0.74)),
    *(
        Binding(
            f"cir.SNM-PWL-{gain}",
            ("benchmark.circuits.transfer:largest_square",),
            lambda gain=gain: _piecewise(float(gain)),
        )
        for gain in ("1.5", "5")
    ),
    Binding(
        "cir.RINV-min",
        (REGENERATION + "log_linear_minimum_ratio",),
        lambda: regeneration.log_linear_minimum_ratio(),
    ),
    *(
        Binding(
            f"cir.RDIV-{ratio}",
            ("benchmark.circuits.transfer:transfer_curve",),
            lambda ratio=ratio: _divider(float(ratio)),
        )
        for ratio in (10, 10000)
    ),
    *(
        Binding(
            f"cir.RLOAD-{ratio}",
            (REGENERATION + "resistor_load_levels",),
            lambda ratio=ratio: regeneration.resistor_load_levels(float(ratio)),
        )
        for ratio in (10, 100, 10000)
    ),
    *(
        Binding(
            f"cir.RATIO-FI{inputs}-e{loss}",
            (REGENERATION + "ratio_for_fan_in",),
            lambda inputs=inputs, loss=loss: regeneration.ratio_for_fan_in(inputs, loss),
        )
        for inputs in (2, 4)
        for loss in (0.1, 0.05)
    ),
    Binding(
        "cir.FANOUT-RTL",
        (REGENERATION + "loaded_high_level",),
        lambda: regeneration.loaded_high_level(5.0, 1e3, 1e4, 0.8, 5.0),
    ),
    *(
        Binding(
            f"cir.VMIN-n{n}",
            (REGENERATION + "subthreshold_minimum_supply",),
            lambda n=n: 1e3 * regeneration.subthreshold_minimum_supply(n, 300.0),
        )
        for n in (1.0, 1.5)
    ),
]

#: switching levels w* printed in the rows of the chain rule, by row number
_SWITCHING_LEVELS = {
    1: 0.8495,
    2: 0.9247,
    3: 0.9499,
    4: 0.9626,
    5: 0.7097,
    6: 0.755,
    8: 0.7785,
    9: 0.605,
    10: 0.6285,
    14: 0.4704,
    15: 0.4814,
    16: 0.4875,
    17: 0.8398,
    18: 0.8704,
    19: 0.8814,
    20: 0.8875,
}

_CHAIN_RULE_ROWS = [
    Binding(
        "dev.C2-wrule" + (f".{number}" if number > 1 else ""),
        ("benchmark.circuits.chain_rule:chain_factor",),
        lambda level=level: chain_rule.chain_factor(level),
    )
    for number, level in _SWITCHING_LEVELS.items()
]

NODE = transient.ChainLoad(C_NODE)

_WINDOWS = {"A": (0.0, 1.0), "B": (0.2, 0.8), "C": (0.35, 0.65), "D": (0.1, 0.5), "E": (0.5, 0.9)}
#: decades and window of the rows of the chain in transport, by row number
_CHAINS = {
    3: ("A", 6),
    5: ("B", 2),
    6: ("B", 4),
    8: ("B", 8),
    9: ("C", 2),
    10: ("C", 4),
    13: ("D", 2),
    15: ("D", 6),
    16: ("D", 8),
    17: ("E", 2),
    19: ("E", 6),
    20: ("E", 8),
}


def _chain(window: str, decades: float) -> float:
    """Stage delay minus the transport of one R C, in R C."""
    pair = soft_pair(decades, *_WINDOWS[window], closing_time=RC, opening_time=RC)
    return transient.chain_transient(pair, NODE).delay / RC - 1.0


def _integral(quality: float, ratio: float, decades: float) -> float:
    """Step-driven delay in R C with a two-pole actuator of w0 = pi/(2 tau), tau = ratio R C, window 0.35..0.65."""
    pair = soft_pair(decades, 0.35, 0.65, **two_pole_fields(ratio, quality))
    return float(integral.integral_delay(pair.down, pair.supply, np.asarray(C_NODE), drive="step")) / RC


def _transistor(threshold: float, velocity: float, mobility: float) -> virtual_source.Transistor:
    """32-nm targets, own calibration, 1 um wide."""
    return virtual_source.Transistor(
        width=1e-6,
        length=23e-9,
        inversion_capacitance=2.57e-2,
        source_resistance=75e-6,
        drain_resistance=75e-6,
        velocity=velocity,
        mobility=mobility,
        threshold=threshold,
        slope_factor=1.4,
        barrier_lowering=0.12,
        fermi_width=3.5,
        saturation_exponent=1.8,
        thermal_voltage=virtual_source.thermal_voltage(300.0),
    )


def _transistor_chain(supply: float) -> float:
    """Delay of a chain of equally wide n and p transistors with 3 fF at every node [s]."""

    def fields(t: virtual_source.Transistor) -> dict[str, Any]:
        high = virtual_source.drain_current(t, np.asarray(supply), np.asarray(0.5 * supply))
        low = virtual_source.drain_current(t, np.asarray(0.5 * supply), np.asarray(supply))
        effective = drive.effective_current(high, low)
        return {
            "current": lambda control, path: virtual_source.drain_current(t, control, path),
            "resistance": np.asarray(supply / (2.0 * math.log(2.0) * effective)),
        }

    pair = ohmic_pair(
        supply=supply,
        **fields(_transistor(0.45338, 9.7726e4, 0.0200)),
        up=fields(_transistor(0.43609, 6.1852e4, 0.0165)),
    )
    return transient.chain_transient(pair, transient.ChainLoad(3e-15)).delay


_TRANSIENT_ROWS = [
    *(
        Binding(
            f"dev.C1-chain.{number}",
            ("benchmark.circuits.transient:chain_transient",),
            lambda window=window, decades=decades: _chain(window, decades),
        )
        for number, (window, decades) in _CHAINS.items()
    ),
    *(
        Binding(
            "dev.C5-integral" + suffix,
            ("benchmark.circuits.integral:integral_delay",),
            lambda quality=quality, ratio=ratio, decades=decades: _integral(quality, ratio, decades),
        )
        for suffix, quality, ratio, decades in (
            ("", 0.5, 10, 4),
            (".2", 1, 10, 4),
            (".3", 3, 10, 4),
            (".4", 10, 100, 6),
        )
    ),
    *(
        Binding(
            "dev.C3-mech" + suffix,
            ("benchmark.physics.two_pole:time_to_level",),
            lambda quality=quality: two_pole.time_to_level(0.6, 0.5 * math.pi, quality),
        )
        for suffix, quality in (("", 0.5), (".3", 3.0), (".4", 10.0))
    ),
    *(
        Binding(
            "dev.M3-delay" + suffix,
            ("benchmark.circuits.transient:chain_transient",),
            lambda supply=supply: _transistor_chain(supply),
        )
        for suffix, supply in (("", 1.0), (".3", 0.8), (".5", 0.6), (".7", 0.5))
    ),
]

BINDINGS: list[Binding] = [*_NOISE_ROWS, *_REGENERATION_ROWS, *_CHAIN_RULE_ROWS, *_TRANSIENT_ROWS]
