"""Charts of a record: what is drawn is what the tables say, readable in grey print, honest on log axes."""

from __future__ import annotations

import csv
import functools
import itertools
import json
import math
import re
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import pytest

from benchmark.report.charts import charts
from benchmark.report.contrast import contrast, grey
from benchmark.report.energy_delay import energy_delay, envelope_path, side_name
from benchmark.report.figure import Chart, checked, to_png, to_svg
from benchmark.report.parts import FILLS
from benchmark.report.rows import NOT_PERMITTED, curve_rows, envelope_rows, policy_rows
from benchmark.report.style import LogAxis, looks, positive
from benchmark.report.svg import SVG_ELEMENTS, inline_svg
from benchmark.report.tables import write_csv
from benchmark.report.words import amount, is_number, number
from tests.report_records import changed, crossing, hostile, hub, infeasible, mixed

RECORDS = [mixed, hub, infeasible, crossing]
KEYS = [
    *(
        "requirement-margins",
        "energy-delay",
        "limits-along-supply",
        "advantage-against-time",
        "time-parts",
        "energy-parts",
        "ladder-steps",
        "advantage-distribution",
        "input-swings",
    ),
    *("advantage-by-node", "node-steps"),
]


@functools.cache
def drawn(record: Callable[[], dict[str, Any]]) -> dict[str, Chart]:
    """Charts of an unchanged record, made once."""
    return charts(record())


def _layers(spec: Any) -> Iterator[dict[str, Any]]:
    for layer in spec["layer"]:
        yield layer
        if "layer" in layer:
            yield from _layers(layer)


def _values(spec: Any, *fields: str) -> list[tuple[float, ...]]:
    """Every row of the inline data that has all these fields, from visible marks."""
    return [
        tuple(row[field] for field in fields)
        for layer in _layers(spec)
        for row in layer["data"]["values"]
        if all(field in row for field in fields)
    ]


@pytest.mark.parametrize("record", RECORDS)
def test_every_chart_is_there_in_order_and_valid(record):
    found = drawn(record)
    assert list(found) == KEYS
    for key, chart in found.items():
        assert chart.key == key
        assert chart.caption
        assert chart.alternative
        if chart.spec is None:
            assert "Not drawn" in chart.caption
            assert not chart.points
        else:
            assert checked(chart.spec) == chart.spec
            json.dumps(chart.spec, allow_nan=False)
            assert chart.points


def test_the_validation_can_fail():
    spec = dict(drawn(hub)["energy-delay"].spec)
    spec["layer"] = [{"mark": {"type": "dot"}}]
    with pytest.raises(Exception, match="dot"):
        checked(spec)


@pytest.mark.parametrize("record", RECORDS)
def test_nothing_that_was_ruled_out_is_drawn(record):
    for chart in drawn(record).values():
        if chart.spec is None:
            continue
        assert chart.spec["config"]["legend"] == {"disable": True}
        text = json.dumps(chart.spec)
        assert '"arc"' not in text  # no radar, no pie
        assert "title" not in chart.spec
        for layer in _layers(chart.spec):
            for channel in layer["encoding"].values():
                assert channel.get("legend") is None
            mark = layer["mark"]
            size = mark.get("fontSize")
            assert size is None or size * 0.75 >= 7.0, "text below 7 pt"
            width = mark.get("strokeWidth", 1.0)
            assert width == 0 or width * 0.75 >= 0.5, "line below 0.5 pt"
        assert chart.spec["config"]["axis"]["labelFontSize"] * 0.75 >= 7.0


def test_lines_and_words_stand_out_from_white():
    record = changed(mixed(), lambda r: r["sides"].extend({**r["sides"][1], "id": f"further {i}"} for i in range(22)))
    found = looks(record)
    assert len(found) == len(record["sides"])
    for look in found.values():
        assert contrast(look.colour) >= 3.0
        assert contrast(look.ink) >= 4.5


def test_each_technology_has_a_style_of_its_own_that_does_not_depend_on_the_chart_or_on_what_is_feasible():
    record = changed(mixed(), lambda r: r["sides"].extend({**r["sides"][1], "id": f"further {i}"} for i in range(10)))
    found = looks(record)
    styles = [(look.colour, look.dash, look.marker) for look in found.values()]
    assert len(set(styles)) == len(styles)
    assert looks(infeasible()) == looks(mixed())


def test_in_grey_print_every_pair_is_told_apart_by_more_than_its_shade():
    record = changed(mixed(), lambda r: r["sides"].extend({**r["sides"][1], "id": f"further {i}"} for i in range(10)))
    found = list(looks(record).values())
    alike = []
    for one, other in itertools.combinations(found, 2):
        assert (one.dash, one.marker) != (other.dash, other.marker), "dash and marker alike: only colour is left"
        if contrast(grey(one.colour), grey(other.colour)) < 1.5:
            alike.append((one, other))
    assert alike, "some shades do come out alike, so dash, marker and name are needed"


def test_every_side_is_named_beside_its_curve():
    record = mixed()
    written = re.sub(r"\s+", " ", json.dumps(charts(record)["energy-delay"].spec, ensure_ascii=False))
    for side in record["sides"]:
        assert side_name(record, f"{side['role']} {side['id']}") in written


def test_strips_tell_the_mechanisms_of_the_swept_points_over_the_whole_supply_range():
    record = mixed()
    chart = drawn(mixed)["limits-along-supply"]
    for curve in record["curves"]:
        mine = [row for row in chart.points if (row["role"], row["side"]) == (curve["role"], curve["side"])]
        for of, field in (("delay", "delay_limit"), ("energy", "energy_limit")):
            runs = [row for row in mine if row["of"] == of]
            usable = [point for point in curve["points"] if point["time"] is not None]
            assert runs[0]["from_V"] == min(point["supply"] for point in usable)
            assert runs[-1]["to_V"] == max(point["supply"] for point in usable)
            for one, other in itertools.pairwise(runs):
                assert one["to_V"] == other["from_V"]
                assert one["mostly"] != other["mostly"]
            for point in usable:
                inside = [row["mostly"] for row in runs if row["from_V"] <= point["supply"] <= row["to_V"]]
                assert point[field] in inside


@pytest.mark.parametrize(("ambition", "said"), [("today", "filled"), ("target", "hollow"), ("limit", "outlined")])
def test_design_points_tell_what_their_technology_stands_for(ambition: str, said: str):
    def change(record: dict[str, Any]) -> None:
        for side in record["sides"]:
            side["ambition"] = ambition

    chart = energy_delay(changed(mixed(), change))
    marks = [layer["mark"] for layer in _layers(chart.spec) if layer["mark"].get("size") == 110]
    assert marks
    for mark in marks:
        look = "outlined" if mark["fill"] == "transparent" else "hollow" if mark["fill"] == "white" else "filled"
        assert look == said
        assert bool(mark.get("strokeDash")) == (said == "outlined")
    assert said in chart.caption
    assert (f"({ambition})" in json.dumps(chart.spec)) == (ambition != "today")


def test_parts_with_one_fill_differ_in_hatching_or_mean_the_same():
    """Device and device RC share a look: one stands in bars of energy, the other in bars of time."""
    for one, other in itertools.combinations(FILLS, 2):
        if {one, other} not in ({"device", "device RC"}, {"level shifter", "level shifters"}):
            assert FILLS[one] != FILLS[other], (one, other)


# -- energy against time -----------------------------------------------------------------------------------------


def test_the_csv_of_the_curves_contains_exactly_the_plotted_points(tmp_path: Path):
    record = mixed()
    chart = drawn(mixed)["energy-delay"]
    place = tmp_path / "chart.csv"
    write_csv(chart.points, place)
    with place.open(newline="", encoding="utf-8") as handle:
        written = {(float(row["time_s"]), float(row["energy_J"])) for row in csv.DictReader(handle)}
    plotted = set(_values(chart.spec, "time_s", "energy_J"))
    assert written == plotted
    points = {(row["time_s"], row["energy_J"]) for row in curve_rows(record)}
    points |= {(row["time_s"], row["energy_J"]) for row in policy_rows(record) if is_number(row["time_s"])}
    corners = {(row["time_s"], row["energy_J"]) for row in envelope_path(envelope_rows(record)) if row["corner"]}
    assert plotted <= points | corners


def test_infeasible_points_are_dotted_and_feasible_ones_are_not():
    chart = drawn(mixed)["energy-delay"]
    failing, good = set(), set()
    for layer in _layers(chart.spec):
        if layer["mark"]["type"] == "line" and "time_s" in json.dumps(layer["encoding"]):
            rows = {(row["time_s"], row["energy_J"]) for row in layer["data"]["values"]}
            (failing if layer["mark"].get("strokeDash") == [1.5, 3.5] else good).update(rows)
    bad = {(r["time_s"], r["energy_J"]) for r in chart.points if r["state"] == "infeasible"}
    assert bad
    assert bad <= failing
    assert not bad & good
    reasons = {row["reason"] for row in chart.points if row["state"] == "infeasible"}
    assert reasons
    assert "" not in reasons


def test_the_reference_line_never_lies_above_a_feasible_contender():
    record = mixed()
    path = envelope_path(envelope_rows(record))
    for row in curve_rows(record):
        if row["role"] == "contender" and row["state"] == "feasible":
            reached = [p["energy_J"] for p in path if p["time_s"] <= row["time_s"]]
            assert min(reached) <= row["energy_J"]


def test_design_points_are_those_of_the_policies():
    record = mixed()
    chart = drawn(mixed)["energy-delay"]
    columns = ("policy", "side", "time_s", "energy_J")
    shown = {tuple(row[name] for name in columns) for row in chart.points if row["series"] == "design point"}
    expected = {
        tuple(row[name] for name in columns)
        for row in policy_rows(record)
        if row["state"] == "feasible" and (row["role"] == "candidate" or row["strongest"])
    }
    assert shown == expected


def test_points_that_no_log_axis_can_show_are_dropped_and_counted():
    def change(record: Any) -> None:
        points = record["curves"][0]["points"]
        points[0]["energy"], points[1]["time"], points[2]["energy"] = 0.0, None, -1e-18

    chart = energy_delay(changed(mixed(), change))
    assert "3 points without a positive time and energy dropped from the log axes" in chart.caption
    assert min(energy for _, energy in _values(chart.spec, "time_s", "energy_J")) > 0.0
    assert "dropped" not in drawn(mixed)["energy-delay"].caption
    kept, lost = positive([{"x": 1.0}, {"x": 0.0}, {"x": "infeasible"}, {"x": None}], "x")
    assert (kept, lost) == ([{"x": 1.0}], 3)


def test_points_outside_the_axes_are_counted():
    record = mixed()
    chart = drawn(mixed)["energy-delay"]
    shown = sum(row["series"] == "curve" for row in chart.points)
    outside = re.search(r"(\d+) swept points? outside the axes not shown", chart.caption)
    every = sum(len(curve["points"]) for curve in record["curves"])
    assert shown + (int(outside[1]) if outside else 0) == every


def test_the_caption_of_the_curves_agrees_with_the_numbers():
    record = mixed()
    chart = drawn(mixed)["energy-delay"]
    deadline = next(row for row in record["requirements"] if row["name"] == "deadline")
    assert f"later than the deadline {amount(deadline['demanded'], 's')}" in chart.caption
    good = [row for row in curve_rows(record) if row["role"] == "candidate" and row["state"] == "feasible"]
    fastest = min(good, key=lambda row: row["time_s"])
    assert f"fastest feasible point {amount(fastest['time_s'], 's')} at" in chart.alternative


# -- advantage ------------------------------------------------------------------------------------------------------


def test_the_advantage_breaks_where_one_side_cannot_reach():
    record = changed(crossing(), lambda r: r["advantage_against_time"][40].update(advantage=None))
    chart = charts(record)["advantage-against-time"]
    runs = {
        row["run"]
        for layer in _layers(chart.spec)
        if layer["mark"]["type"] == "line"
        for row in layer["data"]["values"]
    }
    assert len(runs) == 2
    shown = _values(chart.spec, "time_s", "advantage")
    expected = [(r["time"], r["advantage"]) for r in record["advantage_against_time"] if r["advantage"] is not None]
    assert sorted(set(shown)) == sorted(expected)
    assert {row["advantage"] for row in chart.points if row["reason"]} == {"infeasible"}


def test_crossings_are_said_in_words_and_agree_with_the_record():
    record = crossing()
    assert {row["level"] for row in record["crossings"]} == {1.0, 2.0}
    chart = charts(record)["advantage-against-time"]
    for row in record["crossings"]:
        assert amount(row["time"], "s") in chart.caption
    assert "crosses the required advantage 2 at" in chart.caption
    assert "stays" not in chart.caption
    never = drawn(mixed)["advantage-against-time"].caption
    assert "stays at or above the required advantage 2" in never


def test_nodes_stand_in_order_and_a_crossing_is_marked():
    record = crossing()
    chart = drawn(crossing)["advantage-by-node"]
    assert [row["node"] for row in chart.points] == [row["label"] for row in record["nodes"]]
    assert "passes 2 between g1 and g2" in chart.caption
    assert "1.9" in chart.caption
    assert "2.1" in chart.caption
    gone = changed(record, lambda r: r["nodes"][1].update(advantage=None, note="candidate infeasible"))
    caption = charts(gone)["advantage-by-node"].caption
    assert "g2: infeasible (candidate infeasible)" in caption


# -- parts, margins, swings -----------------------------------------------------------------------------------------


@pytest.mark.parametrize(("quantity", "unit", "column"), [("time", "s", "time"), ("energy", "J", "energy")])
def test_bars_start_at_zero_share_one_scale_and_say_totals(quantity: str, unit: str, column: str):
    record = mixed()
    chart = drawn(mixed)[f"{quantity}-parts"]
    primary = record["policies"][0]
    strongest = next(side for side in primary["contenders"] if side["id"] == primary["strongest"])
    totals = [primary["candidate"]["point"][column], strongest["point"][column]]
    for total in totals:
        assert amount(total, unit) in chart.caption
    domain = next(iter(_layers(chart.spec)))["encoding"]["x"]["scale"]["domain"]
    assert domain[0] == 0.0
    boxes = [
        row
        for layer in _layers(chart.spec)
        if layer["mark"]["type"] == "rect" and layer["mark"].get("stroke")
        for row in layer["data"]["values"]
    ]
    ends = sorted({round(row["c"], 6) for row in boxes})
    scale = max(totals) / max(ends)
    for total in totals:
        assert any(end * scale == pytest.approx(total, rel=1e-5) for end in ends)
    sides = (primary["candidate"], strongest)
    parts = {(side["id"], part) for side in sides for part in side["point"][f"{quantity}_parts"]}
    assert {(row["side"], row["part"]) for row in chart.points} == parts


def test_failed_requirements_come_first_and_unknown_is_open():
    chart = drawn(infeasible)["requirement-margins"]
    states = [row["state"] for row in chart.points]
    assert states == sorted(states, key=["fail", "unknown", "pass"].index)
    assert "Failed: " in chart.caption
    assert "Unknown: thermal noise" in chart.caption
    assert "unknown" not in drawn(mixed)["requirement-margins"].caption.split("question mark.")[1]
    by_name = {row["requirement"]: row for row in chart.points}
    assert by_name["deadline"]["margin_decades"] == pytest.approx(math.log10(0.01))
    assert by_name["thermal_noise"]["margin_decades"] == "unknown"
    assert by_name["device_limits"]["margin_decades"] == "infinite"
    assert by_name["power_density"]["margin_decades"] == "-infinite"


def test_a_pass_lies_right_of_the_limit_and_a_failure_left():
    chart = drawn(infeasible)["requirement-margins"]
    for layer in _layers(chart.spec):
        mark = layer["mark"]
        if mark["type"] == "rect" and mark.get("stroke") in ("#0072B2", "#D55E00"):
            for row in layer["data"]["values"]:
                assert (row["c"] > 1e-12) == (mark["stroke"] == "#0072B2")
                assert (row["a"] < -1e-12) == (mark["stroke"] == "#D55E00")


def test_at_most_twelve_inputs_are_drawn_and_the_rest_counted():
    record = crossing()
    chart = drawn(crossing)["input-swings"]
    ranged = [row for row in record["verdict"]["moves"] if row["ranged"]]
    assert len(ranged) > 12
    assert [row["key"] for row in chart.points] == [row["key"] for row in ranged[:12]]
    assert f"{len(ranged) - 12} further inputs" in chart.caption
    assert "flips at" in json.dumps(chart.spec)
    assert NOT_PERMITTED in {row["advantage_at_high"] for row in chart.points}
    first = ranged[0]
    assert number(first["flip"], 2) in chart.caption


# -- drawing ---------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("record", RECORDS)
def test_drawing_twice_gives_the_same_bytes(record):
    again = charts(record())
    for key, chart in drawn(record).items():
        assert chart == again[key]
        if chart.spec is not None:
            assert to_svg(chart.spec) == to_svg(again[key].spec)


def test_pictures_of_points_are_the_same_bytes_too():
    spec = drawn(mixed)["energy-delay"].spec
    assert to_png(spec) == to_png(spec)


def test_text_of_the_record_never_becomes_an_expression_or_a_link():
    record = hostile(mixed())
    specs = [chart.spec for chart in charts(record).values() if chart.spec is not None]
    assert len(specs) >= 9
    for spec in specs:
        for layer in _layers(spec):
            outside = json.dumps({key: value for key, value in layer.items() if key != "data"})
            assert "owned" not in outside
            assert "href" not in outside
            assert "example.invalid" not in outside
        assert "owned" not in json.dumps(spec["config"])


def test_hostile_words_are_drawn_as_words():
    for chart in charts(hostile(mixed())).values():
        if chart.spec is None:
            continue
        svg = to_svg(chart.spec)
        root = ElementTree.fromstring(inline_svg(svg, chart.key, chart.alternative))
        assert {element.tag for element in root.iter()} <= SVG_ELEMENTS
        assert not any(name.lower().startswith("on") or "href" in name for e in root.iter() for name in e.attrib)
        written = "".join(root.itertext())
        if chart.key == "input-swings":
            assert "</script></style></" in written  # the beginning of the hostile text, as text


@pytest.mark.parametrize(
    "svg",
    [
        '<svg xmlns="http://www.w3.org/2000/svg"><script>1</script></svg>',
        '<svg xmlns="http://www.w3.org/2000/svg"><image href="http://example.invalid/x"/></svg>',
        '<svg xmlns="http://www.w3.org/2000/svg" onload="1"/>',
        '<svg xmlns="http://www.w3.org/2000/svg"><a><text>x</text></a></svg>',
        '<svg xmlns="http://www.w3.org/2000/svg"><rect fill="url(http://example.invalid/x)"/></svg>',
        '<html xmlns="http://www.w3.org/1999/xhtml"/>',
    ],
)
def test_a_drawing_that_could_run_or_load_something_stops_the_report(svg: str):
    with pytest.raises(ValueError, match="does not allow"):
        inline_svg(svg, "key", "words")


def test_ids_of_drawings_do_not_clash():
    svg = '<svg xmlns="http://www.w3.org/2000/svg"><g clip-path="url(#c)"><rect id="c"/></g></svg>'
    found = inline_svg(svg, "one", "words")
    assert 'clip-path="url(#one-c)"' in found
    assert 'id="one-c"' in found


# -- axes -------------------------------------------------------------------------------------------------------------


def test_log_axis_maps_both_ways_and_marks_decades():
    axis = LogAxis(1e-12, 1e-6, 600.0, "s", "time (s)")
    assert axis.pixel(1e-9) == pytest.approx(300.0)
    assert axis.value(axis.pixel(3e-10)) == pytest.approx(3e-10)
    major, minor = axis.ticks()
    assert major == [1e-12, 1e-11, 1e-10, 1e-9, 1e-8, 1e-7, 1e-6]
    assert len(minor) == 6 * 8
    assert [axis.label(tick) for tick in major[:4]] == ["1 ps", "10 ps", "100 ps", "1 ns"]
    flipped = LogAxis(1e-12, 1e-6, 600.0, "s", "time (s)", vertical=True)
    assert flipped.pixel(1e-6) == pytest.approx(0.0)


def test_a_narrow_axis_labels_between_decades():
    major, minor = LogAxis(0.07, 3.0, 400.0, "1", "advantage").ticks()
    assert {0.1, 0.2, 0.5, 1.0, 2.0} <= set(major)
    assert not set(major) & set(minor)


def test_a_very_long_axis_labels_fewer_decades():
    major, minor = LogAxis(1e-30, 1.0, 400.0, "1", "x").ticks()
    assert len(major) <= 10
    assert not set(major) & set(minor)
