"""The command ``extract``: numbers read off measured curves, drawn, and written into a set (layer 10)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import typer

from benchmark.cli.commands import check_folders
from benchmark.cli.forms import check_form, echo_csv, echo_json
from benchmark.cli.layout import Block, Facts, Note, Table, show_blocks
from benchmark.errors import UsageError

if TYPE_CHECKING:
    from benchmark.api.extract import Extraction
    from benchmark.curves.extraction import Found
    from benchmark.curves.record import MeasuredCurves

__all__ = ["extract_command"]

#: devices that are listed one by one; more are summed up, and csv and json have all of them
LISTED = 12


def extract_command(
    description: Path,
    figure: Path | None,
    into: Path | None,
    told: Mapping[str, Any],
    *,
    nodes: Sequence[Path] | None,
    form: str,
) -> None:
    """Read, print, draw and write what was asked for; nothing is drawn or written when something is refused."""
    from benchmark import api
    from benchmark.api.extract import check_figure

    check_form(form)
    idle = [f"--{name.replace('_', '-')}" for name, value in told.items() if value] + (["--nodes"] if nodes else [])
    if into is None and idle:
        message = f"{', '.join(idle)}: only with --into"
        raise UsageError(message)
    check_folders(nodes or [])
    if figure is not None:
        check_figure(figure)
    found = api.extract(description)
    change = {"reason": told["reason"], "old_date": told["old_date"] or None, "nodes": nodes or []}
    edited = None if into is None else found.into(into, write=False, **change)
    drawn = () if figure is None else found.figure(figure)
    if into is not None and not told["dry_run"]:
        edited = found.into(into, **change)
    if form == "json":
        said = {"figures": [str(path) for path in drawn]}
        if edited is not None:
            said |= {"written": [str(path) for path in edited.written]}
            echo_json(found.data | said | {"change": dict(edited.data), "change_warnings": list(edited.warnings)})
            return
        echo_json(found.data | said)
        return
    if form == "csv":
        from benchmark.record.extracted import COLUMNS, found_rows

        rows = [row for one in found.found for row in found_rows(one, found.curves)]
        echo_csv(COLUMNS, (["" if row[name] is None else row[name] for name in COLUMNS] for row in rows))
        return
    show_blocks([*_blocks(found), *([Note(f"Drawn: {', '.join(map(str, drawn))}")] if drawn else [])])
    if edited is not None:
        from benchmark.cli.edit import show_edit

        typer.echo()
        show_edit(edited, form, dry_run=told["dry_run"])


def _blocks(found: Extraction) -> list[Block]:
    """What was done to the file, the numbers, what their uncertainty is made of, the devices."""
    curves = found.curves
    facts = [
        ("description", curves.description),
        ("data sha256", curves.digest),
        ("evidence", f"{curves.evidence}, {curves.source}" + (f", {curves.where}" if curves.where != "-" else "")),
        ("conditions", curves.conditions),
        *([("date", curves.date)] if curves.date else []),
        *(("read", note) for note in curves.notes),
    ]
    blocks: list[Block] = [Facts(f"Read from {curves.file}", facts), _numbers(found)]
    parts = _parts(found)
    blocks += [parts] if parts.rows else []
    for one in found.found:
        if one.over is not None:
            blocks += _devices(one, curves)
    said: dict[str, dict[str, None]] = {}
    for one in found.found:
        for warning in one.warnings:
            said.setdefault(warning, {})[one.request.quantity.replace("_", " ")] = None
    notes = [f"{', '.join(names)}: {warning}" for warning, names in said.items()]
    return [*blocks, *(Note(f"note: {note}") for note in (*notes, *found.warnings))]


def _bounded(text: str, bound: str) -> str:
    return {"at-least": f"at least {text}", "at-most": f"at most {text}"}.get(bound, text)


def _size_words(size: float | None) -> str:
    from benchmark.record.extracted import two_digits

    return "not known" if size is None else two_digits(size) if size else "0"


def _numbers(found: Extraction) -> Table:
    from benchmark.record.extracted import digits_of, found_rows, in_unit, size_in_unit

    rows = []
    for one in found.found:
        request, unit = one.request, one.request.unit
        uncertainty = size_in_unit(one.uncertainty, unit)
        last = found_rows(one, found.curves)[-1]
        between = "" if last["from"] is None else f"{last['from']:.6g} to {last['to']:.6g} {last['along_unit']}"
        asked = ", ".join(f"{key.replace('_', ' ')} {text}" for key, text in request.said.items())
        rows.append(
            (
                request.quantity.replace("_", " "),
                _bounded(digits_of(in_unit(one.value, unit), uncertainty), one.bound),
                "none: a bound" if one.bound else _size_words(uncertainty),
                unit,
                asked or "-",
                between or f"{one.over.count if one.over else 0} devices",
                "-" if last["points"] is None else str(last["points"]),
                f"{request.name}{f' at {request.node}' if request.node else ''}" or "-",
            )
        )
    columns = ("quantity", "value", "standard uncertainty", "unit", "asked", "read between", "points", "value of a set")
    return Table("Read off the curves", columns, rows)


def _parts(found: Extraction) -> Table:
    from benchmark.record.extracted import size_in_unit

    rows = []
    for one in found.found:
        for part in one.parts:
            size = size_in_unit(part.size, one.request.unit) or 0.0
            freedom = "-" if part.freedom == float("inf") else f"{part.freedom:.3g}"
            rows.append(
                (one.request.quantity.replace("_", " "), part.name, _size_words(size), one.request.unit, freedom)
            )
    columns = ("quantity", "part", "standard uncertainty", "unit", "degrees of freedom")
    return Table("What the uncertainty is made of", columns, rows)


def _devices(one: Found, curves: MeasuredCurves) -> list[Block]:
    from benchmark.record.extracted import digits_of, found_rows, in_unit, size_in_unit, two_digits

    over, unit = one.over, one.request.unit
    if over is None:
        return []

    def size(si: float | None) -> str:
        return f"{_size_words(size_in_unit(si, unit))} {'' if si is None or unit == '1' else unit}".rstrip()

    quartiles = [in_unit(q, unit) for q in (over.lower_quartile, over.upper_quartile) if q is not None]
    facts = [
        ("devices", f"{over.count}, of which {over.bounds} are known only by a bound"),
        ("quartiles", " and ".join(f"{q:.4g} {unit}" for q in quartiles) if len(quartiles) == 2 else "rest on bounds"),
        ("spread seen", f"{size(over.seen_spread)} (distance of the quartiles over that of as many normal draws)"),
        ("uncertainty of one device", f"{size(over.measured)} (scatter and spacing of its points)"),
        ("spread of the devices", f"{size(over.device_spread)} (spread seen without that uncertainty)"),
    ]
    name = one.request.quantity.replace("_", " ")
    blocks: list[Block] = [Facts(f"{name}: {over.count} devices", facts)]
    if over.count <= LISTED:
        rows = []
        for row in found_rows(one, curves)[: over.count]:
            uncertainty = row["standard_uncertainty"]
            shown = _bounded(digits_of(row["value"], uncertainty), row["bound"])
            rows.append((row["device"], shown, two_digits(uncertainty) if uncertainty else "-", unit))
        blocks.append(Table("", ("device", "value", "standard uncertainty", "unit"), rows))
    return blocks
