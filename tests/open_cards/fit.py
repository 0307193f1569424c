"""Virtual-source values of a pair of transistors from curves over supply: on-, off- and effective current (DC).

One set has one unit width, one gate-edge capacitance and one access resistance for both polarities, so everything is
per *mean* width of the two. The on- and off-current at the declared supply are targets of the set (the program solves
threshold and velocity from them); swing, barrier lowering, saturation exponent and mobility of each polarity, Fermi
width and access resistance are least squares of the logarithms of all three currents over supply. No delay and no
energy takes part.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import least_squares

from benchmark.physics import drive
from benchmark.physics import virtual_source as vs
from benchmark.physics.calibration import Targets, calibrate

__all__ = ["UNITS", "Capacitance", "Curves", "fit", "transistor"]

Array = NDArray[np.float64]
#: values of a set by name, in SI
Values = dict[str, float]


@dataclass(frozen=True)
class Curves:
    """Currents of one polarity per mean width [A/m] at the supplies [V]; the last supply is the declared one."""

    supplies: Array
    on: Array
    off: Array
    effective: Array


@dataclass(frozen=True)
class Capacitance:
    """Per mean width [F/m]: full-swing gate capacitance (drain edge twice), one edge, one terminal."""

    gate: float
    edge: float
    terminal: float


#: name, first value, lowest, highest (the usual ranges of the catalogue; the swing from the thermionic limit), scale
_BY_POLARITY = (
    ("subthreshold_swing", 0.090, 0.0597, 0.150, 0.01),
    ("drain_barrier_lowering", 0.10, 0.005, 0.40, 0.02),
    ("saturation_exponent", 1.8, 1.0, 3.0, 0.3),
    ("channel_mobility", 0.015, 0.002, 0.200, 0.005),
)
_SHARED = (("fermi_width", 3.0, 1.0, 5.0, 0.5), ("access_resistance", 100e-6, 1e-6, 400e-6, 30e-6))
#: factor from SI and unit as written; others are plain numbers
UNITS = {
    "subthreshold_swing": (1e3, "mV/decade"),
    "drain_barrier_lowering": (1e3, "mV/V"),
    "channel_mobility": (1e4, "cm^2/V/s"),
    "access_resistance": (1e6, "ohm um"),
}
_NAMES = (
    *(name for name, *_ in _BY_POLARITY),
    *(f"{name}_p" for name, *_ in _BY_POLARITY),
    *(name for name, *_ in _SHARED),
)
_TABLE = np.array([row[1:] for row in (*_BY_POLARITY, *_BY_POLARITY, *_SHARED)])


def transistor(
    values: Mapping[str, float], polarity: str, known: Curves, length: float, kelvin: float, c: Capacitance
) -> vs.Transistor:
    """Return the transistor per mean width, threshold and velocity solved at the declared supply."""
    suffix = "" if polarity == "n" else "_p"
    template = vs.Transistor(
        width=1.0,
        length=length,
        inversion_capacitance=0.02,
        source_resistance=values["access_resistance"],
        drain_resistance=values["access_resistance"],
        velocity=1e5,
        mobility=values[f"channel_mobility{suffix}"],
        threshold=0.0,
        slope_factor=vs.slope_factor(values[f"subthreshold_swing{suffix}"], kelvin),
        barrier_lowering=values[f"drain_barrier_lowering{suffix}"],
        fermi_width=values["fermi_width"],
        saturation_exponent=values[f"saturation_exponent{suffix}"],
        thermal_voltage=vs.thermal_voltage(kelvin),
    )
    targets = Targets(known.supplies[-1], known.on[-1], known.off[-1], None, c.gate, c.edge)
    found = calibrate(template, targets)
    return found.applied_to(template)


def _misfit(t: vs.Transistor, known: Curves) -> Array:
    v = known.supplies
    control, path = np.stack([v, 0.0 * v, v, 0.5 * v]), np.stack([v, v, 0.5 * v, v])
    on, off, high, low = vs.drain_current(t, control, path)
    effective = drive.effective_current(high, low)
    return np.log(np.concatenate([on / known.on, off / known.off, effective / known.effective]))


def fit(
    curves: Mapping[str, Curves],
    length: float,
    kelvin: float,
    capacitance: Callable[[Values], Capacitance],
) -> tuple[Values, float]:
    """Return the fitted values (SI) and the root mean square of the logarithms of the current ratios.

    Parameters
    ----------
    curves : mapping
        ``n`` and ``p``.
    length : float
        Channel length [m].
    kelvin : float
        Temperature of the curves.
    capacitance : callable
        Capacitances for given values; measured ones ignore the values.
    """
    first, low, high, scale = _TABLE.T

    def misfit(x: Array) -> Array:
        values = dict(zip(_NAMES, x.tolist(), strict=True))
        c = capacitance(values)
        parts = [_misfit(transistor(values, p, curves[p], length, kelvin, c), curves[p]) for p in ("n", "p")]
        # currents that no velocity can carry are nan: far off, so that the search turns back
        return np.nan_to_num(np.concatenate(parts), nan=3.0)

    best = least_squares(misfit, first, bounds=(low, high), x_scale=scale, max_nfev=60)
    values = dict(zip(_NAMES, best.x.tolist(), strict=True))
    return values, float(np.sqrt(np.mean(best.fun**2)))
