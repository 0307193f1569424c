"""Calibration on published targets: hit, vectorised, refused when impossible."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from benchmark.physics import drive
from benchmark.physics import virtual_source as vs
from benchmark.physics.calibration import Calibration, Targets, calibrate

TEMPLATE = vs.Transistor(
    width=0.2115e-6,
    length=21e-9,
    inversion_capacitance=0.025,
    source_resistance=140e-6,
    drain_resistance=140e-6,
    velocity=1e5,
    mobility=0.02,
    threshold=0.0,
    slope_factor=1.0193,
    barrier_lowering=0.0213,
    fermi_width=2.0,
    saturation_exponent=1.8,
    thermal_voltage=0.0256926,
)
#: p type of the open 7 nm kit, regular threshold: all four targets
FULL = Targets(0.7, 466.0, 0.321e-3, 200.0, 0.756e-9, 0.16e-9)


def _errors(found: Calibration, targets: Targets) -> dict[str, np.ndarray]:
    t = replace(found.applied_to(TEMPLATE), width=1.0)
    v = np.float64(targets.supply)
    effective = 0.5 * (vs.drain_current(t, v, 0.5 * v) + vs.drain_current(t, 0.5 * v, v))
    errors = {
        "on": vs.drain_current(t, v, v) / targets.on_current - 1.0,
        "off": vs.drain_current(t, np.float64(0.0), v) / targets.off_current - 1.0,
    }
    if targets.effective_current is not None:
        errors["effective"] = effective / targets.effective_current - 1.0
    if targets.switching_capacitance is not None:
        capacitance = drive.switching_capacitance(t, v, targets.edge_capacitance)
        errors["capacitance"] = capacitance / targets.switching_capacitance - 1.0
    return errors


def test_all_four_targets_are_met():
    found = calibrate(TEMPLATE, FULL)
    assert found.solved
    for name, error in _errors(found, FULL).items():
        assert abs(float(error)) < 1e-9, name


def test_without_an_effective_current_the_mobility_is_kept():
    targets = replace(FULL, effective_current=None)
    found = calibrate(TEMPLATE, targets)
    assert found.mobility == 0.02
    assert all(abs(float(error)) < 1e-9 for error in _errors(found, targets).values())


def test_first_guesses_do_not_matter():
    other = replace(TEMPLATE, velocity=3e4, mobility=0.05, inversion_capacitance=0.01)
    a, b = calibrate(TEMPLATE, FULL), calibrate(other, FULL)
    for name in ("threshold", "velocity", "mobility", "inversion_capacitance"):
        assert getattr(a, name) == pytest.approx(float(getattr(b, name)), rel=1e-9)


def test_draws_are_solved_one_by_one():
    rng = np.random.default_rng(1)
    on = 466.0 * rng.lognormal(0.0, 0.03, (200, 1, 1))
    off = 0.321e-3 * rng.lognormal(0.0, 0.3, (200, 1, 1))
    targets = replace(FULL, on_current=on, off_current=off)
    found = calibrate(TEMPLATE, targets)
    assert found.threshold.shape == (200, 1, 1)
    assert found.solved.all()
    for name, error in _errors(found, targets).items():
        assert np.max(np.abs(error)) < 1e-9, name
    seventh = calibrate(TEMPLATE, replace(FULL, on_current=on[7], off_current=off[7]))
    np.testing.assert_allclose(seventh.threshold, found.threshold[7], rtol=1e-13)


def test_an_on_current_beyond_the_mobility_limit_is_not_solved():
    found = calibrate(replace(TEMPLATE, mobility=1e-3), replace(FULL, effective_current=None))
    assert not found.solved
    assert np.isnan(found.threshold)


def test_more_drop_than_supply_is_not_solved():
    found = calibrate(TEMPLATE, replace(FULL, on_current=3000.0, effective_current=None))
    assert not found.solved


@pytest.mark.parametrize("effective", [120.0, 420.0])
def test_an_effective_current_out_of_reach_is_not_solved(effective: float):
    assert not calibrate(TEMPLATE, replace(FULL, effective_current=effective)).solved


def test_impossible_draws_leave_the_others_alone():
    targets = replace(FULL, effective_current=np.array([200.0, 420.0, 205.0]))
    found = calibrate(TEMPLATE, targets)
    np.testing.assert_array_equal(found.solved, [True, False, True])
    np.testing.assert_array_equal(np.isnan(found.velocity), [False, True, False])
