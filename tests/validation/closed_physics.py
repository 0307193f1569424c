"""Functions of physics against scipy and mpmath: special functions, quadrature, differential equations, root finding.

What is compared is the mathematics: the law itself is named in the function's own documentation. Where two roads to a
number are the same arithmetic in other words (a quotient written twice), the check says so by its tolerance of 1e-12:
it catches a wrong factor or unit, not a wrong law.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Iterator

import mpmath
import numpy as np
from numpy.typing import NDArray
from scipy import constants, integrate, interpolate, optimize, special

from benchmark.circuits import adder, functional, net_length, patterns
from benchmark.draws import bases
from benchmark.physics import (
    acoustics,
    drive,
    force_balance,
    interpolation,
    limits,
    losses,
    measured_current,
    ohmic,
    piezo,
    pressure_resistance,
    regeneration,
    steep_swing,
    two_pole,
    virtual_source,
    wires,
)
from tests.factories import ohmic_pair
from tests.validation.check import Check

__all__ = ["GROUP", "checks", "exact"]

GROUP = "Physics, by scipy and mpmath"
EXACT = 1e-12
Array = NDArray[np.float64]


def exact(
    name: str,
    source: str,
    expected: float,
    obtained: float,
    relative: float = EXACT,
    note: str = "",
    group: str = GROUP,
) -> Check:
    """Make a check of an exact result; ``relative``: of the expected number, absolute where that is 0."""
    allowed = relative * (abs(expected) or 1.0)
    basis = (
        f"{relative:g} relative: rounding" if relative <= 1e-9 else f"{relative:g} relative: stated error of the rule"
    )
    return Check("closed form", group, name, source, "derived", float(expected), float(obtained), allowed, basis, note)


def _beams() -> Iterator[Check]:
    """Euler-Bernoulli beam, E I w'''' = load, half of it by symmetry, solved as a boundary value problem."""
    modulus, length, moment, force = 1.5e11, 2e-6, 3e-30, 1e-9
    share = force / (modulus * moment)

    def slope(x: Array, y: Array) -> Array:
        return np.vstack([y[1], y[2], y[3], np.zeros_like(x)])

    def ends(fixed: bool) -> Callable[[Array, Array], Array]:
        # at the support: no deflection, and no slope (clamped) or no moment; in the middle: no slope, half the force
        return lambda a, b: np.array([a[0], a[1] if fixed else a[2], b[1], b[3] + 0.5])

    for word, fixed, function in (
        ("clamped", True, force_balance.clamped_beam_compliance),
        ("supported", False, force_balance.supported_beam_compliance),
    ):
        half = np.linspace(0.0, 0.5, 21)
        found = integrate.solve_bvp(slope, ends(fixed), half, np.zeros((4, half.size)), tol=1e-10)
        compliance = abs(found.y[0, -1]) * share * length**3 / force
        name = f"compliance of a {word} beam, load in the middle [m/N]"
        yield exact(
            name, "beam equation, scipy.integrate.solve_bvp", compliance, function(modulus, length, moment), 1e-8
        )


def _acoustics() -> Iterator[Check]:
    # one fixed and one free end: standing wave sin(k x), slope 0 at the free end
    speed, length = 4000.0, 100e-9
    k = optimize.brentq(lambda x: np.cos(x * length), 0.1 / length, 3.0 / length, xtol=1e-3)
    yield exact(
        "quarter-wave resonance [Hz]", "wave equation, scipy.optimize.brentq", k * speed / (2.0 * np.pi),
        acoustics.quarter_wave_frequency(length, speed), 1e-9,
    )  # fmt: skip
    # residual ringing after a ramp: undamped oscillator, solved
    w0, ramp = 2.0 * np.pi, 0.7
    t = np.linspace(0.0, ramp, 2)
    found = integrate.solve_ivp(
        lambda s, y: [y[1], w0**2 * (s / ramp - y[0])], (t[0], t[-1]), [0.0, 0.0], rtol=1e-11, atol=1e-13
    )
    size = float(np.hypot(found.y[0, -1] - 1.0, found.y[1, -1] / w0))
    yield exact(
        "ringing left after a ramp [1]", "oscillator, scipy.integrate.solve_ivp", size,
        acoustics.residual_after_ramp(w0, ramp), 1e-8,
    )  # fmt: skip
    # first undershoot after a step at the Q of the limit just touches the level
    level = 0.8
    quality = float(acoustics.quality_limit(level))
    damped = np.sqrt(1.0 - 0.25 / quality**2)
    step = integrate.solve_ivp(
        lambda s, y: [y[1], 1.0 - y[0] - y[1] / quality],
        (0.0, 2.0 * np.pi / damped),
        [0.0, 0.0],
        rtol=1e-11,
        atol=1e-13,
    )
    yield exact(
        "undershoot at the limit of the quality [1]",
        "two-pole step, scipy.integrate.solve_ivp",
        step.y[0, -1],
        level,
        1e-8,
    )
    first = integrate.solve_ivp(
        lambda s, y: [y[1], 1.0 - y[0] - y[1] / 2.0], (0.0, np.pi / np.sqrt(1.0 - 1.0 / 16.0)), [0.0, 0.0],
        rtol=1e-11, atol=1e-13,
    )  # fmt: skip
    yield exact(
        "overshoot at quality 2 [1]",
        "two-pole step, scipy.integrate.solve_ivp",
        first.y[0, -1] - 1.0,
        two_pole.overshoot(2.0),
        1e-8,
    )
    yield exact(
        "longest quality that does not switch back, level 0.4 [1]", "0.8 pi / ln(1/w), mpmath",
        float(mpmath.mpf("0.8") * mpmath.pi / mpmath.log(1 / mpmath.mpf("0.4"))), acoustics.quality_limit_chain(0.4),
        note="the factor 0.8 is from own simulation",
    )  # fmt: skip


def _losses() -> Iterator[Check]:
    c, volt, loss, omega = 0.3e-15, 0.6, 0.02, 1.0
    # V = V0 sin wt, Q = C V0 sin(wt - d): the loop holds pi C V0^2 sin d
    phase = float(np.arctan(loss))
    energy = integrate.quad(
        lambda t: volt * np.sin(omega * t) * c * volt * np.cos(omega * t - phase) / np.cos(phase), 0.0, 2.0 * np.pi
    )[0]
    source = "integral of V dQ over a cycle, scipy.integrate.quad"
    yield exact(
        "dielectric loss of a swing to both sides [J]",
        source,
        energy,
        losses.dielectric_loss_bipolar(c, volt, loss),
        1e-9,
    )
    t = np.arange(4096) * 2.0 * np.pi / 4096
    loop = losses.loop_loss(volt * np.sin(t), c * volt * np.sin(t - phase) / np.cos(phase))
    yield exact("area of a measured loop of 4096 points [J]", source, energy, loop, 1e-5)
    quality, u = 300.0, 2e-17
    # free decay: energy falls as exp(-w t / Q), first order in 1/Q per cycle
    lost = u * (1.0 - float(mpmath.exp(-2 * mpmath.pi / quality)))
    yield exact(
        "mechanical loss of a cycle, quality 300 [J]", "exponential decay, mpmath", lost,
        losses.resonant_mechanical_loss(u, quality), 0.011, "first order in 1/Q",
    )  # fmt: skip


def _resistances() -> Iterator[Check]:
    k, t, q = constants.Boltzmann, 320.0, constants.elementary_charge
    yield exact(
        "thermionic swing at 320 K [V/decade]", "CODATA constants of scipy.constants",
        np.log(10.0) * k * t / q, limits.boltzmann_swing(t), 1e-9,
    )  # fmt: skip
    gamma = 0.11 * q / 1e9
    barrier = optimize.approx_fprime(np.array([0.0]), lambda p: np.log10(np.exp(-gamma * p[0] / (k * t))), 1.0)[0]
    yield exact(
        "slope of an activated resistance [decade/Pa]", "derivative of exp(-gamma p / kT), scipy.optimize", -barrier,
        pressure_resistance.activated_slope(gamma, t), 1e-6,
    )  # fmt: skip
    energy = 0.15 * q
    law = float(mpmath.mpf(1e5) * mpmath.exp(mpmath.mpf(energy) / k * (1 / mpmath.mpf(t) - 1 / mpmath.mpf(300))))
    yield exact(
        "activated resistance at 320 K of one known at 300 K [ohm]", "Arrhenius law, mpmath", law,
        pressure_resistance.arrhenius_resistance(1e5, energy, t, 300.0), 1e-9,
    )  # fmt: skip
    law = float(mpmath.mpf(1e9) * mpmath.power(10, -mpmath.mpf(2) * mpmath.mpf("1.3")))
    yield exact(
        "exponential resistance at 1.3 GPa, 2 decades per GPa [ohm]", "mpmath", law,
        pressure_resistance.exponential_resistance(1.3e9, 1e9, 2e-9), 1e-12,
    )  # fmt: skip
    area = 20e-9 * 20e-9
    current = integrate.dblquad(lambda y, x: 1.0 / 1e-13, 0.0, 20e-9, 0.0, 20e-9)[0]
    yield exact(
        "two contact faces in series [ohm]", "current through unit drop, scipy.integrate.dblquad", 2.0 / current,
        pressure_resistance.contact_resistance(1e-13, area), 1e-9,
    )  # fmt: skip
    force, _ = force_balance.contact_force(3e-9)
    lost, mask = force_balance.contact_force(-2e-9)
    yield exact("force of a contact that presses [N]", "definition of a dry contact", 3e-9, force)
    yield exact("force of a contact that has parted [N]", "definition of a dry contact", 0.0, lost + (not mask))


def _switches() -> Iterator[Check]:
    r, ratio, v = 1e4, 1e4, 0.37
    decades = np.log10(ratio)

    def pulled(u: float) -> float:
        return float(ohmic.log_linear_conductance(u, r, decades, 0.0, 1.0))

    # output where the currents of both switches are one
    output = optimize.brentq(lambda y: pulled(v) * y - pulled(1.0 - v) * (1.0 - y), 0.0, 1.0, xtol=1e-15)
    source = "node equation, scipy.optimize.brentq"
    yield exact("output of a log-linear pair [V_DD]", source, output, regeneration.log_linear_output(v, ratio), 1e-9)
    yield exact(
        "conductance of a log-linear switch in the middle of its window [S]", "geometric mean of the ends",
        np.sqrt(1.0 / r / (r * ratio)), pulled(0.5), 1e-12,
    )  # fmt: skip
    high = optimize.brentq(lambda y: (1.0 - y) / (3.0 * r) - y * 3.0 / (r * ratio), 0.0, 1.0, xtol=1e-15)
    yield exact(
        "high level of a gate of three inputs [V_DD]", source, high, regeneration.stacked_high_level(3, ratio), 1e-9
    )

    # where the slope of the curve is -1; by symmetry both margins are one
    def curve(x: float) -> float:
        return float(special.expit(-np.log(ratio) * (2.0 * x - 1.0)))

    def corner(x: float) -> float:
        return 1.0 - 2.0 * np.log(ratio) * curve(x) * (1.0 - curve(x))

    low = optimize.brentq(corner, 0.0, 0.5, xtol=1e-15)
    margin = low - curve(1.0 - low)
    yield exact(
        "noise margin of a log-linear chain [V_DD]", "unity-gain points, scipy.optimize.brentq", margin,
        regeneration.log_linear_noise_margin(ratio), 1e-8,
    )  # fmt: skip
    pair = ohmic_pair(on_resistance=r, off_resistance=r * ratio, window=(0.0, 1.0))
    fast = functional.functional(pair, 1, "fast").noise_margin
    source = "unity-gain points, scipy.optimize.brentq"
    yield exact("the same by the fast search of the program [V_DD]", source, margin, fast.item(), 1e-3)
    yield exact(
        "open state that carries nothing, at its switching level [S]", "half of the closed conductance, by definition",
        0.5 / r, ohmic.perfect_conductance(0.6, r, 0.6), 1e-9,
    )  # fmt: skip
    # subthreshold inverter without barrier lowering: slope of the solved curve in the middle
    phi, n, supply = constants.Boltzmann * 300.0 / constants.elementary_charge, 1.2, 0.2

    def solved(x: float) -> float:
        def residual(y: float) -> float:
            down = np.exp(x / (n * phi)) * -np.expm1(-y / phi)
            return float(down - np.exp((supply - x) / (n * phi)) * -np.expm1(-(supply - y) / phi))

        return float(optimize.brentq(residual, 1e-9, supply - 1e-9, xtol=1e-15))

    step = 1e-5
    gain = (solved(0.5 * supply - step) - solved(0.5 * supply + step)) / (2.0 * step)
    yield exact(
        "gain of a subthreshold inverter [1]", "node equation, scipy.optimize.brentq", gain,
        regeneration.subthreshold_gain(supply, n, 300.0), 1e-4,
    )  # fmt: skip
    yield exact(
        "drain factor at three times saturation [1]",
        "mpmath",
        float(1 - mpmath.exp(-3)),
        steep_swing.drain_factor(0.15, 0.05),
    )
    # window kept: floor such that ceiling is reached over the same control voltage at another swing
    window = 0.06 * 5.0
    floor = 1e-4 / float(mpmath.power(10, mpmath.mpf(window) / mpmath.mpf("0.075")))
    yield exact(
        "floor of the blend at a larger swing [A]", "decades that fit into the window, mpmath", floor,
        steep_swing.off_current_at_swing(1e-9, 1e-4, 0.06, 0.075), 1e-9,
    )  # fmt: skip


def _piezo() -> Iterator[Check]:
    k33 = 0.7512
    # series resonance of the bar: tan(x) / x = 1 / k^2 with x = pi f_s / (2 f_p)
    x = optimize.brentq(lambda s: s - k33**2 * np.tan(s), 0.5, 0.5 * np.pi - 1e-9, xtol=1e-15)
    yield exact(
        "coupling of a bar from its resonances [1]", "resonance condition, scipy.optimize.brentq", k33,
        piezo.coupling_from_resonance(2.0 * x / np.pi), 1e-9,
    )  # fmt: skip
    yield exact(
        "clamped permittivity, PZT-4-like couplings [F/m]", "product rule, mpmath",
        float(mpmath.mpf("1.15e-8") * (1 - mpmath.mpf("0.58") ** 2) * (1 - mpmath.mpf("0.51") ** 2)),
        piezo.permittivity_clamped(1.15e-8, 0.58, 0.51),
    )  # fmt: skip


def _transistor() -> virtual_source.Transistor:
    """Invented, no access resistance."""
    return virtual_source.Transistor(
        1e-6, 30e-9, 0.02, 0.0, 0.0, 1e5, 0.02, 0.3, 1.3, 0.1, 3.5, 1.8, 0.0259,
    )  # fmt: skip


def _charges() -> Iterator[Check]:
    # linear fall of Q^2 along the channel, as in a long channel: shares from the Ward-Dutton integrals
    x = 0.4
    total = integrate.quad(lambda u: np.sqrt(1.0 - u * (1.0 - x**2)), 0.0, 1.0)[0]
    drain = integrate.quad(lambda u: u * np.sqrt(1.0 - u * (1.0 - x**2)), 0.0, 1.0)[0]
    found = drive.charge_partition(x)
    source = "Ward-Dutton integrals of a charge whose square falls linearly, scipy.integrate.quad"
    yield exact("charge share of the source [1]", source, total - drain, found[0], 1e-9)
    yield exact("charge share of the drain [1]", source, drain, found[1], 1e-9)
    t = _transistor()
    gate = float(drive.gate_charge(t, np.array(1.0), np.array(0.0)))
    whole = float(virtual_source.channel_state(t, np.array(1.0), np.array(0.0)).charge * t.width * t.length)
    yield exact("gate charge without drain voltage [C]", "whole channel at one density", whole, gate, 1e-9)


def _tables() -> Iterator[Check]:
    x, y = np.array([0.0, 0.1, 0.3, 0.6, 1.0]), np.array([1.0, 1.5, 1.6, 3.0, 3.1])
    pchip = interpolate.PchipInterpolator(x, y)
    found = interpolation.hermite_across(x, y[:, None], np.array([0.42]))[0]
    yield exact(
        "monotone interpolant at 0.42 [1]", "scipy.interpolate.PchipInterpolator", float(pchip(0.42)), found, 1e-12
    )
    charge = interpolation.charge_curve(x, y)
    whole = integrate.quad(lambda u: np.interp(u, x, y), 0.0, 0.6, points=[0.1, 0.3])[0]
    yield exact(
        "charge to 0.6 V of a measured capacitance [C]", "scipy.integrate.quad", whole, float(charge(0.6)), 1e-9
    )
    weights, _ = interpolation.inverse_temperature_weights(330.0, np.array([300.0, 400.0]))
    line = interpolate.interp1d([1.0 / 400.0, 1.0 / 300.0], [0.0, 1.0])
    yield exact(
        "weight of 300 K at 330 K [1]", "scipy.interpolate.interp1d in 1/T", float(line(1.0 / 330.0)), weights[0], 1e-9
    )
    blended = measured_current.blended_branches(np.array(2e-6), np.array(5e-7), np.array(0.25))
    mixed = np.exp(np.interp(0.25, [0.0, 1.0], np.log([2e-6, 5e-7])))
    yield exact(
        "current between two sweeps [A]", "straight in its logarithm, numpy.interp", mixed, float(blended), 1e-12
    )
    gate = np.linspace(0.0, 0.5, 6)
    amperes = 10.0 ** np.array([-9.0, -7.5, -6.0, -5.0, -4.6, -4.5])
    surface = measured_current.current_surface({"control_voltage": gate, "current": amperes}, 0.5, 300.0)
    law = 10.0 ** interpolate.PchipInterpolator(gate, np.log10(amperes))(0.23)
    yield exact(
        "current between the rows of a sweep [A]", "scipy.interpolate.PchipInterpolator in log10", float(law),
        float(surface.curves[0][0](0.23)), 1e-9,
    )  # fmt: skip


def _ladder(driver: float, resistance: float, capacitance: float, load: float, sections: int = 300) -> float:
    """Time to half of a step at the end of a line cut into sections, solved by its eigenvalues [s]."""
    r, c = resistance / sections, capacitance / sections
    conductance = np.zeros((sections + 1, sections + 1))
    own = np.full(sections + 1, c)
    own[0], own[-1] = 0.5 * c, 0.5 * c + load
    for k in range(sections):
        conductance[k, k] += 1.0 / r
        conductance[k + 1, k + 1] += 1.0 / r
        conductance[k, k + 1] -= 1.0 / r
        conductance[k + 1, k] -= 1.0 / r
    conductance[0, 0] += 1.0 / driver
    scale = 1.0 / np.sqrt(own)
    rate, vectors = np.linalg.eigh(scale[:, None] * conductance * scale[None, :])
    start = vectors.T @ (np.sqrt(own) * 1.0)
    last = vectors[-1] * scale[-1] * start
    unit = (driver + resistance) * (capacitance + load)
    return unit * float(optimize.brentq(lambda t: last @ np.exp(-rate * unit * t) - 0.5, 0.0, 10.0))


def _lines() -> Iterator[Check]:
    source = "ladder of 300 sections, numpy.linalg.eigh"
    for ratio in (0.3, 1.0, 10.0):
        driver, load = ratio * 1e3, ratio * 1e-13
        name = f"50 % delay of a driven line, driver and load {ratio:g} of the line [s]"
        own, found = _ladder(driver, 1e3, 1e-13, load), wires.driven_line_delay(driver, 1e3, 1e-13, load)
        yield exact(name, source, own, found, 0.034, "stated: 0 to 3.3 % short")
    # Elmore's time constant is the first moment of the impulse response: minus the first coefficient of the transfer
    driver, r, c, load = 500.0, 1e3, 1e-13, 2e-14

    def transfer(s: mpmath.mpf) -> mpmath.mpf:
        root = mpmath.sqrt(s * r * c)
        line = mpmath.sqrt(mpmath.mpf(r) / (s * c))
        a = mpmath.cosh(root) + line * mpmath.sinh(root) * s * load
        b = mpmath.sinh(root) / line + mpmath.cosh(root) * s * load
        return 1 / (a + driver * b)

    with mpmath.workdps(40):
        s = mpmath.mpf(1)
        moment = float((1 / transfer(s) - 1) / s)
    yield exact(
        "Elmore time of a driven line in five pi sections [s]", "first moment of the exact line, mpmath", moment,
        wires.elmore_pi_line(driver, r, c, load, 5), 1e-8,
    )  # fmt: skip


def _bases() -> Iterator[Check]:
    u = np.array([0.13])
    z = special.ndtri(u[0])
    for k in (2, 5):
        own = special.eval_hermitenorm(k, z) / np.sqrt(special.factorial(k))
        yield exact(
            f"normed Hermite polynomial of degree {k} [1]",
            "scipy.special.eval_hermitenorm",
            own,
            bases.hermite(u)[k, 0],
            1e-12,
        )
        own = np.sqrt(2.0 * k + 1.0) * special.eval_legendre(k, 2.0 * u[0] - 1.0)
        yield exact(
            f"normed Legendre polynomial of degree {k} [1]",
            "scipy.special.eval_legendre",
            own,
            bases.legendre(u)[k, 0],
            1e-12,
        )
    found = bases.hermite_coefficients(lambda points: np.sqrt(3.0) * (2.0 * points - 1.0))
    for k in (1, 3):
        own = mpmath.quad(
            lambda s, k=k: mpmath.sqrt(3) * mpmath.erf(s / mpmath.sqrt(2)) * mpmath.npdf(s) * _hermite(k, s),
            [-mpmath.inf, 0, mpmath.inf],
        )
        name = f"Hermite coefficient {k} of a uniform value [1]"
        yield exact(name, "integral over the normal density, mpmath.quad", float(own), found[k], 1e-10)


def _hermite(degree: int, at: mpmath.mpf) -> mpmath.mpf:
    """He_k(z) / sqrt(k!) from the confluent function of mpmath."""
    plain = mpmath.hermite(degree, at / mpmath.sqrt(2)) / mpmath.sqrt(2) ** degree
    return plain / mpmath.sqrt(mpmath.factorial(degree))


def _pitches() -> Iterator[Check]:
    """Mean wire of a square array by counting every pair of places, as Davis weighs them."""
    side, p = 16, 0.6
    lengths = np.arange(1, 2 * side - 1)
    place = np.arange(side)
    gap = np.abs(place[:, None] - place[None, :])
    counts = np.bincount(gap.ravel())
    pairs = np.convolve(counts, counts)[1:]
    weight = pairs * _expected_share(lengths.astype(float), p)
    own = float((weight * lengths).sum() / weight.sum())
    source = (
        "every pair of places counted, weighed by Rent's rule as in Davis et al., IEEE TED 45, 580 (1998) (from memory)"
    )
    yield exact(
        "mean wire of 256 gates, Rent exponent 0.6 [gate pitches]", source, own, net_length.mean_wire(256.0, p), 1e-6
    )


def _truth() -> Iterator[Check]:
    """One-bit adder of NAND gates: shares of its nets from the sum of three bits, counted by hand."""
    netlist = adder.full_adder()
    ones = [sum(bits) for bits in itertools.product((0, 1), repeat=3)]
    shares, rising = patterns.high_shares(netlist), patterns.activity(netlist)
    source = "sums of three bits, every combination"
    for net, high in (("sum0", np.mean([n % 2 for n in ones])), ("carry0", np.mean([n // 2 for n in ones]))):
        yield exact(f"share of patterns with {net} high [1]", source, high, shares[net])
        yield exact(f"rising edges of {net} per operation [1]", source, high * (1.0 - high), rising[net])
    scenario = {"gate_count": np.array(256.0), "rent_exponent": np.array(0.6), "fan_out": np.array(1.0)}
    source = "a net of one driven input is a point-to-point wire"
    own, found = net_length.mean_wire(256.0, 0.6), net_length.average_net_pitches(scenario)
    yield exact("net of one driven input [gate pitches]", source, own, found.item(), 1e-10)


def _expected_share(length: Array, p: float) -> Array:
    """Wires between two places at a distance: blocks A, B, C of 1, l (l - 1) and 2 l places on average."""
    b, c = length * (length - 1.0), 2.0 * length
    with np.errstate(invalid="ignore"):
        return np.asarray(((1.0 + b) ** p - b**p + (b + c) ** p - (1.0 + b + c) ** p) / c)


def checks() -> list[Check]:
    """Every result."""
    parts = (
        _beams, _acoustics, _losses, _resistances, _switches, _piezo, _charges, _tables, _lines, _bases, _pitches,
        _truth,
    )  # fmt: skip
    return [check for part in parts for check in part()]
