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
from benchmark.sets.joints import Joint, rank_matrix
from benchmark.sets.values import Value

__all__ = ["draw_twice", "draw_values", "drawn_keys", "tied_with", "value_at"]

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
    values: Mapping[str, Value],
    plan: Plan,
    block: int,
    held: Sequence[str] = (),
    joints: Mapping[str, Sequence[Joint]] | None = None,
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
    joints : mapping, optional
        Owner -> values of it that are not independent.

    Returns
    -------
    points, columns : dict
        Ledger key -> points in (0, 1) (draw,), and the values drawn there in SI (draw,). Values drawn together as
        samples have one point, that of the first of their names.
    """
    points: dict[str, Array] = {}
    columns: dict[str, Array] = {}
    for owner, keys in drawn_keys(values).items():
        table = net(owner, len(keys), plan, block)
        own_points, own_columns = _drawn(values, keys, table, (joints or {}).get(owner, ()))
        points |= {key: u for key, u in own_points.items() if key not in held}
        columns |= {key: column for key, column in own_columns.items() if key not in held}
    return points, columns


def _drawn(
    values: Mapping[str, Value], keys: Sequence[str], table: Array, joints: Sequence[Joint]
) -> tuple[dict[str, Array], dict[str, Array]]:
    """Points and values of one owner: independent ones, correlated ones, and those drawn as samples."""
    points = _correlated({key: table[:, position] for position, key in enumerate(keys)}, joints)
    columns: dict[str, Array] = {}
    for joint in joints:
        tied = [key for name in joint.names for key in keys if _name(key) == name]
        if joint.samples is None or not tied:
            continue
        first, samples = tied[0], joint.samples
        row = np.floor(points[first] * samples.shape[0]).astype(int)
        for key in tied:
            columns[key] = samples[row, joint.names.index(_name(key))]
        points = {key: u for key, u in points.items() if key == first or key not in tied}
    columns |= {key: value_at(values[key], u) for key, u in points.items() if key not in columns}
    return points, columns


def _name(key: str) -> str:
    return key.rpartition(".")[2]


def _correlated(points: dict[str, Array], joints: Sequence[Joint]) -> dict[str, Array]:
    """Give the points of correlated values their rank correlation: a Gaussian copula, the distributions unchanged."""
    from scipy.special import ndtr, ndtri

    names, matrix = rank_matrix(joints)
    keys = {_name(key): key for key in points}
    kept = [name for name in names if name in keys]  # a what-if takes the spread of a value away
    if len(kept) < 2:
        return points
    place = [names.index(name) for name in kept]
    size, vectors = np.linalg.eigh(matrix[np.ix_(place, place)])
    root = vectors * np.sqrt(np.maximum(size, 0.0)) @ vectors.T
    scores = root @ np.stack([ndtri(points[keys[name]]) for name in kept])
    return {**points, **{keys[name]: ndtr(row) for name, row in zip(kept, scores, strict=True)}}


def draw_twice(
    values: Mapping[str, Value],
    plan: Plan,
    held: Sequence[str] = (),
    joints: Mapping[str, Sequence[Joint]] | None = None,
    block: int = 0,
) -> tuple[dict[str, Array], dict[str, Array]]:
    """Return two independent sets of draws of one block, of nets that hold both.

    Returns
    -------
    first, second : dict
        Ledger key -> values in SI (draw,).
    """
    sets: tuple[dict[str, Array], dict[str, Array]] = ({}, {})
    for owner, keys in drawn_keys(values).items():
        table = net(f"{owner}, two sets", 2 * len(keys), plan, block)
        for half, found in enumerate(sets):
            part = table[:, half * len(keys) : (half + 1) * len(keys)]
            _, columns = _drawn(values, keys, part, (joints or {}).get(owner, ()))
            found |= {key: column for key, column in columns.items() if key not in held}
    return sets


def tied_with(key: str, joints: Mapping[str, Sequence[Joint]]) -> set[str]:
    """Return the keys that are not independent of one, itself among them."""
    owner = key.rpartition(".")[0]
    group = {key}
    while True:
        wider = group | {
            f"{owner}.{name}"
            for joint in joints.get(owner, ())
            if any(f"{owner}.{other}" in group for other in joint.names)
            for name in joint.names
        }
        if wider == group:
            return group
        group = wider
