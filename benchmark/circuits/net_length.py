"""Average net of a block from its size and Rent's exponent, in gate pitches (layer 5).

Which convention is used moves the length by a factor of two, so the circuit says it in its assumptions: mean of the
discrete distribution of Davis, De and Meindl (exact count of pairs on a square array), times fan_out x 4/(fan_out + 3)
from point-to-point wires to whole nets. Rent's coefficient cancels in the mean, so it is not asked for.
"""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np

from benchmark.circuits.built_in import Scenario, first
from benchmark.devices.record import Array
from benchmark.errors import UsageError
from benchmark.physics import wire_lengths

__all__ = ["FEWEST_GATES", "average_net_pitches", "length_convention", "mean_wire"]

FEWEST_GATES = 4


@lru_cache(maxsize=4096)
def _on_square(side: int, exponent: float) -> float:
    return wire_lengths.davis_discrete(side * side, exponent, 1.0, 1.0)[1]


def mean_wire(gates: float, exponent: float) -> float:
    """Return the mean point-to-point wire [gate pitches] of ``gates`` places and Rent's ``exponent``.

    ``wire_lengths.davis_discrete``; between square numbers straight in the side of the array.

    Raises
    ------
    UsageError
        Fewer than 4 gates, or an exponent outside 0 to 1.
    """
    if gates < FEWEST_GATES:
        message = f"gate_count must be at least {FEWEST_GATES} for a net length from rent_exponent, not {gates:g}"
        raise UsageError(message)
    side = math.sqrt(gates)
    low = math.floor(side)
    share = side - low
    below = _on_square(low, exponent)
    return below if share == 0.0 else below + share * (_on_square(low + 1, exponent) - below)


def average_net_pitches(scenario: Scenario) -> Array:
    """Return the length of an average net [gate pitches] from gate_count, rent_exponent and fan_out.

    One evaluation per distinct pair of size and exponent.
    """
    gates, exponent, fan_out = np.broadcast_arrays(
        *(np.asarray(scenario[name], dtype=np.float64) for name in ("gate_count", "rent_exponent", "fan_out"))
    )
    pairs, where = np.unique(np.stack([gates.ravel(), exponent.ravel()]), axis=1, return_inverse=True)
    means = np.array([mean_wire(float(n), float(p)) for n, p in pairs.T])
    return np.asarray(wire_lengths.net_length(means[where.reshape(gates.shape)], fan_out))


def length_convention(scenario: Scenario) -> str:
    """Return the sentence that says how the length was found, with what other conventions would give."""
    gates, exponent, fan_out = (first(scenario[name]) for name in ("gate_count", "rent_exponent", "fan_out"))
    discrete = mean_wire(gates, exponent)
    others = []
    if exponent != 0.5:  # both closed forms are singular there
        continuous = wire_lengths.davis_continuous(gates, exponent, 1.0, fan_out)[1]
        others = [
            f"{continuous:.3g} by the continuous form",
            f"{wire_lengths.donath_mean_length(gates, exponent):.3g} by hierarchical placement (Donath 1979)",
        ]
    beside = f"; {' and '.join(others)}" if others else ""
    return (
        f"Net length from Rent's exponent {exponent:g} and {gates:g} gates on a square array: mean wire {discrete:.4g} "
        f"gate pitches by the discrete distribution of Davis, De and Meindl 1998 (from memory){beside}. A net of "
        f"fan-out {fan_out:g} is fan_out x 4/(fan_out + 3) as long, "
        f"{wire_lengths.net_length(discrete, fan_out):.4g} gate pitches."
    )
