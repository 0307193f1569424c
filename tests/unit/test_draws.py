"""Draws: spreads, nets keyed by name, propagation of published examples, what may not depend on what."""

from __future__ import annotations

import dataclasses
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from benchmark.decide.compare import Comparison
from benchmark.decide.draw_block import DrawTask
from benchmark.decide.next_measurement import (
    imperfect_worth,
    next_measurements,
    nothing_to_measure,
    relative_spread,
)
from benchmark.decide.uncertainty import Estimate, InputShare, uncertainty
from benchmark.draws.plan import Plan, net, plan_of
from benchmark.draws.values import draw_values, drawn_keys, tied_with, value_at
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.side import values_by_key
from benchmark.record.load import load_study
from benchmark.sets.joints import Joint
from benchmark.sets.study import NodePair, Study, draws_allowed
from benchmark.sets.values import Spread, Value
from tests.fixed_displacement import fixed_displacement
from tests.near import near
from tests.studies import D, hub

U = (np.arange(4096) + 0.5) / 4096


def value(best: float, shape: str, low: float, high: float, scale: float | None = None, name: str = "bias_power"):
    spread = Spread(shape, np.array([low]), np.array([high]), None if scale is None else np.array([scale]))
    return Value(name, np.array([best]), "1", spread, "measured", "s")


@pytest.mark.parametrize(
    ("item", "exact"),
    [
        (value(2.0, "uniform", 1.0, 4.0), stats.uniform(1.0, 3.0)),
        (value(2.0, "loguniform", 1.0, 8.0), stats.loguniform(1.0, 8.0)),
        (value(2.0, "triangular", 1.0, 5.0), stats.triang(0.25, 1.0, 4.0)),
        (value(1.0, "triangular", 1.0, 5.0), stats.triang(0.0, 1.0, 4.0)),
        (value(2.0, "normal", 1.8, 2.2, 0.1), stats.norm(2.0, 0.1)),
        (value(2.0, "lognormal", 1.0, 4.0, 0.3), stats.lognorm(0.3, scale=2.0)),
    ],
)
def test_spreads_have_their_distributions(item, exact):
    """scipy.stats is the outside check."""
    assert value_at(item, U) == near(exact.ppf(U), rel=1e-9)


def test_a_tail_does_not_leave_the_domain():
    """A normal capacitance with 45 % is cut at 0 and renormalised (truncated normal of scipy.stats)."""
    item = value(1.0e-15, "normal", 1.2e-16, 1.9e-15, 0.45e-15, "input_capacitance")
    exact = stats.truncnorm(-1.0 / 0.45, np.inf, 1.0e-15, 0.45e-15)
    drawn = value_at(item, U)
    assert (drawn > 0.0).all()
    assert drawn == near(exact.ppf(U), rel=1e-7)


def test_a_plan_divides_into_independent_blocks():
    assert plan_of(16) == Plan(8, 2, 0)
    assert plan_of(1024, 3) == Plan(8, 128, 3)
    assert plan_of(2**20) == Plan(1024, 1024, 0)
    assert plan_of(2**20).draws == 2**20


@pytest.mark.parametrize(
    ("number", "words"),
    [(0, "16 or 32"), (1000, "512 or 1024"), (17, "16 or 32"), (2**31, "such as 1073741824"), (-4, "16 or 32")],
)
def test_other_numbers_of_draws_are_refused_with_the_nearest(number, words):
    assert words in draws_allowed(number)
    with pytest.raises(ValueError, match=f"found {number}"):
        plan_of(number)


def test_a_negative_seed_is_refused():
    with pytest.raises(ValueError, match="seed must not be negative, found -1"):
        plan_of(16, -1)


@given(st.text(min_size=1, max_size=20), st.integers(1, 6), st.integers(0, 3))
def test_each_coordinate_of_a_net_fills_every_cell_once(owner, dimension, block):
    plan = Plan(8, 32, 5)
    points = net(owner, dimension, plan, block)
    assert points.shape == (32, dimension)
    for column in points.T:
        assert sorted(np.floor(column * 32).astype(int)) == list(range(32))


def test_nets_of_different_owners_are_not_tied():
    """Two scrambled nets in the same order would have their leading digits in common, draw by draw."""
    plan = Plan(64, 256, 0)
    cells = np.zeros((4, 4))
    for block in range(16):
        a, b = (np.floor(4 * net(owner, 1, plan, block)[:, 0]).astype(int) for owner in ("a", "b"))
        np.add.at(cells, (a, b), 1)
    assert stats.chisquare(cells.ravel()).pvalue > 1e-3


def test_values_held_leave_the_draws_of_the_others_as_they_are():
    values = {f"set.{name}": value(2.0, "uniform", 1.0, 4.0) for name in ("a", "b", "c")}
    _, whole = draw_values(values, Plan(8, 16, 0), 0)
    _, part = draw_values(values, Plan(8, 16, 0), 0, held=["set.b"])
    assert set(part) == {"set.a", "set.c"}
    assert all(np.array_equal(part[key], whole[key]) for key in part)


def test_a_further_owner_and_another_order_change_no_draw():
    values = {f"set.{name}": value(2.0, "uniform", 1.0, 4.0) for name in ("a", "b")}
    more = {"other.x": value(1.0, "normal", 0.8, 1.2, 0.1), **dict(reversed(values.items()))}
    _, before = draw_values(values, Plan(8, 16, 0), 2)
    _, after = draw_values(more, Plan(8, 16, 0), 2)
    assert all(np.array_equal(before[key], after[key]) for key in before)


def test_what_is_drawn():
    values = {
        "set.b": value(2.0, "uniform", 1.0, 4.0),
        "set.a": value(2.0, "uniform", 2.0, 2.0),
        "candidate.overhead.c": value(2.0, "uniform", 1.0, 4.0),
        "study.d": Value("activity", np.array([0.1]), "1", None, "choice", "s"),
    }
    assert drawn_keys(values) == {"candidate.overhead": ["candidate.overhead.c"], "set": ["set.b"]}


# -- JCGM 101:2008 (GUM Supplement 1), through nets and spreads ------------------------------------------------------


def propagated(function, values, draws: int = 2**17):
    plan = plan_of(draws)
    keyed = {f"example.{name}": item for name, item in values.items()}
    found = []
    for block in range(plan.blocks):
        _, columns = draw_values(keyed, plan, block)
        found.append(function(*(columns[f"example.{name}"] for name in values)))
    return np.concatenate(found)


def interval(y: np.ndarray) -> tuple[float, float]:
    low, high = np.quantile(y, [0.025, 0.975])
    return float(low), float(high)


def rectangular(half: float) -> Value:
    return value(0.0, "uniform", -half, half, name="built_in_interference")


def normal(best: float, sd: float) -> Value:
    return value(best, "normal", best - 2 * sd, best + 2 * sd, sd, "built_in_interference")


def test_gum_s1_four_normal_inputs():
    """9.2.2: y = x1 + x2 + x3 + x4, each N(0, 1): 0, u 2.0, 95 % +-3.92 (as published)."""
    y = propagated(lambda *x: sum(x), {f"x{i}": normal(0.0, 1.0) for i in range(4)})
    assert y.mean() == near(0.0, abs=5e-3)
    assert y.std() == near(2.0, rel=0, abs=0.05)
    assert interval(y) == near((-3.92, 3.92), rel=0, abs=0.02)


def test_gum_s1_four_rectangular_inputs():
    """9.2.3: rectangular with sd 1: 95 % +-3.88 (published), 3.8794 exactly."""
    y = propagated(lambda *x: sum(x), {f"x{i}": rectangular(np.sqrt(3.0)) for i in range(4)})
    assert y.std() == near(2.0, rel=0, abs=0.05)
    assert interval(y) == near((-3.8794, 3.8794), rel=0, abs=0.02)


def test_gum_s1_one_input_that_rules():
    """9.2.4: three with sd 1 and one with sd 10, rectangular: u 10.1, 95 % +-17.0 (published, from memory)."""
    values = {f"x{i}": rectangular(np.sqrt(3.0)) for i in range(3)} | {"x3": rectangular(10.0 * np.sqrt(3.0))}
    y = propagated(lambda *x: sum(x), values)
    assert y.std() == near(10.1, rel=0, abs=0.06)
    assert interval(y) == near((-17.0, 17.0), rel=0, abs=0.05)


def test_gum_s1_mass_calibration():
    """9.3: 1.2340 mg, u 0.0754 (from memory; 0.0755 recomputed), 95 % interval 0.2991 to 0.2992 wide (published)."""
    values = {
        "m_r": normal(100000.0, 0.05),
        "dm": normal(1.234, 0.02),
        "air": value(1.2, "uniform", 1.1, 1.3),
        "weight": value(8000.0, "uniform", 7000.0, 9000.0),
        "reference": value(8000.0, "uniform", 7950.0, 8050.0),
    }
    y = propagated(
        lambda m_r, dm, air, weight, reference: (
            (m_r + dm) * (1.0 + (air - 1.2) * (1.0 / weight - 1.0 / reference)) - 100000.0
        ),
        values,
    )
    assert y.mean() == near(1.2340, rel=0, abs=5e-4)
    assert y.std() == near(0.0754, rel=0, abs=2e-4)
    low, high = interval(y)
    assert high - low == near(0.299, rel=0, abs=2e-3)


@pytest.mark.parametrize(
    ("x1", "mean", "u", "high"), [(0.0, 50, 50, 150), (0.010, 150, 112, 366), (0.050, 2550, 502, 3549)]
)
def test_gum_s1_power_meter(x1, mean, u, high):
    """9.4: y = x1^2 + x2^2, u = 0.005, no correlation, in 1e-6: exact noncentral chi-square values (published 150,
    367, 3543 for the upper ends)."""
    values = {"x1": normal(x1, 0.005), "x2": normal(0.0, 0.005)}
    y = 1e6 * propagated(lambda a, b: a**2 + b**2, values)
    assert y.mean() == near(mean, rel=0.005)
    assert y.std() == near(u, rel=0.01)
    if x1 == 0.0:  # one-sided, as published
        assert np.quantile(y, 0.95) == near(high, rel=0.01)
    else:
        assert y.max() > high > y.mean()
        shortest = _shortest(y)
        assert shortest[1] == near(high, rel=0.03)


def _shortest(y: np.ndarray) -> tuple[float, float]:
    """Shortest interval that holds 95 %."""
    ordered = np.sort(y)
    held = int(0.95 * ordered.size)
    start = int(np.argmin(ordered[held:] - ordered[:-held]))
    return float(ordered[start]), float(ordered[start + held])


# -- the engine under draws --------------------------------------------------------------------------------------------


def task(path: Path, draws: int = 256, **more) -> DrawTask:
    study, _ = load_study(path)
    pair = study.pair(study.headline)
    comparison = Comparison(study, pair, Batch.best_estimate())
    frozen = comparison.frozen_choices(comparison.outcome(study.policy.primary))
    return DrawTask(study, pair, study.policy.primary, frozen, plan_of(draws), **more)


def test_any_number_of_processes_gives_the_same_digits(tmp_path: Path):
    asked = task(fixed_displacement().write(tmp_path))
    alone = uncertainty(asked, jobs=1)
    for jobs in (2, 4):
        together = uncertainty(asked, jobs=jobs)
        assert repr(together) == repr(alone)


def test_a_shared_value_with_the_same_effect_on_both_sides_cancels(tmp_path: Path):
    """Activity multiplies both energies: the advantage has no spread at all, and no input carries anything."""
    inputs = fixed_displacement()
    inputs.study["value"]["activity"]["spread"] = {"shape": "loguniform", "low": D("0.05"), "high": D("0.9")}
    for data in inputs.sets.values():
        for table in data["value"].values():
            table.pop("spread", None)
    found = uncertainty(task(inputs.write(tmp_path)))
    assert found.sd_log.value < 1e-6  # leakage through 1e15 ohm depends on the activity
    assert found.largest / found.smallest - 1.0 < 1e-7  # leakage of 1e15 ohm


def test_like_sides_give_one_half(tmp_path: Path):
    """Two sides with the same values but draws of their own: each is better in half of the draws."""
    inputs = fixed_displacement(required="1.0")
    twin = {**inputs.sets["technologies/stated-reference"], "id": "twin", "title": "Invented twin"}
    inputs.sets["technologies/twin"] = twin
    del inputs.sets["technologies/film-switch"]
    inputs.study["candidate"]["technology"] = "twin"
    inputs.study["candidate"]["knobs"]["supply"] = {"low": D("0.3"), "high": D("0.3"), "unit": "V"}
    found = uncertainty(task(inputs.write(tmp_path), 4096))
    assert abs(found.reaches.value - 0.5) <= 4.0 * found.reaches.error
    assert found.reaches.value + found.above_one.value >= 0.5
    assert found.mean_log.value == near(0.0, abs=4.0 * found.mean_log.error)


def test_self_comparison_is_one_in_every_draw(tmp_path: Path):
    inputs = fixed_displacement(required="1.5")
    del inputs.sets["technologies/film-switch"]
    inputs.study["candidate"]["technology"] = "stated-reference"
    inputs.study["candidate"]["knobs"]["supply"] = {"low": D("0.3"), "high": D("0.3"), "unit": "V"}
    inputs.study["contender"][0]["id"] = "self-comparison"
    found = uncertainty(task(inputs.write(tmp_path)))
    assert (found.smallest, found.largest) == (1.0, 1.0)
    assert found.constant
    assert found.reaches.value == 0.0
    assert found.worth_of_all.value == 0.0


def test_no_range_no_draws(tmp_path: Path):
    """Every spread gone: the probability would be 0 or 1 by construction, and is not claimed."""
    from benchmark.record.run import run_study
    from benchmark.sets.study import DrawSettings

    study, library = load_study(hub().write(tmp_path))
    assert run_study(study, library, draws=DrawSettings(64))["uncertainty"] is None


def test_narrow_spreads_give_the_deterministic_answer(tmp_path: Path):
    narrow = {"coefficient": ("200.0", "1e-6"), "capacitance": ("0.20", "1e-6")}
    for required, expected in (("1.0", 1.0), ("3.0", 0.0)):
        found = uncertainty(task(fixed_displacement(required=required, **narrow).write(tmp_path / required), 64))
        assert found.reaches.value == expected


# -- values that are not independent -----------------------------------------------------------------------------------


def sampled(columns: dict[str, np.ndarray], a: str, b: str) -> float:
    return float(stats.spearmanr(columns[a], columns[b]).statistic)


@pytest.mark.parametrize("rho", [-1.0, -0.6, 0.0, 0.35, 1.0])
def test_a_rank_correlation_is_met_and_the_distributions_stay(rho: float):
    values = {f"set.{name}": value(2.0, "loguniform", 1.0, 8.0) for name in ("a", "b", "c")}
    joints = {"set": (Joint(("a", "b"), rho),)}
    drawn = [draw_values(values, Plan(8, 1024, 0), block, joints=joints)[1] for block in range(8)]
    columns = {key: np.concatenate([part[key] for part in drawn]) for key in values}
    assert sampled(columns, "set.a", "set.b") == near(rho, rel=0, abs=0.02)
    assert sampled(columns, "set.a", "set.c") == near(0.0, abs=0.04)
    for column in columns.values():
        assert stats.kstest(column, stats.loguniform(1.0, 8.0).cdf).statistic < 0.02


def test_gum_s1_power_meter_with_correlation():
    """9.4.3: r = 0.9: u 67e-6 at x1 = 0, 505e-6 at x1 = 0.050 (closed form, as published)."""
    joint = Joint(("x1", "x2"), 6.0 / np.pi * np.arcsin(0.45))  # r = 2 sin(pi rho / 6)
    for x1, u in ((0.0, 67e-6), (0.050, 505e-6)):
        values = {"example.x1": normal(x1, 0.005), "example.x2": normal(0.0, 0.005)}
        plan = plan_of(2**17)
        y = []
        for block in range(plan.blocks):
            _, columns = draw_values(values, plan, block, joints={"example": (joint,)})
            y.append(columns["example.x1"] ** 2 + columns["example.x2"] ** 2)
        assert np.concatenate(y).std() == near(u, rel=0.012)


def test_paired_samples_with_opposite_effect_leave_nothing():
    """Resistance and capacitance measured on the same samples, perfectly opposed: R C has no spread at all."""
    r = np.array([1.0e3, 2.0e3, 4.0e3, 8.0e3])
    samples = np.stack([r, 1.0e-12 / r], axis=1)
    values = {
        "set.r": value(2.0e3, "samples", 1.0e3, 8.0e3),
        "set.c": value(5.0e-16, "samples", 1.25e-16, 1.0e-15),
        "set.x": value(2.0, "uniform", 1.0, 4.0),
    }
    points, columns = draw_values(values, Plan(8, 16, 0), 0, joints={"set": (Joint(("r", "c"), samples=samples),)})
    assert columns["set.r"] * columns["set.c"] == near(np.full(16, 1.0e-12), rel=1e-15)
    assert set(columns["set.r"]) == set(r)
    assert set(points) == {"set.r", "set.x"}
    assert tied_with("set.r", {"set": (Joint(("r", "c"), samples=samples),)}) == {"set.r", "set.c"}


def test_joints_of_files(tmp_path: Path):
    inputs = fixed_displacement()
    film = inputs.sets["technologies/film-switch"]
    film["joint"] = [{"values": ["actuator_coefficient", "input_capacitance"], "rank_correlation": D("0.8")}]
    correlated = uncertainty(task(inputs.write(tmp_path / "a"), 4096))
    # ln A = ... + 2 ln d - ln C: a positive correlation narrows it; r = 2 sin(0.8 pi / 6)
    r = 2.0 * np.sin(0.8 * np.pi / 6.0)
    exact = np.sqrt(0.04 + 0.16 + 0.01 - 2.0 * r * 0.2 * 0.4)
    assert correlated.sd_log.value == near(exact, rel=0, abs=4.0 * correlated.sd_log.error + 1e-3)
    for key in ("actuator_coefficient", "input_capacitance"):
        del film["value"][key]["spread"]
    film["joint"] = [
        {
            "values": ["actuator_coefficient", "input_capacitance"],
            "samples": [[D("190.0"), D("0.0902")], [D("200.0"), D("0.1000")], [D("210.0"), D("0.1102")]],
        }
    ]
    paired = uncertainty(task(inputs.write(tmp_path / "b"), 1024))
    assert paired.inputs == 2  # the pair, and the reference's capacitance
    assert paired.sd_log.value == near(0.10, rel=0.02)  # d^2 / C is the same for all three samples within 0.3 %


# -- measurements ------------------------------------------------------------------------------------------------------


def test_imperfect_information_by_hand():
    """Normal case: sigma UL(mu/sigma), UL(z) = phi(z) - z (1 - Phi(z)): the prior narrowed by s^2 / (s^2 + s_e^2).

    Raiffa and Schlaifer (1961), from memory; mu = 1, s = 1.6, error 0.8: s_i = 1.6^2 / sqrt(1.6^2 + 0.8^2) = 1.4311.
    """

    def loss(mu: float, s: float) -> float:
        z = mu / s
        return float(s * (stats.norm.pdf(z) - z * stats.norm.sf(z)))

    zero = Estimate(0.0, 0.0)
    share = InputShare("x", "lognormal", zero, zero, np.array([1.6, 0.0, 0.0]))
    assert imperfect_worth(1.0, share, 0.0) == near(loss(1.0, 1.6), rel=1e-3)
    assert loss(1.0, 1.6) == near(0.2591, rel=0, abs=5e-5)  # EVPPI of the handbook example
    assert imperfect_worth(1.0, share, 0.5) == near(loss(1.0, 1.6**2 / np.hypot(1.6, 0.8)), rel=1e-3)
    assert loss(1.0, 1.6**2 / np.hypot(1.6, 0.8)) == near(0.2049, rel=0, abs=5e-5)  # EVSI of the handbook example
    assert imperfect_worth(1.0, share, 1.0e6) == near(0.0, abs=1e-6)


#: S8, M = 1.5: mu = ln(2.000 / 1.5); s of ln(advantage); the error ratio r at which the worth of a normal prior
#: narrowed to s / sqrt(1 + r^2) is 0.001 below that of perfect information, solved by hand from the loss function
ENOUGH = {"film-switch.actuator_coefficient": (0.4, 0.12833), "film-switch.input_capacitance": (-0.2, 0.2785)}


@pytest.mark.parametrize("key", ENOUGH)
def test_the_precision_beyond_which_it_stops_mattering(key: str, tmp_path: Path):
    effect, exact = ENOUGH[key]
    mu, s = np.log(2.0 / 1.5), abs(effect)

    def worth(sd: float) -> float:
        return float(sd * stats.norm.pdf(mu / sd) - mu * stats.norm.sf(mu / sd))

    assert worth(s) - worth(s / np.hypot(1.0, exact)) == near(1.0e-3, rel=1e-3)
    values = values_by_key(*_study_of(tmp_path))
    found = uncertainty(task(tmp_path / "study.toml", 2**14))
    share = next(share for share in found.shares if share.key == key)

    def enough(mean: float, coefficients: np.ndarray) -> float:
        given = dataclasses.replace(share, coefficients=coefficients)
        law = dataclasses.replace(found, mean_log=Estimate(mean, 0.0), shares=(given,))
        return next_measurements(law, 1.5, (), values)[0].enough

    # with the exact expansion: only the points of the quadrature stand between the two
    assert enough(np.log(2.0), np.array([effect, 0.0, 0.0, 0.0])) == near(exact, rel=2e-4)
    # from draws: the scatter of the expansion is all that is added; the middle one of five seeds
    drawn = []
    for seed in range(5):
        other = uncertainty(dataclasses.replace(task(tmp_path / "study.toml"), plan=plan_of(2**14, seed)))
        mine = next(share for share in other.shares if share.key == key)
        drawn.append(enough(other.mean_log.value, mine.coefficients))
    assert np.median(drawn) == near(exact, rel=0.02)
    assert max(drawn) / min(drawn) < 1.08


def _study_of(folder: Path) -> tuple[Study, NodePair]:
    study, _ = load_study(fixed_displacement().write(folder))
    return study, study.pair(study.headline)


def test_measurements_with_a_cost_come_by_worth_for_it(tmp_path: Path):
    inputs = fixed_displacement()
    inputs.study["measurement"] = [
        {"value": "film-switch.actuator_coefficient", "cost": D("30.0"), "reachable_percent": D("5.0")},
        {"value": "film-switch.input_capacitance", "cost": D("1.0"), "reachable_percent": D("2.0")},
    ]
    study, _ = load_study(inputs.write(tmp_path))
    values = values_by_key(study, study.pair(study.headline))
    found = uncertainty(task(tmp_path / "study.toml", 4096))
    listed = next_measurements(found, 1.5, study.measurements, values)
    assert [item.key.rpartition(".")[2] for item in listed[:2]] == ["input_capacitance", "actuator_coefficient"]
    # 5 % against ln-sd 0.20 leaves a quarter of a prior standard deviation
    coefficient = listed[1]
    share = next(share for share in found.shares if share.key == coefficient.key)
    assert coefficient.worth_reachable == near(imperfect_worth(np.log(2.0 / 1.5), share, 0.25), rel=1e-6, abs=5e-4)
    assert coefficient.worth_per_cost == near(coefficient.worth_reachable / 30.0, rel=1e-12)
    assert relative_spread(values["film-switch.actuator_coefficient"]) == near(0.20, rel=1e-12)


def test_where_every_corner_agrees_there_is_nothing_to_measure(tmp_path: Path):
    found = uncertainty(task(fixed_displacement(required="50.0").write(tmp_path), 1024))
    assert found.reaches.value == 0.0
    assert nothing_to_measure(found)
    open_case = uncertainty(task(fixed_displacement().write(tmp_path / "open"), 1024))
    assert not nothing_to_measure(open_case)
