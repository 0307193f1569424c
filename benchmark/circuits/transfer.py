"""Static transfer curve of a gate and the largest square between two curves (layer 5).

``transfer_curve`` draws the whole curve with accurate outputs; ``functional`` (re-exported) finds levels, gain and
noise margins with far fewer evaluations.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import expit

from benchmark.circuits.balance import gate_balance
from benchmark.circuits.functional import Functional, functional
from benchmark.circuits.unity_gain import steepness
from benchmark.devices.record import Array, SwitchPair

__all__ = ["Functional", "TransferCurve", "functional", "largest_square", "transfer_curve"]


@dataclass(frozen=True)
class TransferCurve:
    """Output against input, S + (points,) each [V]; ``supply`` [V] has shape S."""

    v_in: Array
    v_out: Array
    supply: Array

    @property
    def gain(self) -> Array:
        """Largest |dV_out/dV_in| between neighbouring points [1]."""
        return np.asarray(steepness(self.v_in, self.v_out).max(axis=-1))

    @property
    def switching_voltage(self) -> Array:
        """Input at which output equals input [V], straight between points."""
        difference = self.v_out - self.v_in
        below = difference <= 0.0
        right = np.maximum(np.argmax(below, axis=-1), 1)[..., None]
        d0 = np.take_along_axis(difference, right - 1, axis=-1)[..., 0]
        d1 = np.take_along_axis(difference, right, axis=-1)[..., 0]
        v0 = np.take_along_axis(self.v_in, right - 1, axis=-1)[..., 0]
        v1 = np.take_along_axis(self.v_in, right, axis=-1)[..., 0]
        return np.asarray(v0 + (v1 - v0) * d0 / (d0 - d1))


def transfer_curve(pair: SwitchPair, fan_in_down: int = 1, fan_in_up: int = 1, points: int = 65) -> TransferCurve:
    """Return the static transfer curve of a gate whose inputs move together.

    Parameters
    ----------
    pair : SwitchPair
        The pair at any number of design points S.
    fan_in_down : int
        k pull-down switches in series against k pull-up switches in parallel (k-input NAND).
    fan_in_up : int
        k pull-up switches in series against k pull-down switches in parallel (k-input NOR).
    points : int
        Inputs from 0 to V, evenly spaced.

    Returns
    -------
    TransferCurve
        Outputs by bisection in ln(v_out/(V - v_out)): 52 evaluations of each current per point, resolved to 4e-14
        of the logarithm over 35 decades. nan where a current is nan.

    Notes
    -----
    Closing branch of both switches (``benchmark.circuits.balance``). Currents are evaluated in blocks of about two
    million elements; the result and four temporaries of S x points stay in memory.
    """
    balance = gate_balance(pair, fan_in_down, fan_in_up)
    shape = (*balance.supply.shape[:-1], points)
    level = np.broadcast_to(np.linspace(0.0, 1.0, points), shape)
    z = balance.solve(level)
    return TransferCurve(
        np.asarray(level * balance.supply), np.asarray(expit(z) * balance.supply), balance.supply[..., 0]
    )


def _rotated(sum_axis: Array, difference: Array, at: Array) -> Array:
    """Interpolate ``sum_axis`` over rising ``difference`` (last axis) at ``at`` (last axis); nan outside."""
    index = (difference[..., None, :] <= at[..., :, None]).sum(axis=-1) - 1
    last = difference.shape[-1] - 2
    # the last node itself belongs to the last interval
    index = np.where(at == difference[..., -1:], last, index)
    inside = (index >= 0) & (index <= last)
    index = np.clip(index, 0, last)
    d0 = np.take_along_axis(difference, index, axis=-1)
    d1 = np.take_along_axis(difference, index + 1, axis=-1)
    s0 = np.take_along_axis(sum_axis, index, axis=-1)
    s1 = np.take_along_axis(sum_axis, index + 1, axis=-1)
    return np.asarray(np.where(inside, s0 + (s1 - s0) * (at - d0) / (d1 - d0), np.nan))


def largest_square(v_in: Array, v_out: Array, other_out: Array | None = None) -> Array:
    """Return the static noise margin of a loop of two gates: side of the largest square inside both eyes [V].

    Parameters
    ----------
    v_in : array_like
        Rising inputs on the last axis [V].
    v_out : array_like
        Falling outputs of the first gate [V].
    other_out : array_like, optional
        Outputs of the second gate at the same inputs [V]; the first gate again when absent.

    Returns
    -------
    ndarray
        Side of the smaller of the two largest squares [V]; 0 where the loop has no two stable states.

    Notes
    -----
    Both curves are turned by 45 degrees: u = (x - y)/sqrt 2, v = (x + y)/sqrt 2; the side is the largest gap in v
    over sqrt 2 (E. Seevinck, F. J. List and J. Lohstroh, IEEE J. Solid-State Circuits 22, 748 (1987); rotation as in
    published simulator decks). The search stays inside the eyes, between the outer crossings: beyond them curves
    that do not reach the rails enclose an area that holds no state, and an unrestricted search reports it (0.091 V
    instead of 0.016 V at an on/off ratio of 10). Between points the curves are straight: exact for piecewise linear
    curves, otherwise good to the square of the spacing. Memory: S x 2 n^2 flags for n points.
    """
    x, first = np.asarray(v_in, dtype=np.float64), np.asarray(v_out, dtype=np.float64)
    second = first if other_out is None else np.asarray(other_out, dtype=np.float64)
    x, first, second = np.broadcast_arrays(x, first, second)
    u_first, v_first = x - first, x + first
    # the second gate drives the first: its input is y, its output x; u falls with y
    u_second, v_second = (second - x)[..., ::-1], (x + second)[..., ::-1]
    low = np.maximum(u_first[..., :1], u_second[..., :1])
    high = np.minimum(u_first[..., -1:], u_second[..., -1:])
    # between the nodes of both curves the gap is straight: its extremes lie at nodes
    at = np.clip(np.sort(np.concatenate([u_first, u_second], axis=-1), axis=-1), low, high)
    gap = _rotated(v_first, u_first, at) - _rotated(v_second, u_second, at)
    gap = np.where(np.isnan(gap), 0.0, gap)
    # from left to right: outside -, first eye +, second eye -, outside +
    falls = (gap[..., :-1] > 0.0) & (gap[..., 1:] <= 0.0)
    middle = np.argmax(falls, axis=-1)[..., None]
    order = np.arange(at.shape[-1])
    left = np.where(order <= middle, gap, 0.0).max(axis=-1)
    right = np.where(order > middle, -gap, 0.0).max(axis=-1)
    side = 0.5 * np.minimum(left, right)
    return np.asarray(np.where(falls.any(axis=-1), np.maximum(side, 0.0), 0.0))
