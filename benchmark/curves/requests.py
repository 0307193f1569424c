"""What to read off measured curves: the ``[[extract]]`` tables of a description, checked and in SI (layer 7.5)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from typing import Literal

from pydantic import Field

from benchmark.catalogue import QUANTITIES
from benchmark.curves.quantities import KINDS, QuantityName
from benchmark.errors import nearest
from benchmark.sets.files import TomlFile, shown
from benchmark.sets.problems import Collector
from benchmark.sets.schema import DefaultsTable, FileModel, Measure, NodeLabel, Number, RangeTable, Text, Whole
from benchmark.sets.values import Place, convert_measure, convert_range
from benchmark.units import parse_unit

__all__ = ["ExtractTable", "Request", "convert_requests"]


class ExtractTable(FileModel):
    """One number to read off the curves of this file."""

    quantity: QuantityName = Field(description="What to read off the curves")
    name: Text | None = Field(default=None, description="Value of the set it belongs to, by catalogue name")
    node: NodeLabel | None = Field(default=None, description="Node of the set, when the set has several")
    span: RangeTable | None = Field(
        default=None,
        description="Swings: span of currents. Charge: swing of the voltage. Slopes and contacts: span of the abscissa",
    )
    level: Measure | None = Field(
        default=None, description="Current (or resistance) at which a threshold, window or end of life is read"
    )
    at: Measure | None = Field(default=None, description="Voltage at which a current or resistance is read")
    supply: Measure | None = Field(default=None, description="Supply of the effective current")
    factor: Number | None = Field(default=None, description="Pull-in, pull-out: smallest factor of current of the jump")
    step: Measure | None = Field(
        default=None, description="Pull-in, pull-out: smallest step of displacement of the jump"
    )
    points: Whole | None = Field(default=None, description="Neighbouring points that each local slope is taken over")
    weights: Literal["equal", "relative"] | None = Field(
        default=None,
        description="Contacts: readings equally accurate in ohm (equal), or in per cent (relative)",
    )
    half_path_voltage: Literal["subtracted", "kept"] | None = Field(
        default=None, description="Extrapolated threshold: whether half the path voltage is subtracted"
    )
    leave_out: list[Text] = Field(default=[], description="Devices that are left out, by name; the result says so")
    sweep: Literal["forward", "backward", "mean"] | None = Field(
        default=None, description="Which sweep is read; mean: the mean of the numbers of both"
    )
    temperature: Measure | None = Field(default=None, description="Temperature of the curves to read, as in the file")
    path_voltage: Measure | None = Field(default=None, description="Path voltage of the curves to read, as in the file")
    control_voltage: Measure | None = Field(
        default=None, description="Control voltage of the curves to read, as in the file"
    )
    labels: dict[str, Text] = Field(default={}, description="Further words that tell the curves to read from others")
    over: Text | None = Field(default=None, description="median: median of all devices; else the name of one device")
    reading_percent: Number | None = Field(
        default=None, description="Standard uncertainty of a reading of the measured column, in per cent"
    )
    setting: Measure | None = Field(
        default=None, description="Standard uncertainty of the abscissa, such as of the control voltage"
    )
    spread: Literal["uncertainty", "devices", "none"] | None = Field(
        default=None,
        description="Spread written into the set: uncertainty of the number, device to device, or none",
    )


#: keys that every quantity may have
_ALWAYS = frozenset(
    {
        "quantity",
        "name",
        "node",
        "temperature",
        "path_voltage",
        "control_voltage",
        "labels",
        "over",
        "leave_out",
        "reading_percent",
        "setting",
        "spread",
    }
)


@dataclass(frozen=True)
class Request:
    """One number to read, in SI.

    ``measures``: key of the table -> SI number (``span`` as ``low`` and ``high``); ``fixed``: meaning -> SI of what
    tells the curves to read from others; ``labels``: the same in words. ``of``: meaning of the column that is read.
    ``said``: key -> number and unit as the file states them. ``unit``: unit of the result. ``dotted`` and ``line``: its
    place in the description.
    """

    quantity: str
    of: str
    dotted: str
    measures: Mapping[str, float]
    fixed: Mapping[str, float]
    labels: Mapping[str, str]
    said: Mapping[str, str]
    unit: str
    line: int
    name: str = ""
    node: str = ""
    sweep: str = ""
    over: str = ""
    leave_out: tuple[str, ...] = ()
    weights: Literal["equal", "relative"] = "equal"
    half_path_voltage: bool = False
    points: int = 0
    spread: str = "uncertainty"
    reading: float = 0.0
    setting: float = 0.0


def convert_requests(
    tables: Sequence[ExtractTable], file: TomlFile, along: str, units: Mapping[str, str], collector: Collector
) -> list[Request]:
    """Check every request against the columns of the file and convert it to SI.

    Parameters
    ----------
    tables : sequence of ExtractTable
        The requests, in the order of the file.
    file : TomlFile
        The description, for the lines of problems.
    along : str
        Meaning of the axis that the curves are read along.
    units : mapping of str to str
        Meaning -> unit, of every column of the file.
    collector : Collector
        Takes every problem; a request with a problem is left out.

    Returns
    -------
    list of Request
        The requests without problems.
    """
    found = []
    for position, table in enumerate(tables):
        before = len(collector.problems)
        request = _convert(table, f"extract.{position}", file, along, units, collector)
        if request is not None and len(collector.problems) == before:
            found.append(request)
    return found


def _convert(
    table: ExtractTable, dotted: str, file: TomlFile, along: str, units: Mapping[str, str], collector: Collector
) -> Request | None:
    kind = KINDS[table.quantity]
    stated = {key for key in ExtractTable.model_fields if getattr(table, key) not in (None, {}, [])}
    allowed = _ALWAYS | set(kind.needs) | set(kind.may)
    for key in kind.needs:
        if key not in stated:
            collector.add(file.problem(dotted, f"{table.quantity} needs {key}", "", kind.example(key)))
    for key in sorted(stated - allowed):
        words = ", ".join(sorted(allowed - {"quantity"}))
        collector.add(file.problem(f"{dotted}.{key}", f"is not used by {table.quantity}", "", words))
    table = table.model_copy(update=dict.fromkeys(stated - allowed))  # what is idle is judged no further
    if table.node is not None and table.name is None:
        collector.add(file.problem(f"{dotted}.node", "has no value it belongs to", "", 'name = "..."'))
    if along not in kind.along:
        collector.add(
            file.problem(
                dotted,
                f"{table.quantity} cannot be read along {along}",
                "",
                f"curves read along {' or '.join(kind.along)}",
            )
        )
        return None
    of = [meaning for meaning in kind.of if meaning in units]
    if len(of) != 1:
        collector.add(
            file.problem(
                dotted,
                f"{table.quantity} needs one column that it is read from",
                ", ".join(of) or f"columns {', '.join(units)}",
                " or ".join(kind.of),
            )
        )
        return None
    measures, said = _measures(table, dotted, file, along, of[0], units, collector)
    fixed = _fixed(table, dotted, file, along, units, collector)
    reading = _percent(table, dotted, file, collector)
    unit = kind.unit_for(of[0], along, units)
    if table.name is not None:
        unit = _unit_of_name(table.name, unit, dotted, file, collector)
    if table.points is not None and table.points < kind.least_points:
        collector.add(
            file.problem(f"{dotted}.points", "is too small", str(table.points), f"{kind.least_points} or more")
        )
    return Request(
        quantity=table.quantity,
        of=of[0],
        dotted=dotted,
        measures=measures,
        fixed=fixed,
        labels=dict(table.labels),
        said=said,
        unit=unit,
        line=file.line(dotted),
        name=table.name or "",
        node=table.node or "",
        sweep=table.sweep or "",
        over=table.over or "",
        leave_out=tuple(table.leave_out),
        half_path_voltage=table.half_path_voltage == "subtracted",
        weights=table.weights or "equal",
        points=table.points or kind.least_points,
        spread=table.spread or "uncertainty",
        reading=reading,
        setting=measures.get("setting", 0.0),
    )


def _unit_of_name(name: str, unit: str, dotted: str, file: TomlFile, collector: Collector) -> str:
    """Return the unit of a value name; refuse a name that is none, or of another dimension than the reading."""
    quantity = QUANTITIES.get(name)
    if quantity is None:
        hint = nearest(name, QUANTITIES)
        collector.add(file.problem(f"{dotted}.name", "is not a value name", repr(name), "", hint))
        return unit
    wanted, found = parse_unit(quantity.unit), parse_unit(unit)
    if found.dimension != wanted.dimension:
        collector.add(
            file.problem(
                f"{dotted}.name",
                f"has another dimension than what is read ({quantity.meaning})",
                f"{unit} ({found.dimension_text})",
                f"a reading such as {quantity.unit} ({wanted.dimension_text})",
            )
        )
    return quantity.unit


def _place(file: TomlFile, dotted: str) -> Place:
    return Place(file, dotted, DefaultsTable(), frozenset())


def _unit_of(key: str, quantity: str, along: str, of: str, units: Mapping[str, str]) -> str:
    """Return the unit that fixes the dimension of a key."""
    where = KINDS[quantity].measured_in.get(key, "along")
    return units[of] if where == "of" else units.get(along, where) if where == "along" else where


def _measures(
    table: ExtractTable,
    dotted: str,
    file: TomlFile,
    along: str,
    of: str,
    units: Mapping[str, str],
    collector: Collector,
) -> tuple[dict[str, float], dict[str, str]]:
    """Convert the numbers of a request; a unit must have the dimension of the column it stands for."""
    measures: dict[str, float] = {}
    said: dict[str, str] = {}
    for key in ("level", "at", "supply", "step", "setting"):
        measure: Measure | None = getattr(table, key)
        if measure is None:
            continue
        unit = _unit_of(key, table.quantity, along, of, units)
        si = convert_measure(measure, unit, None, _place(file, f"{dotted}.{key}"), collector)
        if si is not None:
            measures[key] = si
        said[key] = f"{shown(measure.value)} {measure.unit}".removesuffix(" 1")
        if key in ("setting", "step", "supply") and si is not None and si <= 0.0:
            collector.add(file.problem(f"{dotted}.{key}.value", "must be above 0", shown(measure.value)))
    if table.span is not None:
        unit = _unit_of("span", table.quantity, along, of, units)
        place = _place(file, f"{dotted}.span")
        ends = convert_range(table.span, unit, place, collector)
        if ends is not None:
            measures["low"], measures["high"] = ends
            if not ends[0] < ends[1]:
                collector.add(file.problem(f"{dotted}.span", "is empty: low and high are the same"))
        said["span"] = f"{shown(table.span.low)} to {shown(table.span.high)} {table.span.unit}".removesuffix(" 1")
    if table.factor is not None:
        measures["factor"] = float(table.factor)
        said["factor"] = shown(table.factor)
        if table.factor <= 1:
            collector.add(file.problem(f"{dotted}.factor", "must be above 1", shown(table.factor)))
    if table.quantity in ("pull_in_voltage", "pull_out_voltage") and (table.factor is None) == (table.step is None):
        collector.add(file.problem(dotted, f"{table.quantity} needs exactly one of factor and step"))
    return measures, said


def _fixed(
    table: ExtractTable, dotted: str, file: TomlFile, along: str, units: Mapping[str, str], collector: Collector
) -> dict[str, float]:
    fixed: dict[str, float] = {}
    for key in ("temperature", "path_voltage", "control_voltage"):
        measure: Measure | None = getattr(table, key)
        if measure is None:
            continue
        if key == along:
            what = "is the axis of the curves, so it cannot choose between them"
            collector.add(file.problem(f"{dotted}.{key}", what))
            continue
        place = _place(file, f"{dotted}.{key}")
        si = convert_measure(measure, "K" if key == "temperature" else "V", None, place, collector)
        if si is not None:
            fixed[key] = si
    return fixed


def _percent(table: ExtractTable, dotted: str, file: TomlFile, collector: Collector) -> float:
    if table.reading_percent is None:
        return 0.0
    if not 0 < table.reading_percent <= 100:
        collector.add(
            file.problem(
                f"{dotted}.reading_percent", "is out of range", shown(table.reading_percent), "above 0, at most 100"
            )
        )
        return 0.0
    return float(Decimal(table.reading_percent) / 100)
