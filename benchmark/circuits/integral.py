"""Delay rule ``integral``: the closing switch discharges the node while its actuator is still under way (layer 5).

The plain rule asks when the conductance has done the work of ln 2 (exact for a path that obeys Ohm's law)::

    integral_0^t dt' / (R(y(t')) C) = ln 2

y is the control of the switch over the supply. Here the switch that opens may be counted too; the node is then the
linear equation with two moving conductances::

    C dv/dt = G_opening(1 - y) (1 - v) - G_closing(y) v,    v(0) = 1,    delay at v = 1/2

The control y is the response of the actuator

- to an ideal step (``drive="step"``), or
- to the output of a stage before it, an exponential 1 - exp(-t/R C) with the stage's own R C, counted from its 50 %
  point (``drive="chain"``).

The actuator is the two-pole of ``natural_frequency`` and ``quality``; where that is nan, the control is the drive
itself and the load-independent time is added. Overshoot is held at the rail. Of a ringing control the first crossing
counts.

Error against the transient of chains of log-linear switches (own; 2 to 6 decades, tau/RC 0 to 100, Q 0.5 to 3), with
the opening switch: windows within 0.1..0.9 of the swing -3.4 to +3.7 %, most within 1 %; a window that fills the swing
-12 to +4 %, at tau/RC = 1 down to -20 %. Without the opening switch down to -54 % where it matters (2 decades and slow
actuators, or windows below half the swing). Behind a step: 0.3 %.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np

from benchmark.circuits.chain_rule import STEP_FACTOR
from benchmark.devices.record import Array, Switch
from benchmark.physics.two_pole import step_response, time_to_level

__all__ = ["IntegralFactors", "integral_delay", "integral_factors"]

Drive = Literal["chain", "step"]

_CHUNKS = 24
_CHUNK = 64
_STEPS = _CHUNKS * _CHUNK
#: the march ends when the actuator has come this near and the drive has had this many R C
_NEAR = 0.995
_TAIL = 12.0
#: half step of R C for the derivative in ``integral_factors``
_DELTA = 0.05


@dataclass(frozen=True)
class IntegralFactors:
    """The delay as ``transit + factor * R C``: transit [s]; factor [1] = d(delay)/d(R C) at this point; delay [s]."""

    transit: Array
    factor: Array
    delay: Array


@dataclass(frozen=True)
class _March:
    """Time steps in R C: grid of controls is produced chunk by chunk."""

    step: Array  # S + (1,), in R C
    drive: Drive
    frequency: Array  # S + (1,), w0 R C; nan: no actuator
    quality: Array

    def target(self, first: int) -> Array:
        """Return the step response of the actuator at nodes first .. first + _CHUNK, S + (_CHUNK + 1,)."""
        t = self.step * np.arange(first, first + _CHUNK + 1)
        with_actuator = np.isfinite(self.frequency)
        phase = np.where(with_actuator, self.frequency, 0.0) * t
        response = step_response(phase, np.where(with_actuator, self.quality, 1.0))
        return np.asarray(np.where(with_actuator, response, 1.0))

    def control(self, first: int, start: Array) -> Array:
        """Return the control at these nodes; ``start`` S + (1,) is its value at the first one."""
        target = self.target(first)
        if self.drive == "step":
            return target
        # the drive's lag of one R C acts after the actuator just as well: y' = target - y, target straight per step
        decay = np.exp(-self.step)
        mean = -np.expm1(-self.step) / self.step
        shape = target.shape
        y = np.empty(shape)
        y[..., :1] = start
        for k in range(_CHUNK):
            old, new = target[..., k : k + 1], target[..., k + 1 : k + 2]
            y[..., k + 1 : k + 2] = y[..., k : k + 1] * decay + old * (mean - decay) + new * (1.0 - mean)
        return y


def _relative_conductance(switch: Switch, supply: Array, level: Array, path: float) -> Array:
    """Return I(level V, path V) / I(V, path V) [1]: conductance relative to fully closed."""
    across = np.broadcast_to(path * supply, level.shape)
    full = switch.current(np.broadcast_to(supply, (*level.shape[:-1], 1)), across[..., :1])
    return np.asarray(switch.current(np.clip(level, 0.0, 1.0) * supply, across) / full)


def _shape(*values: Array) -> tuple[int, ...]:
    return np.broadcast_shapes(*(np.shape(x) for x in values))


def _column(value: Array, shape: tuple[int, ...]) -> Array:
    return np.broadcast_to(np.asarray(value, dtype=np.float64), shape)[..., None]


def _march(closing: Switch, opening: Switch | None, supply: Array, time: Array, drive: Drive) -> Array:
    """Return the time of v = 1/2 in R C from the start of the drive; nan where it is not reached."""
    shape = _shape(supply, time, closing.resistance)
    unit = _column(time, shape)
    volts = _column(supply, shape)

    def actuator(switch: Switch) -> tuple[Array, Array, Array]:
        frequency = _column(switch.natural_frequency, shape)
        quality = _column(switch.quality, shape)
        near = time_to_level(_NEAR, frequency, quality) / unit
        return frequency * unit, quality, np.where(np.isfinite(frequency), near, 0.0)

    w_closing, q_closing, near = actuator(closing)
    side = closing if opening is None else opening
    w_opening, q_opening, near_opening = actuator(side)
    step = (np.maximum(near, near_opening) + _TAIL) / _STEPS
    fast, slow = _March(step, drive, w_closing, q_closing), _March(step, drive, w_opening, q_opening)
    v = np.ones((*shape, 1))
    found = np.full((*shape, 1), np.nan)
    y_closing, y_opening = np.zeros((*shape, 1)), np.zeros((*shape, 1))
    ratio = _column(closing.resistance / side.resistance, shape)
    for chunk in range(_CHUNKS):
        first = chunk * _CHUNK
        control = fast.control(first, y_closing)
        pull = _relative_conductance(closing, volts, 0.5 * (control[..., 1:] + control[..., :-1]), 0.75)
        y_closing = control[..., -1:]
        hold = np.zeros_like(pull)
        if opening is not None:
            other = slow.control(first, y_opening)
            left = 1.0 - 0.5 * (other[..., 1:] + other[..., :-1])
            hold = ratio * _relative_conductance(opening, volts, left, 0.25)
            y_opening = other[..., -1:]
        total = pull + hold
        rest = np.where(total > 0.0, hold / np.where(total > 0.0, total, 1.0), 1.0)
        decay = np.exp(-total * step)
        for k in range(_CHUNK):
            settled, rate = rest[..., k : k + 1], total[..., k : k + 1]
            new = settled + (v - settled) * decay[..., k : k + 1]
            crosses = np.isnan(found) & (v > 0.5) & (new <= 0.5)
            left = np.where(crosses, np.maximum(0.5 - settled, 1e-300), 1.0)
            inside = np.log(np.where(crosses, (v - settled) / left, 1.0))
            at = first * step + k * step + np.minimum(inside / np.where(crosses, rate, 1.0), step)
            found = np.where(crosses, at, found)
            v = new
    return np.asarray(found[..., 0])


def integral_delay(
    closing: Switch,
    supply: Array,
    load_capacitance: Array,
    *,
    resistance: Array | None = None,
    opening: Switch | None = None,
    transit: Array | None = None,
    drive: Drive = "chain",
) -> Array:
    """Return the 50 % delay of an edge by the integral rule.

    Parameters
    ----------
    closing : Switch
        The switch that closes and drives the edge.
    supply : array_like
        V [V].
    load_capacitance : array_like
        C, all of it [F].
    resistance : array_like, optional
        Resistance of the driving path [ohm]; that of ``closing`` when absent. The path of the opening switch is
        scaled by the same ratio.
    opening : Switch, optional
        The switch of the other polarity, to count what it still conducts.
    transit : array_like, optional
        Load-independent time without a two-pole actuator [s]; ``closing_time`` when absent. Not used where
        ``natural_frequency`` is finite: the actuator is that time.
    drive : {"chain", "step"}
        Behind a stage alike, or behind an ideal step.

    Returns
    -------
    ndarray
        Delay [s]; nan where the output does not reach half the swing (the switch does not switch), or a current is
        nan.

    Notes
    -----
    For a resistance of kind ``effective`` (current source, the slope of the input already counted) the rule is
    transit + ln 2 R C. 1536 steps of the exponential midpoint rule: 0.1 % for tau/RC from 0.05 to 100.
    """
    path = closing.resistance if resistance is None else resistance
    late = closing.closing_time if transit is None else transit
    time = np.asarray(path * load_capacitance, dtype=np.float64)
    if closing.resistance_kind == "effective":
        return np.asarray(late + STEP_FACTOR * time + 0.0 * supply)
    start = STEP_FACTOR if drive == "chain" else 0.0
    delay = (_march(closing, opening, np.asarray(supply), time, drive) - start) * time
    return np.asarray(delay + np.where(np.isfinite(closing.natural_frequency), 0.0, late))


def integral_factors(
    closing: Switch,
    supply: Array,
    load_capacitance: Array,
    *,
    resistance: Array | None = None,
    opening: Switch | None = None,
    transit: Array | None = None,
    drive: Drive = "chain",
) -> IntegralFactors:
    """Return the integral delay split into a load-independent time and a factor of R C. Parameters as above.

    The factor is the derivative of the delay by R C (central difference over +-5 %), so wire terms that add to R C at
    the margin are counted right; the transit is the rest. Without an actuator the factor is delay / R C exactly
    and does not depend on R C. With a slow actuator the transit contains the actuator, and the factor can exceed the
    one of a fast switch: the resistance still falls while the node discharges.
    """
    path = np.asarray(closing.resistance if resistance is None else resistance)

    def delay(scale: float) -> Array:
        return integral_delay(
            closing,
            supply,
            load_capacitance,
            resistance=path * scale,
            opening=opening,
            transit=transit,
            drive=drive,
        )

    middle = delay(1.0)
    factor = (delay(1.0 + _DELTA) - delay(1.0 - _DELTA)) / (2.0 * _DELTA * path * load_capacitance)
    return IntegralFactors(np.asarray(middle - factor * path * load_capacitance), np.asarray(factor), middle)
