"""Texts of new files, written from the catalogue and the declarations of models and circuits (layer 10).

A name in a template comes from what the program knows, so a template cannot name something unknown; the numbers are
invented and say so.
"""

from __future__ import annotations

import os
import textwrap
from collections.abc import Mapping
from pathlib import Path
from typing import Any, get_args

from benchmark.catalogue import EVIDENCE, QUANTITIES, Quantity
from benchmark.cli.describe import input_need
from benchmark.cli.template_numbers import SPREADS, TECHNOLOGY_NUMBERS
from benchmark.devices import model
from benchmark.devices.model import DeviceModel, Input
from benchmark.record.value_text import usual_range
from benchmark.sets.library import shipped_nodes
from benchmark.sets.schema import RowTable, SpreadTable
from benchmark.sets.tables import COLUMN_UNITS

__all__ = ["circuit_template", "comment", "schema_hint", "technology_template", "value_block"]

#: widest comment line
WIDTH = 110
NODE = "n1"


def comment(text: str, indent: str = "") -> str:
    """Return text as TOML comment lines."""
    start = "# " + indent
    lines = textwrap.wrap(text, WIDTH, initial_indent=start, subsequent_indent=start, break_on_hyphens=False)
    return "\n".join(lines)


def schema_hint(name: str, place: Path) -> str:
    """Return the line that tells an editor the JSON Schema of a file at ``place``, as a path from that file.

    On another drive there is no such path, and the line holds an address.
    """
    schema = shipped_nodes().resolve() / "schema" / f"{name}.json"
    try:
        where = Path(os.path.relpath(schema, place.parent.resolve())).as_posix()
    except ValueError:
        where = schema.as_uri()
    return f"#:schema {where}\n"


def value_block(
    quantity: Quantity, number: str, *, need: str = "", active: bool = True, dotted: str = "", spread: str = ""
) -> str:
    """Return one value table with its meaning above it; commented out when not ``active``."""
    head = f"{quantity.meaning} ({quantity.symbol}); usually {usual_range(quantity)}; {quantity.domain_text}"
    lines = [comment(head[0].upper() + head[1:])]
    if need:
        lines.append(comment(need, "  "))
    table = [f"[{dotted or 'value.' + quantity.name}]", f"value = {number}", f'unit = "{quantity.unit}"']
    if spread:
        table.append(f"spread = {spread}")
    return "\n".join([*lines, *(table if active else [f"# {line}" for line in table])])


def _head(kind: str, stem: str, title: str) -> list[str]:
    return [
        comment(
            f"{kind} written by evenload new. Every number is invented: replace it, and say where yours comes from."
        ),
        "schema = 1",
        f'id = "{stem}"                # the same as the file name',
        f'title = "{title}"',
    ]


def _how_to() -> str:
    shapes = [item.model_fields["shape"].annotation for item in get_args(get_args(SpreadTable)[0])]
    names = [get_args(shape)[0] for shape in shapes]
    evidence = "; ".join(
        name + (f" (states its {' and '.join(item.must_state)})" if item.must_state else "")
        for name, item in EVIDENCE.items()
    )
    lines = (
        "value or by_node: the number, or one per node: by_node = { n1 = 1.0, n2 = 0.8 }",
        "unit: any spelling of the right dimension; missing only for plain numbers",
        f"spread: shape {', '.join(names)}; low and high for hard limits, sd or percent, factor or ln_sd",
        f"evidence: {evidence}",
        "source: a key of sources.toml beside this file or of the shipped list (evenload show sources)",
        "where, conditions, note, owner, date, bound (at-least, at-most), formula (derived values), unusual",
        "What a value does not say itself, it takes from [default].",
    )
    return "\n".join(["# Keys of a value:", *(comment(line, "  ") for line in lines)])


def _default_table(conditions: str) -> str:
    return f'[default]\nevidence = "invented"\nsource = "invented"\nwhere = "-"\nconditions = "{conditions}"'


def _number_of(device: DeviceModel, item: Input) -> str:
    """An invented number; where none is listed, the middle of the usual range."""
    listed = TECHNOLOGY_NUMBERS.get(device.name, {})
    if item.name in listed:
        return listed[item.name]
    quantity = QUANTITIES[item.name]
    if quantity.low > 0.0:
        middle = (quantity.low * quantity.high) ** 0.5
        return f"{middle:.3g}" if quantity.domain != "count" else f"{max(1, round(middle))}"
    return f"{0.5 * (quantity.low + quantity.high):.3g}"


def _inputs(device: DeviceModel, options: Mapping[str, str]) -> list[str]:
    blocks = []
    listed = TECHNOLOGY_NUMBERS.get(device.name, {})
    for item in device.inputs:
        if item.name == "reference_temperature":
            continue
        applies = item.when is None or options.get(item.when[0]) in item.when[1]
        active = applies and ((item.required and item.default is None) or item.name in listed)
        need = input_need(item)
        if not item.required and item.default is None:
            need += ": not stated means unknown"
        number = _number_of(device, item)
        spread = SPREADS.get(item.name, "") if active else ""
        blocks.append(value_block(QUANTITIES[item.name], number, need=need, active=active, spread=spread))
    return blocks


def technology_template(name: str, stem: str) -> dict[str, str]:
    """Return file name -> text of a technology of one model; tables, if it needs any, are files of their own."""
    device = model(name)
    options = {option.name: option.default for option in device.options}
    parts = [
        "\n".join(
            [
                *_head("Technology", stem, f"Invented technology of the model {name}"),
                f'model = "{name}"              # {device.title}',
                f'nodes = ["{NODE}"]                  # labels in order, never lengths',
                'flavour = ""                    # a label, such as a threshold flavour',
                'ambition = "today"              # today, target or limit',
                'note = ""',
                "# Temperature at which the values hold",
                'reference_temperature = { value = 25.0, unit = "degC" }',
            ]
        ),
        _how_to(),
        _default_table("stated with each value, or here for all"),
    ]
    if options:
        lines = ["# Choices; each word is one of those listed", "[option]"]
        for item in device.options:
            words = " | ".join(item.allowed)
            line = f'{item.name} = "{item.default}"'
            lines += [f"{line}    # {words}"] if len(line) + len(words) < WIDTH else [comment(words), line]
        parts.append("\n".join(lines))
    files: dict[str, str] = {}
    tables = [table for table, required in device.tables.items() if required and table != "rows"]
    for table in tables:
        files |= _table_files(f"tables/{stem}-{table}")
        parts.append(
            f"# Measured curve: the CSV file is described by the TOML file of the same name beside it\n"
            f'[table.{table}]\nfile = "tables/{stem}-{table}.csv"'
        )
    parts += _inputs(device, options)
    if "rows" in device.tables:
        parts += _rows()
    parts.append(
        "# Where the set may be used; outside, a point of the search is infeasible\n"
        "# [valid]\n"
        '# supply = { low = 0.3, high = 0.8, unit = "V" }\n'
        '# temperature = { low = -20.0, high = 85.0, unit = "degC" }'
    )
    parts.append(
        "# Published numbers the set must predict; they are compared, never fitted\n"
        "# [anchor.fan_out_4_delay]\n"
        '# value = 10.0\n# unit = "ps"\n# source = "a-key-of-sources"'
    )
    return {f"{stem}.toml": "\n\n".join(parts) + "\n", **files}


def _table_files(stem: str) -> dict[str, str]:
    """An invented curve of 60 mV per decade, one sweep, with its description."""
    meanings = ("control_voltage", "path_voltage", "temperature", "path_current_per_width")
    rows = [f"{step / 10},0.3,25,{10.0 ** (-12 + 5 * step / 3):.3g}" for step in range(4)]
    columns = [
        f'[column.{meaning}]\nmeaning = "{meaning}"\nkind = "{kind}"\nunit = "{unit}"'
        for meaning, kind, unit in zip(
            meanings, ("axis", "axis", "axis", "value"), ("V", "V", "degC", "A/um"), strict=True
        )
    ]
    name = stem.rpartition("/")[2]
    sidecar = [
        comment(f"Describes {name}.csv. Every number is invented."),
        "schema = 1",
        f'file = "{name}.csv"',
        'delimiter = ","',
        'decimal = "."',
        'evidence = "invented"',
        'source = "invented"',
        'where = "-"',
        'conditions = "25 degC"',
        comment("Instrument floor: a row at or below it is an upper bound"),
        'floor = { column = "path_current_per_width", value = 1.0e-13, unit = "A/um" }',
        comment("Which column is read along which, on which scale (linear, log), how (monotone, charge)"),
        'interpolate = { column = "path_current_per_width", along = "control_voltage", scale = "log", '
        'method = "monotone" }',
        "",
        comment(f"One table per column; kind is label, axis or value. Meanings: {', '.join(COLUMN_UNITS)}"),
        comment('A column with the sweep direction has kind = "label", allowed = ["forward", "backward"]'),
        "\n\n".join(columns),
    ]
    return {f"{stem}.csv": "\n".join([",".join(meanings), *rows]) + "\n", f"{stem}.toml": "\n".join(sidecar) + "\n"}


_ROW_NUMBERS: dict[str, tuple[tuple[str, ...], str]] = {
    "supply": (("0.4", "0.5", "0.6"), "V"),
    "temperature": (("25.0", "25.0", "25.0"), "degC"),
    "delay": (("30.0", "16.0", "11.0"), "ps"),
    "energy_per_cycle": (("0.48", "0.75", "1.08"), "fJ"),
    "leakage_power": (("14.0", "20.0", "27.0"), "pW"),
    "drive_resistance": (("14.0", "7.4", "5.2"), "kohm"),
    "input_capacitance": (("0.6", "0.6", "0.6"), "fF"),
    "area": (("0.022", "0.022", "0.022"), "um^2"),
}


def _rows() -> list[str]:
    keys = [key for key in RowTable.model_fields if key in _ROW_NUMBERS]
    text = comment("One [[row]] per supply and temperature: results of the stage named in [option]")
    blocks = []
    for position in range(3):
        lines = ["[[row]]", f'node = "{NODE}"']
        for key in keys:
            numbers, unit = _ROW_NUMBERS[key]
            lines.append(f'{key} = {{ value = {numbers[position]}, unit = "{unit}" }}')
        blocks.append("\n".join(lines))
    return [f"{text}\n{blocks[0]}", *blocks[1:]]


_NETS: tuple[dict[str, Any], ...] = (
    {"name": "decode", "driver": "nand2", "cell": "inverter", "count": 8, "path": 2, "rising": 0.1, "length": "20.0"},
    {"name": "line", "driver": "inverter", "cell": "nand2", "count": 1, "path": 1, "rising": 0.5, "length": "200.0"},
)


def circuit_template(stem: str) -> str:
    """Return the text of a circuit of two nets, one of them on a layer of its own."""
    parts = [
        "\n".join(
            [
                *_head("Circuit", stem, "Invented circuit of two kinds of nets"),
                'operation = "one access"            # what one operation is, in words',
            ]
        ),
        "# What the wire values below do not say themselves\n" + _default_table("-"),
    ]
    for position, net in enumerate(_NETS):
        lines = ["[[net]]", f'name = "{net["name"]}"']
        layer = ', layer = "upper"' if position else ""
        remarks = (
            "Cell that drives the net: inverter, nand2 to nand8, nor2 to nor8, aoi21, oai22 and the like",
            "Driven inputs at the far end: cell, input (a, b, ...), how many",
            "A fixed capacitance at the far end",
            'Wire: length in a unit or in "gate-pitch"; layer "local" is the wires set of the study',
            'Swing fixed from outside, if any: swing = { value = 0.6, unit = "V", reason = "set by the cell" }',
            "Rising transitions of one such net per operation; busiest_per_operation is what endurance is judged on",
            "Number of alike nets, and how many of them follow each other on the critical path",
        )
        entries = (
            f'driver = "{net["driver"]}"',
            f'loads = [{{ cell = "{net["cell"]}", input = "a", count = 2 }}]',
            'fixed_load = { value = 0.0, unit = "fF" }',
            f'wire = {{ length = {net["length"]}, length_unit = "um"{layer} }}',
            "",
            f"rising_per_operation = {net['rising']}\nbusiest_per_operation = 0.5",
            f"count = {net['count']}\non_critical_path = {net['path']}",
        )
        for remark, entry in zip(remarks, entries, strict=True):
            lines += [comment(remark)] if position == 0 else []
            lines += [entry] if entry else []
        parts.append("\n".join(lines))
    parts.append(
        "# A layer of this circuit's own, the same for both sides\n"
        "[layer.upper]\n"
        'resistance_per_length = { value = 5.0, unit = "ohm/um" }\n'
        'capacitance_per_length = { value = 0.2, unit = "fF/um" }'
    )
    return "\n\n".join(parts) + "\n"
