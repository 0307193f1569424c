"""What each column of a raw file holds: meaning, unit, scale, floor, compliance (layer 7.5)."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

from benchmark.catalogue import Quantity
from benchmark.curves.description import ColumnTable
from benchmark.curves.lines import Reading
from benchmark.curves.matching import Place
from benchmark.curves.meanings import MEANINGS, ONE_SIGN, PER_WIDTH, POSITIVE
from benchmark.errors import nearest
from benchmark.sets.schema import DefaultsTable, Measure
from benchmark.sets.values import Place as ValuePlace
from benchmark.sets.values import convert_measure
from benchmark.units import Unit, UnitError, parse_unit

__all__ = ["Column", "fixed_values", "judge_column"]

#: headers of logarithms: log ID, log10(ID), lg ID, 20 log|S|, gain (dB)
_LOGARITHM = re.compile(r"(?i)(?<![a-z])(?:log|lg)(?:_?10)?(?![a-z])|(?<![a-z])db[a-z]?(?![a-z])")
#: no floor, no compliance
_NONE = Fraction(-1)


@dataclass(frozen=True)
class Column:
    """One column of the file as it is read: ``position`` from 0, ``unit`` of the numbers of the file.

    ``floor`` and ``compliance``: in SI, in the dimension of the file; -1 when there is none.
    """

    header: str
    position: int
    spec: ColumnTable
    dotted: str
    unit: Unit
    floor: Fraction
    compliance: Fraction
    labels: Mapping[str, str]
    fixed: Mapping[str, Fraction]

    @property
    def meaning(self) -> str:
        """What the numbers are once divided by the width, if they are."""
        return PER_WIDTH[self.spec.meaning] if self.spec.per_width else self.spec.meaning


def judge_column(place: Place, reading: Reading) -> Column | None:
    """Judge one column; None after a problem."""
    column, dotted = reading.spec.column[place.index], f"column.{place.index}"
    before = len(reading.collector.problems)
    repeat = reading.spec.repeat
    word = {repeat.label: repeat.words[place.group]} if repeat and place.group >= 0 else {}
    for name in sorted(set(word) & set(column.labels)):
        reading.problem(f"{dotted}.labels", "is also the label of repeat", repr(name))
    labels, fixed = {**column.labels, **word}, fixed_values(column.fixed, f"{dotted}.fixed", reading)
    if column.kind == "label":
        _check_label(column, dotted, reading)
        return Column(place.header, place.position, column, dotted, parse_unit("1"), _NONE, _NONE, labels, fixed)
    if column.allowed is not None:
        reading.problem(f"{dotted}.allowed", "belongs to labels")
    quantity = MEANINGS.get(column.meaning)
    if quantity is None:
        known, hint = ", ".join(MEANINGS), nearest(column.meaning, MEANINGS)
        reading.problem(f"{dotted}.meaning", "is not a known meaning", repr(column.meaning), known, hint)
        return None
    _check_keys(column, quantity, dotted, reading)
    if column.scale is None and _LOGARITHM.search(place.header):
        reading.table.refuse(
            (reading.table.header.line, place.header),
            "looks like logarithms, and the description does not say so",
            "",
            'scale = "log10" with the unit of the number itself, or scale = "linear"',
        )
    unit = _unit(column, quantity, place, dotted, reading)
    if unit is None or len(reading.collector.problems) > before:
        return None
    floor, compliance = (
        _mark(measure, f"{dotted}.{key}", unit, reading)
        for key, measure in (("floor", column.floor), ("compliance", column.compliance))
    )
    if floor >= compliance > 0:
        reading.problem(f"{dotted}.floor", "is not below the compliance")
    if len(reading.collector.problems) > before:
        return None
    return Column(place.header, place.position, column, dotted, unit, floor, compliance, labels, fixed)


def _check_label(column: ColumnTable, dotted: str, reading: Reading) -> None:
    """Labels are words: nothing that belongs to numbers."""
    if column.meaning in MEANINGS:
        found = repr(column.meaning)
        reading.problem(f"{dotted}.meaning", "is a quantity and no label", found, 'kind = "axis" or "value"')
    for key in ("unit", "sign", "scale", "per_width", "floor", "compliance", "saturates", "unusual"):
        if getattr(column, key) != ColumnTable.model_fields[key].default:
            reading.problem(f"{dotted}.{key}", "belongs to numbers, and this column holds words")


def _check_keys(column: ColumnTable, quantity: Quantity, dotted: str, reading: Reading) -> None:
    """Refuse keys that mean nothing for this kind of column."""
    for key in ("floor", "compliance", "saturates"):
        if column.kind == "axis" and getattr(column, key):
            reading.problem(f"{dotted}.{key}", "belongs to what was measured", "", 'kind = "value"')
    if column.per_width and column.meaning not in PER_WIDTH:
        allowed = ", ".join(PER_WIDTH)
        reading.problem(f"{dotted}.per_width", "is possible for some meanings only", repr(column.meaning), allowed)
    if column.scale == "log10" and column.sign != "positive":
        reading.problem(f"{dotted}.sign", "means nothing for logarithms", repr(column.sign))
    if column.sign == "both" and column.meaning not in ONE_SIGN:
        also = "one sign only" if column.meaning in POSITIVE else "either sign without it"
        reading.problem(f"{dotted}.sign", "is for currents", repr(column.sign), f"{quantity.meaning} has {also}")


def _unit(column: ColumnTable, quantity: Quantity, place: Place, dotted: str, reading: Reading) -> Unit | None:
    """Find the unit of a column: stated here or in the file; where both say one, they must agree."""
    wanted, example = parse_unit(quantity.unit), f"a unit such as {quantity.unit}"
    where = (reading.table.units.line or reading.table.header.line, place.header)
    inside = stated = None
    if place.unit:
        try:
            inside = parse_unit(place.unit)
        except UnitError as error:
            if column.unit is None:
                hint = 'state unit = "..." in its [[column]] as well'
                reading.table.refuse(where, f"unknown unit: {error}", "", example, hint)
                return None
            note = f"column {place.header}: the unit {place.unit!r} of the file is taken for {column.unit}, as stated"
            reading.table.notes.append(note)
    if column.unit is not None:
        try:
            stated = parse_unit(column.unit)
        except UnitError as error:
            reading.problem(f"{dotted}.unit", f"unknown unit: {error}", "", example)
            return None
    if inside is not None and stated is not None and (inside.factor, inside.offset) != (stated.factor, stated.offset):
        reading.table.refuse(where, "is in another unit than the description says", inside.text, stated.text)
        return None
    unit = stated or inside or (None if wanted.dimension else wanted)
    if unit is None:
        reading.table.refuse(where, "has no unit", "", example, 'state unit = "..." in its [[column]]')
        return None
    if unit.dimension != wanted.dimension:
        found, allowed = f"{unit.text!r} ({unit.dimension_text})", f"{example} ({wanted.dimension_text})"
        if stated is not None:
            reading.problem(f"{dotted}.unit", "has the wrong dimension", found, allowed, _width_hint(column, unit))
        else:
            reading.table.refuse(where, "has the wrong dimension", found, allowed, _width_hint(column, unit))
        return None
    return unit


def _width_hint(column: ColumnTable, unit: Unit) -> str:
    """Say how a column of absolute numbers becomes one per width."""
    for absolute, per_width in PER_WIDTH.items():
        if per_width == column.meaning and parse_unit(MEANINGS[absolute].unit).dimension == unit.dimension:
            return f'state meaning = "{absolute}", per_width = true and a width'
    return ""


def _mark(measure: Measure | None, dotted: str, unit: Unit, reading: Reading) -> Fraction:
    """Convert a floor or compliance to SI, in the dimension of the file."""
    if measure is None:
        return _NONE
    place = ValuePlace(reading.file, dotted, DefaultsTable(), frozenset())
    si = convert_measure(measure, unit.text, None, place, reading.collector)
    if si is not None and si <= 0.0:
        reading.problem(f"{dotted}.value", "must be above 0", str(measure.value))
    return _NONE if si is None else _exact(measure)


def _exact(measure: Measure) -> Fraction:
    """A number with a unit that is known to be good, in SI and not rounded."""
    unit = parse_unit(measure.unit)
    return Fraction(measure.value) * unit.factor + unit.offset


def fixed_values(measures: Mapping[str, Measure], dotted: str, reading: Reading) -> dict[str, Fraction]:
    """Convert what does not change to SI, by meaning; exact, as numbers may be divided by it before rounding."""
    found = {}
    for name, measure in measures.items():
        quantity = MEANINGS.get(name)
        if quantity is None:
            hint = nearest(name, MEANINGS)
            reading.problem(f"{dotted}.{name}", "is not a known meaning", "", ", ".join(MEANINGS), hint)
            continue
        place = ValuePlace(reading.file, f"{dotted}.{name}", DefaultsTable(), frozenset())
        si = convert_measure(measure, quantity.unit, None, place, reading.collector)
        if si is not None and not quantity.allows(si):
            reading.problem(f"{dotted}.{name}", "is out of its domain", str(measure.value), quantity.domain_text)
        elif si is not None:
            found[name] = _exact(measure)
    return found
