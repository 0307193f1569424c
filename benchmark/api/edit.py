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

__all__ = ["Edited", "supersede"]

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
        Lines for the list of changes.
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


def _notes(table: Mapping[str, Any], node: str, known: tuple[str, ...]) -> tuple[str, ...]:
    if not node or len(known) == 1:
        return ()
    others = ", ".join(label for label in known if label != node)
    return (f"evidence, source, place and conditions now stand for the numbers of {others} too",)


def finished(edited: EditedSet, notes: tuple[str, ...], *, write: bool) -> Edited:
    """Write a changed set, unless it is only judged, and say what changed."""
    written = edited.write() if write else ()
    return Edited(edited.comparison, edited.warnings, notes, edited.lines, edited.text, written)


def _day(what: str, told: Day) -> datetime.date:
    if isinstance(told, datetime.date):
        return told
    try:
        return datetime.date.fromisoformat(told.strip())
    except ValueError as error:
        message = f"{what}: a day such as 2026-01-31 is needed, found {told!r}"
        raise UsageError(message) from error
