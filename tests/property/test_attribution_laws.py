"""How a change is split by cause: laws that hold for any values of the combinations (property 62)."""

from __future__ import annotations

import math

from hypothesis import given
from hypothesis import strategies as st

from benchmark.decide.steps import attribution, combinations
from tests.near import near

NUMBERS = st.floats(-5.0, 5.0)


@st.composite
def worths(draw: st.DrawFn) -> tuple[int, dict[int, float]]:
    count = draw(st.integers(1, 6))
    return count, {key: draw(NUMBERS) for key in combinations(count)}


@given(worths())
def test_the_way_back_has_the_opposite_parts_and_both_add_up(case: tuple[int, dict[int, float]]):
    """From B to A the groups that were in place are taken away."""
    count, worth = case
    whole = (1 << count) - 1
    back = {whole & ~key: value for key, value in worth.items()}
    there, again = attribution(worth, count), attribution(back, count)
    assert there == near([-part for part in again], abs=1e-12)
    assert math.fsum(there) == near(worth[whole] - worth[0], abs=1e-12)


@given(st.integers(1, 6), st.data())
def test_a_group_without_effect_gets_nothing(count: int, data: st.DataObject):
    idle = 1 << data.draw(st.integers(0, count - 1))
    known = {key & ~idle: 0.0 for key in combinations(count)}
    known = {key: data.draw(NUMBERS) for key in known}
    parts = attribution({key: known[key & ~idle] for key in combinations(count)}, count)
    assert parts[idle.bit_length() - 1] == 0.0


@given(NUMBERS, NUMBERS, NUMBERS)
def test_two_groups_with_the_same_role_get_the_same_part(none: float, one: float, both: float):
    parts = attribution({0: none, 1: one, 2: one, 3: both}, 2)
    assert parts[0] == parts[1]


@given(st.lists(st.floats(0.05, 20.0), min_size=1, max_size=6))
def test_logarithms_of_a_product_are_split_exactly(factors: list[float]):
    count = len(factors)
    worth = {
        key: math.log(math.prod(factor for i, factor in enumerate(factors) if key >> i & 1))
        for key in combinations(count)
    }
    assert attribution(worth, count) == near([math.log(factor) for factor in factors], abs=1e-12)
