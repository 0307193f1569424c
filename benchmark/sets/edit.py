"""Changing values in the text of a set: comments stay, what a value was becomes its history (layer 2)."""

from __future__ import annotations

import copy
import datetime
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

from benchmark.sets.files import TomlFile, parse_toml
from benchmark.sets.problems import Collector

__all__ = ["Edit", "edited_text"]

Data = dict[str, Any]
#: what an entry of the history states of a value in any case
_NUMBER = ("value", "by_node", "unit", "spread", "extracted_from")
#: what it states too, as the file says it there or among its defaults
_ORIGIN = ("evidence", "source", "where", "conditions")
#: what it states only where the new state says otherwise, and what stands for "none"
_OTHER = {"note": "", "owner": "", "bound": "none", "formula": "", "unusual": False}


@dataclass(frozen=True)
class Edit:
    """New words of one value table.

    ``changed``: key of the table to what it says now, None to leave it out. ``date`` and ``reason``: what the table
    said before goes into its history; without ``reason`` it is corrected in place. ``old_date``: day from which the
    old number held, for a table that does not say. A value that the set does not state gets a table at the end.
    """

    name: str
    changed: Mapping[str, Any]
    reason: str = ""
    old_date: datetime.date | None = None


def edited_text(file: TomlFile, edits: Sequence[Edit], collector: Collector) -> str | None:
    """Return the text of a set with some value tables changed.

    Parameters
    ----------
    file : TomlFile
        A set that the check found fine.
    edits : sequence of Edit
        At most one per value.
    collector : Collector
        Receives what cannot be done; then None is returned.
    """
    import tomlkit

    document = tomlkit.parse(file.text)
    wanted = copy.deepcopy(file.data)
    before = len(collector.problems)
    stated = wanted.setdefault("value", {})
    added = [edit for edit in edits if edit.name not in stated]
    for edit in edits:
        if edit in added:
            stated[edit.name] = {key: item for key, item in edit.changed.items() if item is not None}
            continue
        table: Data = stated[edit.name]
        entry = _entry(file, edit, table, collector) if edit.reason else None
        _apply(document["value"][edit.name], edit, entry)
        for key, item in edit.changed.items():
            if item is None:
                table.pop(key, None)
            else:
                table[key] = item
        if entry is not None:
            table["superseded"] = [*table.get("superseded", []), entry]
    if len(collector.problems) > before:
        return None
    text = tomlkit.dumps(document)
    text += "" if text.endswith("\n") or not added else "\n"
    text += "".join(f"\n[value.{edit.name}]\n{_lines(stated[edit.name])}" for edit in added)
    if "\r\n" in file.text:
        text = text.replace("\r\n", "\n").replace("\n", "\r\n")
    again = parse_toml(file.path, text, file.name, Collector())
    if again is None or again.data != wanted or not _comments(file.text) <= _comments(text):
        for edit in edits:  # an unusual layout that the editing library does not keep
            collector.add(
                file.problem(f"value.{edit.name}", "stands in a layout that cannot be edited; edit it by hand")
            )
        return None
    return text


def _comments(text: str) -> set[str]:
    """The comments of a text that stand on lines of their own."""
    return {line.strip() for line in text.splitlines() if line.lstrip().startswith("#")}


def _entry(file: TomlFile, edit: Edit, table: Data, collector: Collector) -> Data:
    """Return what a value was as an entry of its history."""
    defaults = file.data.get("default", {})
    entry = {name: table[name] for name in _NUMBER if name in table}
    for name in _ORIGIN:
        said = table.get(name) or defaults.get(name) or ("-" if edit.changed.get(name) else "")
        if said:
            entry[name] = said
    for name, none in _OTHER.items():
        old = table.get(name)
        if name in edit.changed and edit.changed[name] != old:
            entry[name] = none if old is None else old
    date = table.get("date", edit.old_date)
    if date is None:
        collector.add(
            file.problem(
                f"value.{edit.name}",
                "does not say from which day its old number held, so its past could not be told",
                "",
                "a date in the file, or the day as old date",
            )
        )
    return {**entry, "date": date, "reason": edit.reason}


def _apply(table: Any, edit: Edit, entry: Data | None) -> None:
    """Change one table of the document; comments beside keys that go are kept in the entry of the history."""
    from tomlkit.items import Table

    tail = _take_tail(table) if isinstance(table, Table) else []
    beside = {key: _comment(table.value.item(key)) for key in edit.changed if key in table}
    for key, item in edit.changed.items():
        if item is None:
            table.pop(key, None)
        elif key == "by_node" and key in table:
            for node, number in item.items():
                if table[key][node] != number:
                    table[key][node] = _item(number)
        elif key not in table or table[key] != item:
            table[key] = _item(item)
    if entry is not None:
        kept = {key: text for key, text in beside.items() if text and edit.changed[key] is None and key in entry}
        _add_entry(table, entry, kept, as_table=isinstance(table, Table))
    if tail:
        place = _last_table(table)
        for key, item in tail:
            place.value.body.append((key, item))


def _comment(item: Any) -> str:
    """Return the comment beside a key; one spread over dotted keys has none of its own."""
    return str(item.trivia.comment) if hasattr(item, "trivia") else ""


def _take_tail(table: Any) -> list[tuple[Any, Any]]:
    """Take off what stands below the last key of a table: blank lines, and the comment of the table that follows.

    A comment right below a key, without a blank line, belongs to the key and stays, if anything blank follows it.
    """
    from tomlkit.items import Whitespace

    body = _last_table(table).value.body
    tail: list[tuple[Any, Any]] = []
    while body and body[-1][0] is None:
        tail.insert(0, body.pop())
    blank = next((position for position, (_, item) in enumerate(tail) if isinstance(item, Whitespace)), 0)
    body.extend(tail[:blank])
    return tail[blank:]


def _last_table(table: Any) -> Any:
    """Return the table inside a table that is written last: itself, or its last sub-table."""
    from tomlkit.items import AoT, Table

    body = table.value.body
    last = next((item for key, item in reversed(body) if key is not None), None)
    if isinstance(last, AoT) and len(last):
        return _last_table(last.body[-1])
    return _last_table(last) if isinstance(last, Table) else table


def _add_entry(table: Any, entry: Data, comments: Mapping[str, str], *, as_table: bool) -> None:
    import tomlkit
    from tomlkit.items import AoT

    present = table.get("superseded")
    if isinstance(present, AoT) or (present is None and as_table):
        added = tomlkit.table()
        for key, item in entry.items():
            written = _item(item)
            if key in comments:
                written.comment(comments[key].lstrip("# "))
            added.add(key, written)
        if present is None:
            present = tomlkit.aot()
            present.append(added)
            table["superseded"] = present
        else:
            present.append(added)
    elif present is None:
        table["superseded"] = _item([entry])
    else:
        present.append(_item(entry))


def _item(value: Any) -> Any:
    """Return what the editing library writes for plain data; numbers keep their digits."""
    import tomlkit

    return tomlkit.parse(f"x = {_written(value)}\n")["x"]


def _lines(table: Data) -> str:
    """Write a table key by key."""
    return "".join(f"{key} = {_written(item)}\n" for key, item in table.items())


def _written(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, (int, Decimal)):
        return str(value)
    if isinstance(value, datetime.date):
        return value.isoformat()
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{key} = {_written(item)}" for key, item in value.items()) + " }"
    if isinstance(value, (list, tuple)):
        return "[" + ", ".join(map(_written, value)) + "]"
    return json.dumps(str(value), ensure_ascii=False).replace("\x7f", "\\u007F")
