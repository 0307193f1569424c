"""Curves written as raw files in any dialect, with the description of each; and what must come out, from fractions."""

from __future__ import annotations

import csv
import io
import random
from collections.abc import Mapping
from dataclasses import dataclass, field
from decimal import Decimal
from fractions import Fraction
from pathlib import Path

import numpy as np

from benchmark.curves.read import read_curves
from benchmark.curves.record import MeasuredCurves
from benchmark.sets.problems import Collector

SOURCES = frozenset({"invented"})
PREFIX = {0: "", -3: "m", -6: "u", -9: "n", -12: "p"}
HEAD = 'schema = 1\nkind = "curves"\nevidence = "invented"\nsource = "invented"\nconditions = "-"\n'
Points = list[tuple[Decimal, Decimal]]


@dataclass(frozen=True)
class Truth:
    """Curves by device and sweep: (volt, ampere); width in um by device; volt and kelvin the same for all."""

    curves: Mapping[tuple[str, str], Points]
    widths: Mapping[str, Decimal]
    path_voltage: Decimal = Decimal("0.3")
    celsius: Decimal = Decimal("25")

    @property
    def devices(self) -> list[str]:
        return list(dict.fromkeys(device for device, _ in self.curves))


@dataclass(frozen=True)
class Dialect:
    """How the same curves stand in a file."""

    layout: str = (
        "long"  # long: label columns; turns: one column per quantity, cut at turns; side: devices side by side
    )
    delimiter: str = ","
    decimal: str = "."
    encoding: str = "utf-8"
    bom: bool = False
    newline: str = "\n"
    junk: tuple[str, ...] = ()
    starts: bool = False
    comment: bool = False
    units: str = "stated"
    volt: int = 0
    ampere: int = 0
    exponents: bool = False
    negative: bool = False
    trailing: int = 0
    blank: int = 0
    footer: bool = False
    ignored: bool = False
    shuffle: int | None = None
    columns: int | None = None
    kelvin: bool = False
    micrometres: bool = True


def _text(number: Decimal, dialect: Dialect) -> str:
    text = f"{number:E}" if dialect.exponents else format(number, "f")
    return text.replace(".", dialect.decimal)


@dataclass
class _Columns:
    """Header, unit and cells of every column, and the tables that describe them."""

    names: list[str] = field(default_factory=list)
    units: list[str] = field(default_factory=list)
    cells: list[list[str]] = field(default_factory=list)
    tables: list[str] = field(default_factory=list)

    def add(self, name: str, unit: str, cells: list[str], table: str = "") -> None:
        self.names.append(name)
        self.units.append(unit)
        self.cells.append(cells)
        if table:
            self.tables.append(table)


def _tables(dialect: Dialect) -> dict[str, str]:
    sign = 'sign = "negative"\n' if dialect.negative else ""
    units = {"VG": f"{PREFIX[dialect.volt]}V", "VD": f"{PREFIX[dialect.volt]}V", "ID": f"{PREFIX[dialect.ampere]}A"}
    meanings = {"VG": ("control_voltage", "axis"), "VD": ("path_voltage", "axis"), "ID": ("path_current", "value")}
    found = {}
    for name, (meaning, kind) in meanings.items():
        unit = f'unit = "{units[name]}"\n' if dialect.units == "stated" else ""
        more = "per_width = true\nsaturates = true\nunusual = true\n" if name == "ID" else ""
        found[name] = f'[[column]]\nheader = "{name}"\nmeaning = "{meaning}"\nkind = "{kind}"\n{unit}{sign}{more}'
    for name, meaning in (("Die", "device"), ("Sweep", "sweep")):
        found[name] = f'[[column]]\nheader = "{name}"\nmeaning = "{meaning}"\nkind = "label"\n'
    return found


def _filled(truth: Truth, dialect: Dialect) -> _Columns:
    """Columns of the file."""
    tables, found, sign = _tables(dialect), _Columns(), -1 if dialect.negative else 1
    volt, ampere = PREFIX[dialect.volt] + "V", PREFIX[dialect.ampere] + "A"

    def volts(number: Decimal) -> str:
        return _text(sign * number.scaleb(-dialect.volt), dialect)

    def amperes(number: Decimal) -> str:
        return _text(sign * number.scaleb(-dialect.ampere), dialect)

    if dialect.layout == "side":
        longest = 0
        for device in truth.devices:
            points = [point for (owner, _), curve in truth.curves.items() if owner == device for point in curve]
            longest = max(longest, len(points))
            found.add("VG", volt, [volts(v) for v, _ in points])
            found.add("ID", ampere, [amperes(i) for _, i in points])
        for cells in found.cells:
            cells += [""] * (longest - len(cells))
        found.add("VD", volt, [volts(truth.path_voltage)] * longest)
        found.tables += [tables["VG"], tables["ID"], tables["VD"]]
    else:
        rows = [(device, sweep, *point) for (device, sweep), curve in truth.curves.items() for point in curve]
        found.add("VG", volt, [volts(v) for _, _, v, _ in rows], tables["VG"])
        found.add("ID", ampere, [amperes(i) for *_, i in rows], tables["ID"])
        found.add("Die", "", [device for device, *_ in rows], tables["Die"])
        found.add("VD", volt, [volts(truth.path_voltage)] * len(rows), tables["VD"])
        if dialect.layout == "long":
            found.add("Sweep", "", [sweep for _, sweep, *_ in rows], tables["Sweep"])
    if dialect.ignored:
        found.add("Flags", "", ["ok"] * len(found.cells[0]))
    return found


def write(folder: Path, truth: Truth, dialect: Dialect) -> Path:
    """Write the raw file and its description; return the description."""
    found = _filled(truth, dialect)
    order = list(range(len(found.names)))
    if dialect.columns is not None:
        random.Random(dialect.columns).shuffle(order)
    if dialect.layout == "side":  # the groups keep their order from left to right
        places = [place for place, column in enumerate(order) if found.names[column] in ("VG", "ID")]
        for place, column in zip(places, sorted(order[place] for place in places), strict=True):
            order[place] = column
    header = [
        f"{found.names[k]} ({found.units[k]})" if dialect.units == "header" and found.units[k] else found.names[k]
        for k in order
    ]
    rows = [[found.cells[k][row] for k in order] for row in range(len(found.cells[0]))]
    if dialect.shuffle is not None:
        random.Random(dialect.shuffle).shuffle(rows)
    lines = list(dialect.junk)
    lines.append(_line(header, dialect))
    if dialect.units == "row":
        lines.append(_line([found.units[k] or "-" for k in order], dialect))
    for number, row in enumerate(rows):
        lines += ["# a remark"] if dialect.comment and number == 1 else []
        lines.append(_line(row, dialect))
    lines += [""] * dialect.blank
    lines += ["END OF DATA", "12 readings"] if dialect.footer else []
    text = dialect.newline.join(lines) + dialect.newline
    mark = "\ufeff" if dialect.bom and dialect.encoding == "utf-8" else ""
    (folder / "raw.csv").write_bytes((mark + text).encode(dialect.encoding))
    (folder / "raw.toml").write_text(_description(found, truth, dialect), encoding="utf-8")
    return folder / "raw.toml"


def _line(cells: list[str], dialect: Dialect) -> str:
    if dialect.delimiter == "whitespace":
        return "   ".join(cells)
    out = io.StringIO()
    csv.writer(out, delimiter=dialect.delimiter, lineterminator="").writerow([*cells, *[""] * dialect.trailing])
    return out.getvalue()


def _description(found: _Columns, truth: Truth, dialect: Dialect) -> str:
    lines = [HEAD, 'file = "raw.csv"', 'along = "control_voltage"']
    delimiter = "\\t" if dialect.delimiter == "\t" else dialect.delimiter
    lines += [f'delimiter = "{delimiter}"', f'decimal = "{dialect.decimal}"', f'units = "{dialect.units}"']
    encoding = {"cp1252": "windows-1252"}.get(dialect.encoding, dialect.encoding)
    lines.append(f'encoding = "{encoding}"')
    if dialect.junk:
        first = "VG" if dialect.columns is None else ""
        lines.append(f'header_starts = "{first}"' if dialect.starts and first else f"skip_rows = {len(dialect.junk)}")
    lines += ['comment = "#"'] if dialect.comment else []
    lines += ['ends_before = "END OF"'] if dialect.footer else []
    lines += ['ignore = ["Flags"]'] if dialect.ignored else []
    lines += ['turns = ["forward", "backward"]'] if dialect.layout != "long" else []
    lines += ["sort = true"] if dialect.shuffle is not None else []
    kelvin = f'value = {truth.celsius + Decimal("273.15")}, unit = "K"'
    celsius = f'value = {truth.celsius}, unit = "degC"'
    lines.append(f"fixed = {{ temperature = {{ {kelvin if dialect.kelvin else celsius} }} }}")
    if dialect.layout == "side":
        words = ", ".join(f'"{device}"' for device in truth.devices)
        lines.append(f'[repeat]\nlabel = "device"\nwords = [{words}]')
    for device in truth.devices:
        width = truth.widths[device]
        measure = f'{width}, unit = "um"' if dialect.micrometres else f'{width * 1000}, unit = "nm"'
        lines.append(f'[[given]]\nlabels = {{ device = "{device}" }}\nfixed = {{ width = {{ value = {measure} }} }}')
    return "\n".join([*lines, *found.tables])


def read(path: Path) -> MeasuredCurves:
    """Read a description that must be fine."""
    collector = Collector()
    found = read_curves(path, collector, SOURCES, path.name)
    assert [str(problem) for problem in collector.problems] == []
    assert found is not None
    return found


def refusals(path: Path) -> list[str]:
    """Read a description that must be refused."""
    collector = Collector()
    assert read_curves(path, collector, SOURCES, path.name) is None
    return list(dict.fromkeys(str(problem) for problem in sorted(collector.problems)))


def expected(truth: Truth) -> dict[tuple[str, str], dict[str, bytes]]:
    """What must come out: every number a fraction, rounded once."""
    found = {}
    for (device, sweep), points in truth.curves.items():
        width = Fraction(truth.widths[device]) / 10**6
        found[device, sweep] = {
            "control_voltage": np.array([float(v) for v, _ in points]).tobytes(),
            "path_current_per_width": np.array([float(Fraction(i) / width) for _, i in points]).tobytes(),
            "temperature": np.array(float(Fraction(truth.celsius) + Fraction("273.15"))).tobytes(),
            "path_voltage": np.array(float(truth.path_voltage)).tobytes(),
            "width": np.array(float(width)).tobytes(),
        }
    return found


def outcome(curves: MeasuredCurves) -> dict[tuple[str, str], dict[str, bytes]]:
    """Bytes of everything that came out, by device and sweep."""
    found = {
        (sweep.labels["device"], sweep.labels["sweep"]): {
            **{name: column.tobytes() for name, column in sweep.columns.items()},
            **{name: np.array(number).tobytes() for name, number in sweep.fixed.items()},
        }
        for sweep in curves.sweeps
    }
    assert len(found) == len(curves.sweeps)
    return found
