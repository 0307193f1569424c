"""Virtual-source transistor: drain current and channel charge from injection at the source (layer 3).

Equations of the released model v1.0.1 after A. Khakifirooz, O. M. Nayfeh and D. Antoniadis, "A simple semiempirical
short-channel MOSFET current-voltage model continuous across all regions of operation and employing only physical
parameters", IEEE Trans. Electron Devices 56, 1674 (2009). Written for the n sense, path voltage >= 0; a p-type
device is the same with all voltages mirrored. The published model counts in cm; here everything is SI.

With phi = kT/q and internal voltages behind the access resistances R_s, R_d::

    V_GSi = V_GS - I R_s;  V_DSi = V_DS - I (R_s + R_d);  V_BSi = V_BS - I R_s;  n = n0 + n_d V_DS
    V_T(V_B) = V_T0 + gamma (sqrt|phi_b - V_B| - sqrt(phi_b))
    F_pre = 1 / (1 + exp[(V_GS - (V_T(V_BS) - delta V_DSi)) / (1.5 alpha phi)])
    ab = 2 (1 - 0.99 F_pre) phi;  V_corr = (1 + 2 delta) (ab / 2) exp(-V_DSi / ab)
    y = V_GSi + V_corr - V_T(V_BSi + V_corr) + delta V_DSi
    F_f = 1 / (1 + exp[(y + alpha phi / 2) / (alpha phi)])
    Q = C_inv n phi ln(1 + exp[(y + F_f alpha phi) / (n phi)])
    V_dsat = (v L / mu) (1 - F_f) + phi F_f;  r = V_DSi / V_dsat;  F_s = r / (1 + r^beta)^(1/beta)
    I = W Q v F_s

The last line holds I on both sides: it is solved by Newton steps inside a bracket that always holds the root
(the right-hand side falls with I). Validity: L >= about 10 nm, 173 to 423 K, |V_BS| < 1 V, quasi-static, beta >= 1.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from benchmark.constants import BOLTZMANN, ELEMENTARY_CHARGE

__all__ = [
    "Channel",
    "Slopes",
    "Transistor",
    "channel_state",
    "drain_current",
    "intrinsic_slopes",
    "power_law",
    "slope_factor",
    "thermal_voltage",
    "threshold_at",
]

Array = NDArray[np.float64]
Number = float | Array

#: Newton steps allowed; 4 to 7 are needed, the rest is margin for the bisection steps of the safeguard
STEPS = 40
#: a step this small (relative) leaves an error of its square: below 1e-15
SMALL_STEP = 1.0e-8
#: elements below which picking some costs more than it saves
FEW = 512
#: elements solved at once, so that their arrays stay in the cache
PIECE = 8192


@dataclass(frozen=True)
class Transistor:
    """Parameters of one virtual-source transistor (SI; every field broadcasts).

    width W [m], length L [m] (gate length minus correction), inversion_capacitance C_inv [F/m^2],
    source_resistance and drain_resistance R_s, R_d times width [ohm m], velocity v [m/s], mobility mu [m^2/(V s)],
    threshold V_T0 [V], slope_factor n0 [1], barrier_lowering delta [V/V], fermi_width alpha [1],
    saturation_exponent beta [1], thermal_voltage phi [V], punch_through n_d [1/V], body_factor gamma [sqrt V]
    (None: no body effect), body_potential phi_b [V].
    """

    width: Number
    length: Number
    inversion_capacitance: Number
    source_resistance: Number
    drain_resistance: Number
    velocity: Number
    mobility: Number
    threshold: Number
    slope_factor: Number
    barrier_lowering: Number
    fermi_width: Number
    saturation_exponent: Number
    thermal_voltage: Number
    punch_through: Number = 0.0
    body_factor: Number | None = None
    body_potential: Number = 1.2


@dataclass(frozen=True)
class Channel:
    """State at the virtual source: charge Q [C/m^2], F_s [1], V_dsat [V], F_f [1]."""

    charge: Array
    saturation: Array
    saturation_voltage: Array
    fermi: Array


@dataclass(frozen=True)
class Slopes:
    """Current I [A] and its derivatives by gate and drain voltage [S] (source and body fixed)."""

    current: Array
    by_control: Array
    by_path: Array


@dataclass(frozen=True)
class _Inner:
    """Current and its derivatives by the internal voltages and by the external gate voltage."""

    current: Array
    by_gate: Array
    by_drain: Array
    by_body: Array | None
    by_outer_gate: Array


def thermal_voltage(temperature: Number) -> Number:
    """Return phi = k T / q [V] at ``temperature`` [K]."""
    return (BOLTZMANN / ELEMENTARY_CHARGE) * temperature


def slope_factor(swing: Number, temperature: Number) -> Number:
    """Return n0 = S / (phi ln 10) [1] from a subthreshold swing S [V/decade] at ``temperature`` [K].

    1 at the thermionic limit (59.5 mV/decade at 300 K); below 1 no such transistor exists.
    """
    limit: Number = thermal_voltage(temperature) * np.log(10.0)
    return swing / limit


def threshold_at(threshold: Number, slope: Number, rise: Number) -> Number:
    """Return the threshold V_T0 + (dV_T/dT) (T - T0) [V]; slope [V/K], rise T - T0 [K]. Linear law, from memory."""
    return threshold + slope * rise


def power_law(value: Number, exponent: Number, ratio: Number) -> Number:
    """Return ``value`` (T/T0)^exponent: mobility (-1 to -1.5) and injection velocity (-0.3 to -0.5), from memory."""
    raised: Number = np.power(ratio, exponent)
    return value * raised


def _half_logistic(z: Array) -> Array:
    """1 / (1 + exp(z)) without overflow, as (1 - tanh(z/2)) / 2 would lose the tail: exp of a bounded argument."""
    return 1.0 / (1.0 + np.exp(np.minimum(z, 700.0)))


def _softplus(z: Array) -> tuple[Array, Array]:
    """ln(1 + exp z) and its derivative, without overflow."""
    small = np.exp(-np.abs(z))
    value = np.maximum(z, 0.0) + np.log1p(small)
    slope = np.where(z >= 0.0, 1.0, small) / (1.0 + small)
    return value, slope


def _threshold(t: Transistor, body: Number) -> tuple[Number, Number]:
    """V_T(V_B) and its derivative."""
    if t.body_factor is None:
        return t.threshold, 0.0
    root = np.sqrt(np.abs(t.body_potential - body))
    shift = t.body_factor * (root - np.sqrt(t.body_potential))
    return t.threshold + shift, -t.body_factor / (2.0 * root)


def _channel(
    t: Transistor, outer: tuple[Array, Number], inner: tuple[Array, Array, Number], n: Number
) -> tuple[Channel, _Inner]:
    """Evaluate the model at given external (gate, body) and internal (gate, drain, body) voltages."""
    (gate, body), (gate_i, drain_i, body_i) = outer, inner
    phi, delta, beta = t.thermal_voltage, t.barrier_lowering, t.saturation_exponent
    wide = t.fermi_width * phi
    f_pre = _half_logistic((gate - _threshold(t, body)[0] + delta * drain_i) / (1.5 * wide))
    ab = 2.0 * phi * (1.0 - 0.99 * f_pre)
    ratio = drain_i / ab
    correction = (0.5 + delta) * ab * np.exp(-ratio)
    vt, vt_slope = _threshold(t, body_i + correction)
    y = gate_i + correction - vt + delta * drain_i
    f_f = _half_logistic(y / wide + 0.5)
    soft, soft_slope = _softplus((y + f_f * wide) / (n * phi))
    charge = t.inversion_capacitance * n * phi * soft
    v_sat = t.velocity * t.length / t.mobility
    v_dsat = v_sat + (phi - v_sat) * f_f
    r = drain_i / v_dsat
    power = np.power(r, beta)
    below = np.power(1.0 + power, -1.0 / np.asarray(beta))
    channel = Channel(charge, r * below, v_dsat, f_f)
    # derivatives: by y, by the drain at fixed y, then the chain through the correction
    wv = t.width * t.velocity
    rise = below / (1.0 + power)  # dF_s/dr
    fermi_slope = f_f * (1.0 - f_f)
    by_y = wv * (
        t.inversion_capacitance * soft_slope * (1.0 - fermi_slope) * channel.saturation
        - charge * rise * r / v_dsat * (phi - v_sat) * (-fermi_slope / wide)
    )
    pre_slope = 1.98 / (1.5 * t.fermi_width) * f_pre * (1.0 - f_pre)  # d(ab)/d(gate)
    by_ab = (correction / ab) * (1.0 + ratio)
    moved = 1.0 - vt_slope  # dy/d(correction)
    correction_by_drain = by_ab * pre_slope * delta - correction / ab
    by_drain = wv * charge * rise / v_dsat + by_y * (delta + moved * correction_by_drain)
    current = wv * charge * channel.saturation
    by_body = None if t.body_factor is None else -by_y * vt_slope
    return channel, _Inner(current, by_y, by_drain, by_body, by_y * moved * by_ab * pre_slope)


def channel_state(t: Transistor, control: Array, path: Array, current: Number = 0.0) -> Channel:
    """Return charge, saturation function and saturation voltage [``Channel``].

    Parameters
    ----------
    t : Transistor
    control, path : array_like
        External gate-source and drain-source voltage (>= 0) [V], body at the source.
    current : array_like
        Drain current [A] that flows through the access resistances; 0: the voltages are the internal ones.
    """
    gate, drain = np.asarray(control, dtype=np.float64), np.asarray(path, dtype=np.float64)
    return _inside(t, gate, drain, 0.0, np.asarray(current))[0]


def _resistances(t: Transistor) -> tuple[Number, Number]:
    """Source resistance and source plus drain resistance [ohm] of this width."""
    source = t.source_resistance / t.width
    return source, source + t.drain_resistance / t.width


def _inside(t: Transistor, gate: Array, drain: Array, body: Number, current: Array) -> tuple[Channel, _Inner]:
    """Evaluate the model with the voltages that ``current`` leaves inside the access resistances."""
    r_s, r_t = _resistances(t)
    drop = current * r_s
    n = t.slope_factor + t.punch_through * drain
    body_i = body if t.body_factor is None else body - drop
    left = np.maximum(drain - current * r_t, 0.0)
    return _channel(t, (gate, body), (gate - drop, left, body_i), n)


def _fall(t: Transistor, inner: _Inner) -> Array:
    """-d(right-hand side)/dI: how fast the model current falls with the current through the access resistances."""
    r_s, r_t = _resistances(t)
    by_source = inner.by_gate if inner.by_body is None else inner.by_gate + inner.by_body
    return np.asarray(r_s * by_source + r_t * inner.by_drain)


def _solve(t: Transistor, gate: Array, drain: Array, body: Number) -> Array:
    """Solve I = I_model(I): Newton inside a bracket; each element stops on its own, whatever its neighbours do."""
    _, inner = _inside(t, gate, drain, body, np.zeros(()))
    _, r_t = _resistances(t)
    if not np.any(np.asarray(r_t) > 0.0):
        return inner.current
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        high = np.where(drain > 0.0, np.where(r_t > 0.0, drain / r_t, inner.current), 0.0)
    unknown = np.isnan(inner.current)
    nothing = np.zeros_like(high)
    current = _newton(t, (gate, drain, body), inner, _Bracket(nothing, nothing, high, ~(high > 0.0) | unknown), STEPS)
    return np.where(unknown, np.nan, current)


@dataclass(frozen=True)
class _Bracket:
    """Where the current is looked for: the last guess, between two bounds; ``done`` marks what is found."""

    current: Array
    low: Array
    high: Array
    done: NDArray[np.bool_]


def _newton(
    t: Transistor, voltages: tuple[Array, Array, Number], inner: _Inner, bracket: _Bracket, steps: int
) -> Array:
    """Newton steps from a bracket and the model evaluated at its guess; most need two, so the others go on alone."""
    current, low, high, done = bracket.current, bracket.low, bracket.high, bracket.done
    for step in range(steps):
        excess = inner.current - current
        low, high = np.where(excess > 0.0, current, low), np.where(excess < 0.0, current, high)
        newton = current + excess / (1.0 + _fall(t, inner))
        following = np.where((newton >= low) & (newton <= high), newton, 0.5 * (low + high))
        following = np.where(done, current, following)
        done = done | (np.abs(following - current) <= np.where(following == newton, SMALL_STEP, 1.0e-15) * following)
        current = following
        if done.all():
            break
        if step and done.size > FEW and 2 * np.count_nonzero(done) > done.size:
            rest = ~done
            alone, (gate, drain, body) = _of(t, voltages, rest)
            left = _Bracket(current[rest], low[rest], high[rest], done[rest])
            current = current.copy()
            inner = _inside(alone, gate, drain, body, left.current)[1]
            current[rest] = _newton(alone, (gate, drain, body), inner, left, steps - step - 1)
            break
        _, inner = _inside(t, *voltages, current)
    return current


def _of(
    t: Transistor, voltages: tuple[Array, Array, Number], elements: NDArray[np.bool_]
) -> tuple[Transistor, tuple[Array, Array, Number]]:
    """Return transistors and voltages of some elements, one after the other."""

    def picked(value: Any) -> Any:
        return value if np.ndim(value) == 0 else np.broadcast_to(value, elements.shape)[elements]

    named = {item.name: picked(getattr(t, item.name)) for item in fields(t)}
    gate, drain, body = (picked(value) for value in voltages)
    return Transistor(**named), (gate, drain, body)


def drain_current(t: Transistor, control: Array, path: Array, body: Number = 0.0) -> Array:
    """Return the drain current [A]; equations in the module docstring.

    Parameters
    ----------
    t : Transistor
    control, path, body : array_like
        External gate-source, drain-source (>= 0) and body-source voltage [V]; broadcast with the parameters.

    Notes
    -----
    Accurate to 1e-12 relative against the equation solved in 40 digits. Access resistances included. Rises with the
    control voltage; with the path voltage too, except that V_corr lets it fall by up to 0.5 % where nothing else rises
    (no barrier lowering together with v L / mu below about 0.05 V).
    """
    gate, drain = np.asarray(control, dtype=np.float64), np.asarray(path, dtype=np.float64)
    named = {item.name: getattr(t, item.name) for item in fields(t)}
    shape = np.broadcast_shapes(gate.shape, drain.shape, *(np.shape(value) for value in (body, *named.values())))
    if (size := int(np.prod(shape))) <= PIECE:
        return _solve(t, gate, drain, body)
    found = np.empty(shape)
    axis = int(np.argmax(shape))
    step = max(1, PIECE * shape[axis] // size)
    for start in range(0, shape[axis], step):
        place = (slice(None),) * axis + (slice(start, start + step),)
        part = Transistor(**{name: _cut(value, place, shape) for name, value in named.items()})
        found[place] = _solve(part, *(_cut(voltage, place, shape) for voltage in (gate, drain, body)))
    return found


def _cut(value: Any, place: tuple[slice, ...], shape: tuple[int, ...]) -> Any:
    """Return a piece of something that broadcasts to ``shape``."""
    axis = len(place) - 1 - len(shape) + np.ndim(value)
    return value if axis < 0 or np.shape(value)[axis] == 1 else value[place[len(shape) - np.ndim(value) :]]


def intrinsic_slopes(t: Transistor, control: Array, path: Array) -> Slopes:
    """Return current [A], transconductance and output conductance [S] at *internal* voltages: one evaluation.

    Body at the source. F_pre takes the internal for the external gate voltage (up to 0.3 % of the current with access
    resistance). Same arguments as ``drain_current``; the share of n_d in the output conductance is left out.
    """
    gate, drain = np.asarray(control, dtype=np.float64), np.asarray(path, dtype=np.float64)
    bare = replace(t, source_resistance=0.0, drain_resistance=0.0)
    _, inner = _inside(bare, gate, drain, 0.0, np.zeros(()))
    return Slopes(inner.current, inner.by_gate + inner.by_outer_gate, inner.by_drain)
