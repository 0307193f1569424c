"""Everything the validation page shows, and its files."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path

from tests.validation import (
    from_anchors,
    from_bands,
    from_closed_forms,
    from_curves,
    from_open_cards,
    from_published,
    from_solvers,
)
from tests.validation.check import Check
from tests.validation.reach import public_functions, recorded

__all__ = [
    "CHECKS",
    "COLUMNS",
    "FOLDER",
    "FUNCTIONS",
    "PAGE",
    "Dossier",
    "checks_text",
    "collect",
    "functions_text",
    "write",
]

FOLDER = Path(__file__).parent.parent.parent / "reports" / "validation"
CHECKS, FUNCTIONS, PAGE = FOLDER / "checks.csv", FOLDER / "functions.csv", FOLDER / "index.html"
SOURCES: tuple[Callable[[], list[Check]], ...] = (
    from_published.checks,
    from_closed_forms.checks,
    from_curves.checks,
    from_solvers.checks,
    from_bands.checks,
    from_open_cards.checks,
    from_anchors.checks,
)
COLUMNS = (
    *("kind", "group", "check", "source", "status", "known", "expected", "obtained", "residual", "allowed", "holds"),
    *("tolerance", "note", "explains"),
)


@dataclass(frozen=True)
class Dossier:
    """Checks in their order, and public functions that compute numbers with whether a check reached them."""

    checks: tuple[Check, ...]
    functions: Mapping[str, bool]

    @property
    def unreached(self) -> list[str]:
        """Functions that no check reached."""
        return [name for name, reached in self.functions.items() if not reached]


def collect() -> Dossier:
    """Obtain every number anew; simulations come from stored files."""
    functions = public_functions()
    with recorded(functions) as reached:
        found = [check for source in SOURCES for check in source()]
    return Dossier(tuple(found), {name: name in reached for name in functions})


def _number(value: float) -> str:
    return f"{value:.7g}"


def checks_text(found: Dossier) -> str:
    """Write the checks as CSV."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(COLUMNS)
    for one in found.checks:
        numbers = (one.expected, one.obtained, one.residual, one.allowed)
        writer.writerow(
            [
                *(one.kind, one.group, one.name, one.source, one.status, one.word),
                *(_number(value) for value in numbers),
                *("yes" if one.holds else "no", one.basis, one.note, one.isolates),
            ]
        )
    return stream.getvalue()


def functions_text(found: Dossier) -> str:
    """Write the functions as CSV."""
    lines = ["function,reached", *(f"{name},{'yes' if on else 'no'}" for name, on in found.functions.items())]
    return "\n".join(lines) + "\n"


def write(found: Dossier) -> None:
    """Write page and tables."""
    from tests.validation.page import page

    FOLDER.mkdir(parents=True, exist_ok=True)
    CHECKS.write_text(checks_text(found), encoding="utf-8")
    FUNCTIONS.write_text(functions_text(found), encoding="utf-8")
    PAGE.write_text(page(found), encoding="utf-8")
