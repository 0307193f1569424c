"""Laws of numbers read off curves, and whether their stated uncertainty covers what noise does to them."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from benchmark.physics.extraction.charge import charge_from_capacitance
from benchmark.physics.extraction.contacts import contacts, log_slope
from benchmark.physics.extraction.jumps import cycles_to_failure, jump_voltage
from benchmark.physics.extraction.lines import line_fit
from benchmark.physics.extraction.points import Points, read_at
from benchmark.physics.extraction.result import Array, CannotExtract, Extracted
from benchmark.physics.extraction.swing import average_swing, fitted_swing, minimum_swing
from benchmark.physics.extraction.threshold import extrapolated_threshold, hysteresis_window, threshold_at_current
from tests.near import near

V = np.linspace(0.0, 0.6, 61)
SEEDS = 200


def transfer(v: Array, swing: float, threshold: float, top: float = 1e-4) -> Array:
    """A curve that rises at a swing and bends over at a threshold."""
    return np.asarray(top * np.log1p(np.exp((v - threshold) * np.log(10.0) / swing)))


curves = st.tuples(st.floats(0.02, 0.12), st.floats(0.25, 0.45)).map(lambda p: transfer(V, *p))
Read = Callable[[Points, float], Extracted]
#: numbers of a curve, at currents that scale with it
READS: dict[str, Read] = {
    "average": lambda p, k: average_swing(p, 1e-8 * k, 1e-5 * k),
    "smallest": lambda p, k: minimum_swing(p, 1e-8 * k, 1e-5 * k),
    "fitted": lambda p, k: fitted_swing(p, 1e-8 * k, 1e-5 * k),
    "threshold": lambda p, k: threshold_at_current(p, 1e-6 * k),
    "current": lambda p, k: read_at(p, 0.4, "log"),
    "charge": lambda p, k: charge_from_capacitance(p, 0.1, 0.5),
}


def spanned(y: Array) -> bool:
    """Whether the curve holds the currents that are read."""
    return bool(y[0] < 1e-8 and y[-1] > 1e-5)


def both(read: Read, one: Points, two: Points, k: float = 1.0) -> tuple[Extracted, Extracted]:
    return read(one, 1.0), read(two, k)


@pytest.mark.parametrize("name", READS)
@given(y=curves)
def test_the_order_of_the_points_changes_nothing(name: str, y: Array):
    if spanned(y):
        one, two = both(READS[name], Points.of(V, y), Points.of(V[::-1], y[::-1]))
        assert (one.value, one.parts, one.span, one.bound) == (two.value, two.parts, two.span, two.bound)
        assert set(one.used) == {V.size - 1 - place for place in two.used}


@pytest.mark.parametrize("name", ["average", "smallest", "fitted"])
@given(y=curves, k=st.floats(1e-6, 1e6))
def test_scaling_the_current_changes_no_swing(name: str, y: Array, k: float):
    if spanned(y):
        one, two = both(READS[name], Points.of(V, y), Points.of(V, k * y), k)
        assert two.value == near(one.value, rel=1e-9)


@given(y=curves, shift=st.floats(-2.0, 2.0))
def test_shifting_the_voltage_shifts_thresholds_and_no_swing(y: Array, shift: float):
    if spanned(y):
        one, two = Points.of(V, y), Points.of(V + shift, y)
        for read in (READS["threshold"], lambda p, k: extrapolated_threshold(p)):
            try:
                before = read(one, 1.0).value
            except ValueError:
                continue  # a transconductance that is largest at an end, before the shift as after it
            assert read(two, 1.0).value == near(before + shift, rel=1e-9, abs=1e-9)
        assert READS["average"](two, 1.0).value == near(READS["average"](one, 1.0).value, rel=1e-9)
        moved = hysteresis_window(two, one, 1e-6).value
        assert moved == near(shift, rel=1e-9, abs=1e-9)


@given(y=curves, k=st.floats(0.1, 10.0))
def test_stretching_the_voltage_stretches_swing_and_charge(y: Array, k: float):
    if spanned(y):
        one, two = Points.of(V, y), Points.of(V * k, y)
        assert READS["average"](two, 1.0).value == near(k * READS["average"](one, 1.0).value, rel=1e-9)
        charge = charge_from_capacitance(two, 0.1 * k, 0.5 * k).value
        assert charge == near(k * READS["charge"](one, 1.0).value, rel=1e-9)


@given(a=st.floats(-5.0, 5.0), b=st.floats(-5.0, 5.0), weights=st.lists(st.floats(0.1, 10.0), min_size=6, max_size=6))
def test_points_on_a_line_give_the_line_whatever_their_weights(a: float, b: float, weights: list[float]):
    x = np.array([0.0, 0.3, 1.0, 1.1, 2.7, 4.0])
    fit = line_fit(x, a + b * x, np.array(weights))
    assert float(fit.slope) == near(b, abs=1e-12)
    assert float(fit.intercept) == near(a, abs=1e-12)


# -- coverage --------------------------------------------------------------------------------------------------
#
# With normal noise the error over the stated uncertainty follows Student's distribution of the stated degrees of
# freedom, where the uncertainty is the standard error of a straight line. Of 200 seeds the number of errors within the
# stated half width is binomial; the bounds leave 1 in 1e5 outside at either end.


def within(errors: Array, sizes: Array, freedom: Array, share: float) -> int:
    """Count errors within the half width that a share of Student's distribution has."""
    return int(np.sum(np.abs(errors) <= sizes * stats.t.ppf(0.5 + 0.5 * share, freedom)))


def bounds(share: float, tail: float = 1e-5) -> tuple[int, int]:
    law = stats.binom(SEEDS, share)
    return int(law.ppf(tail)), int(law.ppf(1.0 - tail))


NOISE = np.random.default_rng(6).normal(size=(SEEDS, V.size))


def covered(found: list[Extracted], true: float, share: float) -> int:
    errors = np.array([one.value - true for one in found])
    sizes = np.array([one.uncertainty for one in found], dtype=np.float64)
    return within(errors, sizes, np.array([one.freedom for one in found]), share)


@pytest.mark.parametrize("share", [0.683, 0.95])
def test_standard_errors_of_lines_cover_as_students_law_says(share: float):
    steep = 1e-12 * 10.0 ** (V / 0.06) * np.exp(0.05 * NOISE)
    swings = [fitted_swing(Points.of(V, row), 1e-11, 1e-4) for row in steep]
    low, high = bounds(share)
    assert low <= covered(swings, 0.06, share) <= high
    p = V * 1e9
    slopes = [log_slope(Points.of(p, 1e6 * np.exp(-5e-9 * p) * row)) for row in np.exp(0.05 * NOISE)]
    assert low <= covered(slopes, -5e-9, share) <= high
    spacing = np.array([2.0, 4.0, 8.0, 16.0, 24.0, 32.0]) * 1e-6
    lines = (2.0 * 100e-6 + 50.0 * spacing) * (1.0 + 0.01 * NOISE[:, :6])
    read = [contacts(spacing, row, "relative") for row in lines]
    assert low <= covered([one.sheet_resistance for one in read], 50.0, share) <= high
    assert low <= covered([one.contact_resistance for one in read], 100e-6, share) <= high


def test_a_line_fitted_to_all_seeds_at_once_is_the_line_of_each():
    fit = line_fit(V, 1.0 + 2.0 * V + 0.1 * NOISE)
    errors = np.asarray(fit.slope - 2.0)
    low, high = bounds(0.95)
    assert low <= within(errors, np.asarray(fit.slope_error), np.full(SEEDS, float(fit.freedom)), 0.95) <= high
    assert float(fit.slope[17]) == float(line_fit(V, 1.0 + 2.0 * V + 0.1 * NOISE[17]).slope)


@pytest.mark.parametrize("share", [0.683, 0.95])
def test_scatter_of_the_nearest_points_covers_a_crossing_and_a_reading(share: float):
    """The scatter comes from 7 points (4 degrees of freedom), two of which the crossing lies between: it is not quite
    independent of the error. Measured once over 6000 seeds, for 0.683 and 0.95: crossing 0.692 and 0.948, reading 0.680
    and 0.967, average swing 0.664 and 0.953; all within the bounds for the stated shares.
    """
    steep = 1e-12 * 10.0 ** (V / 0.3) * np.exp(0.02 * NOISE)
    level = 1e-12 * 10.0 ** (0.304 / 0.3)
    low, high = bounds(share)
    crossed = [threshold_at_current(Points.of(V, row), level) for row in steep if _once(row, level)]
    counted = covered(crossed, 0.304, share) * SEEDS / len(crossed)
    assert low <= counted <= high
    readings = [read_at(Points.of(V, row), 0.304, "log") for row in steep]
    assert low <= covered(readings, level, share) <= high
    rough = 1e-12 * 10.0 ** (V / 0.06) * np.exp(0.05 * NOISE)
    assert low <= covered([average_swing(Points.of(V, row), 1e-11, 1e-4) for row in rough], 0.06, share) <= high


@pytest.mark.parametrize(("neighbours", "noise"), [(3, 0.002), (3, 0.005), (3, 0.01), (4, 0.01), (5, 0.01)])
def test_the_uncertainty_of_an_extrapolated_threshold_is_not_too_small(neighbours: int, noise: float):
    """Every line that scatter might have chosen counts. Measured once over 400 other seeds, within one standard
    uncertainty: 3 points 0.89, 0.72 and 0.76, 4 points 0.69, 5 points 0.70. Without those lines 3 points at 1 per cent
    have 0.47; the result is 28 mV too high there.
    """
    v = np.linspace(0.0, 1.2, V.size)
    above = 0.04 * np.log1p(np.exp((v - 0.4) / 0.04))
    law = 1e-4 * above / (1.0 + 0.8 * above)
    true = extrapolated_threshold(Points.of(v, law), neighbours).value
    found = [extrapolated_threshold(Points.of(v, row), neighbours) for row in law * (1.0 + noise * NOISE)]
    errors = np.array([one.value - true for one in found])
    sizes = np.array([one.uncertainty for one in found])
    assert np.sum(np.abs(errors) <= sizes) >= bounds(0.683)[0]
    assert "scatter makes a largest slope too large" in found[0].remarks[0]


def test_too_small_an_uncertainty_would_be_noticed():
    rough = 1e-12 * 10.0 ** (V / 0.06) * np.exp(0.05 * NOISE)
    found = [average_swing(Points.of(V, row), 1e-11, 1e-4) for row in rough]
    errors, sizes = (np.array(one) for one in zip(*((f.value - 0.06, f.uncertainty) for f in found), strict=True))
    freedom = np.array([one.freedom for one in found])
    low, high = bounds(0.683)
    assert within(errors, 0.6 * sizes, freedom, 0.683) < low
    assert within(errors, 1.6 * sizes, freedom, 0.683) > high


def _once(row: Array, level: float) -> bool:
    return int(np.sum(np.diff(np.sign(row - level)) != 0.0)) == 1


@pytest.mark.parametrize("share", [0.683, 0.95])
def test_scatter_of_third_differences_covers_a_charge(share: float):
    """58 differences, 25 of them independent. The part for the spacing of the points, which noise makes up here, adds a
    little. Measured once over 6000 seeds: 0.694 and 0.952.
    """
    capacitance = 1e-15 * (1.0 + 0.5 * V + 0.01 * NOISE)
    found = [charge_from_capacitance(Points.of(V, row), 0.0, 0.6) for row in capacitance]
    true = 1e-15 * (0.6 + 0.25 * 0.36)
    low, high = bounds(share)
    assert low <= covered(found, true, share) <= high


values = st.one_of(
    st.floats(-1.0, 1.0).map(lambda number: round(number, 12)),
    st.floats(1e-14, 1e-3),
    st.sampled_from([0.0, 1e-6, 1.0]),
)
ROUGH: dict[str, Read] = {
    **READS,
    "extrapolated": lambda p, k: extrapolated_threshold(p),
    "window": lambda p, k: hysteresis_window(p, p, 1e-6),
    "contacts": lambda p, k: contacts(p.x, p.y, "relative").transfer_length,
    "slope": lambda p, k: log_slope(p),
    "linear": lambda p, k: read_at(p, 0.1, "linear"),
    "jump": lambda p, k: jump_voltage(p, factor=3.0),
    "step": lambda p, k: jump_voltage(p, step=0.3),
    "cycles": lambda p, k: cycles_to_failure(p, 1e-6),
}


@given(
    y=st.lists(values, min_size=4, max_size=12),
    marks=st.lists(st.sampled_from(["", "", "", "floor", "compliance"]), min_size=12, max_size=12),
)
def test_any_readings_give_a_number_a_bound_or_a_refusal_in_words(y: list[float], marks: list[str]):
    x = 0.05 * np.arange(1, len(y) + 1)
    low, high = (np.array([mark == word for mark in marks[: len(y)]]) for word in ("floor", "compliance"))
    points = Points.of(x, np.array(y), low, high, 1e-12)
    for name, read in ROUGH.items():
        try:
            found = read(points, 1.0)
        except CannotExtract:
            continue
        assert np.isfinite(found.value), name
        assert found.bound or np.isfinite(found.uncertainty or 0.0), name
