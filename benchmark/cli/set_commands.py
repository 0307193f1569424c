"""Options of the commands that change a set: ``supersede`` and ``sheet`` (layer 10).

Functions without work of their own, so that help stays quick; ``add_to`` hangs them onto the application.
"""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

__all__ = ["Nodes", "add_to"]

Nodes = Annotated[
    list[Path] | None, typer.Option("--nodes", help="Further folder of sets, searched first (repeatable).")
]


def supersede(
    set_file: Annotated[Path, typer.Argument(metavar="SET", help="Set file: technology or wires (TOML).")],
    name: Annotated[str, typer.Argument(metavar="VALUE", help="Name of the value.")],
    number: Annotated[str, typer.Argument(metavar="NUMBER", help="Its new number, in --unit.")],
    unit: Annotated[str, typer.Option("--unit", help="Unit of the new number; 1 for a plain number.")] = "",
    evidence: Annotated[str, typer.Option("--evidence", help="Evidence class of the new number.")] = "",
    source: Annotated[str, typer.Option("--source", help="Key of sources.toml.")] = "",
    where: Annotated[str, typer.Option("--where", help="Place in the source; - for none.")] = "",
    conditions: Annotated[
        str, typer.Option("--conditions", help="What the new number holds for: temperature, sample; - for none.")
    ] = "",
    date: Annotated[str, typer.Option("--date", help="Day from which the new number holds (2026-01-31).")] = "",
    reason: Annotated[str, typer.Option("--reason", help="Why the old number is no longer used.")] = "",
    old_date: Annotated[
        str, typer.Option("--old-date", help="Day from which the old number held, where the file does not say.")
    ] = "",
    node: Annotated[str, typer.Option("--node", help="Change this node only; default: one number for all nodes.")] = "",
    spread: Annotated[
        str,
        typer.Option(
            "--spread", help="Range: 'lognormal factor 1.25', 'normal percent 5', 'uniform 160 180', none, or keep."
        ),
    ] = "",
    note: Annotated[str, typer.Option("--note", help="Note on the new number; the old note goes with the old.")] = "",
    owner: Annotated[str, typer.Option("--owner", help="Who decided; default: as it was.")] = "",
    bound: Annotated[str, typer.Option("--bound", help="The new number is a bound only: at-least or at-most.")] = "",
    dry_run: Annotated[bool, typer.Option("--dry-run", help="Check and print the change, write nothing.")] = False,
    form: Annotated[str, typer.Option("--format", help="text, csv or json.")] = "text",
    nodes: Nodes = None,
) -> None:
    """Give a value of a set a new number: the old one stays in the file, derived values follow, CHANGES.md says so."""
    from benchmark.cli.edit import supersede_command

    told = {
        "unit": unit,
        "evidence": evidence,
        "source": source,
        "where": where,
        "conditions": conditions,
        "date": date,
        "reason": reason,
        "old_date": old_date,
        "node": node,
        "spread": spread,
        "note": note,
        "owner": owner,
        "bound": bound,
    }
    supersede_command(set_file, name, number, told, nodes=nodes or [], form=form, dry_run=dry_run)


def sheet_export(
    set_file: Annotated[Path, typer.Argument(metavar="SET", help="Set file: technology or wires (TOML).")],
    sheet: Annotated[Path, typer.Argument(metavar="SHEET", help="File to write (ends in .csv).")],
    nodes: Nodes = None,
) -> None:
    """Write the values of a set as a table for a spreadsheet: one row per value and node."""
    from benchmark.cli.edit import export_command

    export_command(set_file, sheet, nodes or [])


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


def add_to(app: typer.Typer) -> None:
    """Hang the commands onto an application."""
    app.command()(supersede)
    sheet = typer.Typer(no_args_is_help=True, rich_markup_mode=None)
    sheet.command("export")(sheet_export)
    sheet.command("import")(sheet_import)
    app.add_typer(sheet, name="sheet", help="Values of a set out to a spreadsheet and in again (CSV).")
