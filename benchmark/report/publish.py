"""Figures for papers and boards (layer 9): one column, full width and one page, as SVG, PDF and PNG with their words.

Everything is made from the record alone. Words are at least 7 pt and lines at least 0.5 pt at the final size.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from benchmark.record.shown_units import in_units_of_record
from benchmark.report.advantage import advantage_against_time, advantage_by_node
from benchmark.report.change_parts import change_parts
from benchmark.report.change_picture import change_picture
from benchmark.report.charts import charts
from benchmark.report.compose import printed, to_bitmap, to_pdf
from benchmark.report.distribution import advantage_distribution
from benchmark.report.energy_delay import energy_delay
from benchmark.report.figure import Chart, to_svg
from benchmark.report.ladder_chart import ladder_steps
from benchmark.report.margins import requirement_margins
from benchmark.report.need_charts import need_charts_in_column
from benchmark.report.one_page import one_page
from benchmark.report.page import digest_of
from benchmark.report.parts import where_it_goes
from benchmark.report.ribbons import limits_along_supply
from benchmark.report.steps import node_steps
from benchmark.report.swings import input_swings
from benchmark.report.words import visible

__all__ = [
    "COLUMN",
    "COLUMN_MM",
    "FULL_MM",
    "MOST_WORDS",
    "Published",
    "figures_for_print",
    "short_caption",
    "write_figures",
]

Record = Mapping[str, Any]
COLUMN_MM, FULL_MM = 88.0, 180.0
#: pixels of a chart drawn for one column, margins included
COLUMN = 386.0
MOST_WORDS = 120


@dataclass(frozen=True)
class Published:
    """One drawing of a stated width with its words."""

    name: str
    svg: str
    caption: str
    alternative: str


def short_caption(text: str, digest: str) -> str:
    """Return whole sentences of a caption, at most 120 words with the record named at the end."""
    close = f"Record sha256 {digest[:16]}."
    room = MOST_WORDS - len(close.split())
    kept: list[str] = []
    for sentence in re.split(r"(?<=[.!?]) (?=[A-Z0-9])", text.strip()):
        if len(" ".join([*kept, sentence]).split()) > room:
            break
        kept.append(sentence)
    if not kept:
        kept = [" ".join(text.split()[:room])]
    return visible(" ".join([*kept, close]))


def _column(record: Record) -> list[Chart]:
    """Return the charts drawn anew for one column."""
    return [
        requirement_margins(record, COLUMN - 250.0, 100.0, 150.0),
        energy_delay(record, COLUMN - 86.0, 330.0),
        limits_along_supply(record, COLUMN - 86.0),
        advantage_against_time(record, COLUMN - 76.0, 260.0),
        *where_it_goes(record, COLUMN - 112.0, 100.0),
        ladder_steps(record, COLUMN - 152.0, 132.0, 20.0),
        advantage_distribution(record, COLUMN - 76.0, 240.0),
        input_swings(record, COLUMN - 164.0, 144.0, 20.0, 8),
        advantage_by_node(record, COLUMN - 76.0),
        *node_steps(record, COLUMN - 170.0, 150.0),
        *need_charts_in_column(record, COLUMN),
        *_changes(record),
    ]


def _changes(record: Record) -> list[Chart]:
    """Charts of what changed, where the record was compared with an earlier one."""
    if record.get("change") is None:
        return []
    return [change_picture(record, COLUMN - 86.0, 300.0), change_parts(record, COLUMN - 240.0, 122.0, 118.0)]


@in_units_of_record
def figures_for_print(record: Record) -> list[Published]:
    """Return every figure that has something to draw: full width, then one column, then the page."""
    digest = digest_of(record)
    found = []
    for width, drawn in ((FULL_MM, list(charts(record).values())), (COLUMN_MM, _column(record))):
        for chart in drawn:
            if chart.spec is None:
                continue
            name = f"{chart.key}-{width:g}mm"
            caption = short_caption(f"{chart.title}. {chart.caption}", digest)
            svg = printed(to_svg(chart.spec), chart.key, width, chart.title, chart.alternative)
            found.append(Published(name, svg, caption, visible(chart.alternative)))
    svg, caption, alternative = one_page(record, digest)
    found.append(Published("one-page-a4", svg, short_caption(caption, digest), visible(alternative)))
    return found


def write_figures(record: Record, folder: Path) -> list[str]:
    """Write every figure as SVG, PDF and PNG with a text of caption and alternative beside it; returns the names."""
    names = []
    for figure in figures_for_print(record):
        (folder / f"{figure.name}.svg").write_text(figure.svg, encoding="utf-8")
        (folder / f"{figure.name}.pdf").write_bytes(to_pdf(figure.svg))
        (folder / f"{figure.name}.png").write_bytes(to_bitmap(figure.svg))
        words = f"Caption\n\n{figure.caption}\n\nAlternative text\n\n{figure.alternative}\n"
        (folder / f"{figure.name}.txt").write_text(words, encoding="utf-8")
        names.append(figure.name)
    return names
