"""Wires against exact solutions, direct minimisation and limits."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.linalg import eigh_tridiagonal
from scipy.optimize import brentq, minimize

from benchmark.errors import UsageError
from benchmark.physics import wire_lengths, wires
from tests.near import near

LN2 = np.log(2.0)
POSITIVE = st.floats(1e-3, 1e3)


def _exact_half_time(driver: float, resistance: float, capacitance: float, load: float, sections: int = 400) -> float:
    """50 % time of driver, line and load: ladder of pi sections, eigenvalues of the symmetrised conductance matrix."""
    c = np.full(sections + 1, capacitance / sections)
    c[0] *= 0.5
    c[-1] = 0.5 * c[-1] + load
    g = np.full(sections, sections / resistance)
    diagonal = np.zeros(sections + 1)
    diagonal[:-1] += g
    diagonal[1:] += g
    diagonal[0] += 1.0 / driver
    scale = 1.0 / np.sqrt(c)
    rates, vectors = eigh_tridiagonal(diagonal * scale**2, -g * scale[:-1] * scale[1:])
    weights = scale[-1] * vectors[-1] * (vectors.T @ (1.0 / scale))  # start everywhere at 1, discharge
    return float(brentq(lambda t: weights @ np.exp(-rates * t) - 0.5, 0.0, 10.0 / rates[0]))


@pytest.mark.parametrize("driver", [1e-3, 0.1, 0.3, 1.0, 10.0])
@pytest.mark.parametrize("load", [0.0, 0.1, 0.3, 1.0, 10.0])
def test_driven_line_is_within_its_stated_error(driver, load):
    error = float(wires.driven_line_delay(driver, 1.0, 1.0, load)) / _exact_half_time(driver, 1.0, 1.0, load) - 1.0
    assert -0.033 < error < 0.0


def test_open_line_is_the_series():
    assert float(wires.distributed_rc_time(0.5)) == near(_exact_half_time(1e-9, 1.0, 1.0, 0.0, 2000), rel=1e-5)
    level = np.array([0.05, 0.3, 0.9, 0.999])
    np.testing.assert_allclose(wires.distributed_rc_response(wires.distributed_rc_time(level)), level, rtol=1e-12)


@settings(deadline=None, max_examples=50)
@given(POSITIVE, POSITIVE, POSITIVE, POSITIVE, st.integers(1, 60))
def test_pi_segments_leave_the_elmore_delay(driver, resistance, capacitance, load, segments):
    expected = driver * (capacitance + load) + resistance * (capacitance / 2 + load)
    found = wires.elmore_pi_line(driver, resistance, capacitance, load, segments)
    assert float(found) == near(expected, rel=1e-9)


def test_elmore_chain_of_six():
    """Six 20 kohm / 20 fF sections: 0.69 R C 21 = 5.8 ns (Rabaey 1996, example 7.4)."""
    tau = wires.elmore_delay(np.full(6, 20e3), np.full(6, 20e-15))
    assert 0.69 * float(tau) == near(5.8e-9, abs=0.05e-9)


def test_functions_are_elementwise():
    time = wires.distributed_rc_time(np.array([[0.5], [0.9]]))
    assert time.shape == (2, 1)
    film = wires.fuchs_sondheimer(np.array([20e-9, 40e-9]), 39.9e-9, np.array([[0.0], [0.5]]))
    assert film.shape == (2, 2)
    np.testing.assert_allclose(film[0, 1], wires.fuchs_sondheimer(40e-9, 39.9e-9, 0.0))


@pytest.mark.parametrize("transit", [0.0, 1e-12, 20e-12])
def test_repeated_line_against_direct_minimisation(transit):
    r, c, r_0, c_0, own = 2e5, 2e-10, 1e4, 1e-15, 0.7

    def per_length(x):
        length, size = np.exp(x)
        stage = (
            transit
            + LN2 * (r_0 / size * (c * length + (1 + own) * c_0 * size) + r * length * c_0 * size)
            + 0.377 * r * c * length**2
        )
        return stage / length * 1e9

    best = minimize(per_length, np.log([1e-3, 30.0]), method="Nelder-Mead", options={"xatol": 1e-8, "fatol": 1e-10})
    found = wires.repeated_line_delay_per_length(r, c, r_0, c_0, own, transit)
    assert float(found) == near(best.fun * 1e-9, rel=1e-6)


def test_repeaters_limited_by_transit():
    left = wires.repeated_line_delay_per_length(2e5, 2e-10, 1e-9, 1e-15, 1.0, 10e-12)
    assert float(left) == near(2 * np.sqrt(0.377 * 2e5 * 2e-10 * 10e-12), rel=1e-6)


def test_repeaters_against_direct_minimisation():
    def total(x):
        k, h = np.exp(x)
        return k * (0.7 * 1e4 / h * (2e-12 / k + h * 1e-15) + 2e3 / k * (0.4 * 2e-12 / k + 0.7 * h * 1e-15)) * 1e10

    best = minimize(total, np.log([10.0, 50.0]), method="Nelder-Mead", options={"xatol": 1e-9, "fatol": 1e-12})
    count, size, delay = wires.repeater_optimum(2e3, 2e-12, 1e4, 1e-15)
    assert [float(count), float(size)] == near(np.exp(best.x).tolist(), rel=1e-4)
    assert float(delay) == near(best.fun * 1e-10, rel=1e-8)


@pytest.mark.parametrize(("k", "p"), [(0.5, 0.0), (1.0, 0.9), (5.0, 0.3)])
def test_film_integral_against_adaptive_quadrature(k, p):
    def inside(t):
        return (t**-3 - t**-5) * (1 - np.exp(-k * t)) / (1 - p * np.exp(-k * t))

    expected = 1.0 / (1.0 - 1.5 / k * (1 - p) * quad(inside, 1.0, np.inf, epsabs=1e-13)[0])
    assert float(wires.fuchs_sondheimer(k, 1.0, p)) == near(expected, rel=1e-8)


def test_scattering_limits():
    assert float(wires.mayadas_shatzkes(1e-8, 39.9e-9, 0.0)) == 1.0
    assert float(wires.fuchs_sondheimer(1e-3, 39.9e-9, 0.0)) == near(
        float(wires.fuchs_sondheimer_thick(1e-3, 39.9e-9, 0.0)), rel=1e-9
    )
    # published together: rho lambda = 6.70e-16 ohm m^2 (Gall 2016)
    assert near(6.70e-16, rel=5e-3) == wires.COPPER_RESISTIVITY * wires.COPPER_MEAN_FREE_PATH


def test_quiet_and_opposite_neighbours():
    quiet, along, against = (float(wires.coupled_line_capacitance(1, 1, 1, 1, 1.0, m)) for m in (1.0, 0.0, 2.0))
    assert along == near(float(wires.single_line_capacitance(1, 1, 1)))
    assert against - quiet == near(quiet - along)


def test_two_point_pairs_are_counted_exactly():
    side = 4
    points = [(x, y) for x in range(side) for y in range(side)]
    counted = np.zeros(2 * side - 1)
    for i, (x, y) in enumerate(points):
        for u, v in points[:i]:
            counted[abs(x - u) + abs(y - v)] += 1
    distance = np.arange(1.0, 2 * side - 1)
    p, k, alpha = 0.6, 4.0, 0.75
    b, c = distance * (distance - 1), 2 * distance
    wires_at = alpha * k / c * ((1 + b) ** p + (b + c) ** p - (1 + b + c) ** p - b**p) * counted[1:]
    found = wire_lengths.davis_discrete(side**2, p, k, 3.0)
    assert found == near((wires_at.sum(), (wires_at * distance).sum() / wires_at.sum()), rel=1e-12)


def test_lengths_that_mean_nothing_are_refused():
    with pytest.raises(UsageError, match="square number"):
        wire_lengths.davis_discrete(1000, 0.6, 4.0, 3.0)
    for function in (
        lambda p: wire_lengths.davis_continuous(1e4, p, 4.0, 3.0),
        lambda p: wire_lengths.donath_mean_length(1e4, p),
    ):
        with pytest.raises(UsageError, match=r"other than 0\.5"):
            function(0.5)
        with pytest.raises(UsageError, match="between 0 and 1"):
            function(1.2)
