"""Regeneration of two cross-coupled inverters from a small difference: the sense amplifier of a memory (layer 5).

The outputs start x_0 above and below the balance point V_M, where an inverter's output equals its input, and move apart
by the net currents of the two inverters, from each switch's own current law::

    dx/dt = [I(V_M - x, V_M + x) - I(V_M + x, V_M - x)] / (2 C),   I(in, out) = I_up - I_down

t_0 = integral of dx / (dx/dt) from x_0 = start/2 to V/4 (a difference of half the supply), with 24 Gauss-Legendre nodes
in ln x: exact within the current laws for motion symmetric about V_M. Switches that answer late (closing and opening
times t_int) slow it down. With s_0 = ln(V/(4 x_0))/t_0 and a C the output conductance of the inverter at V_M, the loop
is taken as linear, the inputs at rest before::

    dx/dt = (s_0 + a) x(t - t_int) - a x(t),   x = x_0 for t <= 0

It is solved step by step where s_0 t_int is above 0.05; below, by its growth rate s, (s + a) exp(s t_int) = s_0 + a.
Within 1.2 % of a fine solution of the same equation for s_0 t_int up to 20, a up to 3 s_0 and V/(4 x_0) from 1.5 to 100
(own). That the amplifier is enabled in time is assumed.

Not evaluated, with the reason: no gain (the difference does not grow everywhere on the way), hysteresis (closing and
opening laws differ, so there is no single balance point), or a balance point outside the middle half of the supply.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from scipy.special import wrightomega

from benchmark.circuits.balance import record_shape
from benchmark.circuits.circuit import Value
from benchmark.devices.record import Array, BoolArray, SwitchPair

__all__ = ["HYSTERESIS", "NO_GAIN", "OFF_CENTRE", "LatchTime", "latch"]

NO_GAIN = "sense amplifier not evaluated: no gain at its balance point"
HYSTERESIS = "sense amplifier not evaluated: the switch has hysteresis"
OFF_CENTRE = "sense amplifier not evaluated: balance point outside the middle half of the supply"

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(24)
_HALVINGS = 48
#: half step of the output conductance, of the supply
_STEP = 0.01
#: s_0 t_int above which the loop is solved in steps, steps per delay of the loop, and delays after which it is given up
_STEPPED, _PER_DELAY, _MOST_DELAYS = 0.05, 16, 128


@dataclass(frozen=True)
class LatchTime:
    """Delay of a latch [s] in two parts: ``charging`` its nodes, and ``waiting`` for switches that answer late.

    ``unable``: reason -> mask where there is no number (the parts are nan there).
    """

    charging: Array
    waiting: Array
    unable: Mapping[str, BoolArray]


@dataclass(frozen=True)
class _Inverter:
    """Net current into the output of one inverter of unit switches; voltages have the shape S + (n,)."""

    pair: SwitchPair
    supply: Array  # S + (1,)

    def current(self, into: Array, out: Array) -> Array:
        up = self.pair.up.current(self.supply - into, self.supply - out)
        return np.asarray(up - self.pair.down.current(into, out))

    def balance(self) -> Array:
        """Return V_M / V by bisection."""
        low, high = np.zeros_like(self.supply), np.ones_like(self.supply)
        for _ in range(_HALVINGS):
            middle = 0.5 * (low + high)
            rising = self.current(middle * self.supply, middle * self.supply) > 0.0
            low, high = np.where(rising, middle, low), np.where(rising, high, middle)
        return np.asarray(0.5 * (low + high))


def _window(pair: SwitchPair, shape: tuple[int, ...]) -> BoolArray:
    """Return where a switch opens at another voltage than it closes."""
    found = np.zeros(shape, dtype=bool)
    for switch in (pair.down, pair.up):
        window = np.broadcast_to(switch.closing_voltage - switch.opening_voltage, shape)
        found |= np.where(np.isfinite(window), window, 0.0) > 0.0
    return found


def latch(pair: SwitchPair, start: Value, capacitance: Array, transit: Array) -> LatchTime:
    """Return how long a latch of unit inverters takes from a difference of ``start`` [V] to half the supply.

    Parameters
    ----------
    pair : SwitchPair
        The switches.
    start : float or array [V]
        Difference at the beginning; at half the supply and beyond there is nothing to wait for.
    capacitance : array [F]
        Of one node, per unit of inverter size.
    transit : array [s]
        Load-independent time of an inverter.
    """
    shape = np.broadcast_shapes(record_shape(pair), np.shape(start), np.shape(capacitance), np.shape(transit))
    volts = np.broadcast_to(np.asarray(pair.supply, dtype=np.float64), shape)
    made = _Inverter(pair, np.broadcast_to(volts[..., None], (*shape, 1)))
    middle = made.balance()
    centred = np.abs(middle[..., 0] - 0.5) <= 0.25
    held = np.clip(middle, 0.25, 0.75) * made.supply  # path voltages stay within the rails; masked below
    begin = np.broadcast_to(0.5 * np.asarray(start, dtype=np.float64), shape)
    growth = np.maximum(np.log(0.25 * volts) - np.log(begin), 0.0)  # ln of end over begin
    along = 0.5 * growth[..., None] * (_NODES - 1.0)
    x = 0.25 * made.supply * np.exp(along)
    speed = 0.5 * (made.current(held - x, held + x) - made.current(held + x, held - x))  # times C
    gain = (speed > 0.0).all(axis=-1)
    per_farad = (0.5 * growth[..., None] * _WEIGHTS * x / np.where(speed > 0.0, speed, np.inf)).sum(axis=-1)
    hysteresis = _window(pair, shape)
    unable: dict[str, BoolArray] = {
        NO_GAIN: np.asarray(~gain),
        HYSTERESIS: hysteresis,
        OFF_CENTRE: np.asarray(gain & ~centred),
    }
    good = gain & centred & ~hysteresis
    charging = np.where(good, per_farad * capacitance, np.nan)
    step = _STEP * made.supply
    conductance = (made.current(held, held - step) - made.current(held, held + step))[..., 0] / (2.0 * step[..., 0])
    there = np.where(capacitance > 0.0, capacitance, np.inf)  # without charge to move nothing is damped
    damping = np.broadcast_to(np.maximum(conductance, 0.0) / there, shape)
    late = _with_delay(charging, growth, damping, np.broadcast_to(transit, shape))
    return LatchTime(
        np.asarray(charging), np.asarray(late - charging), {why: mask for why, mask in unable.items() if mask.any()}
    )


def _with_delay(time: Array, growth: Array, damping: Array, transit: Array) -> Array:
    """Return the delay [s] of a loop that would take ``time`` if its switches answered at once.

    ``growth``: ln of the end over the beginning [1]; ``damping`` a [1/s]; ``transit`` [s].
    """
    waits = (transit > 0.0) & (growth > 0.0) & np.isfinite(time)
    # everything in units of the transit time, harmless numbers where nothing waits
    unit = np.where(waits, transit, 1.0)
    a = np.where(waits, damping, 0.0) * unit
    at_once = np.where(waits, growth, 0.1) / np.where(waits, time, 1.0) * unit
    rate = wrightomega(np.log(at_once + a) + a) - a
    found = np.array(np.where(waits, growth, 0.0) / np.where(waits, rate, 1.0))
    stepped = waits & (at_once > _STEPPED)
    if stepped.any():
        found[stepped] = _stepped(at_once[stepped], a[stepped], growth[stepped], found[stepped])
    return np.asarray(np.where(waits, found * unit, time))


def _stepped(at_once: Array, a: Array, growth: Array, otherwise: Array) -> Array:
    """Solve the loop in steps of 1/16 of its delay; ``otherwise`` where the end is not reached in 128 delays.

    Within the first delay the driving side still rests, so x = 1 + s_0/a (1 - exp(-a t)), exactly.
    """
    dt = 1.0 / _PER_DELAY
    decay = np.exp(-a * dt)
    slow = a * dt < 1.0e-6
    divisor = np.where(slow, 1.0, a)
    whole = np.where(slow, dt, (1.0 - decay) / divisor)  # integral of exp(-a u) over a step
    late = np.where(slow, 0.5 * dt, (1.0 - whole / dt) / divisor)  # the same, weighted towards the end of the step
    drive, end = at_once + a, np.exp(growth)
    past = [np.ones_like(a)] * (_PER_DELAY + 1)
    x, found, done = np.ones_like(a), otherwise.copy(), np.zeros(a.shape, dtype=bool)
    for step in range(_MOST_DELAYS * _PER_DELAY):
        after = decay * x + drive * (past[0] * (whole - late) + past[1] * late)
        crosses = ~done & (after >= end)
        found[crosses] = (step + ((end - x) / np.where(crosses, after - x, 1.0))[crosses]) * dt
        done |= crosses
        if done.all():
            break
        past = [*past[1:], np.minimum(after, 2.0 * end)]
        x = past[-1]
    rise = (end - 1.0) / at_once
    bent = np.minimum(a * rise, 0.999999)
    first = np.where(bent > 1.0e-9, -np.log1p(-bent) / np.where(a > 0.0, a, 1.0), rise)
    return np.asarray(np.where((a * rise < 0.999999) & (first <= 1.0), first, found))
