"""The sections on ladders and robustness: every rung and cell, symbols against M and 1, the declared cell, reasons."""

from __future__ import annotations

from decimal import Decimal as D
from typing import Any

import pytest

from benchmark.record.ratio_only import ratio_only
from benchmark.report.blocks import Section, Table
from benchmark.report.section_question import question
from benchmark.report.section_strength import ladder, robustness
from benchmark.report.tables import plain_tables
from tests.comparisons import record as record_of
from tests.comparisons import side, steep, study
from tests.report_records import changed, hub, mixed
from tests.studies import v
from tests.unit.test_mitigations import DEADLINE, GATE, with_bias, with_copies


def tables(section: Section) -> list[Table]:
    return [block for block in section.blocks if isinstance(block, Table)]


def test_every_rung_is_shown_with_its_turn():
    reference, candidate = tables(ladder(hub()))
    assert [row[0].text for row in reference.rows] == [rung["name"] for rung in hub()["ladder"][0]["rungs"]]
    assert [row[1].text for row in reference.rows] == ["▲ 15", "▲ 15", *["▼ 0.42"] * 5]
    assert [row[1].small for row in reference.rows] == ["", "", "the required advantage is lost here", *[""] * 4]
    assert [row[0].small == "" for row in reference.rows] == [True, False, True, *[False] * 4]
    assert [row[2].text for row in reference.rows] == ["fast", "fast", *["low-leakage"] * 5]
    assert {row[1].text for row in candidate.rows} == {"▼ 0.42"}
    assert "the candidate keeps all of its own" in reference.caption
    assert "the reference keeps all of its own" in candidate.caption


def test_choices_of_a_rung_are_told():
    def change(record: dict[str, Any]) -> None:
        record["ladder"][0]["rungs"][-1] |= {"copies": 4.0, "back_bias": -0.3, "gated": True}
        record["ladder"][0]["rungs"][-2] |= {"advantage": None, "why": "fast: too slow", "side": ""}

    reference = tables(ladder(changed(hub(), change)))[0]
    assert reference.rows[-1][4].text.replace("\u00a0", " ").replace("\u202f", " ") == (
        "4 copies, back bias −0.3 V and gated while idle"
    )
    assert reference.rows[-2][1].text == "infeasible: fast: too slow"
    assert [cell.text for cell in reference.rows[-2][2:4]] == ["–", "–"]


@pytest.mark.parametrize("record", [hub, mixed])
def test_every_cell_is_shown_once_and_the_declared_one_is_marked(record):
    found = record()
    shown = [cell for table in tables(robustness(found)) for row in table.rows for cell in row[1:]]
    assert len(shown) == len(found["robustness"]["cells"])
    assert [cell.small for cell in shown].count("fixed before the run") == 1
    numbers = [cell["advantage"] for cell in found["robustness"]["cells"]]
    assert [cell.text[0] for cell in shown].count("▲") == found["robustness"]["reaching"]
    assert sum((cell.text == "infeasible" and bool(cell.small)) for cell in shown) == numbers.count(None)
    assert sum(cell.text[0] in "▲■" for cell in shown) == found["robustness"]["better"]


def test_a_ratio_only_record_shows_the_same_advantages():
    found = mixed()
    for section in (ladder, robustness):
        here, there = (tables(section(record)) for record in (found, ratio_only(found)))
        for one, other in zip(here, there, strict=True):
            assert [row[1].text for row in one.rows] == [row[1].text for row in other.rows]


def test_a_record_made_before_there_were_such_tables_says_so():
    def change(record: dict[str, Any]) -> None:
        del record["ladder"], record["robustness"]

    found = changed(hub(), change)
    assert tables(ladder(found)) == []
    assert tables(robustness(found)) == []
    assert any("no table of robustness" in getattr(block, "text", "") for block in robustness(found).blocks)


def test_copies_and_back_bias_pass_through_record_page_and_tables():
    """One side may be copied, the other biased; both pay for what they use."""
    copied = with_copies("a", 0.3, 0.9, [1, 2], gating=GATE)
    biased = with_bias(side("b", 0.3, 0.9, gating=GATE), [-0.3, 0.0], 0.1, 0.001)
    values = {"clock_frequency": v(D("100.0"), "MHz"), "idle_time": v(D("0.002"), "s"), "active_cycles": v(500)}
    found = record_of(
        study(
            copied, [biased], [steep("a"), steep("b")], timing="clocked", accounting="period", idle="gated",
            values=values, requirements=DEADLINE, points=21, refine=1e-4,
        )
    )  # fmt: skip
    assert {row["name"] for row in found["conventions"]} >= {"parallel copies", "back bias", "power gating", "ladder"}
    assert {row["key"] for row in found["ledger"]} >= {
        "candidate.mitigation.routing_overhead", "candidate.mitigation.area_share",
        "contender b.mitigation.body_factor", "contender b.mitigation.back_bias_power",
    }  # fmt: skip
    candidate, contender = found["sides"]
    assert (candidate["copies"], candidate["back_biases"]) == ([1.0, 2.0], [0.0])
    assert (contender["copies"], contender["back_biases"]) == ([1.0], [-0.3, 0.0])
    # curves of one size and threshold shift are drawn once, with copies and bias as chosen
    assert len(found["curves"]) == 2
    chosen = found["policies"][0]["contenders"][0]["point"]
    assert chosen["back_bias"] in (-0.3, 0.0)
    (sides,) = [block for block in question(found).blocks if isinstance(block, Table) and block.key == "sides"]
    assert sides.columns[-2:] == ("parallel copies", "back biases")
    assert sides.rows[0][-2].text == "1 and 2"
    assert plain_tables(found)["sides"][1]["back_biases_V"] == "-0.3; 0.0"
    ratios = ratio_only(found)
    assert ratios["ladder"][0]["rungs"][-1]["advantage"] == found["verdict"]["advantage"]
    assert "back_biases" not in ratios["sides"][1]
