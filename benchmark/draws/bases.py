"""Orthonormal functions of one drawn value, for conditional means without keeping the draws (layer 3).

E[y | x_i] is expanded in functions phi_k(u_i) that are orthonormal over u in (0, 1): c_k = E[y phi_k(u_i)]. Sums of
products over the draws are all that is kept. For values with a normal or log-normal spread phi_k are the Hermite
polynomials of z(u), in which a product law of log-normal values is exact with k = 1; for all others the Legendre
polynomials of 2 u - 1.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

__all__ = ["DEGREE", "QUADRATURE", "hermite", "hermite_coefficients", "legendre"]

Array = NDArray[np.float64]
#: highest degree; the smooth dependences met here need 3 to 4
DEGREE = 5
#: midpoints at which expansions are integrated
QUADRATURE: Array = ((np.arange(16384) + 0.5) / 16384.0).astype(np.float64)


def hermite(u: Array) -> Array:
    """Return He_k(z(u)) / sqrt(k!) for k = 0 to ``DEGREE``, shape (k, draw); z: inverse normal distribution."""
    from scipy.special import ndtri

    return _hermite_at(ndtri(u))


def _hermite_at(z: Array) -> Array:
    found = [np.ones_like(z), z]
    for k in range(1, DEGREE):
        found.append((z * found[k] - np.sqrt(k) * found[k - 1]) / np.sqrt(k + 1.0))
    return np.stack(found)


def legendre(u: Array) -> Array:
    """Return sqrt(2k + 1) P_k(2u - 1) for k = 0 to ``DEGREE``, shape (k, draw)."""
    x = 2.0 * u - 1.0
    plain = [np.ones_like(x), x]
    for k in range(1, DEGREE):
        plain.append(((2 * k + 1) * x * plain[k] - k * plain[k - 1]) / (k + 1.0))
    return np.stack([np.sqrt(2.0 * k + 1.0) * item for k, item in enumerate(plain)])


def hermite_coefficients(function: Callable[[Array], Array]) -> Array:
    """Return the Hermite coefficients (k,) of a function of u, by Gauss quadrature in z; the function is finite at 1.

    The polynomials are taken at z itself: u of the outermost places rounds to 1.
    """
    from scipy.special import ndtr

    z, weight = np.polynomial.hermite_e.hermegauss(64)
    u = ndtr(z)
    return np.asarray(_hermite_at(z) @ (weight * function(u)) / weight.sum())
