"""Fundamental limits against independent arithmetic."""

from __future__ import annotations

import mpmath
import pytest

from benchmark.physics import limits


def test_swing_at_room_temperature_and_in_liquid_nitrogen():
    # 2.302585 * 8.617333e-5 eV/K * T, the hand value of every textbook
    assert limits.boltzmann_swing([300.0, 77.0]) * 1e3 == pytest.approx([59.526, 15.278], abs=5e-4)


def test_error_probability_and_its_inverse_agree_with_high_precision():
    mpmath.mp.dps = 40
    capacitance, temperature = 10e-18, 300.0
    for supply in (0.1, 0.3, 0.45):
        chance = limits.error_probability(capacitance, supply, temperature)
        sigma = mpmath.sqrt(mpmath.mpf("1.380649e-23") * temperature / mpmath.mpf(capacitance))
        reference = mpmath.erfc(mpmath.mpf(supply) / (2 * mpmath.sqrt(2) * sigma)) / 2
        assert float(chance) == pytest.approx(float(reference), rel=1e-11)
        energy = limits.switching_energy_for_error(chance, temperature)
        assert float(energy) == pytest.approx(capacitance * supply**2, rel=1e-10)
