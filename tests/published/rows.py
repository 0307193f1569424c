"""Published and recomputed check rows as data: ``tests/data/*-checks.csv`` bound to functions of the package.

A binding says which row, which package functions it exercises, and how to obtain the number(s). The row's own
columns carry inputs, expected value, tolerance, status (seen / from memory ...) and source.
"""

from __future__ import annotations

import csv
import math
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

DATA = Path(__file__).parent.parent / "data"
NUMBER = re.compile(r"(?<![A-Za-z_\d.])[-+]?\d+(?:\.\d+)?(?:[eE][-+]?\d+)?")


@dataclass(frozen=True)
class Binding:
    """``row``: row_id; ``exercises``: 'package.module:function' names; ``obtain``: returns one or more numbers.

    ``picks`` selects which of the numbers printed in ``expected`` are compared (default: the first len(obtained)).
    """

    row: str
    exercises: tuple[str, ...]
    obtain: Callable[[], float | Sequence[float]]
    picks: tuple[int, ...] | None = None


def load() -> dict[str, dict[str, str]]:
    rows: dict[str, dict[str, str]] = {}
    for name in ("device-checks.csv", "circuit-checks.csv"):
        with (DATA / name).open(newline="", encoding="utf-8") as stream:
            rows.update({row["row_id"]: row for row in csv.DictReader(stream)})
    return rows


def expected_numbers(row: dict[str, str]) -> list[tuple[float, float]]:
    """Return (value, half a unit of the last printed digit) of every number in the expected column."""
    found = []
    for text in NUMBER.findall(row["expected"]):
        mantissa, _, exponent = text.lower().partition("e")
        digits = len(mantissa.partition(".")[2])
        found.append((float(text), 0.5 * 10.0 ** (int(exponent or 0) - digits)))
    return found


def allowed_error(row: dict[str, str], expected: float, half_digit: float) -> float:
    """Return the stated tolerance (percent is relative, a plain number absolute), at least half a printed digit."""
    text = row["tolerance"].split("(")[0].replace(" ", "")
    if text.endswith("%"):
        stated = float(text[:-1]) / 100.0 * abs(expected)
    elif text.endswith("%abs"):
        stated = float(text[:-4]) / 100.0
    else:
        stated = float(text.removesuffix("abs"))
    return max(stated, half_digit)


def matching_digits(expected: float, obtained: float) -> float:
    """Return -log10 of the relative difference (the number of matching digits)."""
    if obtained == expected:
        return math.inf
    return -math.log10(abs(obtained - expected) / max(abs(expected), 1e-300))


def failures(binding: Binding, row: dict[str, str]) -> list[str]:
    """Compare; an empty list means the row holds."""
    raw = binding.obtain()
    obtained = (
        [float(raw)] if isinstance(raw, (int, float)) or getattr(raw, "ndim", 1) == 0 else [float(x) for x in raw]
    )
    printed = expected_numbers(row)
    picked = [printed[i] for i in binding.picks] if binding.picks else printed[: len(obtained)]
    if len(picked) != len(obtained):
        return [f"{binding.row}: {len(obtained)} numbers obtained, {len(picked)} printed"]
    problems = []
    for (expected, half_digit), value in zip(picked, obtained, strict=True):
        if not abs(value - expected) <= allowed_error(row, expected, half_digit):
            problems.append(
                f"{binding.row}: expected {expected!r} (tolerance {row['tolerance']}), obtained {value!r}, "
                f"{matching_digits(expected, value):.1f} digits match; source: {row['source']}"
            )
    return problems
