"""What a command prints for other programs: csv and json on standard output (layer 10)."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Collection, Iterable, Sequence
from typing import Any

import typer

from benchmark.errors import UsageError

__all__ = ["check_form", "echo_csv", "echo_json"]

FORMATS = ("text", "csv", "json")


def check_form(form: str, allowed: Collection[str] = FORMATS) -> None:
    """Refuse a --format that is none."""
    if form not in allowed:
        message = f"--format: {form!r} is not one of {', '.join(allowed)}"
        raise UsageError(message)


def echo_csv(columns: Sequence[str], rows: Iterable[Sequence[Any]]) -> None:
    """Print a header and rows."""
    written = io.StringIO()
    writer = csv.writer(written, lineterminator="\n")
    writer.writerow(columns)
    writer.writerows(rows)
    typer.echo(written.getvalue(), nl=False)


def echo_json(data: Any) -> None:
    """Print plain data."""
    typer.echo(json.dumps(data, ensure_ascii=False, indent=1))
