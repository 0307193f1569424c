"""Charts of what would be needed: drawn from the record, exact by hand, readable in grey print and in one column."""

from __future__ import annotations

import copy
import functools
import json
import math
import re
import tempfile
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import pytest

from benchmark import api
from benchmark.record.ratio_only import ratio_only
from benchmark.report.charts import charts
from benchmark.report.figure import Chart, checked, to_svg
from benchmark.report.number_lines import number_lines
from benchmark.report.opportunity_chart import boundary_segments
from benchmark.report.page import page
from benchmark.report.publish import figures_for_print
from benchmark.report.tables import write_csv
from benchmark.report.words import is_number
from tests.fixed_displacement import fixed_displacement
from tests.near import near
from tests.report_records import changed, hostile
from tests.studies import Inputs, hub

Record = dict[str, Any]
STRESS = Path(__file__).parent.parent / "data" / "stress-hand" / "study.toml"
SVG = "{http://www.w3.org/2000/svg}"


@functools.cache
def _run(make: Callable[[], Inputs], draws: int = 0) -> Record:
    with tempfile.TemporaryDirectory() as folder:
        path = make().write(Path(folder))
        return api.run(path, created="2026-01-31T00:00:00Z", draws=draws, need=True).record


def _gated() -> Inputs:
    return hub(activity="0.05", idle="gated", contenders=("low-leakage",))


def always_on() -> Record:
    """Relay against two flavours: no idle time, map over the activity."""
    return copy.deepcopy(_run(hub))


def sleeping() -> Record:
    """Relay against a sleep switch: both maps."""
    return copy.deepcopy(_run(_gated))


def film() -> Record:
    """Two values with stated spreads, drawn."""
    return copy.deepcopy(_run(fixed_displacement, 64))


@functools.cache
def drawn(record: Callable[[], Record]) -> dict[str, Chart]:
    return charts(record())


def _layers(chart: Chart) -> Iterator[dict[str, Any]]:
    assert chart.spec is not None
    yield from chart.spec["layer"]


def _places(chart: Chart, kind: str, x: str, y: str) -> set[tuple[float, float]]:
    """Data of the layers drawn with one mark in these two columns."""
    return {
        (row[x], row[y])
        for layer in _layers(chart)
        if layer["mark"]["type"] == kind
        for row in layer["data"]["values"]
        if x in row and y in row
    }


def _words(chart: Chart) -> set[str]:
    return {
        row["text"] for layer in _layers(chart) if layer["mark"]["type"] == "text" for row in layer["data"]["values"]
    }


def test_charts_are_there_when_needs_were_asked_for():
    assert list(drawn(always_on))[-3:] == ["break-even-lines", "trade-curve", "opportunity-activity"]
    assert list(drawn(sleeping))[-2:] == ["opportunity-activity", "opportunity-duty"]
    assert list(drawn(film))[-2:] == ["break-even-lines", "trade-curve"]  # self-timed: no deadline to map
    without = changed(film(), lambda record: record.pop("need"))
    assert "break-even-lines" not in charts(without)
    for record in (always_on, sleeping, film):
        for chart in drawn(record).values():
            if chart.spec is not None:
                assert checked(chart.spec) == chart.spec
                json.dumps(chart.points, allow_nan=False)


# -- break-evens ----------------------------------------------------------------------------------------------------


def test_break_evens_stand_where_hand_arithmetic_puts_them():
    chart = drawn(always_on)["break-even-lines"]
    (row,) = [row for row in chart.points if row["key"] == "study.activity"]
    assert row["value"] == near(0.007 / 1.51, rel=1e-9)
    assert (row["today"], row["reached"]) == (0.02, "below")
    assert "1 at 0.00464" in _words(chart)
    # on the line: the log scale from 1e-5 to 1 over its width
    width = chart.spec["width"]
    strokes = [
        row["a"]
        for layer in _layers(chart)
        if layer["mark"].get("strokeWidth") == 3.0 and layer["mark"]["type"] == "rule" and "strokeDash" not in
        layer["mark"] and layer["mark"]["color"] == "#1a1a1a"
        for row in layer["data"]["values"]
    ]  # fmt: skip
    assert min(abs(x - width * (math.log10(row["value"]) + 5.0) / 5.0) for x in strokes) < 1e-6


def test_who_is_better_is_written_on_the_line():
    words = _words(drawn(always_on)["break-even-lines"])
    assert {"reference better", "infeasible", "no effect"} <= words
    assert any("candidate better" in text or "or more" in text for text in words)
    assert "1.5 or more" in _words(drawn(film)["break-even-lines"])


def test_a_supply_that_is_permitted_at_one_value_only_is_infeasible_elsewhere():
    rows = [row for row in drawn(film)["break-even-lines"].points if row["key"] == "stated-reference.declared_supply"]
    for row in rows:  # its supply range is 0.3 V alone
        assert row["permitted_from"] == near(0.3, rel=1e-5)
        assert row["permitted_to"] == near(0.3, rel=1e-5)


def test_an_answer_without_a_number_is_a_word():
    points = drawn(always_on)["break-even-lines"].points
    assert {row["value"] for row in points if not is_number(row["value"])} == {"no effect"}

    def nothing(record: Record) -> None:
        for row in record["need"][0]["rows"]:
            row |= {"answer": "undefined", "value": None, "advantage_today": None}
            row |= {"advantage_from": None, "advantage_to": None, "advantage_at_or_above_level": ""}

    chart = number_lines(changed(always_on(), nothing))
    assert {row["value"] for row in chart.points} == {"infeasible over the whole range"}
    assert "infeasible" in _words(chart)
    assert {row["advantage_today"] for row in chart.points} == {"infeasible"}


# -- trade curve ----------------------------------------------------------------------------------------------------


def test_the_trade_curve_is_the_product_law_with_todays_cloud():
    chart = drawn(film)["trade-curve"]
    roots = [row for row in chart.points if row["kind"] == "root"]
    assert len(roots) >= 5
    first, second = roots[0]["first"], roots[0]["second"]
    assert {first, second} == {"film-switch.actuator_coefficient", "film-switch.input_capacitance"}
    for row in roots:  # A = 2 (d / 200)^2 0.1 / C per switch
        d, c = row["first_value"], row["second_value"]
        assert 2.0 * (d / 200.0) ** 2 * 0.1 / c == near(1.5, rel=1e-6)
    samples = [row for row in chart.points if row["kind"] == "sample"]
    assert len(samples) == 64
    for row in samples:
        assert row["advantage"] == near(2.0 * (row["first_value"] / 200.0) ** 2 * 0.1 / row["second_value"], rel=1e-6)
    plotted = _places(chart, "point", "first_value", "second_value")
    assert plotted == {(row["first_value"], row["second_value"]) for row in [*roots, *samples]}
    reached = sum(row["advantage"] >= 1.5 for row in samples)
    assert f"filled where the level is reached ({reached})" in chart.caption
    assert any("today: advantage 2" in text for text in _words(chart))
    (mark,) = [layer for layer in _layers(chart) if layer["mark"].get("shape") == "diamond"]
    (place,) = mark["data"]["values"]
    assert sorted(place.values()) == near([0.1, 200.0], rel=1e-9)


def test_the_limit_of_a_trade_is_drawn_hatched_and_named():
    view = api.load_study(STRESS)
    found = api.trade(
        view,
        "actuator_coefficient",
        "hand-stress-gated.declared_supply",
        advantage=4.0,
        over=((100, 1000), (0.05, 1)),
        points=6,
    )
    record = film()
    block = next(row for row in record["need"] if row["key"] == "trade")
    block |= {"rows": [dict(row) for row in found.rows]}
    chart = charts(record)["trade-curve"]
    # breakdown at 6.67 MV/m over 60 nm
    ends = [row["permitted_to"] for row in chart.points if row["ends_above"] != "-"]
    assert ends == near([0.4002] * len(ends), rel=1e-5)
    assert len(ends) >= 5
    assert "Hatched: infeasible" in chart.caption
    assert any(text.startswith("infeasible beyond") for text in _words(chart))
    assert "device_limits" in " ".join(str(row["ends_above"]) for row in chart.points)


# -- opportunity maps -----------------------------------------------------------------------------------------------


def test_the_break_even_of_the_hub_lies_on_the_drawn_boundary():
    chart = drawn(always_on)["opportunity-activity"]
    by_hand = 0.007 / 1.51
    ends = [place for piece in boundary_segments(chart.points, 1.0) for place in piece]
    (value,) = {y for x, y in ends if x == 1e-5}
    assert value == near(by_hand, rel=1e-9)
    lines = _places(chart, "line", "deadline_s", "value")
    assert (1e-5, value) in lines
    assert set(ends) <= lines
    for x, y in ends:  # 0.49 a + 0.7 pW x T against 2 a, at every deadline
        assert y == near(0.7e3 * x / 1.51, rel=1e-9)
    assert "this study: advantage 0.42" in _words(chart)
    (mark,) = [layer for layer in _layers(chart) if layer["mark"].get("shape") == "diamond"]
    assert mark["data"]["values"] == [{"a": near(1e-5, rel=1e-9), "b": near(0.02, rel=1e-9)}]


def test_the_boundary_over_the_duty_is_that_of_hand_arithmetic_at_every_deadline():
    chart = drawn(sleeping)["opportunity-duty"]
    rows = [row for row in chart.points if row["kind"] == "boundary"]
    assert len({row["deadline_s"] for row in rows}) > 8
    for row in rows:  # fJ per gate and wake of 1000 cycles: 0.7 pW while awake, 5 % of it asleep, 1.47 to wake up
        awake = 1000.0 * row["deadline_s"]
        idle = awake * (1.0 - row["value"]) / row["value"]
        gated = 24.5 + 0.7e3 * awake + min(0.05 * 0.7e3 * idle + 1.47, 0.7e3 * idle)  # gated where that costs less
        assert gated / 100.0 == near(row["level"], rel=1e-9)
    at_study = [row["value"] for row in rows if row["deadline_s"] == 1e-5 and row["level"] == 1.0]
    assert at_study == near([0.01 / (1.915142857142857 + 0.01)], rel=1e-6)


@pytest.mark.parametrize("record", [always_on, sleeping])
def test_points_that_are_drawn_are_the_data(record, tmp_path):
    for key in [key for key in drawn(record) if key.startswith("opportunity")]:
        chart = drawn(record)[key]
        known = [row for row in chart.points if row["kind"] == "point" and is_number(row["advantage"])]
        boundary = [row for row in chart.points if row["kind"] == "boundary"]
        plotted = _places(chart, "point", "deadline_s", "value")
        assert plotted == {(row["deadline_s"], row["value"]) for row in [*known, *boundary]}
        write_csv(chart.points, tmp_path / "chart.csv")
        assert len((tmp_path / "chart.csv").read_text(encoding="utf-8").splitlines()) == len(chart.points) + 1


def test_a_jump_is_drawn_as_an_edge_of_its_own_style_and_is_in_the_data(tmp_path: Path):
    found = api.opportunity(hub(low_leakage_delay="300.0").write(tmp_path), "activity", points=7)
    record = always_on()
    block = next(row for row in record["need"] if row["key"] == "map-activity")
    block |= {"rows": [dict(row) for row in found.rows]}
    chart = charts(record)["opportunity-activity"]
    jumps = {(row["deadline_s"], row["value"]) for row in chart.points if row["kind"] == "jump"}
    assert len(jumps) >= 4
    edges = [layer for layer in _layers(chart) if layer["mark"].get("strokeDash") == [6, 3]]
    (edge,) = (layer for layer in edges if layer["mark"]["type"] == "line")
    at_one = boundary_segments(chart.points, 1.0, "jump")
    assert len(at_one) >= 2
    ends = {(row["deadline_s"], row["value"]) for row in edge["data"]["values"]}
    assert {place for piece in at_one for place in piece} <= ends <= jumps
    (squares,) = [layer for layer in _layers(chart) if layer["mark"].get("shape") == "square"]
    assert {(row["deadline_s"], row["value"]) for row in squares["data"]["values"]} == jumps
    assert "Orange dashed lines with squares: the advantage jumps over a level" in chart.caption
    assert [spot.name for spot in chart.spots if spot.name.startswith("jump: deadline 6")]
    assert "jump" not in drawn(always_on)["opportunity-activity"].caption
    write_csv(chart.points, tmp_path / "chart.csv")
    lines = (tmp_path / "chart.csv").read_text(encoding="utf-8").splitlines()
    assert sum(line.startswith("jump,") for line in lines) >= 4


def test_sides_of_the_level_have_shapes_of_their_own():
    chart = drawn(always_on)["opportunity-activity"]
    shapes = {}
    for layer in _layers(chart):
        for row in layer["data"]["values"]:
            if layer["mark"]["type"] == "point" and set(row) == {"deadline_s", "value"}:
                shapes.setdefault((row["deadline_s"], row["value"]), set()).add(layer["mark"]["shape"])
    for row in chart.points:
        if row["kind"] == "point" and is_number(row["advantage"]):
            wanted = "triangle-up" if row["advantage"] >= 1.0 else "stroke"
            assert wanted in shapes[row["deadline_s"], row["value"]]


def test_infeasible_is_hatched_and_a_word():
    chart = drawn(always_on)["opportunity-activity"]
    assert "infeasible:" in _words(chart)
    gone = [row for row in chart.points if row["advantage"] == "infeasible"]
    assert gone
    for row in gone:  # twenty stages of 100 ns
        assert row["deadline_s"] < 20 * 100e-9 + 1e-9
        assert row["reason"] == "the candidate has no permitted point"
    assert "Hatched: infeasible" in chart.caption


def test_every_class_on_the_map_is_named():
    words = _words(drawn(always_on)["opportunity-activity"])
    assert {"always-on hub", "microcontroller", "mobile core", "server core", "multiply-accumulate array"} <= words


# -- print, page, words ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("record", [always_on, sleeping, film])
def test_in_print_words_have_seven_points_and_lines_half_a_point(record):
    new = {"break-even-lines", "trade-curve", "opportunity-activity", "opportunity-duty"}
    figures = [one for one in figures_for_print(record()) if one.name.rpartition("-")[0] in new]
    assert len(figures) >= 4
    for figure in figures:
        root = ElementTree.fromstring(figure.svg)
        scale = float(root.attrib["width"].removesuffix("mm")) * 72.0 / 25.4 / float(root.attrib["viewBox"].split()[2])
        sizes = [float(item.attrib["font-size"].removesuffix("px")) for item in root.iter(f"{SVG}text")]
        lines = [
            float(item.attrib.get("stroke-width", "1"))
            for item in root.iter()
            if item.attrib.get("stroke", "none") not in ("none", "transparent")
            and item.attrib.get("stroke-width") != "0"
        ]
        assert min(sizes) * scale >= 7.0, figure.name
        assert min(lines) * scale >= 0.5, figure.name
        assert figure.caption
        assert figure.alternative


@pytest.mark.parametrize("record", [always_on, film])
def test_every_mark_leads_to_a_row_and_every_link_to_a_place(record):
    found = charts(record())
    drawings = {key: to_svg(chart.spec) for key, chart in found.items() if chart.spec is not None}
    text = page(record(), found, drawings)
    ids = set(re.findall(r'\bid="([^"]+)"', text))
    links = set(re.findall(r'href="#([^"]+)"', text))
    assert links <= ids
    for key in ("break-even-lines", "trade-curve"):
        assert f"data-{key}-1" in ids
        assert any(name.startswith(f"{key}-mark-") for name in ids)
        for spot in found[key].spots:
            assert 0 <= spot.row < len(found[key].points)
    assert "formula-break-even" in ids


def test_a_mark_leads_to_the_row_of_its_own_numbers():
    chart = drawn(always_on)["opportunity-activity"]
    spot = next(spot for spot in chart.spots if spot.name.startswith("this study"))
    assert chart.points[spot.row]["kind"] == "today"
    curve = drawn(film)["trade-curve"]
    for spot in curve.spots:
        assert spot.name.startswith(curve.points[spot.row]["kind"])


def test_the_required_values_stand_in_one_table():
    found = charts(film())
    text = page(film(), found, {key: to_svg(chart.spec) for key, chart in found.items() if chart.spec is not None})
    table = text[text.index("required-values") :]
    for head in ("today", "needed, best estimate", "needed at 90 %", "spread allowed", "limit", "reachable"):
        assert head in table[: table.index("</thead>")]
    assert "at least 173.2" in table  # 200 sqrt(1.5 / 2) pm/V
    assert "of film-switch, decisive" in table
    assert "none stated" in table
    assert "none small enough" in table
    assert '<section id="need-joint-sheet"' in text


def test_ratios_only_leave_them_out():
    assert "need" not in ratio_only(film())
    assert "break-even-lines" not in charts(ratio_only(film()))


def test_hostile_words_stay_words_and_drawings_are_the_same_twice():
    record = hostile(always_on())
    for key, chart in charts(record).items():
        if key.startswith(("break-even", "trade", "opportunity")) and chart.spec is not None:
            for layer in _layers(chart):
                outside = json.dumps({name: value for name, value in layer.items() if name != "data"})
                assert "owned" not in outside
    for key, chart in drawn(always_on).items():
        assert charts(always_on())[key] == chart
