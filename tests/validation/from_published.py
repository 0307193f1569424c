"""Published rows as checks, and the rows that nothing answers."""

from __future__ import annotations

from tests.published.rows import all_bindings, compared, load
from tests.published.unused import reason
from tests.validation.check import Check

__all__ = ["checks", "unanswered"]


def checks() -> list[Check]:
    """Every number of every bound row."""
    rows = load()
    found = []
    for binding in all_bindings():
        row = rows[binding.row]
        numbers = compared(binding, row)
        basis = f"tolerance of the row: {row['tolerance']}" + (" relative" if binding.relative else "")
        if binding.sampling:
            basis += f", and {binding.sampling:g} for a finite number of draws"
        for position, one in enumerate(numbers, start=1):
            part = f", number {position}" if len(numbers) > 1 else ""
            kind = "published case" if row["kind"].startswith("published") else "published formula"
            unit = "1" if row["unit"] in ("-", "") else row["unit"]
            found.append(
                Check(
                    kind,
                    "Devices" if binding.row.startswith("dev.") else "Circuits, draws and decisions",
                    f"{binding.row.partition('.')[2]}{part} [{unit}]",
                    row["source"],
                    row["status"],
                    one.expected,
                    one.obtained,
                    one.allowed,
                    basis,
                    row["inputs"],
                )
            )
    return found


def unanswered() -> list[tuple[dict[str, str], str]]:
    """Rows that no function answers, with the reason."""
    bound = {binding.row for binding in all_bindings()}
    return [(row, reason(name)) for name, row in load().items() if name not in bound]
