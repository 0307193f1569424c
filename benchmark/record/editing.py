"""Changing a set file: the new text is judged like any other file before it is written (layer 8)."""

from __future__ import annotations

import dataclasses
import datetime
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from benchmark.devices import model
from benchmark.errors import EvenloadError, InputRefused, Problem, nearest
from benchmark.record.changes.compare import compare_sets
from benchmark.record.changes.states import state_of_set
from benchmark.record.check import roots_of
from benchmark.record.load import check_physics, open_library
from benchmark.sets.change_line import change_text, changes_file, read_changes, with_changes, write_files
from benchmark.sets.edit import Edit, edited_text
from benchmark.sets.files import TomlFile, parse_toml, read_toml
from benchmark.sets.follow import followers, in_file_digits
from benchmark.sets.formulas import FormulaError
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.problems import Collector
from benchmark.sets.sources import Source
from benchmark.units import Unit, UnitError, parse_unit, to_si

__all__ = ["EditedSet", "OpenSet", "Restated", "change_set", "open_set_file"]

Data = dict[str, Any]
#: a range that is to stay as the file states it
KEEP = "keep"
#: decimal places after which a converted number counts as endless
MOST_PLACES = 60


@dataclass(frozen=True)
class OpenSet:
    """A set file that the check found fine."""

    path: Path
    nodes: tuple[Path, ...]
    file: TomlFile
    item: ParameterSet
    sources: Mapping[str, Source]

    def table(self, name: str) -> Data:
        """Return the value table of a name as plain data."""
        return dict(self.file.data["value"][name])


@dataclass(frozen=True)
class Restated:
    """What a value is from a day on.

    ``numbers`` by node, or one under an empty name for all nodes, in ``unit``. ``spread``: its table, None for none, or
    the word ``keep``. ``told``: what else changes in the table (evidence, source, where, conditions, note, owner,
    bound), None to leave a key out. ``reason``: why the old number is no longer used; empty to correct the words in
    place. ``old_date``: day from which the old number held, where the file does not say. ``extracted_from``: file and
    digest of the data a new number was read off; a new number without it was not read off a file. ``may_add``: a value
    of the model that the set does not state is added to it.
    """

    name: str
    numbers: Mapping[str, Decimal]
    unit: str
    spread: Mapping[str, Any] | str | None
    told: Mapping[str, str | None]
    date: datetime.date | None
    reason: str
    old_date: datetime.date | None = None
    extracted_from: Mapping[str, Any] | None = None
    may_add: bool = False


@dataclass(frozen=True)
class EditedSet:
    """A changed set that passes the check, not yet written.

    ``comparison`` as ``compare_sets`` returns it; ``lines`` for the list of changes, with the day
    from which each change holds; ``warnings`` of the new state.
    """

    opened: OpenSet
    text: str
    comparison: Mapping[str, Any]
    lines: tuple[tuple[datetime.date, str], ...]
    warnings: tuple[str, ...]

    def write(self) -> tuple[Path, ...]:
        """Write the set and the list of changes, both or neither; nothing when nothing changed.

        Raises
        ------
        EvenloadError
            When the file is not what was read any more.
        InputRefused
            When a file cannot be written.
        """
        path, before = self.opened.path, self.opened.file.text
        if self.text == before:
            return ()
        if path.read_bytes() != before.encode("utf-8"):
            message = f"{path}: was changed by something else meanwhile; nothing was written"
            raise EvenloadError(message)
        texts = {path: self.text}
        place = changes_file(path)
        listed = read_changes(place) if self.lines else ""
        for day in sorted({day for day, _ in self.lines}):  # the newest comes to the top
            listed = with_changes(listed, path.stem, [text for when, text in self.lines if when == day], day)
        if self.lines:
            texts[place] = listed
        write_files(texts)
        return tuple(texts)


def open_set_file(path: Path, nodes: Sequence[Path] = ()) -> OpenSet:
    """Read and check a set file.

    Raises
    ------
    InputRefused
        With every problem of the file; also for a file of another kind.
    """
    collector = Collector()
    library = open_library(*nodes, *roots_of(path), collector=collector)
    file = read_toml(path, collector, path.name)
    if file is not None and not ({"model", "kind"} & file.data.keys()):
        collector.add(Problem(path.name, 0, "", "is not a set of values (technology or wires)"))
        file = None
    item = None if file is None else library.build(file)
    if item is not None and item.kind == "technology":
        check_physics(item, collector)
    collector.raise_if_any()
    if file is None or item is None:
        raise InputRefused([Problem(path.name, 0, "", "could not be read")])
    return OpenSet(path, tuple(nodes), file, item, dict(library.sources))


def change_set(opened: OpenSet, restated: Sequence[Restated]) -> EditedSet:
    """Return a set with some values restated, and with the derived values that follow from them.

    Raises
    ------
    InputRefused
        With every reason why the changed set cannot be, line numbers being those of the file as it is.
    """
    collector = Collector()
    edits = [edit for one in restated if (edit := _edit(opened, one, collector)) is not None]
    collector.raise_if_any()
    edits += _following(opened, restated)
    text = edited_text(opened.file, edits, collector)
    collector.raise_if_any()
    after, warnings = _judged(opened, text or "")
    comparison = compare_sets(
        state_of_set("the file as it was", opened.item, opened.sources),
        state_of_set("the file as it is now", after, opened.sources),
    )
    reasons = {edit.name: edit.reason for edit in edits if edit.reason}
    lines = tuple(
        (_day_of(after, row["key"]), _line(row, reasons[row["key"]]))
        for row in comparison["inputs"]
        if row["key"] in reasons
    )
    return EditedSet(opened, text or "", comparison, lines, warnings)


def _day_of(item: ParameterSet, name: str) -> datetime.date:
    """Return the day from which a value with a history holds."""
    return datetime.date.fromisoformat(item.values[name].date)


def _judged(opened: OpenSet, text: str) -> tuple[ParameterSet, tuple[str, ...]]:
    """Check a text as if it were the file."""
    collector = Collector()
    library = open_library(*opened.nodes, *roots_of(opened.path), collector=collector)
    file = parse_toml(opened.path, text, opened.file.name, collector)
    item = None if file is None else library.build(file)
    if item is not None and item.kind == "technology":
        check_physics(item, collector)
    collector.problems = [
        dataclasses.replace(problem, line=opened.file.line(problem.name))
        if problem.file == opened.file.name
        else problem
        for problem in collector.problems
    ]
    collector.raise_if_any()
    if item is None:
        raise InputRefused([Problem(opened.file.name, 0, "", "could not be read")])
    return item, tuple(str(warning) for warning in sorted(set(collector.warnings)))


def _inputs(item: ParameterSet) -> frozenset[str]:
    """Names that the model of a technology reads."""
    return frozenset(entry.name for entry in model(item.model).inputs) if item.kind == "technology" else frozenset()


def _edit(opened: OpenSet, one: Restated, collector: Collector) -> Edit | None:
    """Return the new words of a value table."""
    file, nodes, before = opened.file, opened.item.nodes, len(collector.problems)
    dotted, known = f"value.{one.name}", file.data.get("value", {})
    added = one.name not in known and one.may_add and one.name in _inputs(opened.item) and "" in one.numbers
    if one.name not in known and not added:
        collector.add(file.problem(dotted, "is not stated in the set", "", ", ".join(known), nearest(one.name, known)))
        return None
    unknown = [node for node in one.numbers if node and node not in nodes]
    for node in unknown:
        collector.add(
            file.problem(
                dotted, "is asked for a node the set does not have", node, ", ".join(nodes), nearest(node, nodes)
            )
        )
    table = {} if added else opened.table(one.name)
    if table.get("formula") and one.reason and not unknown:
        collector.add(
            file.problem(
                dotted, "is derived and follows its formula; change what the formula names", "", table["formula"]
            )
        )
    if len(collector.problems) > before:
        return None
    changed = _numbers(table, one, nodes, file, collector)
    if changed is None:
        return None
    if one.spread != KEEP:
        changed["spread"] = one.spread
    elif _absolute(table.get("spread")) and changed["unit"] != table.get("unit") and not _like(one.unit, table):
        said = f"{table.get('unit', '1')} -> {one.unit}"
        collector.add(
            file.problem(dotted, "changes its unit while its range stays; state the range in the new unit", said)
        )
    changed |= one.told
    same = all(changed[key] == table.get(key) for key in ("value", "by_node", "unit"))
    if one.reason and not (same and one.extracted_from is None):  # another number was not read off these data
        changed["extracted_from"] = one.extracted_from
    if one.date is not None:
        changed["date"] = one.date
    return Edit(one.name, changed, one.reason, one.old_date)


def _numbers(table: Data, one: Restated, nodes: Sequence[str], file: TomlFile, collector: Collector) -> Data | None:
    """Return number and unit of the new state; numbers of other nodes stay, and with them their unit."""
    said, unit = table.get("unit"), table.get("unit", "1")
    new_unit = said if one.unit == unit else one.unit
    if set(one.numbers) == {""}:
        return {"value": one.numbers[""], "by_node": None, "unit": new_unit}
    by_node = dict(table["by_node"]) if "by_node" in table else dict.fromkeys(nodes, table["value"])
    if set(one.numbers) == set(nodes):
        return {"value": None, "by_node": {node: one.numbers[node] for node in nodes}, "unit": new_unit}
    for node, number in one.numbers.items():
        converted = _exact(number, one.unit, unit)
        if converted is None:
            collector.add(
                file.problem(
                    f"value.{one.name}",
                    f"stays in {unit} at the other nodes, where the new number is no finite decimal number",
                    f"{number} {one.unit}",
                    f"a number in {unit}",
                )
            )
            return None
        by_node[node] = converted
    return {"value": None, "by_node": by_node, "unit": said}


def _absolute(spread: Mapping[str, Any] | None) -> bool:
    """Tell whether a range is stated in the unit of its value."""
    return spread is not None and bool({"low", "high", "sd"} & spread.keys())


def _like(unit: str, table: Data) -> bool:
    """Tell whether a unit is only another spelling of that of a table."""
    one, two = _unit(unit), _unit(table.get("unit", "1"))
    return (
        one is not None and two is not None and dataclasses.replace(one, text="") == dataclasses.replace(two, text="")
    )


def _exact(number: Decimal, unit: str, wanted: str) -> Decimal | None:
    """Return a number in another unit exactly; None where that takes endless digits or the units do not fit."""
    if unit == wanted:
        return number
    try:
        one, two = parse_unit(unit), parse_unit(wanted)
    except UnitError:
        return None
    if one.dimension != two.dimension:
        return None
    exact = (Fraction(number) * one.factor + one.offset - two.offset) / two.factor
    tens = 0
    while tens < MOST_PLACES and (exact * 10**tens).denominator != 1:
        tens += 1
    scaled = exact * 10**tens
    return (
        None if scaled.denominator != 1 else Decimal((scaled < 0, tuple(map(int, str(abs(scaled.numerator)))), -tens))
    )


def _following(opened: OpenSet, restated: Sequence[Restated]) -> list[Edit]:
    """Return the derived values that follow from the restated ones, with the reason that names those.

    None where a number cannot be one or a formula cannot be computed with it: the check of the changed set says why.
    """
    moved = _moved(opened, restated)
    try:
        following = followers(opened.item.values, moved) if moved else {}
    except FormulaError:
        return []
    newest = max((one.date for one in restated if one.date is not None), default=None)
    old_date = next((one.old_date for one in restated if one.old_date is not None), None)
    edits = []
    for name, si in following.items():
        table = opened.table(name)
        numbers = [in_file_digits(float(x), table.get("unit", "1")) for x in si]
        changed: Data = {"date": newest}
        if len(set(numbers)) == 1 and "by_node" not in table:
            changed |= {"value": numbers[0]}
        else:
            each = numbers * len(opened.item.nodes) if len(numbers) == 1 else numbers
            changed |= {"value": None, "by_node": dict(zip(opened.item.nodes, each, strict=True))}
        edits.append(Edit(name, changed, f"follows {', '.join(sorted(moved))}", old_date))
    return edits


def _moved(opened: OpenSet, restated: Sequence[Restated]) -> dict[str, NDArray[np.float64]]:
    """Return the new numbers of superseded values in SI; empty when one of them cannot be a number of the program."""
    moved = {}
    for one in restated:
        unit, value = _unit(one.unit), opened.item.values.get(one.name)
        if not one.reason or (value is None and "" not in one.numbers):
            continue
        if unit is None:
            return {}
        try:
            numbers = {node: to_si(number, unit) for node, number in one.numbers.items()}
        except OverflowError:
            return {}
        if "" in numbers:
            moved[one.name] = np.array([numbers[""]])
        elif value is not None:
            array = np.array(np.broadcast_to(value.si, (len(opened.item.nodes),)))
            for node, number in numbers.items():
                array[opened.item.position(node)] = number
            moved[one.name] = array
    return moved


def _unit(text: str) -> Unit | None:
    try:
        return parse_unit(text)
    except UnitError:
        return None


def _line(row: Mapping[str, Any], reason: str) -> str:
    """One line of the list of changes."""
    source = row["source_new"]
    if {"value", "added"} & set(row["changed"]):
        old, new = (None if row[end] is None else Decimal(f"{row[end]:.12g}") for end in ("old", "new"))
        return change_text(row["key"], old, new, row["unit"], node=row["node"], source=source, reason=reason)
    place = f"{row['key']} at {row['node']}" if row["node"] else row["key"]
    words = []
    if "range" in row["changed"]:
        words.append(f"range {row['range_old'] or 'none'} -> {row['range_new'] or 'none'} {row['unit']}")
    rest = [name for name in row["changed"] if name not in ("value", "range", "date")]
    words += [f"new {', '.join(rest)}"] if rest else []
    return f"{place}, {'; '.join(words)}, source {source}: {reason}"
