"""Every mark leads to the row of its numbers, every row to formula, values and back; no drawing leads elsewhere."""

from __future__ import annotations

import itertools
import re
from collections.abc import Callable
from typing import Any
from xml.etree import ElementTree

import pytest

from benchmark.report.charts import charts
from benchmark.report.energy_delay import plane_of
from benchmark.report.energy_delay_layers import policy_groups, supplies_of
from benchmark.report.folder import report_page
from benchmark.report.formulas import PARTS, formula_of_part
from benchmark.report.placing import Box
from benchmark.report.rows import part_rows
from benchmark.report.spots import TARGET, Spot, Spots
from benchmark.report.svg import inline_svg
from benchmark.report.trails import trail
from tests.near import near
from tests.report_records import crossing, hostile, infeasible, mixed

RECORDS = [mixed, crossing, infeasible, lambda: hostile(mixed())]
IDS = ["mixed", "crossing", "infeasible", "hostile"]
SVG = "{http://www.w3.org/2000/svg}"
DRAWING = '<svg xmlns="http://www.w3.org/2000/svg">{}</svg>'


@pytest.mark.parametrize("record", RECORDS, ids=IDS)
def test_places_lie_in_the_drawing_and_name_a_row(record: Callable[[], dict[str, Any]]):
    for chart in charts(record()).values():
        assert bool(chart.spots) == (chart.spec is not None)
        if chart.spec is None:
            continue
        padding = chart.spec["padding"]
        width = padding["left"] + chart.spec["width"] + padding["right"]
        height = padding["top"] + chart.spec["height"] + padding["bottom"]
        for spot in chart.spots:
            assert 0 <= spot.row < len(chart.points)
            assert spot.name.strip()
            assert -TARGET / 2 <= spot.box.left < spot.box.right <= width + TARGET / 2
            assert -TARGET / 2 <= spot.box.top < spot.box.bottom <= height + TARGET / 2


def test_every_mark_of_the_curves_has_its_place_with_its_numbers():
    record = crossing()
    chart = charts(record)["energy-delay"]
    plane = plane_of(record, float(chart.spec["width"]), float(chart.spec["height"]))  # type: ignore[index]
    assert plane is not None
    wanted = [row for rows in supplies_of(plane).values() for row in rows] + [m for m, _ in policy_groups(plane)]
    middles = [(0.5 * (s.box.left + s.box.right), 0.5 * (s.box.top + s.box.bottom), s) for s in chart.spots]
    left, top = chart.spec["padding"]["left"], chart.spec["padding"]["top"]  # type: ignore[index]
    assert len(wanted) > 8
    for row in wanted:
        x, y = plane.pixel(row)
        here = [s for a, b, s in middles if abs(a - x - left) < 1e-6 and abs(b - y - top) < 1e-6]
        rows = [chart.points[spot.row] for spot in here]
        assert any(near(r["time_s"]) == row["time_s"] and near(r["energy_J"]) == row["energy_J"] for r in rows)


def test_bars_requirements_and_nodes_each_have_a_place():
    found = charts(crossing())
    for key in ("requirement-margins", "input-swings", "advantage-by-node"):
        chart = found[key]
        assert {spot.row for spot in chart.spots} == set(range(len(chart.points)))
    for quantity in ("time", "energy"):
        chart = found[f"{quantity}-parts"]
        shown = {index for index, row in enumerate(chart.points) if row["value_SI"] > 0.0}
        assert {spot.row for spot in chart.spots} == shown
        assert {spot.href for spot in chart.spots} <= {f"#point-{r}-{quantity}" for r in ("candidate", "contender")}


def test_places_of_marks_touch_but_do_not_cover_one_another():
    spots = Spots(10.0, 20.0)
    for x, y in ((0.0, 0.0), (12.0, 3.0), (200.0, 0.0)):
        spots.mark(x, y, 0, "mark")
    boxes = [spot.box for spot in spots.found()]
    assert [box.right - box.left for box in boxes] == [12.0, 12.0, TARGET]
    assert all(one.overlap(other) == 0.0 for one, other in itertools.combinations(boxes, 2))
    assert boxes[2].left == 10.0 + 200.0 - TARGET / 2


def test_lone_marks_and_bars_are_large_enough_to_touch():
    """WCAG 2.2, 2.5.8: 24 CSS pixels; the page shows drawings no smaller than at 576 px of width."""
    for key, chart in charts(crossing()).items():
        if chart.spec is None or key.endswith("-parts") or key.startswith(("limits", "node-steps")):
            continue
        padding = chart.spec["padding"]
        scale = 576.0 / (padding["left"] + chart.spec["width"] + padding["right"])
        lone = [s for s in chart.spots if all(s is o or _distance(s, o) >= TARGET for o in chart.spots)]
        assert lone, key
        for spot in lone:
            assert min(spot.box.right - spot.box.left, spot.box.bottom - spot.box.top) * min(1.0, scale) >= 23.9


def _distance(one: Spot, other: Spot) -> float:
    x = 0.5 * abs(one.box.left + one.box.right - other.box.left - other.box.right)
    y = 0.5 * abs(one.box.top + one.box.bottom - other.box.top - other.box.bottom)
    return max(x, y)


@pytest.mark.parametrize("record", RECORDS, ids=IDS)
def test_every_row_of_data_leads_back_and_on(record: Callable[[], dict[str, Any]]):
    made = record()
    page = report_page(made)
    targets = set(re.findall(r'href="#([^"]+)"', page))
    ids = set(re.findall(r'\bid="([^"]+)"', page))
    assert targets <= ids
    for chart in charts(made).values():
        for index, row in enumerate(chart.points):
            places = [place for _, place in trail(made, chart, index, row).links]
            assert any(place in (f"#{chart.key}-mark-{index + 1}", f"#chart-{chart.key}") for place in places)
            assert any(place.startswith("#formula-") for place in places)
            assert any(place.startswith(("#value-", "#ledger")) for place in places)


def test_a_swing_leads_to_its_own_value():
    record = mixed()
    chart = charts(record)["input-swings"]
    for index, row in enumerate(chart.points):
        (place,) = [place for words, place in trail(record, chart, index, row).links if words == "value"]
        assert record["ledger"][int(place.removeprefix("#value-")) - 1]["key"] == row["key"]


def test_every_part_has_a_formula():
    for row in part_rows(crossing()) + part_rows(mixed()):
        assert row["part"] in PARTS
        assert re.fullmatch("part-[a-z-]+", formula_of_part(row["part"]))


def test_places_become_links_beside_an_image():
    spots = [Spot(Box(0, 0, 30, 30), 4, "first"), Spot(Box(40, 0, 70, 30), 4, "second", "#elsewhere")]
    root = ElementTree.fromstring(inline_svg(DRAWING.format("<rect/>"), "key", "words", "title", spots))
    image, links = list(root)
    assert (image.get("role"), image.get("aria-label"), root.get("role")) == ("img", "words", "group")
    assert not list(image.iter("a"))
    found = list(links.iter("a"))
    assert [link.get("href") for link in found] == ["#data-key-5", "#elsewhere"]
    assert [link.findtext("title") for link in found] == ["first", "second"]
    assert [link.get("id") for link in found] == ["key-mark-5", None]


OUTSIDE = [
    "http://example.invalid/",
    "//example.invalid/",
    "javascript:alert(1)",
    "JavaScript:alert(1)#a",
    "data:text/html,x",
    "other.html#a",
    "#",
    "",
    "#a b",
    "#a\nb",
    "#1a",
    " #a",
]


@pytest.mark.parametrize("href", OUTSIDE)
def test_a_link_that_leaves_the_page_stops_the_report(href: str):
    with pytest.raises(ValueError, match=r"links to .* does not allow"):
        inline_svg(DRAWING.format("<rect/>"), "key", "words", "title", [Spot(Box(0, 0, 1, 1), 0, "x", href or " ")])
    root = ElementTree.fromstring(DRAWING.format("<a><rect/></a>"))
    next(iter(root)).set("href", href)
    with pytest.raises(ValueError, match=r"links to .* does not allow"):
        inline_svg(ElementTree.tostring(root, encoding="unicode"), "key", "words")


@pytest.mark.parametrize(
    "inside",
    [
        '<a href="#a" onclick="1"><rect/></a>',
        '<a href="#a" target="_blank"><rect/></a>',
        '<a href="#a" xmlns:x="http://www.w3.org/1999/xlink" x:href="http://example.invalid/"><rect/></a>',
        '<rect href="#a"/>',
        '<use href="#a"/>',
        '<a href="#a"><animate attributeName="href" to="http://example.invalid/"/></a>',
    ],
)
def test_only_a_plain_link_to_a_place_on_the_page_is_let_through(inside: str):
    with pytest.raises(ValueError, match="does not allow"):
        inline_svg(DRAWING.format(inside), "key", "words")
    assert 'href="#a"' in inline_svg(DRAWING.format('<a href="#a"><rect/></a>'), "key", "words")


def test_words_of_the_record_stay_words_in_the_names_of_marks():
    page = report_page(hostile(mixed()))
    titles = re.findall(r"<title>(.*?)</title>", page.partition("<body>")[2], re.DOTALL)
    assert any("&lt;script" in title for title in titles)
    assert not any("<" in title for title in titles)
