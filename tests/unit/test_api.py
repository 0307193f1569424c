"""The Python interface: same bytes as the command line, frames equal to the tables, what-ifs, exact names."""

from __future__ import annotations

import csv
import doctest
import inspect
import json
import os
import re
import subprocess
import sys
from collections.abc import Iterator
from decimal import Decimal
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest

from benchmark import api
from benchmark.api.frames import units_of
from benchmark.errors import EvenloadError, InputRefused, UsageError
from benchmark.record.load import open_library
from benchmark.units import parse_unit, to_si
from tests import studies

STAMP = "2026-01-31T00:00:00Z"

#: everything a user may import; a change here is a change of the interface
NAMES = [
    "Batched",
    "Changes",
    "Edited",
    "Extraction",
    "Needed",
    "Result",
    "SetView",
    "StudyView",
    "batch",
    "changes",
    "check",
    "export_sheet",
    "extract",
    "flips",
    "import_sheet",
    "improve",
    "joint_sheet",
    "load_result",
    "load_set",
    "load_study",
    "need",
    "opportunity",
    "run",
    "sheet",
    "supersede",
    "technologies",
    "trade",
    "what_if",
    "worked_study",
]
RESULT = [
    "advantage",
    "conditions",
    "frames",
    "measure_next",
    "reasons",
    "record",
    "report",
    "save",
    "after",
    "ratio_only",
    "summary",
    "text",
]
MEMBERS = {
    "Batched": ["files", "frame", "notes", "rows", "seconds", "status"],
    "Changes": ["data", "flipped", "frames", "record", "report"],
    "Edited": ["data", "frame", "lines", "notes", "text", "warnings", "written"],
    "Needed": ["columns", "facts", "frame", "heading", "rows", "text"],
    "Result": [*RESULT, "verdict"],
    "SetView": ["frame", "id", "nodes", "parameters", "sources", "title"],
    "StudyView": ["id", "library", "nodes", "path", "sets", "study", "title", "warnings", "what_if"],
}


@pytest.fixture(scope="module")
def study_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return studies.mixed().write(tmp_path_factory.mktemp("mixed"))


@pytest.fixture(scope="module")
def result(study_file: Path) -> api.Result:
    return api.run(study_file, created=STAMP)


@pytest.fixture(scope="module")
def saved(result: api.Result, tmp_path_factory: pytest.TempPathFactory) -> Path:
    return result.save(tmp_path_factory.mktemp("saved") / "record")


# -- the interface -------------------------------------------------------------------------------------------------


def test_exported_names():
    assert sorted(api.__all__) == sorted(NAMES)
    for name, members in MEMBERS.items():
        shown = getattr(api, name)
        found = {key for key in (*vars(shown), *shown.__dataclass_fields__) if not key.startswith("_")}
        assert sorted(found) == sorted(members), name


def _documented() -> Iterator[tuple[str, Any]]:
    for name in NAMES:
        item = getattr(api, name)
        yield name, item
        for key, member in vars(item).items() if inspect.isclass(item) else ():
            if not key.startswith("_") and key not in item.__dataclass_fields__:  # fields stand under Attributes
                own = member.fget if isinstance(member, property) else getattr(member, "func", member)
                yield f"{name}.{key}", own


@pytest.mark.parametrize(("name", "item"), list(_documented()))
def test_every_name_says_what_it_takes_and_returns(name: str, item: Any):
    text = inspect.getdoc(item)
    assert text
    if inspect.isclass(item):
        assert re.search(r"^Attributes\n-+$", text, flags=re.M)
        for key in item.__dataclass_fields__:
            assert re.search(rf"^{key} : .+\n    \S", text, flags=re.M), f"{name}: {key}"
        return
    taken = [key for key in inspect.signature(item).parameters if key != "self"]
    if "." in name and not taken:
        return  # a property: its one line says what it returns
    sections = re.findall(r"^(Parameters|Returns|Raises)\n-+$", text, flags=re.M)
    assert sections == [key for key in ("Parameters", "Returns", "Raises") if key in sections]
    assert {"Parameters", "Returns"} <= set(sections)
    for key in taken:
        assert re.search(rf"^(\*\*)?{key} : .+\n    \S", text, flags=re.M), f"{name}: {key}"


def test_examples_in_the_documentation_are_true():
    assert doctest.testmod(api).attempted == 3
    assert doctest.testmod(api).failed == 0


def test_importing_loads_no_numeric_package():
    heavy = ("numpy", "scipy", "pandas", "pint", "pydantic", "altair", "typer", "rich", "jinja2")
    for statement in ("import benchmark", "from benchmark import api", "import benchmark.cli.commands"):
        code = f"{statement}\nimport sys\nprint([name for name in {heavy!r} if name in sys.modules])"
        done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
        assert done.stdout.strip() == ("['typer']" if "cli" in statement else "[]"), statement


# -- the numbers of the command line ------------------------------------------------------------------------------


def _bytes(folder: Path) -> dict[str, bytes]:
    return {str(path.relative_to(folder)): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


def test_a_record_folder_is_that_of_the_command_line_byte_by_byte(study_file: Path, tmp_path: Path):
    words = ["run", str(study_file), "--out", "cli", "--freeze-time", STAMP, "--quiet", "--set", "activity=0.07"]
    done = subprocess.run(
        [sys.executable, "-m", "benchmark", *words],
        cwd=tmp_path,
        env={**os.environ, "NO_COLOR": "1"},
        capture_output=True,
        text=True,
        check=True,
    )
    changed = api.run(api.what_if(api.load_study(study_file), activity=0.07), created=STAMP)
    changed.save(tmp_path / "api")
    written = _bytes(tmp_path / "cli")
    assert len(written) > 30
    assert _bytes(tmp_path / "api") == written
    assert done.stdout == changed.text + "\n"
    assert changed.record["what_if"] == {"activity": "0.07"}
    page = changed.report(tmp_path / "page.html")
    assert page.read_bytes() == written["report.html"]


def test_a_study_can_be_run_again(study_file: Path, result: api.Result):
    loaded = api.load_study(study_file)
    assert api.run(loaded, created=STAMP).record == result.record
    assert api.run(loaded, created=STAMP).record == result.record


def test_a_saved_record_is_the_result_again(saved: Path, result: api.Result):
    again = api.load_result(saved)
    assert json.loads(json.dumps(result.record)) == again.record
    assert again.summary == result.summary
    assert again.summary == json.loads((saved / "summary.json").read_text(encoding="utf-8"))
    assert api.load_result(saved / "record.json").text == result.text
    for name, frame in result.frames.items():
        pd.testing.assert_frame_equal(again.frames[name], frame)


def test_a_result_says_what_its_record_says(result: api.Result):
    verdict = result.record["verdict"]
    assert (result.verdict, result.advantage) == (verdict["word"], verdict["advantage"])
    assert isinstance(result.advantage, float)
    assert result.reasons == verdict["reasons"] != []
    assert result.conditions == verdict["conditions"]
    assert result.measure_next == verdict["measure_next"]
    assert result.summary["advantage"] == result.advantage
    assert str(result) == result.text
    assert result.text.count(result.verdict) == 1


def test_progress_is_told(study_file: Path):
    told: list[tuple[str, float]] = []
    api.run(study_file, created=STAMP, progress=lambda step, share: told.append((step, share)))
    assert [share for _, share in told] == sorted(share for _, share in told)
    assert told[-1] == ("done", 1.0)


# -- frames --------------------------------------------------------------------------------------------------------


def _same(shown: str, value: Any) -> bool:
    if value is None or (isinstance(value, float) and np.isnan(value)):
        return shown == ""
    if isinstance(value, (bool, np.bool_)):
        return shown == str(bool(value))
    if isinstance(value, (int, float, np.integer, np.floating)):
        return float(shown) == float(value)
    return shown == str(value)


def test_frames_agree_with_the_tables_of_the_folder(result: api.Result, saved: Path):
    tables = {path.stem for path in (saved / "tables").glob("*.csv") if not path.stem.startswith("chart-")}
    assert set(result.frames) == tables
    filled = 0
    for name, frame in result.frames.items():
        with (saved / "tables" / f"{name}.csv").open(encoding="utf-8", newline="") as file:
            header, *rows = csv.reader(file)
        if frame.empty:
            assert (header, rows) == (["no rows"], []), name
            continue
        filled += 1
        assert header == list(frame.columns)
        assert len(rows) == len(frame)
        for cells, values in zip(rows, frame.itertuples(index=False), strict=True):
            for column, shown, value in zip(header, cells, values, strict=True):
                assert _same(shown, value), f"{name}.{column}: {shown!r} and {value!r}"
    assert filled >= 15


def test_frames_carry_their_units(result: api.Result):
    stated = {"column 'unit'", "SI unit of the column 'unit'", "SI unit of the column 'unit_of_source'"}
    for name, frame in result.frames.items():
        units = frame.attrs["units"]
        assert set(units) <= set(frame.columns), name
        for unit in set(units.values()) - stated:
            parse_unit(unit)
        for column in frame.columns:
            ending = re.search(r"_(V|s|J|W|K|m2|W_per_m2|SI)$", column)
            assert (ending is not None) <= (column in units), f"{name}.{column}"
    assert result.frames["policies"].attrs["units"] == {
        "supply_V": "V",
        "threshold_shift_V": "V",
        "time_s": "s",
        "cycle_s": "s",
        "energy_J": "J",
        "leakage_power_W": "W",
        "area_m2": "m^2",
        "power_density_W_per_m2": "W/m^2",
    }


def test_units_of_columns():
    assert units_of(["side", "time_s", "value_SI", "unit"]) == {
        "time_s": "s",
        "value_SI": "SI unit of the column 'unit'",
    }
    assert units_of(["value", "low"]) == {}
    assert units_of(["published_SI", "unit_of_source"]) == {"published_SI": "SI unit of the column 'unit_of_source'"}


@pytest.mark.parametrize("name", ["open-7nm-regular", "demo-stress-gated", "demo-stage-table", "wires-roadmap-2022"])
def test_the_frame_of_a_set_is_the_set(name: str):
    found = api.load_set(name)
    frame, item = found.frame, found.parameters
    assert (found.id, found.title, found.nodes) == (item.id, item.title, item.nodes)
    assert len(frame) == sum(value.si.size for value in item.values.values())
    for row in frame.to_dict("records"):
        value = item.values[row["name"]]
        position = item.position(row["node"]) if row["node"] else 0
        assert row["value_SI"] == float(value.si[position])
        assert to_si(Decimal(repr(row["value"])), parse_unit(row["unit"])) == pytest.approx(row["value_SI"], rel=1e-14)
        assert (row["evidence"], row["source"], row["where"]) == (value.evidence, value.source, value.where)
        assert row["set_by"] == ("default" if value.is_default else "user")
        assert value.spread is not None or row["low"] == row["high"] == "no range stated"


# -- what if --------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("number", [0.1, "0.1", Decimal("0.1"), np.float64(0.1), "1e-1"])
def test_a_what_if_number_gives_the_same_bits_however_it_is_written(study_file: Path, number: Any):
    study = api.load_study(study_file)
    before = study.study.values["activity"].si.copy()
    changed = api.what_if(study, activity=number)
    assert float(changed.study.values["activity"].si[0]) == 0.1
    assert changed.study.values["activity"].spread is None
    assert np.array_equal(study.study.values["activity"].si, before)
    assert study.what_if == {}


def test_what_ifs_add_up_and_may_be_named_again(study_file: Path):
    study = api.load_study(study_file)
    first = api.what_if(study, activity=0.1)
    second = api.what_if(first, {"new-switch.on_resistance": 205}, activity=np.int64(1))
    assert second.what_if == {"activity": "1", "new-switch.on_resistance": "205"}
    moved = second.sets["new-switch"].parameters.values["on_resistance"]
    assert [moved.in_unit(float(si)) for si in moved.si] == [205.0] * moved.si.size
    assert first.what_if == {"activity": "0.1"}


@pytest.mark.parametrize("wrong", [True, None, [0.1], np.bool_(True), 1j])
def test_a_what_if_must_be_a_number(study_file: Path, wrong: Any):
    with pytest.raises(UsageError, match="what-if activity: a number is needed"):
        api.what_if(api.load_study(study_file), activity=wrong)


@pytest.mark.parametrize("wrong", ["much", "", "nan", float("nan"), float("inf"), "1\nvalue = 2", "true"])
def test_a_what_if_that_is_no_number_of_a_file_is_refused(study_file: Path, wrong: Any):
    with pytest.raises(InputRefused, match="activity"):
        api.what_if(api.load_study(study_file), activity=wrong)


def test_a_what_if_names_what_there_is(study_file: Path):
    study = api.load_study(study_file)
    with pytest.raises(InputRefused, match="activty: is not a value of the study"):
        api.what_if(study, activty=0.1)
    with pytest.raises(InputRefused, match="there is no such set"):
        api.what_if(study, {"nobody.activity": 0.1})
    with pytest.raises(UsageError, match="names activity twice"):
        api.what_if(study, {"activity": 0.1}, activity=0.2)


# -- loading, checking, listing --------------------------------------------------------------------------------------


def test_sets_of_a_study(study_file: Path):
    study = api.load_study(study_file)
    wanted = {study.study.candidate.technology.id, *(side.technology.id for side in study.study.contenders)}
    assert set(study.sets) == wanted | {item.id for item in study.study.wires_sets}
    assert next(iter(study.sets)) == study.study.candidate.technology.id
    assert (study.id, study.title) == (study.study.id, study.study.title)


def test_check_counts_files_and_finds_problems(study_file: Path, tmp_path: Path):
    fine = api.check(study_file)
    assert (fine.files, fine.problems) == (1, ())
    assert api.check([study_file, study_file.parent / "nodes"]).files > 2
    wrong = tmp_path / "wrong.toml"
    wrong.write_text("schema = 1\n", encoding="utf-8")
    assert {problem.name for problem in api.check([wrong]).problems} >= {"id", "title", "model", "nodes"}


def test_technologies_are_listed_with_those_of_a_folder(study_file: Path):
    frame = api.technologies()
    library = open_library()
    assert list(frame["id"]) == [name for name in library.ids("technologies") if not name.startswith("wires-")]
    assert list(frame.columns) == ["id", "title", "model", "nodes", "flavour", "ambition"]
    for row in frame.sample(5, random_state=1).to_dict("records"):
        item = api.load_set(row["id"]).parameters
        assert (row["title"], row["model"], row["nodes"]) == (item.title, item.model, ", ".join(item.nodes))
        assert row["ambition"] == item.ambition
    more = api.technologies([study_file.parent / "nodes"])
    assert set(more["id"]) == set(frame["id"]) | {"new-switch", "old-switch"}
    assert api.load_set("new-switch", [study_file.parent / "nodes"]).id == "new-switch"


def test_the_worked_study_is_found_from_anywhere(tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    monkeypatch.chdir(tmp_path)
    assert api.worked_study().id == "always-on-hub"
    with pytest.raises(UsageError, match="did you mean 'always-on-hub'"):
        api.worked_study("always-on-hut")


def test_wrong_places_are_named(study_file: Path, result: api.Result, tmp_path: Path):
    with pytest.raises(InputRefused, match="there is no such set"):
        api.load_set("open-7nm-regulr")
    with pytest.raises(InputRefused, match="does not exist"):
        api.load_study(tmp_path / "nothing.toml")
    with pytest.raises(UsageError, match="is not a folder of sets"):
        api.load_study(study_file, [tmp_path / "nothing"])
    with pytest.raises(EvenloadError, match=r"record\.json: does not exist"):
        api.load_result(tmp_path)
    with pytest.raises(EvenloadError, match="cannot be written"):
        result.report(tmp_path / "nowhere" / "page.html")
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine" / "notes.txt").write_text("keep", encoding="utf-8")
    with pytest.raises(EvenloadError, match="is not a record folder"):
        result.save(tmp_path / "mine")
    assert [path.name for path in (tmp_path / "mine").iterdir()] == ["notes.txt"]
