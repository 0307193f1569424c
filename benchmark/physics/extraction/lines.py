"""Straight lines through points by least squares, with standard errors (layer 3)."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from benchmark.physics.extraction.result import Array, CannotExtract

__all__ = ["LineFit", "line_fit"]


@dataclass(frozen=True)
class LineFit:
    """y = intercept + slope x, with standard errors from the residuals; arrays over the leading axes of y.

    ``covariance``: of intercept and slope. ``residual``: standard deviation of a reading of weight 1 about the line.
    ``freedom``: degrees of freedom, points minus 2.
    """

    intercept: Array
    slope: Array
    intercept_error: Array
    slope_error: Array
    covariance: Array
    residual: Array
    freedom: int
    points: int

    def zero(self) -> tuple[Array, Array]:
        """Return where the line is zero, and the standard error of that, to first order in the errors of both."""
        at = -self.intercept / self.slope
        variance = self.intercept_error**2 + at**2 * self.slope_error**2 + 2.0 * at * self.covariance
        return at, np.sqrt(np.maximum(variance, 0.0)) / np.abs(self.slope)


def line_fit(x: Array, y: Array, weights: Array | None = None) -> LineFit:
    """Fit a straight line by least squares.

    Parameters
    ----------
    x : array, shape (points,)
        Abscissa, without error.
    y : array, shape (..., points)
        Readings; every row has its own line.
    weights : array, shape (..., points)
        Relative weights, 1/variance up to a factor that the residuals give; equal if left out.

    Returns
    -------
    LineFit
        Minimum of sum w (y - a - b x)^2; var(b) = s^2/sum w (x - xm)^2, var(a) = s^2 (1/sum w + xm^2/sum w (x - xm)^2),
        cov(a, b) = -xm var(b), s^2 = sum w r^2/(n - 2), with the weighted mean xm. C. F. Gauss; N. R. Draper and
        H. Smith, Applied Regression Analysis (1998), chapter 1; from memory.

    Raises
    ------
    CannotExtract
        Fewer than three points, or all at one place.
    """
    x, y = np.asarray(x, dtype=np.float64), np.asarray(y, dtype=np.float64)
    w = np.ones_like(y) if weights is None else np.broadcast_to(np.asarray(weights, dtype=np.float64), y.shape)
    points = x.size
    if points < 3:
        what = "a line with its error needs more points"
        raise CannotExtract(what, str(points), "3 or more")
    total = w.sum(axis=-1)
    middle = (w * x).sum(axis=-1) / total
    dx = x - middle[..., None]
    spread = (w * dx**2).sum(axis=-1)
    if not np.all(spread > 0.0):
        what = "all points of a line stand at one place"
        raise CannotExtract(what)
    mean = (w * y).sum(axis=-1) / total
    slope = (w * dx * (y - mean[..., None])).sum(axis=-1) / spread
    left = y - mean[..., None] - slope[..., None] * dx
    variance = (w * left**2).sum(axis=-1) / (points - 2)
    slope_error = np.sqrt(variance / spread)
    return LineFit(
        mean - slope * middle,
        slope,
        np.sqrt(variance * (1.0 / total + middle**2 / spread)),
        slope_error,
        -middle * slope_error**2,
        np.sqrt(variance),
        points - 2,
        points,
    )


def relative_weights(y: Array) -> Array:
    """Return weights of readings that are equally accurate in per cent: 1/y^2.

    Raises
    ------
    CannotExtract
        A reading is zero.
    """
    if np.any(y == 0.0) or not np.all(np.isfinite(y)):
        what = "a reading of zero cannot be weighted by its own size"
        raise CannotExtract(what, at=np.flatnonzero(y == 0.0))
    return 1.0 / (y / math.exp(float(np.mean(np.log(np.abs(y)))))) ** 2
