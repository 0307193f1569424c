"""What notebooks show: every text escaped, values and words of the set and the record, readable on light and dark."""

from __future__ import annotations

import dataclasses
import re
from collections.abc import Callable
from html.parser import HTMLParser
from typing import Any

import pytest

from benchmark import api
from benchmark.api import html
from benchmark.record.text import answer_sentence
from tests import report_records, studies
from tests.report_records import HOSTILE

TAGS = {"div", "p", "strong", "ul", "li", "table", "caption", "thead", "tbody", "tr", "th", "td"}


class Reader(HTMLParser):
    """Tags, attributes and text of a piece of HTML; refuses what is not well nested."""

    def __init__(self, piece: str) -> None:
        super().__init__(convert_charrefs=True)
        self.tags: list[str] = []
        self.attributes: list[tuple[str, str]] = []
        self.cells: list[str] = []
        self.open: list[tuple[str, int]] = []
        self.feed(piece)
        self.close()
        assert self.open == []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        self.open.append((tag, len(self.cells)))
        self.attributes += [(name, value or "") for name, value in attrs]
        self.cells.append("")

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop()[0] == tag

    def handle_data(self, data: str) -> None:
        self.cells[self.open[-1][1]] += data

    def handle_comment(self, data: str) -> None:
        raise AssertionError(data)

    def handle_decl(self, decl: str) -> None:
        raise AssertionError(decl)


def harmless(piece: str) -> Reader:
    """Only our tags and attributes, no colour of its own, nothing to load."""
    found = Reader(piece)
    assert set(found.tags) <= TAGS
    assert {name for name, _ in found.attributes} <= {"style", "scope"}
    styles = ";".join(value for name, value in found.attributes if name == "style")
    assert "url(" not in styles
    colours = set(re.findall(r"(?:color|background):([^;]+)", styles))
    assert colours <= {"inherit", "transparent"}
    assert set(re.findall(r"rgba?\([^)]*\)", styles)) <= {"rgba(128,128,128,.5)"}
    assert "#" not in styles
    return found


@pytest.fixture(scope="module")
def study(tmp_path_factory: pytest.TempPathFactory) -> api.StudyView:
    return api.load_study(studies.mixed().write(tmp_path_factory.mktemp("mixed")))


RECORDS: dict[str, Callable[[], Any]] = {
    "mixed": report_records.mixed,
    "infeasible": report_records.infeasible,
    "crossing": report_records.crossing,
}


@pytest.mark.parametrize("name", RECORDS)
def test_a_result_shows_its_verdict(name: str):
    result = api.Result(RECORDS[name]())
    record = result.record
    shown = harmless(result._repr_html_())
    assert shown.cells.count(record["verdict"]["word"]) == 1
    assert any(answer_sentence(record) in cell for cell in shown.cells)
    for text in (*record["verdict"]["reasons"], *record["verdict"]["conditions"]):
        assert text in shown.cells
    demands = shown.cells[shown.cells.index("requirement") :]
    for row in record["requirements"]:
        place = demands.index(row["name"].replace("_", " "))
        assert demands[place + 1 : place + 3] == [row["kind"], row["state"]]
    for policy in record["policies"]:
        assert any(cell.startswith(policy["policy"]) for cell in shown.cells)
    assert "nan" not in shown.cells
    assert "None" not in shown.cells


def test_what_was_changed_is_shown():
    record = report_records.mixed()
    record["what_if"] = {"activity": "0.1"}
    assert "activity = 0.1" in harmless(api.Result(record)._repr_html_()).cells


@pytest.mark.parametrize("name", RECORDS)
def test_hostile_texts_of_a_record_stay_text(name: str):
    record = report_records.hostile(RECORDS[name]())
    record["what_if"] = {HOSTILE: HOSTILE}
    shown = harmless(api.Result(record)._repr_html_())
    assert sum(HOSTILE.split("\x01")[0] in cell for cell in shown.cells) > 10
    assert "\x01" not in "".join(shown.cells)


def test_a_set_shows_every_value_with_its_origin():
    view = api.load_set("demo-stress-gated")
    item = view.parameters
    shown = harmless(view._repr_html_())
    heads = shown.cells[shown.cells.index("name") :][: 9 + len(item.nodes) - 1]
    assert heads == ["name", "symbol", *item.nodes, "unit", "spread", "evidence", "source", "where", "set by"]
    for name, value in item.values.items():
        row = shown.cells[shown.cells.index(name) :][: len(heads)]
        numbers = [value.in_unit(float(value.at(item.position(node)).si[0])) for node in item.nodes]
        assert [float(cell) for cell in row[2 : 2 + len(item.nodes)]] == pytest.approx(numbers, rel=1e-5)
        assert row[2 + len(item.nodes)] == value.unit
        assert row[4 + len(item.nodes)] == value.evidence
        assert row[5 + len(item.nodes)] == (value.source or "-")
    for key in {value.source for value in item.values.values() if value.source}:
        assert view.sources[key].citation in shown.cells
    for name, word in item.options.items():
        place = shown.cells.index(name)
        assert shown.cells[place + 1] == word


def test_wires_and_stage_results_are_shown_too():
    for name in ("wires-7nm", "demo-stage-table", "demo-table"):
        assert name in "".join(harmless(api.load_set(name)._repr_html_()).cells)


def test_hostile_texts_of_a_set_stay_text():
    view = api.load_set("demo-stress-gated")
    item = view.parameters
    values = {
        name: dataclasses.replace(value, unit=value.unit, where=HOSTILE, origin=HOSTILE if value.is_default else "")
        for name, value in item.values.items()
    }
    bad = dataclasses.replace(item, title=HOSTILE, note=HOSTILE, id=HOSTILE, values=values)
    sources = {key: dataclasses.replace(source, title=HOSTILE) for key, source in view.sources.items()}
    shown = harmless(api.SetView(bad, sources)._repr_html_())
    assert sum(HOSTILE.split("\x01")[0] in cell for cell in shown.cells) > len(values)


def test_a_study_shows_the_question(study: api.StudyView):
    shown = harmless(study._repr_html_())
    for text in (study.title, *study.sets, *(name.replace("_", " ") for name in study.study.requirements)):
        assert any(text in cell for cell in shown.cells), text
    for name, value in study.study.values.items():
        place = shown.cells.index(name)
        assert float(shown.cells[place + 1]) == pytest.approx(value.in_unit(float(value.si[0])), rel=1e-5)
    changed = api.what_if(study, activity=0.07)
    assert "activity = 0.07" in harmless(changed._repr_html_()).cells


def test_hostile_texts_of_a_study_stay_text(study: api.StudyView):
    bad = dataclasses.replace(study.study, title=HOSTILE, product=HOSTILE, operation=HOSTILE, circuit=HOSTILE)
    view = dataclasses.replace(study, study=bad, what_if={HOSTILE: HOSTILE})
    assert sum(HOSTILE.split("\x01")[0] in cell for cell in harmless(view._repr_html_()).cells) >= 3


def test_texts_are_short_and_of_one_line(study: api.StudyView):
    result = api.Result(report_records.mixed())
    assert repr(result) == "Result(mixed: conditional go; advantage 3.085, required 2)"
    assert repr(api.Result(report_records.infeasible())) == (
        "Result(mixed: no-go, requirement failed; advantage not stated, required 2)"
    )
    assert repr(api.load_set("open-7nm-regular")).startswith("SetView(open-7nm-regular: virtual-source, node n7, ")
    assert repr(api.load_set("wires-7nm")) == "SetView(wires-7nm: wires, node n7, 3 values)"
    changed = api.what_if(study, activity=0.07)
    assert repr(changed).endswith(", what-if activity = 0.07)")
    for view in (study, changed, result):
        assert len(repr(view)) < 160
        assert "\n" not in repr(view)


def test_pieces():
    assert html.text("<b>&\"'") == "&lt;b&gt;&amp;&quot;&#x27;"
    assert html.note("") == html.bullets("t", []) == html.table("t", ["a"], []) == ""
    cells = Reader(html.table("T", ["a", "b"], [(1, "<i>")])).cells
    assert [cell for cell in cells if cell] == ["T", "a", "b", "1", "<i>"]
