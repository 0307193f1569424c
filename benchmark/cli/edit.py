"""The commands that change a set: ``supersede`` and ``sheet`` (layer 10)."""

from __future__ import annotations

import os
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from benchmark.cli.changes import blocks, cell
from benchmark.cli.commands import check_folders
from benchmark.cli.forms import check_form, echo_csv, echo_json
from benchmark.cli.layout import Block, Note, show_blocks

if TYPE_CHECKING:
    from benchmark.api.edit import Edited

__all__ = ["export_command", "import_command", "show_edit", "supersede_command"]


def supersede_command(
    path: Path, name: str, number: str, told: Mapping[str, Any], *, nodes: Sequence[Path], form: str, dry_run: bool
) -> None:
    """Give a value a new number and print the change."""
    from benchmark import api

    check_folders(nodes)
    check_form(form)
    show_edit(api.supersede(path, name, number, nodes=nodes, write=not dry_run, **told), form, dry_run=dry_run)


def export_command(path: Path, sheet: Path, nodes: Sequence[Path]) -> None:
    """Write the sheet of a set."""
    from benchmark import api

    check_folders(nodes)
    written = api.export_sheet(path, sheet, nodes)
    show_blocks([Note(f"Written: {written}"), Note(f"Next:    evenload sheet import {sheet} {path}")])


def import_command(
    sheet: Path, path: Path, told: Mapping[str, Any], *, nodes: Sequence[Path], form: str, dry_run: bool
) -> None:
    """Take a sheet into its set and print the change."""
    from benchmark import api

    check_folders(nodes)
    check_form(form)
    show_edit(api.import_sheet(sheet, path, nodes=nodes, write=not dry_run, **told), form, dry_run=dry_run)


def show_edit(edited: Edited, form: str, *, dry_run: bool) -> None:
    """Print what changed, what the check says of it, and what was written."""
    found = dict(edited.data)
    found["banners"] = [*found["banners"], *edited.notes]
    if form == "json":
        said = {"warnings": list(edited.warnings), "written": [str(path) for path in edited.written]}
        echo_json(found | said)
        return
    if form == "csv":
        from benchmark.record.changes.words import COLUMNS, change_rows

        echo_csv(COLUMNS, ([cell(row.get(name, "")) for name in COLUMNS] for row in change_rows(found)))
        return
    shown: list[Block] = blocks(found)
    shown += [Note(f"warning: {warning}") for warning in edited.warnings]
    shown.append(Note(_written(edited.written, dry_run)))
    show_blocks(shown)


def _written(paths: Sequence[Path], dry_run: bool) -> str:
    if dry_run:
        return "Nothing was written: this was a trial."
    if not paths:
        return "Nothing changed, nothing was written."
    return f"Written: {', '.join(os.path.relpath(path) for path in paths)}"
