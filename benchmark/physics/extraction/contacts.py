"""Contact resistance from contacts at several spacings, and slopes of a resistance (layer 3)."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np

from benchmark.physics.extraction.lines import line_fit, relative_weights
from benchmark.physics.extraction.points import LEAST, Points
from benchmark.physics.extraction.result import (
    READING,
    SCATTER,
    SETTING,
    Accuracy,
    Array,
    CannotExtract,
    Extracted,
    Part,
    Told,
    gathered,
)

__all__ = ["Contacts", "contacts", "log_slope"]


@dataclass(frozen=True)
class Contacts:
    """What a line of resistance over spacing gives: per contact [ohm m], [ohm], [m], [ohm m^2]."""

    contact_resistance: Extracted
    sheet_resistance: Extracted
    transfer_length: Extracted
    contact_resistivity: Extracted


def contacts(
    spacing: Array,
    resistance_width: Array,
    weights: Literal["equal", "relative"] = "equal",
    accuracy: Accuracy | None = None,
) -> Contacts:
    """Fit R W = 2 R_c W + R_sheet L through contacts at several spacings.

    Parameters
    ----------
    spacing : array, shape (points,)
        L, distance between two contacts [m], in any order.
    resistance_width : array, shape (points,)
        R W, measured resistance times contact width [ohm m].
    weights : str
        "equal": readings equally accurate in ohm; "relative": in per cent.
    accuracy : Accuracy
        Stated accuracies: that of the readings and that of the spacing are common to all of them.

    Returns
    -------
    Contacts
        R_c W = intercept/2; R_sheet = slope; L_T = R_c W/R_sheet; rho_c = R_c W L_T, for contacts longer than about
        1.5 L_T. Errors from the residuals, with the covariance of intercept and slope. H. H. Berger, Solid-State
        Electronics 15, 145 (1972); D. K. Schroder, Semiconductor Material and Device Characterization (2006), section
        3.4; from memory. Another sheet under the contact makes L_T and rho_c wrong; R_c stays right.

    Raises
    ------
    CannotExtract
        Fewer than four structures, or the line has no positive intercept or slope.
    """
    stated = accuracy or Accuracy()
    length, product = np.asarray(spacing, dtype=np.float64), np.asarray(resistance_width, dtype=np.float64)
    if length.size < LEAST:
        what = "a line of contacts has too few structures"
        raise CannotExtract(what, str(length.size), f"{LEAST} or more", at=range(length.size))
    fit = line_fit(length, product, relative_weights(product) if weights == "relative" else None)
    intercept, slope = float(fit.intercept), float(fit.slope)
    if not (intercept > 0.0 and slope > 0.0):
        what = "the line of resistance over spacing must rise and meet spacing 0 above zero"
        found = f"intercept {intercept:.4g} ohm m, slope {slope:.4g} ohm"
        raise CannotExtract(what, found, "both above 0", "check spacings and the resistance of the leads")
    span = float(length.min()), float(length.max())
    line_x = np.array([0.0, span[1]])

    def read(value: float, by_intercept: float, by_slope: float, power: float, remarks: tuple[str, ...]) -> Extracted:
        """Propagate intercept and slope to a value that goes as a power of a common error of the readings."""
        variance = (
            (by_intercept * float(fit.intercept_error)) ** 2
            + (by_slope * float(fit.slope_error)) ** 2
            + 2.0 * by_intercept * by_slope * float(fit.covariance)
        )
        parts = (
            Part(SCATTER, math.sqrt(max(variance, 0.0)), fit.freedom),
            Part(READING, abs(value) * power * stated.reading),
            Part(SETTING, abs(by_intercept) * slope * stated.setting),
        )
        return Extracted(
            value,
            gathered(parts),
            fit.points,
            span,
            line_x=line_x,
            line_y=intercept + slope * line_x,
            used=np.arange(fit.points, dtype=np.int64),
            remarks=remarks,
        )

    long = ("for contacts longer than about 1.5 transfer lengths, and one sheet between and under them",)
    half = 0.5 * intercept
    return Contacts(
        read(half, 0.5, 0.0, 1.0, ()),
        read(slope, 0.0, 1.0, 1.0, ()),
        read(half / slope, 0.5 / slope, -half / slope**2, 0.0, long),
        read(half**2 / slope, half / slope, -((half / slope) ** 2), 1.0, long),
    )


def log_slope(
    points: Points, low: float | None = None, high: float | None = None, accuracy: Accuracy | None = None
) -> Extracted:
    """Return the slope of the natural logarithm of a resistance along pressure or drive, d ln R/dx [1/x].

    Parameters
    ----------
    points : Points
        Resistance [ohm] along pressure [Pa] or drive [V].
    low, high : float
        Part of the abscissa that is fitted; all of the data if left out.
    accuracy : Accuracy
        Stated accuracies, as if the two ends were read independently.

    Returns
    -------
    Extracted
        Slope of the least-squares line through ln R; negative where the resistance falls.

    Raises
    ------
    CannotExtract
        The span leaves the data, holds bounds or readings that are not above 0, or fewer than four points.
    """
    stated = accuracy or Accuracy()
    start, end = points.x[0] if low is None else low, points.x[-1] if high is None else high
    if start < points.x[0] or end > points.x[-1]:
        what = "the span leaves the data"
        found = Told("{} to {}", "x", (start, end))
        allowed = Told("{} to {}, without extrapolation", "x", (float(points.x[0]), float(points.x[-1])))
        raise CannotExtract(what, found, allowed)
    chosen = np.flatnonzero((points.x >= start) & (points.x <= end))
    if chosen.size < LEAST:
        what = "the span has too few points"
        raise CannotExtract(what, str(chosen.size), f"{LEAST} or more", at=points.place[chosen])
    wrong = chosen[~(points.trusted[chosen] & (points.y[chosen] > 0.0))]
    if wrong.size:
        what = "the span holds readings that are bounds or not above 0"
        raise CannotExtract(what, at=points.place[wrong])
    x, y = points.x[chosen], np.log(points.y[chosen])
    fit = line_fit(x, y)
    width = float(np.ptp(x))
    parts = (
        Part(SCATTER, float(fit.slope_error), fit.freedom),
        Part(READING, math.sqrt(2.0) * stated.reading / width),
        Part(SETTING, math.sqrt(2.0) * stated.setting * abs(float(fit.slope)) / width),
    )
    ends = x[[0, -1]]
    return Extracted(
        float(fit.slope),
        gathered(parts),
        x.size,
        (float(x[0]), float(x[-1])),
        line_x=ends,
        line_y=np.exp(fit.intercept + fit.slope * ends),
        used=points.place[chosen],
    )
