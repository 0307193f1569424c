"""Wires: delay of R C lines, repeaters, resistivity of narrow lines, capacitance, time of flight (layer 3).

All functions are elementwise over broadcast arrays, SI throughout, without clipping.
"""

from __future__ import annotations

import math
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from benchmark.constants import SPEED_OF_LIGHT, VACUUM_PERMITTIVITY

__all__ = [
    "COPPER_MEAN_FREE_PATH",
    "COPPER_RESISTIVITY",
    "coupled_line_capacitance",
    "distributed_rc_response",
    "distributed_rc_time",
    "driven_line_delay",
    "elmore_delay",
    "elmore_pi_line",
    "fuchs_sondheimer",
    "fuchs_sondheimer_thick",
    "line_resistance_per_length",
    "mayadas_shatzkes",
    "narrow_line_resistivity",
    "plate_and_edge_capacitance",
    "repeated_line_delay_per_length",
    "repeater_optimum",
    "segmented_line",
    "single_line_capacitance",
    "time_of_flight",
    "uniform_ladder",
]

Array = NDArray[np.float64]

#: bulk copper at 293 K [ohm m] (from memory); 1.712e-8 is also in use with the same mean free path
COPPER_RESISTIVITY: Final = 1.678e-8
#: electron mean free path of copper [m]; Gall, J. Appl. Phys. 119 (2016) 085101 (seen second-hand)
COPPER_MEAN_FREE_PATH: Final = 39.9e-9
#: distributed line behind a step and its rounding for repeater design (Bakoglu & Meindl 1985)
_DISTRIBUTED: Final = 0.4
_LUMPED: Final = 0.7
_SERIES_TERMS: Final = 40
_LN2: Final = math.log(2.0)
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(64)


def _array(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


# ------------------------------------------------------------------------------------------------ R C delay


def elmore_delay(resistance: ArrayLike, capacitance: ArrayLike) -> Array:
    """Return the Elmore time constant [s] at the far end of a chain of sections (last axis).

    tau = sum_k C_k (R_1 + ... + R_k). Section k is R_k [ohm] followed by C_k [F] to ground. The 50 % delay is about
    ln 2 tau (an upper-bound character for R C trees). Elmore, J. Appl. Phys. 19 (1948) 55 (from memory).
    """
    return np.asarray((np.cumsum(_array(resistance), axis=-1) * _array(capacitance)).sum(axis=-1))


def uniform_ladder(resistance: ArrayLike, capacitance: ArrayLike, sections: int) -> Array:
    """Return the Elmore time constant [s] of a line of total R [ohm], C [F] cut into n L-sections: RC (n+1)/(2n)."""
    r, c = np.broadcast_arrays(_array(resistance) / sections, _array(capacitance) / sections)
    repeat = np.ones(sections)
    return elmore_delay(r[..., None] * repeat, c[..., None] * repeat)


def elmore_pi_line(
    driver: ArrayLike, resistance: ArrayLike, capacitance: ArrayLike, load: ArrayLike, segments: int
) -> Array:
    """Return the Elmore time constant [s] of driver [ohm], line in n equal pi segments and load [F].

    R_t (C + C_t) + R (C/2 + C_t), whatever n: half of a segment's capacitance stands at either end.
    """
    r_t, r, c, c_t = np.broadcast_arrays(_array(driver), _array(resistance), _array(capacitance), _array(load))
    piece_r = np.concatenate([r_t[..., None], (r / segments)[..., None] * np.ones(segments)], axis=-1)
    piece_c = (c / segments)[..., None] * np.ones(segments + 1)
    piece_c[..., 0] *= 0.5
    piece_c[..., -1] = 0.5 * piece_c[..., -1] + c_t
    return elmore_delay(piece_r, piece_c)


def distributed_rc_response(time: ArrayLike) -> Array:
    """Return the far-end voltage [1] of an open distributed line behind a unit step.

    ``time`` in units of R C (total resistance times total capacitance) [1], > 0. Series solution of the diffusion
    equation, 1 - (4/pi) sum (-1)^k/(2k+1) exp(-((2k+1) pi/2)^2 t); 40 terms, full precision for t >= 0.003.
    """
    t = _array(time)[..., None]
    odd = 2.0 * np.arange(_SERIES_TERMS) + 1.0
    sign = np.where(np.arange(_SERIES_TERMS) % 2 == 0, 1.0, -1.0)
    decay = np.exp(-np.minimum((odd * math.pi / 2.0) ** 2 * t, 700.0))
    return np.asarray(1.0 - 4.0 / math.pi * (sign / odd * decay).sum(axis=-1))


def distributed_rc_time(level: ArrayLike) -> Array:
    """Return the time [R C] at which an open distributed line behind a step reaches ``level`` [1], 0.01 to 0.9999.

    Exact: 0.3788 R C at 50 %, 1.031 at 90 % (Rabaey's table 0.38, 1.0). Bisection on the series, 60 halvings.
    """
    target = _array(level)
    low, high = np.full(target.shape, 0.003), np.full(target.shape, 10.0)
    for _ in range(60):
        middle = 0.5 * (low + high)
        below = distributed_rc_response(middle) < target
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return np.asarray(0.5 * (low + high))


def driven_line_delay(driver: ArrayLike, resistance: ArrayLike, capacitance: ArrayLike, load: ArrayLike) -> Array:
    """Return the 50 % step delay [s] of driver R_t, line R, C and load C_t.

    0.377 R C + 0.693 (R_t C_t + R_t C + R C_t); Sakurai, IEEE JSSC 18 (1983) 418 (from memory). Against the exact
    solution of a 400-section ladder: 0 to 3.3 % too short for R_t/R and C_t/C between 0 and 10, worst near 0.3.
    """
    r_t, r, c, c_t = _array(driver), _array(resistance), _array(capacitance), _array(load)
    return np.asarray(0.377 * r * c + 0.693 * (r_t * c_t + r_t * c + r * c_t))


# ------------------------------------------------------------------------------------------------ repeaters


def segmented_line(unbuffered: ArrayLike, buffer: ArrayLike) -> tuple[Array, Array]:
    """Return (number of pieces M, delay [s]) of a line cut by buffers of fixed delay.

    M = sqrt(t_line / t_buffer), t = t_line / M + (M - 1) t_buffer; ``unbuffered`` [s] is 0.38 r c L^2. M is not
    rounded to whole pieces. For a switch with a load-independent delay this is the whole repeater design.
    """
    line, piece = _array(unbuffered), _array(buffer)
    count = np.sqrt(line / piece)
    return np.asarray(count), np.asarray(line / count + (count - 1.0) * piece)


def repeater_optimum(
    resistance: ArrayLike, capacitance: ArrayLike, driver: ArrayLike, gate: ArrayLike
) -> tuple[Array, Array, Array]:
    """Return (number k, size h, total delay [s]) of optimal repeaters of R_0 [ohm], C_0 [F] on a line R, C.

    k = sqrt(0.4 R C / (0.7 R_0 C_0)), h = sqrt(R_0 C / (R C_0)), T = (1.4 + 2 sqrt 0.28) sqrt(R_0 C_0 R C); makes
    sense for R C >= 7 R_0 C_0 only. No own capacitance of the repeater. Bakoglu & Meindl, IEEE TED 32 (1985) 903
    (from memory; coefficient derived).
    """
    r, c, r_0, c_0 = _array(resistance), _array(capacitance), _array(driver), _array(gate)
    count = np.sqrt(_DISTRIBUTED * r * c / (_LUMPED * r_0 * c_0))
    size = np.sqrt(r_0 * c / (r * c_0))
    total = (2.0 * _LUMPED + 2.0 * math.sqrt(_DISTRIBUTED * _LUMPED)) * np.sqrt(r_0 * c_0 * r * c)
    return np.asarray(count), np.asarray(size), np.asarray(total)


def repeated_line_delay_per_length(
    resistance_per_length: ArrayLike,
    capacitance_per_length: ArrayLike,
    driver: ArrayLike,
    gate: ArrayLike,
    self_share: ArrayLike,
    transit: ArrayLike,
    factor: ArrayLike = _LN2,
    wire_factor: ArrayLike = 0.377,
) -> Array:
    """Return the least delay per length [s/m] of a line with repeaters that have a transit time.

    2 sqrt(W r c [t_tr + F R_0 C_0 (1 + s)]) + 2 F sqrt(R_0 C_0 r c); r [ohm/m], c [F/m], repeater R_0 [ohm], C_0 [F],
    own capacitance s C_0, load-independent time t_tr [s]; factors F of every R C and W of the line's own r c L^2 [1],
    those of a step unless given (1 and 1/2: Elmore). Piece length and size both optimal, not rounded. Derived; as
    R_0 C_0 -> 0 a transit-limited repeater still leaves 2 sqrt(W r c t_tr).
    """
    rc = _array(resistance_per_length) * _array(capacitance_per_length)
    r_0_c_0, f = _array(driver) * _array(gate), _array(factor)
    stage = _array(transit) + f * r_0_c_0 * (1.0 + _array(self_share))
    return np.asarray(2.0 * np.sqrt(_array(wire_factor) * rc * stage) + 2.0 * f * np.sqrt(r_0_c_0 * rc))


def time_of_flight(relative_permittivity: ArrayLike) -> Array:
    """Return the least delay per length [s/m] of any wire, sqrt(eps_r) / c (exact)."""
    return np.asarray(np.sqrt(_array(relative_permittivity)) / SPEED_OF_LIGHT)


# ------------------------------------------------------------------------------------------------ resistivity


def fuchs_sondheimer(thickness: ArrayLike, mean_free_path: ArrayLike, specularity: ArrayLike) -> Array:
    """Return rho/rho_0 [1] of a thin film from surface scattering, exact.

    rho_0/rho = 1 - 3/(2k) (1-p) integral_1^inf (t^-3 - t^-5) (1 - e^-kt)/(1 - p e^-kt) dt with k = d/lambda and
    specularity 0 <= p < 1. Fuchs 1938, Sondheimer 1952. Substituted u = 1/t, Gauss-Legendre with 64 nodes.
    """
    k = _array(thickness) / _array(mean_free_path)
    p = _array(specularity)
    u = 0.5 * (_NODES + 1.0)
    decay = np.exp(-np.minimum(k[..., None] / u, 700.0))
    inside = (u - u**3) * (1.0 - decay) / (1.0 - p[..., None] * decay)
    integral = (0.5 * _WEIGHTS * inside).sum(axis=-1)
    return np.asarray(1.0 / (1.0 - 1.5 / k * (1.0 - p) * integral))


def fuchs_sondheimer_thick(thickness: ArrayLike, mean_free_path: ArrayLike, specularity: ArrayLike) -> Array:
    """Return rho/rho_0 [1] of a thick film, 1 + (3/8) (1-p) lambda/d (9 % low at d = lambda/2, p = 0)."""
    return np.asarray(1.0 + 0.375 * (1.0 - _array(specularity)) * _array(mean_free_path) / _array(thickness))


def mayadas_shatzkes(grain: ArrayLike, mean_free_path: ArrayLike, reflection: ArrayLike) -> Array:
    """Return rho/rho_0 [1] from grain boundaries of spacing D [m] and reflection 0 <= R < 1.

    rho_0/rho = 3 [1/3 - a/2 + a^2 - a^3 ln(1 + 1/a)], a = (lambda/D) R/(1-R). Mayadas & Shatzkes, Phys. Rev. B 1
    (1970) 1382.
    """
    r = _array(reflection)
    a = _array(mean_free_path) / _array(grain) * r / (1.0 - r)
    safe = np.where(a > 0.0, a, 1.0)
    last = np.where(a > 0.0, safe**3 * np.log1p(1.0 / safe), 0.0)
    return np.asarray(1.0 / (3.0 * (1.0 / 3.0 - a / 2.0 + a**2 - last)))


def narrow_line_resistivity(
    width: ArrayLike,
    height: ArrayLike,
    specularity: ArrayLike,
    reflection: ArrayLike,
    *,
    bulk: ArrayLike = COPPER_RESISTIVITY,
    mean_free_path: ArrayLike = COPPER_MEAN_FREE_PATH,
) -> Array:
    """Return the resistivity [ohm m] of a line of metal width and height [m] with grains as large as its width.

    rho = rho_0 [1 + (3/8)(1-p) lambda (1/w + 1/h) + (MS - 1)], Matthiessen sum of surface and grain scattering.
    Forms in use differ by about 10 % (thickness, grain size, barrier): state p, R, D and barrier with any result.
    """
    w, h, free = _array(width), _array(height), _array(mean_free_path)
    surface = 0.375 * (1.0 - _array(specularity)) * free * (1.0 / w + 1.0 / h)
    return np.asarray(_array(bulk) * (surface + mayadas_shatzkes(w, free, reflection)))


def line_resistance_per_length(resistivity: ArrayLike, width: ArrayLike, height: ArrayLike) -> Array:
    """Return resistance per length [ohm/m] of a metal cross-section w h [m^2], barrier excluded from w and h."""
    return np.asarray(_array(resistivity) / (_array(width) * _array(height)))


# ------------------------------------------------------------------------------------------------ capacitance


def plate_and_edge_capacitance(length: ArrayLike, width: ArrayLike, per_area: ArrayLike, per_edge: ArrayLike) -> Array:
    """Return capacitance [F] of a line from a plate [F/m^2] and two edges [F/m]: L (w c_a + 2 c_e)."""
    return np.asarray(_array(length) * (_array(width) * _array(per_area) + 2.0 * _array(per_edge)))


def single_line_capacitance(
    width: ArrayLike, thickness: ArrayLike, height: ArrayLike, relative_permittivity: ArrayLike = 1.0
) -> Array:
    """Return capacitance per length [F/m] of a line over a plane, eps [1.15 w/h + 2.80 (t/h)^0.222].

    Sakurai & Tamaru, IEEE TED 30 (1983) 183 (from memory); stated within 6 % for 0.3 < w/h < 30, 0.3 < t/h < 30.
    """
    w, t, h = _array(width), _array(thickness), _array(height)
    eps = VACUUM_PERMITTIVITY * _array(relative_permittivity)
    return np.asarray(eps * (1.15 * w / h + 2.80 * (t / h) ** 0.222))


def coupled_line_capacitance(
    width: ArrayLike,
    thickness: ArrayLike,
    height: ArrayLike,
    spacing: ArrayLike,
    relative_permittivity: ArrayLike = 1.0,
    coupling_factor: ArrayLike = 1.0,
) -> Array:
    """Return capacitance per length [F/m] of a line over a plane between two neighbours.

    Single line plus M 2 eps [0.03 w/h + 0.83 t/h - 0.07 (t/h)^0.222] (s/h)^-1.34; M = 1 for quiet neighbours, 0 to 2
    when they switch along or against. Sakurai & Tamaru 1983 (from memory); stated for 0.5 < s/h < 10.
    """
    w, t, h, s = _array(width), _array(thickness), _array(height), _array(spacing)
    eps = VACUUM_PERMITTIVITY * _array(relative_permittivity)
    side = eps * (0.03 * w / h + 0.83 * t / h - 0.07 * (t / h) ** 0.222) * (s / h) ** -1.34
    return np.asarray(single_line_capacitance(w, t, h, relative_permittivity) + 2.0 * _array(coupling_factor) * side)
