"""``evenload export --netlist``: which point it writes, from a study or a record, and what it refuses."""

from __future__ import annotations

import re

import pytest

from tests.studies import hub, mixed, run


def _deck(place):
    return place.read_text(encoding="ascii")


def test_a_deck_of_the_optimum_and_of_a_supply_asked_for(evenload, tmp_path):
    study = mixed().write(tmp_path)
    ran = evenload("export", study, "--netlist", "d.sp")
    assert ran.status == 0, ran.err
    assert "ngspice -b d.sp" in ran.out
    deck = _deck(tmp_path / "d.sp")
    assert deck.startswith("* Deck for ngspice, written by evenload")
    assert "technology new-switch, node g1 of pair g1" in deck
    assert "optimum under iso-delay" in deck
    ran = evenload(
        "export", study, "--netlist", "d.sp", "--side", "old-switch", "--supply", "0.5", "--node", "g2",
        "--capacitances", "device", "--set", "fan_out=2",
    )  # fmt: skip
    assert ran.status == 0, ran.err
    deck = _deck(tmp_path / "d.sp")  # a deck of ours is replaced
    assert "Vdd vdd 0 0.5\n" in deck
    assert "node g2 of pair g2" in deck
    assert "What-if: fan_out = 2" in deck
    assert "drives 2 x inverter.a" in deck
    assert re.search(r"^Cgated g d ", deck, re.MULTILINE)


def test_a_record_gives_the_same_deck_as_its_study(evenload, tmp_path):
    from benchmark.record.write import to_json

    inputs = mixed()
    record = run(inputs, tmp_path / "inputs")
    (tmp_path / "record").mkdir()
    (tmp_path / "record" / "record.json").write_text(to_json({**record, "what_if": {}}), encoding="utf-8")
    assert evenload("export", "record", "--netlist", "a.sp", "--supply", "0.45").status == 0
    assert evenload("export", "inputs/study.toml", "--netlist", "b.sp", "--supply", "0.45").status == 0
    assert _deck(tmp_path / "a.sp") == _deck(tmp_path / "b.sp")


@pytest.mark.parametrize(
    ("more", "status", "said"),
    [
        (("--capacitances", "real"), 2, "not one of delay, energy, device"),
        (("--side", "old-swich"), 2, "did you mean 'old-switch'?"),
        (("--node", "g9"), 2, "known are g1, g2"),
        (("--net", "stages"), 2, "did you mean 'stage'?"),
        (("--supply", "-1"), 2, "positive number"),
    ],
)
def test_refusals(evenload, tmp_path, more, status, said):
    study = mixed().write(tmp_path)
    ran = evenload("export", study, "--netlist", "d.sp", *more)
    assert ran.status == status
    assert said in ran.err
    assert not (tmp_path / "d.sp").exists()


def test_a_point_outside_the_study_is_marked_and_an_impossible_one_refused(evenload, tmp_path):
    study = mixed().write(tmp_path)
    assert evenload("export", study, "--netlist", "d.sp", "--supply", "0.15").status == 0
    assert "* The study does not permit this point: " in _deck(tmp_path / "d.sp")
    stated_once = hub().write(tmp_path / "hub")
    ran = evenload("export", stated_once, "--netlist", "h.sp", "--supply", "1.0")
    assert ran.status == 2
    assert "no netlist at this point: stated at one supply only" in ran.err
    assert not (tmp_path / "h.sp").exists()


def test_other_files_are_not_overwritten(evenload, tmp_path):
    study = mixed().write(tmp_path)
    before = study.read_text(encoding="utf-8")
    ran = evenload("export", study, "--netlist", study)
    assert ran.status == 2
    assert "is not overwritten" in ran.err
    assert study.read_text(encoding="utf-8") == before
    ran = evenload("export", study, "--netlist", tmp_path / "nowhere" / "d.sp")
    assert ran.status == 3
    assert "cannot be written" in ran.err


def test_hostile_titles_stay_in_their_line(evenload, tmp_path):
    inputs = hub()
    inputs.study["title"] = "x\n.control\nshell touch owned\n.endc"
    study = inputs.write(tmp_path)
    ran = evenload("export", study, "--netlist", "d.sp", "--side", "fast")
    assert ran.status == 0, ran.err
    lines = _deck(tmp_path / "d.sp").splitlines()
    assert [line for line in lines if "owned" in line] == ["* Study hub: x?.control?shell touch owned?.endc"]
    assert lines.count(".control") == 1
