"""Figures and tables for papers: sizes at print, real words in the PDF, captions, formats that agree."""

from __future__ import annotations

import csv
import io
import math
import re
import subprocess
import sys
from collections.abc import Sequence
from pathlib import Path
from xml.etree import ElementTree

import pypdf
import pytest
import vl_convert

from benchmark.report.charts import charts
from benchmark.report.compose import POINTS_PER_MM, to_pdf
from benchmark.report.pdf_order import in_one_order
from benchmark.report.publish import (
    COLUMN,
    COLUMN_MM,
    FULL_MM,
    MOST_WORDS,
    Published,
    figures_for_print,
    short_caption,
)
from benchmark.report.publish_tables import DIGITS, FORMATS, publication_tables, write_tables
from benchmark.report.words import is_number
from tests.report_records import crossing, hostile, infeasible, mixed

ROOT = Path(__file__).parents[2]
SVG = "{http://www.w3.org/2000/svg}"


@pytest.fixture(scope="module")
def figures() -> dict[str, Published]:
    return {figure.name: figure for figure in figures_for_print(crossing())}


def _scale(root: ElementTree.Element) -> float:
    """Points per unit of the drawing."""
    width = float(root.attrib["viewBox"].split()[2])
    return float(root.attrib["width"].removesuffix("mm")) * POINTS_PER_MM / width


def _smallest(svg: str) -> tuple[float, float]:
    """Smallest words and thinnest visible line, in points at the final size."""
    root = ElementTree.fromstring(svg)
    scale = _scale(root)
    words = [float(e.attrib["font-size"].removesuffix("px")) for e in root.iter(f"{SVG}text")]
    lines = [
        float(e.attrib.get("stroke-width", "1"))
        for e in root.iter()
        if e.attrib.get("stroke", "none") not in ("none", "transparent") and e.attrib.get("stroke-width") != "0"
    ]
    assert "scale(" not in re.sub(r"<(?:path|line)[^>]*>", "", svg), "a scaled group would change these sizes"
    return min(words) * scale, min(lines) * scale


def test_every_size_is_there(figures: dict[str, Published]):
    names = set(figures)
    drawn = [key for key, chart in charts(crossing()).items() if chart.spec is not None]
    assert {"requirement-margins", "limits-along-supply", "node-steps"} <= set(drawn)
    assert names == {f"{key}-{width}mm" for key in drawn for width in (88, 180)} | {"one-page-a4"}


def test_drawings_have_the_width_they_state(figures: dict[str, Published]):
    for name, figure in figures.items():
        wanted = 210.0 if name == "one-page-a4" else COLUMN_MM if name.endswith("-88mm") else FULL_MM
        assert ElementTree.fromstring(figure.svg).attrib["width"] == f"{wanted:g}mm"
    page = ElementTree.fromstring(figures["one-page-a4"].svg)
    assert float(page.attrib["height"].removesuffix("mm")) == pytest.approx(297.0, abs=0.05)


def test_words_have_seven_points_and_lines_half_a_point(figures: dict[str, Published]):
    for name, figure in figures.items():
        words, lines = _smallest(figure.svg)
        assert words >= 7.0, name
        assert lines >= 0.5, name


def test_the_size_check_can_fail(figures: dict[str, Published]):
    small = figures["energy-delay-88mm"].svg.replace('width="88mm"', 'width="80mm"')
    words, lines = _smallest(small)
    assert words < 7.0
    assert lines < 0.5


def test_nothing_on_the_page_lies_outside_it(figures: dict[str, Published]):
    page = ElementTree.fromstring(figures["one-page-a4"].svg)
    width, height = map(float, page.attrib["viewBox"].split()[2:])
    for element in page.findall(f"{SVG}text"):
        assert 0 < float(element.attrib["x"]) < width
        assert 0 < float(element.attrib["y"]) < height - 20


def test_the_page_says_verdict_panels_conventions_and_digest(figures: dict[str, Published]):
    page = ElementTree.fromstring(figures["one-page-a4"].svg)
    said = [element.text or "" for element in page.findall(f"{SVG}text")]
    record = crossing()
    assert record["verdict"]["word"] in said[0]
    for letter in "ABCD":
        assert any(text.startswith(f"{letter}  ") for text in said)
    assert any("not modelled, and whom that favours" in text for text in said)
    assert re.fullmatch(r"record sha256 [0-9a-f]{64}, made .*", said[-1])
    for wanted in ("operation: ", "guard-band: ", "leakage: ", "delay factor: "):
        assert any(text.startswith(wanted) for text in said)


@pytest.mark.parametrize(
    "name", ["one-page-a4", "energy-delay-88mm", "requirement-margins-88mm", "node-steps-88mm", "input-swings-180mm"]
)
def test_words_of_a_pdf_are_words_and_its_fonts_are_embedded(figures: dict[str, Published], name: str):
    reader = pypdf.PdfReader(io.BytesIO(to_pdf(figures[name].svg)))
    assert len(reader.pages) == 1
    page = reader.pages[0]
    wanted = float(ElementTree.fromstring(figures[name].svg).attrib["width"].removesuffix("mm")) * POINTS_PER_MM
    assert float(page.mediabox.width) == pytest.approx(wanted, abs=0.01)
    text = re.sub(r"\s+", "", page.extract_text())
    drawn = {re.sub(r"\s+", "", e.text or "") for e in ElementTree.fromstring(figures[name].svg).iter(f"{SVG}text")}
    missing = [word for word in drawn if word and word not in text]
    assert not missing
    fonts = _fonts(page)
    assert fonts
    assert all(fonts.values()), fonts


def _fonts(page: pypdf.PageObject) -> dict[str, bool]:
    """Font name -> whether its outlines are in the file; forms inside forms included."""
    found: dict[str, bool] = {}

    def walk(resources: pypdf.generic.DictionaryObject) -> None:
        for font in resources.get("/Font", {}).values():
            font = font.get_object()
            inner = font["/DescendantFonts"][0].get_object() if "/DescendantFonts" in font else font
            descriptor = inner["/FontDescriptor"].get_object()
            found[str(font["/BaseFont"])] = any(f"/FontFile{n}" in descriptor for n in ("", "2", "3"))
        for item in resources.get("/XObject", {}).values():
            form = item.get_object()
            if "/Resources" in form:
                walk(form["/Resources"].get_object())

    walk(page["/Resources"].get_object())
    return found


def test_charts_for_one_column_are_as_wide_as_one_column(figures: dict[str, Published]):
    for name, figure in figures.items():
        if name.endswith("-88mm"):
            assert float(ElementTree.fromstring(figure.svg).attrib["viewBox"].split()[2]) <= COLUMN


def test_the_same_drawing_gives_the_same_pdf_in_another_process(figures: dict[str, Published], tmp_path: Path):
    """The library orders fonts by chance of the process; ten names make an agreement by chance unlikely."""
    names = [name for name in figures if name.endswith("-88mm")]
    for name in names:
        (tmp_path / f"{name}.svg").write_text(figures[name].svg, encoding="utf-8")
    code = (
        "import pathlib, sys\nfrom benchmark.report.compose import to_pdf\n"
        "for file in sorted(pathlib.Path(sys.argv[1]).glob('*.svg')):\n"
        "    file.with_suffix('.pdf').write_bytes(to_pdf(file.read_text(encoding='utf-8')))\n"
    )
    subprocess.run([sys.executable, "-c", code, str(tmp_path)], cwd=ROOT, check=True, timeout=120)
    for name in names:
        assert (tmp_path / f"{name}.pdf").read_bytes() == to_pdf(figures[name].svg), name


def _raw(figure: Published) -> bytes:
    return bytes(vl_convert.svg_to_pdf(figure.svg.replace("mm", "", 2)))


def _said(data: bytes) -> tuple[object, ...]:
    page = pypdf.PdfReader(io.BytesIO(data), strict=True).pages[0]
    return page.extract_text(), _fonts(page), page.mediabox, page.get_contents().get_data()  # type: ignore[union-attr]


def test_putting_a_pdf_in_order_changes_nothing_it_says(figures: dict[str, Published]):
    for name in ("one-page-a4", "energy-delay-180mm"):
        raw = _raw(figures[name])
        ordered = in_one_order(raw)
        assert _said(ordered) == _said(raw)
        assert len(pypdf.PdfReader(io.BytesIO(ordered)).get_object(1)) > 0  # type: ignore[arg-type]
        assert in_one_order(ordered) == ordered


SMALL = (
    b"%PDF-1.7\n",
    b"1 0 obj\n<< /Type /Catalog /Pages 2 0 R /Note (a \\) (b) << ) >>\nendobj\n",
    b"2 0 obj\n<< /Kids [ 3 0 R ] /Count 1 /Hex <0aFF> >>\nendobj\n",
    b"3 0 obj\n<< /Length 5 >>\nstream\n1 0 R\nendstream\nendobj\n",
)


def _file(parts: Sequence[bytes], root: bytes = b"/Root 1 0 R") -> bytes:
    offsets = [sum(map(len, parts[:k])) for k in range(1, len(parts))]
    rows = b"".join(b"%010d 00000 n \n" % offset for offset in offsets)
    table = b"xref\n0 %d\n0000000000 65535 f \n" % len(parts) + rows
    body = b"".join(parts)
    return body + table + b"trailer\n<< " + root + b" >>\nstartxref\n%d\n%%%%EOF\n" % len(body)


def test_order_of_objects_and_of_names_does_not_matter():
    def swapped(text: bytes) -> bytes:
        return re.sub(rb"[23](?= 0 )", lambda found: b"3" if found[0] == b"2" else b"2", text)

    other = (SMALL[0], SMALL[1].replace(b"2 0 R", b"3 0 R"), swapped(SMALL[3]), swapped(SMALL[2]))
    mixed_up = (*other[:1], other[1].replace(b"/Type /Catalog ", b"").replace(b"<< ) >>", b"<< )/Type /Catalog>>"))
    found = in_one_order(_file(SMALL))
    assert in_one_order(_file((*mixed_up, *other[2:]))) == found
    assert b"(a \\) (b) << )" in found
    assert b"stream\n1 0 R\nendstream" in found, "what a stream holds is not touched"
    assert b"<0aFF>" in found


@pytest.mark.parametrize(
    ("data", "said"),
    [
        (b"%PDF-1.7\n", "no cross-reference table"),
        (_file(SMALL).replace(b"1 0 obj", b"1 0 jbo"), "no object at byte"),
        (_file(SMALL, b"/Size 4"), "no root"),
        (_file((*SMALL[:3], SMALL[3].replace(b"/Length 5", b"/Length 3 0 R"))), "not stated beside it"),
        (_file((*SMALL[:3], SMALL[3].replace(b"/Length 5", b"/Length 3"))), "not as long as it says"),
        (_file((*SMALL[:2], b"2 0 obj\n<< /Kids >>\nendobj\n", SMALL[3])), "do not pair"),
        (_file((*SMALL[:2], b"2 0 obj\n(open\nendobj\n", SMALL[3]))[:-99].replace(b")", b"x"), "cross-reference"),
    ],
)
def test_a_pdf_of_another_structure_is_refused(data: bytes, said: str):
    with pytest.raises(ValueError, match=said):
        in_one_order(data)


def test_captions_are_short_and_name_the_record(figures: dict[str, Published]):
    for name, figure in figures.items():
        assert len(figure.caption.split()) <= MOST_WORDS, name
        assert "Record sha256" in figure.caption
        assert figure.alternative
        root = ElementTree.fromstring(figure.svg)
        assert root.find(f"{SVG}desc").text == figure.alternative  # type: ignore[union-attr]


def test_a_long_caption_ends_after_a_whole_sentence():
    long = " ".join(f"Sentence {k} has exactly six words." for k in range(40))
    kept = short_caption(long, "ab" * 32)
    assert len(kept.split()) <= MOST_WORDS
    assert kept.endswith("words. Record sha256 abababababababab.")


@pytest.mark.parametrize("record", [infeasible, lambda: hostile(mixed())], ids=["infeasible", "hostile"])
def test_figures_of_difficult_records_are_well_formed(record):
    for figure in figures_for_print(record()):
        root = ElementTree.fromstring(figure.svg)
        assert {element.tag for element in root.iter()} <= {
            f"{SVG}{name}"
            for name in ("svg", "g", "path", "line", "rect", "text", "tspan", "defs", "clipPath", "title", "desc")
        }


def test_figures_are_the_same_bytes_again(figures: dict[str, Published]):
    again = {figure.name: figure for figure in figures_for_print(crossing())}
    assert again == figures


def _cells(form: str, text: str) -> list[list[str]]:
    if form == "csv":
        return list(csv.reader(io.StringIO(text)))[1:]
    if form == "md":
        rows = [line for line in text.splitlines() if line.startswith("|")][2:]
        return [[cell.strip() for cell in re.split(r"(?<!\\)\|", row)[1:-1]] for row in rows]
    if text.endswith(": no rows\n"):
        return []
    body = text.split("\\endhead\n")[1].split("\n\\hline")[0]
    return [[cell.strip() for cell in re.split(r"(?<!\\)&", line.removesuffix("\\\\"))] for line in body.splitlines()]


def _value(form: str, cell: str) -> float:
    if form == "latex":
        cell = cell.strip("$").replace(" \\times 10^{", "e").replace("}", "")
    return float(cell)


@pytest.mark.parametrize("form", FORMATS)
def test_every_number_agrees_in_every_format(form: str, tmp_path: Path):
    record = mixed()
    names = write_tables(record, tmp_path, form)
    compared = 0
    for name, rows in publication_tables(record).items():
        file = next(tmp_path / found for found in names if found.startswith(f"{name}."))
        cells = _cells(form, file.read_text(encoding="utf-8"))
        assert len(cells) == len(rows)
        for shown, row in zip(cells, rows, strict=True):
            assert len(shown) == len(row)
            for cell, value in zip(shown, row.values(), strict=True):
                if is_number(value):
                    wanted = value if form == "csv" else float(f"{value:.{DIGITS - 1}e}")
                    assert math.isclose(_value(form, cell), wanted, rel_tol=1e-12, abs_tol=0.0)
                    compared += 1
    assert compared > 200


def test_sources_are_numbered_and_the_tables_use_the_numbers(tmp_path: Path):
    record = mixed()
    write_tables(record, tmp_path, "md")
    listed = (tmp_path / "sources.md").read_text(encoding="utf-8")
    numbers = re.findall(r"^\[(\d+)\] ", listed, re.MULTILINE)
    assert numbers == [str(k) for k in range(1, len(record["sources"]) + 1)]
    used = {row["source"] for row in publication_tables(record)["ledger"]}
    assert used
    assert {cell.strip("[]") for cell in used if cell} <= set(numbers)


@pytest.mark.parametrize("form", FORMATS)
def test_hostile_words_stay_words(form: str, tmp_path: Path):
    record = hostile(mixed())
    for name in write_tables(record, tmp_path, form):
        text = (tmp_path / name).read_text(encoding="utf-8")
        if form == "md" or name == "sources.md":
            assert not re.search(r"(?<!\\)<", text)
        if form == "latex" and name.endswith(".tex"):
            assert not re.search(r"(?<!\\)[#~]{2}", text)
            assert "\\raw" not in text
    for name, rows in publication_tables(record).items():
        ending = FORMATS[form][1]
        assert len(_cells(form, (tmp_path / f"{name}.{ending}").read_text(encoding="utf-8"))) == len(rows)
