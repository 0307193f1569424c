"""The command ``export``: figures and tables for papers and boards, from a record folder (layer 10)."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Callable
from pathlib import Path

import typer

from benchmark.cli.forms import check_form
from benchmark.errors import EvenloadError, UsageError

__all__ = ["export_command"]


def export_command(record_folder: Path, figures: Path | None, tables: Path | None, form: str, ratio_only: bool) -> None:
    """Write what was asked for, from the record alone."""
    from benchmark.record.write import read_record
    from benchmark.report.publish import write_figures
    from benchmark.report.publish_tables import FORMATS, write_tables

    if figures is None and tables is None:
        message = "export needs --figures FOLDER, --tables FOLDER or both"
        raise UsageError(message)
    check_form(form, FORMATS)
    record = read_record(record_folder)
    if ratio_only:
        from benchmark.record.ratio_only import ratio_only as without_absolutes

        record = without_absolutes(record)
    if figures is not None:
        names = _fill(figures, lambda inside: write_figures(record, inside))
        typer.echo(f"{len(names)} figures, each as SVG, PDF and PNG with its caption, in {figures}")
    if tables is not None:
        names = _fill(tables, lambda inside: write_tables(record, inside, form))
        typer.echo(f"{', '.join(names)} in {tables}")


def _fill(folder: Path, write: Callable[[Path], list[str]]) -> list[str]:
    """Write into a folder of its own first, then put every file in place; other files there stay."""
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryDirectory(prefix=".export-", dir=folder) as inside:
            names = write(Path(inside))
            for made in sorted(Path(inside).iterdir()):
                os.replace(made, folder / made.name)  # noqa: PTH105 - both names on one file system
    except OSError as error:
        message = f"{folder}: cannot be written ({error.strerror or error})"
        raise EvenloadError(message) from error
    return names
