"""Latch of two inverters: exact cases, a fine solution of its differential and delay equations, refusals."""

from __future__ import annotations

import collections
import dataclasses
import math

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from benchmark.circuits.latch import HYSTERESIS, NO_GAIN, OFF_CENTRE, latch
from benchmark.devices.record import SwitchPair
from tests.factories import ohmic_pair
from tests.near import near
from tests.soft_window import soft_pair

C = 1.0e-15


def _with_current(pair: SwitchPair, down, up=None) -> SwitchPair:
    return dataclasses.replace(
        pair,
        down=dataclasses.replace(pair.down, current=down),
        up=dataclasses.replace(pair.up, current=up or down),
    )


def _source(transconductance: float, output: float = 0.0):
    """Current in proportion to the control voltage, plus an output conductance."""
    return lambda control, path: np.asarray(transconductance * control + output * path + 0.0 * (control + path))


def _linear_delay(g: float, a: float, transit: float, ratio: float) -> float:
    """Reach ``ratio`` by dx/dt = g x(t - transit) - a x(t), x = 1 before, in 2000 Heun steps per delay or 1/g."""
    steps = max(20, math.ceil(transit * (g + a) * 200))
    dt = transit / steps
    past = collections.deque([1.0] * (steps + 1))
    x, t = 1.0, 0.0
    while True:
        first = g * past[0] - a * x
        after = x + 0.5 * dt * (first + g * past[1] - a * (x + dt * first))
        if after >= ratio:
            return t + dt * (ratio - x) / (after - x)
        past.popleft()
        past.append(after)
        x, t = after, t + dt


@pytest.mark.parametrize("start", [0.02, 0.1, 0.3])
def test_ideal_transconductors_grow_exponentially(start):
    """Both switches g per volt: dx/dt = 2 g x / C, so t = C/(2 g) ln(V/2 / start); an output conductance slows it."""
    g = 1.0e-5
    pair = _with_current(ohmic_pair(supply=0.8), _source(g))
    found = latch(pair, start, np.asarray(C), np.asarray(0.0))
    assert float(found.charging) == near(C / (2 * g) * math.log(0.4 / start), rel=1e-12)
    assert float(found.waiting) == 0.0
    damped = latch(_with_current(pair, _source(g, 0.25 * g)), start, np.asarray(C), np.asarray(0.0))
    assert float(damped.charging) == near(C / (2 * g - 0.5 * g) * math.log(0.4 / start), rel=1e-12)


@pytest.mark.parametrize("window", [(0.2, 0.8), (0.3, 0.7), (0.1, 0.6)])
def test_nonlinear_switches_against_the_differential_equation(window):
    pair = soft_pair(4.0, *window)
    start = 0.05
    found = latch(pair, start, np.asarray(C), np.asarray(0.0))

    def net(into, out):
        up = pair.up.current(np.array([1.0 - into]), np.array([1.0 - out]))
        return float(up[0] - pair.down.current(np.array([into]), np.array([out]))[0])

    low, high = 0.0, 1.0
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if net(middle, middle) > 0.0 else (low, middle)

    def rates(_, y):
        return [net(y[1], y[0]) / C, net(y[0], y[1]) / C]

    def apart(_, y):
        return y[0] - y[1] - 0.5

    apart.terminal = True  # type: ignore[attr-defined]
    begin = [middle + 0.5 * start, middle - 0.5 * start]
    solved = solve_ivp(rates, (0.0, 1e-6), begin, events=apart, rtol=1e-9, atol=1e-12, method="LSODA")
    assert float(found.charging) == near(float(solved.t_events[0][0]), rel=2e-3)


@pytest.mark.parametrize("transit", [0.02, 0.2, 1.0, 5.0, 20.0])
@pytest.mark.parametrize("output", [0.0, 0.2, 1.2])
def test_late_switches_against_the_delay_equation(transit, output):
    """Transit in units of 1/s_0; the stated error is 1.2 %."""
    g = 1.0e-5
    pair = _with_current(ohmic_pair(supply=1.0), _source(g, output * g))
    rate = 2 * g * (1.0 - output / 1.0) if output < 1.0 else None
    if rate is None:
        assert NO_GAIN in latch(pair, 0.1, np.asarray(C), np.asarray(0.0)).unable
        return
    s_0, a = rate / C, 2 * output * g / C
    for start in (0.01, 0.1, 0.3):
        found = latch(pair, start, np.asarray(C), np.asarray(transit / s_0))
        solved = _linear_delay(s_0 + a, a, transit / s_0, 0.5 / start)
        assert float(found.charging + found.waiting) == near(solved, rel=0.012)


def test_elements_of_arrays_do_not_influence_each_other():
    starts = np.array([0.02, 0.2, 0.6])[:, None]
    transits = np.array([0.0, 1e-11, 3e-9])
    pair = _with_current(ohmic_pair(supply=np.ones((3, 3))), _source(1e-5, 2e-6))
    found = latch(pair, starts, np.full((3, 3), C), transits)
    alone = _with_current(ohmic_pair(supply=1.0), _source(1e-5, 2e-6))
    for i, start in enumerate(starts[:, 0]):
        for j, transit in enumerate(transits):
            one = latch(alone, start, np.asarray(C), np.asarray(transit))
            assert float((found.charging + found.waiting)[i, j]) == near(float(one.charging + one.waiting), rel=1e-12)
    assert float(found.charging[2, 0]) == 0.0  # 0.6 V is more than half the supply: nothing to wait for


def test_what_cannot_regenerate_is_not_evaluated():
    none = latch(soft_pair(0.3, 0.2, 0.8), 0.05, np.asarray(C), np.asarray(0.0))
    assert list(none.unable) == [NO_GAIN]
    assert np.isnan(none.charging)
    pair = ohmic_pair()
    window = dataclasses.replace(pair, up=dataclasses.replace(pair.up, opening_voltage=np.asarray(0.4)))
    found = latch(window, 0.05, np.asarray(C), np.asarray(0.0))
    assert list(found.unable) == [HYSTERESIS]
    assert np.isnan(found.charging)
    lopsided = _with_current(ohmic_pair(), _source(1e-5), _source(1e-7))
    assert list(latch(lopsided, 0.05, np.asarray(C), np.asarray(0.0)).unable) == [OFF_CENTRE]
    no_window = dataclasses.replace(pair, up=dataclasses.replace(pair.up, opening_voltage=np.asarray(np.nan)))
    assert not latch(no_window, 0.05, np.asarray(C), np.asarray(0.0)).unable


def test_scaling():
    pair = soft_pair(4.0, 0.3, 0.7)
    one = latch(pair, 0.05, np.asarray(C), np.asarray(1e-11))
    three = latch(pair, 0.05, np.asarray(3 * C), np.asarray(3e-11))
    assert float(three.charging + three.waiting) == near(3 * float(one.charging + one.waiting), rel=1e-9)
    assert float(latch(pair, 0.02, np.asarray(C), np.asarray(0.0)).charging) > float(one.charging)
