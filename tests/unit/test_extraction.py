"""Numbers read off single curves: exact where the curve is known, refused where it does not hold them."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest

from benchmark.physics.extraction.charge import charge_between, charge_from_capacitance, over_swing, scatter_of
from benchmark.physics.extraction.contacts import contacts, log_slope
from benchmark.physics.extraction.currents import effective_current, mean_of_sweeps
from benchmark.physics.extraction.devices import median_scatter, over_devices, quartile_distance
from benchmark.physics.extraction.jumps import cycles_to_failure, jump_voltage
from benchmark.physics.extraction.lines import line_fit, relative_weights
from benchmark.physics.extraction.points import Points, crossing, crossings, read_at
from benchmark.physics.extraction.result import (
    Accuracy,
    Array,
    CannotExtract,
    Extracted,
    Part,
    Told,
    combined,
    gathered,
)
from benchmark.physics.extraction.swing import average_swing, fitted_swing, minimum_swing
from benchmark.physics.extraction.threshold import extrapolated_threshold, hysteresis_window, threshold_at_current
from tests.near import near

V = np.linspace(0.0, 0.6, 61)
#: 50 mV per decade, exactly: 1 pA at 0 V
STEEP = 1e-12 * 10.0 ** (V / 0.05)


def curve(y: Array, x: Array = V, **marks: object) -> Points:
    return Points.of(x, y, **marks)  # type: ignore[arg-type]


def refused(read: Callable[[], object]) -> CannotExtract:
    with pytest.raises(CannotExtract) as caught:
        read()
    return caught.value


def words(told: str | Told) -> str:
    return told if isinstance(told, str) else told.text()


# -- swing -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("read", [average_swing, minimum_swing, fitted_swing])
def test_a_table_of_50_millivolt_per_decade_gives_50(read: Callable[..., Extracted]):
    found = read(curve(STEEP), 2e-12, 3e-6)
    assert found.value == near(0.05, rel=1e-9)
    assert found.uncertainty == near(0.0, abs=1e-12)
    assert found.bound == ""


def test_a_curve_of_two_slopes_has_its_average_and_its_smallest_swing():
    bent = np.where(V < 0.3, 1e-12 * 10.0 ** (V / 0.05), 1e-6 * 10.0 ** ((V - 0.3) / 0.1))
    found = average_swing(curve(bent), 1e-10, 1e-4)
    assert found.value == near((0.5 - 0.1) / 6.0)  # crossings at 0.1 V and 0.5 V, on points of the curve
    assert found.points in (41, 42)  # rounding decides whether an end counts as a point or as lying beside it
    smallest = minimum_swing(curve(bent), 1e-10, 1e-4)
    assert smallest.value == near(0.05, rel=1e-9)
    assert smallest.points == 2
    assert smallest.remarks[0].startswith("smallest of 40 local slopes")
    assert minimum_swing(curve(bent), 1e-10, 1e-4, 5).points == 5


def test_stated_accuracies_move_a_swing_by_what_they_say():
    found = average_swing(curve(STEEP), 1e-10, 1e-6, Accuracy(reading=0.02, setting=0.5e-3))
    sizes = {part.name: part.size for part in found.parts}
    # both ends independent: sqrt(2) x 0.5 mV over 4 decades; 2 per cent are 0.00869 decades, 0.434 mV, at either end
    assert sizes["setting"] == near(math.sqrt(2.0) * 0.5e-3 / 4.0)
    assert sizes["reading"] == near(math.sqrt(2.0) * 0.05 * 0.02 / math.log(10.0) / 4.0)
    assert found.uncertainty == near(math.hypot(sizes["setting"], sizes["reading"]), rel=1e-6)


def test_a_falling_curve_has_the_swing_of_its_mirror_image():
    assert average_swing(curve(STEEP[::-1]), 1e-10, 1e-6).value == near(0.05)
    assert minimum_swing(curve(STEEP[::-1]), 1e-10, 1e-6).value == near(0.05)


def test_a_span_of_too_few_points_is_refused():
    error = refused(lambda: average_swing(curve(STEEP), 1.1e-10, 1.2e-10))
    assert error.what == "the span of currents has too few points, with the ones just outside it"
    assert error.found == "2"
    error = refused(lambda: fitted_swing(curve(STEEP), 1.01e-10, 3e-10))
    assert error.what == "the span of currents holds too few points"
    assert error.allowed == "4 or more"
    assert refused(lambda: minimum_swing(curve(STEEP), 1e-10, 1e-9, 20)).allowed == "20 or more"
    error = refused(lambda: average_swing(curve(STEEP), 1e-6, 1e-10))
    assert error.what == "a span of currents needs two different currents above 0"


def test_a_span_that_reaches_the_floor_is_refused_with_the_points():
    floored = curve(np.maximum(STEEP, 1e-10), at_floor=STEEP <= 1e-10, floor=1e-10)
    error = refused(lambda: average_swing(floored, 1e-11, 1e-6))
    assert error.what == "the level lies below the readings above the noise floor"
    assert max(error.at) == 10
    dirty = STEEP.copy()
    marks = np.zeros(V.shape, dtype=bool)
    marks[25] = True
    error = refused(lambda: average_swing(curve(dirty, at_floor=marks), 1e-10, 1e-6))
    assert error.what == "the span of currents holds readings at the floor or the compliance"
    assert error.at == (25,)
    dirty[25] = -1e-13
    error = refused(lambda: fitted_swing(curve(dirty), 1e-10, 1e-6))
    assert error.what == "the span of currents holds readings that are not above 0"
    assert (error.at, error.hint) == ((25,), "declare the noise floor")


# -- levels ----------------------------------------------------------------------------------------------------


def test_a_threshold_lies_on_the_straight_line_in_the_logarithm():
    found = threshold_at_current(curve(STEEP), 3.3e-9)
    assert found.value == near(0.05 * math.log10(3.3e3), rel=1e-12)
    assert found.span == (near(0.17), near(0.18))
    assert list(found.used) == [17, 18]


def test_a_level_reached_twice_is_refused_with_both_places():
    hump = np.concatenate([STEEP[:31], STEEP[29::-1]])
    error = refused(lambda: threshold_at_current(curve(hump), 1e-9))
    assert error.what == "the curve reaches the level more than once"
    assert words(error.found) == "at 0.15 (SI), 0.45 (SI)"
    assert error.hint == "choose another level or sweep"
    assert len(crossings(curve(hump), 1e-9, "log")) == 2
    # of the second passage only a bound is known: the level is still reached twice
    marks = np.arange(V.size) > 40
    assert refused(lambda: threshold_at_current(curve(hump, at_floor=marks, floor=1e-11), 1e-9)).what == error.what


def test_a_switch_that_jumps_out_of_the_noise_is_bracketed():
    jumped = curve(np.where(V > 0.405, 1e-6, -2e-14), at_floor=V < 0.405, floor=1e-13)
    found = threshold_at_current(jumped, 1e-9)
    assert found.value == near(0.405)
    assert found.uncertainty == near(0.005 / math.sqrt(3.0))
    assert found.remarks[0].startswith("the level lies between a reading and a bound")
    back = curve(np.where(V > 0.305, 1e-6, 1e-14)[::-1], V[::-1], at_floor=(V < 0.305)[::-1], floor=1e-13)
    window = hysteresis_window(jumped, back, 1e-9)
    assert window.value == near(0.1)
    assert window.uncertainty == near(math.sqrt(2.0) * 0.005 / math.sqrt(3.0))
    # below the floor the level may be anywhere
    assert refused(lambda: threshold_at_current(jumped, 0.5e-13)).what == (
        "the level lies below the readings above the noise floor"
    )


def test_a_level_beyond_the_readings_is_refused_and_never_extrapolated():
    error = refused(lambda: crossing(curve(STEEP), 2e-13, "log"))
    assert error.what == "the curve does not reach the level"
    assert words(error.allowed) == "1e-12 (SI) to 1 (SI), without extrapolation"
    error = refused(lambda: crossing(curve(STEEP, at_compliance=STEEP > 1e-4), 1e-2, "log"))
    assert error.what == "the level lies above the readings below the compliance"
    assert refused(lambda: crossing(curve(STEEP), 0.0, "log")).what == "a level on a logarithmic scale must be above 0"
    everything = np.ones(V.shape, dtype=bool)
    assert refused(lambda: crossing(curve(STEEP, at_floor=everything), 1e-9, "log")).what == (
        "no reading of the curve can be used"
    )


def test_a_level_on_a_point_is_that_point():
    assert crossing(curve(STEEP), float(STEEP[20]), "log").x == V[20]


def test_extrapolation_meets_the_threshold_of_a_straight_line():
    current = np.where(V > 0.2, 1e-3 * (V - 0.2), 0.0)
    found = extrapolated_threshold(curve(current))
    assert found.value == near(0.2, rel=1e-9)
    assert extrapolated_threshold(curve(current), 5, 0.05).value == near(0.175, rel=1e-9)
    assert "nothing subtracted" in found.remarks[0]


def test_a_transconductance_that_still_rises_is_refused():
    error = refused(lambda: extrapolated_threshold(curve(V**2)))
    assert error.what == "the transconductance is largest at an end of the data"
    assert words(error.found) == "0.59 (SI)"
    error = refused(lambda: extrapolated_threshold(curve(np.full(V.shape, 1e-6))))
    assert error.what == "the current does not change along the sweep, so no line meets zero current"
    error = refused(lambda: extrapolated_threshold(curve(V[:4] ** 2, V[:4]), 4))
    assert error.what == "the largest slope needs more points that are readings, not bounds"


def test_a_hysteresis_window_is_the_distance_of_the_sweeps():
    backward = curve(STEEP[::-1], V[::-1] - 0.04)  # falls, and 40 mV lower
    found = hysteresis_window(curve(STEEP), backward, 1e-9)
    assert found.value == near(0.04, rel=1e-9)
    assert found.line_y.tolist() == [1e-9, 1e-9]


# -- currents --------------------------------------------------------------------------------------------------


def test_a_current_between_points_and_at_its_bounds():
    between = read_at(curve(STEEP), 0.305, "log")
    assert between.value == near(1e-12 * 10.0 ** (0.305 / 0.05), rel=1e-12)
    floor = 2e-12
    floored = curve(np.where(V < 0.1, -3e-13, STEEP), at_floor=V < 0.1, floor=floor)
    off = read_at(floored, 0.0, "log")
    assert (off.value, off.bound, off.uncertainty) == (floor, "at-most", None)
    # between the floor and a reading the line is an upper bound too
    assert read_at(floored, 0.095, "log").bound == "at-most"
    on = read_at(curve(STEEP, at_compliance=V > 0.5), 0.6, "log")
    assert (on.value, on.bound) == (near(1.0), "at-least")


def test_a_current_that_cannot_be_read_is_refused():
    error = refused(lambda: read_at(curve(STEEP), 0.7, "log"))
    assert error.what == "the place to read at lies outside the data"
    assert words(error.allowed) == "0 (SI) to 0.6 (SI), without extrapolation"
    signed = curve(STEEP - 1e-9)
    error = refused(lambda: read_at(signed, 0.149, "log"))
    assert error.what == "a reading beside the place is not above 0, so its logarithm cannot be interpolated"
    assert error.at == (14, 15)
    mixed = curve(STEEP, at_floor=V < 0.301, at_compliance=V > 0.301)
    assert refused(lambda: read_at(mixed, 0.305, "log")).what == (
        "the points on both sides are bounds, one at the floor and one at the compliance"
    )
    few = curve(STEEP, at_floor=V < 0.58)
    assert refused(lambda: read_at(few, 0.6, "log")).what == (
        "a curve has too few points that are readings, not bounds"
    )


def test_means_of_numbers_and_bounds():
    plain = Extracted(2.0, (Part("reading", 0.3),), 2, (0.0, 1.0))
    other = Extracted(4.0, (Part("reading", 0.4),), 2, (0.0, 1.0))
    low = Extracted(1.0, (), 1, (0.0, 0.0), "at-most")
    high = Extracted(1.0, (), 1, (0.0, 0.0), "at-least")
    assert effective_current(plain, other).value == 3.0
    assert effective_current(plain, other).uncertainty == near(0.25)
    assert effective_current(plain, low).bound == "at-most"
    assert effective_current(high, plain).bound == "at-least"
    assert refused(lambda: effective_current(low, high)).what == (
        "of two numbers to add, one is an upper and one a lower bound"
    )
    mean = mean_of_sweeps(plain, other)
    assert mean.uncertainty == near(math.hypot(0.25, 1.0 / math.sqrt(3.0)))  # half the difference as a half width


# -- charge ----------------------------------------------------------------------------------------------------


def test_the_charge_of_a_constant_capacitance():
    found = charge_from_capacitance(curve(np.full(V.shape, 3e-15)), 0.105, 0.555)
    assert found.value == near(3e-15 * 0.45, rel=1e-12)
    assert over_swing(found).value == near(3e-15, rel=1e-12)
    assert found.uncertainty == near(0.0, abs=1e-28)
    error = charge_from_capacitance(curve(np.full(V.shape, 3e-15)), 0.1, 0.5, Accuracy(0.01, 1e-3))
    assert error.uncertainty == near(math.hypot(0.01 * 1.2e-15, math.sqrt(2.0) * 1e-3 * 3e-15))


def test_the_trapezium_rule_knows_its_error():
    found = charge_from_capacitance(curve(1e-15 * np.exp(4.0 * V)), 0.0, 0.6)
    exact = 1e-15 * (math.exp(2.4) - 1.0) / 4.0
    assert abs(found.value - exact) < 2.0 * float(found.uncertainty or 0.0)
    assert found.uncertainty is not None
    assert found.uncertainty < 3.0 * abs(found.value - exact)


def test_charges_that_cannot_be_read_are_refused():
    capacitance = curve(np.full(V.shape, 3e-15))
    assert refused(lambda: charge_from_capacitance(capacitance, 0.1, 0.7)).what == (
        "the place to read at lies outside the data"
    )
    assert refused(lambda: charge_from_capacitance(capacitance, 0.1, 0.105)).what == (
        "the swing has too few points, with its two ends"
    )
    marked = curve(np.full(V.shape, 3e-15), at_floor=V < 0.2)
    assert refused(lambda: charge_from_capacitance(marked, 0.1, 0.5)).what == (
        "the swing holds readings at the floor or the compliance"
    )
    assert refused(lambda: charge_between(marked, 0.1, 0.5)).what == (
        "an end of the swing is a reading at the floor or the compliance"
    )
    assert charge_between(capacitance, 0.1, 0.5).value == 0.0


def test_scatter_of_a_cubic_is_none_and_steps_may_differ():
    x = np.array([0.0, 0.1, 0.25, 0.3, 0.55, 0.6, 0.9])
    size, freedom = scatter_of(x, 1.0 + x - 2.0 * x**2)
    assert size == near(0.0, abs=1e-14)
    assert freedom == near(4.0 / 2.31, rel=1e-2)


# -- contacts, slopes ------------------------------------------------------------------------------------------


def test_contacts_of_a_known_line():
    spacing = np.array([16.0, 2.0, 8.0, 4.0, 32.0]) * 1e-6
    found = contacts(spacing, 2.0 * 120e-6 + 60.0 * spacing)  # 120 ohm um per contact, 60 ohm per square
    assert found.contact_resistance.value == near(120e-6, rel=1e-12)
    assert found.sheet_resistance.value == near(60.0, rel=1e-12)
    assert found.transfer_length.value == near(2e-6, rel=1e-12)
    assert found.contact_resistivity.value == near(2.4e-10, rel=1e-12)
    assert found.contact_resistance.uncertainty == near(0.0, abs=1e-16)
    # a common error of 3 per cent of all readings moves the resistances and not the length
    stated = contacts(spacing, 2.0 * 120e-6 + 60.0 * spacing, "relative", Accuracy(reading=0.03))
    assert stated.contact_resistance.uncertainty == near(0.03 * 120e-6, rel=1e-6)
    assert stated.transfer_length.uncertainty == near(0.0, abs=1e-16)


def test_lines_that_hold_no_contact_are_refused():
    spacing = np.array([2.0, 4.0, 8.0, 16.0]) * 1e-6
    assert refused(lambda: contacts(spacing[:3], spacing[:3])).what == "a line of contacts has too few structures"
    error = refused(lambda: contacts(spacing, 60.0 * spacing - 1e-4))
    assert error.what == "the line of resistance over spacing must rise and meet spacing 0 above zero"
    assert refused(lambda: line_fit(np.zeros(4), np.ones(4))).what == "all points of a line stand at one place"
    assert refused(lambda: line_fit(np.arange(2.0), np.ones(2))).what == "a line with its error needs more points"
    assert refused(lambda: relative_weights(np.array([1.0, 0.0]))).what == (
        "a reading of zero cannot be weighted by its own size"
    )


def test_the_slope_of_the_logarithm_over_a_part_of_the_data():
    p = np.linspace(0.0, 2e9, 21)
    resistance = np.where(p < 1e9, 1e9 * np.exp(-4e-9 * p), 1e9 * math.exp(-4.0))
    assert log_slope(curve(resistance, p), 0.0, 0.9e9).value == near(-4e-9, rel=1e-12)
    assert log_slope(curve(resistance, p)).value > -4e-9
    assert refused(lambda: log_slope(curve(resistance, p), 0.0, 3e9)).what == "the span leaves the data"
    assert refused(lambda: log_slope(curve(resistance, p), 0.0, 0.25e9)).what == "the span has too few points"
    marked = curve(resistance, p, at_compliance=p < 0.15e9)
    error = refused(lambda: log_slope(marked))
    assert error.what == "the span holds readings that are bounds or not above 0"
    assert error.at == (0, 1)


# -- jumps, cycles ---------------------------------------------------------------------------------------------


def test_a_jump_lies_between_its_two_neighbours():
    current = np.where(V > 0.405, 1e-6, 1e-13)
    found = jump_voltage(curve(current), factor=100.0)
    assert found.value == near(0.405)
    assert found.uncertainty == near(0.005 / math.sqrt(3.0))
    assert found.span == (near(0.40), near(0.41))
    landed = current.copy()
    landed[41] = 1e-9  # a point taken in the middle of the jump: one jump of two steps
    assert jump_voltage(curve(landed), factor=100.0).span == (near(0.40), near(0.42))
    falling = jump_voltage(curve(np.where(V > 0.3, 50e-9, 5e-9)[::-1], V[::-1]), step=20e-9)
    assert falling.value == near(0.305)


def test_jumps_that_are_none_or_several_are_refused():
    error = refused(lambda: jump_voltage(curve(STEEP), factor=100.0))
    assert error.what == "the sweep has no jump of the stated size"
    assert words(error.found) == "at most a factor 1.585"
    assert words(refused(lambda: jump_voltage(curve(V), step=0.1)).found) == "at most 0.01 (SI)"
    twice = np.where(V > 0.45, 1e-4, np.where(V > 0.25, 1e-8, 1e-12))
    error = refused(lambda: jump_voltage(curve(twice), factor=100.0))
    assert error.what == "the sweep jumps at several places"
    assert words(error.found) == "at 0.255 (SI), 0.455 (SI)"
    assert refused(lambda: jump_voltage(curve(twice - 1e-12), factor=100.0)).what == (
        "a current that is not above 0 has no factor to its neighbour"
    )


def test_cycles_to_failure_and_devices_that_lived():
    cycles = np.array([1e6, 1e7, 1e8, 1e9, 1e10])
    failed = cycles_to_failure(curve(np.array([1.0, 1.1, 1.2, 7.0, 2.0]), cycles), 5.0)
    assert failed.value == near(math.sqrt(1e8 * 1e9))
    assert failed.span == (1e8, 1e9)
    assert failed.uncertainty == near(failed.value * 0.5 * math.log(10.0) / math.sqrt(3.0))
    assert failed.remarks == ("the column returns to the good side later",)
    lived = cycles_to_failure(curve(np.full(5, 1.0), cycles), 5.0)
    assert (lived.value, lived.bound) == (1e10, "at-least")
    assert refused(lambda: cycles_to_failure(curve(np.ones(4), np.arange(4.0)), 5.0)).what == (
        "a number of cycles must be above 0"
    )
    assert refused(lambda: cycles_to_failure(curve(np.full(5, 5.0), cycles), 5.0)).what == (
        "the first point stands on the limit, so no side is good"
    )


# -- devices ---------------------------------------------------------------------------------------------------


def device(value: float, bound: str = "", *parts: Part) -> Extracted:
    return Extracted(value, parts, 2, (0.0, 1.0), bound)  # type: ignore[arg-type]


def test_spread_of_devices_is_kept_apart_from_the_error_of_measurement():
    values = np.linspace(-2.0, 2.0, 41)
    found = [device(float(v), "", Part("scatter of the points", 0.5), Part("setting", 0.2)) for v in values]
    over = over_devices(found)
    seen = 2.0 / quartile_distance(41)  # quartiles at -1 and 1
    assert (over.median, over.lower_quartile, over.upper_quartile) == (near(0.0, abs=1e-12), near(-1.0), near(1.0))
    assert over.seen_spread == near(seen)
    assert over.measured == near(0.5)
    assert over.common == near(0.2)
    assert over.device_spread == near(math.sqrt(seen**2 - 0.25))
    assert over.median_error == near(math.hypot(median_scatter(41) * seen, 0.2))
    noisy = over_devices([device(float(v), "", Part("scatter of the points", 5.0)) for v in values])
    assert noisy.device_spread is None
    assert noisy.median_error == near(median_scatter(41) * 5.0)


@pytest.mark.parametrize("count", [2, 3, 4, 5, 8, 40])
def test_spread_and_median_of_few_devices_are_right_on_average(count: int):
    """20 000 samples of a normal distribution: the spread without bias, the scatter of the median as stated."""
    draws = np.random.default_rng(count).standard_normal((20_000, count))
    lower, upper = np.quantile(draws, [0.25, 0.75], axis=1)
    assert np.mean(upper - lower) == near(quartile_distance(count), rel=0.02)
    assert np.std(np.median(draws, axis=1)) == near(median_scatter(count), rel=0.13)
    two = over_devices([device(70.0), device(80.0)])
    assert two.seen_spread == near(5.0 * math.sqrt(math.pi))  # an unbiased 8.9; the sample deviation 7.1 is biased low


def test_a_median_stands_on_bounds_only_where_they_can_move_it():
    low = [device(1.0, "at-most"), device(2.0), device(3.0), device(4.0), device(5.0)]
    over = over_devices(low)
    assert (over.median, over.median_bound, over.bounds) == (3.0, "", 1)
    assert over.lower_quartile == 2.0
    many = [device(1.0, "at-most"), device(2.0, "at-most"), device(4.0, "at-most"), device(3.0), device(5.0)]
    assert (over_devices(many).median, over_devices(many).median_bound) == (3.0, "at-most")
    assert over_devices(many).seen_spread is None
    lived = [device(1e9, "at-least"), device(1e9, "at-least"), device(1e7)]
    assert (over_devices(lived).median, over_devices(lived).median_bound) == (1e9, "at-least")
    torn = [device(1.0, "at-least"), device(2.0, "at-most")]
    assert refused(lambda: over_devices(torn)).what == (
        "the median over devices is open on both sides: too many bounds"
    )
    assert refused(lambda: over_devices(torn[:1])).what == "a median over devices needs more than one"


# -- points and parts ------------------------------------------------------------------------------------------


def test_points_that_are_no_sweep_are_refused():
    assert refused(lambda: curve(STEEP[:3], V[:3])).what == "a curve has too few points"
    assert refused(lambda: curve(STEEP[:4], V[:5])).what == "abscissa, readings and marks differ in shape"
    turned = V.copy()
    turned[30] = 0.1
    error = refused(lambda: curve(STEEP, turned))
    assert error.what == "the abscissa of a curve turns back or stands still"
    assert error.at == (30,)
    lost = STEEP.copy()
    lost[7] = math.nan
    assert refused(lambda: curve(lost)).at == (7,)
    assert refused(lambda: curve(lost)).what == "a point is not a number"


def test_parts_add_as_squares_and_freedom_follows_welch():
    parts = [Part("a", 3.0, 4.0), Part("b", 4.0), Part("a", 0.0, 7.0)]
    total = combined(parts)
    assert total.size == 5.0
    assert total.freedom == near(5.0**4 / (3.0**4 / 4.0))
    assert combined([]).size == 0.0
    assert [(part.name, part.size) for part in gathered(parts, -2.0)] == [("a", 6.0), ("b", 8.0)]
    assert Told("{} and {}", "x", (1.0, 2.0)).text(lambda axis, n: f"{axis}{n:g}") == "x1 and x2"
