"""Laws of draws over random small technologies with ranges: probabilities, shares, values of information.

Exact where draws are tied to their values; elsewhere within stated sampling errors. ``ERRORS`` of them, taken from 8 to
16 groups, are passed by chance in about one of 10^5 comparisons.
"""

from __future__ import annotations

import copy
import math
import tempfile
from decimal import Decimal as D
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import ndtr

from benchmark.decide.compare import Comparison
from benchmark.decide.draw_block import DrawTask, drawn
from benchmark.decide.moves import permitted_advantage
from benchmark.decide.uncertainty import Uncertainty, uncertainty
from benchmark.draws.plan import plan_of
from benchmark.evaluate.batch import Batch
from benchmark.record.load import load_study
from tests import comparisons as cmp
from tests.comparisons import number, side, study
from tests.near import near
from tests.profiles import costly
from tests.random_sets import POLICIES, RANGE, factor, lines, published, scaled, side_of, switches, two, with_policy
from tests.studies import Inputs, v

few = costly(3)
ERRORS = 6.0
#: inputs of each model that are given a range
DRAWN = {
    "given": ("on_resistance", "input_capacitance", "off_resistance"),
    "steep-swing": ("on_current", "gate_capacitance_total", "off_current"),
    "stress-gated": ("input_capacitance", "resistance_slope", "actuator_coefficient"),
}


def with_range(technology: Any, sizes: dict[str, float], shape: str = "lognormal") -> Any:
    """Give values a range around their best estimate; sizes are ln-sd, or half of the ln range."""
    item = copy.deepcopy(technology)
    for name, size in sizes.items():
        table = item["value"][name]
        best = float(table["value"])
        if shape == "lognormal":
            table["spread"] = {"shape": shape, "ln_sd": number(size)}
        else:
            ends = (best * math.exp(-size), best * math.exp(size))
            table["spread"] = {"shape": shape, "low": number(ends[0]), "high": number(ends[1])}
    return item


@st.composite
def uncertain(draw: Any, name: str, most: float = 0.08) -> Any:
    """A technology of any of three models with log-normal values."""
    item = draw(switches(name))
    return with_range(item, {key: round(draw(factor(0.01, most)), 4) for key in DRAWN[item["model"]]})


def task_of(inputs: Inputs, draws: int = 64, seed: int = 0) -> DrawTask:
    with tempfile.TemporaryDirectory() as folder:
        loaded, _ = load_study(inputs.write(Path(folder)))
    pair = loaded.pair(loaded.headline)
    comparison = Comparison(loaded, pair, Batch.best_estimate())
    frozen = comparison.frozen_choices(comparison.outcome(loaded.policy.primary))
    return DrawTask(loaded, pair, loaded.policy.primary, frozen, plan_of(draws, seed))


def drawn_study(inputs: Inputs, draws: int = 64, seed: int = 0) -> Uncertainty:
    return uncertainty(task_of(inputs, draws, seed))


def charge_only(name: str, capacitance: float, supply: float, ln_sd: float) -> Any:
    """A switch whose energy is C V^2 alone, C log-normal: ln(advantage) of two of them is normal."""
    item = cmp.given(
        name,
        supply=supply,
        options={"off_state": "none"},
        off_resistance=None,
        input_capacitance=capacitance,
    )
    return with_range(item, {"input_capacitance": ln_sd}) if ln_sd else item


def charges(first: Any, second: Any, required: float, **more: Any) -> Inputs:
    sides = (side(first["id"], 0.2, 1.0), [side(second["id"], 0.2, 1.0)], [first, second])
    return published(study(*sides, policy={"primary": "declared-point"}, points=5, required=required, **more))


SIZES = factor(0.05, 0.5)


# -- identities (3 to 6) in every draw ------------------------------------------------------------------------------


@few
@given(uncertain("a"), st.sampled_from(sorted(POLICIES)))
def test_a_technology_against_itself_is_one_in_every_draw(item: Any, policy: str):
    inputs = study(side_of(item), [side_of(item, id="self-comparison")], [item], required=1.0001, points=7, refine=1e-4)
    found = drawn_study(with_policy(inputs, policy))
    assert (found.smallest, found.largest) == (1.0, 1.0)
    assert found.inputs == 3
    assert found.reaches.value == found.worth_of_all.value == 0.0
    assert all(share.worth.value == share.share.value == 0.0 for share in found.shares)


@few
@given(uncertain("a"), uncertain("b"), st.sampled_from(sorted(POLICIES)))
def test_swapped_sides_mirror_the_distribution(first: Any, second: Any, policy: str):
    """P(win) + P(lose) + P(tie) = 1, draw by draw."""
    there, back = (drawn_study(with_policy(two(x, y), policy)) for x, y in ((first, second), (second, first)))
    assert there.without_candidate == back.without_contender
    undefined = there.without_candidate + there.without_contender
    assert there.reaches.value + back.above_one.value + undefined == near(1.0, rel=1e-12)
    if undefined < 1.0:
        assert there.mean_log.value == near(-back.mean_log.value, abs=1e-9)
        assert there.smallest * back.largest == near(1.0, rel=1e-12)


@few
@given(uncertain("a"), uncertain("b"), uncertain("c"), st.sampled_from(sorted(POLICIES)))
def test_mean_logarithms_add_along_a_chain(a: Any, b: Any, c: Any, policy: str):
    """Each technology keeps its draws, whatever stands beside it."""
    ab, bc, ac = (drawn_study(with_policy(two(x, y), policy)) for x, y in ((a, b), (b, c), (a, c)))
    if not any(found.without_candidate + found.without_contender for found in (ab, bc, ac)):
        assert ac.mean_log.value == near(ab.mean_log.value + bc.mean_log.value, abs=1e-9)


@few
@given(uncertain("a"), uncertain("b"), uncertain("c"), st.sampled_from(sorted(POLICIES)))
def test_a_third_technology_changes_no_draw_of_the_others(a: Any, b: Any, c: Any, policy: str):
    pair = two(a, b)
    triple = copy.deepcopy(pair)
    triple.study["contender"].insert(0, side_of(c))
    triple.sets["technologies/c"] = c
    advantages = []
    for inputs in (pair, triple):
        comparison, outcome, _ = drawn(task_of(with_policy(inputs, policy)), 0)
        advantages.append((outcome.candidate.metric, permitted_advantage(comparison, outcome)))
    assert np.array_equal(advantages[0][0], advantages[1][0], equal_nan=True)
    alone, beside = advantages[0][1], advantages[1][1]
    assert np.all((beside <= alone) | np.isnan(alone) | np.isnan(beside))


@few
@given(uncertain("a"), uncertain("b"))
def test_a_third_technology_that_is_never_the_strongest_changes_no_number(a: Any, b: Any):
    """Its own inputs have no share and no worth, exactly."""
    hopeless = with_range(cmp.given("c", input_capacitance=1e4), {"input_capacitance": 0.3})
    pair = two(a, b, required=1.2)
    triple = copy.deepcopy(pair)
    triple.study["contender"].insert(0, side_of(hopeless))
    triple.sets["technologies/c"] = hopeless
    alone, beside = drawn_study(pair), drawn_study(triple)
    assert beside.strongest["c"] == 0.0
    for name in ("reaches", "above_one", "quantiles", "mean_log", "sd_log", "worth_of_all", "smallest", "largest"):
        assert repr(getattr(beside, name)) == repr(getattr(alone, name)), name
    shares = {share.key: share for share in beside.shares}
    assert shares["c.input_capacitance"].share.value == shares["c.input_capacitance"].worth.value == 0.0
    for share in alone.shares:
        assert (shares[share.key].share, shares[share.key].worth) == (share.share, share.worth)


# -- spelling and names (1, 8, 10) ----------------------------------------------------------------------------------


@few
@given(SIZES, SIZES, factor(0.5, 2.0), st.integers(0, 2**31))
def test_units_change_no_draw_and_names_only_within_the_sampling_error(one: float, other: float, m: float, seed: int):
    inputs = charges(charge_only("a", 0.2, 0.4, one), charge_only("b", 0.2, 0.4, other), m)
    first = drawn_study(inputs, 256, seed)
    assert repr(drawn_study(copy.deepcopy(inputs), 256, seed)) == repr(first)
    respelled = copy.deepcopy(inputs)
    table = respelled.sets["technologies/a"]["value"]["input_capacitance"]
    table |= {"value": number(table["value"]) * 1000, "unit": "aF"}
    assert repr(drawn_study(respelled, 256, seed)) == repr(first)
    renamed = charges(charge_only("zz.9", 0.2, 0.4, one), charge_only("b", 0.2, 0.4, other), m)
    for again in (drawn_study(renamed, 256, seed), drawn_study(inputs, 256, seed + 1)):
        assert again.reaches != first.reaches or again.mean_log != first.mean_log
        for name in ("reaches", "mean_log", "sd_log"):
            mine, theirs = getattr(first, name), getattr(again, name)
            assert abs(mine.value - theirs.value) <= ERRORS * math.hypot(mine.error, theirs.error) + 4.0 / 256, name


# -- limits and monotone relations (42, 50, 56) ---------------------------------------------------------------------


@few
@given(switches("a"), switches("b"), factor(0.3, 3.0), st.sampled_from(sorted(POLICIES)))
def test_ranges_of_no_width_give_the_answer_without_draws(a: Any, b: Any, m: float, policy: str):
    narrow = [with_range(item, dict.fromkeys(DRAWN[item["model"]], 1e-7)) for item in (a, b)]
    best = cmp.advantage(with_policy(two(a, b), policy))
    required = best * m if abs(math.log(m)) > 0.05 else best * 1.3  # beyond the resolution of the search in a draw
    found = drawn_study(with_policy(two(*narrow, required=required), policy))
    assert found.reaches.value == (1.0 if best >= required else 0.0)
    assert found.reaches.error == 0.0
    assert found.worth_of_all.value == 0.0
    assert found.largest / found.smallest - 1.0 < 5e-3


@few
@given(factor(0.05, 0.3), factor(0.05, 0.3), factor(1.2, 3.0))
def test_nested_ranges_nest_the_outcome(first: float, second: float, k: float):
    """Both sides of C V^2 alone, log-uniform: every draw lies further out."""
    found = []
    for wider in (1.0, k):
        sets = [
            with_range(charge_only(name, 0.2, 0.4, 0.0), {"input_capacitance": size * wider}, "loguniform")
            for name, size in (("a", first), ("b", second))
        ]
        found.append(drawn_study(charges(*sets, 1.0), 128))
    inner, outer = found
    assert outer.smallest < inner.smallest < 1.0 < inner.largest < outer.largest
    assert outer.largest <= math.exp(k * (first + second))
    assert outer.sd_log.value == near(k * inner.sd_log.value, rel=1e-6)


@few
@given(SIZES, factor(0.1, 0.5))
def test_one_more_uncertain_factor_widens_the_outcome(first: float, added: float):
    narrow, wide = (
        drawn_study(charges(charge_only("a", 0.2, 0.4, first), charge_only("b", 0.2, 0.4, size), 1.0), 1024)
        for size in (0.0, added)
    )
    assert wide.sd_log.value > narrow.sd_log.value
    slack = ERRORS * wide.sd_log.error + 2e-3
    assert wide.sd_log.value == near(math.hypot(first, added), abs=slack)


@few
@given(uncertain("a"), factor(1.05, 4.0), st.sampled_from(["declared-point", "minimum-energy"]))
def test_a_dominated_side_wins_in_no_draw_and_shared_values_cancel(item: Any, k: float, policy: str):
    """The same set k times as wide costs k times the energy in every draw: no spread is left."""

    def against(first: float, second: float) -> Uncertainty:
        sides = side_of(item, sizes=[first]), [side_of(item, id="self-comparison", sizes=[second])], [item]
        return drawn_study(with_policy(study(*sides, points=9, refine=1e-7), policy))

    found, back = against(1.0, k), against(k, 1.0)
    assert found.smallest == near(k, rel=1e-9)
    assert found.largest == near(k, rel=1e-9)
    assert found.reaches.value == 1.0
    assert back.above_one.value == back.reaches.value == 0.0


# -- known distributions (65 to 68) ---------------------------------------------------------------------------------


def worth(mean: float, sd: float) -> float:
    """E[max(0, x)] - max(0, mean) of a normal x."""
    density = math.exp(-0.5 * (mean / sd) ** 2) / math.sqrt(2.0 * math.pi)
    return mean * float(ndtr(mean / sd)) + sd * density - max(0.0, mean)


@few
@given(SIZES, SIZES, factor(0.4, 2.5), factor(0.3, 0.8))
def test_a_product_of_lognormal_values_has_its_probability_shares_and_worth(
    one: float, other: float, m: float, supply: float
):
    draws = 1024
    advantage = (0.5 / supply) ** 2
    inputs = charges(charge_only("a", 0.2, supply, one), charge_only("b", 0.2, 0.5, other), m * advantage)
    found = drawn_study(inputs, draws)
    sd, mean = math.hypot(one, other), -math.log(m)
    assert abs(found.reaches.value - float(ndtr(mean / sd))) <= ERRORS * found.reaches.error + 4.0 / draws
    assert abs(found.mean_log.value - math.log(advantage)) <= ERRORS * found.mean_log.error + 1e-3
    assert abs(found.worth_of_all.value - worth(mean, sd)) <= ERRORS * found.worth_of_all.error + 3e-3
    shares = {share.key: share for share in found.shares}
    for key, size in (("a.input_capacitance", one), ("b.input_capacitance", other)):
        share = shares[key]
        assert abs(share.share.value - (size / sd) ** 2) <= ERRORS * share.share.error + 5e-3
        assert abs(share.worth.value - worth(mean, size)) <= ERRORS * share.worth.error + 3e-3


def test_the_error_falls_with_the_number_of_draws():
    """At least as 1 / sqrt(n): 16 times the draws, a quarter of the error, up to the error of the error."""
    inputs = charges(charge_only("a", 0.2, 0.4, 0.3), charge_only("b", 0.2, 0.4, 0.2), 1.1)
    small, large = (drawn_study(inputs, draws) for draws in (256, 4096))
    for name in ("reaches", "mean_log", "sd_log"):
        assert getattr(large, name).error < 0.45 * getattr(small, name).error, name


@few
@given(SIZES, st.integers(0, 2**31))
def test_like_independent_sides_win_in_half_of_the_draws(size: float, seed: int):
    inputs = charges(charge_only("a", 0.2, 0.4, size), charge_only("b", 0.2, 0.4, size), 1.0)
    found = drawn_study(inputs, 512, seed)
    assert abs(found.reaches.value - 0.5) <= ERRORS * found.reaches.error + 4.0 / 512
    assert abs(found.above_one.value - 0.5) <= ERRORS * found.above_one.error + 4.0 / 512


@few
@given(switches("a"), switches("b"), factor(0.1, 0.5))
def test_a_shared_wire_capacitance_cancels_where_the_wire_is_everything(a: Any, b: Any, size: float):
    spreads = []
    for length in ("2.0", "1.0e6"):
        inputs = study(
            side(a["id"], *RANGE[a["model"]]),
            [side(b["id"], *RANGE[b["model"]])],
            [a, b],
            policy={"primary": "declared-point", "metric": "energy-per-operation"},
            values={"average_net_length": v(D(length), "um", unusual=True), "activity": v(D("0.9"))},
            line=lines(0.0, 0.2, 0.0),
            points=5,
        )
        wire = inputs.sets["wires/lines"]["value"]["wire_capacitance_per_length"]
        wire["spread"] = {"shape": "lognormal", "ln_sd": number(size)}
        spreads.append(drawn_study(inputs).sd_log.value)
    assert spreads[1] < 2e-3 * size
    assert spreads[1] <= spreads[0] + 1e-6


@few
@given(uncertain("a", 0.3), uncertain("b", 0.3), factor(0.5, 2.0))
def test_information_is_never_worth_less_than_nothing_nor_more_than_all_of_it(a: Any, b: Any, m: float):
    inputs = two(a, b, policy={"primary": "declared-point"})
    inputs.study["verdict"]["required_advantage"] = number(cmp.advantage(inputs) * m)
    found = drawn_study(inputs, 256)
    for share in found.shares:
        assert share.worth.value >= 0.0
        slack = ERRORS * math.hypot(share.worth.error, found.worth_of_all.error) + 3e-3
        assert share.worth.value <= found.worth_of_all.value + slack
    if found.reaches.value in (0.0, 1.0):
        assert found.worth_of_all.value == 0.0
        assert all(share.worth.value == 0.0 for share in found.shares)


@few
@given(SIZES, factor(0.7, 1.4))
def test_a_value_that_moves_nothing_is_worth_nothing(size: float, m: float):
    """The area is drawn too, and has no part in the energy."""
    first = charge_only("a", 0.2, 0.4, size)
    first = with_range(first, {"footprint": 0.5})
    found = drawn_study(charges(first, charge_only("b", 0.2, 0.4, 0.1), m), 512)
    shares = {share.key: share for share in found.shares}
    idle = shares["a.footprint"]
    assert abs(idle.share.value) <= ERRORS * idle.share.error + 5e-3
    assert idle.worth.value <= ERRORS * idle.worth.error + 2e-3


@pytest.mark.parametrize("m", [1e-3, 1e3])
def test_nothing_is_worth_knowing_where_no_draw_flips_the_answer(m: float):
    found = drawn_study(charges(charge_only("a", 0.2, 0.4, 0.2), charge_only("b", 0.2, 0.4, 0.2), m), 128)
    assert found.reaches.value in (0.0, 1.0)
    assert found.worth_of_all.value == 0.0
    assert [share.worth.value for share in found.shares] == [0.0, 0.0]


def test_scaled_best_estimates_move_the_mean_and_not_the_spread():
    """The comparisons above can fail: twice the capacitance halves the advantage in every draw."""
    first, second = charge_only("a", 0.2, 0.4, 0.2), charge_only("b", 0.2, 0.4, 0.2)
    one, other = (drawn_study(charges(item, second, 1.0)) for item in (first, scaled(first, input_capacitance=2.0)))
    assert other.mean_log.value == near(one.mean_log.value - math.log(2.0), abs=1e-9)
    assert other.sd_log.value == near(one.sd_log.value, rel=1e-9)
