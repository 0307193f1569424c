"""The command ``batch``: every study of a folder, and which verdicts flipped (layer 10)."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Sequence
from dataclasses import asdict
from pathlib import Path
from typing import TYPE_CHECKING, Any

import typer

from benchmark.cli.commands import check_folders, refuse_idle_draws, time_left
from benchmark.cli.forms import check_form, echo_csv, echo_json
from benchmark.errors import UsageError

if TYPE_CHECKING:
    from benchmark.api.batch import Batched

__all__ = ["batch_command"]

#: seconds between two looks at the files
PAUSE = 1.0


def batch_command(
    folder: Path,
    *,
    since: Path | None,
    out: Path | None,
    form: str,
    draws: int | None,
    seed: int | None,
    jobs: int,
    freeze_time: str,
    watch: bool,
    nodes: Sequence[Path],
) -> int:
    """Run the studies and print one table; with ``watch`` again after every change of a file. Returns the status."""
    from benchmark import api
    from benchmark.api.batch_files import Stamps, folders_read, input_files, stamps, written_by_runs

    check_folders(nodes)
    check_form(form)
    refuse_idle_draws(seed, 1, draws)
    if freeze_time and out is None:
        message = "--freeze-time is written into records; state --out FOLDER for them"
        raise UsageError(message)
    options: dict[str, Any] = {"out": out, "nodes": nodes, "draws": draws, "seed": seed, "jobs": jobs}
    read: set[str] = set()  # files that studies read, here or elsewhere

    def look() -> Stamps:
        return input_files(folders_read(folder, nodes), [out, since]) | stamps(sorted(read))

    while True:
        seen = look() if watch else {}
        found = api.batch(folder, since=since, created=freeze_time or None, told=_Told(), **options)
        _print(found, form)
        if not watch:
            return found.status
        new = {name: stamp for name, stamp in found.files.items() if not written_by_runs(Path(name), [out, since])}
        seen = new | seen  # of a file seen before the run, what it was then: it may have been edited since
        read |= set(new)
        typer.echo("\nWaiting for a change of an input file; Ctrl-C stops.")
        _wait(seen, look)


def _wait(seen: dict[str, tuple[int, int]], look: Callable[[], dict[str, tuple[int, int]]]) -> None:
    """Wait until a file is not as it was when the last run began."""
    while look() == seen:
        time.sleep(PAUSE)


class _Told:
    """Progress on standard error: a line that rewrites itself on a terminal, nothing elsewhere."""

    def __init__(self) -> None:
        self.started = time.perf_counter()

    def __call__(self, done: int, of: int) -> None:
        if sys.stderr.isatty():
            left = time_left(time.perf_counter() - self.started, done / of)
            sys.stderr.write(f"\r\x1b[K{done} of {of} studies{left}" if done < of else "\r\x1b[K")
            sys.stderr.flush()


def _print(found: Batched, form: str) -> None:
    rows = [asdict(row) for row in found.rows]
    if form == "json":
        echo_json({"seconds": found.seconds, "studies": rows, "notes": list(found.notes)})
    elif form == "csv":
        echo_csv(list(rows[0]), (["" if value is None else value for value in row.values()] for row in rows))
        for note in found.notes:
            typer.echo(f"warning: {note}", err=True)
    else:
        _show(found)


def _show(found: Batched) -> None:
    from benchmark.cli.layout import Block, Note, Table, show_blocks

    table = [
        (
            row.study,
            row.state,
            _number(row.advantage_old),
            _number(row.advantage_new),
            "-" if row.distance is None else f"x {row.distance:.4g}",
            " -> ".join(dict.fromkeys(word for word in (row.verdict_old, row.verdict_new) if word)),
        )
        for row in found.rows
    ]
    columns = ("study", "state", "advantage before", "advantage", "of the required", "verdict")
    states = [row.state for row in found.rows]
    counts = ", ".join(f"{states.count(state)} {state}" for state in dict.fromkeys(states))
    blocks: list[Block] = [Table("", columns, table)]
    blocks += [Note(f"{row.study}: {row.message}") for row in found.rows if row.message]
    blocks += [Note(note) for note in found.notes]
    show_blocks(
        [*blocks, Note(f"{len(states)} {'study' if len(states) == 1 else 'studies'}: {counts}; {found.seconds:.1f} s.")]
    )


def _number(value: float | str | None) -> str:
    return "-" if value is None else f"{value:.5g}" if isinstance(value, float) else value
