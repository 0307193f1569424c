"""The one-page figure (layer 9): verdict, four panels, conventions and digest on one sheet of A4."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.report.advantage import advantage_against_time
from benchmark.report.compose import Sheet
from benchmark.report.energy_delay import energy_delay
from benchmark.report.figure import Chart, to_svg
from benchmark.report.parts import where_it_goes
from benchmark.report.placing import fitted, text_width
from benchmark.report.section_question import evidence_counts
from benchmark.report.swings import input_swings
from benchmark.report.words import amount, is_number, listed, number, plural, policy_name

__all__ = ["PAGE_MM", "one_page", "verdict_line"]

Record = Mapping[str, Any]
PAGE_MM = 210.0
WIDTH, HEIGHT, MARGIN = 922.0, 1304.0, 44.0
#: text is estimated a little wide, so lines are filled to this width
LINE, ROOM = 13.5, WIDTH - 2.0 * MARGIN
#: conventions printed in the foot, in this order
_FOOT = ("operation", "wires", "temperature", "guard-band", "leakage", "delay factor", "idle", "short circuit")


def _panels(record: Record) -> list[tuple[str, float, float, list[Chart]]]:
    """Return letter and title, corner and charts of the four panels."""
    left = energy_delay(record, 470.0 - 86.0, 388.0)
    right = advantage_against_time(record, 352.0 - 76.0, 388.0)
    bars = where_it_goes(record, 414.0 - 112.0, 100.0)
    flips = input_swings(record, 404.0 - 164.0, 144.0, 20.0, 8)
    second = MARGIN + ROOM - 404.0
    return [
        ("A  Energy against time", MARGIN, 142.0, [left]),
        ("B  Advantage against required time", MARGIN + ROOM - 352.0, 142.0, [right]),
        ("C  Where time and energy go", MARGIN, 620.0, list(bars)),
        ("D  What flips the answer", second, 620.0, [flips]),
    ]


def _subtitle(record: Record) -> str:
    study = record["study"]
    strongest = record["policies"][0]["strongest"]
    against = f"strongest contender {strongest}" if strongest else "no contender has a permitted point"
    return (
        f"{study['product_class']}; policy {policy_name(study['primary_policy'])}; required advantage "
        f"{number(study['required_advantage'], 3)}; {against}"
    )


def _activity(record: Record) -> str:
    row = next((row for row in record["ledger"] if row["key"] == "study.activity"), None)
    if row is None or not is_number(row["value"][0]):
        return ""
    return f"activity {number(row['value'][0], 3)} rising transitions per clock cycle per net; "


def _foot(record: Record) -> list[str]:
    said = {row["name"]: row["text"] for row in record["conventions"]}
    lines = [f"{name}: {said[name]}" for name in _FOOT if name in said]
    favours = listed(f"{row['what'].split(':')[0].split(' (')[0]} ({row['favours']})" for row in record["not_modelled"])
    study = record["study"]
    deadline = study["required_time"]
    limit = f"required time {amount(deadline, 's')}; " if is_number(deadline) else ""
    return [
        *lines,
        f"circuit: {study['circuit']}, {study['timing']}; {limit}{_activity(record)}"
        f"{len(record['ledger'])} values: {evidence_counts(record)}",
        f"not modelled, and whom that favours: {favours}",
    ]


def _head(sheet: Sheet, record: Record) -> None:
    title = verdict_line(record)
    size = next((size for size in (16.0, 15.0, 14.0, 13.0, 12.0) if text_width(title, size, bold=True) <= ROOM), 11.0)
    sheet.write(fitted(title, ROOM, bold=True)[0] if size == 11.0 else title, MARGIN, 62.0, size, bold=True)
    for position, line in enumerate(fitted(_subtitle(record), ROOM, 2)):
        sheet.write(line, MARGIN, 84.0 + LINE * position)


def verdict_line(record: Record) -> str:
    """Say the verdict in one line: class, verdict, candidate, advantage."""
    study, verdict = record["study"], record["verdict"]
    candidate = next(side for side in record["sides"] if side["role"] == "candidate")
    head = "Demonstration: " if study["demonstration"] else ""
    limits = (1.0, float(study["required_advantage"]))
    found = verdict["advantage"]
    said = f"advantage {number(found, 2, limits)}" if is_number(found) else "no advantage can be stated"
    return f"{head}{verdict['word']} for {candidate['title']}: {said}, required {number(limits[1], 3)}"


def one_page(record: Record, digest: str) -> tuple[str, str, str]:
    """Return drawing (SVG), caption and alternative text of the one-page figure.

    Parameters
    ----------
    record : mapping
        As ``run_study`` returns it.
    digest : str
        sha256 of record.json.
    """
    sheet = Sheet(WIDTH, HEIGHT)
    _head(sheet, record)
    said: list[str] = []
    for title, left, top, charts in _panels(record):
        sheet.write(title, left, top - 10.0, 12.0, bold=True)
        y = top
        for chart in charts:
            said.append(chart.alternative)
            if chart.spec is None:
                for line in fitted(chart.caption, 330.0, 8):
                    sheet.write(line, left, y + 14.0)
                    y += LINE
                continue
            sheet.place(to_svg(chart.spec), chart.key, left, y)
            y += float(chart.spec["height"]) + 58.0
    sheet.rule(MARGIN, WIDTH - MARGIN, 1064.0)
    made = f"record sha256 {digest}, made {record['created']} by Evenload {record['software']['evenload']}"
    lines = [line for item in _foot(record) for line in fitted(item, ROOM, 4)]
    room = int((HEIGHT - MARGIN - 1080.0) / LINE)
    if len(lines) > room:
        left_out = f"... and {plural(len(lines) - room + 1, 'line')} of conventions in the report"
        lines = [*lines[: room - 1], left_out]
    for position, line in enumerate([*lines, made]):
        sheet.write(line, MARGIN, 1080.0 + LINE * position)
    alternative = f"{verdict_line(record)}. {' '.join(said)}"
    return sheet.svg(PAGE_MM, verdict_line(record), alternative), _caption(record), alternative


def _caption(record: Record) -> str:
    moves = [row for row in record["verdict"]["moves"] if row["ranged"] and row["matters"]]
    study = record["study"]
    return (
        f"{verdict_line(record)}; {_subtitle(record)}. "
        "A: energy against time per operation, swept over the supply; drawn through where every hard requirement "
        "holds, dotted where one fails; broad grey line: lower envelope of the contenders; symbols: design points of "
        "the policies. B: reference over candidate energy at equal required time; above 1 favours the candidate. "
        f"C: parts at the primary design points. D: each input alone over its range, {min(8, len(moves))} of "
        f"{plural(len(moves), 'ranged input')}. Evidence: {evidence_counts(record)}. "
        f"Criteria fixed {study['declared']}."
    )
