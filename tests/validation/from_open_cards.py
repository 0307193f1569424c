"""Comparisons with open cards, stored series and published scaling factors as checks."""

from __future__ import annotations

from tests.open_cards.row import Row
from tests.open_cards.rows import COMPARISONS
from tests.validation.check import Check
from tests.validation.simulated import answered

__all__ = ["NOT_IN_USE", "checks", "run_all"]

#: comparisons of a rule that the program does not use: no checks of it
NOT_IN_USE = ("Delay by a proposed rule, not in use",)


def _kind(title: str, row: Row) -> str:
    if title.startswith("Scaling factors"):
        return "scaling factors" if row.status == "published" else "stored series"
    if row.status == "closed form":
        return "closed form"
    return "open card" if row.status == "simulated now" else "stored series"


def run_all() -> list[tuple[str, Row]]:
    """Return every row with the title of its comparison."""
    return [(title, row) for title, rows in COMPARISONS.items() if title not in NOT_IN_USE for row in rows()]


def checks() -> list[Check]:
    """Every row, with the simulations of the file."""
    with answered():
        rows = run_all()
    return [
        Check(
            _kind(title, row),
            title,
            row.quantity,
            row.source,
            row.status if row.status != "simulated now" else "simulated",
            row.expected,
            row.obtained,
            row.tolerance * abs(row.expected),
            "stated error of the model there" if row.tolerance >= 1e-3 else "printed digits or agreement of solvers",
            row.note,
            row.isolates,
        )
        for title, row in rows
    ]
