"""Does a chain of these switches keep its levels? Gain, levels and noise margins from the current laws (layer 5)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, Protocol

import numpy as np
from scipy.special import expit

from benchmark.circuits.balance import Balance, gate_balance
from benchmark.circuits.conductance_grid import conductance_grid, settle
from benchmark.circuits.unity_gain import (
    Index,
    corner,
    corner_start,
    peak_start,
    steepness,
    triple,
)
from benchmark.devices.record import Array, BoolArray, SwitchPair
from benchmark.errors import UsageError
from benchmark.physics.limits import thermal_noise_voltage

__all__ = ["Functional", "functional"]

#: the change over the last halving does not see what both halvings share; measured: 2e-6 for transistors, up to
#: 1e-4 for laws with kinks
_ERROR_FLOOR = 1e-4

#: passes of the chain of gates; a stage that regenerates settles within a few
_CHAIN = 24
#: curves side by side: 0 the gate with the weak low level (NAND), 1 the one with the weak high level (NOR);
#: zones: corner of 0, corner of 1, peak of 0, peak of 1
_ZONE_CURVES = [0, 1, 0, 1]
_MIDDLE_CURVES = [curve for curve in _ZONE_CURVES for _ in range(2)]


@dataclass(frozen=True)
class Functional:
    """What a chain of k-input gates keeps. Shape S; voltages in volts. See ``functional`` for the definitions.

    noise_margin [1]
        Smaller noise margin as a fraction of the supply, every stage of a chain disturbed at once.
    noise_margin_low, noise_margin_high [V]
        V_IL - V_out(V_IH) and V_out(V_IL) - V_IH.
    single_margin [1]
        Smaller margin as a fraction of the supply when one stage is disturbed and all others are quiet: measured
        from the levels a chain reaches. Never below ``noise_margin``.
    gain [1]
        Largest |dV_out/dV_in|, of the weaker of the two gates.
    v_ol, v_oh [V]
        Levels that a long chain reaches from the rails.
    v_il, v_ih [V]
        Inputs of unity gain that bound the low and the high level.
    regenerates
        Gain above 1, a positive margin and two distinct levels.
    error [1]
        Estimated error of ``noise_margin`` by the fast method. Where the gain is 1 or less, or a chain does not
        regenerate, the margin is no number to trust, only a failure.
    supply [V], temperature [K]
        Of the point.
    """

    noise_margin: Array
    noise_margin_low: Array
    noise_margin_high: Array
    single_margin: Array
    gain: Array
    v_ol: Array
    v_oh: Array
    v_il: Array
    v_ih: Array
    regenerates: BoolArray
    error: Array
    supply: Array
    temperature: Array

    def half_swing_over_noise(self, node_capacitance: Array) -> Array:
        """Return half the swing a chain reaches over sqrt(k T / C) [1]; C [F] of the whole node, shape S."""
        noise = thermal_noise_voltage(node_capacitance, self.temperature)
        return np.asarray(0.5 * (self.v_oh - self.v_ol) / noise)


class _Solver(Protocol):
    """How outputs are found: nodes of the first look, rounds of refinement, and z of the output at an input level."""

    nodes: int
    rounds: int

    def rough(self, balance: Balance, level: Array) -> Array:
        """Return z at the nodes of the first look."""

    def exact(self, balance: Balance, level: Array, start: Array, corrections: int = 2) -> Array:
        """Return z anywhere; ``start`` is a value nearby."""


class _Fast:
    nodes = 17
    rounds = 6

    def __init__(self, balance: Balance) -> None:
        self.grid = conductance_grid(balance, self.nodes)

    def rough(self, balance: Balance, level: Array) -> Array:
        return self.grid.solve(balance, level)

    def exact(self, balance: Balance, level: Array, start: Array, corrections: int = 2) -> Array:
        return settle(self.grid, balance, level, start, corrections)


class _Accurate:
    nodes = 129
    rounds = 14

    def rough(self, balance: Balance, level: Array) -> Array:
        return balance.solve(level)

    def exact(self, balance: Balance, level: Array, start: Array, corrections: int = 2) -> Array:
        return balance.solve(level)


def _both_gates(pair: SwitchPair, fan_in: int) -> Balance:
    """Return the weak-low gate (column 0) and the weak-high gate (column 1), hysteresis against each."""
    low, high = gate_balance(pair, fan_in, 1, "up"), gate_balance(pair, 1, fan_in, "down")
    return Balance(
        pair,
        low.supply,
        np.concatenate([low.log_ratio, high.log_ratio], axis=-1),
        np.concatenate([low.lead_down, high.lead_down], axis=-1),
        np.concatenate([low.lead_up, high.lead_up], axis=-1),
    )


@dataclass(frozen=True)
class _Zones:
    """Triples of the four zones: position u (from the supply downwards for gate 0) and output z; S + (4, 3)."""

    u: Array
    z: Array

    def corners(self, no_corner: BoolArray, at_edge: BoolArray) -> tuple[Array, Array]:
        """Return u and y of the two corners, S + (2,); the peak where there is no corner, the rail at the edge."""
        u, y = self.u, expit(self.z)
        position, output = corner(u[..., :2, :], y[..., :2, :])
        position = np.where(no_corner, u[..., 2:, 1], np.where(at_edge, u[..., :2, 0], position))
        output = np.where(no_corner, y[..., 2:, 1], np.where(at_edge, y[..., :2, 0], output))
        return np.asarray(position), np.asarray(output)

    def gain(self) -> Array:
        """Return the largest steepness of each gate, S + (2,)."""
        return np.asarray(steepness(self.u, expit(self.z))[..., 2:, :].max(axis=-1))


def _levels_at(u: Array) -> Array:
    """Return the input level of positions u of the four zones, S + (4, n)."""
    return np.asarray(np.where(np.array(_ZONE_CURVES)[:, None] == 0, 1.0 - u, u))


def _first_zones(both: Balance, solver: _Solver) -> tuple[_Zones, BoolArray, BoolArray]:
    """Return the zones from a first look at the whole curves, where there is no corner, where it is at the rail."""
    n = solver.nodes
    level = np.linspace(0.0, 1.0, n)
    shape = both.supply.shape[:-1]
    levels = np.broadcast_to(np.concatenate([level[::-1], level]), (*shape, 2 * n))
    z = solver.rough(both.columns([0] * n + [1] * n), levels).reshape(*shape, 2, n)
    u = np.broadcast_to(level, z.shape)
    s = steepness(u, expit(z))
    first, exists, at_edge = corner_start(s)
    start = np.concatenate([first, peak_start(s)], axis=-1)
    u, z = triple(u[..., _ZONE_CURVES, :], start), triple(z[..., _ZONE_CURVES, :], start)
    columns = [curve for curve in _ZONE_CURVES for _ in range(3)]
    flat = (*shape, 12)
    z = solver.exact(both.columns(columns), _levels_at(u).reshape(flat), z.reshape(flat)).reshape(u.shape)
    return _Zones(u, z), ~exists, at_edge


def _refined(both: Balance, solver: _Solver, zones: _Zones) -> _Zones:
    """Halve the intervals of every triple and keep the better three of five nodes."""
    middle = 0.5 * (zones.u[..., :-1] + zones.u[..., 1:])
    nearby = 0.5 * (zones.z[..., :-1] + zones.z[..., 1:])
    flat = (*middle.shape[:-2], 8)
    z = solver.exact(both.columns(_MIDDLE_CURVES), _levels_at(middle).reshape(flat), nearby.reshape(flat))
    nodes = np.empty((*middle.shape[:-1], 5))
    outputs = np.empty_like(nodes)
    nodes[..., ::2], nodes[..., 1::2] = zones.u, middle
    outputs[..., ::2], outputs[..., 1::2] = zones.z, z.reshape(middle.shape)
    s = steepness(nodes, expit(outputs))
    crossing: Index = np.argmax((s[..., :-1] < 1.0) & (s[..., 1:] >= 1.0), axis=-1)
    start = np.where(np.arange(4) < 2, crossing, peak_start(s))
    return _Zones(triple(nodes, start), triple(outputs, start))


def _no_current(both: Balance) -> BoolArray:
    """Return where a current is nan at some input level of a coarse sweep with the output at half the supply."""
    level = np.broadcast_to(np.linspace(0.0, 1.0, 9), (*both.supply.shape[:-1], 9))
    one = both.columns([0] * 9)
    return np.asarray(np.isnan(one.residual(level, np.zeros_like(level))).any(axis=-1))


def _levels(both: Balance, solver: _Solver) -> tuple[Array, Array]:
    """Return (v_ol, v_oh) / V of a long chain that alternates the two gates, started at the supply."""
    weak_low, weak_high = both.columns([0]), both.columns([1])
    high = np.ones_like(both.supply)
    z_low = solver.rough(weak_low, high)
    z_high = solver.rough(weak_high, np.zeros_like(high))
    for _ in range(_CHAIN):
        z_low = solver.exact(weak_low, high, z_low, 1)
        z_high = solver.exact(weak_high, expit(z_low), z_high, 1)
        high = expit(z_high)
    return expit(z_low)[..., 0], high[..., 0]


def functional(pair: SwitchPair, fan_in: int = 1, accuracy: Literal["fast", "accurate"] = "fast") -> Functional:
    """Return gain, levels and noise margins of the worst chain of k-input gates.

    Parameters
    ----------
    pair : SwitchPair
        The pair at any number of points S.
    fan_in : int
        k, inputs of every gate.
    accuracy : {"fast", "accurate"}
        fast: a coarse table of each current (119 evaluations per point and switch) and about 180 evaluations near
        the points that matter. accurate: every output by bisection, some 30 000 evaluations; the measure of the
        fast one.

    Returns
    -------
    Functional
        Elements where a current is nan have nan results and do not regenerate.

    Notes
    -----
    Worst chain: k-input NANDs drive k-input NORs and the reverse. The low level is set by k closed pull-down
    switches in series against k open pull-up switches in parallel, the high level by the mirror image; all inputs
    move together. No other input state and no mixture with gates of fewer inputs has a worse level or threshold.
    Ohmic switches with ideal inputs: V_OL/V = 1/(1 + rho/k^2).

    Noise margins: between the outer points of unity gain, V_IL of the NOR and V_IH of the NAND, with the outputs at
    these inputs: the steady noise that every stage bears at once, equal to the largest square between the curves
    when they are mirror images. A curve that is nowhere steeper than 1 has its steepest point in their place; the
    margin of inverters is then 0.

    Hysteresis: each margin is taken with the switch that should have opened still on its opening branch
    (``benchmark.circuits.balance``), so the window between opening and closing is taken from the margin.

    Fast method: the bracket of a unity-gain point is V/8 at first and is halved six times with corrected outputs; a
    law with a jump is resolved to V/1000. Gains are secants over that distance: 0.1 % low at 10, several times too low
    above 100. 0.2 to 0.4 ms per point (own measurement). Memory grows by about 20 kB per point; call it with some
    thousand points at a time (the closures of a pair cannot be cut into blocks here).
    """
    both = _both_gates(pair, fan_in)
    if accuracy == "fast":
        solver: _Solver = _Fast(both)
    elif accuracy == "accurate":
        solver = _Accurate()
    else:
        message = f"accuracy must be 'fast' or 'accurate', found {accuracy!r}"
        raise UsageError(message)

    bad = _no_current(both)
    zones, no_corner, at_edge = _first_zones(both, solver)
    previous = zones
    for _ in range(solver.rounds):
        previous, zones = zones, _refined(both, solver, zones)

    def margins(some: _Zones) -> tuple[Array, Array, Array, Array]:
        position, output = some.corners(no_corner, at_edge)
        v_ih, v_il = 1.0 - position[..., 0], position[..., 1]
        return v_il, v_ih, v_il - output[..., 0], output[..., 1] - v_ih

    v_il, v_ih, margin_low, margin_high = margins(zones)
    _, _, last_low, last_high = margins(previous)
    low, high = _levels(both, solver)
    gain = zones.gain().min(axis=-1)
    margin = np.minimum(margin_low, margin_high)
    # a slope of 1 that only the refined peak shows: the corner lies within one interval of the first look
    found_late = (no_corner & (zones.gain() > 1.0)).any(axis=-1)
    missed = np.where(found_late, 1.0 / (solver.nodes - 1), 0.0)
    supply = both.supply[..., 0]

    def out(x: Array) -> Array:
        return np.asarray(np.where(bad, np.nan, x))

    return Functional(
        noise_margin=out(margin),
        noise_margin_low=out(margin_low * supply),
        noise_margin_high=out(margin_high * supply),
        single_margin=out(np.minimum(v_il - low, high - v_ih)),
        gain=out(gain),
        v_ol=out(low * supply),
        v_oh=out(high * supply),
        v_il=out(v_il * supply),
        v_ih=out(v_ih * supply),
        regenerates=np.asarray(~bad & (gain > 1.0) & (margin > 0.0) & (high > low)),
        error=out(np.abs(margin - np.minimum(last_low, last_high)) + _ERROR_FLOOR + missed),
        supply=supply,
        temperature=np.broadcast_to(np.asarray(pair.temperature, dtype=np.float64), supply.shape),
    )
