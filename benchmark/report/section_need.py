"""What would change the answer: break-evens, required values, maps (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.report.blocks import Block, Paragraph, Section, Table, plain
from benchmark.report.words import is_number, number

__all__ = ["needed"]

Record = Mapping[str, Any]
NONE = (
    "Not worked out in this record: run with --need, or ask evenload need for break-evens, required values, a "
    "specification, who must improve, the smallest flipping set, or a map of deadlines."
)


def needed(record: Record) -> list[Section]:
    """Return a section for every answer of ``need`` that the record holds."""
    blocks = record.get("need")
    if not blocks:
        return [Section("need", "What would change the answer", (Paragraph(NONE),))]
    return [Section(f"need-{row['key']}", row["title"], _of(row)) for row in blocks]


def _of(row: Record) -> tuple[Block, ...]:
    facts = tuple(Paragraph(text, f"{name.replace('_', ' ')}:") for name, text in row["facts"])
    return (*facts, _table(row))


def _table(row: Record) -> Table:
    columns = [name.replace("_", " ") for name in row["columns"]]
    rows = [[_shown(item.get(name)) for name in row["columns"]] for item in row["rows"]]
    return plain(f"need-{row['key']}-rows", f"{row['title']}: all numbers", columns, rows, wide=True)


def _shown(value: Any) -> Any:
    if value is None or value == "":
        return "–"
    return number(value, 4) if is_number(value) else value
