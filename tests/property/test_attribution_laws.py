"""How a change is split by cause: laws that hold for any values of the combinations (property 62)."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from benchmark.decide.attribution import REST, attribute, shapley
from benchmark.decide.steps import attribution, combinations
from tests.comparisons import load
from tests.near import near
from tests.profiles import costly
from tests.random_sets import POLICIES, factor, plain, scaled, transistor, two, with_policy

few = costly(6)

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


# -- all orders: changes between two states of a study ----------------------------------------------------------------


@given(st.integers(1, 6), st.integers(0, 2**32 - 1), st.data())
def test_all_orders_way_back_equal_roles_and_no_effect(count: int, seed: int, data: st.DataObject):
    worth = np.random.default_rng(seed).uniform(-3.0, 3.0, 1 << count)
    masks = np.arange(1 << count)
    there = shapley(worth, count)
    assert there == near(-shapley(worth[masks[::-1]], count), abs=1e-12)
    one, other = (data.draw(st.integers(0, count - 1)) for _ in range(2))
    swapped = (masks & ~(1 << one | 1 << other)) | (masks >> one & 1) << other | (masks >> other & 1) << one
    equal = shapley(0.5 * (worth + worth[swapped]), count)
    assert equal[one] == near(equal[other], abs=1e-12)
    assert shapley(worth[masks & ~(1 << one)], count)[one] == 0.0


@few
@given(plain("a"), transistor("b"), factor(0.5, 2.0), factor(0.5, 2.0), st.sampled_from(sorted(POLICIES)))
def test_parts_of_two_studies_add_up_and_return(a: Any, b: Any, first: float, second: float, policy: str):
    """Both sides search again in every combination; what is not changed is not listed."""
    new_a, new_b = scaled(a, input_capacitance=first), scaled(b, on_current=second)
    old, new = (load(with_policy(two(x, y), policy)) for x, y in ((a, b), (new_a, new_b)))
    there, back = attribute(old, new), attribute(new, old)
    for forth, again in zip(there, back, strict=True):
        if forth.note:
            assert not forth.parts
            continue
        slack = 1e-9 * max(abs(forth.before), abs(forth.after), abs(forth.total))
        assert math.fsum(forth.parts.values()) == near(forth.total, abs=slack + 1e-12 * (forth.scale == "logarithm"))
        for name, part in forth.parts.items():
            assert again.parts[name] == near(-part, rel=1e-6, abs=slack), name
        changed = {"a.input_capacitance": first, "b.on_current": second}
        assert set(forth.parts) - {REST} == {name for name, k in changed.items() if k != 1.0}
