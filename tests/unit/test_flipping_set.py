"""The smallest set of inputs that changes the side: constructed cases, where energy is activity times C V^2 alone."""

from __future__ import annotations

import itertools
import math
from decimal import Decimal as D
from typing import Any

import pytest
from scipy.optimize import minimize

from benchmark.decide.flipping_set import FlippingSets, flip_rows, flipping_sets
from benchmark.decide.trials import Trials
from benchmark.errors import UsageError
from tests.comparisons import given, load, side, study
from tests.near import near
from tests.studies import Table, v


def capacitance(best: str, share: str | None, shape: str = "uniform") -> Table:
    """A capacitance in fF with a range of so much on either side."""
    if share is None:
        return v(D(best), "fF", unusual=True)
    if shape == "lognormal":
        return v(D(best), "fF", unusual=True, spread={"shape": shape, "factor": 1 + D(share)})
    low, high = D(best) * (1 - D(share)), D(best) * (1 + D(share))
    return v(D(best), "fF", unusual=True, spread={"shape": shape, "low": low, "high": high})


def trials(candidate: Table, reference: Table, required: str = "1.0", **values: Any) -> Trials:
    """Both sides at 0.5 V, without leakage: the advantage is the ratio of the capacitances."""
    free = {"options": {"off_state": "none"}, "off_resistance": None}
    sets = [
        given("a", input_capacitance=candidate, **free, **values),
        given("b", input_capacitance=reference, **free),
    ]
    loaded = load(study(side("a", 0.5, 0.5), [side("b", 0.5, 0.5)], sets, required=D(required)))
    return Trials(loaded, loaded.pair(loaded.headline))


def names(found: FlippingSets) -> list[set[str]]:
    return [{axis.name for axis in flip.axes} for flip in found.flips]


def test_one_input_is_enough():
    found = flipping_sets(trials(capacitance("0.10", "0.5"), capacitance("0.13", "0.05")), 1.0)
    assert names(found) == [{"a.input_capacitance"}]
    (flip,) = found.flips
    assert flip.values == (near(0.13e-15, rel=1e-6),)
    # uniform over 0.10 fF: standard deviation 0.10/sqrt(12)
    assert flip.implausibility == near(0.03 / (0.10 / math.sqrt(12.0)), rel=1e-5)
    assert flip.advantage == near(1.0, rel=1e-6)


def test_no_single_input_but_exactly_one_pair():
    # 1.35 today; a alone gives 1.125, b alone 1.08, together 0.9; the delay moves no energy
    delay = v(D("0.01"), "ns", spread={"shape": "uniform", "low": D("0.005"), "high": D("0.02")})
    footprint = v(D("0.02"), "um^2", spread={"shape": "lognormal", "factor": D("2.0")})
    found = flipping_sets(
        trials(capacitance("0.100", "0.2"), capacitance("0.135", "0.2"), closing_delay=delay, footprint=footprint),
        1.0,
    )
    assert names(found) == [{"a.input_capacitance", "b.input_capacitance"}]
    assert set(found.left_out) == {"a.closing_delay", "a.footprint"}
    (flip,) = found.flips
    a, b = flip.values
    assert b / a == near(1.0, rel=1e-6)
    sd = 0.040e-15 / math.sqrt(12.0), 0.054e-15 / math.sqrt(12.0)
    assert flip.implausibility == near(math.hypot((a - 0.1e-15) / sd[0], (b - 0.135e-15) / sd[1]), rel=1e-6)
    # the nearest point of the line a = b, by a general minimiser
    nearest = minimize(lambda x: ((x[0] - 100.0) / 40.0) ** 2 * 12.0 + ((x[0] - 135.0) / 54.0) ** 2 * 12.0, [115.0])
    assert math.sqrt(nearest.fun) <= flip.implausibility <= 1.05 * math.sqrt(nearest.fun)
    assert "two inputs together" in found.text
    rows = flip_rows(found)
    assert [row["set"] for row in rows] == [1, 1]
    assert {row["evidence"] for row in rows} == {"invented"}


def overheads(candidate: Table | None, contender: Table | None, reference: str, **spreads: Table) -> Trials:
    """Capacitances of both sides with spreads of their own, and efficiencies of supply with ranges."""
    free = {"options": {"off_state": "none"}, "off_resistance": None}

    def of(name: str, best: str) -> Table:
        own = {"spread": spreads[name]} if name in spreads else {}
        return v(D(best), "fF", unusual=True, **own)

    sets = [
        given("a", input_capacitance=of("a", "0.100"), **free),
        given("b", input_capacitance=of("b", reference), **free),
    ]
    sides = [
        side(name, 0.5, 0.5, **({"costs": {"supply_efficiency": table}} if table else {}))
        for name, table in (("a", candidate), ("b", contender))
    ]
    loaded = load(study(sides[0], [sides[1]], sets, required=D("1.0")))
    return Trials(loaded, loaded.pair(loaded.headline))


def test_the_order_is_that_of_the_nearest_points_not_of_the_ends(monkeypatch):
    """1.2 today. One end lies 3.46 standard deviations away, but its side changes after 0.23 of one already."""
    sets = overheads(
        None,
        None,
        "0.120",
        a={"shape": "uniform", "low": D("0.100"), "high": D("0.400")},
        b={"shape": "lognormal", "ln_sd": D("0.12")},
    )
    exact = {"a.input_capacitance": 0.02 / (0.3 / math.sqrt(12.0)), "b.input_capacitance": math.log(1.2) / 0.12}
    for most in (400, 1):
        monkeypatch.setattr("benchmark.decide.flipping_set.MOST_SOLVED", most)
        found = flipping_sets(sets, 1.0)
        assert names(found)[0] == {"a.input_capacitance"}
        assert found.sets == 2
        for flip in found.flips:
            assert flip.implausibility == near(exact[flip.axes[0].name], rel=1e-5)
    assert found.unsolved == 1
    assert "nearest points of 1 further combinations of ends not solved" in found.text
    monkeypatch.setattr("benchmark.decide.flipping_set.MOST_SOLVED", 400)
    monkeypatch.setattr("benchmark.decide.flipping_set.LISTED", 1)
    found = flipping_sets(sets, 1.0)
    assert found.unsolved == 0
    assert names(found) == [{"a.input_capacitance"}]
    assert "one input alone changes that, the least implausible of 2 such sets (1 listed): a.input" in found.text


def test_the_less_implausible_pair_comes_first():
    """1.2 today (0.108 fF / 0.9 over 0.100 fF); no input alone takes away more than 1.17, most of the pairs do."""
    sets = overheads(
        v(D("1.0"), spread={"shape": "loguniform", "low": D("0.87"), "high": D("1.0")}),
        v(D("0.9"), spread={"shape": "loguniform", "low": D("0.85"), "high": D("1.0")}),
        "0.108",
        a={"shape": "uniform", "low": D("0.099"), "high": D("0.117")},
        b={"shape": "lognormal", "ln_sd": D("0.075")},
    )
    found = flipping_sets(sets, 1.0)
    assert all(len(flip.axes) == 2 for flip in found.flips)
    # by how much ln(advantage) falls with the standard deviations of each, and how far each may go
    falls = {
        "a.input_capacitance": lambda z: math.log(1.0 + z * 0.018 / math.sqrt(12.0) / 0.100),
        "b.input_capacitance": lambda z: 0.075 * z,
        "candidate.overhead.supply_efficiency": lambda z: math.log(1.0 / 0.87) / math.sqrt(12.0) * z,
        "contender b.overhead.supply_efficiency": lambda z: math.log(1.0 / 0.85) / math.sqrt(12.0) * z,
    }
    reach = {
        "a.input_capacitance": 0.017 / (0.018 / math.sqrt(12.0)),
        "b.input_capacitance": 1.959964,
        "candidate.overhead.supply_efficiency": math.sqrt(12.0),
        "contender b.overhead.supply_efficiency": math.log(1.0 / 0.9) / math.log(1.0 / 0.85) * math.sqrt(12.0),
    }
    exact = {}
    for pair in itertools.combinations(reach, 2):
        if sum(falls[name](reach[name]) for name in pair) <= math.log(1.2):
            continue
        nearest = minimize(
            lambda z: z @ z,
            [reach[name] for name in pair],
            bounds=[(0.0, reach[name]) for name in pair],
            constraints={
                "type": "eq",
                "fun": lambda z, p=pair: sum(map(lambda n, x: falls[n](x), p, z)) - math.log(1.2),
            },
        )
        exact[frozenset(pair)] = math.sqrt(nearest.fun)
    assert len(exact) == found.sets >= 4
    order = [frozenset(flip) for flip in names(found)]
    assert order == sorted(exact, key=lambda pair: exact[pair])[:5]
    for pair, flip in zip(order, found.flips, strict=True):
        assert exact[pair] * (1.0 - 1e-6) <= flip.implausibility <= 1.06 * exact[pair]
        moved = {}
        for axis, value in zip(flip.axes, flip.values, strict=True):
            moved |= axis.place(value, moved)
        assert sets([moved]).advantage[0] == near(1.0, rel=1e-6)


def test_none_up_to_pairs_is_said_and_a_triple_is_found_on_request():
    # each of three inputs gives a factor 1.15 at most; 1.45 today needs all three (1.521)
    third = v(D("1.0"), spread={"shape": "loguniform", "low": D("0.86956522"), "high": D("1.0")})
    free = {"options": {"off_state": "none"}, "off_resistance": None}
    sets = [
        given("a", input_capacitance=capacitance("0.100", "0.15", "lognormal"), **free),
        given("b", input_capacitance=capacitance("0.145", "0.15", "lognormal"), **free),
    ]
    loaded = load(study(side("a", 0.5, 0.5, costs={"supply_efficiency": third}), [side("b", 0.5, 0.5)], sets))
    made = Trials(loaded, loaded.pair(loaded.headline))
    pairs = flipping_sets(made, 1.0, 2)
    assert pairs.flips == ()
    assert "no pair of inputs changes that inside the 3 ranges" in pairs.text
    triple = flipping_sets(made, 1.0, 3)
    assert names(triple) == [{"a.input_capacitance", "b.input_capacitance", "candidate.overhead.supply_efficiency"}]


def test_without_ranges_there_is_nothing_to_move():
    found = flipping_sets(trials(capacitance("0.100", None), capacitance("0.080", None)), 1.0)
    assert found.flips == ()
    assert found.inputs == 0
    assert "no pair of inputs changes that inside the 0 ranges" in found.text


def test_combinations_far_from_enough_are_left_out_and_counted(monkeypatch):
    made = trials(capacitance("0.100", "0.2"), capacitance("0.135", "0.2"))
    every = flipping_sets(made, 1.0)
    monkeypatch.setattr("benchmark.decide.flipping_set.EXHAUSTIVE", 0)
    found = flipping_sets(made, 1.0)
    assert names(found) == names(every)
    assert found.flips[0].values == every.flips[0].values
    # three of the four combinations of ends move an input the wrong way or not far enough, two could still do
    assert 1 <= found.pruned <= 3
    far = flipping_sets(made, 0.01)
    assert far.flips == ()
    assert far.pruned == 4
    assert "4 combinations whose effects alone add up to less than a third of it left out" in far.text


def test_a_loss_can_be_turned_too_and_other_sizes_are_refused():
    # 0.8 today
    made = trials(capacitance("0.100", "0.3"), capacitance("0.080", "0.1"))
    found = flipping_sets(made, 1.0)
    assert names(found) == [{"a.input_capacitance"}]
    assert "missed today (0.8)" in found.text
    with pytest.raises(UsageError, match="1, 2 or 3 inputs"):
        flipping_sets(made, 1.0, 4)
