"""Numbers read off curves: certified regressions, a measured transistor with published limits, known curves."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from importlib import resources
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from scipy import constants, integrate, interpolate, optimize, stats

from benchmark.physics.extraction import charge, contacts, currents, devices, jumps, lines, swing, threshold
from benchmark.physics.extraction.points import Points, crossing, crossings, nearby, read_at
from benchmark.physics.extraction.result import Extracted, Part, combined, half_width
from tests.validation.check import Check
from tests.validation.closed_physics import exact

__all__ = ["GROUP", "checks", "measured_block", "norris"]

GROUP = "Numbers read off curves"
MEASURED = Path(__file__).parent.parent / "data" / "measured-curves"
TRANSISTOR = "SkyWater PDK Authors (2022), sky130-raw-data, n-type transistor of 7 um by 0.15 um"
LIMITS = "SkyWater PDK Authors, skywater-pdk, device details of the 1.8 V n-type transistor, table of 7 um by 0.15 um"
Array = NDArray[np.float64]


def norris() -> tuple[dict[str, float], Array, Array]:
    """Return certified values, abscissa and readings of NIST data set Norris, as scipy carries it for its own tests."""
    place = resources.files("scipy.stats") / "tests" / "data" / "nist_linregress" / "Norris.dat"
    text = place.read_text(encoding="ascii")
    numbers = r"\s+([-\d.E+]+)\s+([-\d.E+]+)"
    b0 = re.search(rf"B0{numbers}", text)
    b1 = re.search(rf"B1{numbers}", text)
    residual = re.search(r"Residual\s+Standard Deviation\s+([\d.]+)", text)
    assert b0
    assert b1
    assert residual
    certified = {
        "intercept": float(b0[1]), "intercept_error": float(b0[2]), "slope": float(b1[1]),
        "slope_error": float(b1[2]), "residual": float(residual[1]),
    }  # fmt: skip
    rows = np.array([line.split() for line in text.splitlines()[60:96]], dtype=np.float64)
    return certified, rows[:, 1], rows[:, 0]


def measured_block(name: str, column: str) -> tuple[Array, Array]:
    """Return swept voltage and one column of a block of measured numbers."""
    rows = (MEASURED / name).read_text(encoding="ascii").splitlines()
    start = next(number for number, row in enumerate(rows) if row.lstrip().startswith("#"))
    names = rows[start].split()
    table = np.array([row.split() for row in rows[start + 1 : rows.index("END_DB")]], dtype=np.float64)
    return table[:, 0], table[:, names.index(column)]


def transfer(name: str, floor: float = 3e-9) -> Points:
    """Return a transfer curve of the measured transistor, readings up to 3 nA marked as the noise of the instrument."""
    voltage, current = measured_block(name, "ID")
    return Points.of(voltage, current, np.abs(current) <= floor, None, floor)


def _certified() -> Iterator[Check]:
    certified, x, y = norris()
    fit = lines.line_fit(x, y)
    for name, value in certified.items():
        yield Check(
            "published case", GROUP, f"line through 36 points, {name.replace('_', ' ')} [1]",
            "NIST StRD, data set Norris, certified values", "published", value, float(getattr(fit, name)),
            1e-11 * abs(value), "1e-11 relative: digits kept in double precision",
        )  # fmt: skip


def _line_laws() -> Iterator[Check]:
    x = np.array([1.0, 2.0, 4.0, 8.0, 16.0, 32.0])
    y = np.array([3.1, 5.2, 8.9, 17.4, 32.1, 66.0])
    fit = lines.line_fit(x, y, lines.relative_weights(y))
    found, covariance = optimize.curve_fit(lambda s, a, b: a + b * s, x, y, p0=(1.0, 1.0), sigma=y)
    source = "weighted least squares, scipy.optimize.curve_fit"
    for name, expected, obtained in (
        ("weighted line, slope [1]", found[1], fit.slope),
        ("weighted line, standard error of the slope [1]", math.sqrt(covariance[1, 1]), fit.slope_error),
        ("weighted line, covariance of intercept and slope [1]", covariance[0, 1], fit.covariance),
    ):
        yield exact(name, source, expected, float(obtained), 1e-6, group=GROUP)
    spacing, product = np.array([2.0, 4.0, 8.0, 16.0, 32.0]) * 1e-6, np.array([1.3, 1.68, 2.53, 4.02, 7.3]) * 1e-3
    law = optimize.curve_fit(lambda s, r, t: 2.0 * r + r / t * s, spacing * 1e6, product * 1e3, p0=(0.5, 2.0))
    read = contacts.contacts(spacing, product)
    errors = np.sqrt(np.diag(law[1]))
    source = "fit of contact resistance and transfer length themselves, scipy.optimize.curve_fit"
    for name, expected, error, one in (
        ("contact resistance times width [ohm m]", law[0][0] * 1e-3, errors[0] * 1e-3, read.contact_resistance),
        ("transfer length [m]", law[0][1] * 1e-6, errors[1] * 1e-6, read.transfer_length),
    ):
        yield exact(name, source, expected, one.value, 1e-6, group=GROUP)
        yield exact(f"{name[: name.index('[')]}standard error {name[name.index('[') :]}", source, error,
                    float(one.uncertainty or 0.0), 1e-6, group=GROUP)  # fmt: skip
    p = np.linspace(0.0, 1e9, 9)
    resistance = 1e9 * np.exp(-4.2e-9 * p) * np.array([1.0, 1.02, 0.99, 1.01, 0.98, 1.0, 1.03, 0.97, 1.0])
    sloped, regressed = contacts.log_slope(Points.of(p, resistance)), stats.linregress(p, np.log(resistance))
    source = "regression, scipy.stats.linregress"
    yield exact("slope of ln R over pressure [1/Pa]", source, regressed.slope, sloped.value, 1e-9, group=GROUP)
    yield exact("standard error of it [1/Pa]", source, regressed.stderr, float(sloped.uncertainty or 0.0), 1e-9,
                group=GROUP)  # fmt: skip


def _transistor() -> Iterator[Check]:
    low, high = transfer("nfet-7um-path-0p1V.mdm"), transfer("nfet-7um-path-1p8V.mdm")
    basis = "published smallest and largest value of the process"
    yield Check(
        "published case", GROUP, "threshold by extrapolation, measured transistor [V]", f"{TRANSISTOR}; {LIMITS}",
        "seen", 0.700, threshold.extrapolated_threshold(low, 3, 0.1).value, 0.039, basis,
        "line at the largest transconductance of the curve at 0.1 V, half the path voltage subtracted",
    )  # fmt: skip
    yield Check(
        "published case", GROUP, "on-current, measured transistor [A]", f"{TRANSISTOR}; {LIMITS}", "seen", 3.510e-3,
        read_at(high, 1.8, "log").value, 0.471e-3, basis,
    )  # fmt: skip
    voltage, current = measured_block("nfet-7um-path-1p8V.mdm", "ID")
    part = slice(7, 16)  # 0.35 to 0.75 V: above the noise
    line = interpolate.make_interp_spline(voltage[part], np.log(current[part]), k=1)
    ends = [optimize.brentq(lambda v, i=i: line(v) - math.log(i), 0.36, 0.74, xtol=1e-14) for i in (5e-8, 2e-5)]
    source = f"{TRANSISTOR}; lines in ln I, scipy.interpolate and scipy.optimize.brentq"
    average = swing.average_swing(high, 5e-8, 2e-5)
    yield exact("average swing from 50 nA to 20 uA, measured transistor [V/decade]", source,
                (ends[1] - ends[0]) / math.log10(400.0), average.value, 1e-10, group=GROUP)  # fmt: skip
    reached = crossing(high, 5e-8, "log")
    yield exact("control voltage at 50 nA [V]", source, ends[0], reached.x, 1e-10, group=GROUP)
    yield exact("threshold at 50 nA [V]", source, ends[0], threshold.threshold_at_current(high, 5e-8).value, 1e-10,
                group=GROUP)  # fmt: skip
    other = crossings(low, 5e-8, "log")[0].x
    window = threshold.hysteresis_window(low, high, 5e-8)
    yield exact("distance of two curves at 50 nA [V]", source, other - ends[0], window.value, 1e-9, group=GROUP)
    inside = (voltage >= ends[0]) & (voltage <= ends[1])
    regressed = stats.linregress(voltage[inside], np.log10(current[inside]))
    fitted = swing.fitted_swing(high, 5e-8, 2e-5)
    source = f"{TRANSISTOR}; regression, scipy.stats.linregress"
    yield exact("fitted swing from 50 nA to 20 uA [V/decade]", source, 1.0 / regressed.slope, fitted.value, 1e-10,
                group=GROUP)  # fmt: skip
    yield exact("standard error of the fitted swing [V/decade]", source, regressed.stderr / regressed.slope**2,
                float(fitted.uncertainty or 0.0), 1e-9, group=GROUP)  # fmt: skip
    output = Points.of(*measured_block("nfet-7um-output-1p8V.mdm", "ID"))
    effective = currents.effective_current(read_at(output, 0.9, "log"), read_at(high, 0.9, "log"))
    yield exact("effective current at 1.8 V, measured transistor [A]", f"{TRANSISTOR}; mean of two printed readings",
                0.5 * (0.003106 + 0.00041761), effective.value, 1e-12, group=GROUP)  # fmt: skip


def _known_curves() -> Iterator[Check]:
    thermal = math.log(10.0) * constants.Boltzmann * 300.0 / constants.elementary_charge
    v = np.linspace(0.0, 0.5, 51)
    ideal = Points.of(v, 1e-12 * np.exp(v * constants.elementary_charge / constants.Boltzmann / 300.0))
    yield exact("smallest swing of a thermionic current at 300 K [V/decade]", "CODATA constants of scipy.constants",
                thermal, swing.minimum_swing(ideal, 1e-11, 1e-5).value, 1e-9, group=GROUP)  # fmt: skip

    def capacitance(u: float) -> float:
        return 1e-15 * (1.0 + 0.6 * math.tanh(6.0 * (u - 0.4)))

    u = np.linspace(0.0, 1.0, 41)
    stored = integrate.quad(capacitance, 0.1, 0.9)[0]
    read = charge.charge_from_capacitance(Points.of(u, np.array([capacitance(one) for one in u])), 0.1, 0.9)
    source = "integral, scipy.integrate.quad"
    yield exact("charge over 0.1 to 0.9 V from 41 capacitances [C]", source, stored, read.value, 1e-4, group=GROUP)
    yield exact("the same over the swing [F]", source, stored / 0.8, charge.over_swing(read).value, 1e-4, group=GROUP)
    total = np.array([integrate.quad(capacitance, 0.0, one)[0] for one in u])
    yield exact("the same from charges [C]", source, stored, charge.charge_between(Points.of(u, total), 0.1, 0.9).value,
                1e-9, group=GROUP)  # fmt: skip
    noise = np.random.default_rng(20261201).normal(0.0, 0.02, 4000)
    along = np.linspace(0.0, 1.0, noise.size)
    size, freedom = charge.scatter_of(along, 1.0 + along + along**2 + noise)
    yield exact("scatter about a smooth curve, 4000 points [1]", "random numbers of known standard deviation", 0.02,
                size, 3.0 / math.sqrt(2.0 * freedom), "three standard deviations of the estimate", GROUP)  # fmt: skip
    few = np.array([0.0, 0.1, 0.25, 0.3, 0.5, 0.6, 0.8])
    bent = np.array([1.0, 1.3, 1.9, 2.0, 3.2, 3.9, 5.2])
    law, left, *_ = np.polyfit(few, bent, 2, full=True)
    near = nearby(Points.of(few, bent), 0.3, "linear")
    source = "parabola, numpy.polyfit"
    yield exact("curvature near a point [1]", source, law[0], near.curvature, 1e-9, group=GROUP)
    yield exact("scatter near a point [1]", source, math.sqrt(left[0] / 4.0), near.scatter, 1e-9, group=GROUP)
    yield from _pull_in()


def _pull_in() -> Iterator[Check]:
    """Plate on a spring: the gap closes where the force balance has no solution any more."""
    stiffness, gap, permittivity_area = 10.0, 100e-9, constants.epsilon_0 * 1e-10

    def balance(x: float, voltage: float) -> float:
        return stiffness * x - 0.5 * permittivity_area * voltage**2 / (gap - x) ** 2

    steps = np.linspace(0.0, 4.0, 401)
    closed = math.sqrt(8.0 * stiffness * gap**3 / (27.0 * permittivity_area))
    shift = [
        optimize.brentq(balance, 0.0, gap / 3.0, args=(v,)) if balance(gap / 3.0, v) >= 0.0 else 0.7 * gap
        for v in steps.tolist()
    ]
    read = jumps.jump_voltage(Points.of(steps, np.array(shift)), step=0.2 * gap)
    yield exact("pull-in voltage of a plate on a spring, steps of 10 mV [V]",
                "V = sqrt(8 k g^3 / 27 eps A), G. M. Rebeiz, RF MEMS (2003), from memory; force balance by "
                "scipy.optimize.brentq", closed, read.value, 0.005 / closed, "half a step", GROUP)  # fmt: skip
    worn = jumps.cycles_to_failure(Points.of(np.array([1e6, 1e7, 1e8, 1e9]), np.array([1.0, 1.1, 9.0, 9.5])), 5.0)
    yield exact("cycles to failure between 1e7 and 1e8 [1]", "geometric mean, scipy.stats.gmean",
                float(stats.gmean([1e7, 1e8])), worn.value, 1e-12, group=GROUP)  # fmt: skip


def _many() -> Iterator[Check]:
    values = np.array([0.31, 0.35, 0.29, 0.41, 0.33, 0.36, 0.30, 0.38, 0.34])
    found = [Extracted(float(one), (Part("reading", 0.01),), 4, (0.0, 1.0)) for one in values]
    over = devices.over_devices(found)
    quartiles = np.percentile(values, [25, 50, 75])
    source = "numpy.percentile, scipy.stats.iqr"
    for name, expected, obtained in (
        ("median of nine devices [V]", quartiles[1], over.median),
        ("lower quartile [V]", quartiles[0], over.lower_quartile),
        (
            "distance of the quartiles [V]",
            stats.iqr(values),
            float(over.upper_quartile or 0) - float(over.lower_quartile or 0),
        ),
    ):
        yield exact(name, source, float(expected), float(obtained or 0.0), 1e-12, group=GROUP)
    for count, exactly in ((2, 1.0 / np.sqrt(np.pi)), (3, 1.5 / np.sqrt(np.pi))):
        yield exact(f"mean distance of the quartiles of {count} normal draws [1]", "largest of 2 or 3 normal draws",
                    float(exactly), devices.quartile_distance(count), 1e-9, group=GROUP)  # fmt: skip
    yield exact("standard error of a median of one normal draw [1]", "normal distribution", 1.0,
                devices.median_scatter(1), 1e-12, group=GROUP)  # fmt: skip
    mean = currents.mean_of_sweeps(found[0], found[1])
    yield exact("mean of two sweeps [V]", "numpy.mean", float(np.mean(values[:2])), mean.value, 1e-12, group=GROUP)
    yield exact("standard uncertainty of +-0.3 [1]", "scipy.stats.uniform", float(stats.uniform(-0.3, 0.6).std()),
                half_width(0.3), 1e-12, group=GROUP)  # fmt: skip
    # two samples of unequal variance: the rule of Welch is what scipy uses for their means
    one, two = np.array([4.1, 4.4, 3.9, 4.3, 4.0]), np.array([3.2, 4.9, 2.8])
    parts = [Part("mean", float(stats.sem(sample)), sample.size - 1) for sample in (one, two)]
    welch = stats.ttest_ind(one, two, equal_var=False)
    yield exact("degrees of freedom of two means [1]", "Welch, scipy.stats.ttest_ind", float(welch.df),
                combined(parts).freedom, 1e-12, group=GROUP)  # fmt: skip


def checks() -> list[Check]:
    """Every comparison."""
    return [*_certified(), *_line_laws(), *_transistor(), *_known_curves(), *_many()]
