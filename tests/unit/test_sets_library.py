"""Where sets are found: nearer folders first, the shipped ones last; what-if numbers; source lists."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

import benchmark
from benchmark.errors import InputRefused, Problem
from benchmark.record.load import load_study, load_technology, open_library
from benchmark.sets import library as library_module
from benchmark.sets.library import Library, shipped_nodes, shipped_reports
from benchmark.sets.problems import Collector
from benchmark.sets.sources import read_sources
from tests.refusals import SOURCES, TECHNOLOGY, WIRES
from tests.studies import mixed

NOWHERE = Problem("study.toml", 7, "candidate.technology", "")


def _library(*folders: Path) -> Library:
    return open_library(*folders)


def _texts(problems: list[Problem]) -> list[str]:
    return [str(problem) for problem in problems]


def test_a_set_lies_in_its_folder_or_directly_in_the_root(tmp_path: Path):
    (tmp_path / "technologies").mkdir()
    (tmp_path / "technologies" / "switch.toml").write_text(TECHNOLOGY)
    (tmp_path / "lines.toml").write_text(WIRES)
    library = _library(tmp_path)
    switch, lines = library.load("switch", "technologies", NOWHERE), library.load("lines", "wires", NOWHERE)
    assert switch is not None
    assert lines is not None
    assert (switch.file, lines.file) == ("technologies/switch.toml", "lines.toml")
    assert library.load("switch", "technologies", NOWHERE) is switch  # read once


def test_a_nearer_folder_hides_a_farther_one(tmp_path: Path):
    for name, title in (("near", "Near"), ("far", "Far")):
        (tmp_path / name).mkdir()
        (tmp_path / name / "switch.toml").write_text(TECHNOLOGY.replace('title = "Switch"', f'title = "{title}"'))
    found = _library(tmp_path / "near", tmp_path / "far").load("switch", "technologies", NOWHERE)
    assert found is not None
    assert found.title == "Near"


def test_a_users_set_hides_a_shipped_one(tmp_path: Path):
    text = (shipped_nodes() / "wires" / "hand-no-wires.toml").read_text(encoding="utf-8")
    (tmp_path / "hand-no-wires.toml").write_text(text.replace("No local wires", "My own"), encoding="utf-8")
    found = _library(tmp_path).load("hand-no-wires", "wires", NOWHERE)
    assert found is not None
    assert found.title.startswith("My own")


def test_an_unknown_set_is_named_with_the_place_that_asked(tmp_path: Path):
    library = _library(tmp_path)
    assert library.load("demo-givn", "technologies", NOWHERE) is None
    (problem,) = library.collector.problems
    assert (problem.file, problem.line, problem.name) == ("study.toml", 7, "candidate.technology")
    assert problem.what == "there is no such set in technologies"
    assert problem.found == "'demo-givn'"
    assert "demo-stress-gated" in problem.allowed.split(", ")
    assert problem.hint == "did you mean 'demo-given'?"


@pytest.mark.parametrize("name", ["../switch", "a/switch", "a\\switch", ".switch", "/etc/switch"])
def test_an_id_never_leads_out_of_the_folders(name: str, tmp_path: Path):
    (tmp_path / "inside").mkdir()
    (tmp_path / "switch.toml").write_text(TECHNOLOGY)
    assert _library(tmp_path / "inside").find(name, "technologies") is None


def test_shipped_files_are_named_alike_in_a_checkout_and_in_an_installation(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
):
    package = tmp_path / "site" / "benchmark"
    (package / "_nodes" / "wires").mkdir(parents=True)
    (package / "_reports").mkdir()
    shutil.copy(shipped_nodes() / "wires" / "hand-no-wires.toml", package / "_nodes" / "wires")
    monkeypatch.setattr(library_module.benchmark, "__file__", str(package / "__init__.py"))
    assert shipped_nodes() == package / "_nodes"
    assert shipped_reports() == package / "_reports"
    library = Library(lambda name: None, (), (shipped_nodes(),), Collector())  # type: ignore[arg-type, return-value]
    assert library.shown(package / "_nodes" / "wires" / "hand-no-wires.toml") == "nodes/wires/hand-no-wires.toml"


def test_in_a_checkout_the_folders_of_the_checkout_are_used():
    root = Path(benchmark.__file__).parent.parent
    assert shipped_nodes() == root / "nodes"
    assert shipped_reports() == root / "reports"


def test_a_technology_by_name(tmp_path: Path):
    (tmp_path / "switch.toml").write_text(TECHNOLOGY)
    assert load_technology("switch", tmp_path).nodes == ("g1", "g2")
    assert load_technology("hand-no-wires", tmp_path).kind == "wires"
    (tmp_path / "switch.toml").write_text(TECHNOLOGY.replace("value = 0.7", "value = 7"))
    with pytest.raises(InputRefused, match=r"switch\.toml:23: value\.switching_level\.value: is out of its domain"):
        load_technology("switch", tmp_path)
    with pytest.raises(InputRefused, match="there is no such set in wires"):
        load_technology("swich", tmp_path)


# -- what-if numbers -------------------------------------------------------------------------------------------


def _refused(folder: Path, overrides: dict[str, str]) -> list[str]:
    with pytest.raises(InputRefused) as caught:
        load_study(mixed().write(folder), (), overrides)
    return _texts(list(caught.value.problems))


def test_a_number_of_the_study_and_of_a_set_is_replaced_in_the_unit_of_the_file(tmp_path: Path):
    study, _ = load_study(
        mixed().write(tmp_path),
        (),
        {"clock_frequency": "5", "new-switch.input_capacitance": "0.3", "wires.layout_capacitance_per_pin": "7.5"},
    )
    assert study.values["clock_frequency"].si.tolist() == [5e6]
    assert study.values["clock_frequency"].spread is None  # the range belonged to the old number
    assert study.candidate.technology.values["input_capacitance"].si.tolist() == [0.3e-15, 0.3e-15]  # every node
    assert study.pairs[0].wires.values["layout_capacitance_per_pin"].si.tolist() == [7.5e-18]
    assert study.contenders[0].technology.values["off_current"].si[0] == pytest.approx(1e-4)


def test_what_if_for_something_that_is_not_there(tmp_path: Path):
    known = (
        "on_resistance, off_resistance, switching_level, input_capacitance, terminal_capacitance, closing_delay, "
        "opening_delay, declared_supply, footprint, endurance_cycles, process_temperature, supply_ceiling"
    )
    assert _refused(tmp_path, {"activty": "0.1"}) == [
        "--set: activty: is not a value of the study; allowed: clock_frequency, activity, busiest_activity, duty, "
        "logic_depth, fan_out, average_net_length"
    ]
    assert _refused(tmp_path, {"new-switch.on_resistence": "5"}) == [
        f"--set: new-switch.on_resistence: is not a value of the set; allowed: {known}; did you mean 'on_resistance'?"
    ]
    assert _refused(tmp_path, {"new-swich.on_resistance": "5"}) == [
        "--set: new-swich.on_resistance: there is no such set; found 'new-swich'; did you mean 'new-switch'?"
    ]


@pytest.mark.parametrize("text", ["abc", "1 V", "1,5", "nan x", "[1]", "'1'", "true", "1\ny = 2"])
def test_what_if_with_something_that_is_no_number(text: str, tmp_path: Path):
    assert _refused(tmp_path, {"activity": text}) == [f"--set: activity: needs a number; found {text!r}"]


def test_what_if_numbers_are_judged_like_any_other(tmp_path: Path):
    assert _refused(tmp_path, {"activity": "7"}) == [
        "study.toml:28: value.activity.value: is out of its domain; found 7; allowed: between 0 and 1"
    ]
    assert _refused(tmp_path, {"activity": "nan"}) == [
        "study.toml:28: value.activity.value: a finite number is needed; found NaN"
    ]


# -- sources ---------------------------------------------------------------------------------------------------


def test_a_source_as_it_is_printed(tmp_path: Path):
    path = tmp_path / "sources.toml"
    path.write_text(
        SOURCES + '[other]\nkind = "book"\nauthors = ["A", "B"]\nyear = 1999\ntitle = "T"\nvenue = "V"\n'
        'read = "second-hand"\nvia = "film-batch"\n'
    )
    collector = Collector()
    found = read_sources(path, collector)
    assert collector.problems == []
    assert found["film-batch"].citation == "example team (fictional): Batch (2026) [read]"
    assert found["other"].citation == "A, B: T, V (1999) [second-hand via film-batch]"


def test_a_users_sources_add_to_the_shipped_ones(tmp_path: Path):
    (tmp_path / "sources.toml").write_text(SOURCES)
    library = _library(tmp_path)
    assert library.sources["film-batch"].title == "Batch"
    assert "invented" in library.sources


def test_a_source_list_with_a_fault_adds_nothing_silently(tmp_path: Path):
    (tmp_path / "sources.toml").write_text(SOURCES.replace('read = "original"', 'read = "hearsay"'))
    library = _library(tmp_path)
    assert "film-batch" not in library.sources
    assert len(library.collector.problems) == 1
