"""Transit, overshoot and ringing limits against differential equations and finite differences."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from benchmark.physics import acoustics, two_pole


def _solve(quality: float, end: float) -> object:
    return solve_ivp(
        lambda _, y: [y[1], 1.0 - y[0] - y[1] / quality],
        (0.0, end),
        [0.0, 0.0],
        rtol=1e-11,
        atol=1e-13,
        dense_output=True,
    )


@pytest.mark.parametrize("quality", [0.1, 0.4999999999, 0.5, 0.5000000001, 0.7, 3.0, 50.0])
def test_step_response_solves_its_differential_equation(quality: float):
    times = np.linspace(0.0, 12.0, 40)
    solved = _solve(quality, 12.0).sol(times)[0]
    np.testing.assert_allclose(two_pole.step_response(times, quality), solved, atol=2e-9)


@pytest.mark.parametrize("quality", [0.2, 0.5, 1.0, 3.0, 10.0])
@pytest.mark.parametrize("level", [0.05, 0.6, 0.8, 0.99])
def test_time_to_level_is_the_first_crossing(quality: float, level: float):
    solved = _solve(quality, 60.0).sol
    grid = np.linspace(0.0, 60.0, 60001)
    above = int(np.argmax(solved(grid)[0] >= level))
    first = brentq(lambda t: solved(t)[0] - level, grid[above - 1], grid[above], xtol=1e-12)
    assert float(two_pole.time_to_level(level, 2.0e9, quality)) * 2.0e9 == pytest.approx(first, rel=1e-7)


def test_time_to_level_is_nan_where_it_is_never_reached():
    assert np.isnan(two_pole.time_to_level(np.array([1.0, np.nan, -0.1]), 1e9, 1.0)).all()


@pytest.mark.parametrize("quality", [1.0, 3.0, 10.0])
def test_overshoot_is_the_largest_value_less_one(quality: float):
    peak = float(np.max(two_pole.step_response(np.linspace(0.0, 20.0, 200001), quality)))
    assert peak - 1.0 == pytest.approx(float(two_pole.overshoot(quality)), abs=1e-8)


def test_overshoot_vanishes_without_ringing_and_is_one_without_damping():
    assert two_pole.overshoot(np.array([0.3, 0.5])).tolist() == [0.0, 0.0]
    assert float(two_pole.overshoot(np.inf)) == 1.0
    assert np.isnan(two_pole.overshoot(np.nan))


def _bar_tip(reflected: float, cells: int, transits: float) -> np.ndarray:
    """Tip displacement over v S0 dt steps: bar of unit length, density and modulus on a dashpot, strain step 1."""
    dx = 1.0 / cells
    base = (1.0 + reflected) / (1.0 - reflected)
    velocity, strain = np.zeros(cells + 1), np.zeros(cells)
    tip, path = 0.0, []
    for _ in range(int(transits * cells)):
        stress = strain - 1.0
        velocity[1:-1] += np.diff(stress)
        velocity[-1] += -2.0 * stress[-1]
        velocity[0] = ((1.0 - base) * velocity[0] + 2.0 * stress[0]) / (1.0 + base)
        strain += np.diff(velocity)
        tip += velocity[-1] * dx
        path.append(tip)
    return np.array(path)


@pytest.mark.parametrize("reflected", [-0.4, -0.19, 0.2, 0.5, 0.9])
def test_step_peak_of_a_bar_on_a_base_by_finite_differences(reflected: float):
    cells = 1000
    tip = _bar_tip(reflected, cells, 8.0)
    assert tip[cells - 1] == pytest.approx(1.0, abs=2.0 / cells)  # static value first reached after one transit
    assert np.max(tip) == pytest.approx(float(acoustics.step_peak(reflected)), abs=3.0 / cells)
    swing = np.max(np.abs(tip[4 * cells : 6 * cells] - 1.0)) / np.max(np.abs(tip[2 * cells : 4 * cells] - 1.0))
    decay_per_round_trip = math.exp(-0.5 * math.pi / float(acoustics.quality_from_reflection(reflected)))
    assert swing == pytest.approx(decay_per_round_trip, rel=0.02)
    assert decay_per_round_trip == pytest.approx(abs(reflected), rel=1e-12)


def test_quality_from_reflection_limits():
    assert float(acoustics.quality_from_reflection(0.0)) == 0.0
    assert float(acoustics.quality_from_reflection(-1.0)) == math.inf


def test_free_bar_is_a_quarter_wave_and_blocked_bar_a_half_wave():
    assert float(acoustics.loaded_bar_root(0.0)) == pytest.approx(0.5 * math.pi, rel=1e-12)
    assert float(acoustics.loaded_bar_root(1e9)) == pytest.approx(math.pi, rel=1e-8)
    x = float(acoustics.loaded_bar_root(0.0))
    length, speed = 100e-9, 3845.0
    assert x * speed / length / (2 * math.pi) == pytest.approx(float(acoustics.quarter_wave_frequency(length, speed)))
    ratio = acoustics.half_wave_frequency(length, speed) / acoustics.quarter_wave_frequency(length, speed)
    assert float(ratio) == 2.0


@pytest.mark.parametrize("level", [0.3, 0.63, 0.9])
def test_undershoot_limit_is_where_the_response_comes_back_to_the_level(level: float):
    limit = float(acoustics.quality_limit_undershoot(level))
    end = 3.2 * math.pi / math.sqrt(1.0 - 1.0 / (4.0 * limit**2))
    times = np.linspace(0.0, end, 100001)
    response = _solve(limit, end).sol(times)[0]
    after = times > math.pi / math.sqrt(1.0 - 1.0 / (4.0 * limit**2))
    assert float(np.min(response[after])) == pytest.approx(level, abs=1e-6)


@pytest.mark.parametrize(
    ("supply", "first_bad"),
    [(0.4, 8.0), (0.5, 6.0), (0.6, 4.5), (0.75, 3.5), (0.9, 3.0)],
)
def test_chain_limit_stays_below_the_first_bad_quality_of_the_circuit_simulation(supply: float, first_bad: float):
    """First Q with false switching in simulated chains, fast load (RC = 0.1 period), R = 2 R_on at 0.36 V."""
    assert float(acoustics.quality_limit_chain(0.36 / supply)) <= first_bad


def test_chain_limit_follows_its_rule():
    assert float(acoustics.quality_limit_chain(0.36 / 0.9)) == pytest.approx(0.8 * math.pi / math.log(2.5), rel=1e-12)
    assert float(acoustics.quality_limit_chain(0.9)) == 4.5
    assert float(acoustics.quality_limit_chain(1.0)) == 4.5


def test_combined_limit_is_the_smaller_one_and_unknown_stays_unknown():
    level = np.array([0.2, 0.63, 0.95, np.nan])
    limit = acoustics.quality_limit(level)
    np.testing.assert_array_equal(
        limit[:3],
        np.minimum(acoustics.quality_limit_undershoot(level), acoustics.quality_limit_chain(level))[:3],
    )
    assert limit[0] < acoustics.quality_limit_undershoot(0.2)  # the chain rule binds for early switches
    assert limit[2] < acoustics.quality_limit_chain(0.95)  # the undershoot rule binds for late switches
    assert np.isnan(limit[3])


def test_residual_vibration_after_shaped_drive():
    """Undamped oscillator driven by 1 - exp(-t/RC), and by a ramp of one whole period."""
    tau = 0.7
    solved = solve_ivp(
        lambda t, y: [y[1], 1.0 - math.exp(-t / tau) - y[0]], (0.0, 60.0), [0.0, 0.0], rtol=1e-10, atol=1e-12
    )
    late = solved.t > 40.0
    amplitude = np.max(np.hypot(solved.y[0][late] - 1.0, solved.y[1][late]))
    assert amplitude == pytest.approx(float(acoustics.residual_after_exponential(1.0, tau)), rel=1e-5)
    assert float(acoustics.residual_after_ramp(1.0, 2.0 * math.pi)) == pytest.approx(0.0, abs=1e-15)
    assert float(acoustics.residual_after_ramp(1.0, math.pi)) == pytest.approx(2.0 / math.pi, rel=1e-12)
