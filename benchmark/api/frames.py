"""Tidy pandas frames with their units: of a record, and of one parameter set."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import TYPE_CHECKING, Any

from benchmark.record.ledger import set_rows
from benchmark.report.tables import frames, ledger_table
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.sources import Source

if TYPE_CHECKING:
    import pandas

__all__ = ["result_frames", "set_frame", "units_of"]

#: end of a column name -> unit of its numbers; longer ends first
_ENDS = {"W_per_m2": "W/m^2", "m2": "m^2", "V": "V", "s": "s", "J": "J", "W": "W", "K": "K"}
#: columns whose numbers are in the unit that each row states
_BY_ROW = ("value", "low", "high", "best", "flips_at", "demanded", "offered")


def units_of(columns: Iterable[str]) -> dict[str, str]:
    """Return the unit of every column that has one.

    Parameters
    ----------
    columns : iterable of str
        Names of the columns of one table.

    Returns
    -------
    dict
        Column to unit. Where each row states its own unit, the text names the column that holds it.
    """
    names = list(columns)
    found: dict[str, str] = {}
    by_row = next((name for name in ("unit", "unit_of_source") if name in names), None)
    for name in names:
        end = next((unit for end, unit in _ENDS.items() if name.endswith(f"_{end}")), None)
        if end is not None:
            found[name] = end
        elif by_row is not None and name.endswith("_SI"):
            found[name] = f"SI unit of the column {by_row!r}"
        elif by_row == "unit" and name in _BY_ROW:
            found[name] = "column 'unit'"
    return found


def _with_units(frame: pandas.DataFrame) -> pandas.DataFrame:
    frame.attrs["units"] = units_of(str(name) for name in frame.columns)
    return frame


def result_frames(record: Mapping[str, Any]) -> dict[str, pandas.DataFrame]:
    """Return every table of a record by name; ``attrs["units"]`` tells the unit of each column that has one.

    Parameters
    ----------
    record : mapping
        As ``run_study`` returns it.

    Returns
    -------
    dict
        The tables of the record folder, in its order; one without rows has no columns.
    """
    return {name: _with_units(frame) for name, frame in frames(record).items()}


def set_frame(item: ParameterSet, sources: Mapping[str, Source]) -> pandas.DataFrame:
    """Return the values of one set, one row per value and node.

    Parameters
    ----------
    item : ParameterSet
        The set.
    sources : mapping
        Known sources by key.

    Returns
    -------
    pandas.DataFrame
        The columns of the assumption ledger and ``value_SI``. ``node`` is empty where one number holds for all nodes.
    """
    import pandas

    rows = ledger_table({"ledger": set_rows(item, sources)})
    numbers = [float(si) for _, value in sorted(item.values.items()) for si in value.si]
    for row, si in zip(rows, numbers, strict=True):
        row["value_SI"] = si
    frame = pandas.DataFrame(rows).drop(columns=["moves_result", "decisive"])
    frame.insert(list(frame.columns).index("unit") + 1, "value_SI", frame.pop("value_SI"))
    return _with_units(frame)
