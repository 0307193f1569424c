"""How long the wires of a block are: Rent's rule and the length distributions that follow from it (layer 3).

The convention moves the answer by a factor of two: for 10^6 gates, p = 0.6, k = 4, fan-out 3 the exact pair sum gives
a mean of 6.18 gate pitches, the continuous form 9.76, the hierarchical placement of Donath 13.2. Print which one.
Scalars in, scalars out but for ``net_length``: these belong to a scenario, not to a draw.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from benchmark.errors import UsageError

__all__ = [
    "davis_continuous",
    "davis_discrete",
    "donath_mean_length",
    "donath_pair_distance",
    "net_length",
    "rent_terminals",
]

Array = NDArray[np.float64]

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(80)


def _check_exponent(p: float, forbidden: tuple[float, ...] = ()) -> None:
    if not 0.0 < p < 1.0 or p in forbidden:
        outside = f", other than {', '.join(map(str, forbidden))}" if forbidden else ""
        message = f"Rent exponent must lie between 0 and 1{outside}, not {p}"
        raise UsageError(message)


def rent_terminals(gates: float, coefficient: float, exponent: float) -> float:
    """Return the terminals of a block, T = k N^p [1]. Landman & Russo 1971 (from memory)."""
    return float(coefficient * gates**exponent)


def davis_continuous(gates: float, exponent: float, coefficient: float, fan_out: float) -> tuple[float, float]:
    """Return (number of point-to-point wires, mean length [gate pitches]) of the continuous distribution.

    i(l) = alpha k Gamma/2 (l^3/3 - 2 sqrt(N) l^2 + 2 N l) l^(2p-4) for 1 <= l < sqrt N,
    alpha k Gamma/6 (2 sqrt N - l)^3 l^(2p-4) up to 2 sqrt N, alpha = fo/(fo+1). Davis, De, Meindl, IEEE TED 45 (1998)
    580 (from memory). Not for p = 1/2, where Gamma is singular: use the discrete form.
    """
    p, n = exponent, gates
    _check_exponent(p, (0.5,))
    root = math.sqrt(n)
    bracket = (
        -(n**p) * (1.0 + 2.0 * p - 2.0 ** (2.0 * p - 1.0)) / (p * (2.0 * p - 1.0) * (p - 1.0) * (2.0 * p - 3.0))
        - 1.0 / (6.0 * p)
        + 2.0 * root / (2.0 * p - 1.0)
        - n / (p - 1.0)
    )
    gamma = 2.0 * n * (1.0 - n ** (p - 1.0)) / bracket
    scale = fan_out / (fan_out + 1.0) * coefficient * gamma
    count = length = 0.0
    for start, stop in ((1.0, root), (root, 2.0 * root)):
        half = 0.5 * math.log(stop / start)
        x = np.exp(math.log(start) + half * (_NODES + 1.0))
        if stop <= root:
            density = scale / 2.0 * (x**3 / 3.0 - 2.0 * root * x**2 + 2.0 * n * x) * x ** (2.0 * p - 4.0)
        else:
            density = scale / 6.0 * (2.0 * root - x) ** 3 * x ** (2.0 * p - 4.0)
        weight = half * _WEIGHTS * x
        count += float((weight * density).sum())
        length += float((weight * density * x).sum())
    return count, length / count


def davis_discrete(gates: int, exponent: float, coefficient: float, fan_out: float) -> tuple[float, float]:
    """Return (number of point-to-point wires, mean length [gate pitches]) summed over the exact pair counts.

    Expected wires per pair at distance l: (alpha k/N_C) [(1+N_B)^p + (N_B+N_C)^p - (1+N_B+N_C)^p - N_B^p], N_B =
    l(l-1), N_C = 2l; pairs on a square array of side s counted exactly: 2 l s (s - l) + l (l^2 - 1)/3 up to l = s,
    m (m^2 - 1)/3 with m = 2 s - l beyond (derived). Edges are neglected in N_B and N_C: the number of wires misses
    alpha k N (1 - N^(p-1)) by 0.6 % at 10^6 gates, 6 % at 10^3. ``gates`` must be a square number above 1. The mean
    depends on neither k nor fan-out.
    """
    _check_exponent(exponent)
    side = math.isqrt(gates)
    if side * side != gates or side < 2:
        message = f"the discrete distribution needs a square number of gates, 4 or more, not {gates}"
        raise UsageError(message)
    distance = np.arange(1, 2 * side - 1, dtype=np.float64)
    beyond = 2.0 * side - distance
    pairs = np.where(
        distance <= side,
        2.0 * distance * side * (side - distance) + distance * (distance**2 - 1.0) / 3.0,
        beyond * (beyond**2 - 1.0) / 3.0,
    )
    near, at = distance * (distance - 1.0), 2.0 * distance
    p = exponent
    per_pair = ((1.0 + near) ** p + (near + at) ** p - (1.0 + near + at) ** p - near**p) / at
    wires = fan_out / (fan_out + 1.0) * coefficient * pairs * per_pair
    return float(wires.sum()), float((wires * distance).sum() / wires.sum())


def donath_pair_distance(side: float) -> float:
    """Return the mean distance [gate pitches] between two of the four quarter blocks of side s: (14 s - 2/s)/9."""
    return (14.0 * side - 2.0 / side) / 9.0


def donath_mean_length(gates: float, exponent: float) -> float:
    """Return the mean wire length [gate pitches] of hierarchical placement.

    (2/9) [7 (N^(p-1/2) - 1)/(4^(p-1/2) - 1) - (1 - N^(p-3/2))/(1 - 4^(p-3/2))] (1 - 4^(p-1))/(1 - N^(p-1)).
    Donath, IEEE TCAS 26 (1979) 272 (from memory). Not for p = 1/2.
    """
    p, n = exponent, gates
    _check_exponent(p, (0.5,))
    first = 7.0 * (n ** (p - 0.5) - 1.0) / (4.0 ** (p - 0.5) - 1.0)
    second = (1.0 - n ** (p - 1.5)) / (1.0 - 4.0 ** (p - 1.5))
    return float(2.0 / 9.0 * (first - second) * (1.0 - 4.0 ** (p - 1.0)) / (1.0 - n ** (p - 1.0)))


def net_length(mean_length: ArrayLike, fan_out: ArrayLike) -> Array:
    """Return the length of a net [same unit as ``mean_length``]: fo L chi with chi = 4/(fo + 3).

    From point-to-point to multi-terminal nets; Davis, De, Meindl 1998 (from memory).
    """
    fo, mean = np.asarray(fan_out, dtype=np.float64), np.asarray(mean_length, dtype=np.float64)
    return np.asarray(fo * mean * 4.0 / (fo + 3.0))
