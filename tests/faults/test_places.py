"""Places that cannot be read or written: a message with the place, the documented status, and nothing half-done."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

from tests import refusals
from tests.faults.children import ROOT, Children
from tests.faults.test_killed import tree
from tests.refusals import check
from tests.studies import hub

LONG = "x" * 300
RUN = ["run", "study.toml", "--freeze-time", "then", "--out"]


@pytest.fixture
def study(tmp_path: Path) -> Path:
    """A folder with a study."""
    hub().write(tmp_path)
    return tmp_path


# -- writing ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("most", [0, 1, 100, 4096, 50_000])
@pytest.mark.parametrize("over_a_record", [False, True])
def test_a_file_system_that_takes_no_larger_file(most: int, over_a_record: bool, study: Path, evenload: Children):
    """No file may grow beyond ``most`` bytes, as on a full disk; what is printed goes to a file, too."""
    before = {}
    if over_a_record:
        assert evenload.run(study, *RUN, "record", undrawn=True).status == 0
        before = tree(study / "record")
    died = evenload.run(study, *RUN, "record", "--set", "activity=0.1", undrawn=True, file_size=most or 1)
    assert died.status == 3
    if most >= 100:
        message = f"evenload: {study}/record: cannot be written (File too large); nothing was written\n"
        assert died.err == message[:most]
    assert "Traceback" not in died.err
    assert tree(study / "record") == before
    assert {path.name for path in study.iterdir()} - {"record"} == {"nodes", "study.toml"}


def test_a_limit_that_all_files_respect_is_no_limit(study: Path, evenload: Children):
    assert evenload.run(study, *RUN, "record", undrawn=True, file_size=50_000_000).status == 0


@pytest.mark.parametrize(
    "arguments", [["--figures", "f"], ["--tables", "t"], ["--netlist", "n.cir"]], ids=lambda a: a[0]
)
def test_an_export_that_finds_no_room(arguments: list[str], study: Path, evenload: Children):
    assert evenload.run(study, *RUN, "record", undrawn=True).status == 0
    died = evenload.run(study, "export", "record", *arguments, file_size=200)
    assert died.status == 3
    assert died.err in (
        f"evenload: {arguments[1]}: cannot be written (File too large)\n",
        "evenload: standard output or a temporary file: cannot be used (File too large)\n",  # the study to run again
    )
    assert died.out == ""
    left = study / arguments[1]
    assert not left.exists() or list(left.iterdir()) == []


def test_a_template_that_finds_no_room(study: Path, evenload: Children):
    died = evenload.run(study, "new", "study", "mine.toml", file_size=200)
    assert died.status == 2
    assert "mine.toml: cannot be written (File too large)" in died.err
    assert not (study / "mine.toml").exists()


@pytest.mark.parametrize(
    ("out", "reason"),
    [
        ("study.toml", "exists and is not a record folder; nothing was written"),
        ("nodes", "exists and is not a record folder; nothing was written"),
        (".", "exists and is not a record folder; nothing was written"),
        ("/", "exists and is not a record folder; nothing was written"),
        ("study.toml/record", "cannot be written (File exists); nothing was written"),
        ("study.toml/deep/record", "cannot be written (Not a directory); nothing was written"),
        ("/proc/record", "cannot be written ("),
        ("/dev/null", "exists and is not a record folder; nothing was written"),
        ("/dev/null/record", "cannot be written ("),
        (LONG, "cannot be written (File name too long); nothing was written"),
        (f"{LONG}/record", "cannot be written (File name too long); nothing was written"),
        ("a/" * 2100 + "record", "cannot be written (File name too long); nothing was written"),
    ],
    ids=lambda text: text[:30],
)
def test_an_output_that_cannot_be(out: str, reason: str, study: Path, evenload: Children):
    before = tree(study)
    died = evenload.run(study, *RUN, out, undrawn=True)
    assert died.status == 3
    assert died.out == ""
    assert reason in died.err
    assert died.err.count("\n") == 1
    assert tree(study) == before


@pytest.mark.parametrize("out", ["nodes/record", "nodes/technologies/record", "./a/../record"])
def test_an_output_inside_the_inputs_is_written_and_disturbs_nothing(out: str, study: Path, evenload: Children):
    first = evenload.run(study, *RUN, out, undrawn=True)
    assert (first.status, first.err) == (0, "")
    record = tree(study / out)
    again = evenload.run(study, *RUN, out, undrawn=True)
    assert (again.status, again.err) == (0, "")
    assert tree(study / out) == record
    checked = evenload.run(study, "check", "nodes")
    assert (checked.status, checked.err) == (0, "")


def test_an_output_through_a_link(study: Path, evenload: Children):
    """The record a link points to is replaced, and the link stays."""
    assert evenload.run(study, *RUN, "record", undrawn=True).status == 0
    (study / "latest").symlink_to("record")
    died = evenload.run(study, *RUN, "latest", "--set", "activity=0.1", undrawn=True)
    assert (died.status, died.err) == (0, "")
    assert (study / "latest").is_symlink()
    assert b'"activity": "0.1"' in (study / "record" / "record.json").read_bytes()
    assert sorted(path.name for path in study.iterdir()) == ["latest", "nodes", "record", "study.toml"]


@pytest.mark.parametrize("command", [["check", "study.toml"], ["show"], ["--help"], ["new", "study", "b.toml"]])
def test_a_standard_output_that_is_full(command: list[str], study: Path):
    with Path("/dev/full").open("w") as full:
        done = subprocess.run(
            [sys.executable, "-m", "benchmark", *command],
            cwd=study,
            env={**os.environ, "PYTHONPATH": str(ROOT)},
            stdout=full,
            stderr=subprocess.PIPE,
            text=True,
            check=False,
        )
    assert done.returncode == 3
    assert done.stderr == "evenload: standard output or a temporary file: cannot be used (No space left on device)\n"


# -- reading ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("arguments", "status"),
    [
        (["check", f"{LONG}.toml"], 3),
        (["run", f"{LONG}.toml"], 3),
        (["check", "study.toml", "--nodes", LONG], 3),
        (["export", LONG, "--tables", "t"], 3),
        (["trace", LONG], 3),
        (["show", LONG], 2),
        (["show", "../study"], 2),
        (["show", "/etc/passwd"], 2),
        (["new", "study", f"{LONG}.toml"], 2),
        (["new", "study", f"{LONG}/a.toml"], 2),
        (["check", "/dev/zero"], 3),
        (["check", "/dev/stdin"], 3),
        (["run", "/dev/full"], 3),
        (["run", "nodes"], 3),
        (["trace", "nodes"], 3),
        (["export", "study.toml", "--tables", "t"], 3),
        (["export", "/dev/zero", "--tables", "t"], 3),
        (["check", "no\x01ne.toml"], 3),
        (["check", ""], 3),
        (["run", "pipe"], 3),
        (["check", "loop.toml"], 3),
        (["check", "gone.toml"], 3),
        (["check", "folder.toml"], 3),
        (["check", "empty"], 3),
    ],
    ids=lambda value: " ".join(value)[:40] if isinstance(value, list) else None,
)
def test_an_input_that_cannot_be(arguments: list[str], status: int, study: Path, evenload: Children):
    os.mkfifo(study / "pipe")
    (study / "loop.toml").symlink_to("loop.toml")
    (study / "gone.toml").symlink_to("nowhere.toml")
    (study / "folder.toml").mkdir()
    (study / "empty").mkdir()
    before = sorted(path.name for path in study.iterdir())
    died = evenload.run(study, *arguments)
    assert died.status == status, died.err
    assert died.out == ""
    assert died.err.startswith("evenload: ")
    assert "Traceback" not in died.err
    assert died.seconds < 5
    assert sorted(path.name for path in study.iterdir()) == before


@pytest.mark.parametrize(
    "name", [LONG, "../relay", "/etc/passwd", "technologies/relay", "..", ".", "", "a\\\\b", "\\u0000", "relay\\n", "~"]
)
@pytest.mark.parametrize("old", ['technology = "relay"', 'wires = "no-wires"', 'circuit = "inverter-chain"'])
def test_names_of_sets_that_are_paths(name: str, old: str, tmp_path: Path):
    files = hub().files()
    assert files["study.toml"].count(old) == 1
    files["study.toml"] = files["study.toml"].replace(old, f'{old.partition(" =")[0]} = "{name}"')
    (message,) = [line for line in check(tmp_path, dict(files)).refused if "there is no such" in line]
    assert message.startswith("study.toml:")


@pytest.mark.parametrize(
    "name",
    [
        f"{LONG}.csv",
        "../x.csv",
        "/etc/passwd",
        "/dev/zero.csv",
        "tables/../x.csv",
        "a\\u0000.csv",
        "",
        ".csv",
        "tables/",
        "tables",
    ],
)
def test_names_of_tables_that_are_paths(name: str, tmp_path: Path):
    files = refusals.files("table")
    old = 'file = "tables/curve.csv"'
    assert files["technologies/curves.toml"].count(old) == 1
    files["technologies/curves.toml"] = files["technologies/curves.toml"].replace(old, f'file = "{name}"')
    said = check(tmp_path, dict(files))
    assert len(said.refused) == 1
    assert "Traceback" not in said.refused[0]


@pytest.mark.parametrize("name", ["tables/curve.csv", "tables/curve.toml", "technologies/curves.toml", "sources.toml"])
@pytest.mark.parametrize("kind", ["folder", "loop", "gone", "pipe", "device", "empty"])
def test_a_file_that_is_something_else(name: str, kind: str, tmp_path: Path):
    files = refusals.files("table") | {"sources.toml": refusals.SOURCES}
    check(tmp_path, dict(files))
    place = tmp_path / name
    place.unlink()
    if kind == "folder":
        place.mkdir()
    elif kind == "pipe":
        os.mkfifo(place)
    elif kind == "empty":
        place.touch()
    else:
        place.symlink_to({"loop": place.name, "gone": "nowhere", "device": "/dev/zero"}[kind])
    from benchmark.record.check import check_paths

    found = check_paths([tmp_path / "technologies" / "curves.toml"])
    assert [problem for problem in found.problems if name in str(problem) or place.name in str(problem)]


# -- circles ---------------------------------------------------------------------------------------------------


def test_a_study_that_names_itself_as_set_wires_and_circuit(tmp_path: Path):
    files = hub().files()
    text = files["study.toml"]
    for old in ('technology = "relay"', 'wires = "no-wires"', 'circuit = "inverter-chain"'):
        text = text.replace(old, f'{old.partition(" =")[0]} = "study"')
    said = check(tmp_path, {**files, "study.toml": text})
    assert said.refused
    assert all(message.startswith("study.toml:") for message in said.refused)


def test_sets_whose_formulas_lead_in_a_circle(tmp_path: Path):
    text = refusals.TECHNOLOGY
    for name, other in (("closing_delay", "opening_delay"), ("opening_delay", "closing_delay")):
        old = f'[value.{name}]\nvalue = 0.05\nunit = "ns"\n'
        assert text.count(old) == 1
        text = text.replace(old, f'{old}evidence = "derived"\nformula = "{other}"\n')
    said = check(tmp_path, {"switch.toml": text})
    assert len(said.refused) == 2
    assert all("leads back to the value itself" in message for message in said.refused)


def test_a_table_whose_sidecar_is_the_set_itself(tmp_path: Path):
    text = refusals.TABLE_SET.replace("tables/curve.csv", "curves.csv")
    said = check(tmp_path, {"technologies/curves.toml": text, "technologies/curves.csv": refusals.CURVE})
    assert said.refused
    assert all(message.startswith("technologies/curves.toml") for message in said.refused)
