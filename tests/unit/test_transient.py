"""Chains solved as differential equations, against closed forms where these are exact or their error is stated."""

from __future__ import annotations

import math

import numpy as np
import pytest

from benchmark.circuits.chain_rule import chain_factor
from benchmark.circuits.law_table import scalar_law
from benchmark.circuits.transient import ChainLoad, chain_transient, headline_difference
from benchmark.errors import UsageError
from tests.factories import ohmic_pair
from tests.soft_window import C_NODE, R_ON, RC, soft_pair, two_pole

NODE = ChainLoad(C_NODE)


@pytest.mark.parametrize("ratio", [0.01, 1.0, 100.0, 1.0e4])
def test_transport_delay_adds_exactly(ratio):
    plain = chain_transient(soft_pair(4.0, 0.35, 0.65), NODE).delay
    tau = ratio * RC
    late = chain_transient(soft_pair(4.0, 0.35, 0.65, closing_time=tau, opening_time=tau), NODE)
    assert (late.delay - tau) / RC == pytest.approx(plain / RC, rel=1e-4, abs=1e-8 * ratio)
    assert late.false_crossings == 0


@pytest.mark.parametrize("load", [NODE, ChainLoad(0.2e-15, 0.5e-15, 1e4, 0.3e-15)])
def test_energy_per_cycle_is_c_v_squared(load):
    found = chain_transient(soft_pair(8.0, 0.35, 0.65), load)
    assert found.switching_energy == pytest.approx(load.total * 1.0**2, rel=0.01)
    assert found.leakage_energy < 1e-4 * found.energy
    assert found.unsettled < 1e-4


def test_leakage_is_the_static_current_times_the_period():
    # on/off 1e4: one open switch in series with one closed one, whatever the state
    found = chain_transient(soft_pair(4.0, 0.35, 0.65), NODE)
    assert found.leakage_energy == pytest.approx(1.0 / (R_ON * 1.0001e4) * found.period, rel=0.01)


def test_step_drives_a_stage_in_ln_two():
    found = chain_transient(soft_pair(8.0, 0.35, 0.65), NODE, drive="step")
    assert found.delay == pytest.approx(math.log(2.0) * RC, rel=1e-4)
    assert found.falling_delay == pytest.approx(found.rising_delay, rel=1e-6)


def _ladder_delay(resistance, near, line, capacitance, far, sections=200):
    """50 % delay of a step through a resistor and a line of many sections, by eigenvalues (independent solution)."""
    share = capacitance / sections
    caps = np.full(sections + 1, share)
    caps[0], caps[-1] = near + 0.5 * share, far + 0.5 * share
    g = sections / line
    matrix = np.zeros((sections + 1, sections + 1))
    for k in range(sections):
        matrix[k, k] -= g
        matrix[k + 1, k + 1] -= g
        matrix[k, k + 1] += g
        matrix[k + 1, k] += g
    matrix[0, 0] -= 1.0 / resistance
    root = np.sqrt(caps)
    rates, modes = np.linalg.eigh(matrix / np.outer(root, root))
    weights = modes[-1] / root[-1] * (modes.T @ root)  # from 1 everywhere to 0
    low, high = 0.0, 10.0 * resistance * (near + far + capacitance)
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if weights @ np.exp(rates * middle) > 0.5 else (low, middle)
    return low


def test_driven_line_agrees_with_the_exact_ladder():
    near, line, capacitance, far = 0.3e-15, 2.0e4, 2.0e-15, 1.0e-15
    exact = _ladder_delay(R_ON, near, line, capacitance, far)
    pair = soft_pair(8.0, 0.35, 0.65)
    fine = chain_transient(pair, ChainLoad(near, far, line, capacitance, sections=12), drive="step").delay
    coarse = chain_transient(pair, ChainLoad(near, far, line, capacitance), drive="step").delay
    assert fine == pytest.approx(exact, rel=5e-4)
    assert coarse == pytest.approx(exact, rel=5e-3)


@pytest.mark.parametrize(
    ("window", "level", "low", "high"),
    [
        ((0.2, 0.8), 0.755, -0.01, 0.05),
        ((0.35, 0.65), 0.6285, 0.0, 0.04),
        ((0.1, 0.5), 0.4704, -0.07, 0.0),
        ((0.0, 1.0), 0.9247, -0.11, -0.06),
    ],
)
def test_headline_difference_of_the_chain_rule_stays_in_its_band(window, level, low, high):
    closed = float(chain_factor(level)) * RC
    difference = headline_difference(closed, soft_pair(4.0, *window), NODE)
    assert low <= difference <= high


def test_plain_step_factor_is_far_off_in_a_chain():
    assert headline_difference(math.log(2.0) * RC, soft_pair(4.0, 0.2, 0.8), NODE) == pytest.approx(-0.49, abs=0.01)


def test_ringing_actuator_switches_falsely_and_a_damped_one_does_not():
    assert chain_transient(soft_pair(4.0, 0.2, 0.6, **two_pole(10.0, 0.7)), NODE).false_crossings == 0
    assert chain_transient(soft_pair(4.0, 0.2, 0.6, **two_pole(10.0, 12.0)), NODE, drive="step").false_crossings > 0


def test_late_opening_burns_the_overlap():
    # both switches closed for 10 R C on each edge: V^2/(2 R) each time, on top of C V^2
    pair = soft_pair(8.0, 0.35, 0.65, closing_time=RC, opening_time=11.0 * RC)
    found = chain_transient(pair, NODE)
    assert found.switching_energy == pytest.approx(11.0 * C_NODE, rel=0.06)
    early = chain_transient(soft_pair(8.0, 0.35, 0.65, closing_time=11.0 * RC, opening_time=RC), NODE)
    assert early.switching_energy == pytest.approx(C_NODE, rel=0.01)
    assert early.delay == pytest.approx(chain_transient(soft_pair(8.0, 0.35, 0.65), NODE).delay + 11.0 * RC, rel=1e-3)


def test_sharp_law_is_called_directly_and_a_smooth_one_from_its_table():
    sharp = ohmic_pair(on_resistance=R_ON, off_resistance=1e12, window=(0.5, 0.5001))
    smooth = soft_pair(6.0, 0.35, 0.65)
    assert not scalar_law(sharp.down, 1.0).tabulated
    law = scalar_law(smooth.down, 1.0)
    assert law.tabulated
    assert law.error < 1e-6
    levels, paths = np.array([0.0, 0.351, 0.4997, 0.66, 1.0]), np.array([1e-9, 1e-5, 0.013, 0.6, 1.0])
    for level, path in zip(levels, paths, strict=True):
        true = smooth.down.current(np.array([level]), np.array([path]))[0]
        assert law.current(float(level), float(path)) == pytest.approx(true, rel=1e-5)
    # a jump at half the swing: the next switch moves when its input passes 1/2
    assert chain_transient(sharp, NODE).delay == pytest.approx(math.log(2.0) * RC, rel=0.01)


def test_one_point_of_any_shape_gives_the_same_numbers():
    flat = chain_transient(ohmic_pair(on_resistance=R_ON, off_resistance=1e9), NODE)
    deep = chain_transient(ohmic_pair(on_resistance=np.full((1, 1, 1), R_ON), off_resistance=1e9), NODE)
    assert deep == flat


def test_what_cannot_be_solved_is_refused():
    with pytest.raises(UsageError, match="one design point"):
        chain_transient(ohmic_pair(supply=np.array([0.5, 1.0])), NODE)
    with pytest.raises(UsageError, match="at least 5 stages"):
        chain_transient(ohmic_pair(), NODE, stages=4)
    with pytest.raises(UsageError, match="die out"):
        chain_transient(ohmic_pair(on_resistance=R_ON, off_resistance=2.0 * R_ON), NODE)
