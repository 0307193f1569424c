"""Log-linear switches with soft corners: the invented devices of the chain checks."""

from __future__ import annotations

from typing import Any

import numpy as np

from benchmark.devices.record import Array, SwitchPair
from tests.factories import ohmic_pair

R_ON = 1.0e4
C_NODE = 1.0e-15
RC = R_ON * C_NODE


def soft_pair(decades: float, low: float, high: float, **fields: Any) -> SwitchPair:
    """Return a pair at 1 V with log10(R/R_on) = D - D/(w2 - w1) s [sp((w - w1)/s) - sp((w - w2)/s)].

    sp(x) = ln(1 + e^x), s = 0.01; D decades between the levels w1 and w2 of the control.
    """

    def current(control: Array, path: Array) -> Array:
        corner = 0.01
        rise = np.logaddexp(0.0, (control - low) / corner) - np.logaddexp(0.0, (control - high) / corner)
        return np.asarray(path / (R_ON * 10.0 ** (decades - decades / (high - low) * corner * rise)))

    at_supply = 1.0 / current(np.ones(1), np.ones(1))[0]  # above R_on where the upper corner is cut off
    own = {"current": current, "resistance": np.asarray(at_supply)}
    return ohmic_pair(on_resistance=R_ON, off_resistance=R_ON * 10.0**decades, **{**own, **fields})


def two_pole(ratio: float, quality: float) -> dict[str, Array]:
    """Return the fields of an actuator with w0 = pi / (2 tau), tau = ratio R C."""
    return {"natural_frequency": np.asarray(np.pi / (2.0 * ratio * RC)), "quality": np.asarray(quality)}
