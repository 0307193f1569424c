"""Ladders: the last rung is the study's answer, no rung weakens the side it is given to, turns and reasons named."""

from __future__ import annotations

import dataclasses
import itertools
from decimal import Decimal as D
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from benchmark.decide.ladder import RUNGS, SCALED, Ladder, climb, ladders
from benchmark.record.load import load_study
from benchmark.record.text import ladder_words
from benchmark.sets.study import Study
from tests.comparisons import compare, comparison, given, load, planar, side, steep, study
from tests.near import near
from tests.studies import Table, hub, v
from tests.unit.test_mitigations import DEADLINE, GATE, with_bias, with_copies

NAMES = [name for name, _ in RUNGS]
IDLE = {"idle_time": v(D("0.002"), "s"), "active_cycles": v(500)}


def climbed(found: Study, policy: str | None = None) -> tuple[Ladder, Ladder]:
    return ladders(comparison(found), compare(found, policy))


def advantages(ladder: Ladder) -> dict[str, float]:
    return {rung.name: rung.advantage for rung in ladder.rungs}


def test_rungs_stand_in_order_and_each_allows_more():
    assert [
        *("declared point", "own best supply", "best flavour", "near-threshold supply"),
        *("parallel copies", "power gating", "back bias"),
    ] == NAMES
    order = ["declared", "scaled", "whole"]
    for (_, less), (_, more) in itertools.pairwise(RUNGS):
        assert order.index(less.supply) <= order.index(more.supply)
        before, after = (dataclasses.astuple(item)[1:] for item in (less, more))
        assert all(b or not a for a, b in zip(before, after, strict=True))
        assert less != more


# -- the hub by hand --------------------------------------------------------------------------------------------


def _hub(tmp_path: Path, **choices: Any) -> tuple[Ladder, Ladder]:
    found, _ = load_study(hub(**choices).write(tmp_path))
    return climbed(found)


def test_the_hub_hangs_on_the_second_flavour(tmp_path: Path):
    """0.6072 and 0.0168 over 0.0400 fJ; each side has one supply and nothing is idle."""
    reference, candidate = _hub(tmp_path)
    found = advantages(reference)
    assert found["declared point"] == near(15.18, rel=1e-9)
    assert found["own best supply"] == found["declared point"]
    assert all(found[name] == near(0.42, rel=1e-9) for name in NAMES[2:])
    assert (reference.state, reference.turn) == ("lost", "best flavour")
    assert [rung.side for rung in reference.rungs] == ["fast", "fast", *["low-leakage"] * 5]
    assert [rung.offered for rung in reference.rungs] == [True, False, True, False, False, False, False]
    assert set(advantages(candidate).values()) == {found["back bias"]}
    assert (candidate.state, candidate.turn) == ("never", "")


def test_the_hub_asleep_hangs_on_the_sleep_switch(tmp_path: Path):
    """724.5 ungated and 67.62 gated over 100 fJ per second."""
    reference, candidate = _hub(tmp_path, activity="0.05", idle="gated", contenders=("low-leakage",))
    found = advantages(reference)
    assert found["near-threshold supply"] == near(7.245, rel=1e-9)
    assert found["power gating"] == near(0.6762, rel=1e-9)
    assert (reference.state, reference.turn) == ("lost", "power gating")
    assert [rung.gated for rung in reference.rungs] == [False] * 5 + [True] * 2
    # the relay leaks nothing, so gating gives it nothing
    assert set(advantages(candidate).values()) == {found["back bias"]}


# -- any study --------------------------------------------------------------------------------------------------


def _everything(seed: int) -> Study:
    """Two flavours and a candidate with every liberty; numbers drawn with a fixed key."""
    draw = np.random.default_rng(seed)

    def liberties(name: str, **more: Any) -> Table:
        found = with_copies(name, 0.15, 0.9, [1, 2, 4], draw.uniform(0.0, 0.1), draw.uniform(0.2, 1.0), 1.0, **more)
        return with_bias(found, [-0.3, 0.0, 0.3], draw.uniform(0.05, 0.2), draw.uniform(0.0, 1e-3))

    def flavour(name: str) -> Table:
        return steep(
            name, supply=round(draw.uniform(0.45, 0.7), 2), subthreshold_swing=round(draw.uniform(60.0, 90.0), 1),
            off_current=float(f"{10 ** draw.uniform(-3.0, 0.5):.3g}"),
        )  # fmt: skip

    sides = [liberties("a", gating=GATE), [liberties("b", gating=GATE, sizes=[1, 2]), liberties("c", gating=GATE)]]
    clock = {"clock_frequency": v(D(repr(float(f"{10 ** draw.uniform(0.5, 2.5):.3g}"))), "MHz")}
    return load(
        study(
            *sides, [flavour(name) for name in "abc"], timing="clocked", accounting="period", idle="gated",
            values=clock | IDLE, requirements=DEADLINE, points=41, refine=1e-6,
        )
    )  # fmt: skip


@pytest.mark.parametrize("seed", range(6))
def test_a_rung_never_weakens_the_side_it_is_given_to(seed: int):
    found = _everything(seed)
    outcome = compare(found)
    reference, candidate = climbed(found)
    for ladder in (reference, candidate):
        assert all(rung.offered for rung in ladder.rungs if ladder.of == "reference" or rung.name != "best flavour")
        assert ladder.rungs[-1].advantage == float(outcome.advantage[0])  # bit for bit
    slack = 1.0 + 1e-6  # the supply is searched to this relative step, and an optimum on a limit moves with it
    falling = [rung.advantage for rung in reference.rungs if not np.isnan(rung.advantage)]
    rising = [rung.advantage for rung in candidate.rungs if not np.isnan(rung.advantage)]
    assert all(b <= a * slack for a, b in itertools.pairwise(falling))
    assert all(b >= a / slack for a, b in itertools.pairwise(rising))
    assert falling[0] > falling[-1] * 1.01
    known = [rung.name for rung in reference.rungs if not np.isnan(rung.advantage)]
    assert known == NAMES[-len(known) :]  # what is permitted on one rung is permitted on the next


def test_a_ladder_alone_is_that_of_the_pair():
    found = _everything(1)
    outcome = compare(found)
    for of, ladder in zip(("reference", "candidate"), climbed(found), strict=True):
        assert climb(comparison(found), outcome, of) == ladder


def test_supplies_of_the_first_rungs():
    sides = [side("a", 0.2, 1.0), [side("b", 0.2, 1.0)], [steep("a"), steep("b", supply=0.6)]]
    found = load(study(*sides, timing="clocked", accounting="period", values={"clock_frequency": v(D("1.0"), "MHz")}))
    supplies = {rung.name: rung.supply for rung in climbed(found)[0].rungs}
    assert supplies["declared point"] == 0.6
    assert supplies["own best supply"] == near(SCALED * 0.6, rel=1e-9)
    assert supplies["near-threshold supply"] < 0.9 * SCALED * 0.6


def test_a_declared_supply_outside_the_range_is_named():
    sides = [side("a", 0.2, 0.9), [side("b", 0.2, 0.4)], [steep("a"), steep("b", supply=0.5)]]
    reference = climbed(load(study(*sides)))[0]
    for rung in reference.rungs[:3]:
        assert np.isnan(rung.advantage)
        assert rung.why == "b: the declared supply is outside the supply range"
        assert rung.side == ""
    assert not np.isnan(reference.rungs[3].advantage)


def test_a_reference_that_is_too_slow_at_first_is_infeasible_with_its_reason():
    """At its declared supply the path takes longer than the clock cycle; two copies of it meet the cycle."""
    slow = given("b", on_resistance=1.5e-6 / (20 * float(np.log(2.0)) * 0.4e-15) / 1e3)
    sides = [side("a", 0.2, 0.9), [with_copies("b", 0.2, 0.9, [1, 2])], [given("a"), slow]]
    clock = {"clock_frequency": v(D("1.0"), "MHz")}
    found = load(study(*sides, timing="clocked", accounting="period", values=clock, requirements=DEADLINE))
    reference = climbed(found)[0]
    before = NAMES.index("parallel copies")
    assert all(np.isnan(rung.advantage) for rung in reference.rungs[:before])
    assert reference.rungs[0].why == "b: no point of the supply range meets requirement deadline"
    assert reference.rungs[before].copies == 2.0
    assert reference.state in ("kept", "never")


def test_a_candidate_without_a_point_leaves_the_ladder_undefined():
    sides = [side("a", 0.2, 0.9), [side("b", 0.2, 0.9)], [given("a", closing_delay=9.0), given("b")]]
    late = {"deadline": {"limit": {"value": D("10.0"), "unit": "ns"}, "kind": "hard"}}
    reference, candidate = climbed(load(study(*sides, requirements=late)))
    for ladder in (reference, candidate):
        assert (ladder.state, ladder.turn) == ("undefined", "")
        assert all(rung.why.startswith("a: ") for rung in ladder.rungs)


@pytest.mark.parametrize("policy", ["declared-point", "iso-delay", "iso-energy", "minimum-energy-delay"])
def test_under_every_policy_the_last_rung_is_the_answer(policy: str):
    more: Table = {"policy": {"primary": policy}}
    if policy == "iso-delay":
        more["policy"]["required_time"] = {"value": D("100.0"), "unit": "ns"}
    if policy == "iso-energy":
        more["policy"]["required_energy"] = {"value": D("1.0"), "unit": "fJ"}
    if policy == "minimum-energy-delay":
        more["policy"]["exponent"] = D("1.0")
    sides = [side("a", 0.3, 1.0), [side("b", 0.3, 1.0), side("c", 0.3, 1.0)]]
    found = load(study(*sides, [steep("a"), planar("b"), steep("c", off_current=1.0)], points=21, refine=1e-6, **more))
    outcome = compare(found)
    assert not np.isnan(outcome.advantage[0])
    for ladder in climbed(found):
        assert ladder.rungs[-1].advantage == float(outcome.advantage[0])


# -- words ------------------------------------------------------------------------------------------------------


def _words(of: str, state: str, turn: str, numbers: list[Any]) -> str:
    rungs = [{"name": name, "advantage": number} for name, number in zip(NAMES, numbers, strict=True)]
    record = {"study": {"required_advantage": 2.0}}
    return ladder_words(record, {"of": of, "state": state, "turn": turn, "rungs": rungs})


def test_words_of_a_ladder():
    falling = [None, 15.2, 4.0, 1.996, 1.0, 0.5, 0.42]
    assert _words("reference", "lost", "near-threshold supply", falling) == (
        "Ladder of the reference: advantage 15 at 'own best supply', 0.42 with everything the study offers; "
        "the required 2 is lost at 'near-threshold supply'."
    )
    rising = [0.5, 1.0, 2.0, 3.0, 3.0, 3.0, None]
    assert _words("candidate", "reached", "best flavour", rising) == (
        "Ladder of the candidate: advantage 0.5 at 'declared point', 3 at 'power gating'; "
        "the required 2 is reached at 'best flavour'."
    )
    assert _words("reference", "kept", "", ["infinite"] * 7).endswith("the required 2 is kept on every rung.")
    assert _words("candidate", "never", "", [1.0] * 7).endswith("the required 2 is reached on no rung.")
    undefined = "Ladder of the candidate: on no rung do both sides have a permitted point."
    assert _words("candidate", "undefined", "", [None] * 7) == undefined
