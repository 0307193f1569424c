"""From points in (0, 1) to values with their stated spreads (layer 3).

A spread says how a value may lie around its best estimate:

    uniform      low + (high - low) u
    loguniform   low (high / low)^u
    triangular   the inverse of the distribution with its peak at the best estimate
    normal       best + sd z(u)
    lognormal    best exp(ln_sd z(u)); the best estimate is the median

z is the inverse of the normal distribution function. A normal or log-normal distribution that would leave the domain
of its value (a capacitance above 0, a share up to 1) is cut there and its probability renormalised: u is first mapped
to the part inside. Files whose central 95 % would leave the domain are refused, so the part cut off is below 5 %. The
best estimate of a uniform or log-uniform value need not be its mean or median: it is the value that the verdict's own
points are made at.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from benchmark.catalogue import QUANTITIES
from benchmark.draws.plan import Plan, net
from benchmark.sets.values import Value

__all__ = ["draw_twice", "draw_values", "drawn_keys", "value_at"]

Array = NDArray[np.float64]
#: ends of the domains that a tail may not cross
DOMAINS = {
    "positive": (0.0, np.inf),
    "nonnegative": (0.0, np.inf),
    "fraction": (0.0, 1.0),
    "share": (0.0, 1.0),
    "count": (1.0, np.inf),
}


def value_at(value: Value, u: Array) -> Array:
    """Return the values at points ``u`` of (0, 1).

    Parameters
    ----------
    value : Value
        At one node, with a spread.
    u : array (draw,)

    Returns
    -------
    array (draw,)
        In SI.
    """
    from scipy.special import ndtri

    spread = value.spread
    if spread is None:
        message = f"{value.name} has no spread to draw from"
        raise ValueError(message)
    best, low, high = float(value.si[0]), float(spread.low[0]), float(spread.high[0])
    if spread.shape == "uniform":
        return np.asarray(low + (high - low) * u)
    if spread.shape == "loguniform":
        return np.asarray(np.exp(np.log(low) + (np.log(high) - np.log(low)) * u))
    if spread.shape == "triangular":
        return _triangular(low, best, high, u)
    scale = float(spread.scale[0]) if spread.scale is not None else float("nan")
    lowest, highest = DOMAINS.get(QUANTITIES[value.name].domain, (-np.inf, np.inf))
    if spread.shape == "normal":
        return np.asarray(best + scale * ndtri(_inside(u, (lowest - best) / scale, (highest - best) / scale)))
    with np.errstate(divide="ignore"):
        ends = (np.log(np.array([max(lowest, 0.0), highest]) / best)) / scale
    return np.asarray(best * np.exp(scale * ndtri(_inside(u, float(ends[0]), float(ends[1])))))


def _inside(u: Array, low: float, high: float) -> Array:
    """Map u to the probabilities of a normal distribution between two standard scores; unchanged without ends."""
    from scipy.special import ndtr

    below, above = float(ndtr(low)), float(ndtr(-high))
    return u if below == 0.0 and above == 0.0 else below + (1.0 - below - above) * u


def _triangular(low: float, peak: float, high: float, u: Array) -> Array:
    if high == low:
        return np.full(u.shape, low)
    share = (peak - low) / (high - low)
    rising = low + np.sqrt(u * (high - low) * (peak - low))
    falling = high - np.sqrt((1.0 - u) * (high - low) * (high - peak))
    return np.where(u < share, rising, falling)


def drawn_keys(values: Mapping[str, Value]) -> dict[str, list[str]]:
    """Return owner -> ledger keys of its values with a spread that is not a point, in order of name."""
    found: dict[str, list[str]] = {}
    for key in sorted(values):
        spread = values[key].spread
        if spread is not None and spread.high[0] > spread.low[0]:
            found.setdefault(key.rpartition(".")[0], []).append(key)
    return found


def draw_values(
    values: Mapping[str, Value], plan: Plan, block: int, held: Sequence[str] = ()
) -> tuple[dict[str, Array], dict[str, Array]]:
    """Draw every value that has a spread.

    Parameters
    ----------
    values : mapping
        Ledger key -> value at one node.
    plan : Plan
    block : int
        Number of the block.
    held : sequence of str
        Keys that stay at their best estimate. The draws of all others are the same as without it.

    Returns
    -------
    points, columns : dict
        Ledger key -> points in (0, 1) (draw,), and the values drawn there in SI (draw,).
    """
    points: dict[str, Array] = {}
    columns: dict[str, Array] = {}
    for owner, keys in drawn_keys(values).items():
        table = net(owner, len(keys), plan, block)
        for position, key in enumerate(keys):
            if key not in held:
                points[key] = table[:, position]
                columns[key] = value_at(values[key], table[:, position])
    return points, columns


def draw_twice(
    values: Mapping[str, Value], plan: Plan, held: Sequence[str] = ()
) -> tuple[dict[str, Array], dict[str, Array]]:
    """Return two independent sets of draws of one block, of nets that hold both.

    Returns
    -------
    first, second : dict
        Ledger key -> values in SI (draw,).
    """
    sets: tuple[dict[str, Array], dict[str, Array]] = ({}, {})
    for owner, keys in drawn_keys(values).items():
        table = net(f"{owner}, two sets", 2 * len(keys), plan, 0)
        for position, key in enumerate(keys):
            if key not in held:
                for half in (0, 1):
                    sets[half][key] = value_at(values[key], table[:, position + half * len(keys)])
    return sets
