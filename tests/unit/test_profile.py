"""Crossings, jumps and edges along a line, against advantages stated as formulas of the trial value."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np
import pytest

from benchmark.decide.axes import Axis, deviations
from benchmark.decide.profile import Line, profiles
from benchmark.decide.trials import Answers
from benchmark.errors import UsageError
from benchmark.sets.values import Spread, Value
from tests.near import near


def axis(low: float, high: float, best: float = 1.0, **more: Any) -> Axis:
    chosen = {"unit": "1", "domain": "positive", "origin": "stated range", "place": lambda x, other: {"x": x}} | more
    return Axis("x", "a number", best=best, low=low, high=high, **chosen)


class Formula:
    """Trials whose advantage is a formula; nan: a side has no permitted point. Contender b: where ``has`` says."""

    def __init__(self, formula: Callable[[float], float], has: Callable[[float], bool] = lambda x: True) -> None:
        self.formula, self.has, self.rows = formula, has, 0

    def __call__(self, trials: Sequence[Mapping[str, float]]) -> Answers:
        x = [trial["x"] for trial in trials]
        self.rows += len(x)
        advantage = np.array([self.formula(value) for value in x])
        ok = ~np.isnan(advantage)
        both = np.stack([ok, np.array([self.has(value) for value in x]) & ok])
        none = {"device RC": np.full(len(x), np.nan)}
        return Answers(advantage, ok, ok, both, ("a", "b"), np.zeros(len(x), dtype=int), none, none, ("",) * len(x))

    whole = __call__

    def why(self, trial: Mapping[str, float]) -> str:
        return f"nothing at {trial['x']:.3g}"


def profile(formula: Callable[[float], float], low: float, high: float, *levels: float, **more: Any) -> Any:
    trials = Formula(formula, more.pop("has", lambda x: True))
    (found,) = profiles(trials, [Line(axis(low, high, **more))], levels or (1.0,), 17)  # type: ignore[arg-type]
    return found


def test_several_roots_are_listed_in_order_with_their_sides():
    found = profile(lambda x: math.exp(math.sin(math.log(x))), 0.1, 1000.0)
    assert [c.x for c in found.crossings] == near([1.0, math.exp(math.pi), math.exp(2.0 * math.pi)], rel=1e-12)
    assert [c.above_below for c in found.crossings] == [False, True, False]
    assert found.edges == ()


def test_roots_of_several_levels_are_told_apart():
    found = profile(lambda x: x, 0.1, 100.0, 1.5, 20.0)
    assert [(c.level, c.x) for c in found.crossings] == [(1.5, near(1.5, rel=1e-12)), (20.0, near(20.0, rel=1e-12))]
    assert [c.x for c in found.crossings_of(20.0)] == near([20.0], rel=1e-12)


def test_two_crossings_between_grid_points_are_seen_where_the_advantage_turns():
    # ln(advantage) = 0.01 - (ln x - 1.7)^2 rises above 0 for 0.2 in ln x; the grid steps by 0.43
    found = profile(lambda x: math.exp(0.01 - (math.log(x) - 1.7) ** 2), 0.1, 100.0)
    assert [math.log(c.x) for c in found.crossings] == near([1.6, 1.8], rel=1e-9)
    assert [c.above_below for c in found.crossings] == [False, True]
    # the same upside down, and a turn that does not reach the level
    below = profile(lambda x: math.exp((math.log(x) - 1.7) ** 2 - 0.01), 0.1, 100.0)
    assert [math.log(c.x) for c in below.crossings] == near([1.6, 1.8], rel=1e-9)
    assert [c.above_below for c in below.crossings] == [True, False]
    assert profile(lambda x: math.exp(-0.001 - (math.log(x) - 1.7) ** 2), 0.1, 100.0).crossings == ()


def test_a_jump_is_no_root():
    found = profile(lambda x: 0.5 if x < 3.0 else 5.0, 0.1, 100.0, has=lambda x: x < 3.0)
    (crossing,) = found.crossings
    assert crossing.kind == "jump"
    assert crossing.x == near(3.0, rel=1e-9)
    assert not crossing.above_below
    assert crossing.why == "the advantage jumps from 0.5 to 5: b has a permitted point only below"


def test_edges_are_found_and_the_stretch_up_to_them_is_searched():
    # the root lies between the last grid point with an advantage and the edge at 2.9
    found = profile(lambda x: 4.0 / x**1.5 if x < 2.9 else math.nan, 1.0, 10.0, 4.0 / 2.85**1.5)
    (edge,) = found.edges
    assert edge.x == near(2.9, rel=1e-6)
    assert edge.defined_below
    assert edge.why == "nothing at 2.9"
    assert [c.x for c in found.crossings] == near([2.85], rel=1e-9)


def test_a_window_of_advantages_has_two_edges_and_nowhere_is_no_error():
    found = profile(lambda x: 2.0 if 1.0 < x < 10.0 else math.nan, 0.1, 100.0)
    assert [edge.defined_below for edge in found.edges] == [False, True]
    assert [edge.x for edge in found.edges] == near([1.0, 10.0], rel=1e-6)
    assert found.crossings == ()
    nowhere = profile(lambda x: math.nan, 0.1, 100.0)
    assert nowhere.edges == nowhere.crossings == ()
    assert nowhere.defined.size == 0


def test_infinite_and_zero_advantages_are_sides_like_others():
    found = profile(lambda x: math.inf if x < 2.0 else 0.0, 0.1, 100.0)
    (crossing,) = found.crossings
    assert (crossing.kind, crossing.above_below) == ("jump", True)
    assert crossing.x == near(2.0, rel=1e-9)


def test_a_linear_range_through_zero_and_a_range_from_zero():
    found = profile(lambda x: math.exp(x), -3.0, 5.0, best=0.0, domain="any")
    assert [c.x for c in found.crossings] == near([0.0], abs=1e-12)
    started = axis(0.0, 100.0, domain="nonnegative", smallest=0.1)
    grid = started.grid(7)
    assert grid[0] == 0.0
    assert grid[1] == near(0.1, rel=1e-12)
    assert 1.0 in grid
    root = profile(lambda x: 0.98 + x, 0.0, 100.0, domain="nonnegative", smallest=0.1).crossings[0]
    assert root.x == near(0.02, rel=1e-9)


def test_a_value_at_the_level_itself_is_above_it():
    found = profile(lambda x: min(x, 1.0), 0.5, 100.0)
    assert [(c.x, c.above_below) for c in found.crossings] == [(near(1.0, rel=1e-9), False)]


# -- distances in standard deviations of a stated spread -------------------------------------------------------------


def value(spread: Spread | None, bound: str = "", best: float = 2.0) -> Value:
    return Value("on_resistance", np.array([best]), "ohm", spread, "invented", "invented", bound=bound)


def spread(shape: str, low: float, high: float, scale: float | None = None) -> Spread:
    return Spread(shape, np.array([low]), np.array([high]), None if scale is None else np.array([scale]))


@pytest.mark.parametrize(
    ("item", "x", "expected"),
    [
        (spread("normal", 1.6, 2.4, 0.2), 2.5, 2.5),
        (spread("lognormal", 1.0, 4.0, 0.35), 1.0, -math.log(2.0) / 0.35),
        (spread("uniform", 1.0, 3.0), 3.0, math.sqrt(3.0)),
        (spread("loguniform", 1.0, 4.0), 4.0, math.sqrt(3.0)),
        # variance of a triangle (a, c, b): (a^2 + b^2 + c^2 - ab - ac - bc)/18 = (1 + 9 + 4 - 3 - 2 - 6)/18
        (spread("triangular", 1.0, 3.0), 1.0, -1.0 / math.sqrt(3.0 / 18.0)),
    ],
)
def test_distance_in_standard_deviations(item, x, expected):
    assert deviations(value(item), x) == near(expected, rel=1e-9)


def test_without_a_spread_there_is_no_distance_and_a_bound_is_log_uniform():
    assert math.isnan(deviations(value(None), 3.0))
    assert math.isnan(deviations(None, 3.0))
    at_most = value(None, "at-most")  # three decades on its open side
    assert deviations(at_most, 0.002) == near(-math.sqrt(12.0), rel=1e-9)


def test_a_number_is_read_in_the_unit_of_the_axis():
    resistance = axis(1.0, 1e6, unit="kohm")
    assert resistance.si("2.5") == near(2500.0, rel=1e-15)
    with pytest.raises(UsageError, match="is not a number in kohm"):
        resistance.si("many")
    with pytest.raises(UsageError, match="low end below its high end"):
        resistance.over(3.0, 2.0)
