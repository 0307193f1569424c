"""Steps between nodes split by cause: the parts add up, and each cause gets what it alone can do."""

from __future__ import annotations

import itertools
import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchmark.decide.steps import attribution, combinations
from benchmark.report.steps import node_steps, step_rows
from tests.report_records import changed, crossing, mixed

NUMBERS = st.floats(-5.0, 5.0)


def _additive(effects: list[float]) -> dict[int, float]:
    return {
        key: math.fsum(effect for i, effect in enumerate(effects) if key >> i & 1) for key in combinations(len(effects))
    }


@settings(deadline=None)
@given(st.lists(NUMBERS, min_size=1, max_size=7))
def test_independent_groups_get_their_own_effect(effects: list[float]):
    found = attribution(_additive(effects), len(effects))
    assert found == pytest.approx(effects, abs=1e-12)


@settings(deadline=None)
@given(st.integers(1, 7), st.randoms(use_true_random=False))
def test_parts_add_up_whatever_the_combinations_are_worth(count: int, random):
    worth = {key: random.uniform(-3.0, 3.0) for key in combinations(count)}
    total = worth[(1 << count) - 1] - worth[0]
    assert math.fsum(attribution(worth, count)) == pytest.approx(total, abs=1e-12)


def test_two_groups_share_what_they_do_together_by_hand():
    """ln effects 1 and 2 alone, 5 together: each alone first, the other second; means 2 and 3."""
    assert attribution({0: 0.0, 1: 1.0, 2: 2.0, 3: 5.0}, 2) == [2.0, 3.0]


def test_no_group_no_part():
    assert attribution({0: 0.3}, 0) == []
    assert combinations(0) == [0]


def test_parts_of_a_run_add_up_to_the_step_of_the_node_table():
    record = mixed()
    steps = record["node_steps"]
    assert len(steps) == len(record["nodes"]) - 1 >= 1
    for step, (before, after) in zip(steps, itertools.pairwise(record["nodes"]), strict=True):
        assert (step["before"], step["after"]) == (before["label"], after["label"])
        wanted = math.log(after["advantage"] / before["advantage"])
        assert step["total"] == pytest.approx(wanted, abs=1e-12)
        assert math.fsum(step["parts"].values()) == pytest.approx(wanted, abs=1e-9)
        assert any(abs(value) > 1e-3 for cause, value in step["parts"].items() if cause.startswith("candidate"))


def test_values_carry_the_whole_step_where_nothing_else_differs():
    """Same contenders, no tables: every value moved is the other node, but for the end of the supply search."""
    for step in mixed()["node_steps"]:
        assert abs(step["parts"]["not carried by values"]) < 1e-6


def test_the_chart_draws_the_parts_and_says_the_largest():
    record = mixed()
    (chart,) = node_steps(record)
    assert chart.spec is not None
    assert list(chart.points) == step_rows(record)
    factors = [row["factor"] for row in chart.points if row["cause"] != "total"]
    total = next(row["factor"] for row in chart.points if row["cause"] == "total")
    assert math.prod(factors) == pytest.approx(total, rel=1e-9)


def test_a_step_that_cannot_be_split_says_why():
    def change(record):
        record["node_steps"] = [
            {"before": "g1", "after": "g2", "total": None, "parts": {}, "note": "one of the nodes has no advantage"}
        ]

    (chart,) = node_steps(changed(crossing(), change))
    assert chart.spec is None
    assert "one of the nodes has no advantage" in chart.caption
