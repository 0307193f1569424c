"""Series balance against brute force and against hand results."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import brentq

from benchmark.physics import virtual_source as vs
from benchmark.physics.stacking import series_balance, subthreshold_current
from tests.unit.test_virtual_source import N32

BARE = replace(N32, source_resistance=0.0, drain_resistance=0.0)


def _law(control: np.ndarray, path: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    slopes = vs.intrinsic_slopes(BARE, control, path)
    return slopes.current, slopes.by_control, slopes.by_path


def _brute_force(control: float, supply: float, count: int, resistance: float) -> float:
    """Voltage of a stack at a given current, device by device from the rail; the current that gives the supply."""

    def excess(log_current: float) -> float:
        current, node = np.exp(log_current), 0.0
        for _ in range(count):
            source = node + current * resistance

            def mismatch(path: float, source: float = source, current: float = current) -> float:
                return float(_law(np.float64(control - source), np.float64(path))[0]) - current

            if mismatch(supply) < 0.0:
                return 1.0
            node = source + brentq(mismatch, 0.0, supply, xtol=1e-15) + current * resistance
        return node - supply

    return float(np.exp(brentq(excess, np.log(1e-16), np.log(2e-3), xtol=1e-12)))


@pytest.mark.parametrize(("control", "supply"), [(0.0, 1.0), (0.0, 0.2), (1.0, 0.5), (0.5, 1.0)])
@pytest.mark.parametrize("count", [2, 3])
@pytest.mark.parametrize("resistance", [0.0, 75.0])
def test_agrees_with_brute_force(control: float, supply: float, count: int, resistance: float):
    found = series_balance(_law, control, np.float64(supply), count, access=(resistance, resistance))
    assert found.current == pytest.approx(_brute_force(control, supply, count, resistance), rel=1e-8)
    assert found.across.sum() + 2 * count * resistance * found.current == pytest.approx(supply, rel=1e-9)


def test_one_device_is_the_law_itself():
    assert series_balance(_law, 0.3, np.float64(0.8), 1).current == pytest.approx(
        float(_law(np.float64(0.3), np.float64(0.8))[0]), rel=1e-11
    )


@pytest.mark.parametrize("count", [2, 3, 4, 6])
def test_ideal_swing_without_barrier_lowering_leaks_one_over_k(count: int):
    # I = exp(V_G/phi) - exp(V_D/phi) form: nodes are exponentials, k devices share them equally (exact)
    phi = 0.025852
    law = subthreshold_current(1e-9, phi * np.log(10.0), 0.0, phi)
    single = law(np.float64(0.0), np.float64(0.7))[0]
    stacked = series_balance(law, 0.0, np.float64(0.7), count).current
    assert stacked * count == pytest.approx(float(single), rel=1e-9)


def test_first_guess_does_not_matter():
    supply = np.linspace(0.05, 1.0, 20)
    a = series_balance(_law, 0.0, supply, 3)
    b = series_balance(_law, 0.0, supply, 3, start=[np.full(20, 0.01), np.full(20, 0.05)])
    np.testing.assert_allclose(a.current, b.current, rtol=1e-9)


def test_unknown_elements_stay_unknown():
    found = series_balance(_law, 0.0, np.array([0.5, np.nan]), 2)
    assert np.isfinite(found.current[0])
    assert np.isnan(found.current[1])


def test_a_law_without_balance_is_nan_and_leaves_the_others_alone():
    # current falls with the path voltage where the scale is negative: no balance to be found
    scale = np.array([1e-6, -1e-6])

    def law(control: np.ndarray, path: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        return 1e-6 + scale * path, np.zeros_like(path), scale + np.zeros_like(path)

    found = series_balance(law, 0.0, np.array([1.0, 2.5]), 2)
    assert found.current[0] == pytest.approx(1.5e-6, rel=1e-9)
    assert np.isnan(found.current[1])
