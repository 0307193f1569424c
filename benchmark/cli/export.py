"""The command ``export``: figures and tables for papers and boards, from a record folder (layer 10)."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Callable, Mapping
from pathlib import Path

import typer

from benchmark.cli.forms import check_form
from benchmark.errors import EvenloadError, UsageError

__all__ = ["export_command", "refuse_idle"]

#: options that say something about a netlist alone
NETLIST_OPTIONS = ("--side", "--supply", "--node", "--net", "--capacitances", "--nodes", "--set")


def refuse_idle(given: Mapping[str, bool], *, netlist: bool, tables: bool, figures: bool) -> None:
    """Refuse options of something that is not written; ``given``: option -> whether it was stated."""
    homes = dict.fromkeys(NETLIST_OPTIONS, "--netlist") | {"--format": "--tables"}
    written = {"--netlist": netlist, "--tables": tables}
    idle = [f"{name} belongs to {homes[name]}" for name in homes if given.get(name) and not written[homes[name]]]
    if given.get("--ratio-only") and netlist:
        idle.append("--ratio-only and --netlist exclude each other: a deck holds absolute values")
    if idle:
        message = "; ".join(idle)
        raise UsageError(message)
    if not (netlist or tables or figures):
        message = "export needs --figures FOLDER, --tables FOLDER or --netlist FILE"
        raise UsageError(message)


def export_command(record_folder: Path, figures: Path | None, tables: Path | None, form: str, ratio_only: bool) -> None:
    """Write what was asked for, from the record alone."""
    from benchmark.record.write import read_record
    from benchmark.report.publish import write_figures
    from benchmark.report.publish_tables import FORMATS, write_tables

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
