"""Path current of a switch from measured curves: control voltage x path voltage x temperature (layer 3).

Along the control voltage log(I) is interpolated monotonically; across several path voltages log(I / V_path) is (the
conductance; below the smallest measured path voltage it stays constant, so the current runs straight to its known
value 0 at 0 V); across temperatures log(I) is straight in 1/T. Outside the data every answer is nan.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.physics.interpolation import (
    Curve,
    curve,
    hermite_across,
    inverse_temperature_weights,
    outside,
)
from benchmark.physics.steep_swing import drain_factor

__all__ = ["CurrentSurface", "blended_branches", "current_surface"]

Array = NDArray[np.float64]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True)
class CurrentSurface:
    """One sweep direction; build it with `current_surface`.

    temperatures [K] and path_voltages [V] rise; ``curves[i][j]`` is the current [A, or A/m per width] against the
    control voltage at temperature i and path voltage j. With one path voltage the caller's saturation voltage says how
    the current falls towards 0 V across the path: I(V_path) / I(measured) = f(V_path) / f(measured),
    f = 1 - exp(-V/V_sat).
    """

    temperatures: Array
    path_voltages: Array
    curves: tuple[tuple[Curve, ...], ...]

    @property
    def control_low(self) -> float:
        """Lowest control voltage known on every curve [V]."""
        return max(item.low for row in self.curves for item in row)

    @property
    def control_high(self) -> float:
        """Highest control voltage known on every curve [V]."""
        return min(item.high for row in self.curves for item in row)

    @property
    def path_high(self) -> float:
        """Highest measured path voltage [V]."""
        return float(self.path_voltages[-1])

    @property
    def measured_across(self) -> bool:
        """Whether the dependence on the path voltage is measured rather than stated."""
        return self.path_voltages.size > 1

    def outside_temperature(self, temperature: Array) -> BoolArray:
        """Return where the temperature leaves the data."""
        return inverse_temperature_weights(temperature, self.temperatures)[1]

    def outside_voltage(self, voltage: Array) -> BoolArray:
        """Return where a supply leaves the data: as control voltage or as path voltage."""
        known = self.control_high if self.control_low <= 0.0 else -np.inf
        return outside(voltage, 0.0, min(known, self.path_high))

    def __call__(
        self, control: Array, path: Array, temperature: Array, saturation_voltage: Array | None = None
    ) -> Array:
        """Return the path current; control and path in V (path 0 or above), temperature in K, broadcasting.

        ``saturation_voltage`` [V] is needed with one path voltage (``ValueError`` without) and not used with several.
        """
        weights, beyond = inverse_temperature_weights(temperature, self.temperatures)
        path = np.asarray(path, dtype=np.float64)
        path = np.where(outside(path, 0.0, self.path_high), np.nan, path)
        total: Array = np.asarray(0.0)
        for weight, row in zip(weights, self.curves, strict=True):
            if not np.any(weight):
                continue
            logarithm = self._log_conductance(row, control, path)
            total = total + np.where(weight > 0.0, weight * logarithm, 0.0)
        shape_factor = path
        if not self.measured_across:
            if saturation_voltage is None:
                problem = "one path voltage needs a saturation voltage"
                raise ValueError(problem)
            shape_factor = drain_factor(path, saturation_voltage) / drain_factor(self.path_high, saturation_voltage)
        return np.where(beyond, np.nan, np.exp(total) * shape_factor)

    def _log_conductance(self, row: tuple[Curve, ...], control: Array, path: Array) -> Array:
        """Return log I (one path voltage) or log(I / V_path) (several)."""
        if not self.measured_across:
            return np.log(row[0](control)) + 0.0 * path
        known = np.stack(
            [np.log(item(control)) - np.log(volts) for item, volts in zip(row, self.path_voltages, strict=True)]
        )
        return hermite_across(self.path_voltages, known, np.clip(path, self.path_voltages[0], self.path_high))


def current_surface(columns: Mapping[str, Array], path_voltage: float | None, temperature: float) -> CurrentSurface:
    """Return the surface through the rows of one sweep, in any order.

    Parameters
    ----------
    columns : mapping
        ``control_voltage`` [V], ``current`` [A or A/m, above 0] and, when measured, ``path_voltage`` [V, above 0] and
        ``temperature`` [K], each of shape (rows,).
    path_voltage : float or None
        Path voltage of the whole table [V] when it has no such column.
    temperature : float
        Temperature of the whole table [K] when it has no such column.

    Raises
    ------
    ValueError
        Not every temperature has the same path voltages.
    """
    control, current = columns["control_voltage"], columns["current"]
    everywhere = np.ones(control.size)
    paths = columns.get("path_voltage")
    if paths is None:
        if path_voltage is None:
            problem = "the path voltage of the table is not known"
            raise ValueError(problem)
        paths = path_voltage * everywhere
    temperatures = columns.get("temperature", temperature * everywhere)
    steps, levels = np.unique(temperatures), np.unique(paths)
    rows = []
    for kelvin in steps:
        at = temperatures == kelvin
        if not np.array_equal(np.unique(paths[at]), levels):
            problem = "every temperature needs the same path voltages"
            raise ValueError(problem)
        rows.append(
            tuple(curve(control[at & (paths == volts)], current[at & (paths == volts)], "log") for volts in levels)
        )
    return CurrentSurface(steps, levels, tuple(rows))


def blended_branches(first: Array, second: Array, level: Array) -> Array:
    """Return the pessimistic current between two sweep directions.

    ``I = I_larger^(1-u) I_smaller^u``: the larger (leakier) current at zero control, the smaller (weaker) one at full
    control, and in between the two weighted along the swing. Own form; it always understates the on/off ratio.

    Parameters
    ----------
    first, second : ndarray
        Currents of the two sweeps at the same voltages [A], above 0.
    level : ndarray
        Control voltage over the supply u [1], 0 to 1.

    Returns
    -------
    ndarray
        Current [A].
    """
    larger, smaller = np.maximum(first, second), np.minimum(first, second)
    return np.asarray(larger ** (1.0 - level) * smaller**level, dtype=np.float64)
