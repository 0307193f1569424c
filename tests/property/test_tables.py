"""Table interpolation: through its points, between its neighbours, never outside; a table of a model is the model."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.interpolate import PchipInterpolator

from benchmark.devices import model
from benchmark.devices.model import ModelInputs
from benchmark.devices.record import SwitchPair
from benchmark.devices.table import MODEL
from benchmark.measured import MeasuredTable
from benchmark.physics.interpolation import charge_curve, curve, hermite_across, inverse_temperature_weights
from tests.profiles import examples
from tests.unit.test_device_steep_swing import inputs as steep_inputs
from tests.unit.test_device_steep_swing import pair_of as steep_pair
from tests.unit.test_direct_sets import inputs_of, load

SETTINGS = settings(max_examples=examples(80))
ROOM = 298.15


@st.composite
def points(draw, smallest=2, rising=False):
    steps = draw(st.lists(st.floats(0.01, 1.0), min_size=smallest, max_size=8))
    x = np.cumsum(steps) + draw(st.floats(-2.0, 2.0))
    jumps = st.floats(0.0 if rising else -4.0, 4.0)
    y = np.cumsum(draw(st.lists(jumps, min_size=x.size, max_size=x.size)))
    return x, y


@SETTINGS
@given(points(), st.sampled_from(["linear", "log"]), st.floats(0.0, 1.0), st.randoms())
def test_through_points_between_neighbours_and_not_beyond(data, scale, share, random):
    x, y = data
    values = np.exp(y) if scale == "log" else y
    fit = curve(x, values, scale)
    assert np.array_equal(fit(x), values)
    where = x[:-1] + share * np.diff(x)
    low, high = np.minimum(values[:-1], values[1:]), np.maximum(values[:-1], values[1:])
    slack = 1e-12 * np.abs(values).max()
    got = fit(where)
    assert (got >= low - slack).all()
    assert (got <= high + slack).all()
    assert np.isnan(fit([x[0] - 1e-3, x[-1] + 1e-3, np.nan])).all()
    order = list(range(x.size))
    random.shuffle(order)
    assert np.array_equal(curve(x[order], values[order], scale)(where), got)


@SETTINGS
@given(points(rising=True))
def test_monotone_data_give_a_monotone_curve(data):
    x, y = data
    got = curve(x, y, "linear")(np.linspace(x[0], x[-1], 200))
    assert (np.diff(got) >= -1e-12 * max(1.0, np.abs(y).max())).all()


@SETTINGS
@given(points(smallest=3), st.floats(0.05, 0.95))
def test_a_point_inserted_on_straight_data_changes_nothing(data, share):
    x, _ = data
    values = 10.0 ** (-12.0 + 3.0 * (x - x[0]))
    fit = curve(x, values, "log")
    new = x[0] + share * (x[1] - x[0])
    finer = curve(np.append(x, new), np.append(values, fit(new)), "log")
    where = np.linspace(x[0], x[-1], 50)
    assert finer(where) == pytest.approx(fit(where), rel=1e-12)


def test_a_point_inserted_on_curved_data_moves_the_curve_only_beside_it():
    # the slopes at a point depend on its neighbours: the interpolant is local, not invariant
    x, y = np.arange(6) * 0.1, np.array([-9.0, -7.5, -6.0, -5.0, -4.6, -4.5])
    fit = curve(x, y, "linear")
    finer = curve(np.append(x, 0.35), np.append(y, fit(0.35)), "linear")
    far, near = np.linspace(0.0, 0.2, 50), np.linspace(0.2, 0.5, 301)
    assert np.array_equal(finer(far), fit(far))
    moved = np.abs(finer(near) - fit(near)).max()
    assert 1e-4 < moved < 0.02  # decades, of the 1.5 that the segments span


@SETTINGS
@given(points(smallest=2), st.integers(1, 5), st.floats(0.0, 1.0))
def test_interpolation_across_knots_is_that_of_a_general_library(data, columns, share):
    x, y = data
    values = np.stack([y * (k + 1) + k * np.sin(y) for k in range(columns)], axis=-1)
    where = np.full(columns, x[0] + share * (x[-1] - x[0]))
    reference = [float(PchipInterpolator(x, values[:, k])(where[k])) for k in range(columns)]
    assert hermite_across(x, values, where) == pytest.approx(reference, rel=1e-10, abs=1e-10)


@SETTINGS
@given(st.floats(0.1, 3.0), st.floats(-0.3, 3.0), st.lists(st.floats(0.02, 0.5), min_size=1, max_size=6))
def test_charge_of_a_straight_capacitance_is_exact_at_the_points(base, slope, steps):
    volts = np.concatenate(([0.0], np.cumsum(steps)))
    capacitance = base + slope * volts
    if (capacitance <= 0.0).any():
        return
    charge = charge_curve(volts, capacitance)
    assert charge(volts) == pytest.approx(base * volts + 0.5 * slope * volts**2, rel=1e-12, abs=1e-15)
    # a measurement that starts below 0 V gives the same charge from 0 V on
    shifted = np.concatenate(([-0.1], volts))
    assert charge_curve(shifted, base + slope * shifted)(volts) == pytest.approx(charge(volts), rel=1e-12, abs=1e-15)


@SETTINGS
@given(st.lists(st.integers(800, 1800), min_size=1, max_size=5, unique=True), st.floats(150.0, 500.0))
def test_temperature_weights(given_temperatures, wanted):
    kelvin = np.sort(np.array(given_temperatures)) / 4.0
    weights, beyond = inverse_temperature_weights(wanted, kelvin)
    assert weights.sum(axis=0) == pytest.approx(1.0, rel=1e-12)
    assert beyond == ((wanted < kelvin[0] - 1e-6) or (wanted > kelvin[-1] + 1e-6))
    if not beyond and kelvin.size > 1:
        assert (weights / kelvin).sum() == pytest.approx(1.0 / wanted, rel=1e-7)
    exact, _ = inverse_temperature_weights(kelvin, kelvin)
    assert np.array_equal(exact, np.eye(kelvin.size))


def table_of(pair: SwitchPair, end: float, controls: int, paths: int, temperature: float = ROOM) -> MeasuredTable:
    """Sample the pull-down current of a pair whose law does not depend on its own supply."""
    control = np.linspace(0.0, end, controls)
    path = end * np.arange(1, paths + 1) / paths
    c, p = (grid.ravel() for grid in np.meshgrid(control, path))
    columns = {
        "control_voltage": c,
        "path_voltage": p,
        "temperature": np.full(c.size, temperature),
        "path_current": np.asarray(pair.down.current(c, p)).reshape(c.size),
    }
    return MeasuredTable("current", columns, {}, "path_current", "control_voltage", "log", "monotone")


def table_pair(table: MeasuredTable, supply: np.ndarray, temperature: float = ROOM) -> SwitchPair:
    values = {
        "reference_temperature": temperature,
        "declared_supply": 0.3,
        "terminal_capacitance": 1e-17,
        "input_capacitance": 1e-16,
        "transit_time": 0.0,
    }
    given_inputs = ModelInputs({k: np.asarray(v) for k, v in values.items()}, {}, {"current": table})
    assert [f for f in MODEL.check(given_inputs) if f.level == "refuse"] == []
    knobs = {"threshold_shift": np.zeros(())}
    return MODEL.switch(MODEL.prepare(given_inputs), supply, np.asarray(temperature), knobs)


COMPARED = ("resistance", "on_current", "off_current_path")


def worst_errors(source, end: float, supply: np.ndarray, intervals: int) -> dict[str, float]:
    """Largest relative difference between a model and the table sampled from it, off the grid points."""
    got = table_pair(table_of(source(end), end, intervals + 1, intervals), supply)
    model = source(supply)
    return {name: float(np.max(np.abs(getattr(got.down, name) / getattr(model.down, name) - 1.0))) for name in COMPARED}


def assert_converges(source, end: float, supply: np.ndarray, final: float) -> None:
    """Errors fall by at least 12 when the grid gets 4 times finer (second order would give 16) and end small."""
    coarse, fine = worst_errors(source, end, supply, 20), worst_errors(source, end, supply, 80)
    for name in COMPARED:
        assert fine[name] < final, (name, fine)
        assert fine[name] < coarse[name] / 12.0, (name, coarse, fine)


SUPPLIES = np.array([0.11, 0.17, 0.23, 0.29, 0.37, 0.43, 0.49])


def test_a_table_of_the_steep_swing_model_is_the_model():
    assert_converges(lambda supply: steep_pair(steep_inputs(), supply), 0.5, SUPPLIES, 2e-4)


def test_a_table_of_the_virtual_source_model_is_the_model():
    loaded, _ = load("open-7nm-regular")
    given_inputs = inputs_of(loaded, "n7")
    values = {name: value.reshape(()) for name, value in given_inputs.values.items()}
    device = model("virtual-source")
    prepared = device.prepare(ModelInputs({**values, "series_switches_max": np.asarray(1.0)}, given_inputs.options, {}))

    def source(supply) -> SwitchPair:
        knobs = {"threshold_shift": np.zeros(())}
        return device.switch(prepared, np.asarray(supply, float), np.asarray(ROOM), knobs)

    assert_converges(source, 0.7, np.array([0.16, 0.24, 0.33, 0.41, 0.52, 0.63, 0.69]), 2e-5)


def test_on_grid_points_a_table_of_the_model_is_exact():
    supply = np.array([0.1, 0.2, 0.3, 0.4, 0.5])
    got = table_pair(table_of(steep_pair(steep_inputs(), 0.5), 0.5, 11, 10), supply)
    source = steep_pair(steep_inputs(), supply)
    for name in COMPARED:
        assert getattr(got.down, name) == pytest.approx(getattr(source.down, name), rel=1e-12), name
    assert math.isclose(float(got.down.switching_level[0]), 0.5)
