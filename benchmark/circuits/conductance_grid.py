"""Coarse table of a pair's currents for solving the output balance with few evaluations (layer 5).

The current law of a device can be expensive (an implicit transistor), its logarithm per path voltage is smooth. The
table holds ln(I / path) on a few control voltages times a few path voltages; between path nodes a cubic spline in
sqrt(path / V), between control nodes linear. Below the first path node (1e-4 of the supply) the conductance is taken
as constant. The table only has to come near: every output that matters is corrected with the currents themselves
(``settle``), so its error is second order in the table's.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline
from scipy.special import expit

from benchmark.circuits.balance import Z_MAX, Balance
from benchmark.devices.record import Array, BoolArray, Switch

__all__ = ["ConductanceGrid", "conductance_grid", "settle"]

_FIRST_NODE = 0.01  # sqrt of path / V

#: bracketed Newton steps on the table without and with a start value: the residual is nearly straight in z
_STEPS = 16
_STEPS_NEAR = 4
_FLATTEST = 1e-3


@dataclass(frozen=True)
class _Table:
    """ln(I/path) and its derivative by t = sqrt(path/V), of shape S + (controls * nodes,), laid flat.

    ``start``: index of the first entry of every element of S, shape S + (1,).
    """

    value: Array
    slope: Array
    start: NDArray[np.intp]
    controls: int
    nodes: int

    @property
    def unknown(self) -> BoolArray:
        """Elements of S of which some current is nan."""
        whole = self.value.reshape(*self.start.shape[:-1], self.controls * self.nodes)
        return np.asarray(np.isnan(whole).any(axis=-1))

    def at(self, level: Array, t: Array) -> tuple[Array, Array]:
        """Return ln(I/path) and its derivative by t; ``level`` in [0, 1]."""
        row = np.clip(level, 0.0, 1.0) * (self.controls - 1)
        first = np.minimum(row.astype(np.intp), self.controls - 2)
        share = row - first
        inside = t > _FIRST_NODE
        column = (np.where(inside, t, _FIRST_NODE) - _FIRST_NODE) * ((self.nodes - 1) / (1.0 - _FIRST_NODE))
        left = np.minimum(column.astype(np.intp), self.nodes - 2)
        u = column - left
        h = (1.0 - _FIRST_NODE) / (self.nodes - 1)
        index = self.start + first * self.nodes + left
        v0, v1 = self._blend(self.value, index, share), self._blend(self.value, index + 1, share)
        d0, d1 = h * self._blend(self.slope, index, share), h * self._blend(self.slope, index + 1, share)
        rise = v1 - v0
        c2, c3 = 3.0 * rise - 2.0 * d0 - d1, d0 + d1 - 2.0 * rise
        value = v0 + u * (d0 + u * (c2 + u * c3))
        slope = np.where(inside, (d0 + u * (2.0 * c2 + 3.0 * u * c3)) / h, 0.0)
        return np.asarray(value), np.asarray(slope)

    def _blend(self, table: Array, index: NDArray[np.intp], share: Array) -> Array:
        near, far = table[index], table[index + self.nodes]
        return np.asarray(near + share * (far - near))


@dataclass(frozen=True)
class ConductanceGrid:
    """Tables of the two switches of a pair over control and path fractions of the supply."""

    down: _Table
    up: _Table

    def residual(self, balance: Balance, level: Array, z: Array) -> tuple[Array, Array]:
        """Return the residual of ``balance`` from the tables and its derivative by z (at least 1e-3)."""
        low, high = expit(z), expit(-z)
        t_down, t_up = np.sqrt(low), np.sqrt(high)
        down, down_slope = self.down.at(level + balance.lead_down, t_down)
        up, up_slope = self.up.at(1.0 - level + balance.lead_up, t_up)
        # ln I = table + ln(path): the difference of ln(path) is z; d sqrt(y)/dz = sqrt(y) (1 - y) / 2
        slope = 1.0 + 0.5 * (down_slope * t_down * high + up_slope * t_up * low)
        return np.asarray(z + down - up + balance.log_ratio), np.asarray(np.maximum(slope, _FLATTEST))

    def solve(self, balance: Balance, level: Array, start: Array | None = None, shift: Array | float = 0.0) -> Array:
        """Return z where the tables' residual plus ``shift`` is 0, from the start value if there is one."""
        low, high = np.full(level.shape, -Z_MAX), np.full(level.shape, Z_MAX)
        z = np.zeros(level.shape) if start is None else start
        for _ in range(_STEPS if start is None else _STEPS_NEAR):
            residual, slope = self.residual(balance, level, z)
            residual = residual + shift
            low, high = np.where(residual < 0.0, z, low), np.where(residual < 0.0, high, z)
            newton = z - residual / slope
            z = np.where((newton >= low) & (newton <= high), newton, 0.5 * (low + high))
        return np.asarray(z)


def _table(switch: Switch, supply: Array, controls: int, nodes: int) -> _Table:
    level = np.repeat(np.linspace(0.0, 1.0, controls), nodes)
    t = np.linspace(_FIRST_NODE, 1.0, nodes)
    path = np.tile(t * t, controls) * supply
    current = np.asarray(switch.current(level * supply, path))
    value = np.log(np.maximum(current, 1e-300) / path)
    # the derivative of a not-a-knot spline at its nodes is linear in the values: one small matrix for all samples
    derive = CubicSpline(t, np.eye(nodes)).derivative()(t)
    stacked = value.reshape(*value.shape[:-1], controls, nodes)
    slope = (stacked @ derive.T).reshape(value.shape)
    per_element = controls * nodes
    start = (np.arange(value.size // per_element) * per_element).reshape(*value.shape[:-1], 1)
    return _Table(value.ravel(), np.asarray(slope).ravel(), start, controls, nodes)


def conductance_grid(balance: Balance, controls: int = 17, nodes: int = 7) -> ConductanceGrid:
    """Return the tables of a pair: ``controls * nodes`` evaluations of each current."""
    pair, supply = balance.pair, balance.supply
    return ConductanceGrid(_table(pair.down, supply, controls, nodes), _table(pair.up, supply, controls, nodes))


def settle(grid: ConductanceGrid, balance: Balance, level: Array, z: Array, rounds: int) -> Array:
    """Return z corrected with the currents themselves: one evaluation of both per round.

    Each round moves the tables' residual so that it agrees with the true one at the last z, and solves it again.
    """
    for _ in range(rounds):
        shift = balance.residual(level, z) - grid.residual(balance, level, z)[0]
        z = grid.solve(balance, level, z, shift)
    return z
