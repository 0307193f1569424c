"""The ``evenload`` command: one function per command, exit status in one place (layer 10).

Exit status: 0 done, 1 internal fault, 2 wrong usage, 3 input refused, 130 interrupted; with ``--gate``: 0 go,
10 conditional, 11 requirement failed, 12 not better, 13 not decidable; ``batch``: 20 a verdict flipped.
"""

from __future__ import annotations

import contextlib
import io
import os
import sys
from pathlib import Path
from typing import Annotated

import typer

import benchmark
from benchmark.cli import set_commands
from benchmark.errors import EvenloadError, InputRefused, UsageError

__all__ = ["app", "main"]

app = typer.Typer(
    name="evenload",
    help="Is a new switch worth it against scaled CMOS? Equal terms, every assumption listed.",
    no_args_is_help=True,
    add_completion=False,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
)

GATE = {
    "go": 0,
    "conditional go": 10,
    "no-go, requirement failed": 11,
    "no-go, not better": 12,
    "not decidable on this evidence": 13,
}
MOST_PROBLEMS = 40
#: status of a run that was interrupted from the keyboard
STOPPED = 130

Nodes = set_commands.Nodes
Set = Annotated[
    list[str] | None,
    typer.Option("--set", help="What-if: NAME=NUMBER or TECHNOLOGY.NAME=NUMBER, in the unit of the file."),
]
Draws = Annotated[
    int | None, typer.Option("--draws", help="Draws of all ranges together: 0 for none, else a power of two from 16.")
]
Seed = Annotated[int | None, typer.Option("--seed", help="Seed of the draws; default: that of the study.")]
Need = Annotated[
    bool, typer.Option("--need", help="Also break-evens, required values, who must improve, flipping set, maps.")
]
Jobs = Annotated[int, typer.Option("--jobs", help="Processes for the draws; no digit depends on their number.")]

Anyway = Annotated[
    bool, typer.Option("--anyway", help="Compare also when question, policy or required advantage differ.")
]
AsOf = Annotated[str, typer.Option("--as-of", help="Values with a history as they were on this day (2026-01-31).")]


def main() -> None:
    """Run the command line and turn errors into messages and exit status."""
    if "NO_COLOR" in os.environ:
        os.environ.pop("FORCE_COLOR", None)
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="backslashreplace")  # a terminal without Unicode is no reason to stop
    try:
        app(standalone_mode=True)
    except InputRefused as error:
        _refuse(error)
        sys.exit(3)
    except UsageError as error:
        _say(f"evenload: {error}")
        sys.exit(2)
    except EvenloadError as error:
        _say(f"evenload: {error}")
        sys.exit(3)
    except BrokenPipeError:
        sys.stderr.close()
        sys.exit(1)
    except OSError as error:
        _cannot(error)
        sys.exit(3)
    except SystemExit as stopped:
        if stopped.code == STOPPED:  # the command-line library has turned the interrupt into this status
            _say("evenload: stopped; nothing half-written")
        raise


def _say(text: str) -> None:
    """Print to standard error; when even that is full, the exit status is left to tell."""
    from benchmark.cli.layout import printable

    with contextlib.suppress(OSError):
        print("\n".join(map(printable, text.split("\n"))), file=sys.stderr, flush=True)  # noqa: T201


def _cannot(error: OSError) -> None:
    """Say which file the system does not let us read or write; a standard output that takes no more is let go."""
    place = error.filename if isinstance(error.filename, str) else "standard output or a temporary file"
    if error.filename is None:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    _say(f"evenload: {place}: cannot be used ({error.strerror or error})")


def _refuse(error: InputRefused) -> None:
    shown = error.problems[:MOST_PROBLEMS]
    _say(f"evenload: input refused, {len(error.problems)} problem(s); nothing was run")
    for problem in shown:
        _say("  " + str(problem).replace("\n", " "))
    if len(error.problems) > len(shown):
        _say(f"  ... and {len(error.problems) - len(shown)} more")


def _overrides(pairs: list[str] | None) -> dict[str, str]:
    found: dict[str, str] = {}
    for pair in pairs or []:
        name, equals, text = pair.partition("=")
        if not equals or not name.strip() or not text.strip():
            message = f"--set needs NAME=NUMBER, found {pair!r}"
            raise UsageError(message)
        if name.strip() in found:
            message = f"--set names {name.strip()!r} twice"
            raise UsageError(message)
        found[name.strip()] = text.strip()
    return found


@app.callback(invoke_without_command=True)
def top(
    context: typer.Context,
    version: Annotated[bool, typer.Option("--version", help="Print the version and stop.")] = False,
) -> None:
    """Is a new switch worth it against scaled CMOS? Equal terms, every assumption listed."""
    if version:
        typer.echo(benchmark.__version__)
        raise typer.Exit
    if context.invoked_subcommand is None:
        typer.echo(context.get_help())


@app.command()
def run(
    study: Annotated[Path, typer.Argument(help="Study file (TOML).")],
    out: Annotated[
        Path | None, typer.Option("--out", help="Record folder to write; default: evenload-<study id> here.")
    ] = None,
    nodes: Nodes = None,
    set_: Set = None,
    as_of: AsOf = "",
    ratio_only: Annotated[
        bool, typer.Option("--ratio-only", help="Write ratios only: no absolute value of any side, no input texts.")
    ] = False,
    gate: Annotated[bool, typer.Option("--gate", help="Exit status tells the verdict.")] = False,
    freeze_time: Annotated[str, typer.Option("--freeze-time", help="Time stamp to write instead of the clock.")] = "",
    quiet: Annotated[bool, typer.Option("--quiet", help="Print the verdict only.")] = False,
    draws: Draws = None,
    seed: Seed = None,
    jobs: Jobs = 1,
    need: Need = False,
    since: Annotated[
        Path | None,
        typer.Option("--since", help="Earlier record folder or report.html: also say what changed since, and why."),
    ] = None,
    anyway: Anyway = False,
) -> None:
    """Run a study: verdict on the terminal, record folder with report, tables and figures."""
    from benchmark.cli.commands import run_command

    word = run_command(
        study,
        out,
        nodes or [],
        _overrides(set_),
        freeze_time,
        quiet,
        ratio_only,
        draws,
        seed,
        jobs,
        need,
        as_of,
        since,
        anyway,
    )
    if gate:
        raise typer.Exit(GATE[word])


@app.command()
def demo(
    out: Annotated[Path | None, typer.Option("--out", help="Record folder to write.")] = None,
    freeze_time: Annotated[str, typer.Option("--freeze-time", help="Time stamp to write instead of the clock.")] = "",
    quiet: Annotated[bool, typer.Option("--quiet", help="Print the verdict only.")] = False,
    draws: Draws = None,
    seed: Seed = None,
    jobs: Jobs = 1,
    need: Need = False,
) -> None:
    """Run the worked study that comes with the program (invented switch, published CMOS)."""
    from benchmark.cli.commands import run_command
    from benchmark.sets.library import shipped_reports

    study = shipped_reports() / "always-on-hub" / "study.toml"
    run_command(
        study, out or Path("evenload-demo"), [], {}, freeze_time, quiet, draws=draws, seed=seed, jobs=jobs, need=need
    )


@app.command()
def check(
    paths: Annotated[
        list[Path],
        typer.Argument(help="Files or folders: sets, sources, circuits, studies, descriptions of raw measured files."),
    ],
    as_of: AsOf = "",
    nodes: Nodes = None,
) -> None:
    """Check files: names, units, sources, ranges, physics. All problems in one pass."""
    from benchmark.cli.commands import check_command

    check_command(paths, nodes or [], as_of)


@app.command()
def show(
    what: Annotated[
        str,
        typer.Argument(
            help="A list: technologies, wires, circuits, models, values, sources, requirements, evidence, classes; "
            "or one name of these, or TECHNOLOGY.VALUE."
        ),
    ] = "technologies",
    nodes: Nodes = None,
) -> None:
    """Show what there is, or everything about one name, with sources."""
    from benchmark.cli.show import show_command

    show_command(what, nodes or [])


@app.command()
def new(
    kind: Annotated[str, typer.Argument(help="study, technology, circuit or curves (a raw measured file).")],
    path: Annotated[Path, typer.Argument(help="File to write (ends in .toml).")],
    model: Annotated[
        str | None, typer.Option("--model", help="Device model of a new technology; default: given.")
    ] = None,
) -> None:
    """Write a commented template to start from."""
    from benchmark.cli.new import new_command

    new_command(kind, path, model)


@app.command()
def export(
    record: Annotated[
        Path, typer.Argument(help="Record folder of an earlier run, or its record.json; with --netlist also a study.")
    ],
    figures: Annotated[
        Path | None,
        typer.Option("--figures", help="Folder for figures of 88 mm, 180 mm and one page: SVG, PDF, PNG, caption."),
    ] = None,
    tables: Annotated[Path | None, typer.Option("--tables", help="Folder for tables and numbered sources.")] = None,
    form: Annotated[
        str | None, typer.Option("--format", help="Format of the tables: csv, md or latex; default: csv.")
    ] = None,
    ratio_only: Annotated[
        bool, typer.Option("--ratio-only", help="Ratios only: no absolute value of any side.")
    ] = False,
    netlist: Annotated[Path | None, typer.Option("--netlist", help="File for a deck that runs in ngspice.")] = None,
    side: Annotated[
        str | None, typer.Option("--side", help="Netlist: candidate (default), or the id of a contender.")
    ] = None,
    supply: Annotated[
        float | None, typer.Option("--supply", help="Netlist: supply in volt; default: the optimum of the policy.")
    ] = None,
    node: Annotated[str, typer.Option("--node", help="Netlist: label of a node pair; default: the headline.")] = "",
    net: Annotated[str, typer.Option("--net", help="Netlist: net to repeat; default: the largest of the path.")] = "",
    capacitances: Annotated[
        str | None,
        typer.Option(
            "--capacitances", help="Netlist: constants (delay, the default; energy) or charges of the device."
        ),
    ] = None,
    nodes: Nodes = None,
    set_: Set = None,
) -> None:
    """Write figures and tables for papers and boards from a record, or one design point as a deck for ngspice."""
    from benchmark.cli.export import export_command, refuse_idle

    given: dict[str, object] = {"--side": side, "--supply": supply, "--node": node or None, "--net": net or None}
    given |= {"--capacitances": capacitances, "--set": set_, "--nodes": nodes, "--format": form}
    given |= {"--ratio-only": ratio_only or None}
    refuse_idle(
        {name: value is not None for name, value in given.items()},
        netlist=netlist is not None,
        tables=tables is not None,
        figures=figures is not None,
    )
    if netlist is not None:
        from benchmark.cli.netlist import netlist_command

        netlist_command(
            record,
            netlist,
            side=side or "candidate",
            supply=supply,
            node=node,
            net=net,
            capacitances=capacitances or "delay",
            nodes=nodes or [],
            overrides=_overrides(set_),
        )
        if figures is None and tables is None:
            return
    export_command(record, figures, tables, form or "csv", ratio_only)


@app.command()
def trace(
    study: Annotated[Path, typer.Argument(help="Study file, or a record folder.")],
    side: Annotated[str, typer.Option("--side", help="candidate, or the id of a contender.")] = "candidate",
    supply: Annotated[
        float | None, typer.Option("--supply", help="Supply in volt; default: the optimum of the primary policy.")
    ] = None,
    node: Annotated[str, typer.Option("--node", help="Label of a node pair; default: the headline pair.")] = "",
    nodes: Nodes = None,
    set_: Set = None,
) -> None:
    """Show the arithmetic of one result: formula, numbers put in, intermediate results."""
    from benchmark.cli.trace import trace_command

    trace_command(study, side, supply, node, nodes or [], _overrides(set_))


@app.command()
def need(
    study: Annotated[Path, typer.Argument(help="Study file, or a record folder.")],
    names: Annotated[
        list[str] | None,
        typer.Argument(help="Values by ledger key or name; also temperature, deadline, on_off_ratio. Default: usual."),
    ] = None,
    advantage: Annotated[
        float | None, typer.Option("--advantage", help="Level instead of the required advantage of the study.")
    ] = None,
    pair: Annotated[str, typer.Option("--pair", help="Label of a node pair; default: the headline pair.")] = "",
    over: Annotated[
        list[str] | None,
        typer.Option("--over", help="Range LOW..HIGH in the unit of the value; repeatable, in the order of the names."),
    ] = None,
    trade: Annotated[bool, typer.Option("--trade", help="Required second value for each value of the first.")] = False,
    sheet: Annotated[
        bool, typer.Option("--sheet", help="Required value of every decisive value of the candidate.")
    ] = False,
    together: Annotated[
        bool, typer.Option("--together", help="With --sheet: values and spreads moved together by one rule.")
    ] = False,
    map_: Annotated[str, typer.Option("--map", help="Advantage over the deadline and activity, or duty.")] = "",
    improve: Annotated[
        bool, typer.Option("--improve", help="What perfecting each physical term alone could give at most.")
    ] = False,
    flips: Annotated[
        int | None,
        typer.Option("--flips", help="Smallest set of up to so many inputs (1 to 3) that changes the answer."),
    ] = None,
    probability: Annotated[
        float | None, typer.Option("--probability", help="With --sheet: also value and spread for this probability.")
    ] = None,
    draws: Annotated[
        int | None, typer.Option("--draws", help="Draws for --probability: a power of two from 16; default: 256.")
    ] = None,
    seed: Annotated[int | None, typer.Option("--seed", help="Seed of these draws; default: 0.")] = None,
    points: Annotated[int | None, typer.Option("--points", help="Grid points of each scan.")] = None,
    form: Annotated[str, typer.Option("--format", help="text, csv or json.")] = "text",
    nodes: Nodes = None,
    set_: Set = None,
) -> None:
    """Find break-even and required values: where the answer changes, and what would be needed."""
    from benchmark.cli.need import need_command

    need_command(
        study,
        names or [],
        advantage=advantage,
        pair=pair,
        over=over or [],
        points=points,
        trade=trade,
        sheet=sheet,
        together=together,
        map_=map_,
        improve=improve,
        flips=flips,
        probability=probability,
        draws=draws,
        seed=seed,
        form=form,
        nodes=nodes or [],
        overrides=_overrides(set_),
    )


@app.command()
def changes(
    old: Annotated[
        str,
        typer.Argument(
            help="Record folder, record.json, report.html, study file, set file, or REVISION:path of a set."
        ),
    ],
    new: Annotated[str, typer.Argument(help="The same; studies are run, of two sets only the values are compared.")],
    anyway: Anyway = False,
    additive: Annotated[
        bool, typer.Option("--additive", help="Parts also in J and s, beside the logarithms of ratios.")
    ] = False,
    report: Annotated[
        Path | None,
        typer.Option("--report", help="File ending in .html: the report of the new run with a section of the change."),
    ] = None,
    form: Annotated[str, typer.Option("--format", help="text, csv or json.")] = "text",
    draws: Draws = None,
    seed: Seed = None,
    jobs: Jobs = 1,
    nodes: Nodes = None,
) -> None:
    """Show what changed between two runs, and how much of it is due to each changed input."""
    from benchmark.cli.changes import changes_command

    changes_command(
        old,
        new,
        form=form,
        anyway=anyway,
        additive=additive,
        report=report,
        draws=draws,
        seed=seed,
        jobs=jobs,
        nodes=nodes or [],
    )


set_commands.add_to(app)


@app.command()
def extract(
    description: Annotated[Path, typer.Argument(help="Description of a raw measured file (TOML, kind curves).")],
    figure: Annotated[
        Path | None,
        typer.Option("--figure", help="Also draw points and what was read off them: a file ending in svg, pdf or png."),
    ] = None,
    into: Annotated[
        Path | None, typer.Option("--into", metavar="SET", help="Write the numbers into this set; old ones stay in it.")
    ] = None,
    reason: Annotated[str, typer.Option("--reason", help="With --into: why the old numbers are no longer used.")] = "",
    old_date: Annotated[
        str, typer.Option("--old-date", help="With --into: day from which the old numbers held, if the set is silent.")
    ] = "",
    dry_run: Annotated[bool, typer.Option("--dry-run", help="With --into: print the change, write nothing.")] = False,
    form: Annotated[str, typer.Option("--format", help="text, csv or json.")] = "text",
    nodes: Nodes = None,
) -> None:
    """Read numbers off measured curves: swing, threshold, currents, charge, contacts, pull-in, with uncertainty."""
    from benchmark.cli.extract import extract_command

    told = {"reason": reason, "old_date": old_date, "dry_run": dry_run}
    extract_command(description, figure, into, told, nodes=nodes, form=form)


sheet_app = typer.Typer(no_args_is_help=True, rich_markup_mode=None)
app.add_typer(sheet_app, name="sheet", help="Values of a set out to a spreadsheet and in again (CSV).")


@sheet_app.command("export")
def sheet_export(
    set_file: Annotated[Path, typer.Argument(metavar="SET", help="Set file: technology or wires (TOML).")],
    sheet: Annotated[Path, typer.Argument(metavar="SHEET", help="File to write (ends in .csv).")],
    nodes: Nodes = None,
) -> None:
    """Write the values of a set as a table for a spreadsheet: one row per value and node."""
    from benchmark.cli.edit import export_command

    export_command(set_file, sheet, nodes or [])


@sheet_app.command("import")
def sheet_import(
    sheet: Annotated[Path, typer.Argument(metavar="SHEET", help="File that the spreadsheet saved as CSV UTF-8.")],
    set_file: Annotated[Path, typer.Argument(metavar="SET", help="Set file the sheet was exported from.")],
    reason: Annotated[str, typer.Option("--reason", help="Why the old numbers are no longer used.")] = "",
    date: Annotated[str, typer.Option("--date", help="Day from which the new numbers hold (2026-01-31).")] = "",
    old_date: Annotated[
        str, typer.Option("--old-date", help="Day from which the old numbers held, where the file does not say.")
    ] = "",
    decimal: Annotated[
        str, typer.Option("--decimal", help="Decimal sign: point or comma; default: as untouched numbers show.")
    ] = "",
    dry_run: Annotated[bool, typer.Option("--dry-run", help="Check and print the change, write nothing.")] = False,
    form: Annotated[str, typer.Option("--format", help="text, csv or json.")] = "text",
    nodes: Nodes = None,
) -> None:
    """Take the changes of a sheet into its set: comments stay, old numbers are kept, CHANGES.md says what changed."""
    from benchmark.cli.edit import import_command

    told = {"reason": reason, "date": date, "old_date": old_date, "decimal": decimal}
    import_command(sheet, set_file, told, nodes=nodes or [], form=form, dry_run=dry_run)


@app.command()
def batch(
    folder: Annotated[Path, typer.Argument(help="Folder with study files, at any depth.")],
    since: Annotated[
        Path | None, typer.Option("--since", help="Folder of earlier records to compare with; default: --out.")
    ] = None,
    out: Annotated[
        Path | None, typer.Option("--out", help="Folder for the new records, one folder per study; default: none.")
    ] = None,
    form: Annotated[str, typer.Option("--format", help="text, csv or json.")] = "text",
    draws: Draws = None,
    seed: Seed = None,
    jobs: Annotated[int, typer.Option("--jobs", help="Studies run at once; no digit depends on their number.")] = 1,
    freeze_time: Annotated[str, typer.Option("--freeze-time", help="Time stamp to write instead of the clock.")] = "",
    watch: Annotated[bool, typer.Option("--watch", help="Run again whenever an input file changes.")] = False,
    nodes: Nodes = None,
) -> None:
    """Run every study of a folder: unchanged, moved or flipped. Exit status 20: a verdict flipped, 3: one failed."""
    from benchmark.cli.batch import batch_command

    status = batch_command(
        folder,
        since=since,
        out=out,
        form=form,
        draws=draws,
        seed=seed,
        jobs=jobs,
        freeze_time=freeze_time,
        watch=watch,
        nodes=nodes or [],
    )
    if status:
        raise typer.Exit(status)
