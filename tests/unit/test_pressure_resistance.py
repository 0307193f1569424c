"""Resistance against pressure: limits of the laws, and a hand calculation written out in full."""

from __future__ import annotations

import math

import numpy as np
import pytest

from benchmark.constants import BOLTZMANN, ELEMENTARY_CHARGE
from benchmark.physics import acoustics, pressure_resistance


def test_floor_and_ceiling_are_exact_far_away():
    saturation = pressure_resistance.floor_pressure(1e9, 1e4, 0.2e9, 2.5e-9)
    assert float(saturation) == pytest.approx(2.2e9, rel=1e-12)
    far = pressure_resistance.log_slope_resistance(np.array([-5e9, 9e9]), 1e9, 1e4, 0.2e9, saturation, 0.05e9)
    np.testing.assert_allclose(far, [1e9, 1e4], rtol=1e-10)


def test_slope_between_the_corners_is_the_stated_one():
    saturation = pressure_resistance.floor_pressure(1e9, 1e4, 0.2e9, 2.5e-9)
    r = pressure_resistance.log_slope_resistance(np.array([1.1e9, 1.3e9]), 1e9, 1e4, 0.2e9, saturation, 0.02e9)
    assert math.log10(r[0] / r[1]) == pytest.approx(2.5 * 0.2, rel=1e-9)


def test_activated_slope_printed_for_110_mev_per_gpa():
    slope = pressure_resistance.activated_slope(0.110e-9 * ELEMENTARY_CHARGE, 300.0)
    assert float(slope) * 1e9 == pytest.approx(1.848, abs=5e-4)


def test_activated_law_ends_at_metal_and_at_leakage():
    energy = pressure_resistance.activation_energy(
        np.array([0.0, 50e9]), 0.62 * ELEMENTARY_CHARGE, 0.1e-9 * ELEMENTARY_CHARGE, 0.01 * ELEMENTARY_CHARGE
    )
    r = pressure_resistance.activated_resistance(energy, 300.0, 1e3, 5e3, 1e-12)
    assert r[1] == pytest.approx(6e3, rel=1e-6)  # prefactor plus metal in series
    assert r[0] == pytest.approx(1.0 / (1e-12 + 1.0 / (1e3 * math.exp(0.62 * ELEMENTARY_CHARGE / BOLTZMANN / 300.0))))


def test_activated_barrier_never_turns_negative():
    energy = pressure_resistance.activation_energy(1e11, 1e-19, 1e-29, 1e-21)
    assert float(energy) >= 0.0


def test_arrhenius_is_neutral_at_the_reference_and_falls_with_temperature():
    r = pressure_resistance.arrhenius_resistance(1e9, 0.45 * ELEMENTARY_CHARGE, np.array([298.15, 358.15]), 298.15)
    assert r[0] == 1e9
    assert math.log(r[0] / r[1]) == pytest.approx(
        0.45 * ELEMENTARY_CHARGE / BOLTZMANN * (1 / 298.15 - 1 / 358.15), rel=1e-12
    )


def test_contacts_are_two_faces_in_series():
    assert float(pressure_resistance.contact_resistance(2e-12, 1e-16)) == pytest.approx(4e4, rel=1e-12)


# p = b d V, R = R_0 10^(-s p), 60 nm at 4000 m/s, C = 0.10 fF, depth 20, activity 0.05, step-driven delay.
# Every number below was worked out by hand.
HAND = [
    # d pm/V, V, p GPa, R ohm, RC ps, t ps, transit share, C V^2 aJ, leakage over dynamic energy
    (300.0, 0.25, 2.0, 1e5, 6.931, 21.93, 0.684, 6.25, 0.0877),
    (150.0, 0.25, 1.0, 1e7, 693.1, 708.1, 0.021, 6.25, 2.833),
    (150.0, 0.50, 2.0, 1e5, 6.931, 21.93, 0.684, 25.0, 0.0877),
    (150.0, 0.40, 1.6, 6.31e5, 43.73, 58.73, 0.255, 16.0, 0.235),
]


@pytest.mark.parametrize("row", HAND)
def test_hand_calculation_of_a_stress_gated_switch(row: tuple[float, ...]):
    coefficient, supply, gpa, resistance, rc, delay, share, energy, leakage = row
    pressure = 2.0e9 / (300e-12 * 0.25) * coefficient * 1e-12 * supply
    r_on = float(pressure_resistance.exponential_resistance(pressure, 1e9, 2e-9))
    transit = float(acoustics.transit_time(60e-9, 4000.0))
    device_rc = math.log(2.0) * r_on * 0.10e-15
    assert pressure / 1e9 == pytest.approx(gpa, rel=1e-12)
    assert r_on == pytest.approx(resistance, rel=1e-3)
    assert transit == pytest.approx(15e-12, rel=1e-12)
    assert device_rc * 1e12 == pytest.approx(rc, abs=0.5 * 10.0 ** (math.floor(math.log10(rc)) - 3))
    assert (device_rc + transit) * 1e12 == pytest.approx(delay, abs=0.005 if delay < 100 else 0.05)
    assert transit / (device_rc + transit) == pytest.approx(share, abs=5e-4)
    assert 0.10e-15 * supply**2 * 1e18 == pytest.approx(energy, rel=1e-12)
    assert 20 * (device_rc + transit) / (0.05 * 1e9 * 0.10e-15) == pytest.approx(
        leakage, abs=5e-5 if leakage < 0.1 else 5e-4
    )


def test_hand_calculation_leakage_with_the_closed_switch_in_series():
    r_on = float(pressure_resistance.exponential_resistance(1e9, 1e9, 2e-9))
    delay = math.log(2.0) * r_on * 0.10e-15 + 15e-12
    assert 20 * delay / (0.05 * (1e9 + r_on) * 0.10e-15) == pytest.approx(2.805, abs=5e-4)
