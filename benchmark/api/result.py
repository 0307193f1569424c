"""The result of a run: verdict, tables and record, all from the record alone."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

from benchmark.errors import EvenloadError

if TYPE_CHECKING:
    import pandas

__all__ = ["Result"]


@dataclass(frozen=True, eq=False, repr=False)
class Result:
    """What a run found.

    Attributes
    ----------
    record : mapping
        The complete record as plain data, as in ``record.json``; numbers are SI unless a key says otherwise.
    """

    record: Mapping[str, Any]

    @property
    def verdict(self) -> str:
        """Return the word of the verdict: one of the five answers."""
        return str(self.record["verdict"]["word"])

    @property
    def advantage(self) -> float | str | None:
        """Return reference over candidate of the metric [1] under the primary policy.

        None: a side has no permitted design point. A word (``infinite``): the candidate costs nothing.
        """
        found: float | str | None = self.record["verdict"]["advantage"]
        return found

    @property
    def reasons(self) -> list[str]:
        """Return why the verdict is what it is."""
        return list(self.record["verdict"]["reasons"])

    @property
    def conditions(self) -> list[str]:
        """Return what a conditional go depends on."""
        return list(self.record["verdict"]["conditions"])

    @property
    def measure_next(self) -> list[str]:
        """Return what to measure before anything else."""
        return list(self.record["verdict"]["measure_next"])

    @cached_property
    def summary(self) -> dict[str, Any]:
        """Return the small, stable part of the record, as in ``summary.json`` (SI)."""
        from benchmark.record.write import summary

        return summary(self.record)

    @cached_property
    def frames(self) -> dict[str, pandas.DataFrame]:
        """Return the tables of the record folder by name, as tidy frames.

        Units stand in the column names (``energy_J``) and in ``frame.attrs["units"]``. Where there is no number a cell
        holds a word such as ``infeasible``; ``pandas.to_numeric(column, errors="coerce")`` makes it not-a-number.
        """
        from benchmark.api.frames import result_frames

        return result_frames(self.record)

    @property
    def text(self) -> str:
        """Return the verdict in plain lines, as the command line prints it."""
        from benchmark.record.text import verdict_text

        return verdict_text(self.record)

    def ratio_only(self) -> Result:
        """Return the result with ratios only: no absolute value of any side, no text of an input file.

        Returns
        -------
        Result
            Everything can be made from it as usual; it cannot be run again.
        """
        from benchmark.record.ratio_only import ratio_only

        return Result(ratio_only(self.record))

    def save(self, folder: str | Path) -> Path:
        """Write the record folder: record, summary, tables, figures and report.

        Of an earlier run in the folder its criteria (policy, required advantage, thresholds) are kept with their date.

        Parameters
        ----------
        folder : str or Path
            New folder, or an earlier record folder to replace; written whole or not at all.

        Returns
        -------
        Path
            The folder.

        Raises
        ------
        EvenloadError
            When the place cannot be written or holds something else.
        """
        from benchmark.record.write import write_folder
        from benchmark.report.folder import fill_folder

        place = Path(folder)
        record = self.after(place).record
        write_folder(place, lambda inside: fill_folder(inside, record))
        return place

    def after(self, folder: str | Path) -> Result:
        """Return the result as it is written into a folder that holds an earlier run of the study.

        Parameters
        ----------
        folder : str or Path
            A record folder; one that does not exist changes nothing.

        Returns
        -------
        Result
            With the date at which its criteria were first used there, and the criteria that were used before.
        """
        from benchmark.record.criteria import continued

        return Result(continued(self.record, Path(folder)))

    def report(self, path: str | Path) -> Path:
        """Write the report alone: one page that opens off-line and holds the record.

        Parameters
        ----------
        path : str or Path
            File to write; one that exists is replaced.

        Returns
        -------
        Path
            The file.

        Raises
        ------
        EvenloadError
            When the file cannot be written.
        """
        from benchmark.report.folder import report_page

        place = Path(path)
        text = report_page(self.record)
        try:
            place.write_text(text, encoding="utf-8")
        except OSError as error:
            message = f"{place}: cannot be written ({error.strerror or error})"
            raise EvenloadError(message) from error
        return place

    def __str__(self) -> str:
        return self.text

    def __repr__(self) -> str:
        study = self.record["study"]
        found = f"{self.advantage:.4g}" if isinstance(self.advantage, float) else self.advantage or "not stated"
        return f"Result({study['id']}: {self.verdict}; advantage {found}, required {study['required_advantage']:g})"

    def _repr_html_(self) -> str:
        from benchmark.api.display import result_html

        return result_html(self.record)
