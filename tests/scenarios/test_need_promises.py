"""What the notes for users promise of needs, ladder and robustness, each sentence held once by a whole study."""

from __future__ import annotations

import dataclasses
from decimal import Decimal as D
from pathlib import Path

import pytest

from benchmark import api
from benchmark.decide.axes import find_axis
from benchmark.decide.compare import Comparison
from benchmark.decide.ladder import RUNGS
from benchmark.decide.trials import Trials
from benchmark.evaluate.batch import Batch
from tests.near import near
from tests.studies import Inputs, hub, mixed, run, v


def with_everything() -> Inputs:
    """The mixed study with an idle scheme, so that it has every axis."""
    inputs = mixed()
    inputs.study["workload"]["idle"] = "ungated"
    del inputs.study["value"]["duty"]  # the idle time says it
    inputs.study["value"] |= {"idle_time": v(D("1.0"), "ms"), "active_cycles": v(100)}
    return inputs


@pytest.fixture(scope="module")
def view(tmp_path_factory: pytest.TempPathFactory) -> api.StudyView:
    return api.load_study(with_everything().write(tmp_path_factory.mktemp("every-axis")))


@pytest.mark.parametrize(
    "name",
    [
        "activity",
        "awake_share",
        "idle_time",
        "average_net_length",
        "fan_out",
        "logic_depth",
        "new-switch.declared_supply",
        "temperature",
        "on_off_ratio",
        "required_advantage",
        "new-switch.terminal_capacitance",
    ],
)
def test_a_need_of_every_axis_has_one_of_the_answers_there_are(name: str, view: api.StudyView):
    found = api.need(view, [name], points=3)
    assert found.rows
    for row in found.rows:
        assert row["name"].rpartition(".")[2] == name.rpartition(".")[2]
        assert row["answer"] in (
            *("crossings", "jump", "beyond", "always", "never", "unreachable", "no effect", "undefined"),
        )
        assert row["words"]
        if row["answer"] == "crossings" and name != "required_advantage":
            # the value put back as a what-if gives the level
            axis_name = row["name"]
            trials = Trials(view.study, view.study.pair(view.study.headline))
            axis = find_axis(trials, axis_name)
            put = axis.place(axis.si(repr(row["value"])), {})
            assert trials([put]).advantage[0] == near(row["level"], rel=1e-6)


@pytest.mark.parametrize("required", [8e-9, 60e-9])  # 20 ns today
def test_the_reference_is_optimised_anew_along_the_way(required: float, view: api.StudyView):
    pair = view.study.pair(view.study.headline)
    trials = Trials(view.study, pair)
    policy = dataclasses.replace(view.study.policy, required_time=required)
    study = dataclasses.replace(view.study, policy=policy)
    today, there = (
        Comparison(one, pair, Batch.best_estimate(), frozen=trials.frozen).outcome(policy.primary)
        for one in (view.study, study)
    )
    assert trials([{"required_time": required}]).advantage[0] == there.advantage[0]
    strongest = today.strongest_side
    assert strongest is not None
    moved = next(side for side in there.contenders if side.id == strongest.id)
    assert moved.supply[0] != strongest.supply[0]


def test_the_ladder_has_seven_rungs_and_ends_in_the_answer(tmp_path: Path):
    record = run(mixed(), tmp_path)
    names = [
        *("declared point", "own best supply", "best flavour", "near-threshold supply"),
        *("parallel copies", "power gating", "back bias"),
    ]
    assert [name for name, _ in RUNGS] == names
    for ladder in record["ladder"]:
        assert [rung["name"] for rung in ladder["rungs"]] == names
        assert ladder["rungs"][-1]["advantage"] == record["policies"][0]["advantage"]


def test_a_gate_that_stops_nothing_and_costs_nothing_is_no_gate_bit_for_bit(tmp_path: Path):
    neutral = run(hub(idle="gated", residual="1.0", wake="0.0"), tmp_path / "gated")
    without = run(hub(idle="ungated"), tmp_path / "ungated")
    for one, other in zip(neutral["policies"], without["policies"], strict=True):
        assert one["advantage"] == other["advantage"]
        for a, b in zip(
            (one["candidate"], *one["contenders"]), (other["candidate"], *other["contenders"]), strict=True
        ):
            assert a["point"]["energy"] == b["point"]["energy"]
            assert a["point"]["time"] == b["point"]["time"]


def test_robustness_counts_its_cells_and_marks_the_one_fixed_before(tmp_path: Path):
    record = run(mixed(), tmp_path)
    found = record["robustness"]
    cells = found["cells"]
    assert sum(cell["declared"] for cell in cells) == 1
    assert found["reaching"] == sum(cell["level"] == "reaches" for cell in cells)
    assert found["infeasible"] == sum(cell["level"] == "infeasible" for cell in cells)
    (declared,) = [cell for cell in cells if cell["declared"]]
    assert declared["advantage"] == record["policies"][0]["advantage"]
    for axis in ("policy", "contenders", "pair", "temperatures"):
        assert len({str(cell[axis]) for cell in cells}) > 1, axis


def test_product_classes_are_boxes_with_their_origin(tmp_path: Path):
    found = api.opportunity(hub().write(tmp_path), "activity", points=2)
    boxes = [row for row in found.rows if row["kind"] == "class"]
    assert len(boxes) == 5
    assert {row["state"] for row in boxes} == {"common practice, no source"}
