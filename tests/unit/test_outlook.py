"""Today, target and limit: one study names the candidate's sets, the verdict is made on the one it judges."""

from __future__ import annotations

import copy
import functools
import json
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import pytest

from benchmark.errors import InputRefused
from benchmark.record.load import load_study
from benchmark.report.charts import charts
from benchmark.report.energy_delay import energy_delay
from benchmark.report.figure import to_svg
from benchmark.report.folder import report_page
from tests import studies
from tests.studies import D, Inputs, mixed

LOOKS = {"today": "filled", "target": "hollow", "limit": "outlined"}


def three(**ambitions: str) -> Inputs:
    """The mixed study: today's switch judged, two better ones beside it."""
    inputs = mixed()
    today = inputs.sets["technologies/new-switch"]
    today["ambition"] = ambitions.get("today", "today")
    for position, name in enumerate(("target", "limit"), start=1):
        other = copy.deepcopy(today)
        other |= {"id": f"new-switch-{name}", "title": f"Invented {name}", "ambition": ambitions.get(name, name)}
        capacitance = other["value"]["input_capacitance"]["by_node"]
        other["value"]["input_capacitance"]["by_node"] = {
            node: value / (D("1.5") ** position) for node, value in capacitance.items()
        }
        inputs.sets[f"technologies/new-switch-{name}"] = other
    inputs.study["candidate"]["outlook"] = ["new-switch-target", "new-switch-limit"]
    return inputs


@functools.cache
def _records() -> tuple[dict[str, Any], dict[str, Any]]:
    """With and without the two further sets."""
    alone = three()
    del alone.study["candidate"]["outlook"]
    with tempfile.TemporaryDirectory() as one, tempfile.TemporaryDirectory() as two:
        return studies.run(three(), Path(one)), studies.run(alone, Path(two))


def test_the_verdict_is_made_on_the_set_that_is_judged():
    record, alone = _records()
    for key in ("verdict", "requirements", "policies", "curves", "sides"):
        assert record[key] == alone[key], key
    assert alone["outlook"] == []
    assert [row["ambition"] for row in record["outlook"]] == ["target", "limit"]


def test_each_further_set_has_the_result_it_would_have_in_the_candidates_place():
    record, _ = _records()
    for row in record["outlook"]:
        inputs = three()
        inputs.study["candidate"] |= {"technology": row["technology"], "outlook": []}
        with tempfile.TemporaryDirectory() as folder:
            judged = studies.run(inputs, Path(folder))
        primary = judged["policies"][0]
        point = primary["candidate"]["point"]
        assert (row["advantage"], row["strongest"]) == (primary["advantage"], primary["strongest"])
        assert [row[name] for name in ("supply", "time", "energy")] == [
            point[name] for name in ("supply", "time", "energy")
        ]
    today = record["policies"][0]["advantage"]
    assert today < record["outlook"][0]["advantage"] < record["outlook"][1]["advantage"], "less to charge costs less"


def test_values_files_and_sources_of_further_sets_are_in_the_record():
    record, alone = _records()
    owners = {row["owner"] for row in record["ledger"]}
    assert {"new-switch-target", "new-switch-limit"} <= owners
    assert len(record["files"]) == len(alone["files"]) + 2
    assert {row["source"] for row in record["ledger"] if row["source"]} <= set(record["sources"])


def _drawn(record: dict[str, Any]) -> list[tuple[str, tuple[float, float]]]:
    """Look and place of the symbols of design points."""
    found = []
    for layer in energy_delay(record).spec["layer"]:  # type: ignore[index]
        mark = layer["mark"]
        if mark.get("size") == 110:
            look = {"white": "hollow", "transparent": "outlined"}.get(mark["fill"], "filled")
            assert bool(mark.get("strokeDash")) == (look == "outlined")
            found += [(look, (row["time_s"], row["energy_J"])) for row in layer["data"]["values"]]
    return found


def test_marks_are_filled_hollow_and_outlined_with_a_path_between_them():
    record, alone = _records()
    drawn = _drawn(record)
    point = record["policies"][0]["candidate"]["point"]
    wanted = [("today", point["time"], point["energy"])]
    wanted += [(row["ambition"], row["time"], row["energy"]) for row in record["outlook"]]
    for ambition, time, energy in wanted:
        assert (LOOKS[ambition], (time, energy)) in drawn
    path = [
        [(row["time_s"], row["energy_J"]) for row in layer["data"]["values"]]
        for layer in energy_delay(record).spec["layer"]  # type: ignore[index]
        if layer["mark"].get("type") == "line"
    ]
    assert [(time, energy) for _, time, energy in wanted] in path
    assert "thin line" in energy_delay(record).caption
    assert "thin line" not in energy_delay(alone).caption
    written = "".join(ElementTree.fromstring(to_svg(energy_delay(record).spec)).itertext())  # type: ignore[arg-type]
    assert "(target)" in written
    assert "(limit)" in written


def test_the_report_says_which_set_is_judged_and_the_marks_lead_to_their_rows():
    record, _ = _records()
    page = report_page(record)
    assert "Made on:" in page
    assert "today (Invented new-switch)" in page
    assert "today: carries the verdict" in page
    chart = charts(record)["energy-delay"]
    names = [spot.name for spot in chart.spots if chart.points[spot.row]["side"].startswith("new-switch-")]
    assert len(names) == 2
    assert any(name.startswith("Invented limit: supply ") for name in names)


def test_a_further_set_without_permitted_point_is_said_in_words():
    record = copy.deepcopy(_records()[0])
    record["outlook"][1] |= {"feasible": False, "why": "cannot reach it", "advantage": "nan", "strongest": ""}
    record["outlook"][1] |= dict.fromkeys(("supply", "time", "energy"))
    page = report_page(record)
    assert "limit (Invented limit): infeasible, cannot reach it" in page
    assert len(_drawn(record)) == len(_drawn(_records()[0])) - 1


def _other_model(inputs: Inputs) -> None:
    inputs.study["candidate"]["outlook"] = ["old-switch"]


def _no_node(inputs: Inputs) -> None:
    inputs.sets["technologies/new-switch-limit"]["nodes"] = ["g2", "g9"]
    for table in inputs.sets["technologies/new-switch-limit"]["value"].values():
        if "by_node" in table:
            table["by_node"] = dict(zip(("g2", "g9"), table["by_node"].values(), strict=True))


def _of_a_contender(inputs: Inputs) -> None:
    inputs.study["contender"][0]["outlook"] = ["new-switch-target"]


@pytest.mark.parametrize(
    ("spoil", "said"),
    [
        (_other_model, "is not a set of the candidate's model; found 'old-switch'"),
        (_no_node, "new-switch-limit has no node of the headline pair; found 'g1'"),
        (_of_a_contender, "belongs to the candidate alone; found new-switch-target"),
        (lambda inputs: None, ""),
    ],
)
def test_what_cannot_stand_beside_the_candidate_is_refused(spoil: Callable[[Inputs], None], said: str, tmp_path: Path):
    inputs = three()
    spoil(inputs)
    if not said:
        assert len(load_study(inputs.write(tmp_path))[0].candidate.outlook) == 2
        return
    with pytest.raises(InputRefused) as caught:
        load_study(inputs.write(tmp_path))
    assert any(said in str(problem) for problem in caught.value.problems), json.dumps(
        [str(problem) for problem in caught.value.problems]
    )


def test_two_sets_cannot_stand_for_the_same(tmp_path: Path):
    with pytest.raises(InputRefused) as caught:
        load_study(three(limit="target").write(tmp_path))
    assert any("stands for target, as new-switch-target does" in str(problem) for problem in caught.value.problems)


def test_an_invented_further_set_makes_a_demonstration(tmp_path: Path):
    inputs = three()
    for data in (inputs.study, *inputs.sets.values()):
        data["default"] = {**data["default"], "evidence": "choice", "source": "team-choice"}
    for table in inputs.value_tables():
        table.pop("evidence", None)
    inputs.study["demonstration"] = False
    load_study(inputs.write(tmp_path / "decided"))
    inputs.sets["technologies/new-switch-limit"]["value"]["footprint"]["evidence"] = "invented"
    with pytest.raises(InputRefused, match="must be true: some inputs are invented"):
        load_study(inputs.write(tmp_path / "invented"))
