"""What to measure next, how well, and when to stop (layer 7).

A measurement with a standard error of r prior standard deviations leaves the mean of what is known spread by the share
rho = 1 / sqrt(1 + r^2) of the prior (normal prior and error, in the scale in which the spread is normal). The value of
that imperfect information is E[max(0, mu + g(z))] - max(0, mu) with g the conditional mean whose Hermite coefficients
are multiplied by rho^k (Mehler's formula); r = 0 is perfect information. Values are in ln(advantage), see
``uncertainty.py``. A spread that is not normal is taken by the normal score of its quantiles.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.draw_block import basis_of
from benchmark.decide.uncertainty import InputShare, Uncertainty
from benchmark.draws.bases import QUADRATURE, hermite, hermite_coefficients
from benchmark.draws.values import value_at
from benchmark.sets.study import PossibleMeasurement
from benchmark.sets.values import Value

__all__ = ["NEGLIGIBLE", "Measurement", "imperfect_worth", "next_measurements", "nothing_to_measure", "relative_spread"]

Array = NDArray[np.float64]
#: a value below this does not matter: a tenth of a per cent of the advantage
NEGLIGIBLE = 1.0e-3


@dataclass(frozen=True)
class Measurement:
    """One possible measurement.

    ``worth``: of knowing the input perfectly, with its error. ``worth_halved``: of a measurement whose error is half
    the prior spread. ``enough``: standard error, in prior standard deviations, below which knowing it better is worth
    nothing more; nan when the input is worth nothing as it is. ``worth_reachable``: of the measurement that a study
    says could be made, ``cost`` in its unit; nan where it says none.
    """

    key: str
    worth: float
    error: float
    worth_halved: float
    enough: float
    cost: float = float("nan")
    worth_reachable: float = float("nan")

    @property
    def worth_per_cost(self) -> float:
        """Worth of the measurement that could be made, over its cost."""
        return self.worth_reachable / self.cost


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


def next_measurements(
    found: Uncertainty, required: float, possible: Sequence[PossibleMeasurement], values: Mapping[str, Value]
) -> list[Measurement]:
    """Return every drawn input, the most worth measuring first.

    Parameters
    ----------
    found : Uncertainty
    required : float
        Required advantage M.
    possible : sequence of PossibleMeasurement
        What the study says could be measured: those come first, by worth per cost.
    values : mapping
        Ledger key -> value with its present spread.
    """
    mean = found.mean_log.value - float(np.log(required))
    offered = {item.key: item for item in possible}
    listed = [_measurement(mean, share) for share in found.shares]
    listed = [
        _offered(mean, share, item, offered.get(share.key), values)
        for share, item in zip(found.shares, listed, strict=True)
    ]
    return sorted(listed, key=_order)


def _order(item: Measurement) -> tuple[bool, float, str]:
    stated = not np.isnan(item.cost)
    return not stated, -(item.worth_per_cost if stated else item.worth), item.key


def _offered(
    mean: float, share: InputShare, item: Measurement, offer: PossibleMeasurement | None, values: Mapping[str, Value]
) -> Measurement:
    """Add what the measurement that could be made is worth."""
    if offer is None:
        return item
    ratio = offer.reachable / relative_spread(values[share.key])
    worth = imperfect_worth(mean, share, ratio) if share.coefficients.any() else 0.0
    return dataclasses.replace(item, cost=offer.cost, worth_reachable=worth)


def relative_spread(value: Value) -> float:
    """Return the present standard deviation of a value over the value: half of what the middle 68 % span."""
    if value.spread is not None and value.spread.shape in ("normal", "lognormal") and value.spread.scale is not None:
        scale = float(value.spread.scale[0])
        return scale if value.spread.shape == "lognormal" else scale / abs(float(value.si[0]))
    if value.spread is not None and value.spread.shape == "samples":
        return float(value.spread.high[0] - value.spread.low[0]) / (2.0 * abs(float(value.si[0])))
    low, high = value_at(value, np.array([0.15865525393145707, 0.8413447460685429]))
    return float(high - low) / (2.0 * abs(float(value.si[0])))


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
