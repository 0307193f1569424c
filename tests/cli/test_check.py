"""``evenload check``: everything wrong in one pass, by file and line, whatever is put in."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from tests.cli.conftest import Run
from tests.refusals import CIRCUIT, SOURCES, STAGES, TECHNOLOGY, WIRES, cases
from tests.studies import mixed


def test_what_is_fine(tmp_path: Path, evenload: Run):
    mixed().write(tmp_path)
    ran = evenload("check", "study.toml", "nodes")
    assert (ran.status, ran.out, ran.err) == (0, "4 file(s) fine\n", "")


def test_warnings_do_not_refuse(tmp_path: Path, evenload: Run):
    (tmp_path / "switch.toml").write_text(TECHNOLOGY.replace('value = 0.25\nunit = "fF"', 'value = 5.0\nunit = "pF"'))
    ran = evenload("check", "switch.toml")
    assert (ran.status, ran.out) == (0, "1 file(s) fine, 1 warning(s)\n")
    assert ran.err == (
        "warning: switch.toml:25: value.input_capacitance.value: is outside the usual range; found 5 pF; allowed: "
        "usually 0.001 to 1000 fF\n"
    )


def test_all_problems_of_all_files_in_one_pass(tmp_path: Path, evenload: Run):
    (tmp_path / "switch.toml").write_text(
        TECHNOLOGY.replace("value = 0.7", 'value = "n/a"').replace('unit = "Mohm"', 'unit = "MV"')
    )
    (tmp_path / "lines.toml").write_text(WIRES.replace("value = 50.0", "value = -50.0"))
    (tmp_path / "word-line.toml").write_text(CIRCUIT.replace("nand2", "nand20"))
    (tmp_path / "sources.toml").write_text(SOURCES.replace("2026", '"soon"'))
    ran = evenload("check", ".")
    assert ran.status == 3
    assert ran.out == ""
    head, *lines = ran.err.splitlines()
    assert head == "evenload: input refused, 5 problem(s); nothing was run"
    assert [re.match(r"  (\S+:\d+): (\S+): ", line).groups() for line in lines] == [  # type: ignore[union-attr]
        ("lines.toml:10", "value.wire_resistance_per_length.value"),
        ("sources.toml:5", "film-batch.year"),
        ("switch.toml:21", "value.off_resistance.unit"),
        ("switch.toml:23", "value.switching_level.value"),
        ("word-line.toml:11", "net.0.loads"),
    ]


def test_every_spoiled_file_gives_its_message(tmp_path: Path, evenload: Run):
    """Hundreds of bad files at once: each named with its line, none stops the others."""
    spoiled = [case for _, case in cases() if case.kind == "technology" and case.refused]
    assert len(spoiled) > 90
    expected = set()
    for number, case in enumerate(spoiled):
        folder = tmp_path / f"{number}"
        folder.mkdir()
        (folder / "switch.toml").write_text(str(case.spoiled()["switch.toml"]), encoding="utf-8")
        expected |= {line.replace("switch.toml", f"{number}/switch.toml", 1) for line in case.refused}
    ran = evenload("check", ".")
    assert ran.status == 3
    lines = ran.err.splitlines()
    start = lines.index(f"evenload: input refused, {len(expected)} problem(s); nothing was run")
    assert all(line.startswith("warning: ") for line in lines[:start])
    shown = {line.removeprefix("  ") for line in lines[start + 1 : start + 41]}
    assert shown <= expected
    assert len(shown) == 40
    assert lines[start + 41 :] == [f"  ... and {len(expected) - 40} more"]


@pytest.mark.parametrize(
    ("make", "message"),
    [
        (lambda path: None, "does not exist"),
        (lambda path: path.mkdir(), "has no TOML file"),
        (lambda path: path.write_bytes(b""), "is empty"),
        (lambda path: path.write_bytes(b"\x89PNG\r\n\x1a\n\x00"), "is not UTF-8 text; found byte 0x89 at 0"),
        (lambda path: path.symlink_to("/dev/zero"), "is not a regular file"),
        (lambda path: path.symlink_to(path), "does not exist"),
        (lambda path: path.write_text("x = " + "[" * 20_000), "is not usable TOML (RecursionError)"),
    ],
)
@pytest.mark.parametrize("name", ["set.toml", "Größe μ.toml", "with space.toml", "-x.toml"])
def test_what_is_no_set(make: object, message: str, name: str, tmp_path: Path, evenload: Run):
    make(tmp_path / name)  # type: ignore[operator]
    ran = evenload("check", "--", name)
    assert ran.status == 3
    assert ran.err == f"evenload: input refused, 1 problem(s); nothing was run\n  {name}: {message}\n"


def test_a_name_in_a_file_cannot_steer_the_terminal(tmp_path: Path, evenload: Run):
    (tmp_path / "switch.toml").write_text(TECHNOLOGY + '["\\u001b[31mred\\u202e"]\nx = 1\n', encoding="utf-8")
    ran = evenload("check", "switch.toml")
    assert ran.status == 3
    assert "red" in ran.err
    assert not re.search("[\x00-\x09\x0b-\x1f\u202e]", ran.err)


def test_a_folder_of_sets_that_is_none(tmp_path: Path, evenload: Run):
    (tmp_path / "switch.toml").write_text(TECHNOLOGY)
    ran = evenload("check", "switch.toml", "--nodes", "nowhere")
    assert (ran.status, ran.out, ran.err) == (2, "", "evenload: --nodes: nowhere is not a folder\n")


def test_a_study_is_checked_with_its_sets_and_their_physics(tmp_path: Path, evenload: Run):
    inputs = mixed()
    inputs.sets["technologies/new-switch"]["value"]["off_resistance"] = {"value": 1, "unit": "kohm", "unusual": True}
    inputs.write(tmp_path)
    ran = evenload("check", "study.toml")
    assert ran.status == 3
    assert "nodes/technologies/new-switch.toml" in ran.err
    assert "value.off_resistance: is not above the on-resistance" in ran.err


def test_sets_beside_the_folders_of_a_root_are_checked_with_the_sources_of_that_root(tmp_path: Path, evenload: Run):
    (tmp_path / "technologies").mkdir()
    text = STAGES.replace('source = "invented"', 'source = "film-batch"')
    (tmp_path / "technologies" / "stages.toml").write_text(text)
    assert "is not a known source" in evenload("check", "technologies/stages.toml").err
    (tmp_path / "sources.toml").write_text(SOURCES)
    assert evenload("check", "technologies/stages.toml").status == 0


def test_what_ships_is_fine(evenload: Run):
    from benchmark.sets.library import shipped_nodes

    assert evenload("check", shipped_nodes()).status == 0
