"""Virtual-source current law: accuracy of the solution, limits, slopes, charges."""

from __future__ import annotations

from dataclasses import replace

import mpmath
import numpy as np
import pytest

from benchmark.physics import drive
from benchmark.physics import virtual_source as vs

N32 = vs.Transistor(
    width=1e-6,
    length=23e-9,
    inversion_capacitance=0.0257,
    source_resistance=75e-6,
    drain_resistance=75e-6,
    velocity=97726.0,
    mobility=0.02,
    threshold=0.45338,
    slope_factor=1.4,
    barrier_lowering=0.12,
    fermi_width=3.5,
    saturation_exponent=1.8,
    thermal_voltage=0.025852,
)
WITH_BODY = replace(N32, body_factor=0.1, punch_through=0.1, drain_resistance=120e-6, saturation_exponent=1.6)
#: access resistance takes two thirds of the supply
RESISTIVE = replace(N32, source_resistance=900e-6, drain_resistance=600e-6, threshold=0.1)


def _in_40_digits(t: vs.Transistor, gate: float, drain: float) -> float:
    """The equations as printed, root by bisection and secant in 40 digits; nothing shared with the package."""
    with mpmath.workdps(40):
        f = mpmath.mpf
        r_s, r_d = f(t.source_resistance) / f(t.width), f(t.drain_resistance) / f(t.width)
        phi, alpha, beta, delta = (
            f(t.thermal_voltage),
            f(t.fermi_width),
            f(t.saturation_exponent),
            f(t.barrier_lowering),
        )
        n = f(t.slope_factor) + f(t.punch_through) * f(drain)
        gamma, phi_b = f(t.body_factor or 0.0), f(t.body_potential)

        def v_t(body: mpmath.mpf) -> mpmath.mpf:
            return f(t.threshold) + gamma * (mpmath.sqrt(abs(phi_b - body)) - mpmath.sqrt(phi_b))

        def excess(current: mpmath.mpf) -> mpmath.mpf:
            gate_i = f(gate) - current * r_s
            drain_i = f(drain) - current * (r_s + r_d)
            body_i = -current * r_s
            f_pre = 1 / (1 + mpmath.exp((f(gate) - (v_t(f(0)) - delta * drain_i)) / (1.5 * alpha * phi)))
            ab = 2 * (1 - f(0.99) * f_pre) * phi
            corr = (1 + 2 * delta) * (ab / 2) * mpmath.exp(-drain_i / ab)
            gate_c, threshold = gate_i + corr, v_t(body_i + corr)
            f_f = 1 / (1 + mpmath.exp((gate_c - (threshold - delta * drain_i - alpha * phi / 2)) / (alpha * phi)))
            eta = (gate_c - (threshold - delta * drain_i - f_f * alpha * phi)) / (n * phi)
            charge = f(t.inversion_capacitance) * n * phi * mpmath.log1p(mpmath.exp(eta))
            v_dsat = f(t.velocity) * f(t.length) / f(t.mobility) * (1 - f_f) + phi * f_f
            ratio = drain_i / v_dsat
            f_s = ratio / (1 + ratio**beta) ** (1 / beta)
            return f(t.width) * charge * f(t.velocity) * f_s - current

        low, high = f(0), f(drain) / (r_s + r_d)
        for _ in range(140):
            middle = (low + high) / 2
            low, high = (middle, high) if excess(middle) > 0 else (low, middle)
        return float((low + high) / 2)


@pytest.mark.parametrize("transistor", [N32, WITH_BODY, RESISTIVE], ids=["n32", "body", "resistive"])
@pytest.mark.parametrize(
    ("gate", "drain"), [(1.0, 1.0), (0.0, 1.0), (1.0, 0.02), (0.45, 0.45), (0.3, 1e-4), (-0.2, 0.7), (1.4, 1.2)]
)
def test_solution_agrees_with_40_digits(transistor: vs.Transistor, gate: float, drain: float):
    expected = _in_40_digits(transistor, gate, drain)
    found = float(vs.drain_current(transistor, np.float64(gate), np.float64(drain)))
    assert found == pytest.approx(expected, rel=1e-12)


def test_without_access_resistance_it_is_charge_times_velocity():
    bare = replace(N32, source_resistance=0.0, drain_resistance=0.0)
    state = vs.channel_state(bare, np.float64(0.8), np.float64(0.6))
    expected = bare.width * state.charge * bare.velocity * state.saturation
    assert vs.drain_current(bare, np.float64(0.8), np.float64(0.6)) == pytest.approx(expected, rel=1e-15)


def test_known_current_reproduces_the_solution():
    current = vs.drain_current(N32, np.float64(1.0), np.float64(0.7))
    state = vs.channel_state(N32, np.float64(1.0), np.float64(0.7), current)
    assert N32.width * state.charge * N32.velocity * state.saturation == pytest.approx(float(current), rel=1e-12)


def test_far_outside_it_stays_finite():
    control, path = np.linspace(-5.0, 5.0, 41), np.linspace(0.0, 4.0, 17)[:, None]
    current = vs.drain_current(N32, control, path)
    assert np.isfinite(current).all()
    assert (current[1:] > 0.0).all()
    assert (current[0] == 0.0).all()


def test_an_element_does_not_depend_on_its_neighbours():
    rng = np.random.default_rng(3)
    control, path = rng.uniform(-0.2, 1.2, 999), rng.uniform(0.0, 1.2, 999)
    whole = vs.drain_current(N32, control, path)
    parts = np.concatenate([vs.drain_current(N32, control[i : i + 7], path[i : i + 7]) for i in range(0, 999, 7)])
    np.testing.assert_array_equal(whole, parts)


def test_unknown_parameters_give_unknown_current():
    threshold = np.array([0.45, np.nan])
    current = vs.drain_current(replace(N32, threshold=threshold), np.float64(1.0), np.float64(1.0))
    assert np.isfinite(current[0])
    assert np.isnan(current[1])


@pytest.mark.parametrize("control", [0.0, 0.3, 0.5, 0.9])
@pytest.mark.parametrize("path", [0.01, 0.1, 0.6])
def test_intrinsic_slopes_agree_with_differences(control: float, path: float):
    bare = replace(N32, source_resistance=0.0, drain_resistance=0.0)
    slopes = vs.intrinsic_slopes(N32, np.float64(control), np.float64(path))
    step = 1e-6

    def current(dg: float, dd: float) -> float:
        return float(vs.drain_current(bare, np.float64(control + dg), np.float64(path + dd)))

    assert slopes.current == pytest.approx(current(0.0, 0.0), rel=1e-14)
    assert slopes.by_control == pytest.approx((current(step, 0.0) - current(-step, 0.0)) / (2 * step), rel=1e-7)
    assert slopes.by_path == pytest.approx((current(0.0, step) - current(0.0, -step)) / (2 * step), rel=1e-6)


def test_subthreshold_current_changes_a_decade_per_swing():
    swing = 1.4 * 0.025852 * np.log(10.0)
    control = np.array([-0.4, -0.4 + swing])
    current = vs.drain_current(N32, control, np.float64(0.5))
    assert current[1] / current[0] == pytest.approx(10.0, rel=1e-3)


def test_slope_factor_is_one_at_the_thermionic_limit():
    assert vs.slope_factor(0.0595260, 300.0) == pytest.approx(1.0, rel=1e-4)


def test_charge_shares():
    assert drive.charge_partition(1.0) == (0.5, 0.5)
    assert sum(drive.charge_partition(0.0)) == pytest.approx(2.0 / 3.0)
    whole = N32.width * N32.length * vs.channel_state(N32, np.float64(1.0), np.float64(0.0)).charge
    assert drive.gate_charge(N32, np.float64(1.0), np.float64(0.0)) == pytest.approx(float(whole), rel=1e-15)
    saturated = drive.gate_charge(N32, np.float64(1.0), np.float64(50.0))
    charge = vs.channel_state(N32, np.float64(1.0), np.float64(50.0)).charge
    assert saturated == pytest.approx(float(2.0 / 3.0 * N32.width * N32.length * charge), rel=0.02)


def test_switching_capacitance_counts_the_drain_edge_with_its_weight():
    edge = 0.2e-9
    single, double = (drive.switching_capacitance(N32, np.float64(1.0), edge, m) for m in (1.0, 2.0))
    assert double - single == pytest.approx(edge * N32.width, rel=1e-9)


def test_miller_weight_falls_to_its_floor():
    ratio = np.array([0.0, 0.1, 0.3, 0.52, 0.8])
    np.testing.assert_allclose(drive.miller_weight(ratio), [2.32, 2.038, 1.474, 0.8536, 0.8536])
