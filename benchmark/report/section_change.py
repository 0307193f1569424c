"""What changed since an earlier record, and why (layer 9): only in reports of records that were compared with one."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.record.changes import words
from benchmark.record.changes.words import Print, Worded
from benchmark.report.blocks import Block, Cell, Figure, Folded, Notice, Pairs, Paragraph, Section, Table, plain
from benchmark.report.words import amount, number

__all__ = ["PAGE", "change_sentence", "changed"]

Record = Mapping[str, Any]
TITLE = "Change since the previous record"
#: how the page prints the numbers of a change
PAGE = Print(number, amount, "×", " → ", "−")
#: what is no change of an input, in the order shown
_KINDS = {
    "question": "The question changed",
    "criteria": "The criteria of the answer changed",
    "method": "What is searched changed",
    "option": "Choices that are no numbers changed",
    "file": "Measured tables or circuit files changed",
    "draws": "The draws changed",
    "constant": "Physical constants changed",
    "program": "The program or its libraries changed",
}


def change_sentence(record: Record) -> str:
    """Say in one line what became of the answer since the earlier record; empty where there is none."""
    change = record.get("change")
    if change is None:
        return ""
    first, *_ = words.change_lines({**change, "banners": []}, PAGE)
    return f"{first[0].lower()}{first[1:]} See the section {TITLE}."


def changed(record: Record, picture: Figure | None, parts: Figure | None) -> list[Section]:
    """Return the section, or nothing for a record that was not compared with an earlier one."""
    change = record.get("change")
    if change is None:
        return []
    blocks: list[Block] = [Paragraph(_head(change))]
    blocks += [Notice(f"{text}.", "Not a change of an input:") for text in change["banners"]]
    blocks.append(Pairs(tuple(words.answer_rows(change, PAGE))))
    blocks += [Paragraph(line) for line in words.change_lines({**change, "banners": []}, PAGE)[1:]]
    blocks += [] if picture is None else [picture]
    inputs = words.input_table(change, PAGE)
    blocks.append(_inputs(record, inputs) if inputs.rows else Paragraph("No input changed."))
    links = words.link_table(change, PAGE)
    blocks += [_table("change-links", links, wide=True)] if links.rows else []
    blocks += _others(change)
    blocks += [] if parts is None else [parts]
    blocks += [Paragraph(text) for text in words.unsplit(change, "logarithm")]
    for position, table in enumerate(words.part_tables(change, PAGE, additive=True), start=1):
        blocks.append(_table(f"change-parts-{position}", table))
    blocks += _probability(change)
    chain = words.chain_table(change, PAGE)
    none = "Between inputs and result of the candidate nothing changed."
    blocks.append(_table("change-chain", chain) if chain.rows else Paragraph(none))
    results = words.result_table(change, PAGE)
    if results.rows:
        blocks.append(_table("change-results", results))
    blocks += [Paragraph(text)] if (text := words.result_words(change, PAGE)) else []
    same = words.identical_words(change)
    blocks.append(Folded(same, tuple(change["identical"])) if change["identical"] else Paragraph(same))
    return [Section("change", TITLE, tuple(blocks))]


def _head(change: Record) -> str:
    old, new = change["old"], change["new"]
    renamed = "" if old["study"] == new["study"] else f"; the study was called {old['study']}"
    return (
        f"From the record made {old['created']} (sha256 {old['sha256']}) to this one, made {new['created']}{renamed}."
    )


def _table(key: str, table: Worded, **options: Any) -> Table:
    return plain(key, table.title, table.columns, table.rows, **options)


def _inputs(record: Record, table: Worded) -> Table:
    """Every changed input leads to its row of the ledger, where it still has one."""
    places = {row["key"]: position for position, row in enumerate(record["ledger"], start=1)}
    rows = []
    for entry, (first, *rest) in zip(record["change"]["inputs"], table.rows, strict=True):
        place = places.get(entry["key"])
        rows.append((Cell(first, f"#value-{place}" if place else ""), *rest))
    return plain("change-inputs", table.title, table.columns, rows, wide=True)


def _others(change: Record) -> list[Block]:
    """One table for each kind of change that is not a value, so that none is taken for the effect of an input."""
    table = words.other_table(change)
    found: list[Block] = []
    for kind, title in _KINDS.items():
        rows = [row[1:] for row in table.rows if row[0] == kind]
        if rows:
            found.append(plain(f"change-{kind}", title, table.columns[1:], rows))
    return found


def _probability(change: Record) -> list[Block]:
    title = "Probability of reaching the required advantage"
    split = change["probability"]
    if split is None:
        return []
    if split["note"]:
        return [Paragraph(f"{split['note']}.", f"{title}, not split:")]
    rows = words.probability_rows(change, PAGE)
    *rows, (_, how) = rows
    text = (
        "How much of the change of the probability is the moved best estimates, and how much the ranges that became "
        f"narrower or wider: mean over both orders, so the two parts add up. {how[0].upper()}{how[1:]}."
    )
    return [plain("change-probability", title, ("state", "probability"), rows), Paragraph(text)]
