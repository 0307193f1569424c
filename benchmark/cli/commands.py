"""The commands ``run``, ``demo`` and ``check`` (layer 10)."""

from __future__ import annotations

import datetime
import sys
import time
from collections.abc import Mapping, Sequence
from pathlib import Path

import typer

from benchmark.errors import UsageError

__all__ = ["check_command", "check_folders", "run_command"]


class _Steps:
    """Progress on standard error: a line that rewrites itself on a terminal, nothing elsewhere."""

    def __init__(self, quiet: bool) -> None:
        self.active = not quiet and sys.stderr.isatty()
        self.started = time.perf_counter()

    def __call__(self, step: str, share: float) -> None:
        if self.active:
            sys.stderr.write(f"\r\x1b[K{share:4.0%}  {step}{time_left(time.perf_counter() - self.started, share)}")
            if share >= 1.0:
                sys.stderr.write("\r\x1b[K")
            sys.stderr.flush()


def time_left(elapsed: float, share: float) -> str:
    """Say how long is left if the rest goes as fast; nothing before a tenth is done or while it would be seconds."""
    if not 0.1 <= share < 1.0:
        return ""
    left = elapsed * (1.0 - share) / share
    return "" if left < 5.0 else f", about {left:.0f} s left" if left < 90.0 else f", about {left / 60.0:.0f} min left"


def run_command(
    study_path: Path,
    out: Path | None,
    nodes: Sequence[Path],
    overrides: Mapping[str, str],
    freeze_time: str,
    quiet: bool,
    ratio_only: bool = False,
    draws: int | None = None,
    seed: int | None = None,
    jobs: int = 1,
    need: bool = False,
    as_of: str = "",
    since: Path | None = None,
    anyway: bool = False,
) -> str:
    """Run a study and write its record folder; returns the word of the verdict."""
    from benchmark import api
    from benchmark.record.criteria import criteria_words

    check_folders(nodes)
    _check_since(since, ratio_only, anyway)
    if need and ratio_only:
        message = "--need and --ratio-only exclude each other: needs are stated in the units of the values"
        raise UsageError(message)
    study = api.load_study(study_path, nodes, overrides, day(as_of))
    refuse_idle_draws(seed, jobs, study.study.draws.number if draws is None else draws)
    folder = out or Path(f"evenload-{study.id}")
    result = api.run(
        study,
        created=freeze_time or None,
        progress=_Steps(quiet),
        draws=draws,
        seed=seed,
        jobs=jobs,
        need=need,
        since=since,
        anyway=anyway,
    )
    result = result.after(folder)
    if ratio_only:
        result = result.ratio_only()
    started = time.perf_counter()
    result.save(folder)
    seconds = time.perf_counter() - started
    typer.echo(result.text)
    if words := criteria_words(result.record):
        typer.echo(f"Criteria changed after results: {words}")
    if since is not None:
        from benchmark.record.changes.words import change_lines

        typer.echo("\n  ".join([f"Since {since}:", *change_lines(result.record["change"])]))
    if not quiet:
        size = (folder / "report.html").stat().st_size / 1e6
        typer.echo("")
        typer.echo(f"Record:  {folder} (written in {seconds:.1f} s)")
        typer.echo(f"Report:  {folder / 'report.html'} ({size:.1f} MB)")
    return result.verdict


def _check_since(since: Path | None, ratio_only: bool, anyway: bool) -> None:
    """Refuse combinations in which an option would do nothing."""
    if since is not None and ratio_only:
        message = "--since needs absolute values of both runs, which --ratio-only leaves out; give one of them"
        raise UsageError(message)
    if anyway and since is None:
        message = "--anyway says how to compare with an earlier record; give --since RECORD too"
        raise UsageError(message)


def refuse_idle_draws(seed: int | None, jobs: int, draws: int | None) -> None:
    """Refuse a seed or processes for draws where nothing is drawn."""
    idle = [name for name, given in (("--seed", seed is not None), ("--jobs", jobs > 1)) if given]
    if idle and draws == 0:
        message = f"{' and '.join(idle)} without draws: nothing would be drawn; state --draws"
        raise UsageError(message)


def check_folders(nodes: Sequence[Path]) -> None:
    """Refuse --nodes that are no folders."""
    for folder in nodes:
        if not folder.is_dir():
            message = f"--nodes: {folder} is not a folder"
            raise UsageError(message)


def day(text: str) -> datetime.date | None:
    """Read the day of --as-of."""
    if not text:
        return None
    try:
        return datetime.date.fromisoformat(text)
    except ValueError as error:
        message = f"--as-of needs a day such as 2026-01-31, found {text!r}"
        raise UsageError(message) from error


def check_command(paths: Sequence[Path], nodes: Sequence[Path], as_of: str = "") -> None:
    """Check every file; prints what is fine, then refuses with all problems."""
    from benchmark import api
    from benchmark.errors import InputRefused

    check_folders(nodes)
    result = api.check(paths, nodes, day(as_of))
    for warning in result.warnings:
        typer.echo(f"warning: {warning}", err=True)
    if result.problems:
        raise InputRefused(result.problems)
    typer.echo(f"{result.files} file(s) fine" + (f", {len(result.warnings)} warning(s)" if result.warnings else ""))
