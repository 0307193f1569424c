"""From a value table of a file to SI arrays with spread and provenance (layer 2)."""

from __future__ import annotations

import dataclasses
import datetime
import itertools
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

import numpy as np
from numpy.typing import NDArray

from benchmark.catalogue import EVIDENCE, Quantity
from benchmark.errors import nearest
from benchmark.sets.extracted import check_data
from benchmark.sets.files import TomlFile, shown
from benchmark.sets.problems import Collector
from benchmark.sets.schema import (
    DefaultsTable,
    LogNormal,
    LogUniform,
    Measure,
    Normal,
    RangeTable,
    Triangular,
    Uniform,
    ValueTable,
)
from benchmark.units import Unit, UnitError, from_si, parse_unit, to_si

__all__ = ["Spread", "Value", "amount", "convert_measure", "convert_range", "convert_value", "read_provenance"]

#: what a superseded entry does not say of these was as in the state that followed it
_AS_FOLLOWED = ("evidence", "source", "where", "conditions", "note", "owner", "bound", "formula", "unusual")
#: half-width of the central 95 % of a normal distribution, in standard deviations
NORMAL_95 = 1.959963984540054


@dataclass(frozen=True)
class Spread:
    """Spread of a value. ``low`` and ``high`` are SI, per node: hard limits of uniform, loguniform and triangular,
    the central 95 % of normal and lognormal. ``scale`` is the standard deviation (normal, SI per node) or the
    standard deviation of the logarithm (lognormal).
    """

    shape: str
    low: NDArray[np.float64]
    high: NDArray[np.float64]
    scale: NDArray[np.float64] | None = None


@dataclass(frozen=True)
class Value:
    """One named value in SI, with everything the ledger prints."""

    name: str
    si: NDArray[np.float64]  # one number per node of its set (shape (1,) for a study value)
    unit: str
    spread: Spread | None
    evidence: str
    source: str
    where: str = "-"
    conditions: str = "-"
    note: str = ""
    owner: str = ""
    bound: str = ""
    formula: str = ""
    origin: str = ""  # not empty: this is a default, and this is where it comes from
    date: str = ""
    file: str = ""
    line: int = 0
    past: tuple[PastValue, ...] = ()  # oldest first
    read_off: str = ""  # measured data it was read off, with their digest

    @property
    def is_default(self) -> bool:
        """Tell whether the file was silent and the program's default was used."""
        return bool(self.origin)

    def at(self, position: int) -> Value:
        """Return the value at one node."""
        index = position if self.si.size > 1 else 0
        spread = self.spread
        if spread is not None:
            scale = None if spread.scale is None else spread.scale[index : index + 1]
            spread = Spread(spread.shape, spread.low[index : index + 1], spread.high[index : index + 1], scale)
        return dataclasses.replace(self, si=self.si[index : index + 1], spread=spread)

    def in_unit(self, si: float) -> float:
        """Express an SI number in the unit the file used."""
        return from_si(si, parse_unit(self.unit))


@dataclass(frozen=True)
class PastValue:
    """What a value was from its own date on, and why it is no longer used."""

    value: Value
    reason: str


@dataclass(frozen=True)
class Place:
    """Where a value table stands: file, dotted name, and the defaults of the file."""

    file: TomlFile
    dotted: str
    defaults: DefaultsTable
    sources: frozenset[str]


def unit_for(quantity: Quantity, text: str | None, place: Place, collector: Collector) -> Unit | None:
    """Parse a unit and compare its dimension with the catalogue's."""
    wanted = parse_unit(quantity.unit)
    file, dotted = place.file, f"{place.dotted}.unit"
    if text is None:
        if not wanted.dimension:
            return parse_unit("1")
        collector.add(file.problem(place.dotted, "has no unit", "", f"a unit such as {quantity.unit}"))
        return None
    try:
        unit = parse_unit(text)
    except UnitError as error:
        collector.add(file.problem(dotted, f"unknown unit: {error}", "", f"a unit such as {quantity.unit}"))
        return None
    if unit.dimension != wanted.dimension:
        collector.add(
            file.problem(
                dotted,
                f"has the wrong dimension for {quantity.name} ({quantity.meaning})",
                f"{text!r} ({unit.dimension_text})",
                f"a unit such as {quantity.unit} ({wanted.dimension_text})",
            )
        )
        return None
    return unit


def convert_number(number: Decimal | int, unit: Unit, place: Place, key: str, collector: Collector) -> float | None:
    """Convert to SI; an overflow or underflow is a problem."""
    dotted = f"{place.dotted}.{key}"
    try:
        si = to_si(number, unit)
    except OverflowError:
        si = math.inf
    if not math.isfinite(si) or (si == 0.0 and number != 0 and unit.offset == 0):
        collector.add(place.file.problem(dotted, "is beyond the range of the program", shown(number)))
        return None
    return si


def amount(number: str, unit: str) -> str:
    """Write a number with its unit; a plain number has none."""
    return number if unit == "1" else f"{number} {unit}"


def check_range(
    quantity: Quantity, si: float, unit: Unit, unusual: bool, place: Place, key: str, collector: Collector
) -> bool:
    """Check domain and usual range; beyond a factor 1000 only with ``unusual = true``."""
    dotted = f"{place.dotted}.{key}"
    as_found = amount(f"{from_si(si, unit):.6g}", unit.text)
    if not quantity.allows(si):
        collector.add(place.file.problem(dotted, "is out of its domain", as_found, quantity.domain_text))
        return False
    low, high = _usual(quantity)
    if low <= si <= high or (si == 0.0 and quantity.domain != "positive"):
        return True
    allowed = _usually(quantity)
    if unusual:
        return True
    if _is_far(quantity, si):
        collector.add(
            place.file.problem(
                dotted,
                "is more than a factor 1000 outside the usual range",
                as_found,
                allowed,
                "check the prefix of the unit, or state unusual = true",
            )
        )
        return False
    collector.warn(place.file.problem(dotted, "is outside the usual range", as_found, allowed))
    return True


def _usual(quantity: Quantity) -> tuple[float, float]:
    """Return the usual range in SI."""
    unit = parse_unit(quantity.unit)
    return to_si(Decimal(repr(quantity.low)), unit), to_si(Decimal(repr(quantity.high)), unit)


def _usually(quantity: Quantity) -> str:
    return amount(f"usually {quantity.low:g} to {quantity.high:g}", quantity.unit)


def _is_far(quantity: Quantity, si: float) -> bool:
    """Tell whether a number is more than a factor 1000 outside the usual range; a zero may be meant."""
    low, high = _usual(quantity)
    if si == 0.0 and quantity.domain != "positive":
        return False
    return (low > 0.0 and abs(si) < low / 1000.0) or abs(si) > 1000.0 * max(abs(low), abs(high))


def _may_reach(quantity: Quantity, si: float) -> bool:
    """Tell whether a range may reach a number; a range of whole numbers passes between them."""
    return si >= 1.0 if quantity.domain == "count" else quantity.allows(si)


def _convert_spread(
    table: ValueTable, quantity: Quantity, unit: Unit, si: NDArray[np.float64], place: Place, collector: Collector
) -> Spread | None:
    """Convert a spread; its ends must be numbers of the program and, unless said otherwise, plausible."""
    dotted = f"{place.dotted}.spread"
    before = len(collector.problems)
    try:
        with np.errstate(over="ignore"):
            spread = _read_spread(table, quantity, unit, si, place, collector)
    except OverflowError:
        spread = None
    if len(collector.problems) > before:
        return None
    ends = [] if spread is None else [*spread.low.tolist(), *spread.high.tolist()]
    lost = spread is not None and "log" in spread.shape and min(ends) == 0.0  # a positive end that became zero
    if spread is None or lost or not np.all(np.isfinite(ends)):
        collector.add(place.file.problem(dotted, "reaches beyond the range of the program"))
        return None
    far = [end for end in ends if _is_far(quantity, end)]
    if far and not table.unusual:
        collector.add(
            place.file.problem(
                dotted,
                "reaches more than a factor 1000 outside the usual range",
                amount(f"{from_si(far[0], unit):.6g}", unit.text),
                _usually(quantity),
                "check the spread, or state unusual = true",
            )
        )
        return None
    return spread


def _read_spread(
    values: ValueTable, quantity: Quantity, unit: Unit, si: NDArray[np.float64], place: Place, collector: Collector
) -> Spread | None:
    file, dotted, table = place.file, f"{place.dotted}.spread", values.spread
    by_node = values.by_node is not None

    def refuse(what: str, found: str = "", allowed: str = "", hint: str = "") -> None:
        collector.add(file.problem(dotted, what, found, allowed, hint))

    if isinstance(table, (Uniform, LogUniform, Triangular)):
        if by_node:
            refuse(
                "has absolute limits together with by_node",
                table.shape,
                "lognormal or normal with percent",
                "a spread must follow each node's own value",
            )
            return None
        low, high = (to_si(bound, unit) for bound in (table.low, table.high))
        if table.low > table.high:
            refuse("has low above high", f"low {table.low}, high {table.high}", "low <= value <= high")
            return None
        if values.value is None or not table.low <= values.value <= table.high:
            refuse(
                "does not contain the value",
                f"value {values.value}, low {table.low}, high {table.high}",
                "low <= value <= high",
            )
            return None
        if isinstance(table, LogUniform) and low <= 0.0:
            refuse("needs positive limits on a log scale", f"low {table.low}", "above 0")
            return None
        if not (_may_reach(quantity, low) and _may_reach(quantity, high)):
            refuse(
                "reaches out of the domain of the value",
                amount(f"{table.low} to {table.high}", unit.text),
                quantity.domain_text,
            )
            return None
        return Spread(table.shape, np.array([low]), np.array([high]))
    if isinstance(table, Normal):
        if (table.sd is None) == (table.percent is None):
            refuse("needs exactly one of sd and percent")
            return None
        if table.sd is not None and by_node:
            refuse("has an absolute sd together with by_node", "sd", "percent")
            return None
        sd = (
            np.full(si.shape, float(to_si(table.sd, dataclasses.replace(unit, offset=0 * unit.offset))))
            if table.sd is not None
            else np.abs(si) * float(table.percent or 0) / 100.0
        )
        if np.any(sd < 0.0):
            refuse("is negative", shown(table.sd if table.sd is not None else table.percent), "0 or above")
            return None
        low_95, high_95 = si - NORMAL_95 * sd, si + NORMAL_95 * sd
        if not all(_may_reach(quantity, float(bound)) for bound in (*low_95, *high_95)):
            refuse(
                "makes the value leave its domain",
                f"95 % range {low_95[0]:.3g} to {high_95[0]:.3g} (SI)",
                quantity.domain_text,
                "use lognormal",
            )
            return None
        return Spread("normal", low_95, high_95, sd)
    return None if table is None else _convert_lognormal(table, quantity, si, refuse)


def _convert_lognormal(table: LogNormal, quantity: Quantity, si: NDArray[np.float64], refuse: Any) -> Spread | None:
    if (table.factor is None) == (table.ln_sd is None):
        refuse("needs exactly one of factor and ln_sd")
        return None
    if table.factor is not None and table.factor < 1:
        refuse("has a factor below 1", shown(table.factor), "1 or above")
        return None
    if table.ln_sd is not None and table.ln_sd < 0:
        refuse("is negative", shown(table.ln_sd), "0 or above")
        return None
    if np.any(si <= 0.0):
        refuse("is log-normal but the value is not positive", f"{si[0]:.3g}", "a positive value")
        return None
    ln_sd = math.log(float(table.factor)) / NORMAL_95 if table.factor is not None else float(table.ln_sd or 0)
    factor = float(table.factor) if table.factor is not None else math.exp(NORMAL_95 * ln_sd)
    high = si * factor
    if quantity.domain in ("fraction", "share") and np.any(high > 1.0):
        refuse("reaches above 1", f"value times {factor:.3g}", quantity.domain_text)
        return None
    if quantity.domain == "count" and np.any(si / factor < 1.0):
        refuse("reaches below 1", f"value over {factor:.3g}", quantity.domain_text)
        return None
    return Spread("lognormal", si / factor, high, np.full(si.shape, ln_sd))


def read_provenance(table: Any, place: Place, collector: Collector) -> dict[str, str]:
    """Collect evidence, source and the rest of a value, a stage result or a table, with the file's defaults."""
    defaults, file = place.defaults, place.file
    inside = f"{place.dotted}." if place.dotted else ""

    def said(key: str) -> str:
        """Where the file says it: in the table itself, or among its defaults (then once for all values)."""
        return f"{inside}{key}" if getattr(table, key) else f"default.{key}"

    found = {
        key: getattr(table, key) or getattr(defaults, key, None) or ""
        for key in ("evidence", "source", "where", "conditions", "note", "owner")
    }
    evidence = EVIDENCE.get(found["evidence"])
    if not found["evidence"]:
        collector.add(file.problem(place.dotted, "has no evidence class", "", ", ".join(EVIDENCE)))
    elif evidence is None:
        collector.add(
            file.problem(
                said("evidence"),
                "is not an evidence class",
                repr(found["evidence"]),
                ", ".join(EVIDENCE),
                nearest(found["evidence"], EVIDENCE),
            )
        )
    else:
        for key in evidence.must_state:
            if found[key].strip() in ("", "-"):
                collector.add(
                    file.problem(place.dotted, f"is {evidence.name} and must state its {key}", "", f'{key} = "..."')
                )
    if not found["source"]:
        collector.add(file.problem(place.dotted, "has no source", "", "a key of sources.toml"))
    elif found["source"] not in place.sources:
        collector.add(
            file.problem(
                said("source"),
                "is not a known source",
                repr(found["source"]),
                "a key of sources.toml",
                nearest(found["source"], place.sources),
            )
        )
    return {key: text or ("-" if key in ("where", "conditions") else "") for key, text in found.items()}


def convert_value(
    quantity: Quantity, table: ValueTable, nodes: Sequence[str], place: Place, collector: Collector
) -> Value | None:
    """Convert one value table to SI; problems go to the collector and None comes back."""
    file = place.file
    before = len(collector.problems)
    provenance = read_provenance(table, place, collector)
    unit = unit_for(quantity, table.unit, place, collector)
    if (table.value is None) == (table.by_node is None):
        collector.add(file.problem(place.dotted, "needs exactly one of value and by_node"))
        return None
    if table.by_node is not None and list(nodes) == [""]:
        collector.add(file.problem(f"{place.dotted}.by_node", "belongs to sets, which have nodes; one value is needed"))
        return None
    numbers: Mapping[str, Decimal | int]
    if table.by_node is not None:
        missing = [node for node in nodes if node not in table.by_node]
        unknown = [node for node in table.by_node if node not in nodes]
        for node in missing:
            collector.add(file.problem(f"{place.dotted}.by_node", f"has no entry for node {node!r}"))
        for node in unknown:
            collector.add(
                file.problem(
                    f"{place.dotted}.by_node",
                    "names a node the set does not have",
                    repr(node),
                    ", ".join(nodes),
                    nearest(node, nodes),
                )
            )
        numbers = {node: table.by_node[node] for node in nodes if node in table.by_node}
        keys = [f"by_node.{node}" for node in numbers]
    else:
        numbers = {"": table.value}  # type: ignore[dict-item]
        keys = ["value"]
    if unit is None or (len(collector.problems) > before and not numbers):
        return None
    si: list[float] = []
    for key, number in zip(keys, numbers.values(), strict=True):
        converted = convert_number(number, unit, place, key, collector)
        if converted is not None and check_range(quantity, converted, unit, table.unusual, place, key, collector):
            si.append(converted)
    if len(si) != len(numbers) or len(collector.problems) > before:
        return None
    array = np.array(si, dtype=np.float64)
    spread = None
    if table.spread is not None:
        spread = _convert_spread(table, quantity, unit, array, place, collector)
        if spread is None:
            return None
    past = _past(quantity, table, nodes, place, collector)
    if past is None:
        return None
    if table.extracted_from is not None:
        check_data(table.extracted_from, file, place.dotted, collector)
    return Value(
        name=quantity.name,
        si=array,
        unit=table.unit or quantity.unit,
        spread=spread,
        bound=table.bound or "",
        formula=table.formula or "",
        date=table.date.isoformat() if isinstance(table.date, datetime.date) else "",
        file=file.name,
        line=file.line(place.dotted),
        past=past,
        read_off=f"{said.file}, sha256 {said.digest}" if (said := table.extracted_from) else "",
        **provenance,
    )


def _past(
    quantity: Quantity, table: ValueTable, nodes: Sequence[str], place: Place, collector: Collector
) -> tuple[PastValue, ...] | None:
    """Convert what a value was before as if it were stated today; dates must rise."""
    before = len(collector.problems)
    if table.superseded and not place.dotted.startswith("value."):
        collector.add(place.file.problem(f"{place.dotted}.superseded", "belongs to values in [value] alone"))
    dates = [past.date for past in table.superseded]
    if dates and table.date is None:
        collector.add(place.file.problem(place.dotted, "has superseded numbers but no date of its own"))
    for position, (one, two) in enumerate(itertools.pairwise([*dates, *([table.date] if table.date else [])])):
        if one >= two:
            dotted = f"{place.dotted}.superseded"
            where = f"entry {position + 1}"
            collector.add(
                place.file.problem(
                    dotted, f"{where} is not older than what follows", f"{one} and {two}", "rising dates"
                )
            )
    found: list[PastValue] = []
    words = {name: getattr(table, name) for name in _AS_FOLLOWED}
    for position, past in reversed(list(enumerate(table.superseded))):  # each against what followed it
        words |= {name: said for name in _AS_FOLLOWED if (said := getattr(past, name)) is not None}
        told = {name: getattr(past, name) for name in ("value", "by_node", "unit", "spread", "date")} | words
        told["bound"] = None if told["bound"] == "none" else told["bound"]
        one_place = dataclasses.replace(place, dotted=f"{place.dotted}.superseded.{position}")
        value = convert_value(quantity, ValueTable(**told), nodes, one_place, collector)
        if value is not None:
            found.insert(0, PastValue(value, past.reason))
    return tuple(found) if len(collector.problems) == before else None


def convert_measure(
    measure: Measure,
    unit_like: str,
    domain_low: float | None,
    place: Place,
    collector: Collector,
    key: str = "value",
    unit_key: str = "unit",
) -> float | None:
    """Convert a plain number with unit; ``unit_like`` fixes the dimension, ``domain_low`` the lowest value (SI).

    ``key`` and ``unit_key``: how the file calls the number and its unit.
    """
    try:
        unit = parse_unit(measure.unit)
    except UnitError as error:
        collector.add(
            place.file.problem(
                f"{place.dotted}.{unit_key}", f"unknown unit: {error}", "", f"a unit such as {unit_like}"
            )
        )
        return None
    wanted = parse_unit(unit_like)
    if unit.dimension != wanted.dimension:
        collector.add(
            place.file.problem(
                f"{place.dotted}.{unit_key}",
                "has the wrong dimension",
                f"{measure.unit!r} ({unit.dimension_text})",
                f"a unit such as {unit_like} ({wanted.dimension_text})",
            )
        )
        return None
    si = convert_number(measure.value, unit, place, key, collector)
    if si is not None and domain_low is not None and si < domain_low:
        collector.add(
            place.file.problem(
                f"{place.dotted}.{key}",
                "is too small",
                amount(str(measure.value), measure.unit),
                amount(f"at least {from_si(domain_low, unit):g}", measure.unit),
            )
        )
        return None
    return si


def convert_range(table: RangeTable, unit_like: str, place: Place, collector: Collector) -> tuple[float, float] | None:
    """Convert a closed range; low must not exceed high."""
    low = convert_measure(Measure(value=table.low, unit=table.unit), unit_like, None, place, collector, "low")
    high = convert_measure(Measure(value=table.high, unit=table.unit), unit_like, None, place, collector, "high")
    if low is None or high is None:
        return None
    if low > high:
        collector.add(
            place.file.problem(place.dotted, "has low above high", f"{table.low} to {table.high} {table.unit}")
        )
        return None
    return low, high
