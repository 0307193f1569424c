"""Published and recomputed check rows as data: ``tests/data/*-checks.csv`` bound to functions of the package.

A binding says which row, which package functions it exercises, and how to obtain the number(s). The row's own
columns carry inputs, expected value, tolerance, status (seen / from memory ...) and source.
"""

from __future__ import annotations

import csv
import importlib
import math
import pkgutil
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
    ``sampling``: what a finite number of draws adds to the tolerance of the row, in its unit. ``relative``: the row's
    plain number is a relative tolerance (numbers far below it).
    """

    row: str
    exercises: tuple[str, ...]
    obtain: Callable[[], float | Sequence[float]]
    picks: tuple[int, ...] | None = None
    sampling: float = 0.0
    relative: bool = False


@dataclass(frozen=True)
class Compared:
    """One number of a row: as printed, as obtained, and the largest difference allowed."""

    expected: float
    obtained: float
    allowed: float

    @property
    def holds(self) -> bool:
        """Whether the difference is allowed (nan is not)."""
        return abs(self.obtained - self.expected) <= self.allowed


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
    """Return the stated tolerance (percent is relative, a plain number absolute), at least half a printed digit.

    A printed zero is exact where a tolerance is stated.
    """
    text = row["tolerance"].split("(")[0].replace(" ", "")
    if text.endswith("%"):
        stated = float(text[:-1]) / 100.0 * abs(expected)
    elif text.endswith("%abs"):
        stated = float(text[:-4]) / 100.0
    else:
        stated = float(text.removesuffix("abs"))
    return stated if stated > 0.0 and expected == 0.0 else max(stated, half_digit)


def matching_digits(expected: float, obtained: float) -> float:
    """Return -log10 of the relative difference (the number of matching digits)."""
    if obtained == expected:
        return math.inf
    return -math.log10(abs(obtained - expected) / max(abs(expected), 1e-300))


def compared(binding: Binding, row: dict[str, str]) -> list[Compared]:
    """Return every number of a row that is compared; raise ValueError when there are not as many as printed."""
    raw = binding.obtain()
    obtained = (
        [float(raw)] if isinstance(raw, (int, float)) or getattr(raw, "ndim", 1) == 0 else [float(x) for x in raw]
    )
    printed = expected_numbers(row)
    picked = [printed[i] for i in binding.picks] if binding.picks else printed[: len(obtained)]
    if len(picked) != len(obtained):
        message = f"{binding.row}: {len(obtained)} numbers obtained, {len(picked)} printed"
        raise ValueError(message)
    found = []
    for (expected, half_digit), value in zip(picked, obtained, strict=True):
        if binding.relative:
            allowed = max(float(row["tolerance"]) * abs(expected), half_digit)
        else:
            allowed = allowed_error(row, expected, half_digit)
        found.append(Compared(expected, value, allowed + binding.sampling))
    return found


def failures(binding: Binding, row: dict[str, str]) -> list[str]:
    """Compare; an empty list means the row holds."""
    try:
        numbers = compared(binding, row)
    except ValueError as error:
        return [str(error)]
    return [
        f"{binding.row}: expected {one.expected!r} (tolerance {row['tolerance']}), obtained {one.obtained!r}, "
        f"{matching_digits(one.expected, one.obtained):.1f} digits match; source: {row['source']}"
        for one in numbers
        if not one.holds
    ]


def all_bindings() -> list[Binding]:
    """Return the bindings of every ``bind_*`` module beside this one."""
    found: list[Binding] = []
    for info in pkgutil.iter_modules([str(Path(__file__).parent)]):
        if info.name.startswith("bind_"):
            found += importlib.import_module(f"tests.published.{info.name}").BINDINGS
    return found
