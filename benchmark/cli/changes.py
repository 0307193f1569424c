"""The command ``changes``: what changed between two states, and why (layer 10)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from benchmark.cli.commands import check_folders
from benchmark.cli.forms import check_form, echo_csv, echo_json
from benchmark.cli.layout import Block, Facts, Note, Table, show_blocks
from benchmark.errors import UsageError

__all__ = ["changes_command"]

Row = Mapping[str, Any]


def changes_command(
    old: str,
    new: str,
    *,
    form: str,
    anyway: bool,
    additive: bool,
    report: Path | None,
    draws: int | None,
    seed: int | None,
    jobs: int,
    nodes: Sequence[Path],
) -> None:
    """Compare two states and print what changed; with ``report`` also write the report of the new one."""
    from benchmark import api
    from benchmark.record.changes.words import COLUMNS, change_rows

    check_folders(nodes)
    check_form(form)
    if report is not None and report.suffix.lower() not in (".html", ".htm"):
        message = f"--report: {report} must end in .html, so that changes can read it back"
        raise UsageError(message)
    if additive and form != "text":
        message = f"--additive is for text; --format {form} always holds these parts"
        raise UsageError(message)
    changes = api.changes(old, new, nodes=nodes, anyway=anyway, draws=draws, seed=seed, jobs=jobs)
    if report is not None:
        changes.report(report)
    found = changes.data
    if form == "json":
        echo_json(found)
    elif form == "csv":
        echo_csv(COLUMNS, ([cell(row.get(name, "")) for name in COLUMNS] for row in change_rows(found)))
    else:
        written = [] if report is None else [Note(f"Report: {report} ({report.stat().st_size / 1e6:.1f} MB)")]
        show_blocks([*blocks(found, additive=additive), *written])


def blocks(found: Row, *, additive: bool = False) -> list[Block]:
    """Return the comparison as blocks of text."""
    from benchmark.record.changes import words

    shown: list[Block] = [Note(f"Change from {found['old']['shown']} to {found['new']['shown']}")]
    shown += [Note(f"Note: {text}.") for text in found["banners"]]
    if "verdict" in found:
        shown.append(Facts("", words.answer_rows(found)))
    shown.append(_table(words.input_table(found), "Inputs: none changed."))
    if found["links"]:
        shown.append(_table(words.link_table(found)))
    if found["other"]:
        shown.append(_table(words.other_table(found)))
    if "attribution" not in found:
        return shown
    shown += [Note(text) for scale in _scales(additive) for text in words.unsplit(found, scale)]
    shown += [_table(table) for table in words.part_tables(found, additive=additive)]
    title = "Probability of reaching the required advantage"
    if rows := words.probability_rows(found):
        shown.append(Facts(title, rows))
    elif found["probability"] is not None:
        shown.append(Note(f"{title}, not split: {found['probability']['note']}."))
    shown.append(_table(words.chain_table(found), "Between inputs and result of the candidate: nothing changed."))
    results = words.result_table(found)
    shown += [_table(results)] if results.rows else []
    shown += [Note(text)] if (text := words.result_words(found)) else []
    return [*shown, Note(words.identical_words(found))]


def _scales(additive: bool) -> tuple[str, ...]:
    return ("logarithm", "additive") if additive else ("logarithm",)


def _table(table: Any, empty: str = "") -> Block:
    return Table(table.title, table.columns, table.rows) if table.rows else Note(empty)


def cell(value: Any) -> str:
    """A number with all its digits; nothing where there is none."""
    if value is None:
        return ""
    return repr(value) if isinstance(value, float) else str(value)
