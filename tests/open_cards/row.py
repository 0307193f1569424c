"""One line of a comparison with something that was not made here."""

from __future__ import annotations

import csv
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

__all__ = ["DATA", "Row", "failures", "read_csv"]

DATA = Path(__file__).parent.parent / "data"


@dataclass(frozen=True)
class Row:
    """``expected``: of the source; ``obtained``: of this program; SI.

    status: ``simulated now`` (ngspice, in this run), ``simulated`` (stored series), ``published``, ``closed form``.
    tolerance: largest relative difference allowed, the stated error of the model there; ``isolates`` names the row
    that a second measurement explains, empty for a result of its own.
    """

    quantity: str
    source: str
    status: str
    expected: float
    obtained: float
    tolerance: float
    note: str = ""
    isolates: str = ""

    @property
    def difference(self) -> float:
        """Relative difference [1]."""
        return self.obtained / self.expected - 1.0

    @property
    def holds(self) -> bool:
        """Whether the difference is within the tolerance (nan is not)."""
        return abs(self.difference) <= self.tolerance


def read_csv(name: str) -> list[dict[str, str]]:
    """Rows of a stored table."""
    with (DATA / name).open(newline="", encoding="utf-8") as stream:
        return list(csv.DictReader(stream))


def failures(rows: Iterable[Row]) -> list[str]:
    """What does not hold, in words; no rows at all is a failure too."""
    listed = list(rows)
    if not listed:
        return ["no rows"]
    return [
        f"{row.quantity}: {row.obtained:.5g}, expected {row.expected:.5g}, {row.difference:+.2%} of {row.tolerance:.2%}"
        for row in listed
        if not row.holds
    ]
