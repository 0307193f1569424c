"""The report in a real browser: no request, no error, no script needed, prints whole, reflows, hostile text inert."""

from __future__ import annotations

import re
import shutil
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import axe_core_python
import pytest
from playwright.sync_api import Browser, BrowserContext, Page, sync_playwright

from benchmark.report.charts import charts
from benchmark.report.folder import fill_folder
from benchmark.report.one_page import one_page
from tests.report_records import crossing, hostile, infeasible, mixed, remeasured

pytestmark = pytest.mark.browser

ARGUMENTS = ["--headless", "--no-sandbox", "--disable-gpu", "--disable-background-networking"]
#: printable width of A4 between the margins of the page rule, in CSS pixels
PRINT_WIDTH = round(180 / 25.4 * 96)
LONG = "unbreakable" * 30
RECORDS = {
    "mixed": mixed,
    "crossing": crossing,
    "infeasible": infeasible,
    "hostile": lambda: hostile(mixed()),
    "long-words": lambda: hostile(mixed(), LONG),
    "remeasured": remeasured,
    "remeasured-hostile": lambda: hostile(remeasured()),
    "remeasured-long": lambda: hostile(remeasured(), LONG),
}


@pytest.fixture(scope="session")
def browser() -> Iterator[Browser]:
    """The system's Chromium; without it these tests fail, they are not left out."""
    path = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
    if path is None:
        pytest.fail("no chromium on the PATH: install the system package 'chromium' to test the report")
    with sync_playwright() as playwright:
        found = playwright.chromium.launch(executable_path=path, args=ARGUMENTS)
        yield found
        found.close()


@pytest.fixture(scope="session")
def reports(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """One report of each record."""
    places = {}
    for name, record in RECORDS.items():
        folder = tmp_path_factory.mktemp(name)
        fill_folder(folder, record())
        places[name] = folder / "report.html"
    return places


class Visit:
    """A page with everything it asked for and complained of."""

    def __init__(self, context: BrowserContext, path: Path) -> None:
        self.requests: list[str] = []
        self.complaints: list[str] = []
        self.address = path.as_uri()
        self.page: Page = context.new_page()
        self.page.on("console", lambda message: self.complaints.append(message.text))
        self.page.on("pageerror", lambda error: self.complaints.append(str(error)))
        self.page.on("dialog", lambda dialog: self.complaints.append(f"dialog {dialog.message}"))
        context.route("**/*", self._route)
        self.page.goto(self.address)

    def _route(self, route: Any) -> None:
        self.requests.append(route.request.url)
        if route.request.url == self.address:
            route.continue_()
        else:
            route.abort()


@pytest.fixture
def visit(browser: Browser, reports: dict[str, Path]) -> Iterator[Any]:
    """Open a report in a context of its own."""
    contexts = []

    def opened(name: str, width: int = 1280, height: int = 900, **options: Any) -> Visit:
        context = browser.new_context(viewport={"width": width, "height": height}, **options)
        contexts.append(context)
        return Visit(context, reports[name])

    yield opened
    for context in contexts:
        context.close()


@pytest.mark.parametrize("name", RECORDS)
def test_nothing_is_requested_and_nothing_complains(visit: Any, name: str):
    seen = visit(name)
    seen.page.wait_for_load_state("load")
    seen.page.evaluate("document.querySelectorAll('details').forEach((box) => { box.open = true; })")
    seen.page.wait_for_timeout(150)
    assert seen.requests == [seen.address]
    assert seen.complaints == []


def test_the_request_count_can_fail(browser: Browser, tmp_path: Path):
    """The counting itself is tested: a page that loads something is caught."""
    place = tmp_path / "bad.html"
    place.write_text('<img src="http://example.invalid/x.png">', encoding="utf-8")
    context = browser.new_context()
    seen = Visit(context, place)
    assert "http://example.invalid/x.png" in seen.requests
    assert seen.complaints
    context.close()


def test_the_content_policy_stops_scripts_and_requests(visit: Any):
    seen = visit("mixed")
    seen.page.evaluate(
        """() => {
        const script = document.createElement("script");
        script.textContent = "document.title = 'owned'";
        document.body.append(script);
        const image = document.createElement("img");
        image.src = "http://example.invalid/x.png";
        document.body.append(image);
    }"""
    )
    seen.page.wait_for_timeout(100)
    assert seen.page.title() == "Mixed"
    assert seen.requests == [seen.address]
    assert sum("Content Security Policy" in text for text in seen.complaints) >= 2


def _drawn(page: Page) -> dict[str, float]:
    """Chart key -> pixels of its drawing, and marks inside."""
    found = page.evaluate(
        """() => Object.fromEntries([...document.querySelectorAll("figure svg")].map((svg) => {
        const box = svg.getBoundingClientRect();
        const marks = svg.querySelectorAll("path, line, rect").length;
        const words = svg.querySelectorAll("text").length;
        return [svg.closest("figure").id, Math.min(box.width, box.height, 100 * marks, 100 * words)];
    }))"""
    )
    return dict(found)


@pytest.mark.parametrize("scripts", [True, False])
@pytest.mark.parametrize("name", ["mixed", "infeasible"])
def test_every_chart_is_drawn_with_and_without_scripts(visit: Any, name: str, scripts: bool):
    record = RECORDS[name]()
    seen = visit(name, java_script_enabled=scripts)
    expected = {f"chart-{key}" for key, chart in charts(record).items() if chart.spec is not None}
    if scripts:
        drawn = _drawn(seen.page)
        assert set(drawn) == expected
        assert all(size > 90 for size in drawn.values())
    else:
        for key in expected:
            box = seen.page.locator(f"#{key} svg").bounding_box()
            assert box is not None
            assert box["width"] > 300
            assert box["height"] > 90


def test_without_scripts_all_rows_show_and_the_filter_does_not(visit: Any):
    seen = visit("mixed", java_script_enabled=False)
    rows = seen.page.locator("#ledger-table tbody tr")
    assert rows.count() == len(mixed()["ledger"])
    assert rows.last.is_visible()
    assert not seen.page.locator(".filter").first.is_visible()


def test_the_ledger_can_be_filtered_and_prints_whole(visit: Any):
    record = mixed()
    seen = visit("mixed")
    page = seen.page
    rows = page.locator("#ledger-table tbody tr")
    page.fill("#ledger-text", "Input Capacitance new-switch")
    assert rows.locator("visible=true").count() == 1
    assert page.locator(".count").inner_text() == f"1 of {len(record['ledger'])} rows"
    page.fill("#ledger-text", "")
    page.select_option("#ledger-set-by", "default")
    defaults = sum(row["set_by"] == "default" for row in record["ledger"])
    assert rows.locator("visible=true").count() == defaults
    page.emulate_media(media="print")
    assert rows.locator("visible=true").count() == len(record["ledger"])
    assert not page.locator(".filter").is_visible()
    assert seen.complaints == []


_OVERFLOW = """(limit) => [...document.querySelectorAll("body *")]
    .filter((item) => !item.closest("script, style") && !item.closest("details:not([open]) > :not(summary)"))
    .filter((item) => item.getClientRects().length && getComputedStyle(item).position !== "absolute")
    .filter((item) => item.getBoundingClientRect().right > limit + 1 || item.getBoundingClientRect().left < -1)
    .map((item) => `${item.tagName}.${item.className.baseVal ?? item.className} `
        + `${item.getBoundingClientRect().right} ${item.textContent.slice(0, 40)}`)"""


@pytest.mark.parametrize("name", RECORDS)
def test_print_cuts_nothing(visit: Any, name: str):
    seen = visit(name, width=PRINT_WIDTH)
    seen.page.emulate_media(media="print")
    assert seen.page.evaluate(_OVERFLOW, PRINT_WIDTH) == []
    clipped = seen.page.evaluate(
        """() => [...document.querySelectorAll(".scroll")].filter((box) => box.getClientRects().length)
        .filter((box) => getComputedStyle(box).overflowX !== "visible").length"""
    )
    assert clipped == 0
    assert not seen.page.locator("nav").is_visible()


def test_pdf_is_made(visit: Any, tmp_path: Path):
    place = tmp_path / "report.pdf"
    visit("mixed").page.pdf(path=str(place), prefer_css_page_size=True)
    assert place.read_bytes().startswith(b"%PDF")


def test_printed_chart_words_have_seven_points_at_least(visit: Any):
    seen = visit("crossing", width=PRINT_WIDTH)
    seen.page.emulate_media(media="print")
    sizes = seen.page.evaluate(
        """() => [...document.querySelectorAll("figure svg text")].map((item) =>
        { const place = item.getScreenCTM();
          return parseFloat(item.getAttribute("font-size")) * Math.hypot(place.a, place.b) * 0.75; })"""
    )
    assert sizes
    assert min(sizes) >= 7.0


@pytest.mark.parametrize("width", [320, 390, 768])
@pytest.mark.parametrize("name", RECORDS)
def test_a_narrow_screen_has_no_sideways_scroll(visit: Any, name: str, width: int):
    seen = visit(name, width=width, height=800)
    seen.page.evaluate("document.querySelectorAll('details').forEach((box) => { box.open = true; })")
    wide = seen.page.evaluate("document.documentElement.scrollWidth")
    assert wide <= width
    outside = seen.page.evaluate(
        """(limit) => [...document.querySelectorAll("body *")].filter((item) => item.getClientRects().length
        && !item.closest(".scroll > *, script, style, .skip") && item.getBoundingClientRect().right > limit + 1)
        .map((item) => item.outerHTML.slice(0, 80))""",
        width,
    )
    assert outside == []


def test_what_scrolls_can_be_reached_by_keyboard(visit: Any):
    seen = visit("mixed", width=390)
    unreachable = seen.page.evaluate(
        """() => [...document.querySelectorAll("body *")].filter((item) =>
        ["auto", "scroll"].includes(getComputedStyle(item).overflowX) && item.scrollWidth > item.clientWidth + 1
        && item.tabIndex < 0).map((item) => item.className)"""
    )
    assert unreachable == []


def test_keyboard_path(visit: Any):
    seen = visit("mixed")
    page = seen.page
    page.keyboard.press("Tab")
    first = page.evaluate("document.activeElement.textContent")
    assert first == "Skip to the answer"
    box = page.locator(".skip").bounding_box()
    assert box is not None
    assert box["x"] >= 0, "the skip link shows when it has the focus"
    page.keyboard.press("Enter")
    assert page.evaluate("location.hash") == "#answer"
    path = []
    for _ in range(200):
        page.keyboard.press("Tab")
        here = page.evaluate(
            """() => { const item = document.activeElement; if (item === document.body) return null;
            const style = getComputedStyle(item);
            const box = item.getBoundingClientRect();
            return [item.tagName, item.id || item.className || item.getAttribute("href") || "",
                style.outlineStyle !== "none" && parseFloat(style.outlineWidth) >= 2,
                box.bottom > 0 && box.top < innerHeight]; }"""
        )
        if here is None:
            break
        path.append(here)
    else:
        pytest.fail("the keyboard never leaves the page")
    assert all(outlined for _, _, outlined, _ in path), [item for item in path if not item[2]]
    assert all(visible for *_, visible in path), [item for item in path if not item[3]]
    names = [name for _, name, _, _ in path]
    for wanted in ("#question", "ledger-text", "ledger-evidence", "ledger-set-by"):
        assert wanted in names
    summaries = [name for name, *_ in path if name == "SUMMARY"]
    assert len(summaries) == page.locator("summary").count()
    page.locator("summary").first.focus()
    page.keyboard.press("Enter")
    assert page.locator("details[open] table").first.is_visible()


@pytest.mark.parametrize("name", ["hostile", "long-words"])
def test_hostile_text_is_inert_and_visible(visit: Any, name: str):
    seen = visit(name)
    seen.page.wait_for_timeout(100)
    assert seen.page.title() != "owned"
    assert seen.complaints == []
    assert seen.requests == [seen.address]
    body = seen.page.inner_text("h1")
    assert ("document.title='owned'" if name == "hostile" else LONG) in body
    assert seen.page.locator("script").count() == 2
    assert seen.page.locator("img").count() == 0


_COLOURS = """() => {
    const found = new Map();
    const walker = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT);
    while (walker.nextNode()) {
        const item = walker.currentNode.parentElement;
        if (!walker.currentNode.textContent.trim() || item.closest("script, style")) continue;
        const style = getComputedStyle(item);
        let ground = "rgb(255, 255, 255)";
        for (let place = item; place; place = place.parentElement) {
            const colour = getComputedStyle(place).backgroundColor;
            if (colour !== "rgba(0, 0, 0, 0)") { ground = colour; break; }
        }
        const ink = item.closest("svg") ? getComputedStyle(item).fill : style.color;
        found.set(ink + " on " + ground, item.outerHTML.slice(0, 80));
    }
    return [...found.entries()];
}"""


def _luminance(colour: str) -> float:
    channels = [float(part) / 255 for part in colour.removeprefix("rgb(").removesuffix(")").split(",")]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


@pytest.mark.parametrize("name", ["crossing", "infeasible"])
def test_all_words_stand_out_from_their_ground(visit: Any, name: str):
    pairs = visit(name).page.evaluate(_COLOURS)
    assert len(pairs) >= 4
    for pair, example in pairs:
        ink, ground = pair.split(" on ")
        light, dark = sorted((_luminance(ink), _luminance(ground)), reverse=True)
        assert (light + 0.05) / (dark + 0.05) >= 4.5, (pair, example)


def test_controls_are_large_enough_to_hit(visit: Any):
    sizes = visit("mixed", width=390).page.evaluate(
        """() => [...document.querySelectorAll("nav a, summary, input, select")].map((item) =>
        [item.textContent.slice(0, 30), item.getBoundingClientRect().height])"""
    )
    assert sizes
    assert [item for item in sizes if item[1] < 24] == []


def _axe() -> str:
    """The checking script as its package ships it; it is put into the page by this test only."""
    return (Path(axe_core_python.__file__).parent / "axe.min.js").read_text(encoding="utf-8")


@pytest.mark.parametrize("width", [1280, 390])
@pytest.mark.parametrize("name", RECORDS)
def test_no_rule_of_accessibility_is_broken(visit: Any, name: str, width: int):
    seen = visit(name, width=width)
    seen.page.evaluate("document.querySelectorAll('details').forEach((box) => { box.open = true; })")
    seen.page.evaluate(_axe())
    result = seen.page.evaluate("axe.run(document, { resultTypes: ['violations'] })")
    found = [(rule["id"], len(rule["nodes"]), rule["nodes"][0]["html"][:120]) for rule in result["violations"]]
    assert found == []
    assert len(result["passes"]) >= 15


def test_the_rules_can_be_broken(visit: Any):
    seen = visit("mixed")
    seen.page.evaluate("document.querySelector('th[scope]').closest('div').insertAdjacentHTML('beforebegin', '<img>')")
    seen.page.evaluate("document.querySelector('p').style.color = '#bbbbbb'")
    seen.page.evaluate(_axe())
    result = seen.page.evaluate("axe.run(document, { resultTypes: ['violations'] })")
    assert {"image-alt", "color-contrast"} <= {rule["id"] for rule in result["violations"]}


@pytest.mark.parametrize("name", ["mixed", "crossing", "long-words"])
def test_twice_the_size_has_no_sideways_scroll(visit: Any, name: str):
    seen = visit(name, width=640, height=450, device_scale_factor=2)
    seen.page.evaluate("document.querySelectorAll('details').forEach((box) => { box.open = true; })")
    assert seen.page.evaluate("document.documentElement.scrollWidth") <= 640
    seen.page.evaluate("document.documentElement.style.fontSize = '200%'")  # larger words in an unchanged window
    assert seen.page.evaluate("document.documentElement.scrollWidth") <= 640


_CUT = """() => [...document.querySelectorAll("#change figure svg")].flatMap((svg) => {
    const whole = svg.getBoundingClientRect();
    return [...svg.querySelectorAll("text")].filter((item) => {
        const box = item.getBoundingClientRect();
        return box.left < whole.left - 0.5 || box.right > whole.right + 0.5
            || box.top < whole.top - 0.5 || box.bottom > whole.bottom + 0.5;
    }).map((item) => item.textContent);
})"""


@pytest.mark.parametrize("name", ["remeasured", "remeasured-hostile", "remeasured-long"])
@pytest.mark.parametrize(("width", "media"), [(1280, "screen"), (360, "screen"), (PRINT_WIDTH, "print")])
def test_a_change_is_shown_whole_before_and_after(visit: Any, name: str, width: int, media: Any):
    """No words of the picture or of the waterfall leave their drawing, nothing but tables scrolls sideways."""
    seen = visit(name, width=width)
    page = seen.page
    page.emulate_media(media=media)
    assert page.locator("#change figure svg").count() == 2
    assert page.locator("#change figure svg text").count() > 25
    assert page.evaluate(_CUT) == []
    assert page.evaluate("document.documentElement.scrollWidth") <= width
    clipped = page.evaluate(
        """() => [...document.querySelectorAll("#change th, #change td, #change dd, #change p")].filter((item) =>
        item.scrollWidth > item.clientWidth + 1 && getComputedStyle(item).display !== "inline").map((item) =>
        item.textContent.slice(0, 60))"""
    )
    assert clipped == []
    assert seen.complaints == []


def test_words_that_leave_a_drawing_are_seen(visit: Any):
    page = visit("remeasured").page
    page.evaluate("document.querySelector('#change figure svg text').setAttribute('x', '-400')")
    assert len(page.evaluate(_CUT)) == 1


def test_the_marks_of_a_change_lead_to_their_numbers_and_can_be_read(visit: Any):
    page = visit("remeasured").page
    marks = page.locator("#chart-change-picture .chart a")
    assert marks.count() == 3, "candidate before, candidate after, reference before and after"
    said = []
    for position in range(marks.count()):
        marks.nth(position).focus()
        said.append(_readout(page))
    assert all("energy" in words for words in said), said
    marks.first.click()
    assert page.evaluate("location.hash").startswith("#data-change-picture-")
    assert page.locator(page.evaluate("location.hash")).is_visible()
    bars = page.locator("#chart-change-parts .chart a")
    assert bars.count() == 3
    bars.first.focus()
    assert "film-switch.actuator_coefficient" in _readout(page)


def test_no_words_of_the_one_page_figure_leave_the_page(browser: Browser, tmp_path: Path):
    """Measured by the browser, not by the estimate the drawing uses."""
    place = tmp_path / "page.svg"
    svg, _, _ = one_page(crossing(), "ab" * 32)
    place.write_text(svg, encoding="utf-8")
    context = browser.new_context(viewport={"width": 900, "height": 1200})
    page = context.new_page()
    page.goto(place.as_uri())
    boxes = page.evaluate(
        """() => { const all = document.documentElement.getBoundingClientRect();
        return [...document.querySelectorAll("text")].map((item) => { const box = item.getBoundingClientRect();
            return [item.textContent, box.left - all.left, all.right - box.right, all.bottom - box.bottom]; }); }"""
    )
    context.close()
    assert len(boxes) > 60
    assert [box for box in boxes if min(box[1:]) < 20] == []


def _readout(page: Page) -> str:
    return page.locator("#readout").inner_text() if page.locator("#readout").is_visible() else ""


def test_values_of_a_chart_can_be_read_by_keyboard(visit: Any):
    seen = visit("mixed")
    page = seen.page
    marks = page.locator("#chart-energy-delay .chart a")
    assert page.locator("#chart-energy-delay .chart a[tabindex='0']").count() == 1
    marks.first.focus()
    said = [_readout(page)]
    for _ in range(marks.count() - 1):
        page.keyboard.press("ArrowRight")
        said.append(_readout(page))
    assert all(re.search(r"supply .*V, time .*s, energy .*J", words) for words in said)
    assert len(set(said)) > 0.8 * len(said)
    assert any("design point" in words for words in said)
    assert page.evaluate("document.activeElement.getAttribute('aria-label')") == said[-1]
    page.keyboard.press("Home")
    assert _readout(page) == said[0]
    page.keyboard.press("Escape")
    assert _readout(page) == ""
    page.keyboard.press("ArrowRight")
    assert _readout(page) == said[1]
    page.keyboard.press("Tab")
    assert _readout(page) == ""
    assert seen.complaints == []


def test_what_is_read_by_pointer_stays_can_be_pointed_at_and_be_dismissed(visit: Any):
    """WCAG 2.2, 1.4.13: dismissible, hoverable, persistent."""
    seen = visit("mixed")
    page = seen.page
    mark = page.locator("#chart-energy-delay .chart a").last
    mark.scroll_into_view_if_needed()
    mark.hover()
    words = _readout(page)
    assert words == mark.get_attribute("aria-label")
    page.wait_for_timeout(1500)
    assert _readout(page) == words
    page.locator("#readout").hover()
    assert _readout(page) == words
    page.keyboard.press("Escape")
    assert _readout(page) == ""
    page.mouse.move(2, 2)
    mark.hover()
    assert _readout(page) == words
    page.mouse.move(2, 2)
    assert _readout(page) == ""
    box = page.locator("body").evaluate("document.documentElement.scrollWidth - innerWidth")
    assert box <= 0
    assert seen.complaints == []


@pytest.mark.parametrize("width", [320, 1280])
def test_the_read_out_stays_on_the_screen(visit: Any, width: int):
    page = visit("long-words", width=width).page
    for chart in page.locator("figure .chart").all():
        for mark in (chart.locator("a").first, chart.locator("a").last):
            mark.focus()
            box = page.locator("#readout").bounding_box()
            assert box is not None
            assert box["x"] >= 0
            assert box["x"] + box["width"] <= width
            assert page.evaluate("document.documentElement.scrollWidth") <= width


@pytest.mark.parametrize("scripts", [True, False])
def test_a_mark_leads_to_its_row_and_the_row_back_and_on(visit: Any, scripts: bool):
    page = visit("crossing", java_script_enabled=scripts).page
    mark = page.locator("#chart-advantage-by-node .chart a").first
    row = page.locator(str(mark.get_attribute("href")))
    assert not row.is_visible()
    mark.click()
    assert row.is_visible()
    for words, place in (("mark", "#advantage-by-node-mark-1"), ("formula", "#formula-advantage")):
        link = row.get_by_role("link", name=words, exact=True)
        assert link.get_attribute("href") == place
    row.get_by_role("link", name="values", exact=True).click()
    value = re.sub(".*#", "#", page.url)
    assert value.startswith("#value-")
    assert page.locator(value).is_visible()
    page.go_back()
    row.get_by_role("link", name="mark", exact=True).click()
    assert page.url.endswith("#advantage-by-node-mark-1")


def test_a_filtered_row_that_is_led_to_shows(visit: Any):
    page = visit("mixed").page
    page.fill("#ledger-text", "nothing has these words")
    page.evaluate("location.hash = '#value-3'")
    page.wait_for_timeout(50)
    assert page.locator("#value-3").is_visible()


def test_one_node_pair_can_be_shown_at_a_time_and_all_are_printed(visit: Any):
    seen = visit("crossing")
    page = seen.page
    pairs = page.locator(".group")
    count = pairs.count()
    assert count == len(crossing()["nodes"]) >= 2
    assert pairs.locator("visible=true").count() >= count
    page.select_option("#pair-choice", "pair-2")
    shown = [pairs.nth(k).is_visible() for k in range(count)]
    assert shown == [k == 1 for k in range(count)]
    page.locator("#nodes-table a[href='#pair-1']").click()
    assert all(pairs.nth(k).is_visible() for k in range(count))
    page.select_option("#pair-choice", "pair-2")
    page.emulate_media(media="print")
    assert all(pairs.nth(k).is_visible() for k in range(count))
    assert not page.locator(".choose").is_visible()
    assert seen.complaints == []


def test_without_scripts_all_node_pairs_show_and_there_is_no_reader_of_values(visit: Any):
    page = visit("crossing", java_script_enabled=False).page
    assert all(page.locator(".group").nth(k).is_visible() for k in range(page.locator(".group").count()))
    assert not page.locator(".choose").is_visible()
    assert page.locator("#readout").count() == 0
    assert page.locator(".chart a title").count() > 20, "the browser shows these by itself"


def test_design_points_lead_to_their_arithmetic_and_on_to_the_ledger(visit: Any):
    page = visit("mixed").page
    page.locator("#design-points-table tbody a").first.click()
    assert page.evaluate("location.hash") == "#point-candidate-table"
    rows = page.locator("#point-candidate-table tbody tr")
    assert rows.count() >= 2
    assert rows.locator("td:last-child").all_text_contents() == ["agrees"] * rows.count()
    page.locator("#point-candidate-inputs-table tbody a").first.click()
    target = page.evaluate("location.hash")
    assert page.locator(target).is_visible()
    assert target.startswith("#value-")
