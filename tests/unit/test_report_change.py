"""What changed since an earlier record, in the report: picture, waterfall, tables, banners; the numbers of the text."""

from __future__ import annotations

import csv
import functools
import html
import io
import json
import math
import re
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import pytest

from benchmark.record.changes.words import (
    PLAIN,
    chain_table,
    change_lines,
    change_rows,
    input_table,
    link_table,
    part_tables,
    result_table,
    result_words,
)
from benchmark.record.ratio_only import ratio_only
from benchmark.report.change_parts import change_parts
from benchmark.report.change_picture import change_picture
from benchmark.report.charts import charts
from benchmark.report.figure import checked
from benchmark.report.folder import fill_folder, report_page
from benchmark.report.publish import COLUMN, figures_for_print
from benchmark.report.section_change import PAGE, change_sentence, changed
from benchmark.report.tables import tables
from benchmark.report.trails import trail
from tests.near import near
from tests.report_records import changed as altered
from tests.report_records import hostile, mixed, remeasured

KEYS = ("change-picture", "change-parts")


@functools.cache
def page_of_remeasured() -> str:
    return report_page(remeasured())


def points(record: dict[str, Any], series: str) -> dict[tuple[str, str], dict[str, Any]]:
    rows = [row for row in change_picture(record).points if row["series"] == series]
    return {(row["role"], row["when"]): row for row in rows}


# -- where it is shown ------------------------------------------------------------------------------------------------


def test_a_record_that_was_not_compared_has_no_section_and_no_charts():
    record = mixed()
    assert changed(record, None, None) == []
    assert change_sentence(record) == ""
    assert not set(KEYS) & set(charts(record))
    assert 'id="change"' not in report_page(record)
    assert "part of a change" not in report_page(record)


def test_the_section_stands_before_what_to_measure_next_and_the_first_screen_points_to_it():
    page = page_of_remeasured()
    assert page.index('<section id="moves"') < page.index('<section id="change"') < page.index('id="next-measurement"')
    first = page[page.index('id="answer"') : page.index("<nav")]
    said = "verdict the same: conditional go; advantage 2 → 1.6056. See the section Change since the previous record"
    assert said in html.unescape(first)
    assert '<tr id="formula-change"' in page


# -- the picture ------------------------------------------------------------------------------------------------------


def test_the_picture_shows_the_points_of_both_records_and_the_required_line():
    """V = 60 pm/d, E = 10 C V^2: 180 aJ at 0.3 V, then 224.2 aJ at 0.3529 V; the reference 360 aJ; M = 1.5: 240 aJ."""
    record = remeasured()
    found = points(record, "operating point")
    assert set(found) == {(role, when) for role in ("candidate", "contender") for when in ("before", "after")}
    assert found["candidate", "before"]["energy_J"] == near(180e-18, rel=1e-6)
    assert found["candidate", "after"]["energy_J"] == near(180e-18 * (200 / 170) ** 2 * 0.9, rel=1e-6)
    assert found["candidate", "after"]["supply_V"] == near(60 / 170, rel=1e-9)
    assert (
        found["contender", "before"]["energy_J"] == found["contender", "after"]["energy_J"] == near(360e-18, rel=1e-6)
    )
    advantages = [found["candidate", when]["advantage"] for when in ("before", "after")]
    assert advantages == near([2.0, 2.0 * 0.85**2 / 0.9], rel=1e-6)
    mine = record["policies"][0]["candidate"]["point"]
    assert [found["candidate", "after"][name] for name in ("time_s", "energy_J", "area_m2")] == [
        mine[name] for name in ("time", "energy", "area")
    ]
    lines = points(record, "required line")
    assert {key: row["energy_J"] for key, row in lines.items()} == {
        ("contender", when): near(240e-18, rel=1e-6) for when in ("before", "after")
    }


@pytest.mark.parametrize("width", [610.0, COLUMN - 86.0])
def test_every_mark_and_line_is_named_in_words_and_told_apart_without_colour(width: float):
    chart = change_picture(remeasured(), width, 300.0)
    assert chart.spec is not None
    written = " ".join(
        row["text"]
        for layer in chart.spec["layer"]
        if layer["mark"]["type"] == "text"
        for row in layer["data"]["values"]
    ).replace("\u00a0", " ")
    for text in ("Invented film-switch", "stated-reference", "before: 180 aJ", "after: 224 aJ", "advantage 2",
                 "advantage 1.61", "before and after: 360", "required advantage 1.5"):  # fmt: skip
        assert text in written, text
    symbols = [layer["mark"] for layer in chart.spec["layer"] if layer["mark"].get("shape")]
    assert len({(mark["shape"], mark["size"]) for mark in symbols}) == len(symbols) == 3
    dashes = [layer["mark"].get("strokeDash") for layer in chart.spec["layer"] if layer["mark"]["type"] == "rule"]
    assert [6, 3] in dashes
    assert checked(chart.spec) == chart.spec


def test_the_words_of_the_picture_come_from_the_same_record():
    record = remeasured()
    chart = change_picture(record)
    for text in (
        "Invented film-switch before: supply 0.3 V, time 996 ps, energy 180 aJ, advantage 2.",
        "Required line after: 240 aJ for",
    ):
        assert text in chart.alternative.replace("\u00a0", " ")
    assert "policy declared point" in chart.caption
    record["change"]["points"][0]["energy"] *= 2.0
    assert "energy 360 aJ, advantage 2" in change_picture(record).alternative.replace("\u00a0", " ")


def test_another_required_advantage_has_a_line_of_its_own():
    record = altered(remeasured(), lambda r: r["change"]["new"].update(required_advantage=3.0))
    lines = points(record, "required line")
    assert [lines["contender", when]["energy_J"] for when in ("before", "after")] == near([240e-18, 120e-18], rel=1e-6)
    chart = change_picture(record)
    assert chart.spec is not None
    dashes = [layer["mark"].get("strokeDash") for layer in chart.spec["layer"] if layer["mark"]["type"] == "rule"]
    assert [6, 3] in dashes
    assert [2, 3] in dashes


@pytest.mark.parametrize(
    ("metric", "column", "words"),
    [
        ("time-per-operation", "time_s", "candidate left of this line reaches it"),
        ("area", "area_m2", "Dashed: the area of the reference"),
        ("leakage-power", "leakage_power_W", "no required line"),  # the reference of S8 has no leakage
    ],
)
def test_the_required_line_is_of_the_metric_of_the_study(metric: str, column: str, words: str):
    def other(record: dict[str, Any]) -> None:
        for end in ("old", "new"):
            record["change"][end]["metric"] = metric

    record = altered(remeasured(), other)
    found, lines = points(record, "operating point"), points(record, "required line")
    for when in ("before", "after"):
        if ("contender", when) in lines:
            assert lines["contender", when][column] == near(found["contender", when][column] / 1.5)
    assert bool(lines) == (metric != "leakage-power")
    assert words in change_picture(record).caption


@pytest.mark.parametrize(("when", "left"), [("before", 3), ("after", 3), ("both", 2), ("all", 0)])
def test_a_side_without_a_point_is_said_and_never_drawn(when: str, left: int):
    def gone(record: dict[str, Any]) -> None:
        change = record["change"]
        change["points"] = [
            row
            for row in change["points"]
            if when != "all" and (row["role"] != "candidate" or (when != "both" and row["when"] != when))
        ]

    record = altered(remeasured(), gone)
    assert len(points(record, "operating point")) == left
    chart = change_picture(record)
    if left:
        said = {"before": "the candidate before", "after": "the candidate after"}.get(
            when, "the candidate before and the candidate after"
        )
        assert f"Without a point that can be shown: {said} the change." in chart.caption
    else:
        assert chart.spec is None
        assert chart.caption.startswith("Not drawn:")


def test_a_row_of_the_old_record_alone_leads_to_no_value_of_another_side():
    def other(record: dict[str, Any]) -> None:
        for row in record["change"]["points"]:
            if (row["role"], row["when"]) == ("contender", "before"):
                row["side"] = "left-out"

    record = altered(remeasured(), other)
    chart = change_picture(record)
    rows = {(row["role"], row["when"], row["series"]): index for index, row in enumerate(chart.points)}
    leads = dict(trail(record, chart, rows["contender", "before", "operating point"], chart.points[1]).links)
    assert leads["values"] == "#ledger"
    assert "arithmetic" not in leads
    after = rows["candidate", "after", "operating point"]
    leads = dict(trail(record, chart, after, chart.points[after]).links)
    assert leads["arithmetic"].startswith("#point-candidate")


# -- the waterfall ----------------------------------------------------------------------------------------------------


def test_the_waterfall_runs_from_before_to_after():
    """ln(1.6056 / 2) = -0.32504 (coefficient) + 0.10536 (capacitance)."""
    record = remeasured()
    rows = change_parts(record).points
    assert [row["cause"] for row in rows] == [
        "film-switch.actuator_coefficient",
        "film-switch.input_capacitance",
        "total",
    ]
    assert [row["ln_factor"] for row in rows] == near([-0.32504, 0.10536, -0.21968], rel=0, abs=5e-6)
    reached = 0.0
    for row in rows[:-1]:
        assert row["ln_before"] == reached
        reached = row["ln_after"]
        assert row["factor"] == near(math.exp(row["ln_factor"]))
    assert reached == near(rows[-1]["ln_factor"], rel=0, abs=1e-9)
    change = record["change"]
    ratio = change["new"]["advantage"] / change["old"]["advantage"]
    assert rows[-1]["ln_factor"] == near(math.log(ratio), rel=0, abs=1e-9)


def test_bars_lie_where_their_numbers_are_and_the_required_advantage_is_drawn():
    chart = change_parts(remeasured())
    assert chart.spec is not None
    domain = chart.spec["layer"][0]["encoding"]["x"]["scale"]["domain"]
    assert domain[0] < -0.32504
    assert domain[1] > 0.0
    boxes = [
        (row["a"], row["c"])
        for layer in chart.spec["layer"]
        if layer["mark"]["type"] == "rect" and layer["mark"].get("stroke")
        for row in layer["data"]["values"]
    ]
    wanted = [(-0.32504, 0.0), (-0.32504, -0.21968), (-0.21968, 0.0)]
    assert [sorted(box) for box in boxes] == [near(list(pair), rel=0, abs=1e-4) for pair in wanted]
    dashed = [layer for layer in chart.spec["layer"] if layer["mark"].get("strokeDash") == [6, 3]]
    assert [row["a"] for layer in dashed for row in layer["data"]["values"]] == near([math.log(1.5 / 2.0)], abs=1e-4)


def test_small_parts_are_counted_and_a_far_required_advantage_is_said():
    def other(record: dict[str, Any]) -> None:
        record["change"]["attribution"][0]["parts"]["study.fan_out"] = 1e-5
        record["change"]["new"]["required_advantage"] = 100.0

    chart = change_parts(altered(remeasured(), other))
    assert "1 smaller than 5×10⁻⁴ only in the table." in chart.caption
    assert "The required advantage 100 lies outside the axis." in chart.caption


@pytest.mark.parametrize(
    ("note", "said"), [("advantage is not stated after the change", ""), ("", "no changed value moves the advantage")]
)
def test_without_parts_there_is_no_waterfall_and_the_reason_is_said(note: str, said: str):
    record = altered(remeasured(), lambda r: r["change"]["attribution"][0].update(parts={}, note=note))
    chart = change_parts(record)
    assert chart.spec is None
    assert chart.caption == f"Not drawn: {note or said}."
    assert (f"Not split: {note}." in report_page(record)) == bool(note)


# -- the same numbers everywhere --------------------------------------------------------------------------------------


class _Tables(HTMLParser):
    """Table id -> rows of cells; links and small second lines are part of their cell."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.found: dict[str, list[list[str]]] = {}
        self.name, self.open = "", False
        self.feed(page)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        if tag == "table":
            self.name = str(dict(attrs)["id"]).removesuffix("-table")
            self.found[self.name] = []
        if tag == "tr" and self.name:
            self.found[self.name].append([])
        if tag in ("td", "th") and self.name:
            self.found[self.name][-1].append("")
            self.open = True

    def handle_endtag(self, tag: str) -> None:
        self.open = self.open and tag not in ("td", "th")
        self.name = "" if tag == "table" else self.name

    def handle_data(self, data: str) -> None:
        if self.open:
            self.found[self.name][-1][-1] += data


_POWERS = str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "-0123456789")


def _alike(text: str) -> str:
    """A cell with its typesetting taken away: numbers as the shortest that give the same double."""
    plain = text.replace("\u00a0", " ").replace("−", "-").replace("µ", "u").replace("→", "->").replace("°C", "degC")
    plain = re.sub(r"([\d.]+)×10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)", lambda m: f"{m[1]}e{m[2].translate(_POWERS)}", plain)
    plain = re.sub(r"(?<![\d.])10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)", lambda m: f"1e{m[1].translate(_POWERS)}", plain)
    plain = plain.replace("²", "^2").replace("×", "x ")
    plain = re.sub(r"([\d.]+) MV/m", lambda m: f"{float(m[1]) * 1e6:.12g} V/m", plain)  # a page scales no compound unit
    return re.sub(r"\d+(?:\.\d+)?(?:e[+-]?\d+)?", lambda m: repr(float(m[0])), plain)


def test_the_page_says_what_the_terminal_says_digit_by_digit():
    record = remeasured()
    change, found = record["change"], _Tables(page_of_remeasured()).found
    wanted_tables = {
        "change-inputs": input_table(change, PLAIN),
        "change-links": link_table(change, PLAIN),
        "change-chain": chain_table(change, PLAIN),
        "change-results": result_table(change, PLAIN),
        **{f"change-parts-{i}": t for i, t in enumerate(part_tables(change, PLAIN, additive=True), start=1)},
    }
    assert len(wanted_tables) == 6
    for key, table in wanted_tables.items():
        heads, *rows = found[key]
        assert heads == list(table.columns)
        assert [[_alike(cell) for cell in row] for row in rows] == [
            [_alike(cell) for cell in row] for row in table.rows
        ]
        assert len(rows) >= (1 if key == "change-links" else 3)
    assert found["change-parts-1"][-1][:2] == ["total", "−0.21968 (×0.8028)"]


def test_typesetting_can_differ_and_numbers_cannot():
    assert _alike("1.5×10⁻¹⁸\u00a0J") == _alike("1.5e-18 J")
    assert _alike("10⁻⁹") == _alike("1e-09")
    assert _alike("+0.105 (×1.11)") == _alike("+0.105 (x 1.11)")
    assert _alike("1.445") != _alike("1.446")


def test_the_table_in_the_record_folder_is_the_csv_of_the_command(tmp_path: Path):
    record = remeasured()
    fill_folder(tmp_path, record)
    rows = list(csv.DictReader(io.StringIO((tmp_path / "tables" / "changes.csv").read_text(encoding="utf-8"))))
    for row, fact in zip(rows, change_rows(record["change"]), strict=True):
        for name, text in row.items():
            value = fact.get(name)
            assert (float(text) if isinstance(value, float) else text) == ("" if value is None else value), (name, fact)
    for key in KEYS:
        assert (tmp_path / "figures" / f"{key}.svg").is_file()
        assert (tmp_path / "tables" / f"chart-{key}.csv").is_file()
    assert json.loads((tmp_path / "record.json").read_text(encoding="utf-8"))["change"] == record["change"]


def test_figures_for_print_hold_the_picture_in_both_widths():
    names = [figure.name for figure in figures_for_print(remeasured())]
    assert {f"{key}-{width}mm" for key in KEYS for width in (88, 180)} <= set(names)


# -- what is not a change of an input ---------------------------------------------------------------------------------


def test_question_criteria_constants_and_program_stand_apart():
    kinds = ("question", "criteria", "method", "option", "file", "draws", "constant", "program")

    def other(record: dict[str, Any]) -> None:
        record["change"]["other"] = [{"kind": kind, "name": f"the {kind}", "old": "1", "new": ""} for kind in kinds]
        record["change"]["banners"] = ["physical constants of the program changed: BOLTZMANN"]

    page = report_page(altered(remeasured(), other))
    found = _Tables(page).found
    for kind in kinds:
        assert found[f"change-{kind}"] == [["name", "old", "new"], [f"the {kind}", "1", "absent"]]
        assert f"the {kind}" not in str(found["change-inputs"])
    assert '<p class="notice"><b>Not a change of an input:</b> physical constants' in page


def test_probability_is_split_into_moved_and_narrowed():
    record = remeasured()
    rows = dict(_Tables(page_of_remeasured()).found["change-probability"])
    split = record["change"]["probability"]
    parts = [rows["part of the moved best estimates"], rows["part of the changed ranges"]]
    assert [float(text.replace("−", "-")) for text in parts] == near(
        [split["part_moved"], split["part_narrowed"]], rel=0, abs=6e-4
    )
    page = report_page(altered(record, lambda r: r["change"]["probability"].update(note="why not")))
    assert "Probability of reaching the required advantage, not split:</b> why not." in page
    assert 'id="change-probability' not in report_page(altered(record, lambda r: r["change"].update(probability=None)))


def test_unchanged_results_and_unchanged_inputs_are_named():
    record = remeasured()
    page = html.unescape(page_of_remeasured())
    summary = f"<summary>Results identical to the last bit: {len(record['change']['identical'])}.</summary>"
    folded = page[page.index(summary) :]
    assert "<li>declared-point: contender stated-reference: energy</li>" in folded[: folded.index("</details>")]

    def none(made: dict[str, Any]) -> None:
        made["change"] |= {"inputs": [], "results": [], "chain": [], "attribution": made["change"]["attribution"][:1]}
        made["change"]["attribution"][0] |= {"parts": {}, "total": 0.0}

    page = report_page(altered(record, none))
    assert "No input changed." in page
    assert "Between inputs and result of the candidate nothing changed." in page


def test_results_that_differ_below_the_printed_digits_and_whole_tables_are_counted():
    """0.455812345 V and 0.455812346 V print the same; table against table says nothing; a table that is gone does."""
    rows = [
        {"result": "supply", "unit": "V", "old": 0.455812345, "new": 0.455812346, "factor": 1.000000002},
        {"result": "energy", "unit": "J", "old": 1.0e-18, "new": 2.0e-18, "factor": 2.0},
        {"result": "curve", "unit": "", "old": "table of 62 rows", "new": "table of 62 rows", "factor": None},
        {"result": "elasticities", "unit": "", "old": "a table", "new": "a table", "factor": None},
        {"result": "ladder", "unit": "", "old": "table of 3 rows", "new": None, "factor": None},
    ]
    record = altered(remeasured(), lambda r: r["change"].update(results=rows))
    for how in (PLAIN, PAGE):
        assert [row[0] for row in result_table(record["change"], how).rows] == ["energy", "ladder"]
        said = result_words(record["change"], how)
        assert said.startswith("Results: 1 more differ only below the printed digits; 2 whole tables differ.")
    assert said in report_page(record)
    assert {row["name"]: row["old"] for row in change_rows(record["change"]) if row["section"] == "result"} == {
        row["result"]: row["old"] for row in rows
    }
    listed = altered(remeasured(), lambda r: r["change"].update(results=rows[1:2]))
    assert result_words(listed["change"]) == ""


@pytest.mark.parametrize("how", [PLAIN, PAGE])
def test_a_part_that_the_search_does_not_resolve_is_credited_to_no_input(how: Any):
    """31 as of a time of about 1 ns is 3e-8 of it, below the 1e-6 of the search; 2e-6 of it is above; 0 stays 0."""

    def other(record: dict[str, Any]) -> None:
        for row in record["change"]["attribution"]:
            if row["quantity"] == "candidate time":
                size = row["after"] if row["scale"] == "additive" else 1.0
                row["parts"] = {"residue": 3e-8 * size, "real": -2e-6 * size, "nothing": 0.0}
                row["total"] = sum(row["parts"].values())

    record = altered(remeasured(), other)
    change = record["change"]
    assert change["resolution"] == 1e-6
    below = "below the resolution of the search"
    logarithms, amounts = part_tables(change, how, additive=True)
    for table in (logarithms, amounts):
        place = table.columns.index("candidate time")
        rows = {row[0]: row[place] for row in table.rows}
        assert rows["residue"] == below
        assert below not in (rows["real"], rows["nothing"], rows["total"])
        assert f"; {below}: less than {how.number(1e-6, 3)} of the quantity" in table.title
    facts = {(r["section"], r["node"], r["name"]): r["part"] for r in change_rows(change) if r["section"][:4] == "part"}
    assert facts["part, logarithm", "candidate time", "residue"] == 3e-8
    coarse = altered(record, lambda r: r["change"].update(resolution=1e-5))["change"]
    assert part_tables(coarse, how, additive=True)[1].rows[-1][place] == below, "a total too"
    exact = altered(record, lambda r: r["change"].pop("resolution"))["change"]
    assert not any(below in row for table in part_tables(exact, how, additive=True) for row in table.rows)


def test_a_part_below_a_coarse_search_does_not_make_most_of_the_change():
    record = altered(remeasured(), lambda r: r["change"].update(resolution=0.2))
    lines = change_lines(record["change"])
    assert lines[1].startswith("Most of it by film-switch.actuator_coefficient (x 0.7225)."), lines
    assert "input_capacitance" in change_lines(remeasured()["change"])[1]


def test_an_input_leads_to_its_row_of_the_ledger_unless_it_is_gone():
    record = remeasured()
    inputs = [block for block in changed(record, None, None)[0].blocks if getattr(block, "key", "") == "change-inputs"]
    place = next(i for i, row in enumerate(record["ledger"], start=1) if row["key"].endswith("actuator_coefficient"))
    assert inputs[0].rows[0][0].href == f"#value-{place}"
    gone = altered(record, lambda r: r["change"]["inputs"][0].update(key="film-switch.no_more"))
    inputs = [block for block in changed(gone, None, None)[0].blocks if getattr(block, "key", "") == "change-inputs"]
    assert inputs[0].rows[0][0].href == ""


# -- what may leave the house -----------------------------------------------------------------------------------------


def test_ratios_only_leave_the_change_out_and_folders_are_not_told(tmp_path: Path):
    assert "change" not in ratio_only(remeasured())
    assert "shown" not in remeasured()["change"]["new"]
    from benchmark.record.changes import in_record

    record = remeasured()
    ends = {"old": {"shown": str(tmp_path / "house" / "a")}, "new": {"shown": "b", "sha256": "c", "study": "d"}}
    assert in_record(record, ends)["change"] == {"old": {"shown": "a"}, "new": {"study": "d"}}


def test_hostile_texts_are_escaped():
    page = report_page(hostile(remeasured()))
    inside = page[page.index('<section id="change"') : page.index('<section id="next-measurement"')]
    assert "<script" not in inside
    assert "&lt;script&gt;" in inside


def test_the_page_prints_signs_and_arrows_as_pages_do():
    assert PAGE.signed(-0.5, 3) == "−0.500"
    assert PLAIN.signed(-0.5, 3) == "-0.500"
    assert PLAIN.signed(-1e-9, 3) == "+0.000"


def test_numbers_of_the_table_of_changes_have_their_unit_beside_them():
    rows = [row for row in tables(remeasured())["changes"] if isinstance(row["new"], float)]
    sections = {row["section"].split(",")[0] for row in rows}
    assert {"input", "chain", "result", "probability"} <= sections
    bare = [row for row in rows if not row["unit"]]
    assert all(row["section"] == "probability" or row["name"].endswith(": margin") for row in bare), bare
