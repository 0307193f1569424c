"""The Python interface to numbers read off measured curves: what was read, how sure, and into which set."""

from __future__ import annotations

import datetime
import os
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from decimal import Decimal
from pathlib import Path
from typing import TYPE_CHECKING, Any

from benchmark.api.edit import Edited, finished
from benchmark.api.session import folders_of
from benchmark.errors import InputRefused, Problem, UsageError

if TYPE_CHECKING:
    import pandas

    from benchmark.curves.extraction import Found
    from benchmark.curves.record import MeasuredCurves
    from benchmark.record.editing import OpenSet, Restated

__all__ = ["Extraction", "extract"]

Place = str | Path
#: evidence of data that a reading cannot better
_NO_BETTER = ("invented", "assumed", "simulated", "projected", "target")
#: significant digits of a number written into a set, and of its spread
DIGITS, SPREAD_DIGITS = 7, 3


@dataclass(frozen=True, eq=False)
class Extraction:
    """Numbers read off the curves of one raw file.

    Attributes
    ----------
    path : Path
        The description of the file.
    curves : MeasuredCurves
        Every curve, and what was done to read them.
    found : tuple of Found
        The numbers, in the order of the requests.
    warnings : tuple of str
        What the reading says without refusing.
    """

    path: Path
    curves: MeasuredCurves
    found: tuple[Found, ...]
    warnings: tuple[str, ...]

    @property
    def data(self) -> dict[str, Any]:
        """Return everything as plain data."""
        from benchmark.record.extracted import found_data

        return {
            "file": self.curves.file,
            "digest": self.curves.digest,
            "description": self.curves.description,
            "notes": list(self.curves.notes),
            "warnings": list(self.warnings),
            "numbers": [found_data(one, self.curves) for one in self.found],
        }

    @property
    def frame(self) -> pandas.DataFrame:
        """Return one row per number, and one per device where there are several."""
        import pandas

        from benchmark.record.extracted import COLUMNS, found_rows

        rows = [row for one in self.found for row in found_rows(one, self.curves)]
        return pandas.DataFrame(rows, columns=list(COLUMNS))

    def figure(self, path: Place, width: float = 180.0) -> tuple[Path, ...]:
        """Draw the points with what was read off them.

        Parameters
        ----------
        path : str or Path
            File ending in .svg, .pdf or .png; with several measured columns each has its own, named after it.
        width : float
            Width on paper [mm].

        Returns
        -------
        tuple of Path
            The drawings; caption and alternative text stand beside each as .txt.

        Raises
        ------
        UsageError
            When the ending is none of these, or no number was asked for.
        """
        from benchmark.report.curve_figure import write_curve_figures

        return write_curve_figures(self.curves, self.found, check_figure(path), width)

    def into(
        self,
        set_file: Place,
        *,
        reason: str = "",
        old_date: datetime.date | str | None = None,
        nodes: Iterable[Place] = (),
        write: bool = True,
    ) -> Edited:
        """Give values of a set the numbers that were read; the old ones stay in the file as their history.

        Parameters
        ----------
        set_file : str or Path
            A technology or wires set; a value of its model that it does not state yet is added.
        reason : str
            Why the old numbers are no longer used; default: that they were read off this file.
        old_date : date or str, optional
            Day from which the old numbers held; needed where the set does not say.
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
            When no request names a value of a set.
        InputRefused
            With every problem of the set as it is, or as it would be; nothing was written.
        """
        from benchmark.record.editing import change_set, open_set_file

        named = [one for one in self.found if one.request.name]
        if not named:
            message = f'{self.path}: no request names a value of a set (name = "...")'
            raise UsageError(message)
        opened = open_set_file(Path(set_file), folders_of(nodes))
        before = None
        if old_date:
            before = old_date if isinstance(old_date, datetime.date) else _day(old_date)
        restated, notes = self._restated(named, opened, reason, before)
        return finished(change_set(opened, restated), notes, write=write)

    def _restated(
        self, named: list[Found], opened: OpenSet, reason: str, old_date: datetime.date | None
    ) -> tuple[list[Restated], tuple[str, ...]]:
        """Return the new state of each value; refused where it cannot be told."""
        problems: list[Problem] = []
        groups: dict[str, dict[str, Found]] = {}
        for one in named:
            request = one.request
            if request.node in groups.setdefault(request.name, {}):
                what = "names a value that another request gives too"
                problems.append(self._problem(one, what, f"{request.name} {request.node}".strip()))
            groups[request.name][request.node] = one
        if not self.curves.date:
            what = "does not say on which day the curves were measured, so no value can hold from then on"
            problems.append(Problem(self.curves.description, 0, "date", what, "", "date = 2026-01-31"))
        for group in groups.values():
            if "" in group and len(group) > 1:
                problems.append(self._problem(group[""], "gives one number for all nodes beside numbers for some"))
            if len({one.bound for one in group.values()}) > 1:
                first = next(iter(group.values()))
                problems.append(self._problem(first, "gives a bound for one node and a number for another"))
        if problems:
            raise InputRefused(problems)
        made = [self._one(name, group, opened, reason, old_date) for name, group in groups.items()]
        return [one for one, _ in made], tuple(dict.fromkeys(note for _, notes in made for note in notes))

    def _problem(self, one: Found, what: str, found: str = "") -> Problem:
        return Problem(self.curves.description, one.request.line, one.request.dotted, what, found)

    def _one(
        self, name: str, group: Mapping[str, Found], opened: OpenSet, reason: str, old_date: datetime.date | None
    ) -> tuple[Restated, list[str]]:
        from benchmark.record.editing import KEEP, Restated
        from benchmark.record.extracted import how_read

        curves = self.curves
        table = opened.file.data.get("value", {}).get(name, {})
        first = next(iter(group.values()))
        unit = str(table.get("unit") or first.request.unit)
        notes = list(dict.fromkeys(f"{name}: {warning}" for one in group.values() for warning in one.warnings))
        spread: Mapping[str, Any] | str | None = _spread(first, unit)
        if list(group) != [""] and len(opened.item.nodes) > 1:
            spread = KEEP if "spread" in table else None
            notes.append(f"{name} has one range for all its nodes, which stays as it was")
        notes += self._other_temperature(group.values(), opened)
        data = self.path.resolve().parent / Path(curves.file).name
        read_from = os.path.relpath(data, opened.path.resolve().parent)
        how = "; ".join(how_read(one, curves) for one in group.values())
        told: dict[str, str | None] = {
            "evidence": curves.evidence if curves.evidence in _NO_BETTER else "extracted",
            "source": curves.source,
            "where": curves.where,
            "conditions": curves.conditions,
            "note": " ".join([how, curves.note]).strip(),
            "bound": first.bound or None,
        }
        if curves.owner:
            told["owner"] = curves.owner
        restated = Restated(
            name,
            {node: _decimal(one.value, unit) for node, one in group.items()},
            unit,
            spread,
            told,
            _day(curves.date),
            " ".join((reason or f"read off {Path(curves.file).name}").split()),
            old_date,
            {"file": Path(read_from).as_posix(), "digest": curves.digest} | ({"hero": True} if curves.hero else {}),
            may_add=True,
        )
        return restated, notes

    def _other_temperature(self, group: Iterable[Found], opened: OpenSet) -> list[str]:
        """Say when the curves were measured at another temperature than the set states its values for."""
        from benchmark.units import format_si

        stated = opened.item.values.get("reference_temperature")
        sweeps = [sweep for one in group for device in one.devices for sweep in device.sweeps]
        measured = sorted({sweep.fixed["temperature"] for sweep in sweeps if "temperature" in sweep.fixed})
        if stated is None or not measured or all(abs(one - float(stated.si[0])) <= 1.0 for one in measured):
            return []
        shown = ", ".join(format_si(one, "K", 5) for one in measured)
        return [f"the curves were measured at {shown}, the values of the set hold at {format_si(stated.si[0], 'K', 5)}"]


def extract(path: Place) -> Extraction:
    """Read a raw measured file as its description says, and read off it what the description asks for.

    Parameters
    ----------
    path : str or Path
        The description, a TOML file of kind ``curves`` with ``[[extract]]`` tables.

    Returns
    -------
    Extraction
        The numbers with their uncertainty, and everything that was done.

    Raises
    ------
    InputRefused
        With every problem of the description, the raw file and the readings, in one pass.
    """
    from benchmark.curves.extraction import extract_all
    from benchmark.curves.read import read_curves
    from benchmark.sets.files import read_toml, shown
    from benchmark.sets.problems import Collector

    place, collector = Path(path), Collector()
    file = read_toml(place, collector)
    collector.raise_if_any()
    if file is not None and file.data.get("kind") != "curves":
        what = "is no description of a raw measured file"
        raise InputRefused([file.problem("kind", what, shown(file.data.get("kind", "none")), 'kind = "curves"')])
    curves = read_curves(place, collector)
    collector.raise_if_any()
    if curves is None:
        raise InputRefused([Problem(str(place), 0, "", "could not be read")])
    if not curves.extract:
        collector.add(
            Problem(
                curves.description, 0, "extract", "nothing is asked for", "", "[[extract]] tables in the description"
            )
        )
    found = extract_all(curves, collector)
    collector.raise_if_any()
    warnings = tuple(str(warning) for warning in sorted(set(collector.warnings)))
    return Extraction(place, curves, tuple(found), warnings)


def check_figure(path: Place) -> Path:
    """Refuse the name of a drawing that says no form."""
    place = Path(path)
    if place.suffix not in (".svg", ".pdf", ".png"):
        message = f"--figure: {place.name!r} does not end in .svg, .pdf or .png"
        raise UsageError(message)
    return place


def _day(told: str) -> datetime.date:
    try:
        return datetime.date.fromisoformat(told.strip())
    except ValueError as error:
        message = f"a day such as 2026-01-31 is needed, found {told!r}"
        raise UsageError(message) from error


def _decimal(si: float, unit: str, digits: int = DIGITS) -> Decimal:
    """Return an SI number in a unit, in the digits a file states."""
    from benchmark.units import from_si, parse_unit

    number = Decimal(f"{from_si(si, parse_unit(unit)):.{digits}g}")
    return number if number.as_tuple().exponent != 0 else number + Decimal("0.0")


def _spread(one: Found, unit: str) -> Mapping[str, Any] | None:
    """Return the spread a request asks for, as a table of the set."""
    from benchmark.units import parse_unit

    deviation = one.spread
    if not deviation:
        return None
    if one.kind.logarithmic and one.value > 0.0:
        return {"shape": "lognormal", "ln_sd": _decimal(deviation / one.value, "1", SPREAD_DIGITS)}
    factor = float(parse_unit(unit).factor)
    return {"shape": "normal", "sd": _decimal(deviation / factor, "1", SPREAD_DIGITS)}
