"""Where the search looks next: the aim shrinks the interval fast, and never loses the best supply."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from benchmark.evaluate.zoom import Near, Seen

ENDS = (0.1, 0.9)
Function = Callable[[np.ndarray], np.ndarray]


def zoomed(cost: Function, margin: Function, start: np.ndarray, reach: float, width: float = 1e-7):
    """Run the rounds as the search does, one row per start; supply, cost and number of points looked at."""
    permitted = margin(start) >= 1.0
    value = np.where(permitted, cost(start), np.inf)
    near = Near.around(start, value, margin(start), reach, ENDS)
    fine, points = near.first(), 0
    while (near.width > width).any():
        points += fine.shape[1]
        assert points < 200
        holds, score = margin(fine) >= 1.0, cost(fine)
        asked = score < value[:, None]
        near, place = near.narrowed(Seen(fine, score, asked & holds, np.where(asked, margin(fine), np.inf)))
        better = place >= 0
        value = np.where(better, near.seen.score[:, 1], value)
        fine = near.following(ENDS)
    return near, value, points


def free(supply: np.ndarray) -> np.ndarray:
    return np.full(supply.shape, np.inf)


@given(st.floats(0.15, 0.85), st.floats(-0.039, 0.039), st.floats(0.5, 20.0), st.floats(0.5, 20.0))
def test_a_smooth_least_is_found(best: float, off: float, left: float, right: float):
    start = np.array([best + off])
    near, value, points = zoomed(
        lambda v: np.exp(-left * (v - best)) / left + np.exp(right * (v - best)) / right, free, start, 0.04
    )
    assert abs(near.seen.supply[0, 1] - best) < 1e-5
    assert value[0] <= 1.0 / left + 1.0 / right + 1e-11
    assert points <= 60
    assert not near.at_limit[0]


@given(st.floats(0.15, 0.85), st.floats(-0.039, 0.039), st.floats(0.1, 30.0), st.floats(0.1, 30.0))
def test_a_kink_is_found(best: float, off: float, left: float, right: float):
    """As where the path becomes as long as the clock period."""
    start = np.array([best + off])
    near, _, points = zoomed(
        lambda v: 1.0 + np.where(v < best, left * (best - v), right * (v - best)), free, start, 0.04
    )
    assert abs(near.seen.supply[0, 1] - best) < 2e-7
    assert points <= 100


@given(st.floats(0.15, 0.85), st.floats(0.0, 0.039), st.floats(2.0, 60.0))
def test_a_limit_is_met_from_the_permitted_side(limit: float, off: float, slope: float):
    """A margin that rises like a subthreshold current: few points, because its logarithm is a line."""
    start = np.array([min(limit + off, 0.9)])
    near, _, points = zoomed(lambda v: v**2, lambda v: np.exp(slope * (v - limit)), start, 0.04)
    found = near.seen.supply[0, 1]
    assert 0.0 <= found - limit + 1e-12 <= 2e-7
    assert near.at_limit[0]
    assert points <= 40


def test_the_end_of_the_range_is_an_aim():
    for end, sign in ((0.1, 1.0), (0.9, -1.0)):
        near, _, points = zoomed(lambda v, sign=sign: sign * (v - 0.5), free, np.array([end]), 0.04)
        assert near.seen.supply[0, 1] == end
        assert points <= 35
        assert not near.at_limit[0]


def test_rows_do_not_see_each_other():
    def cost(v: np.ndarray) -> np.ndarray:
        return (v - 0.31) ** 2

    def margin(v: np.ndarray) -> np.ndarray:
        return np.exp(20.0 * (v - 0.315))

    alone = [zoomed(cost, margin, np.array([start]), 0.04)[0].seen.supply[0, 1] for start in (0.32, 0.34)]
    near, _, _ = zoomed(cost, margin, np.array([0.32, 0.34]), 0.04)
    # the row that is done first goes on here, so it can only come closer
    assert np.all(np.abs(near.seen.supply[:, 1] - alone) <= 1e-7)
