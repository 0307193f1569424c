"""The report page (layer 9): one file, no request, no script needed, every text escaped."""

from __future__ import annotations

import base64
import hashlib
from collections.abc import Mapping
from importlib.resources import files
from typing import Any

from benchmark.record.shown_units import in_units_of_record
from benchmark.record.write import to_json
from benchmark.report import section_change as change
from benchmark.report import section_evidence as evidence
from benchmark.report import section_method as method
from benchmark.report import section_need as needs
from benchmark.report import section_question as asked
from benchmark.report import section_results as results
from benchmark.report import section_strength as strength
from benchmark.report import section_uncertainty as sure
from benchmark.report.blocks import Figure, Section, Table, plain
from benchmark.report.figure import Chart
from benchmark.report.section_points import points
from benchmark.report.svg import inline_svg
from benchmark.report.trails import data_id, trail
from benchmark.report.words import plural, visible

__all__ = ["digest_of", "embedded_record", "page", "sections"]

Record = Mapping[str, Any]


def digest_of(record: Record) -> str:
    """Return the sha256 of record.json."""
    return hashlib.sha256(to_json(record).encode()).hexdigest()


def embedded_record(record: Record) -> str:
    """Return the record as JSON that cannot end the element it stands in; parsed, it is record.json again."""
    return to_json(record).replace("&", "\\u0026").replace("<", "\\u003c").replace(">", "\\u003e")


def _text(name: str) -> str:
    return files("benchmark.report").joinpath("templates", name).read_text(encoding="utf-8")


def _data(record: Record, chart: Chart) -> Table | None:
    """Return the table of what is drawn: every row has an id and leads to its mark, formulas, arithmetic and values."""
    if not chart.points:
        return None
    columns = list(dict.fromkeys(name for row in chart.points for name in row))
    rows = [
        [*(row.get(name, "") for name in columns), trail(record, chart, index, row)]
        for index, row in enumerate(chart.points)
    ]
    anchors = tuple(data_id(chart.key, index) for index in range(len(rows)))
    caption = f"Data of the chart: {chart.title}"
    return plain(f"data-{chart.key}", caption, [*columns, "leads to"], rows, digits=5, wide=True, anchors=anchors)


def _figure(record: Record, chart: Chart, drawings: Mapping[str, str]) -> Figure:
    if chart.spec is None:
        return Figure(chart, "", _data(record, chart))
    svg = inline_svg(drawings[chart.key], chart.key, chart.alternative, chart.title, chart.spots)
    return Figure(chart, svg, _data(record, chart))


def sections(record: Record, charts: Mapping[str, Chart], drawings: Mapping[str, str]) -> list[Section]:
    """Return every section in the order of the report."""
    digest = digest_of(record)
    shown = {key: _figure(record, chart, drawings) for key, chart in charts.items()}
    steps = [figure for key, figure in shown.items() if key.startswith("node-steps")]
    return [
        asked.answer(record, digest),
        asked.findings(record),
        asked.question(record),
        asked.requirements(record, shown["requirement-margins"]),
        results.curves(shown["energy-delay"], shown["limits-along-supply"]),
        results.required_time(record, shown["advantage-against-time"]),
        results.energy_and_time(record, shown["time-parts"], shown["energy-parts"]),
        points(record),
        results.policies(record),
        strength.ladder(record, shown["ladder-steps"]),
        strength.robustness(record),
        sure.uncertainty(record, shown["advantage-distribution"]),
        results.moves(record, shown["input-swings"]),
        *change.changed(record, shown.get("change-picture"), shown.get("change-parts")),
        sure.next_measurement(record),
        *needs.needed(record, shown),
        results.nodes(record, shown["advantage-by-node"], steps),
        evidence.anchors(record),
        evidence.closed_form(record),
        evidence.ledger(record),
        evidence.options(record),
        evidence.conventions(record),
        evidence.circuit_assumptions(record),
        evidence.not_modelled(record),
        method.self_checks(record),
        method.warnings(record),
        method.reproduce(record, digest),
        Section("sources", "Sources", (evidence.sources(record),)),
        method.terms(),
        method.cautions(record),
    ]


def _shown(value: Any) -> Any:
    """Clean every text put into the page; what is marked as safe (drawings, script, record) passes as it is."""
    return visible(value) if type(value) is str else value


def _hash(script: str) -> str:
    return base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()


@in_units_of_record
def page(record: Record, charts: Mapping[str, Chart], drawings: Mapping[str, str]) -> str:
    """Return the whole page.

    Parameters
    ----------
    record : mapping
        As ``run_study`` returns it.
    charts : mapping
        Key -> chart, from ``charts``.
    drawings : mapping
        Key -> SVG of every chart that has a specification.
    """
    import jinja2

    environment = jinja2.Environment(
        loader=jinja2.FunctionLoader(_text),
        autoescape=True,
        undefined=jinja2.StrictUndefined,
        finalize=_shown,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    script = _text("report.js")
    return environment.get_template("report.html").render(
        title=record["study"]["title"],
        sections=sections(record, charts, drawings),
        css=_text("report.css"),
        script=script,
        script_hash=_hash(script),
        record_json=embedded_record(record),
        software=record["software"]["evenload"],
        created=record["created"],
        plural=plural,
    )
