"""Parts of a change: they add up, nothing gets what it does not do, the way back is opposite."""

from __future__ import annotations

import copy
import itertools
import math
from decimal import Decimal as D
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchmark.decide.attribution import MOST_CHANGES, REST, ROUNDING, attribute, changed_values, shapley
from benchmark.record.load import load_study
from tests.fixed_displacement import fixed_displacement
from tests.near import near
from tests.studies import Inputs, mixed


def load(inputs: Inputs, folder: Path):
    return load_study(inputs.write(folder))[0]


@settings(deadline=None)
@given(st.integers(1, 5), st.integers(0, 2**32 - 1))
def test_shapley_is_the_mean_over_all_orders(count: int, seed: int):
    worth = np.random.default_rng(seed).uniform(-3.0, 3.0, 1 << count)
    expected = np.zeros(count)
    for order in itertools.permutations(range(count)):
        mask = 0
        for i in order:
            expected[i] += worth[mask | 1 << i] - worth[mask]
            mask |= 1 << i
    expected /= math.factorial(count)
    found = shapley(worth, count)
    assert found == pytest.approx(expected, abs=1e-12)
    assert found.sum() == pytest.approx(worth[-1] - worth[0], abs=1e-12)


def test_shapley_by_hand():
    """1 and 2 alone, 5 together: 2 and 3; equal roles get equal parts; no effect gets 0."""
    assert shapley(np.array([0.0, 1.0, 2.0, 5.0]), 2) == pytest.approx([2.0, 3.0])
    assert shapley(np.array([0.0, 1.0, 1.0, 7.0]), 2) == pytest.approx([3.5, 3.5])
    assert shapley(np.array([1.0, 1.0, 4.0, 4.0]), 2) == pytest.approx([0.0, 3.0])
    assert shapley(np.array([0.3]), 0).shape == (0,)


def test_nothing_changed(tmp_path: Path):
    study = load(fixed_displacement(), tmp_path)
    assert changed_values(study, study) == []
    first = attribute(study, study)[0]
    assert (first.total, dict(first.parts), first.note) == (0.0, {}, "")


def test_a_derived_value_that_follows_is_no_cause_of_its_own(tmp_path: Path):
    """The supply is 60 pm over the coefficient: all is due to the coefficient, energy goes with its square."""
    old = load(fixed_displacement(), tmp_path / "old")
    new = load(fixed_displacement(coefficient=("170.0", "0.05")), tmp_path / "new")
    assert [change.key for change in changed_values(old, new)] == [
        "film-switch.actuator_coefficient",
        "film-switch.declared_supply",
    ]
    parts = attribute(old, new)[0].parts
    assert dict(parts) == {"film-switch.actuator_coefficient": near(-2.0 * math.log(200 / 170), rel=1e-6)}


def test_a_derived_value_rounded_in_the_file_has_a_part_of_its_own(tmp_path: Path):
    """0.353 V stands for 0.352941 V: that rounding is named, and the parts still add up to the new study's number."""
    inputs = fixed_displacement(coefficient=("170.0", "0.05"))
    inputs.sets["technologies/film-switch"]["value"]["declared_supply"]["value"] = D("0.353")
    old, new = load(fixed_displacement(), tmp_path / "old"), load(inputs, tmp_path / "new")
    found = attribute(old, new)[0]
    assert found.parts[ROUNDING] == near(-2.0 * math.log(0.353 * 170 / 60), rel=1e-4)
    assert math.fsum(found.parts.values()) == near(found.total, rel=0, abs=1e-12)
    assert found.after == near(attribute(new, new)[0].before, rel=1e-12)
    back = attribute(new, old)[0]
    assert back.parts == {name: near(-part, rel=0, abs=1e-9) for name, part in found.parts.items()}


def _moved(factors: dict[str, str]) -> Inputs:
    """The mixed study with some values of its candidate and its transistor times a factor."""
    inputs = mixed()
    for place, factor in factors.items():
        name, value = place.split(".")
        table = inputs.sets[f"technologies/{name}"]["value"][value]
        if "by_node" in table:
            table["by_node"] = {node: number * D(factor) for node, number in table["by_node"].items()}
        else:
            table["value"] = table["value"] * D(factor)
    return inputs


def _first_values(count: int) -> list[str]:
    """Values of the candidate and of the contender that can be moved by a little."""
    sets = mixed().sets
    names = []
    for place in sorted(sets):
        kind, name = place.split("/")
        if kind == "technologies":
            for value, table in sets[place]["value"].items():
                usable = "formula" not in table and ("spread" not in table)
                names += [f"{name}.{value}"] if usable and "capacitance" in value else []
    return names[:count]


def test_both_sides_search_again_and_the_parts_add_up(tmp_path: Path):
    names = _first_values(3)
    assert len(names) == 3
    old = load(mixed(), tmp_path / "old")
    new = load(_moved(dict(zip(names, ("1.10", "0.95", "1.07"), strict=True))), tmp_path / "new")
    forth, back = attribute(old, new), attribute(new, old)
    for one, other in zip(forth, back, strict=True):
        assert not one.note
        assert set(one.parts) == set(names)
        unit = max(abs(one.total), 1e-30) if one.scale == "additive" else 1.0
        assert abs(math.fsum(one.parts.values()) - one.total) <= 1e-9 * unit
        size = one.before if one.scale == "additive" else 1.0
        for name in names:
            assert abs(one.parts[name] + other.parts[name]) <= 1e-9 * size


def test_too_many_changes_go_together_by_owner(tmp_path: Path):
    names = _first_values(3)
    old = load(mixed(), tmp_path / "old")
    new = load(_moved(dict(zip(names, ("1.10", "0.95", "1.07"), strict=True))), tmp_path / "new")
    alone = attribute(old, new)[0]
    grouped = attribute(old, new, most=2)[0]
    assert len(grouped.parts) <= 2 < len(alone.parts)
    assert all("values)" in name for name in grouped.parts)
    assert math.fsum(grouped.parts.values()) == near(alone.total, rel=0, abs=1e-9)


def test_thirteen_changes_go_together_by_owner_and_the_parts_are_exact(tmp_path: Path):
    """Beyond twelve the parts of values become parts of owners: still the mean over all orders, so no error."""
    inputs, moved = mixed(), 0
    for place in sorted(inputs.sets):
        for name, table in inputs.sets[place]["value"].items():
            known = any(word in name for word in ("capacitance", "resistance", "current", "swing", "velocity", "delay"))
            if moved == 13 or "formula" in table or not known:
                continue
            spread = table.pop("spread", None)
            assert spread is None or isinstance(spread, dict)
            if "by_node" in table:
                table["by_node"] = {node: number * D("1.001") for node, number in table["by_node"].items()}
            else:
                table["value"] = table["value"] * D("1.001")
            moved += 1
    old, new = load(mixed(), tmp_path / "old"), load(inputs, tmp_path / "new")
    count = len(changed_values(old, new))
    assert count == 13 == MOST_CHANGES + 1
    forth, back = attribute(old, new), attribute(new, old)
    alone = attribute(old, new, most=count)[0]
    assert len(forth[0].parts) >= 2
    for one, other in zip(forth, back, strict=True):
        assert len(one.parts) <= MOST_CHANGES
        size = max(abs(one.before), 1e-30) if one.scale == "additive" else 1.0
        assert abs(math.fsum(one.parts.values()) - one.total) <= 1e-9 * size
        for name, part in one.parts.items():
            assert abs(part + other.parts[name]) <= 1e-9 * size, name
    # nearly additive at a thousandth each, so a group is the sum of its members
    for name, part in forth[0].parts.items():
        owner = name.split(" (")[0]
        members = [p for key, p in alone.parts.items() if key.split(".")[0] == owner]
        assert f"({len(members)} values)" in name
        assert part == near(math.fsum(members), rel=0, abs=1e-6)


def test_what_values_do_not_carry_over_is_a_part_of_its_own(tmp_path: Path):
    """Another supply range of the candidate moves the optimum although no value changed."""
    inputs = mixed()
    before = attribute(load(inputs, tmp_path / "old"), load(inputs, tmp_path / "old"))[0].before
    moved = copy.deepcopy(inputs)
    supply = moved.study["candidate"]["knobs"]["supply"]
    supply["low"] = supply["low"] + (supply["high"] - supply["low"]) * D("0.9")
    old, new = load(inputs, tmp_path / "old"), load(moved, tmp_path / "new")
    found = attribute(old, new)[0]
    assert list(found.parts) == [REST]
    assert found.parts[REST] == near(math.log(found.after / before), rel=0, abs=1e-9)
    assert attribute(new, old)[0].parts[REST] == near(-found.parts[REST], rel=0, abs=1e-12)


def test_without_a_permitted_point_nothing_is_split_and_the_reason_is_said(tmp_path: Path):
    inputs = fixed_displacement()
    inputs.sets["technologies/film-switch"]["value"]["stack_thickness"]["value"] = D("6.0e6")
    old, new = load(fixed_displacement(), tmp_path / "old"), load(inputs, tmp_path / "new")
    found = attribute(old, new)[0]
    assert not found.parts
    assert found.note == "advantage is not stated after the change"
