"""Factor between ``resistance * capacitance`` and the 50 % delay: ideal step, or chain of alike stages."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike

from benchmark.devices.record import Array

__all__ = ["CHAIN_FLOOR", "STEP_FACTOR", "chain_factor"]

#: ln 2: a step-driven RC reaches half its swing after ln 2 * R * C (exact).
STEP_FACTOR = math.log(2.0)

#: Lower bound of the chain factor: an early switch fights its partner (crow-bar current) and gains no more.
#: Own simulation of chains of log-linear switches.
CHAIN_FLOOR = 0.60


def chain_factor(switching_level: ArrayLike) -> Array:
    """Return the factor F of ``F * R * C`` for a stage inside a chain of alike stages.

    The input of a stage in a chain is no step but the exponential of the stage before; the switch waits until
    that input has passed its own switching level w (the input level where R = 2 R_on at this supply)::

        F = max(0.60, ln(1 / (1 - w)))

    Parameters
    ----------
    switching_level : array_like
        w as a fraction of the supply [1]; nan: the switch does not switch, and F is nan.

    Returns
    -------
    ndarray
        F [1]; infinite at w = 1 (the level is reached only asymptotically), nan above it.

    Notes
    -----
    Valid for complementary pairs of equal switches whose actuation is fast against R C (tau/RC < 0.3) and
    whose window lies inside the swing; simulation of 20 chains puts the error of the rule at -8 to +4 %
    (-11 % for windows that fill the whole swing). No upper bound is applied: bounding w at 0.846 errs by -31
    to -41 % on full-swing windows. The step-driven stage has F = ``STEP_FACTOR`` instead.
    """
    level = np.asarray(switching_level, dtype=np.float64)
    with np.errstate(divide="ignore", invalid="ignore"):
        waited = -np.log1p(-level)
    return np.asarray(np.maximum(CHAIN_FLOOR, waited), dtype=np.float64)
