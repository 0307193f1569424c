"""The loaded piezoelectric column against its own differential equations and limits."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from benchmark.constants import VACUUM_PERMITTIVITY as EPS0
from benchmark.physics import acoustics, force_balance, losses, piezo, resonator

D33, S33E, EPS33T, RHO = 593e-12, 20.7e-12, 3400.0 * EPS0, 7500.0
L_A, A_A, V = 100e-9, (60e-9) ** 2, 0.5
COLUMN = force_balance.column_compliance(S33E, L_A, A_A)
TOTAL = COLUMN + 3.125e-3
FREE = force_balance.free_capacitance(1, EPS33T, A_A, L_A)
K33 = piezo.coupling_factor(D33, S33E, EPS33T)
KAPPA = force_balance.blocking_ratio(COLUMN, TOTAL)
C_IN = force_balance.input_capacitance(FREE, K33, KAPPA)


def test_a_contact_pushes_and_does_not_pull():
    force, lost = force_balance.contact_force(np.array([-1e-9, 0.0, 2e-9]))
    assert force.tolist() == [0.0, 0.0, 2e-9]
    assert lost.tolist() == [True, False, False]


def test_a_gap_is_crossed_by_the_stroke():
    volts = np.array([0.0, 0.1, 0.2, 0.3])
    gap = -0.15 * D33
    force, lost = force_balance.contact_force(force_balance.spring_force(1, D33, volts, gap, TOTAL))
    assert lost.tolist() == [True, True, False, False]
    np.testing.assert_allclose(force[2:], D33 * np.array([0.05, 0.15]) / TOTAL, rtol=1e-12)


def test_charge_is_continuous_across_loss_of_contact():
    """Below contact the column is free (slope C_T), above it is loaded (slope C_in)."""
    gap = -0.2 * D33

    def charge(volts: float) -> float:
        force, _ = force_balance.contact_force(force_balance.spring_force(1, D33, volts, gap, TOTAL))
        return float(force_balance.terminal_charge(FREE, volts, 1, D33, force))

    assert charge(0.1) == pytest.approx(float(FREE) * 0.1, rel=1e-14)
    assert charge(0.2 + 1e-9) == pytest.approx(charge(0.2 - 1e-9), rel=1e-7)
    assert charge(0.5) - charge(0.4) == pytest.approx(float(C_IN) * 0.1, rel=1e-12)


def test_layers_multiply_stroke_by_n_and_capacitance_by_n_squared():
    one = force_balance.spring_force(1, D33, V, 0.0, TOTAL)
    four = force_balance.spring_force(4, D33, V / 4, 0.0, TOTAL)
    assert float(four) == pytest.approx(float(one), rel=1e-14)
    energy = [float(force_balance.free_capacitance(n, EPS33T, A_A, L_A)) * (V / n) ** 2 for n in (1, 4)]
    assert energy[1] == pytest.approx(energy[0], rel=1e-14)


def test_the_punch_keeps_the_pressure_finite():
    """With the punch, pressure grows as the area shrinks but more slowly than 1/area."""
    area = np.array([400e-18, 4e-18])
    punch = force_balance.flat_punch_compliance(400e9, 0.2, np.sqrt(area / math.pi))
    pressure = force_balance.spring_force(1, D33, V, 0.0, COLUMN + punch) / area
    assert 1.0 < pressure[1] / pressure[0] < 100.0


def test_beams():
    clamped = force_balance.clamped_beam_compliance(400e9, 200e-9, 1e-31)
    assert float(clamped) == pytest.approx((200e-9) ** 3 / (192 * 400e9 * 1e-31), rel=1e-14)
    supported = force_balance.supported_beam_compliance(400e9, 200e-9, 1e-31)
    assert float(supported / clamped) == pytest.approx(4.0, rel=1e-14)


def _dissipated(drive: float, quality: float) -> tuple[float, float]:
    """Heat in the resistor and in the mechanics after a supply step, by the circuit's differential equation.

    ``drive`` = w0 R C_0. State: charge on C_0, charge on C_m, its current, both heats; in units of w0, V, C_0.
    """
    ratio = float(FREE * K33**2 * (1 - KAPPA) / force_balance.length_blocked_capacitance(FREE, K33))  # C_m / C_0

    def slope(_: float, y: np.ndarray) -> list[float]:
        q_0, q_m, i_m, _, _ = y
        i_r = (1.0 - q_0) / drive
        l_m = 1.0 / ratio
        r_m = math.sqrt(l_m / ratio) / quality
        return [i_r - i_m, i_m, (q_0 - q_m / ratio - r_m * i_m) / l_m, drive * i_r**2, r_m * i_m**2]

    end = 60.0 * max(1.0, quality, drive)
    solved = solve_ivp(slope, (0.0, end), [0.0] * 5, method="LSODA", rtol=1e-9, atol=1e-12)
    unit = float(force_balance.length_blocked_capacitance(FREE, K33)) / float(C_IN)
    return solved.y[3, -1] * unit, solved.y[4, -1] * unit


@pytest.mark.parametrize("drive", [0.01, 1.0, 10.0])
@pytest.mark.parametrize("quality", [0.5, 2.0])
def test_half_of_charge_times_voltage_is_lost_at_an_edge_whatever_takes_it(drive: float, quality: float):
    resistor, mechanics = _dissipated(drive, quality)
    assert resistor + mechanics == pytest.approx(0.5, rel=2e-5)


def test_fast_drive_leaves_the_motional_part_to_the_mechanics_and_slow_drive_none():
    blocked_share = float(force_balance.length_blocked_capacitance(FREE, K33) / C_IN)
    resistor, mechanics = _dissipated(0.001, 2.0)
    assert resistor == pytest.approx(0.5 * blocked_share, rel=0.005)
    assert mechanics == pytest.approx(0.5 * (1.0 - blocked_share), rel=0.005)
    assert _dissipated(100.0, 2.0)[1] < 0.01


def test_motional_branch_frequency_is_that_of_spring_and_mass():
    mass = float(acoustics.lumped_mass(RHO * A_A * L_A))
    branch = resonator.motional_branch(1, D33, COLUMN, FREE, K33, KAPPA, mass)
    stiffness = 1.0 / float(COLUMN) + 1.0 / float(TOTAL - COLUMN)
    series = resonator.series_resonance(branch.motional_inductance, branch.motional_capacitance)
    assert float(series) == pytest.approx(math.sqrt(stiffness / mass) / (2 * math.pi), rel=1e-12)


def test_resonance_relation_inverts():
    k = np.array([0.05, 0.3, 0.7, 0.98])
    np.testing.assert_allclose(piezo.coupling_from_resonance(piezo.resonance_ratio(k)), k, rtol=1e-9)
    assert np.isnan(piezo.resonance_ratio(np.array([1.0, 1.3]))).all()


def test_constants_that_do_not_belong_together_have_no_wave_speed():
    coupling = piezo.coupling_factor(900e-12, S33E, EPS33T)
    assert coupling > 1.0
    assert np.isnan(piezo.bar_wave_speed(RHO, piezo.compliance_constant_displacement(S33E, coupling)))


def test_clamped_permittivity_is_below_the_length_clamped_one():
    # PZT-5H, kp 0.65, kt 0.505 (from memory) against 1470 published
    clamped = float(piezo.permittivity_clamped(3400.0, 0.65, 0.505))
    assert clamped == pytest.approx(1470.0, rel=0.01)


def test_loop_loss_of_an_ellipse_is_the_loss_tangent_formula():
    phase = np.linspace(0.0, 2.0 * np.pi, 20000, endpoint=False)
    capacitance, swing, tangent = 1e-15, 0.6, 0.03
    voltage = 0.5 * swing * (1.0 - np.cos(phase))
    charge = capacitance * 0.5 * swing * (1.0 - np.cos(phase) + tangent * np.sin(phase))
    loop = float(losses.loop_loss(voltage, charge))
    # the current leads: i dt = dQ, so the loss part of Q is in quadrature with V
    assert abs(loop) == pytest.approx(float(losses.dielectric_loss_unipolar(capacitance, swing, tangent)), rel=1e-6)
    bipolar = losses.dielectric_loss_bipolar(capacitance, 0.5 * swing, tangent)
    assert float(bipolar) == pytest.approx(abs(loop), rel=1e-6)


def test_resonant_loss_is_the_definition_of_quality():
    assert float(losses.resonant_mechanical_loss(1e-18, 10.0)) == pytest.approx(2e-19 * math.pi, rel=1e-14)
