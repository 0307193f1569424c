"""Check rows of level restoration, thermal noise, the chain factor and the transient of chains."""

from __future__ import annotations

import numpy as np

from benchmark.circuits import chain_rule, functional, transfer
from benchmark.devices.record import Array
from benchmark.physics import noise, regeneration
from tests.factories import ohmic_pair
from tests.published.rows import Binding

NOISE = "benchmark.physics.noise:"
REGENERATION = "benchmark.physics.regeneration:"
TEN_YEARS = 10.0 * 365.25 * 86400.0


def _noise_need() -> float:
    frequency = noise.pole_frequency(1.0e4, 0.1e-15)
    return float(noise.threshold_for_rate(1.0 / (1.0e9 * TEN_YEARS), frequency))


# The tolerance of NOISE-rate and NOISE-Q is larger than the number itself: tests/unit/test_noise.py holds them.
_NOISE_ROWS = [
    Binding("cir.NOISE-need", (NOISE + "threshold_for_rate", NOISE + "pole_frequency"), _noise_need),
]


def _log_linear(ratio: float) -> list[float]:
    pair = ohmic_pair(on_resistance=1e4, off_resistance=1e4 * ratio, window=(0.0, 1.0))
    curve = transfer.transfer_curve(pair, points=401)
    low, high = regeneration.log_linear_levels(ratio)
    margin = functional.functional(pair, 1, "accurate").noise_margin
    square = transfer.largest_square(curve.v_in, curve.v_out)
    return [float(x) for x in (regeneration.log_linear_gain(ratio), low, high, margin, square)]


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

BINDINGS: list[Binding] = [*_NOISE_ROWS, *_REGENERATION_ROWS, *_CHAIN_RULE_ROWS]
