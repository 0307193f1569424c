"""What would change the answer: break-evens, required values, specifications, maps (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.report.blocks import Block, Cell, Figure, Paragraph, Section, Table, plain
from benchmark.report.words import is_number, number, spaced

__all__ = ["needed"]

Record = Mapping[str, Any]
NONE = (
    "Not worked out in this record: run with --need, or ask evenload need for break-evens, required values, a "
    "specification, who must improve, the smallest flipping set, or a map of deadlines."
)
#: answer of ``need`` -> the chart that shows it
CHARTS = {
    "break-evens": "break-even-lines",
    "trade": "trade-curve",
    "map-activity": "opportunity-activity",
    "map-duty": "opportunity-duty",
}
#: answers whose rows are those of a chart, which lists them itself
DRAWN = ("trade", "map-activity", "map-duty")
#: columns of words that stand above the table of all numbers already
SAID = ("words", "limit")


def needed(record: Record, figures: Mapping[str, Figure]) -> list[Section]:
    """Return a section for every answer of ``need`` that the record holds, with its chart among ``figures``."""
    blocks = record.get("need")
    if not blocks:
        return [Section("need", "What would change the answer", (Paragraph(NONE),))]
    return [Section(f"need-{row['key']}", row["title"], _of(record, row, figures)) for row in blocks]


def _of(record: Record, row: Record, figures: Mapping[str, Figure]) -> tuple[Block, ...]:
    figure = figures.get(CHARTS.get(row["key"], ""))
    found: list[Block] = [] if figure is None else [figure]
    if row["key"] == "sheet" and row["rows"]:
        found.append(_required(record, row))
    drawn = figure is not None and figure.chart.spec is not None and row["key"] in DRAWN
    # the points of a curve or a map are in the data of the chart; its sentences would repeat them one by one
    facts = [fact for fact in row["facts"] if not drawn or fact[0].startswith(("share of", "draws of"))]
    found += [Paragraph(text, f"{name.replace('_', ' ')}:") for name, text in facts]
    if row["columns"] and not drawn:
        found.append(_table(row))
    return tuple(found)


def _required(record: Record, row: Record) -> Table:
    """Return today, needed, limit and reachable of every value on the sheet."""
    known = [item["probability"] for item in row["rows"] if is_number(item.get("probability"))]
    columns = ["value", "today", "evidence", "needed, best estimate"]
    columns += [f"needed at {100.0 * known[0]:g} %", "spread allowed"] if known else []
    rows = [
        [
            _name(item),
            spaced(item["today"], item["unit"]),
            item["evidence"],
            _bounded(item, "required"),
            *([_at_probability(item), _spread(item)] if known else []),
            item["limit"],
            item["reachable"],
        ]
        for item in row["rows"]
    ]
    level = number(record["study"]["required_advantage"], 3)
    caption = f"Required values for an advantage of {level}, each alone with the rest at the best estimate"
    return plain("required-values", caption, [*columns, "limit", "reachable"], rows, wide=True)


def _name(item: Record) -> Cell:
    owner, _, name = item["name"].rpartition(".")
    words = [*([f"of {owner}"] if owner else []), *(["decisive"] if item["decisive"] == "yes" else [])]
    return Cell(name.replace("_", " "), small=", ".join(words))


def _bounded(item: Record, field: str) -> str:
    if not is_number(item[field]):
        return "none in reach" if item["reachable"] in ("no", "cannot be judged") else item["reachable"]
    return f"{item['bound']} {spaced(item[field], item['unit'], 4)}".strip()


def _at_probability(item: Record) -> Cell:
    value = item.get("required_at_probability")
    if item["today"] == 0.0:
        return Cell("–")
    if not is_number(value):
        return Cell("none between a tenth and ten times today's" if is_number(item.get("probability")) else "–")
    return Cell(spaced(value, item["unit"], 4), small=f"today: P = {number(item['probability_today'])}")


def _spread(item: Record) -> str:
    factor = item.get("spread_factor")
    if is_number(factor):
        return f"{number(factor)} times the stated one"
    if "stated range" not in item["range"]:
        return "none stated"
    return "none small enough" if is_number(item.get("probability")) else "–"


def _table(row: Record) -> Table:
    names = [name for name in row["columns"] if name not in SAID]
    columns = [name.replace("_", " ") for name in names]
    rows = [[_shown(item.get(name)) for name in names] for item in row["rows"]]
    return plain(f"need-{row['key']}-rows", f"{row['title']}: all numbers", columns, rows, wide=True)


def _shown(value: Any) -> Any:
    if value is None or value == "":
        return "–"
    return number(value, 4) if is_number(value) else value
