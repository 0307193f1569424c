"""Strength of the reference and robustness in the report: two ladders, one table of cells per node pair (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.record.text import ladder_words, robustness_words
from benchmark.report.advantage import levels
from benchmark.report.blocks import Block, Cell, Figure, Paragraph, Section, Table, plain
from benchmark.report.words import is_number, listed, number, policy_name, volts

__all__ = ["ladder", "robustness"]

Record = Mapping[str, Any]
INFEASIBLE = "infeasible"


def _mark(record: Record, value: Any) -> str:
    """Print an advantage with a symbol for its place against M and 1."""
    limits = [level for level, _ in levels(record)]
    if isinstance(value, str):
        return f"▲ {value}"
    if value >= record["study"]["required_advantage"]:
        return f"▲ {number(value, 2, limits)}"
    return f"{'■' if value > 1.0 else '▼'} {number(value, 2, limits)}"


def _key(record: Record) -> Paragraph:
    required = number(record["study"]["required_advantage"], 3)
    text = f"▲ reaches {required}; ■ better than 1, below {required}; ▼ not better; {INFEASIBLE}: a side has no point."
    return Paragraph(text, "Symbols:")


def _choices(rung: Record) -> str:
    """What a side chose besides its supply."""
    found = [f"{number(rung['copies'])} copies"] if rung["copies"] not in (None, 1.0) else []
    if rung["back_bias"]:
        found.append(f"back bias {volts(rung['back_bias'])}")
    found += ["gated while idle"] if rung["gated"] else []
    return listed(found) or "–"


def _rungs(record: Record, row: Record) -> Table:
    rows = []
    for rung in row["rungs"]:
        name = Cell(rung["name"], small="" if rung["offered"] else "not offered by the study")
        if rung["advantage"] is None:
            shown = Cell(f"{INFEASIBLE}: {rung['why']}")
        else:
            turn = "" if rung["name"] != row["turn"] else f"the required advantage is {row['state']} here"
            shown = Cell(_mark(record, rung["advantage"]), small=turn)
        supply = volts(rung["supply"], 3) if rung["side"] else "–"
        rows.append((name, shown, rung["side"] or "–", supply, _choices(rung)))
    columns = ("allowed up to", "advantage", "side" if row["of"] == "candidate" else "strongest contender")
    grows, stays = ("candidate", "reference") if row["of"] == "candidate" else ("reference", "candidate")
    caption = f"The {grows} is allowed one more mitigation after another; the {stays} keeps all of its own"
    return plain(f"ladder-{grows}", caption, (*columns, "its supply", "also chosen"), rows)


def ladder(record: Record, figure: Figure | None = None) -> Section:
    """Return the ladder of the reference, and the candidate's beside it."""
    blocks: list[Block] = []
    for row in record.get("ladder", ()):
        blocks += [Paragraph(ladder_words(record, row)), _rungs(record, row)]
    drawn = () if figure is None else (figure,)
    return Section("ladder", "Ladder of the reference", (*drawn, _key(record), *blocks))


def _cells(record: Record, pair: str, position: int) -> Table:
    cells = [cell for cell in record["robustness"]["cells"] if cell["pair"] == pair]
    lists = list(dict.fromkeys(cell["contenders"] for cell in cells))
    table: dict[tuple[str, tuple[float, ...]], dict[str, Record]] = {}
    for cell in cells:
        table.setdefault((cell["policy"], tuple(cell["temperatures"])), {})[cell["contenders"]] = cell
    rows = []
    for (policy, kelvin), found in table.items():
        at = f"{kelvin[0]:.6g} K" if len(kelvin) == 1 else "all temperatures"
        rows.append((Cell(policy_name(policy), small=at), *(_cell(record, found.get(name)) for name in lists)))
    columns = ("policy", *(f"contenders: {name}" for name in lists))
    return plain(f"robustness-{position}", f"Node pair {pair}", columns, rows, wide=True)


def _cell(record: Record, cell: Record | None) -> Cell:
    if cell is None:
        return Cell("–")
    declared = "fixed before the run" if cell["declared"] else ""
    if not (is_number(cell["advantage"]) or isinstance(cell["advantage"], str)):
        return Cell(INFEASIBLE, small="; ".join(text for text in (declared, cell["why"]) if text))
    return Cell(_mark(record, cell["advantage"]), small=declared or f"against {cell['strongest']}")


def robustness(record: Record) -> Section:
    """Return every policy, list of contenders, node pair and list of temperatures."""
    if "robustness" not in record:
        return Section("robustness", "Robustness", (Paragraph("This record has no table of robustness."),))
    pairs = dict.fromkeys(cell["pair"] for cell in record["robustness"]["cells"])
    tables = [_cells(record, pair, position) for position, pair in enumerate(pairs, start=1)]
    text = "The best estimate in every cell; the cell fixed before the run is marked and carries the verdict."
    return Section(
        "robustness", "Robustness", (Paragraph(robustness_words(record)), Paragraph(text), _key(record), *tables)
    )
