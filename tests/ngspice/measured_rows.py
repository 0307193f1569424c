"""Measured points of the closed forms as files: what every kind of point shares.

A row holds the inputs of a point, what ngspice found, and the ratios closed over simulated of the program as it is.
Simulated numbers that stand in a file are kept, so a broken run goes on and a changed closed form needs no new
simulation.
"""

from __future__ import annotations

import csv
import sys
from collections.abc import Callable, Iterable, Mapping, Sequence
from pathlib import Path
from typing import TypeVar

from tests.ngspice.benches import Bench

__all__ = ["DATA", "RATIOS", "RULES", "Row", "complete", "ratios", "stored", "write"]

DATA = Path(__file__).parent.parent / "data"
RULES = ("chain", "step", "integral")
RATIOS = (
    *(f"delay_{rule}" for rule in RULES), *(f"energy_{rule}" for rule in RULES), "energy_without_short_circuit",
    "leakage",
)  # fmt: skip
Row = dict[str, str]
P = TypeVar("P")


def stored(path: Path) -> list[Row]:
    """Return the rows of a file."""
    with path.open(newline="", encoding="utf-8") as stream:
        return list(csv.DictReader(stream))


def write(path: Path, rows: Sequence[Mapping[str, str]]) -> None:
    """Write a file."""
    with path.open("w", newline="", encoding="utf-8") as stream:
        writer = csv.DictWriter(stream, list(rows[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)


def ratios(one: Bench, delay: float, energy: float, leakage: float) -> Row:
    """Return the ratios closed over simulated (s, J, W); ``energy`` is that of one cycle without leakage."""
    found: Row = {}
    for rule in RULES:
        closed = one.estimate(rule)
        whole, short = closed.dynamic_energy.item(), closed.dynamic_energy_parts["short_circuit"].item()
        found[f"delay_{rule}"] = f"{closed.path_delay.item() / delay:.5g}"
        found[f"energy_{rule}"] = f"{whole / energy:.5g}"
        found["energy_without_short_circuit"] = f"{(whole - short) / energy:.5g}"
        found["leakage"] = f"{closed.leakage_power.item() / leakage:.5g}"
    return {name: found[name] for name in RATIOS}


def complete(
    path: Path,
    points: Iterable[P],
    key: Callable[[P], tuple[str, ...]],
    names: Sequence[str],
    simulate: Callable[[P], Row],
    row: Callable[[P, Row], Row],
) -> list[Row]:
    """Simulate the points that are not in the file, take every ratio anew, write the file and return its rows.

    ``names`` are the columns that make a key; ``row`` makes the whole row from a point and what was simulated.
    """
    known = {tuple(line[name] for name in names): line for line in stored(path)} if path.is_file() else {}
    listed = list(points)
    rows: list[Row] = []
    for position, point in enumerate(listed):
        mine = key(point)
        fresh = mine not in known
        rows.append(row(point, simulate(point) if fresh else known[mine]))
        if fresh:
            print(position + 1, len(listed), *rows[-1].values())
            sys.stdout.flush()
            write(path, rows + [known[key(later)] for later in listed[position + 1 :] if key(later) in known])
    write(path, rows)
    return rows
