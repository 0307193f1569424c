"""Measured tables: a CSV file with one header row and a TOML sidecar of the same stem (layer 2)."""

from __future__ import annotations

import csv
import hashlib
import io
from dataclasses import dataclass
from decimal import Decimal, InvalidOperation
from pathlib import Path
from typing import Literal

import numpy as np
from pydantic import Field

from benchmark.errors import Problem, nearest
from benchmark.measured import MeasuredTable
from benchmark.sets.files import TomlFile, read_bytes, read_toml
from benchmark.sets.problems import Collector
from benchmark.sets.schema import (
    MOST_DIGITS,
    DefaultsTable,
    FileModel,
    FreeNote,
    Number,
    Schema,
    Text,
    UnitText,
    validate,
)
from benchmark.sets.values import Place, read_provenance
from benchmark.units import Unit, UnitError, parse_unit, to_si

__all__ = ["COLUMN_UNITS", "TableFile", "cell_number", "read_table"]

MAX_ROWS = 200_000
MAX_COLUMNS = 200
#: range of the numbers a cell may hold, as in every other file
LEAST, MOST = Decimal("1e-300"), Decimal("1e300")

#: meaning of a column -> unit that fixes its dimension
COLUMN_UNITS: dict[str, str] = {
    "control_voltage": "V",
    "path_voltage": "V",
    "temperature": "K",
    "path_current": "A",
    "path_current_per_width": "A/m",
    "input_capacitance": "F",
    "input_capacitance_per_width": "F/m",
    "path_resistance": "ohm",
}
#: values that must be positive once the declared sign is removed
_POSITIVE = {
    "path_current",
    "path_current_per_width",
    "input_capacitance",
    "input_capacitance_per_width",
    "path_resistance",
}


class ColumnTable(FileModel):
    """What one column of the CSV file means."""

    meaning: Text = Field(description="What the column holds; for labels: a name of your own, such as sweep")
    kind: Literal["label", "axis", "value"] = Field(
        description="label: a word per row; axis: what was set; value: what was measured"
    )
    unit: Text | None = Field(default=None, description="Unit of the numbers; labels have none")
    sign: Literal["positive", "negative"] = Field(
        default="positive", description="negative: the numbers of the file are turned round when read"
    )
    allowed: list[Text] | None = Field(default=None, description="Words a label may have")


class FloorTable(FileModel):
    """Instrument floor of a value column."""

    column: Text = Field(description="Column of the CSV file")
    value: Number = Field(description="A row at or below it is an upper bound; in the unit")
    unit: UnitText


class InterpolateTable(FileModel):
    """How to read between the points."""

    column: Text = Field(description="Value column of the CSV file")
    along: Text = Field(description="Axis column it is read along")
    scale: Literal["linear", "log"] = Field(description="Scale of the value column between the points")
    method: Literal["monotone", "charge"] = Field(
        description="monotone: a monotone cubic through the points; charge: a capacitance, integrated along the axis"
    )


class Sidecar(FileModel):
    """The sidecar of a measured table."""

    schema_: Schema
    file: Text = Field(description="Name of the CSV file beside this file")
    delimiter: Literal[",", ";", "\t", " "] = Field(default=",", description="What stands between two cells")
    decimal: Literal[".", ","] = Field(default=".", description="Decimal sign of the numbers")
    evidence: Text = Field(description="What the numbers are worth: their evidence class")
    source: Text = Field(description="Where the numbers come from: a key of sources.toml")
    where: Text = Field(default="-", description="Place in the source: table, figure, page")
    conditions: Text = Field(description="What the numbers hold for: temperature, sample, geometry")
    note: FreeNote = ""
    owner: Text = Field(default="", description="Who decided, for choices and targets")
    floor: FloorTable | None = Field(default=None, description="Instrument floor of a value column")
    interpolate: InterpolateTable = Field(description="How to read between the points")
    column: dict[str, ColumnTable] = Field(min_length=2, description="One table per column of the CSV file")


@dataclass(frozen=True)
class TableFile:
    """A measured table with the provenance of its sidecar."""

    table: MeasuredTable
    evidence: str
    source: str
    where: str
    conditions: str
    note: str
    sha256: str
    sidecar_sha256: str
    file: str
    raw: str
    sidecar_raw: str


def read_table(
    csv_path: Path, name: str, sources: frozenset[str], collector: Collector, shown_name: str
) -> TableFile | None:
    """Read one table; every problem names file, row and column."""
    before = len(collector.problems)
    sidecar_path = csv_path.with_suffix(".toml")
    file = read_toml(sidecar_path, collector, shown_name.rsplit(".", 1)[0] + ".toml")
    if file is None:
        return None
    sidecar = validate(Sidecar, file, collector)
    if sidecar is None:
        return None
    if sidecar.file != csv_path.name:
        collector.add(
            file.problem("file", "does not name the table beside the sidecar", repr(sidecar.file), repr(csv_path.name))
        )
    read_provenance(sidecar, Place(file, "", DefaultsTable(), sources), collector)
    units = _column_units(sidecar, file, collector)
    raw = read_bytes(csv_path, shown_name, collector)
    if raw is None:
        return None
    rows = _rows(raw, sidecar, shown_name, collector)
    if rows is None or len(collector.problems) > before:
        return None
    floor = _floor(sidecar, file, units, collector)
    columns, labels = _columns(rows, sidecar, units, floor, shown_name, collector)
    if len(collector.problems) > before:
        return None
    meanings = {column: spec.meaning for column, spec in sidecar.column.items()}
    table = MeasuredTable(
        name=name,
        columns=columns,
        labels=labels,
        value=meanings[sidecar.interpolate.column],
        along=meanings[sidecar.interpolate.along],
        scale=sidecar.interpolate.scale,
        method=sidecar.interpolate.method,
        floor=floor,
        where=shown_name,
    )
    _check_rows(table, [line for line, _ in rows[1:]], shown_name, collector)
    if len(collector.problems) > before:
        return None
    return TableFile(
        table,
        sidecar.evidence,
        sidecar.source,
        sidecar.where,
        sidecar.conditions,
        sidecar.note,
        hashlib.sha256(raw).hexdigest(),
        file.sha256,
        shown_name,
        raw.decode("utf-8"),
        file.text,
    )


def _column_units(sidecar: Sidecar, file: TomlFile, collector: Collector) -> dict[str, Unit]:
    units: dict[str, Unit] = {}
    for column, spec in sidecar.column.items():
        dotted = f"column.{column}"
        if spec.kind == "label":
            continue
        if spec.meaning not in COLUMN_UNITS:
            collector.add(
                file.problem(
                    f"{dotted}.meaning",
                    "is not a known meaning",
                    repr(spec.meaning),
                    ", ".join(COLUMN_UNITS),
                    nearest(spec.meaning, COLUMN_UNITS),
                )
            )
            continue
        wanted = parse_unit(COLUMN_UNITS[spec.meaning])
        if spec.unit is None:
            collector.add(file.problem(dotted, "has no unit", "", f"a unit such as {COLUMN_UNITS[spec.meaning]}"))
            continue
        try:
            unit = parse_unit(spec.unit)
        except UnitError as error:
            collector.add(file.problem(f"{dotted}.unit", f"unknown unit: {error}"))
            continue
        if unit.dimension != wanted.dimension:
            collector.add(
                file.problem(
                    f"{dotted}.unit",
                    "has the wrong dimension",
                    repr(spec.unit),
                    f"a unit such as {COLUMN_UNITS[spec.meaning]}",
                )
            )
            continue
        units[column] = unit
    meanings = [spec.meaning for spec in sidecar.column.values()]
    for meaning in sorted({meaning for meaning in meanings if meanings.count(meaning) > 1}):
        collector.add(file.problem("column", "two columns have the same meaning", repr(meaning)))
    named = [
        ("interpolate.column", sidecar.interpolate.column, "value"),
        ("interpolate.along", sidecar.interpolate.along, "axis"),
    ]
    if sidecar.floor:
        named.append(("floor.column", sidecar.floor.column, "value"))
    for dotted, column, kind in named:
        allowed = [name for name, spec in sidecar.column.items() if spec.kind == kind]
        if column not in allowed:
            what = f"is not a column of kind {kind}" if column in sidecar.column else "is a column nobody describes"
            collector.add(file.problem(dotted, what, repr(column), ", ".join(allowed), nearest(column, allowed)))
    return units


def _rows(raw: bytes, sidecar: Sidecar, name: str, collector: Collector) -> list[tuple[int, list[str]]] | None:
    """Split into (line number, cells), header first."""
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError:
        collector.add(Problem(name, 0, "", "is not UTF-8 text"))
        return None
    if "\x00" in text:
        collector.add(Problem(name, 0, "", "is binary"))
        return None
    reader = csv.reader(io.StringIO(text), delimiter=sidecar.delimiter, strict=True)
    rows: list[tuple[int, list[str]]] = []
    try:
        for cells in reader:
            if any(cell.strip() for cell in cells):
                rows.append((reader.line_num, [cell.strip() for cell in cells]))
            if len(rows) > MAX_ROWS:
                collector.add(Problem(name, reader.line_num, "", "has too many rows", "", f"at most {MAX_ROWS}"))
                return None
    except csv.Error as error:
        collector.add(Problem(name, reader.line_num, "", f"is not a readable table ({error})"))
        return None
    if len(rows) < 2:
        collector.add(Problem(name, 0, "", "has no data rows" if rows else "is empty"))
        return None
    header_line, header = rows[0]
    if len(header) > MAX_COLUMNS:
        collector.add(
            Problem(name, header_line, "", "has too many columns", str(len(header)), f"at most {MAX_COLUMNS}")
        )
        return None
    for column in sorted({column for column in header if header.count(column) > 1}):
        collector.add(Problem(name, header_line, column, "column name appears twice"))
    for column in header:
        if column not in sidecar.column:
            collector.add(
                Problem(
                    name,
                    header_line,
                    column,
                    "column is not described in the sidecar",
                    "",
                    ", ".join(sidecar.column),
                    nearest(column, sidecar.column),
                )
            )
    for column in sidecar.column:
        if column not in header:
            collector.add(
                Problem(
                    name,
                    header_line,
                    column,
                    "column is described but absent",
                    "",
                    ", ".join(header),
                    nearest(column, header),
                )
            )
    for line, cells in rows[1:]:
        if len(cells) != len(header):
            collector.add(
                Problem(name, line, "", "row and header differ in length", f"{len(cells)} cells", f"{len(header)}")
            )
    return rows


def cell_number(text: str, decimal: str) -> Decimal | None:
    """Read the number of a cell exactly; None when it is none, or beyond the range of the program."""
    if len(text) > MOST_DIGITS or not text.isascii():  # Decimal reads the digits of every script
        return None
    if decimal == ",":
        if "." in text:
            return None
        text = text.replace(",", ".")
    try:
        number = Decimal(text)
    except InvalidOperation:
        return None
    if not number.is_finite() or "_" in text or (number and not LEAST <= number.copy_abs() <= MOST):
        return None
    return number


def _columns(
    rows: list[tuple[int, list[str]]],
    sidecar: Sidecar,
    units: dict[str, Unit],
    floor: dict[str, float],
    name: str,
    collector: Collector,
) -> tuple[dict[str, np.ndarray], dict[str, tuple[str, ...]]]:
    header = rows[0][1]
    columns: dict[str, np.ndarray] = {}
    labels: dict[str, tuple[str, ...]] = {}
    for position, column in enumerate(header):
        spec = sidecar.column[column]
        if spec.kind == "label":
            labels[spec.meaning] = tuple(cells[position] for _, cells in rows[1:])
            for line, cells in rows[1:]:
                if spec.allowed and cells[position] not in spec.allowed:
                    collector.add(
                        Problem(
                            name, line, column, "is not an allowed word", repr(cells[position]), ", ".join(spec.allowed)
                        )
                    )
            continue
        numbers = []
        for line, cells in rows[1:]:
            number = cell_number(cells[position], sidecar.decimal)
            if number is None:
                hint = (
                    'declare decimal = "," in the sidecar' if "," in cells[position] and sidecar.decimal == "." else ""
                )
                collector.add(
                    Problem(
                        name,
                        line,
                        column,
                        "is not a number",
                        repr(cells[position][:40]),
                        f"a number with decimal {sidecar.decimal!r}, at most 1e300",
                        hint,
                    )
                )
                continue
            number = -number if spec.sign == "negative" and number != 0 else number
            si = to_si(number, units[column])
            noise = abs(si) <= floor.get(spec.meaning, -1.0)  # around zero, no larger than the stated floor
            if spec.meaning in _POSITIVE and number <= 0 and not noise:
                collector.add(
                    Problem(
                        name,
                        line,
                        column,
                        "must be above 0" if spec.sign == "positive" else "must be below 0, as its sign is declared",
                        cells[position],
                    )
                )
                continue
            numbers.append(si)
        columns[spec.meaning] = np.array(numbers, dtype=np.float64)
    return columns, labels


def _floor(sidecar: Sidecar, file: TomlFile, units: dict[str, Unit], collector: Collector) -> dict[str, float]:
    if sidecar.floor is None or sidecar.floor.column not in units:
        return {}
    try:
        unit = parse_unit(sidecar.floor.unit)
    except UnitError as error:
        collector.add(file.problem("floor.unit", f"unknown unit: {error}"))
        return {}
    if unit.dimension != units[sidecar.floor.column].dimension:
        collector.add(file.problem("floor.unit", "has the wrong dimension", repr(sidecar.floor.unit)))
        return {}
    return {sidecar.column[sidecar.floor.column].meaning: to_si(sidecar.floor.value, unit)}


def _check_rows(table: MeasuredTable, lines: list[int], name: str, collector: Collector) -> None:
    """Refuse two different values at the same point of one sweep, and curves with fewer than two points."""
    axes = [column for column in table.columns if column != table.value]
    seen: dict[tuple[object, ...], float] = {}
    curves: dict[tuple[object, ...], set[float]] = {}
    for row in range(len(table.columns[table.value])):
        key = (*(labels[row] for labels in table.labels.values()), *(float(table.columns[axis][row]) for axis in axes))
        value = float(table.columns[table.value][row])
        if seen.setdefault(key, value) != value:
            point = ", ".join(str(part) for part in key)
            collector.add(
                Problem(name, lines[row], table.value, "has two different values at the same point of one sweep", point)
            )
        curve = (
            *(labels[row] for labels in table.labels.values()),
            *(float(table.columns[axis][row]) for axis in axes if axis != table.along),
        )
        curves.setdefault(curve, set()).add(float(table.columns[table.along][row]))
    for curve, points in curves.items():
        if len(points) < 2:
            collector.add(Problem(name, 0, table.along, "a curve has fewer than 2 points", str(curve)))
