"""What to measure next, how well, and when to stop (layer 7).

A measurement with a standard error of r prior standard deviations leaves the mean of what is known spread by the share
rho = 1 / sqrt(1 + r^2) of the prior (normal prior and error, in the scale in which the spread is normal). The value of
that imperfect information is E[max(0, mu + g(z))] - max(0, mu) with g the conditional mean whose Hermite coefficients
are multiplied by rho^k (Mehler's formula); r = 0 is perfect information. Values are in ln(advantage), see
``uncertainty.py``. A spread that is not normal is taken by the normal score of its quantiles.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.draw_block import basis_of
from benchmark.decide.uncertainty import InputShare, Uncertainty
from benchmark.draws.bases import QUADRATURE, hermite, hermite_coefficients

__all__ = ["NEGLIGIBLE", "Measurement", "imperfect_worth", "next_measurements", "nothing_to_measure"]

Array = NDArray[np.float64]
#: a value below this does not matter: a tenth of a per cent of the advantage
NEGLIGIBLE = 1.0e-3


@dataclass(frozen=True)
class Measurement:
    """One possible measurement.

    ``worth``: of knowing the input perfectly, with its error. ``worth_halved``: of a measurement whose error is half
    the prior spread. ``enough``: standard error, in prior standard deviations, below which knowing it better is worth
    nothing more; nan when the input is worth nothing as it is.
    """

    key: str
    worth: float
    error: float
    worth_halved: float
    enough: float


def imperfect_worth(mean: float, share: InputShare, ratio: float) -> float:
    """Return the value of measuring one input with a standard error of ``ratio`` prior standard deviations.

    Parameters
    ----------
    mean : float
        Mean net benefit, ln(advantage / M).
    share : InputShare
    ratio : float
        0: perfect information.
    """
    coefficients = share.coefficients
    if share.shape not in ("normal", "lognormal"):
        degree = coefficients.size

        def conditional(u: Array) -> Array:
            return np.asarray(coefficients @ basis_of(share.shape, u)[1 : degree + 1])

        coefficients = hermite_coefficients(conditional)[1:]
    rho = 1.0 / np.sqrt(1.0 + ratio**2)
    orders = np.arange(1, coefficients.size + 1)
    basis = hermite(QUADRATURE)[1 : coefficients.size + 1]
    shifted = mean + (coefficients * rho**orders) @ (basis - basis.mean(axis=1, keepdims=True))
    return max(float(np.maximum(shifted, 0.0).mean() - max(mean, 0.0)), 0.0)


def next_measurements(found: Uncertainty, required: float) -> list[Measurement]:
    """Return every drawn input, the most worth measuring first.

    Parameters
    ----------
    found : Uncertainty
    required : float
        Required advantage M.
    """
    mean = found.mean_log.value - float(np.log(required))
    listed = [_measurement(mean, share) for share in found.shares]
    return sorted(listed, key=lambda item: (-item.worth, item.key))


def _measurement(mean: float, share: InputShare) -> Measurement:
    if not share.coefficients.any() or share.worth.value <= 0.0:
        return Measurement(share.key, share.worth.value, share.worth.error, 0.0, float("nan"))
    perfect = imperfect_worth(mean, share, 0.0)
    return Measurement(
        share.key,
        share.worth.value,
        share.worth.error,
        imperfect_worth(mean, share, 0.5),
        _enough(mean, share, perfect),
    )


def _enough(mean: float, share: InputShare, perfect: float) -> float:
    """Largest error ratio at which all but a negligible part of the worth is had, by bisection: the worth falls."""
    if perfect < NEGLIGIBLE:
        return float("nan")
    low, high = 0.0, 1.0e3
    for _ in range(60):
        middle = 0.5 * (low + high)
        if perfect - imperfect_worth(mean, share, middle) < NEGLIGIBLE:
            low = middle
        else:
            high = middle
    return low


def nothing_to_measure(found: Uncertainty) -> bool:
    """Tell whether knowing all drawn inputs perfectly would be worth nothing, within twice its sampling error."""
    return found.worth_of_all.value + 2.0 * found.worth_of_all.error < NEGLIGIBLE


def worth_per_cost(measurements: Sequence[Measurement], costs: dict[str, float]) -> list[tuple[str, float]]:
    """Return key and worth per cost of those with a cost, best first."""
    rated = [(item.key, item.worth / costs[item.key]) for item in measurements if item.key in costs]
    return sorted(rated, key=lambda pair: (-pair[1], pair[0]))
