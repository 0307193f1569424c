"""The supply search against dense brute force, at limits, in narrow windows, in batches."""

from __future__ import annotations

import dataclasses
import itertools
from decimal import Decimal as D

import numpy as np
import pytest

from benchmark.decide.policies import own_limit
from benchmark.decide.requirements import FunctionalFloor, functional_condition, hard_conditions
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.points import design_points
from benchmark.evaluate.search import All, supply_grid
from benchmark.sets.study import Choice
from tests.comparisons import compare, comparison, given, load, moved, planar, pressed, side, steep, study
from tests.near import near
from tests.studies import v

DELAY = {"primary": "minimum-energy-delay", "exponent": D("1.0")}
FLOOR = {"noise_margin": {"limit": {"value": D("0.2"), "unit": "1"}, "kind": "hard", "fan_in": 2}}
LIMITS = {"device_limits": {"limit": {"value": D("1.0"), "unit": "1"}, "kind": "hard"}}


def brute(loaded, run, policy, points=40001):
    """Least objective over a dense grid of supplies, and where."""
    low, high = run.problem.side.supply
    found = comparison(loaded)
    found_inputs = found.policy_inputs()
    condition = All.of(hard_conditions(loaded), own_limit(policy, found_inputs))
    if functional_condition(loaded):
        condition = All.of(condition, FunctionalFloor())
    best, where = np.inf, np.nan
    for combination in run.combinations:
        dense = design_points(run.problem, np.linspace(low, high, points)[None, :], *combination)
        mask = dense.able & condition(run, dense, dense.able)
        if policy == "minimum-energy-delay":
            score = dense.energy * dense.time**loaded.policy.exponent
        else:
            score = dense.time if policy == "iso-energy" else dense.energy
        score = np.where(mask, score, np.inf)[0]
        k = int(np.argmin(score))
        if score[k] < best:
            best, where = float(score[k]), float(dense.supply[0, k])
    return best, where


@pytest.mark.parametrize("policy", ["minimum-energy", "minimum-energy-delay", "iso-energy", "iso-delay"])
@pytest.mark.parametrize(
    ("make", "low", "high", "time", "energy"),
    [
        (steep, 0.15, 0.9, "3.0e-10", "1.0e-16"),
        (pressed, 0.08, 0.5, "4.0e-10", "1.0e-17"),
        (planar, 0.25, 1.2, "2.0e-9", "6.0e-16"),
    ],
)
def test_optimum_is_that_of_dense_brute_force_and_never_worse(make, low, high, time, energy, policy):
    loaded = load(
        study(
            side("a", low, high),
            [side("b", low, high)],
            [make("a"), make("b")],
            policy={
                "primary": policy,
                **({"exponent": D("1.0")} if policy == "minimum-energy-delay" else {}),
                **({"required_time": v(D(time), "s")} if policy in ("iso-delay", "minimum-energy") else {}),
                **({"required_energy": v(D(energy), "J")} if policy == "iso-energy" else {}),
            },
            points=25,
            refine=1e-7,
        )
    )
    found = compare(loaded)
    run = comparison(loaded).candidate
    best, where = brute(loaded, run, policy)
    assert found.candidate.found[0]
    assert found.candidate.optimum.value[0] <= best * (1 + 1e-12)
    # a dense grid of 40 001 points misses a limit by at most one step: 2e-5 of the range in supply
    assert found.candidate.optimum.value[0] == near(best, rel=2e-3)
    assert found.candidate.supply[0] == near(where, rel=2e-2 if policy == "minimum-energy-delay" else 1e-3)


def test_optimum_with_a_functional_floor_is_that_of_brute_force():
    loaded = load(
        study(
            side("a", 0.1, 0.9),
            [side("b", 0.1, 0.9)],
            [steep("a"), steep("b")],
            requirements=FLOOR,
            points=25,
            refine=1e-6,
        )
    )
    found = compare(loaded).candidate
    best, where = brute(loaded, comparison(loaded).candidate, "minimum-energy", 1601)
    assert found.optimum.value[0] <= best * (1 + 1e-12)
    assert found.supply[0] == near(where, abs=0.8 / 1600)


@pytest.mark.parametrize("declared", ["0.35", "0.4", "0.40000000001", "0.45", "0.475", "0.5", "0.15"])
def test_declared_supply_on_or_beside_a_grid_point_does_not_hide_the_optimum(declared):
    """0.15 to 0.90 V in 16 points: 0.35, 0.40 and 0.45 are points of the grid; the optimum lies between two."""
    optima = []
    for supply in (declared, "0.6"):
        sets = [steep("a", supply=D(supply)), steep("b")]
        loaded = load(study(side("a", 0.15, 0.9), [side("b", 0.15, 0.9)], sets, policy=DELAY, points=16))
        optima.append(compare(loaded).candidate.optimum)
    assert not optima[0].at_lower[0]
    assert optima[0].value[0] == near(optima[1].value[0], rel=1e-12)


def test_limit_of_the_feasible_region_is_hit_to_the_resolution():
    """Minimum energy with T <= T*: the supply is the lowest that still reaches T*."""
    for refine in (1e-4, 1e-6, 1e-9):
        loaded = load(
            study(
                side("a", 0.15, 0.9),
                [side("b", 0.15, 0.9)],
                [steep("a"), steep("b")],
                policy={"primary": "iso-delay", "required_time": v(D("0.3"), "ns")},
                points=16,
                refine=refine,
            )
        )
        found = compare(loaded).candidate
        assert found.time[0] <= 0.3e-9
        run = comparison(loaded).candidate
        below = design_points(run.problem, found.supply[None, :] * (1.0 - 1.01 * refine))
        assert below.time[0, 0] > 0.3e-9
        assert found.optimum.at_limit[0]
        assert not found.optimum.at_lower[0]


def test_labels_of_the_ends():
    """No search condition: the cheapest point is the lowest supply, the fastest the highest one."""
    sets = [given("a"), given("b")]
    loaded = load(study(side("a", 0.2, 0.9), [side("b", 0.2, 0.9)], sets))
    low = compare(loaded).candidate.optimum
    assert low.points.supply[0, 0] == 0.2
    assert (low.at_lower[0], low.at_upper[0], low.at_limit[0]) == (True, False, False)
    rising = load(
        study(
            side("a", 0.4, 0.9),
            [side("b", 0.4, 0.9)],
            [planar("a"), planar("b")],
            policy={"primary": "iso-energy", "required_energy": v(D("1.0"), "pJ")},
        )
    )
    high = compare(rising).candidate.optimum
    assert high.points.supply[0, 0] == 0.9
    assert (high.at_lower[0], high.at_upper[0], high.at_limit[0]) == (False, True, False)
    only = load(study(side("a", 0.5, 0.5), [side("b", 0.5, 0.5)], sets))
    one = compare(only).candidate.optimum
    assert (one.at_lower[0], one.at_upper[0], one.at_limit[0]) == (False, False, False)


def test_interior_optimum_carries_no_label():
    loaded = load(study(side("a", 0.15, 0.9), [side("b", 0.15, 0.9)], [steep("a"), steep("b")], policy=DELAY))
    found = compare(loaded).candidate.optimum
    assert (found.at_lower[0], found.at_upper[0], found.at_limit[0]) == (False, False, False)


@pytest.mark.parametrize("width", [1e-2, 1e-4, 1e-6])
def test_window_between_two_grid_points_is_found(width):
    """The deadline asks for at least 0.4302 V, the field allows a little more; the grid has 0.42 and 0.44 V."""
    base = study(
        side("a", 0.1, 0.5),
        [side("b", 0.1, 0.5)],
        [pressed("a"), pressed("b")],
        requirements=LIMITS,
        policy={"primary": "iso-delay", "required_time": v(D("1.0"), "ns")},
        points=21,
        refine=1e-9,
    )
    problem = comparison(load(base)).candidate.problem
    target = 0.4302
    time = float(design_points(problem, np.array([[target]])).time[0, 0])
    ceiling = target * (1.0 + width)
    base.sets["technologies/a"]["value"]["breakdown_field"] = v(D(repr(ceiling / 60e-9 / 1e6)), "MV/m", unusual=True)
    base.study["policy"]["required_time"] = v(D(repr(time)), "s")
    loaded = load(base)
    grid = supply_grid(comparison(loaded).candidate.problem)
    assert not np.any((grid >= target) & (grid <= ceiling))
    found = compare(loaded)
    assert found.candidate.found[0], found.candidate.why
    assert target * (1 - 1e-12) <= found.candidate.supply[0] <= ceiling * (1 + 1e-12)
    assert found.candidate.supply[0] == near(target, rel=2e-9)


def test_window_closed_by_the_functional_floor_is_found():
    """Floor from below, energy cap from above: a window much narrower than the step of the grid."""
    base = study(
        side("a", 0.1, 0.9),
        [side("b", 0.1, 0.9)],
        [steep("a"), steep("b")],
        requirements=FLOOR,
        points=9,
        refine=1e-7,
        values={"activity": v(D("0.9"))},
        policy={"primary": "minimum-energy", "also": ["iso-energy"], "required_energy": v(D("1.0"), "fJ")},
    )
    least = compare(load(base)).candidate
    assert least.optimum.at_limit[0]
    base.study["policy"]["required_energy"] = v(D(repr(float(least.energy[0]) * 1.001)), "J")
    found = compare(load(base), "iso-energy").candidate
    assert found.found[0], found.why
    assert found.energy[0] <= least.energy[0] * 1.001
    assert found.supply[0] == near(least.supply[0], rel=2e-3)
    base.study["policy"]["required_energy"] = v(D(repr(float(least.energy[0]) * 0.999)), "J")
    missed = compare(load(base), "iso-energy").candidate
    assert not missed.found[0]
    assert "cannot reach" in missed.why
    assert f"{least.supply[0]:.4g} V" in missed.why


def test_no_window_is_invented():
    """Deadline and field contradict each other by one part in a million: nothing is permitted."""
    base = study(
        side("a", 0.1, 0.5),
        [side("b", 0.1, 0.5)],
        [pressed("a"), pressed("b")],
        requirements=LIMITS,
        policy={"primary": "iso-delay", "required_time": v(D("1.0"), "ns")},
        points=21,
        refine=1e-9,
    )
    problem = comparison(load(base)).candidate.problem
    time = float(design_points(problem, np.array([[0.4302]])).time[0, 0])
    base.sets["technologies/a"]["value"]["breakdown_field"] = v(
        D(repr(0.4302 * (1 - 1e-6) / 60e-9 / 1e6)), "MV/m", unusual=True
    )
    base.study["policy"]["required_time"] = v(D(repr(time)), "s")
    found = compare(load(base)).candidate
    assert not found.found[0]
    assert "fastest permitted point" in found.why
    # the two numbers differ by less than four digits show: enough digits are printed to see the miss
    required, fastest = (float(found.why.split(word)[1].split(" s")[0]) for word in ("reach ", "point "))
    assert fastest > required


#: key -> factor
MIXED = {
    "a.on_current": 0.6,
    "a.off_current": 3.0,
    "a.declared_supply": 0.8,
    "b.resistance_slope": 1.2,
    "study.activity": 0.2,
    "study.logic_depth": 1.5,
}


@pytest.mark.parametrize(
    ("policy", "requirements"),
    [
        ("minimum-energy", {}),
        ("minimum-energy-delay", {}),
        ("declared-point", LIMITS),
        ("minimum-energy", FLOOR),
        ("iso-delay", {**FLOOR, **LIMITS}),
    ],
)
def test_row_of_a_batch_equals_the_study_with_that_value(policy, requirements):
    loaded = load(
        study(
            side("a", 0.1, 0.8, shifts=[0.0, 40.0]),
            [side("b", 0.08, 0.45)],
            [steep("a", supply_ceiling=0.75), pressed("b")],
            requirements=requirements,
            policy={
                "primary": "minimum-energy-delay",
                "exponent": D("1.5"),
                "also": ["minimum-energy", "iso-delay", "declared-point"],
                "required_time": v(D("3.0"), "ns"),
            },
            points=12,
            refine=1e-4,
            temperatures=(-20.0, 85.0),
            line=("20.0", "0.2", "10.0"),
        )
    )
    best = {key: float(_si(loaded, key)) for key in MIXED}
    moves = [(key, best[key], best[key] * factor) for key, factor in MIXED.items()]
    start = comparison(loaded)
    frozen = start.frozen_choices(start.outcome(policy))
    batch = comparison(loaded, Batch.one_at_a_time(moves))
    batch.frozen = frozen
    together = batch.outcome(policy)
    assert together.advantage[0] == start.outcome(policy).advantage[0]
    for row, (key, _, value) in enumerate(moves, start=1):
        alone = comparison(moved(loaded, key, value))
        alone.frozen = frozen
        single = alone.outcome(policy)
        for mine, theirs in zip(
            (together.candidate, *together.contenders), (single.candidate, *single.contenders), strict=True
        ):
            assert mine.found[row] == theirs.found[0], (key, value)
            if mine.found[row]:
                for name in ("supply", "energy", "time", "metric", "area"):
                    assert getattr(mine, name)[row] == getattr(theirs, name)[0], (key, value, name)
        assert np.array_equal(together.advantage[row], single.advantage[0], equal_nan=True)


def _si(loaded, key):
    owner, _, name = key.rpartition(".")
    if owner == "study":
        return loaded.values[name].si[0]
    sets = {item.technology.id: item.technology for item in (loaded.candidate, *loaded.contenders)}
    return sets[owner].values[name].si[0]


def test_part_of_a_batch_gives_its_rows():
    """Some rows of a batch, alone: the same numbers; put back, the others untouched."""
    loaded = load(study(side("a", 0.15, 0.9), [side("b", 0.15, 0.9)], [steep("a"), steep("b")], points=16))
    best = float(loaded.values["activity"].si[0])
    moves = [("study.activity", best, best * factor) for factor in (0.1, 0.5, 2.0, 8.0)]
    run = comparison(loaded, Batch.one_at_a_time(moves)).candidate
    some = run.subset(np.array([3, 1]))
    assert list(some.problem.batch.origin) == [3, 1]
    whole = run.grid(Choice(1.0, 0.0))
    part = some.grid(Choice(1.0, 0.0))
    assert np.array_equal(part.energy, whole.energy[[3, 1]])
    assert np.array_equal(part.time, whole.time[[3, 1]])
    again = some.subset(np.array([1]))
    assert list(again.problem.batch.origin) == [1]


def test_floor_that_binds_some_rows_only():
    """Rows whose cheapest point fails the floor are searched again; the others keep theirs (bit for bit)."""
    loaded = load(
        study(
            side("a", 0.1, 0.8),
            [side("b", 0.1, 0.8)],
            [steep("a"), steep("b")],
            requirements=FLOOR,
            points=10,
            refine=1e-4,
            policy={"primary": "minimum-energy"},
            values={"activity": v(D("0.001")), "logic_depth": v(40)},
        )
    )
    best = float(loaded.values["activity"].si[0])
    moves = [("study.activity", best, value) for value in (1e-5, 0.5, 1e-4, 0.9)]
    batch = comparison(loaded, Batch.one_at_a_time(moves)).outcome("minimum-energy").candidate
    for row, (_, _, value) in enumerate(moves, start=1):
        alone = compare(moved(loaded, "study.activity", value)).candidate
        assert batch.supply[row] == alone.supply[0]
        assert batch.energy[row] == alone.energy[0]
        assert batch.optimum.at_limit[row] == alone.optimum.at_limit[0]
    assert {bool(x) for x in batch.optimum.at_limit} == {True, False}


def test_frozen_knobs_are_chosen_once_at_the_best_estimate():
    """The threshold is frozen in silicon: a row that would like another one does not get it."""
    loaded = load(
        study(
            side("a", 0.15, 0.9, shifts=[-100.0, 0.0, 100.0], sizes=[0.5, 1.0, 2.0]),
            [side("b", 0.5, 0.5)],
            [steep("a", off_current=1.0), steep("b")],
            timing="clocked",
            accounting="period",
            values={"clock_frequency": v(D("1.0"), "MHz")},
            requirements={"deadline": {"limit": "cycle", "kind": "hard"}},
        )
    )
    best = float(loaded.values["clock_frequency"].si[0])
    moves = [("study.clock_frequency", best, best * factor) for factor in (1e-2, 1e4)]
    together = comparison(loaded, Batch.one_at_a_time(moves)).outcome("minimum-energy").candidate
    assert np.ndim(together.optimum.points.threshold_shift) == 0
    alone = [compare(moved(loaded, "study.clock_frequency", value)).candidate for _, _, value in moves]
    first = compare(loaded).candidate.optimum.points
    assert together.optimum.points.threshold_shift == first.threshold_shift == 0.1
    assert together.optimum.points.size == first.size == 0.5
    other = alone[1].optimum.points
    assert (other.threshold_shift, other.size) != (first.threshold_shift, first.size)
    assert together.energy[2] > alone[1].energy[0] or not together.found[2]


def test_finer_grid_is_never_worse_and_changes_little():
    for make, low, high in ((steep, 0.15, 0.9), (pressed, 0.08, 0.5), (planar, 0.25, 1.2)):
        loaded = load(study(side("a", low, high), [side("b", low, high)], [make("a"), make("b")], policy=DELAY))
        values = [
            compare(dataclasses.replace(loaded, supply_points=points)).candidate.optimum.value[0]
            for points in (11, 21, 41, 81)
        ]
        assert all(b <= a * (1 + 1e-9) for a, b in itertools.pairwise(values))
        assert values[-1] == near(values[0], rel=1e-9)
