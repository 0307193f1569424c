"""The Python interface to changing a set: a value superseded, a spreadsheet out and in again."""

from __future__ import annotations

import datetime
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from decimal import Decimal
from pathlib import Path
from typing import TYPE_CHECKING, Any

from benchmark.api.session import folders_of, text_of
from benchmark.errors import UsageError

if TYPE_CHECKING:
    import pandas

    from benchmark.record.editing import EditedSet

__all__ = ["Edited", "export_sheet", "import_sheet", "supersede"]

Place = str | Path
Day = datetime.date | str
Number = int | float | Decimal | str


@dataclass(frozen=True, eq=False)
class Edited:
    """A set with changed values.

    Attributes
    ----------
    data : mapping
        What changed, as plain data, as ``changes`` gives it for two sets.
    warnings : tuple of str
        What the check says of the new state without refusing it.
    notes : tuple of str
        What else a reader must know of the change.
    lines : tuple of str
        Lines for the list of changes, each with its day.
    text : str
        The set as it is now.
    written : tuple of Path
        Files that were written; empty when nothing changed, or nothing was to be written.
    """

    data: Mapping[str, Any]
    warnings: tuple[str, ...]
    notes: tuple[str, ...]
    lines: tuple[str, ...]
    text: str
    written: tuple[Path, ...]

    @property
    def frame(self) -> pandas.DataFrame:
        """Return the changed values, one row per value and node."""
        import pandas

        return pandas.DataFrame(self.data["inputs"])


def supersede(
    path: Place,
    name: str,
    number: Number,
    *,
    unit: str,
    evidence: str,
    source: str,
    where: str,
    conditions: str,
    date: Day,
    reason: str,
    old_date: Day | None = None,
    node: str = "",
    spread: Mapping[str, Any] | str = "",
    note: str = "",
    owner: str = "",
    bound: str = "",
    nodes: Iterable[Place] = (),
    write: bool = True,
) -> Edited:
    """Give a value of a set a new number; the old one stays in the file as its history.

    Comments of the file are kept, derived values of the set follow, the changed set is checked as ``check`` would
    before anything is written, and one line per change goes into the ``CHANGES.md`` beside the sets.

    Parameters
    ----------
    path : str or Path
        A technology or wires set.
    name : str
        The value.
    number : int, float, Decimal or str
        Its new number in ``unit``; text and Decimal keep their digits.
    unit : str
        Unit of the new number, of the dimension of the value; ``"1"`` for plain numbers.
    evidence : str
        Evidence class of the new number. Like source, where and conditions it holds for the numbers of all nodes.
    source : str
        A key of ``sources.toml``.
    where : str
        Place in the source; ``"-"`` for none.
    conditions : str
        What the new number holds for; ``"-"`` for none.
    date : date or str
        Day of the measurement or choice (2026-01-31); the new number holds from then on.
    reason : str
        Why the old number is no longer used.
    old_date : date or str, optional
        Day from which the old number held; needed where the file does not say.
    node : str
        Only the number of this node changes; empty: one number for all nodes.
    spread : mapping or str
        The range: ``"lognormal factor 1.25"``, ``"normal percent 5"``, ``"uniform 160 180"``, ``"none"``, or ``"keep"``
        the one it had. Must be said where the old number had a range.
    note : str
        Note on the new number; that of the old number goes with it.
    owner : str
        Who decided; empty: as it was.
    bound : str
        ``"at-least"`` or ``"at-most"`` where the new number is a bound only.
    nodes : iterable of path, optional
        Further folders of sets and sources.
    write : bool
        False: judge the change only.

    Returns
    -------
    Edited
        What changed, what the check says of it, and the files that were written.

    Raises
    ------
    UsageError
        When something that must be said is missing.
    InputRefused
        With every problem of the file as it is, or as it would be; nothing was written.
    """
    from benchmark.record.editing import KEEP, Restated, change_set, open_set_file
    from benchmark.sets.cells import CellError, read_number
    from benchmark.sets.spread_words import read_spread

    must = {"unit": unit, "evidence": evidence, "source": source, "where": where, "conditions": conditions}
    must |= {"date": str(date), "reason": reason}
    missing = [key for key, text in must.items() if not text.strip()]
    if missing:
        message = f"{name}: say also {', '.join(missing)}; '-' where there is nothing to say"
        raise UsageError(message)
    opened = open_set_file(Path(path), folders_of(nodes))
    table = opened.file.data.get("value", {}).get(name, {})
    if not spread and "spread" in table and name in opened.item.values:
        message = f"{name} has a range; say what becomes of it: a new one, none, or keep"
        raise UsageError(message)
    try:
        new = read_number(text_of(name, number))
        shape = spread if spread == KEEP or isinstance(spread, Mapping) else read_spread(spread)
    except CellError as error:
        message = f"{name}: {error}" + (f"; {error.hint}" if error.hint else "")
        raise UsageError(message) from error
    told: dict[str, str | None] = {"evidence": evidence, "source": source, "where": where, "conditions": conditions}
    told |= {"note": note or None, "bound": bound or None} | ({"owner": owner} if owner else {})
    day = _day("date", date)
    before = _day("old date", old_date) if old_date else None
    one = Restated(name, {node: new}, unit, shape, told, day, " ".join(reason.split()), before)
    return finished(change_set(opened, [one]), _notes(table, node, opened.item.nodes), write=write)


def export_sheet(path: Place, sheet: Place, nodes: Iterable[Place] = ()) -> Path:
    """Write the values of a set as a comma-separated table for a spreadsheet: one row per value and node.

    Parameters
    ----------
    path : str or Path
        A technology or wires set.
    sheet : str or Path
        File to write; its name ends in .csv. An older one is replaced.
    nodes : iterable of path, optional
        Further folders of sets and sources.

    Returns
    -------
    Path
        The file that was written.

    Raises
    ------
    UsageError
        When the name does not end in .csv.
    InputRefused
        With every problem of the set, or when the file cannot be written.
    """
    from benchmark.record.editing import open_set_file
    from benchmark.sets.change_line import write_files
    from benchmark.sets.sheet import sheet_text

    place = _table(sheet)
    text = sheet_text(open_set_file(Path(path), folders_of(nodes)).file)
    write_files({place: text if text.isascii() else f"\ufeff{text}"})  # spreadsheets know UTF-8 by the mark
    return place


def import_sheet(
    sheet: Place,
    path: Place,
    *,
    reason: str = "",
    date: Day | None = None,
    old_date: Day | None = None,
    decimal: str = "",
    nodes: Iterable[Place] = (),
    write: bool = True,
) -> Edited:
    """Take the changes of a sheet into the set it was exported from, as ``supersede`` takes one.

    Comments of the file are kept and what did not change stays to the byte. Changed numbers, units, ranges, evidence,
    sources, places and conditions supersede what was; a changed comment or date alone is corrected in place.

    Parameters
    ----------
    sheet : str or Path
        The file that the spreadsheet saved: UTF-8, with commas, semicolons or tabs between the cells.
    path : str or Path
        The set; it must be as it was when the sheet was exported.
    reason : str
        Why the old numbers are no longer used; needed when a value changes.
    date : date or str, optional
        Day from which the new numbers hold, for rows whose date was not changed.
    old_date : date or str, optional
        Day from which the old numbers held, where the file does not say.
    decimal : str
        Decimal sign of the sheet, ``"point"`` or ``"comma"``; empty: the point, and the comma only in a sheet with
        semicolons whose untouched numbers have it.
    nodes : iterable of path, optional
        Further folders of sets and sources.
    write : bool
        False: judge the change only.

    Returns
    -------
    Edited
        What changed, what the check says of it, and the files that were written.

    Raises
    ------
    UsageError
        When the decimal sign or a day is none.
    InputRefused
        With every problem of the sheet, each with its cell, or of the changed set; nothing was written.
    """
    from benchmark.record.editing import change_set, open_set_file
    from benchmark.record.sheet import Told, restated_by
    from benchmark.sets.files import read_bytes
    from benchmark.sets.problems import Collector
    from benchmark.sets.sheet import read_sheet

    if decimal not in ("", "point", "comma"):
        message = f"decimal: {decimal!r} is not one of point, comma"
        raise UsageError(message)
    said = Told(_day("date", date) if date else None, _day("old date", old_date) if old_date else None, reason, decimal)
    opened, collector = open_set_file(Path(path), folders_of(nodes)), Collector()
    place = _table(sheet)
    raw = read_bytes(place, place.name, collector)
    read = None if raw is None else read_sheet(raw, place.name, collector)
    restated, notes = restated_by(read, opened, said, collector) if read else ([], ())
    collector.raise_if_any()
    return finished(change_set(opened, restated), notes, write=write)


def _table(sheet: Place) -> Path:
    place = Path(sheet)
    if place.suffix.lower() != ".csv":
        message = f"{place}: the name of a sheet ends in .csv"
        raise UsageError(message)
    return place


def _notes(table: Mapping[str, Any], node: str, known: tuple[str, ...]) -> tuple[str, ...]:
    if not node or len(known) == 1:
        return ()
    others = ", ".join(label for label in known if label != node)
    return (f"evidence, source, place and conditions now stand for the numbers of {others} too",)


def finished(edited: EditedSet, notes: tuple[str, ...], *, write: bool) -> Edited:
    """Write a changed set, unless it is only judged, and say what changed."""
    written = edited.write() if write else ()
    lines = tuple(f"{day.isoformat()}, {text}" for day, text in edited.lines)
    return Edited(edited.comparison, edited.warnings, notes, lines, edited.text, written)


def _day(what: str, told: Day) -> datetime.date:
    if isinstance(told, datetime.date):
        return told
    try:
        return datetime.date.fromisoformat(told.strip())
    except ValueError as error:
        message = f"{what}: a day such as 2026-01-31 is needed, found {told!r}"
        raise UsageError(message) from error
