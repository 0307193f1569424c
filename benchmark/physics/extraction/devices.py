"""One number over many devices: median, quartiles and spread, apart from the error of measurement (layer 3)."""

from __future__ import annotations

import functools
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from scipy import stats

from benchmark.physics.extraction.result import (
    READING,
    SETTING,
    Bound,
    CannotExtract,
    Extracted,
    Part,
    combined,
)

__all__ = ["OverDevices", "median_scatter", "over_devices", "quartile_distance"]

#: parts of an uncertainty that move all devices alike
COMMON = (READING, SETTING)


@dataclass(frozen=True)
class OverDevices:
    """What many devices say about one number, SI.

    ``median``, and ``median_bound`` where it rests on bounds. ``lower_quartile`` and ``upper_quartile``: None where
    they rest on bounds. ``seen_spread``: distance of the quartiles over what it is on average for as many draws from a
    normal distribution (``quartile_distance``). ``measured``: root mean square of what makes the numbers of single
    devices uncertain one by one (scatter and spacing of points). ``device_spread``: what is left of the spread without
    it, the root of the difference of squares; None where the measurement explains all of it. ``common``: root mean
    square of the stated accuracies of reading and setting, which move all devices alike. ``median_error``: standard
    error of a median of so many (``median_scatter``) times the spread seen, or times ``measured`` where that is larger,
    together with the common part. ``count`` devices, ``bounds`` of them known only by a bound.
    """

    median: float
    median_bound: Bound
    lower_quartile: float | None
    upper_quartile: float | None
    seen_spread: float | None
    measured: float
    common: float
    device_spread: float | None
    median_error: float | None
    count: int
    bounds: int


def over_devices(found: Sequence[Extracted]) -> OverDevices:
    """Sum up one number of many devices.

    Parameters
    ----------
    found : sequence of Extracted
        The number of each device.

    Returns
    -------
    OverDevices
        Quantiles by linear interpolation between ordered numbers (R. J. Hyndman and Y. Fan, The American Statistician
        50, 361 (1996), definition 7; from memory). A bound counts as anywhere on its side: a quantile that this cannot
        move is a number, else a bound.

    Raises
    ------
    CannotExtract
        Fewer than two devices; or the bounds leave the median open on both sides.
    """
    if len(found) < 2:
        what = "a median over devices needs more than one"
        raise CannotExtract(what, str(len(found)), "2 or more")
    values = np.array([one.value for one in found])
    below = np.array([one.bound == "at-most" for one in found])
    above = np.array([one.bound == "at-least" for one in found])
    median, bound = _quantile(values, below, above, 0.5)
    quartiles = [_quantile(values, below, above, share, refuse=False) for share in (0.25, 0.75)]
    lower, upper = (None if one_bound or math.isnan(one) else one for one, one_bound in quartiles)
    seen = None if lower is None or upper is None else (upper - lower) / quartile_distance(len(found))
    measured = _typical(found, lambda part: part.name not in COMMON)
    common = _typical(found, lambda part: part.name in COMMON)
    left = None if seen is None or seen <= measured else math.sqrt(seen**2 - measured**2)
    return OverDevices(
        median=median,
        median_bound=bound,
        lower_quartile=lower,
        upper_quartile=upper,
        seen_spread=seen,
        measured=measured,
        common=common,
        device_spread=left,
        median_error=(
            None if seen is None or bound else math.hypot(median_scatter(len(found)) * max(seen, measured), common)
        ),
        count=len(found),
        bounds=int(np.sum(below | above)),
    )


@functools.cache
def quartile_distance(count: int) -> float:
    """Return the mean distance of the quartiles of ``count`` draws from a normal distribution [standard deviations].

    Quartiles by linear interpolation between ordered draws (definition 7). 0.564 for two, 0.990 for five, towards 1.349
    for many. The mean of the i-th of n ordered draws is that of Phi^-1(U), U of the beta distribution (i, n + 1 - i):
    David and Nagaraja, Order Statistics, 3rd ed. (2003), from memory.
    """
    z = np.linspace(-9.0, 9.0, 3601)
    share, density = stats.norm.cdf(z), stats.norm.pdf(z)

    def mean(i: int) -> float:
        return float(np.trapezoid(z * stats.beta.pdf(share, i, count + 1 - i) * density, z))

    place = 0.75 * (count - 1)
    left, part = math.floor(place), place - math.floor(place)
    upper = mean(left + 1) if part == 0.0 else (1.0 - part) * mean(left + 1) + part * mean(left + 2)
    return 2.0 * upper


def median_scatter(count: int) -> float:
    """Return the standard error of the median of ``count`` draws from a normal distribution [standard deviations].

    sqrt(pi / (2 n + pi - 2)): exact for one draw and for many; 2 % below for three, 11 % above for two (own form).
    """
    return math.sqrt(math.pi / (2.0 * count + math.pi - 2.0))


def _typical(found: Sequence[Extracted], counts: Callable[[Part], bool]) -> float:
    """Return the root mean square over the devices of the parts that count; 0 without any number."""
    sizes = [combined(part for part in one.parts if counts(part)).size for one in found if not one.bound]
    return math.sqrt(sum(size**2 for size in sizes) / len(sizes)) if sizes else 0.0


def _quantile(
    values: np.ndarray, below: np.ndarray, above: np.ndarray, share: float, *, refuse: bool = True
) -> tuple[float, Bound]:
    """Return a quantile and whether it is a bound; nan when it is open on both sides and that may be."""
    least, most = (
        _between(np.sort(np.where(side, infinite, values)), share)
        for side, infinite in ((below, -math.inf), (above, math.inf))
    )
    if least == most:
        return least, ""
    if math.isfinite(most):
        return most, "at-most"
    if math.isfinite(least):
        return least, "at-least"
    if refuse:
        what = "the median over devices is open on both sides: too many bounds"
        raise CannotExtract(what, f"{int(np.sum(below))} upper and {int(np.sum(above))} lower bounds of {values.size}")
    return math.nan, ""


def _between(ordered: np.ndarray, share: float) -> float:
    """Interpolate between ordered numbers, of which some may be infinite."""
    place = share * (ordered.size - 1)
    left = math.floor(place)
    part = place - left
    if part == 0.0:
        return float(ordered[left])
    if not math.isfinite(ordered[left]):
        return float(ordered[left])
    return float(ordered[left] + part * (ordered[left + 1] - ordered[left]))
