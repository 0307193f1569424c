"""The page as text: sections in order, every value present, hostile text inert, record carried along."""

from __future__ import annotations

import base64
import functools
import hashlib
import html
import itertools
import json
import re
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import pytest

from benchmark.record.text import answer_sentence
from benchmark.record.write import to_json
from benchmark.report.charts import charts
from benchmark.report.figure import to_svg
from benchmark.report.folder import fill_folder
from benchmark.report.page import digest_of, page
from benchmark.report.words import amount, visible
from tests.report_records import HOSTILE, changed, crossing, hostile, hub, infeasible, mixed

SECTIONS = [
    *(
        "answer",
        "findings",
        "question",
        "requirements",
        "curves",
        "required-time",
        "parts",
        "points",
        "policies",
        "ladder",
        "robustness",
        "uncertainty",
        "moves",
        "next-measurement",
        "need",
        "nodes",
        "anchors",
    ),
    *("closed-form", "ledger", "options", "conventions", "circuit", "not-modelled", "self-checks", "warnings"),
    *("reproduce", "sources", "terms", "cautions"),
]
VOID = {"meta", "input", "br", "img", "link", "hr"}


def render(record: dict[str, Any]) -> str:
    found = charts(record)
    drawings = {key: to_svg(chart.spec) for key, chart in found.items() if chart.spec is not None}
    return page(record, found, drawings)


@functools.cache
def page_of(record: Any) -> str:
    return render(record())


class Outline(HTMLParser):
    """Elements, attributes, text and nesting of a page."""

    def __init__(self, text: str) -> None:
        super().__init__(convert_charrefs=True)
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.stack: list[str] = []
        self.problems: list[str] = []
        self.words: list[str] = []
        self.scripts: list[tuple[dict[str, str | None], str]] = []
        self.feed(text)
        self.close()
        self.problems += [f"unclosed {name}" for name in self.stack]

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, dict(attrs)))
        if len({name for name, _ in attrs}) != len(attrs):
            self.problems.append(f"attribute twice on {tag}")
        if tag not in VOID:
            self.stack.append(tag)
        if tag == "script":
            self.scripts.append((dict(attrs), ""))

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        if not self.stack or self.stack.pop() != tag:
            self.problems.append(f"stray end of {tag}")

    def handle_data(self, data: str) -> None:
        if self.stack and self.stack[-1] == "script":
            attributes, text = self.scripts.pop()
            self.scripts.append((attributes, text + data))
        elif self.stack and self.stack[-1] != "style":
            self.words.append(data)

    def all(self, tag: str) -> list[dict[str, str | None]]:
        return [attributes for name, attributes in self.elements if name == tag]

    @property
    def text(self) -> str:
        return " ".join(" ".join(self.words).split())


RECORDS = [mixed, hub, infeasible, crossing]


@pytest.mark.parametrize("record", RECORDS)
def test_sections_stand_in_order_and_the_page_is_well_formed(record):
    outline = Outline(page_of(record))
    assert outline.problems == []
    assert [attributes["id"] for attributes in outline.all("section")] == SECTIONS
    ids = [attributes["id"] for _, attributes in outline.elements if "id" in attributes]
    assert len(set(ids)) == len(ids)
    for attributes in outline.all("a"):
        target = str(attributes["href"])
        assert target.startswith("#")
        assert target[1:] in ids


@pytest.mark.parametrize("record", RECORDS)
def test_structure_is_accessible(record):
    outline = Outline(page_of(record))
    headings = [int(name[1]) for name, _ in outline.elements if re.fullmatch("h[1-6]", name)]
    assert headings[0] == 1
    assert headings.count(1) == 1
    assert all(b <= a + 1 for a, b in itertools.pairwise(headings))
    assert len(outline.all("caption")) == len(outline.all("table"))
    assert all(attributes.get("scope") in ("col", "row") for attributes in outline.all("th"))
    assert outline.all("html")[0]["lang"] == "en"
    labels = {attributes["for"] for attributes in outline.all("label")}
    for tag in ("input", "select"):
        assert {attributes["id"] for attributes in outline.all(tag)} <= labels
    for attributes in outline.all("svg"):
        assert attributes["role"] == "group", "the drawing inside is the image, links stand beside it"
        assert attributes["aria-label"]
    images = [attributes for attributes in outline.all("g") if attributes.get("role") == "img"]
    assert len(images) == len(outline.all("svg"))
    assert all(attributes["aria-label"] for attributes in images)
    for attributes in outline.all("div"):
        if "scroll" in str(attributes.get("class")):
            assert attributes["tabindex"] == "0"
            assert attributes["role"] == "region"
            assert attributes.get("aria-label") or attributes.get("aria-labelledby")


def test_the_content_policy_allows_nothing_but_the_one_script():
    outline = Outline(page_of(mixed))
    policy = next(a["content"] for a in outline.all("meta") if a.get("http-equiv") == "Content-Security-Policy")
    rules = dict(rule.strip().split(" ", 1) for rule in str(policy).split(";"))
    assert rules["default-src"] == "'none'"
    assert rules["style-src"] == "'unsafe-inline'"
    assert rules["img-src"] == "data:"
    running = [text for attributes, text in outline.scripts if attributes.get("type") != "application/json"]
    assert len(running) == 1
    digest = base64.b64encode(hashlib.sha256(running[0].encode()).digest()).decode()
    assert rules["script-src"] == f"'sha256-{digest}'"
    for tag in ("link", "img", "iframe", "object", "embed", "base", "form"):
        assert not outline.all(tag)
    names = {name for _, attributes in outline.elements for name in attributes}
    assert not {name for name in names if name.startswith("on") or name in ("src", "srcset", "action")}


def test_the_page_carries_its_record_to_the_last_digit():
    record = mixed()
    outline = Outline(page_of(mixed))
    text = next(text for attributes, text in outline.scripts if attributes.get("id") == "record")
    assert json.loads(text) == json.loads(to_json(record))
    assert not set("<>&") & set(text)  # nothing in it can end the element or open a comment
    assert hashlib.sha256(to_json(json.loads(text)).encode()).hexdigest() == digest_of(record)
    assert digest_of(record) in outline.text


def test_the_first_screen_answers():
    record = mixed()
    text = Outline(page_of(mixed)).text
    assert answer_sentence(record) in text
    assert "Demonstration: some inputs are invented" in text
    for name in ("Decisive inputs:", "First thing to measure:", "Record: sha256", "Why"):
        assert name in text
    assert f"made {record['created']}" in text
    real = changed(record, lambda r: r["study"].update(demonstration=False))
    assert "some inputs are invented" not in Outline(render(real)).text


def test_conditions_stand_on_the_first_screen_and_all_of_them_further_down():
    conditions = [f"study.value_{i} at least {i} V (invented)" for i in range(11)]
    record = changed(mixed(), lambda r: r["verdict"].update(word="conditional go", conditions=conditions))
    source = render(record)
    first = source[source.index('<section id="answer"') : source.index('<section id="question"')]
    rest = source[source.index('<section id="moves"') : source.index('<section id="nodes"')]
    assert "Conditions: each of these must hold" in first
    assert "and 3 more, listed in the section What moves the answer" in first
    assert all(text in rest for text in conditions)


def test_all_slots_of_the_question_are_filled():
    outline = Outline(page_of(mixed))
    for slot in (
        *("Product class", "Operation and workload", "Requirements", "Candidate", "Contenders"),
        *("Required advantage", "Metric", "Policy", "Evidence", "Criteria fixed"),
    ):
        assert slot in outline.words
    assert "2026-01-12 by example team (fictional)" in outline.text


def test_every_value_stands_in_the_ledger_with_what_is_known_of_it():
    record = mixed()
    found = re.search('<table id="ledger-table">(.*?)</table>', page_of(mixed), re.S)
    assert found
    rows = re.findall("<tr.*?</tr>", found[1], re.S)[1:]
    assert len(rows) == len(record["ledger"])
    for row, entry in zip(rows, record["ledger"], strict=True):
        text = html.unescape(re.sub("<[^>]+>", " ", row))
        assert entry["name"].replace("_", " ") in text
        assert entry["meaning"] in text
        assert entry["evidence"] in text
        assert entry["set_by"] in text
        assert (entry["origin"] in text) if entry["set_by"] == "default" else (entry["file"] in text)
        if entry["spread"]:
            assert entry["spread"]["meaning"] in text
        else:
            assert "no range stated" in text
        assert entry["unit"] == "1" or entry["unit"] in text
    defaults = sum(row["set_by"] == "default" for row in [*record["ledger"], *record["options"]])
    assert defaults > 0
    assert f"{defaults} defaults set by the program" in Outline(page_of(mixed)).text


def test_defaults_are_counted_one_by_one():
    record = mixed()
    user = next(row for row in record["ledger"] if row["set_by"] == "user")
    before = re.search(r"(\d+) defaults? set by the program", Outline(page_of(mixed)).text)

    def change(r: dict[str, Any]) -> None:
        row = next(row for row in r["ledger"] if row["key"] == user["key"])
        row |= {"set_by": "default", "origin": "a made-up origin"}

    text = Outline(render(changed(record, change))).text
    after = re.search(r"(\d+) defaults? set by the program", text)
    assert before
    assert after
    assert int(after[1]) == int(before[1]) + 1
    assert "a made-up origin" in text


def test_infeasible_is_a_word_with_its_reason():
    text = Outline(page_of(infeasible)).text
    assert "infeasible: cannot reach 1e-12 s per operation" in text
    assert "None" not in text
    assert "nan" not in text.split()
    assert "Not drawn" in text
    for name in ("time-parts", "energy-parts", "advantage-against-time", "input-swings", "advantage-by-node"):
        assert f'id="chart-{name}"' in page_of(infeasible)


def test_a_failed_self_check_is_loud():
    record = changed(mixed(), lambda r: r["self_checks"][0].update(passed=False))
    source = render(record)
    first = source[source.index('<section id="answer"') : source.index('<section id="question"')]
    name = record["self_checks"][0]["name"]
    assert f"<b>Self-check failed:</b> {name}. Do not use these results." in first
    assert "FAILED" in source
    assert "Self-check failed" not in page_of(mixed)


def test_what_was_not_compared_or_stated_is_said():
    record = changed(mixed(), lambda r: r.update(closed_form=[], anchors=[], warnings=[]))
    text = Outline(render(record)).text
    assert "Not executed for this study" in text
    assert "nothing outside the inputs supports the reference" in text
    row = mixed()["closed_form"][0]
    assert amount(row["closed_delay"], "s", 4).replace("\u00a0", " ") in Outline(page_of(mixed)).text


def test_what_if_values_and_the_command_are_shown():
    record = changed(mixed(), lambda r: r.update(what_if={"activity": "0.5"}))
    text = Outline(render(record)).text
    assert "activity = 0.5" in text
    assert f"evenload run study.toml --set activity=0.5 --freeze-time {record['created']}" in text


def test_a_diagnostic_policy_is_bannered():
    assert "<b>Diagnostic:</b> same supply" in page_of(mixed)
    assert "diagnostic, not a verdict" in page_of(mixed)
    assert "<b>Diagnostic:</b>" not in page_of(hub)


def test_sources_are_numbered_and_linked():
    record = mixed()
    source = page_of(mixed)
    for position, (key, entry) in enumerate(record["sources"].items(), start=1):
        assert f'<tr id="source-{position}">' in source
        assert html.escape(entry["citation"], quote=False).replace("'", "&#39;") in source
        assert f'<a href="#source-{position}">[{position}] {key}</a>' in source


def test_a_decisive_rounding_does_not_turn_a_miss_into_a_pass():
    def change(record: dict[str, Any]) -> None:
        for policy in record["policies"]:
            policy["advantage"] = 1.996
            for side in policy["contenders"]:
                side["advantage"] = 1.996
        record["verdict"] |= {"advantage": 1.996, "advantage_low": 1.9951, "advantage_high": 2.004}
        record["requirements"][0] |= {"margin": 0.9996, "state": "fail"}

    text = Outline(render(changed(mixed(), change))).text
    assert "advantage 1.996" in text
    assert "1.996, better, below 2" in text
    assert "fail, factor 0.9996" in text


def test_hostile_text_stays_text():
    record = hostile(mixed())
    source = render(record)
    outline = Outline(source)
    assert outline.problems == []
    assert len(outline.scripts) == 2
    assert not outline.all("img")
    names = {name for _, attributes in outline.elements for name in attributes}
    assert not {name for name in names if name.startswith("on")}
    assert {name for name, _ in outline.elements} == {name for name, _ in Outline(page_of(mixed)).elements}
    shown = " ".join(visible(HOSTILE).split())
    assert shown in outline.text  # whole and visible
    assert "\u202e" not in outline.text  # nothing makes a number read backwards
    data = next(text for attributes, text in outline.scripts if attributes.get("id") == "record")
    assert not set("<>&") & set(data)
    assert json.loads(data) == json.loads(to_json(record))


def test_a_record_folder_is_complete_and_identical_when_made_again(tmp_path: Path):
    record = mixed()
    places = [tmp_path / name for name in ("one", "two")]
    for place in places:
        place.mkdir()
        fill_folder(place, mixed())
    files = sorted(str(path.relative_to(places[0])) for path in places[0].rglob("*") if path.is_file())
    again = sorted(str(path.relative_to(places[1])) for path in places[1].rglob("*") if path.is_file())
    assert files == again
    for name in files:
        assert (places[0] / name).read_bytes() == (places[1] / name).read_bytes(), name
    assert {"record.json", "summary.json", "report.html", "tables/ledger.csv"} <= set(files)
    for key, chart in charts(record).items():
        assert f"tables/chart-{key}.csv" in files
        for name in (f"figures/{key}.svg", f"figures/{key}.png"):
            assert (name in files) == (chart.spec is not None)
    assert json.loads((places[0] / "record.json").read_text(encoding="utf-8")) == json.loads(to_json(record))
    assert (places[0] / "figures" / "energy-delay.png").read_bytes().startswith(b"\x89PNG")


def test_a_report_can_be_made_again_from_the_record_file_alone(tmp_path: Path):
    first, second = tmp_path / "first", tmp_path / "second"
    first.mkdir()
    second.mkdir()
    fill_folder(first, mixed())
    fill_folder(second, json.loads((first / "record.json").read_text(encoding="utf-8")))
    assert (first / "report.html").read_bytes() == (second / "report.html").read_bytes()


def test_a_study_without_anything_feasible_still_gives_a_folder(tmp_path: Path):
    fill_folder(tmp_path, infeasible())
    assert (tmp_path / "report.html").stat().st_size > 10_000
    assert not (tmp_path / "figures" / "time-parts.svg").exists()
    assert (tmp_path / "tables" / "chart-time-parts.csv").read_text() == "no rows\n"
