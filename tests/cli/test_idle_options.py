"""An option that would have no effect beside the others is refused, never taken in silence."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from tests.cli.conftest import Run
from tests.fixed_displacement import fixed_displacement
from tests.studies import hub


@pytest.fixture
def study(tmp_path: Path) -> Path:
    (tmp_path / "sets").mkdir()
    return hub().write(tmp_path / "hub")


def words(text: str) -> str:
    return " ".join(text.split())


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["run", "STUDY", "--seed", "3"], "--seed without draws: nothing would be drawn; state --draws"),
        (["run", "STUDY", "--jobs", "2"], "--jobs without draws: nothing would be drawn; state --draws"),
        (["run", "STUDY", "--draws", "0", "--seed", "3", "--jobs", "2"], "--seed and --jobs without draws"),
        (["demo", "--seed", "3", "--draws", "0"], "--seed without draws"),
        (["run", "STUDY", "--need", "--ratio-only"], "--need and --ratio-only exclude each other: needs are stated in"),
        (["batch", "hub", "--draws", "0", "--seed", "3"], "--seed without draws"),
        (
            ["batch", "hub", "--freeze-time", "2026-01-31T00:00:00Z"],
            "--freeze-time is written into records; state --out",
        ),
        (["new", "study", "x.toml", "--model", "given"], "--model belongs to a new technology; a study has none"),
        (["new", "circuit", "x.toml", "--model", "table"], "--model belongs to a new technology; a circuit has none"),
        (["export", "RECORD"], "export needs --figures FOLDER, --tables FOLDER or --netlist FILE"),
        (["export", "RECORD", "--figures", "f", "--format", "md"], "--format belongs to --tables"),
        (["export", "RECORD", "--figures", "f", "--side", "relay"], "--side belongs to --netlist"),
        (["export", "RECORD", "--tables", "t", "--supply", "1"], "--supply belongs to --netlist"),
        (["export", "RECORD", "--tables", "t", "--node", "n1"], "--node belongs to --netlist"),
        (["export", "RECORD", "--tables", "t", "--net", "stage"], "--net belongs to --netlist"),
        (["export", "RECORD", "--tables", "t", "--capacitances", "delay"], "--capacitances belongs to --netlist"),
        (["export", "RECORD", "--tables", "t", "--nodes", "sets"], "--nodes belongs to --netlist"),
        (["export", "RECORD", "--tables", "t", "--set", "activity=0.1"], "--set belongs to --netlist"),
        (["export", "STUDY", "--netlist", "n.sp", "--format", "md"], "--format belongs to --tables"),
        (["export", "STUDY", "--netlist", "n.sp", "--ratio-only"], "--ratio-only and --netlist exclude each other"),
        (["need", "RECORD", "--nodes", "sets"], "--nodes has no effect on record: a record holds all its inputs"),
        (["trace", "RECORD", "--nodes", "sets"], "--nodes has no effect on record"),
        (["export", "RECORD", "--netlist", "n.sp", "--nodes", "sets"], "--nodes has no effect on record"),
        (
            ["changes", "RECORD", "RECORD", "--draws", "32"],
            "draws: without effect, for records hold what they were run",
        ),
        (["changes", "RECORD", "RECORD", "--seed", "1", "--nodes", "sets"], "nodes, seed: without effect"),
        (["changes", "SET", "SET", "--jobs", "2"], "jobs: without effect, for two sets are compared value by value"),
        (["changes", "SET", "SET", "--anyway"], "anyway: without effect, for two sets are compared value by value"),
        (["changes", "STUDY", "STUDY", "--additive", "--format", "csv"], "--additive is for text; --format csv always"),
    ],
)
def test_an_option_without_effect_is_refused(
    arguments: list[str], message: str, evenload: Run, study: Path, quick: None, tmp_path: Path
):
    if "RECORD" in arguments:
        assert evenload("run", study, "--out", "record", "--quiet").status == 0
    places = {"STUDY": "hub/study.toml", "RECORD": "record", "SET": "hub/nodes/technologies/relay.toml"}
    before = sorted(str(path) for path in tmp_path.rglob("*"))
    ran = evenload(*(places.get(word, word) for word in arguments))
    assert ran.status == 2
    assert message in words(ran.err)
    assert ran.out == ""
    assert sorted(str(path) for path in tmp_path.rglob("*")) == before


def test_a_seed_of_a_study_that_draws_by_itself_is_taken(evenload: Run, tmp_path: Path, quick: None):
    inputs = fixed_displacement(uncertainty={"draws": 64})
    inputs.write(tmp_path / "film")
    ran = evenload("run", "film/study.toml", "--seed", "3", "--out", "out", "--quiet")
    assert ran.status == 0, ran.err
    assert "(64 draws, seed 3)" in words(ran.out)


def test_tables_of_changes_hold_the_additive_parts_without_asking(evenload: Run, tmp_path: Path):
    fixed_displacement().write(tmp_path / "old")
    fixed_displacement(coefficient=("170.0", "0.05")).write(tmp_path / "new")
    places = ("changes", "old/study.toml", "new/study.toml")
    listed = json.loads(evenload(*places, "--format", "json").out)
    assert "additive" in json.dumps(listed)
    assert "additive" in evenload(*places, "--format", "csv").out
