"""Charge through both switches while their actuators move: integral, limits, and what simulation says."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import brentq

from benchmark.circuits.motion import HALF, lagging, motion_charges
from benchmark.devices.record import SwitchPair
from benchmark.physics.two_pole import step_response
from tests.factories import ohmic_pair, ohmic_switch
from tests.near import near

SUPPLY, ON, OFF, FREQUENCY = 0.8, 1.0e4, 1.0e8, 1.0e11


def _pair(quality: float, **changes: float) -> SwitchPair:
    known = {"supply": SUPPLY, "on_resistance": ON, "off_resistance": OFF, "window": (0.0, 0.9)}
    moving = {"natural_frequency": np.asarray(FREQUENCY), "quality": np.asarray(quality)}
    down, up = (ohmic_switch(polarity=p, **known, **moving | changes) for p in ("down", "up"))
    return SwitchPair(down, up, np.asarray(SUPPLY), np.asarray(300.0))


def _resistance(level: float) -> float:
    share = min(max(level / 0.9, 0.0), 1.0)
    return OFF ** (1.0 - share) * ON**share


@pytest.mark.parametrize("quality", [0.5, 1.0, 3.0])
def test_charge_is_the_integral_over_time_up_to_the_first_arrival(quality: float):
    """Against adaptive quadrature over time; the window ends in a kink, hence 2 %."""

    def way(time: float) -> float:
        return float(step_response(FREQUENCY * time, quality))

    def excess(time: float) -> float:
        level = way(time)
        return SUPPLY / (_resistance(level) + _resistance(1.0 - level)) - SUPPLY / (ON + OFF)

    arrival = brentq(lambda t: way(t) - 0.9999, 0.0, (np.pi if quality > 0.5 else 14.0) / FREQUENCY * 1.16)
    middle = brentq(lambda t: way(t) - 0.5, 0.0, arrival)
    wanted = quad(excess, 0.0, arrival, points=[middle], limit=400)[0]
    found = motion_charges(_pair(quality))
    assert found["down"] == near(wanted, rel=0.02)
    assert found["up"] == near(wanted, rel=0.02)


def test_a_slower_actuator_carries_more_in_proportion():
    slow = motion_charges(_pair(1.0, natural_frequency=np.asarray(0.1 * FREQUENCY)))["down"]
    assert slow == near(10.0 * motion_charges(_pair(1.0))["down"], rel=1e-9)


def test_nothing_without_an_actuator():
    assert motion_charges(ohmic_pair(supply=SUPPLY)) == {"down": 0.0, "up": 0.0}


def test_an_output_that_follows_at_once_leaves_all_and_one_that_lags_next_to_nothing():
    node = np.asarray(1.0)
    assert lagging(np.asarray(1e3), node) == near(1e3, rel=2e-4)
    assert lagging(np.asarray(HALF), node) == near(0.5 * HALF)
    assert lagging(np.asarray(1e-6), node) == near(1e-12 / HALF, rel=1e-5)
    assert lagging(np.asarray([0.0, 0.0]), np.asarray([0.0, 1.0])).tolist() == [0.0, 0.0]
