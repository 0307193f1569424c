"""A set as it was on a day: superseded numbers put back in its text (layer 2).

The text that comes out is a file of its own, with its own digest, so a record made from it holds the past state and can
be run again like any other.
"""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from typing import Any

from benchmark.sets.files import TomlFile, parse_toml
from benchmark.sets.problems import Collector

__all__ = ["as_it_was"]

#: what an entry states for itself; what it does not state of these it did not have
_NUMBER = ("value", "by_node", "unit", "spread", "extracted_from")
#: what it states where the state that followed says otherwise; else it was as in that state
_WORDS = ("evidence", "source", "where", "conditions", "note", "owner", "bound", "formula", "unusual")
#: words that say that there was none
_NONE = {"note": "", "owner": "", "bound": "none", "formula": ""}


def as_it_was(file: TomlFile, day: datetime.date, collector: Collector) -> TomlFile | None:
    """Return a file with every value that has a history as it was on a day.

    A value holds from its own date on. Values without history stay. Files without any are returned as they are.
    """
    if not _any_history(file.data):
        return file
    import tomlkit

    document = tomlkit.parse(file.text)
    problems = len(collector.problems)
    values = document.get("value", {})
    for name in values:
        table = values[name]
        if isinstance(table, dict) and table.get("superseded"):
            _put_back(table, f"value.{name}", day, file, collector)
    if len(collector.problems) > problems:
        return None
    return parse_toml(file.path, tomlkit.dumps(document), file.name, collector)


def _any_history(data: dict[str, Any]) -> bool:
    values = data.get("value")
    return isinstance(values, dict) and any(isinstance(v, dict) and v.get("superseded") for v in values.values())


def _dated(state: Mapping[str, Any]) -> bool:
    date = state.get("date")
    return isinstance(date, datetime.date) and not isinstance(date, datetime.datetime)


def _put_back(table: Any, dotted: str, day: datetime.date, file: TomlFile, collector: Collector) -> None:
    """Put the number of that day into a value table, and leave of its history what was known then."""
    entries = table["superseded"]
    states = [*entries, table] if isinstance(entries, list) else []
    dates: list[datetime.date] = [state["date"] for state in states if isinstance(state, dict) and _dated(state)]
    if not dates or len(dates) != len(states):
        collector.add(file.problem(dotted, "has a history without dates, so it has no past state"))
        return
    known = [position for position, date in enumerate(dates) if date <= day]
    if not known:
        first = dates[0]
        collector.add(file.problem(dotted, "has no number yet on that day", str(day), f"{first} or later"))
        return
    if known[-1] == len(entries):
        return
    for entry in map(dict, reversed(entries[known[-1] :])):  # from the newest on, each against what followed it
        for name in _WORDS:
            if name in entry and entry[name] == _NONE.get(name):
                table.pop(name, None)
            elif name in entry:
                table[name] = entry[name]
    for name in _NUMBER:
        table.pop(name, None)
        if name in entry:
            table[name] = entry[name]
    table["date"] = entry["date"]
    for _ in range(len(entries) - known[-1]):
        entries.pop()
    if not entries:
        table.pop("superseded")
