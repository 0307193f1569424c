"""Scenario S8 as a change: what moved, how much of it is due to what, and why; by hand arithmetic (all invented)."""

from __future__ import annotations

import copy
import functools
import json
import math
import tempfile
from pathlib import Path
from typing import Any

import pytest
from scipy.special import ndtr

from benchmark.decide.attribution import REST
from benchmark.record.changes import QuestionsDiffer, compare_states, open_state, read_any_record
from benchmark.record.load import load_study
from benchmark.record.run import run_study
from benchmark.report.page import embedded_record
from benchmark.sets.study import DrawSettings
from tests.fixed_displacement import fixed_displacement
from tests.near import near

COEFFICIENT, CAPACITANCE = "film-switch.actuator_coefficient", "film-switch.input_capacitance"
OLD: tuple[tuple[str, str], tuple[str, str]] = (("200.0", "0.20"), ("0.20", "0.20"))
NEW_D = (("170.0", "0.05"), ("0.20", "0.20"))
NEW_BOTH = (("170.0", "0.05"), ("0.18", "0.02"))
#: the study switches every stage of the chain: the energy of one operation is ten times C V^2
STAGES = 10.0


@functools.cache
def _made(case: Any, required: str, draws: int) -> dict[str, Any]:
    with tempfile.TemporaryDirectory() as folder, pytest.MonkeyPatch.context() as patch:
        patch.setattr("benchmark.record.run.closed_form_differences", lambda *_: [])
        study, library = load_study(fixed_displacement(*case, required=required).write(Path(folder)))
        record = run_study(study, library, created="2026-01-31T00:00:00Z", draws=DrawSettings(draws))
    return json.loads(json.dumps(record | {"what_if": {}}))


def record(case: Any = OLD, required: str = "1.5", draws: int = 0) -> dict[str, Any]:
    return copy.deepcopy(_made(case, required, draws))


def change(old: dict[str, Any], new: dict[str, Any], **more: Any) -> dict[str, Any]:
    return compare_states(open_state("old", old), open_state("new", new), **more)


def part(found: dict[str, Any], quantity: str, scale: str = "logarithm") -> dict[str, Any]:
    return next(row for row in found["attribution"] if (row["quantity"], row["scale"]) == (quantity, scale))


def test_parts_of_the_logarithm():
    """-2 ln(200/170) = -0.32504 from the coefficient, ln(0.20/0.18) = +0.10536 from the capacitance."""
    found = change(record(), record(NEW_BOTH))
    row = part(found, "advantage")
    assert row["parts"][COEFFICIENT] == near(-0.32504, rel=0, abs=5e-6)
    assert row["parts"][CAPACITANCE] == near(0.10536, rel=0, abs=5e-6)
    assert row["total"] == near(-0.21968, rel=0, abs=5e-6)
    assert math.fsum(row["parts"].values()) == near(row["total"], rel=0, abs=1e-9)
    assert row["total"] == near(math.log(found["new"]["advantage"] / found["old"]["advantage"]), rel=0, abs=1e-9)
    assert found["banners"] == []


def test_parts_of_the_energy_in_joules():
    """18 -> 22.422 aJ; the mean over both orders: coefficient +6.568, capacitance -2.146, sum +4.422 aJ."""
    row = part(change(record(), record(NEW_BOTH)), "candidate energy", "additive")
    assert row["parts"][COEFFICIENT] / STAGES == near(6.568e-18, rel=0, abs=5e-22)
    assert row["parts"][CAPACITANCE] / STAGES == near(-2.146e-18, rel=0, abs=5e-22)
    assert row["total"] / STAGES == near(4.422e-18, rel=0, abs=5e-22)


def test_the_way_back_has_the_opposite_parts_and_the_digits_return():
    forth, back = change(record(), record(NEW_BOTH)), change(record(NEW_BOTH), record())
    for one, other in zip(forth["attribution"], back["attribution"], strict=True):
        for name, value in one["parts"].items():
            assert value == near(
                -other["parts"][name], rel=0, abs=1e-9 * max(1.0 * (one["unit"] == "1"), one["before"])
            )
    again = change(record(), record())
    assert again["inputs"] == again["results"] == again["other"] == []
    assert not again["verdict"]["flipped"]


def test_inputs_and_results_are_listed_and_what_is_the_same_is_named():
    found = change(record(), record(NEW_D))
    changed = {row["key"]: row for row in found["inputs"]}
    assert set(changed) == {COEFFICIENT, "film-switch.declared_supply"}
    row = changed[COEFFICIENT]
    assert (row["old"], row["new"], row["unit"]) == (200.0, 170.0, "pm/V")
    assert row["factor"] == near(0.85)
    assert row["changed"] == ["value", "range"]
    assert row["evidence_old"] == row["evidence_new"] == "invented"
    results = {row["result"]: row for row in found["results"]}
    assert results["advantage"]["factor"] == near(0.7225, rel=1e-6)
    same = found["identical"]
    # what does not depend on the coefficient: everything of the reference
    reference = [name for name in [*same, *results] if "stated-reference" in name]
    assert len(reference) >= 10
    assert set(reference) <= set(same)
    assert not set(same) & set(results)


def test_the_probability_split_into_moved_mean_and_narrowed_spread():
    """Phi((ln 1.445 - ln 1.5)/0.4583) = 0.468; Phi((ln 2 - ln 1.5)/0.2449) = 0.880; both 0.439; before 0.735."""
    found = change(record(draws=4096), record(NEW_D, draws=4096))["probability"]
    wide, narrow = math.sqrt(0.04 + 0.16 + 0.01), math.sqrt(0.04 + 0.01 + 0.01)
    means = math.log(2.0 / 1.5), math.log(1.445 / 1.5)
    expected = {
        "old": ndtr(means[0] / wide),
        "moved": ndtr(means[1] / wide),
        "narrowed": ndtr(means[0] / narrow),
        "new": ndtr(means[1] / narrow),
    }
    written = {"old": 0.735, "moved": 0.468, "narrowed": 0.880, "new": 0.439}
    for name, value in expected.items():
        assert value == near(written[name], rel=0, abs=6e-4)
        assert abs(found[name]["value"] - value) <= 4.0 * found[name]["error"]
        assert found[name]["error"] < 0.005
    total = found["new"]["value"] - found["old"]["value"]
    assert found["part_moved"] + found["part_narrowed"] == near(total, rel=0, abs=1e-12)
    assert found["part_moved"] < 0.0 < found["part_narrowed"]


def test_only_the_range_changed():
    """Same best estimate, better known: the whole change of the probability is the range, and nothing else moved."""
    found = change(record(draws=256), record((("200.0", "0.05"), ("0.20", "0.20")), draws=256))
    assert part(found, "advantage")["parts"] == {}
    assert [row["changed"] for row in found["inputs"]] == [["range"]]
    p = found["probability"]
    assert p["part_moved"] == near(0.0, rel=0, abs=1e-12)
    assert p["part_narrowed"] == near(p["new"]["value"] - p["old"]["value"], rel=0, abs=1e-12)
    assert p["part_narrowed"] > 0.05


def test_without_draws_on_both_sides_there_is_no_split():
    assert change(record(), record(NEW_D, draws=256))["probability"] is None


def test_another_question_is_refused_unless_asked_for_and_then_bannered():
    with pytest.raises(QuestionsDiffer, match=r"required advantage: 1.5 -> 2.*--anyway"):
        change(record(), record(required="2.0"))
    found = change(record(), record(required="2.0"), anyway=True)
    date = "2026-01-31T00:00:00Z"
    assert found["banners"] == [
        f"the criteria of the answer changed: required advantage (first used on {date} and on {date})"
    ]
    assert part(found, "advantage")["total"] == 0.0


def test_another_program_is_kept_apart():
    """A record of an older program with another number: said, and not given to an input."""
    old = record()
    old["software"]["evenload"] = "0.0.9"
    old["verdict"]["advantage"] *= 1.01
    found = change(old, record(NEW_D))
    assert part(found, "advantage")["parts"] == {COEFFICIENT: near(-0.32504, rel=0, abs=5e-6)}
    assert any(text.startswith("the program or its libraries changed: evenload") for text in found["banners"])
    assert any("the old record states the advantage 2.0" in text for text in found["banners"])


def test_another_search_is_named_and_moves_no_declared_point(tmp_path: Path):
    study, library = load_study(fixed_displacement(*NEW_D, search={"supply_points": 21}).write(tmp_path))
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("benchmark.record.run.closed_form_differences", lambda *_: [])
        new = run_study(study, library, created="x") | {"what_if": {}}
    found = change(record(), new)
    assert any(text.startswith("what is searched changed: supply points") for text in found["banners"])
    assert REST not in part(found, "advantage")["parts"]


def test_the_resolution_is_of_the_coarser_search(tmp_path: Path):
    assert change(record(), record(NEW_D))["resolution"] == 1e-6
    search = {"supply_points": 11, "refine_relative": 1e-4}
    study, library = load_study(fixed_displacement(*NEW_D, search=search).write(tmp_path))
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("benchmark.record.run.closed_form_differences", lambda *_: [])
        coarse = run_study(study, library, created="x") | {"what_if": {}}
    assert [change(*ends)["resolution"] for ends in ((record(), coarse), (coarse, record()))] == [1e-4, 1e-4]


def test_report_against_report_gives_the_same_as_the_records(tmp_path: Path):
    old, new = record(), record(NEW_D)
    for name, made in (("old", old), ("new", new)):
        script = f'<script type="application/json" id="record">{embedded_record(made)}</script>'
        page = f'<p>&lt;script id="record"&gt;</p>{script}<script>other</script>'
        (tmp_path / f"{name}.html").write_text(page, encoding="utf-8")
    ends = [open_state(name, read_any_record(tmp_path / f"{name}.html")) for name in ("old", "new")]
    assert json.dumps(compare_states(*ends)) == json.dumps(change(old, new))


def test_a_renamed_unit_is_no_changed_number(tmp_path: Path):
    old, new = record(), record()
    for row in new["ledger"]:
        if row["key"] == COEFFICIENT:
            row["unit"], row["value"] = "nm/V", [0.2]
            row["spread"] = {**row["spread"], "low": [x / 1e3 for x in row["spread"]["low"]]}
            row["spread"]["high"] = [x / 1e3 for x in row["spread"]["high"]]
    found = change(old, new)
    assert [(row["key"], row["changed"]) for row in found["inputs"]] == [(COEFFICIENT, ["unit"])]


def test_the_chain_of_a_halved_coefficient_at_fixed_supply():
    """S2: 300 -> 150 pm/V at 0.25 V: pressure 2 -> 1 GPa, 1e5 -> 1e7 ohm, 21.93 -> 708.1 ps, leakage over dynamic
    0.0877 -> 2.833."""
    states = []
    for coefficient in ("300.0", "150.0"):
        path = Path(__file__).parent.parent / "data" / "stress-hand" / "study.toml"
        study, _ = load_study(path, overrides={"hand-stress-gated.actuator_coefficient": coefficient})
        states.append(study)
    from benchmark.record.changes.chain import causal_chain

    rows = {row["quantity"]: row for row in causal_chain(*states)}

    def ends(name: str) -> tuple[float, float]:
        return rows[name]["before"], rows[name]["after"]

    assert ends("pressure") == near((2.0e9, 1.0e9), rel=1e-4)
    assert ends("closed-switch resistance") == near((1.0e5, 1.0e7), rel=1e-3)
    assert ends("time of one operation") == near((20 * 21.93e-12, 20 * 708.1e-12), rel=1e-3)
    shares = [rows["share of energy: leakage"][end] for end in ("before", "after")]
    assert [share / (1.0 - share) for share in shares] == near([0.0877, 2.833], rel=2e-3)
    assert rows["share of time: transit"]["before"] == near(0.684, rel=0, abs=6e-4)
    # the supply is the declared one on both sides, so the middle column is the last
    assert rows["time of one operation"]["at_old_supply"] == near(rows["time of one operation"]["after"])
    assert [row["stage"] for row in rows.values()] == sorted(
        (row["stage"] for row in rows.values()),
        key=("supply", "device", "time", "energy", "limits", "result").index,
    )
