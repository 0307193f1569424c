"""``evenload extract``: a measured transistor read, drawn and written into a set."""

from __future__ import annotations

import csv
import datetime
import hashlib
import io
import json
import shutil
import tomllib
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest

from benchmark import api
from benchmark.errors import InputRefused, UsageError
from benchmark.record.check import check_paths
from benchmark.sets.files import read_toml
from benchmark.sets.history import as_it_was
from benchmark.sets.library import shipped_nodes
from benchmark.sets.problems import Collector
from tests.cli.conftest import Run
from tests.near import near

MEASURED = Path(__file__).parent.parent / "data" / "measured-curves"


NAME = "silicon-45nm-high-performance.toml"


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Measured files in ``data``, a copy of a shipped set in ``nodes/technologies``."""
    shutil.copytree(MEASURED, tmp_path / "data")
    (tmp_path / "nodes" / "technologies").mkdir(parents=True)
    shutil.copy(MEASURED / "sources.toml", tmp_path / "nodes" / "sources.toml")
    shutil.copy(shipped_nodes() / "technologies" / NAME, tmp_path / "nodes" / "technologies" / NAME)
    return tmp_path


def test_the_text_says_what_was_read_and_how_sure(evenload: Run):
    said = evenload("extract", str(MEASURED / "nfet-7um-path-0p1V.toml")).out
    assert "column 3 (ID): current of the switched path in A, divided by the width" in said
    assert "columns left out as declared: IG, IB" in said
    assert "8 reading(s) at or below the floor" in said
    assert "at most" in said
    assert "threshold extrapolated" in said
    assert "scatter of the points" in said
    assert "minimum swing: smallest of 3 local slopes" in said


def test_csv_and_json_give_the_same_numbers(evenload: Run):
    path = str(MEASURED / "nfet-7um-path-1p8V.toml")
    rows = list(csv.DictReader(io.StringIO(evenload("extract", path, "--format", "csv").out)))
    data = json.loads(evenload("extract", path, "--format", "json").out)
    assert [row["quantity"] for row in rows] == [one["quantity"] for one in data["numbers"]]
    for row, one in zip(rows, data["numbers"], strict=True):
        assert float(row["value"]) == one["value"]
        assert (row["standard_uncertainty"] == "") == (one["standard_uncertainty"] is None)
    assert data["digest"] == hashlib.sha256((MEASURED / "nfet-7um-path-1p8V.mdm").read_bytes()).hexdigest()
    on = next(one for one in data["numbers"] if one["name"] == "on_current")
    assert on["value"] == near(3393.0 / 7.0)  # 3.393 mA of 7 um, printed in the file
    off = next(one for one in data["numbers"] if one["name"] == "off_current")
    assert (off["bound"], off["value"]) == ("at-most", near(3.0 / 7.0))
    frame = api.extract(path).frame
    assert frame["value"].tolist() == [one["value"] for one in data["numbers"]]


@pytest.mark.parametrize("ending", ["svg", "pdf", "png"])
def test_the_figure_shows_points_bounds_and_fits(ending: str, evenload: Run, tmp_path: Path):
    place = tmp_path / f"curve.{ending}"
    said = evenload("extract", str(MEASURED / "nfet-7um-path-0p1V.toml"), "--figure", str(place)).out
    assert f"Drawn: {place}" in " ".join(said.split())
    start = place.read_bytes()[:8]
    assert start.startswith({"svg": b"<svg", "pdf": b"%PDF", "png": b"\x89PNG"}[ending])
    words = place.with_suffix(".txt").read_text(encoding="utf-8")
    assert "8 triangles downwards: upper bound at the floor of the instrument" in words
    assert "average swing 99.18 ± 0.89 mV/decade" in words
    if ending == "svg":
        root = ElementTree.fromstring(place.read_text(encoding="utf-8"))
        text = " ".join("".join(item.itertext()) for item in root.iter() if item.tag.endswith("text"))
        assert "current of the switched path per width [A/um]" in text
        assert "voltage of the control terminal [V]" in text
        assert "threshold extrapolated 0.7081 ± 0.0093 V" in text


def test_the_points_of_the_figure_are_those_of_the_file():
    from benchmark.report.curve_figure import curve_figures

    found = api.extract(MEASURED / "nfet-7um-path-0p1V.toml")
    (chart,) = curve_figures(found.curves, found.found).values()
    sweep = found.curves.sweeps[0]
    drawn = {row["a"]: row for row in chart.points}
    assert len(drawn) == 37
    for voltage, si, low in zip(
        sweep.columns["control_voltage"],
        sweep.columns["path_current_per_width"],
        sweep.at_floor["path_current_per_width"],
        strict=True,
    ):
        row = drawn[float(voltage)]
        assert row["b"] == near(3e-9 / 7.0 if low else si * 1e-6, rel=1e-12)
        assert row["what"] == ("upper bound" if low else "reading")


# -- into a set ------------------------------------------------------------------------------------------------


def test_a_set_takes_the_numbers_and_keeps_the_old_ones(folder: Path, evenload: Run):
    path = folder / "nodes" / "technologies" / NAME
    before = read_toml(path, Collector())
    assert before is not None
    description = str(folder / "data" / "nfet-7um-path-1p8V.toml")
    said = evenload(
        "extract", description, "--into", str(path), "--old-date", "2010-01-01", "--reason", "new wafer"
    ).out
    assert "the curves were measured at 300 K, the values of the set hold at 298.15 K" in " ".join(said.split())
    table = tomllib.loads(path.read_text(encoding="utf-8"))["value"]["subthreshold_swing"]
    assert table["value"] == near(93.33506, rel=1e-6)
    assert table["evidence"] == "extracted"
    assert table["source"] == "sky130-raw-data"
    assert table["date"] == datetime.date(2022, 1, 1)
    assert table["spread"] == {"shape": "normal", "sd": 3.78}
    assert table["note"].startswith("Read off nfet-7um-path-1p8V.mdm: subthreshold swing")
    assert "span 0.01 to 3 uA/um" in table["note"]
    digest = hashlib.sha256((folder / "data" / "nfet-7um-path-1p8V.mdm").read_bytes()).hexdigest()
    assert table["extracted_from"] == {"file": "../../data/nfet-7um-path-1p8V.mdm", "digest": digest}
    old = table["superseded"][-1]
    assert old["value"] == float(before.data["value"]["subthreshold_swing"]["value"])
    assert (old["reason"], old["date"]) == ("new wafer", datetime.date(2010, 1, 1))
    off = tomllib.loads(path.read_text(encoding="utf-8"))["value"]["off_current"]
    assert (off["bound"], "spread" in off) == ("at-most", False)
    comments = [line for line in before.text.splitlines() if line.startswith("#")]
    assert all(line in path.read_text(encoding="utf-8") for line in comments)
    shown = evenload("show", "silicon-45nm-high-performance.on_current", "--nodes", folder / "nodes").out
    assert "../../data/nfet-7um-path-1p8V.mdm, sha256" in " ".join(shown.split())
    changes = (folder / "nodes" / "CHANGES.md").read_text(encoding="utf-8")
    assert "subthreshold_swing" in changes
    assert "new wafer" in changes


def test_a_value_that_the_set_does_not_state_is_added(folder: Path):
    path = folder / "nodes" / "technologies" / NAME
    before = path.read_text(encoding="utf-8")
    description = folder / "data" / "nfet-7um-path-1p8V.toml"
    fitted = 'quantity = "fitted_swing"\n'
    told = description.read_text(encoding="utf-8").replace("name = ", "# name = ")
    description.write_text(told.replace(fitted, fitted + 'name = "subthreshold_swing_p"\n'), encoding="utf-8")
    edited = api.extract(description).into(path)
    assert edited.text.startswith(before)
    table = tomllib.loads(path.read_text(encoding="utf-8"))["value"]["subthreshold_swing_p"]
    assert table["value"] == near(92.97421, rel=1e-6)
    assert table["unit"] == "mV/decade"
    assert "superseded" not in table
    assert "subthreshold_swing_p, absent -> 92.9742" in (folder / "nodes" / "CHANGES.md").read_text(encoding="utf-8")
    assert check_paths([path]).problems == ()


def test_a_hero_device_is_named_as_such(folder: Path, evenload: Run):
    path = folder / "nodes" / "technologies" / NAME
    description = folder / "data" / "nfet-7um-path-1p8V.toml"
    told = description.read_text(encoding="utf-8")
    description.write_text(told.replace('where = "nfet', 'hero = true\nwhere = "nfet'), encoding="utf-8")
    said = " ".join(evenload("extract", description, "--into", path, "--old-date", "2010-01-01").out.split())
    assert "holds a hero device: one chosen sample, not a typical one" in said
    warned = [str(one) for one in check_paths([path]).warnings]
    assert sum("was read off a hero device: one chosen sample, not a typical one" in one for one in warned) == 3
    note = tomllib.loads(path.read_text(encoding="utf-8"))["value"]["on_current"]["note"]
    assert "a hero device, not a typical one" in note


def test_check_says_when_the_data_changed(folder: Path, evenload: Run):
    path = folder / "nodes" / "technologies" / NAME
    api.extract(folder / "data" / "nfet-7um-path-1p8V.toml").into(path, old_date="2010-01-01")
    first = check_paths([path])
    assert first.problems == ()
    assert [str(one) for one in first.warnings if "have changed" in str(one)] == []
    raw = folder / "data" / "nfet-7um-path-1p8V.mdm"
    raw.write_bytes(raw.read_bytes().replace(b"0.003393", b"0.003394"))
    second = check_paths([path])
    changed = [str(one) for one in second.warnings if "have changed" in str(one)]
    assert len(changed) == 3
    assert changed[0].endswith("read the number off again: evenload extract")
    raw.unlink()
    assert [str(one) for one in check_paths([path]).warnings if "have changed" in str(one)] == []


def test_the_past_state_is_the_old_set_and_a_later_number_lets_the_file_go(folder: Path):
    path = folder / "nodes" / "technologies" / NAME
    before = tomllib.loads(path.read_text(encoding="utf-8"))["value"]["on_current"]
    api.extract(folder / "data" / "nfet-7um-path-1p8V.toml").into(path, old_date="2010-01-01")
    edited = api.supersede(
        path, "on_current", 512, unit="uA/um", evidence="assumed", source="sky130-raw-data", where="-", conditions="-",
        date="2026-11-30", reason="rounded", spread="none", note="by eye",
    )  # fmt: skip
    now = tomllib.loads(edited.text)["value"]["on_current"]
    assert "extracted_from" not in now
    assert now["superseded"][-1]["extracted_from"]["file"] == "../../data/nfet-7um-path-1p8V.mdm"
    collector = Collector()
    file = read_toml(path, collector)
    assert file is not None
    then = as_it_was(file, datetime.date(2015, 1, 1), collector)
    between = as_it_was(file, datetime.date(2024, 1, 1), collector)
    assert then is not None
    assert between is not None
    assert float(then.data["value"]["on_current"]["value"]) == before["value"]
    assert "extracted_from" not in then.data["value"]["on_current"]
    assert between.data["value"]["on_current"]["extracted_from"]["file"].endswith("nfet-7um-path-1p8V.mdm")
    assert collector.problems == []


def test_a_trial_writes_nothing_and_invented_data_stay_invented(folder: Path, evenload: Run):
    path = folder / "nodes" / "technologies" / NAME
    text = path.read_bytes()
    description = folder / "data" / "nfet-7um-path-1p8V.toml"
    said = evenload("extract", str(description), "--into", str(path), "--old-date", "2010-01-01", "--dry-run").out
    assert "Nothing was written: this was a trial." in said
    assert path.read_bytes() == text
    told = description.read_text(encoding="utf-8").replace('evidence = "published"', 'evidence = "invented"')
    description.write_text(told, encoding="utf-8")
    edited = api.extract(description).into(path, old_date="2010-01-01", write=False)
    assert tomllib.loads(edited.text)["value"]["on_current"]["evidence"] == "invented"


def test_what_cannot_go_into_a_set_is_refused(folder: Path, evenload: Run):
    path = folder / "nodes" / "technologies" / NAME
    description = folder / "data" / "nfet-7um-path-1p8V.toml"
    told = description.read_text(encoding="utf-8")

    def refused(text: str) -> str:
        description.write_text(text, encoding="utf-8")
        with pytest.raises(InputRefused) as caught:
            api.extract(description).into(path, old_date="2010-01-01", write=False)
        return str(caught.value)

    assert "does not say on which day the curves were measured" in refused(told.replace("date = 2022-01-01\n", ""))
    level = 'quantity = "threshold_at_current"\n'
    assert "is not stated in the set" in refused(told.replace(level, level + 'name = "closing_voltage"\n'))
    said = refused(told.replace('name = "on_current"', 'name = "effective_current_p"'))
    assert "value.effective_current_p: and channel_mobility_p fix the same thing" in said
    both = told.replace('quantity = "fitted_swing"\n', 'quantity = "fitted_swing"\nname = "subthreshold_swing"\n')
    assert "names a value that another request gives too; found subthreshold_swing" in refused(both)
    mixed = both.replace('name = "subthreshold_swing"\n', 'name = "subthreshold_swing"\nnode = "n45"\n', 1)
    assert "gives one number for all nodes beside numbers for some" in refused(mixed)
    torn = told.replace('name = "on_current"\n', 'name = "off_current"\nnode = "n45"\n').replace(
        'name = "off_current"\nat', 'name = "off_current"\nnode = "n46"\nat'
    )
    assert "gives a bound for one node and a number for another" in refused(torn)
    description.write_text(told.replace("name = ", "# name = "), encoding="utf-8")
    with pytest.raises(UsageError, match="no request names a value of a set"):
        api.extract(description).into(path)


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (["--reason", "x"], "--reason: only with --into"),
        (["--dry-run", "--old-date", "2010-01-01"], "--old-date, --dry-run: only with --into"),
        (["--figure", "curve.jpg"], "--figure: 'curve.jpg' does not end in .svg, .pdf or .png"),
        (["--format", "xml"], "--format: 'xml' is not one of text, csv, json"),
    ],
)
def test_wrong_use_is_said_in_one_line(options: list[str], said: str, evenload: Run):
    found = evenload("extract", str(MEASURED / "nfet-7um-path-0p1V.toml"), *options)
    assert found.status == 2
    assert said in found.err


def test_nothing_is_written_when_the_figure_cannot_be(folder: Path, evenload: Run):
    path = folder / "nodes" / "technologies" / NAME
    text = path.read_bytes()
    into = ["--into", str(path), "--old-date", "2010-01-01"]
    description = str(folder / "data" / "nfet-7um-path-1p8V.toml")
    assert evenload("extract", description, *into, "--figure", "x.gif").status == 2
    assert evenload("extract", description, *into, "--figure", "absent/x.svg").status == 3
    assert path.read_bytes() == text


def test_a_day_that_is_none_is_refused(folder: Path):
    found = api.extract(folder / "data" / "nfet-7um-path-1p8V.toml")
    path = folder / "nodes" / "technologies" / NAME
    with pytest.raises(UsageError, match="a day such as 2026-01-31 is needed, found 'soon'"):
        found.into(path, old_date="soon")


def test_several_columns_have_a_figure_each(tmp_path: Path):
    raw = tmp_path / "two.csv"
    v = np.linspace(0.0, 0.6, 7)
    raw.write_text("V,I,C\n" + "".join(f"{x:.1f},{1e-9 * 10 ** (x / 0.1):.6e},{1.0 + x:.3f}\n" for x in v))
    (tmp_path / "two.toml").write_text(
        'schema = 1\nkind = "curves"\nfile = "two.csv"\nalong = "control_voltage"\nevidence = "invented"\n'
        'source = "invented"\nconditions = "-"\nfixed = { temperature = { value = 300, unit = "K" } }\n'
        '[[column]]\nheader = "V"\nmeaning = "control_voltage"\nkind = "axis"\nunit = "V"\n'
        '[[column]]\nheader = "I"\nmeaning = "path_current"\nkind = "value"\nunit = "A"\n'
        '[[column]]\nheader = "C"\nmeaning = "input_capacitance"\nkind = "value"\nunit = "fF"\n'
        '[[extract]]\nquantity = "current"\nat = { value = 0.25, unit = "V" }\n'
        '[[extract]]\nquantity = "switching_charge"\nspan = { low = 0.05, high = 0.55, unit = "V" }\n'
    )
    found = api.extract(tmp_path / "two.toml")
    assert [path.name for path in found.figure(tmp_path / "x.svg")] == ["x-path-current.svg", "x-input-capacitance.svg"]
    assert found.found[1].value == near(1e-15 * (0.5 + 0.5 * (0.55**2 - 0.05**2)))
