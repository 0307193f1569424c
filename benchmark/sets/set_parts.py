"""Parts of a technology file beyond its values: anchors, stage results, measured tables (layer 2)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Protocol

import numpy as np

from benchmark.errors import nearest
from benchmark.measured import MeasuredTable
from benchmark.sets.files import TomlFile, is_file
from benchmark.sets.problems import Collector
from benchmark.sets.schema import AnchorTable, DefaultsTable, Measure, RowTable, TechnologyFile
from benchmark.sets.tables import TableFile, read_table
from benchmark.sets.values import Place, convert_measure, read_provenance

__all__ = ["ANCHOR_UNITS", "Anchor", "ModelDeclaration", "read_anchors", "read_rows", "read_tables"]

#: name of an anchor, before any ``__`` -> unit that fixes its dimension
ANCHOR_UNITS: dict[str, str] = {
    "on_current": "A/m",
    "on_current_p": "A/m",
    "off_current": "A/m",
    "off_current_p": "A/m",
    "effective_current": "A/m",
    "effective_current_p": "A/m",
    "fan_out_4_delay": "s",
    "fan_out_4_energy": "J",
}


class ModelDeclaration(Protocol):
    """What this layer needs to know of a device model (``benchmark.devices.model.DeviceModel`` has it)."""

    @property
    def name(self) -> str: ...  # noqa: D102
    @property
    def inputs(self) -> Sequence[Any]: ...  # noqa: D102
    @property
    def options(self) -> Sequence[Any]: ...  # noqa: D102
    @property
    def tables(self) -> Mapping[str, bool]: ...  # noqa: D102


@dataclass(frozen=True)
class Anchor:
    """A published number the set must predict."""

    name: str
    node: str
    si: float
    low: float
    high: float
    unit: str
    supply: float | None
    source: str
    where: str
    conditions: str
    note: str


def read_anchors(
    tables: Mapping[str, AnchorTable],
    nodes: Sequence[str],
    file: TomlFile,
    sources: frozenset[str],
    collector: Collector,
) -> tuple[Anchor, ...]:
    """Convert the anchors of a technology file."""
    units = ANCHOR_UNITS
    found: list[Anchor] = []
    for name, table in tables.items():
        dotted = f"anchor.{name}"
        kind = name.split("__")[0]
        if kind not in units:
            collector.add(file.problem(dotted, "is not a known anchor", "", ", ".join(units), nearest(kind, units)))
            continue
        if table.source not in sources:
            collector.add(
                file.problem(
                    f"{dotted}.source",
                    "is not a known source",
                    repr(table.source),
                    "a key of sources.toml",
                    nearest(table.source, sources),
                )
            )
        if table.node is None and len(nodes) > 1:
            collector.add(file.problem(dotted, "must name its node", "", ", ".join(nodes)))
            continue
        node = table.node or nodes[0]
        if node not in nodes:
            collector.add(
                file.problem(
                    f"{dotted}.node", "is not a node of the set", repr(node), ", ".join(nodes), nearest(node, nodes)
                )
            )
            continue
        place = Place(file, dotted, DefaultsTable(), sources)
        numbers = {}
        for key, number in (("value", table.value), ("low", table.low), ("high", table.high)):
            if number is not None:
                numbers[key] = convert_measure(
                    Measure(value=number, unit=table.unit), units[kind], 0.0, place, collector
                )
        supply = None
        if table.supply is not None:
            supply = convert_measure(
                table.supply, "V", 0.0, Place(file, f"{dotted}.supply", DefaultsTable(), sources), collector
            )
        value = numbers.get("value")
        if value is None:
            continue
        low, high = numbers.get("low", value), numbers.get("high", value)
        if low is None or high is None or not low <= value <= high:
            collector.add(file.problem(dotted, "does not lie between its low and high"))
            continue
        found.append(
            Anchor(
                kind,
                node,
                value,
                low,
                high,
                table.unit,
                supply,
                table.source,
                table.where,
                table.conditions,
                table.note,
            )
        )
    return tuple(found)


def read_rows(
    rows: Sequence[RowTable],
    nodes: Sequence[str],
    file: TomlFile,
    sources: frozenset[str],
    defaults: Any,
    collector: Collector,
) -> tuple[dict[str, MeasuredTable], frozenset[tuple[str, str]]]:
    """Convert the stage results of a technology file, by node; with the (evidence, source) pairs they rest on."""
    units = {
        "supply": "V",
        "temperature": "K",
        "delay": "s",
        "energy_per_cycle": "J",
        "leakage_power": "W",
        "drive_resistance": "ohm",
        "input_capacitance": "F",
        "area": "m^2",
    }
    by_node: dict[str, dict[str, list[float]]] = {}
    rests_on: set[tuple[str, str]] = set()
    for position, row in enumerate(rows):
        dotted = f"row.{position}"
        if row.node not in nodes:
            collector.add(
                file.problem(
                    f"{dotted}.node",
                    "is not a node of the set",
                    repr(row.node),
                    ", ".join(nodes),
                    nearest(row.node, nodes),
                )
            )
            continue
        provenance = read_provenance(row, Place(file, dotted, defaults, sources), collector)
        rests_on.add((provenance["evidence"], provenance["source"]))
        columns = by_node.setdefault(row.node, {key: [] for key in units})
        for key, unit in units.items():
            measure = getattr(row, key)
            if measure is None:
                columns[key].append(np.nan)
                continue
            si = convert_measure(measure, unit, 0.0, Place(file, f"{dotted}.{key}", defaults, sources), collector)
            columns[key].append(np.nan if si is None else si)
    found = {
        node: MeasuredTable(
            "rows",
            {key: np.array(column) for key, column in columns.items()},
            {},
            "delay",
            "supply",
            "log",
            "monotone",
            {},
            file.name,
        )
        for node, columns in by_node.items()
    }
    return found, frozenset(rests_on)


def read_tables(
    parsed: TechnologyFile, declaration: ModelDeclaration, file: TomlFile, sources: frozenset[str], collector: Collector
) -> dict[str, TableFile]:
    """Read the measured tables a technology file names."""
    allowed = [name for name in declaration.tables if name != "rows"]
    found: dict[str, TableFile] = {}
    for name, reference in parsed.table.items():
        dotted = f"table.{name}"
        if name not in allowed:
            collector.add(
                file.problem(
                    dotted,
                    f"is not used by the model {declaration.name}",
                    "",
                    ", ".join(allowed),
                    nearest(name, allowed),
                )
            )
            continue
        path = Path(reference.file)
        if (
            path.is_absolute()
            or ".." in path.parts
            or "\\" in reference.file
            or "\x00" in reference.file
            or path.suffix != ".csv"
        ):
            collector.add(
                file.problem(
                    f"{dotted}.file",
                    "is not a CSV file inside the folder of the sets",
                    repr(reference.file),
                    "a relative path such as tables/name.csv",
                )
            )
            continue
        # beside the set, or beside the folder of the technologies
        beside = any(is_file((file.path.parent / path).with_suffix(suffix)) for suffix in (".csv", ".toml"))
        root = file.path.parent if beside else file.path.parent.parent
        shown_root = Path(file.name).parent if beside else Path(file.name).parent.parent
        table = read_table(root / path, name, sources, collector, str(shown_root / path))
        if table is not None:
            found[name] = table
    for name, required in declaration.tables.items():
        if required and name != "rows" and name not in parsed.table:
            collector.add(file.problem("table", f"{name} is missing", "", f'[table.{name}] file = "tables/...csv"'))
    return found
