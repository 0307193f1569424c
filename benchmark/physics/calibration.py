"""Calibration of a virtual-source transistor on published targets (layer 3).

The published numbers are the inputs; threshold and injection velocity are what makes the model meet them:

- on-current I(V, V) and off-current I(0, V) fix V_T0 and v;
- a switching capacitance, when published, fixes C_inv (else C_inv is stated);
- an effective current, when published as a target, fixes the mobility (else the mobility is stated).

All access drops are known from the target currents, so no implicit current is solved here: with the internal
voltages given, C_inv follows from V_T0 in closed form, v from a one-dimensional concave equation (Newton from below,
monotone), and V_T0 from ln I(0, V) by the secant rule. Vectorised: every element stops on its own.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from benchmark.physics import drive, virtual_source
from benchmark.physics.virtual_source import Transistor

__all__ = ["Calibration", "Targets", "calibrate"]

Array = NDArray[np.float64]
Number = float | Array

VELOCITY_STEPS = 60
SECANT_STEPS = 40
#: relative agreement at which an element stops
AGREED = 1.0e-12
#: mobilities outside this range mean that the effective current cannot be met [m^2/(V s)]
MOBILITY_RANGE = (1.0e-4, 10.0)


@dataclass(frozen=True)
class Targets:
    """What the transistor must do at ``supply`` [V] (SI; every field broadcasts).

    on_current, off_current: I(V, V) and I(0, V) per width [A/m]. effective_current: [I(V, V/2) + I(V/2, V)]/2 per
    width [A/m] or None. switching_capacitance: full-swing input capacitance with the drain edge counted twice, per
    width [F/m], or None; edge_capacitance: overlap and fringe of one edge per width [F/m].
    """

    supply: Number
    on_current: Number
    off_current: Number
    effective_current: Number | None = None
    switching_capacitance: Number | None = None
    edge_capacitance: Number = 0.0


@dataclass(frozen=True)
class Calibration:
    """Solved values: threshold V_T0 [V], velocity v [m/s], mobility [m^2/(V s)], inversion_capacitance [F/m^2].

    ``solved`` is False where no solution was found (the values are nan there).
    """

    threshold: Array
    velocity: Array
    mobility: Array
    inversion_capacitance: Array
    solved: NDArray[np.bool_]

    def applied_to(self, t: Transistor) -> Transistor:
        """Return the transistor with the solved values."""
        return replace(
            t,
            threshold=self.threshold,
            velocity=self.velocity,
            mobility=self.mobility,
            inversion_capacitance=self.inversion_capacitance,
        )


def calibrate(template: Transistor, targets: Targets) -> Calibration:
    """Solve the free parameters of ``template`` for ``targets``.

    Parameters
    ----------
    template : Transistor
        ``threshold``, ``velocity`` and, where targets fix them, ``mobility`` and ``inversion_capacitance`` are first
        guesses; everything else is kept. Its width does not matter (targets are per width).
    targets : Targets
        Published values at the temperature of ``template.thermal_voltage``.

    Notes
    -----
    The solution meets the targets to better than 1e-9 relative. No solution exists when the channel cannot carry the
    on-current at any velocity (mobility limit), or the effective current lies outside what any mobility gives.
    """
    t = replace(template, width=1.0)
    if targets.effective_current is None:
        return _currents_met(t, targets)

    wanted = np.log(np.asarray(targets.effective_current))
    v = np.asarray(targets.supply, dtype=np.float64)

    def mismatch(log_mobility: Array) -> Array:
        tried = _currents_met(replace(t, mobility=np.exp(log_mobility)), targets).applied_to(t)
        high = virtual_source.drain_current(tried, v, 0.5 * v)
        low = virtual_source.drain_current(tried, 0.5 * v, v)
        return np.asarray(np.log(drive.effective_current(high, low)) - wanted)

    first = np.log(np.asarray(t.mobility, dtype=np.float64)) + np.zeros(_shape(t, targets))
    root, found = _secant(mismatch, first, 0.2, 0.7)
    mobility = np.exp(root)
    found &= (mobility >= MOBILITY_RANGE[0]) & (mobility <= MOBILITY_RANGE[1])
    result = _currents_met(replace(t, mobility=np.where(found, mobility, np.nan)), targets)
    return replace(result, solved=result.solved & found)


def _shape(t: Transistor, targets: Targets) -> tuple[int, ...]:
    """Common shape of everything that takes part."""
    parts = [*vars(t).values(), *vars(targets).values()]
    return np.broadcast_shapes(*(np.shape(part) for part in parts if part is not None))


def _currents_met(t: Transistor, targets: Targets) -> Calibration:
    """Solve threshold, velocity and (with a switching capacitance) C_inv at the stated mobility."""
    shape = _shape(t, targets)
    v = np.asarray(targets.supply, dtype=np.float64)
    off = np.asarray(targets.off_current, dtype=np.float64)
    log_off = np.log(off)

    def with_velocity(threshold: Array) -> Transistor:
        tried = replace(t, threshold=threshold)
        if targets.switching_capacitance is not None:
            tried = replace(tried, inversion_capacitance=_inversion_capacitance(tried, targets))
        return replace(tried, velocity=_velocity(tried, targets))

    def mismatch(threshold: Array) -> Array:
        tried = with_velocity(threshold)
        # an unreachable on-current gives an infinite velocity: nan from here on, and the search steps back
        tried = replace(tried, velocity=np.where(np.isfinite(tried.velocity), tried.velocity, np.nan))
        state = virtual_source.channel_state(tried, np.zeros_like(v), v, off)
        return np.asarray(np.log(state.charge * tried.velocity * state.saturation) - log_off)

    n_phi = np.asarray(t.slope_factor * t.thermal_voltage)
    scale = np.asarray(t.inversion_capacitance * n_phi * t.velocity)
    guess = t.barrier_lowering * v + t.fermi_width * t.thermal_voltage + n_phi * (np.log(scale) - log_off)
    threshold, found = _secant(mismatch, np.asarray(guess) + np.zeros(shape), -0.01, 0.1)
    tried = with_velocity(threshold)
    found &= np.isfinite(tried.velocity)

    def kept(value: Number) -> Array:
        return np.where(found, np.asarray(value) + np.zeros(shape), np.nan)

    return Calibration(
        kept(threshold), kept(tried.velocity), kept(tried.mobility), kept(tried.inversion_capacitance), found
    )


def _inversion_capacitance(t: Transistor, targets: Targets) -> Array:
    """C_inv that gives the switching capacitance at this threshold: Q(V, 0) is proportional to C_inv."""
    v = np.asarray(targets.supply, dtype=np.float64)
    wanted = np.asarray(targets.switching_capacitance)
    full = drive.switching_capacitance(t, v, targets.edge_capacitance)
    edges = 3.0 * np.asarray(targets.edge_capacitance)
    scale = (wanted - edges) / (full - edges)
    return np.where(scale > 0.0, t.inversion_capacitance * scale, np.nan)


def _velocity(t: Transistor, targets: Targets) -> Array:
    """Velocity that carries the on-current at this threshold; infinite where none does.

    v = J |(1, s(v))|_beta with J = I_on/Q and s = V_dsat(v)/V_DSi, straight in v. The right-hand side is convex and the
    start lies below the root, so Newton steps rise to it without overshoot.
    """
    v, on = np.asarray(targets.supply, dtype=np.float64), np.asarray(targets.on_current, dtype=np.float64)
    state = virtual_source.channel_state(t, v, v, on)
    left = v - on * (t.source_resistance + t.drain_resistance)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        flux = np.where(left > 0.0, on / state.charge, np.nan)
        per_velocity = t.length / t.mobility * (1.0 - state.fermi) / left
        at_rest = t.thermal_voltage * state.fermi / left
        beta = np.asarray(t.saturation_exponent)
        reachable = flux * per_velocity < 1.0
        velocity = flux
        for _ in range(VELOCITY_STEPS):
            s = at_rest + per_velocity * velocity
            norm = np.power(1.0 + np.power(s, beta), 1.0 / beta)
            slope = flux * per_velocity * np.power(s / norm, beta - 1.0)
            step = (flux * norm - velocity) / (1.0 - slope)
            velocity = velocity + np.where(reachable, step, 0.0)
            if not np.any(np.abs(step) > AGREED * velocity):
                break
    return np.where(reachable, velocity, np.inf)


def _secant(
    function: Callable[[Array], Array], first: Array, ahead: float, longest: float
) -> tuple[Array, NDArray[np.bool_]]:
    """Root of a vectorised function by the secant rule, with bounded steps; steps back halfway from a nan.

    Returns the roots and where |function| <= ``AGREED`` was reached.
    """
    old, new = first, first + ahead
    f_old, f_new = function(old), function(new)
    for _ in range(SECANT_STEPS):
        done = np.abs(f_new) <= AGREED
        if done.all():
            break
        lost = np.isnan(f_new)
        with np.errstate(divide="ignore", invalid="ignore"):
            step = -f_new * (new - old) / (f_new - f_old)
        step = np.where(np.isfinite(step), np.clip(step, -longest, longest), 0.5 * longest)
        following = np.where(lost, 0.5 * (old + new), new + step)
        following = np.where(done, new, following)
        # a lost point is forgotten; otherwise the newest two points stay
        old, f_old = np.where(lost | done, old, new), np.where(lost | done, f_old, f_new)
        new = following
        f_new = np.where(done, f_new, function(new))
    return new, np.abs(f_new) <= AGREED
