"""From measured points to bands: tidy points, the boxes, and the table the program reads.

``tidy_points`` is what a drawing or a page wants; ``band_rows`` is what ``benchmark/evaluate/closed-form-bands.csv``
holds. A band is the smallest and the largest ratio of the points in its box, nothing else; a box with a point where the
method broke makes none. Neighbouring boxes share
their limits, and the limits are places where points stand, so a stage inside a box lies between measured points on
every axis that has limits (the shortest transits are the only open side: they are without effect there).
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

import benchmark.evaluate.bands as engine
from benchmark.evaluate.bands import AXES, fits
from tests.ngspice import measure_references, measure_stress
from tests.ngspice.measured_rows import RULES, Row, stored, write

__all__ = ["PATH", "Box", "TidyPoint", "band_rows", "boxes", "inside", "tidy_points", "write_table"]

PATH = Path(engine.__file__).parent / "closed-form-bands.csv"
Box = dict[str, tuple[float, float]]
#: flags of points whose boxes make no band: the method broke where nothing announces it
FATAL = ("false switching", "edge before that of its input")
#: quantity of the program -> column, by rule
_COLUMNS = {
    "delay": "delay_{rule}",
    "energy": "energy_{rule}",
    "energy without short circuit": "energy_without_short_circuit",
    "leakage": "leakage",
}


@dataclass(frozen=True)
class TidyPoint:
    """One ratio closed over simulated.

    model, technology, node, cell, pin
        Device model; set and node (``invented`` and empty for the switch made to order); driving cell and moving input.
    quantity, rule
        As in ``benchmark.evaluate.bands``.
    ratio [1]
        Closed over simulated.
    facts
        Axis -> value (SI) of those in ``benchmark.evaluate.bands.AXES`` that the model's boxes use.
    fan_out [1], fixed_inputs [1]
        Driven inputs, and fixed load in such inputs.
    flag
        Why the point belongs to no band; empty for all others.
    """

    model: str
    technology: str
    node: str
    cell: str
    pin: str
    quantity: str
    rule: str
    ratio: float
    facts: dict[str, float]
    fan_out: float
    fixed_inputs: float
    flag: str


def _split(row: Row, common: dict[str, object]) -> Iterator[TidyPoint]:
    for quantity, rule in itertools.product(_COLUMNS, RULES):
        text = row[_COLUMNS[quantity].format(rule=rule)]
        if text:
            yield TidyPoint(quantity=quantity, rule=rule, ratio=float(text), **common)  # type: ignore[arg-type]


@lru_cache(maxsize=1)
def tidy_points() -> tuple[TidyPoint, ...]:
    """Return every measured ratio with what it belongs to, one per line, for drawing; see ``TidyPoint``.

    Four lines of quantities by three rules per simulated stage; points without a simulated number are left out (their
    rows, with the reason, are in the files ``tests/data/closed-form-*.csv``).
    """
    found: list[TidyPoint] = []
    for row in stored(measure_references.PATH):
        common: dict[str, object] = {
            "model": "virtual-source",
            **{name: row[name] for name in ("technology", "node", "cell")},
            "pin": row["input"],
            "facts": {"supply": float(row["supply_V"]), "temperature": float(row["temperature_K"])},
            **{name: float(row[name]) for name in ("fan_out", "fixed_inputs")},
            "flag": "",
        }
        found += _split(row, common)
    for row in stored(measure_stress.PATH):
        axes = ("transit_over_rc", "on_off_ratio", "switching_level", "quality")
        common = {
            "model": "stress-gated",
            "technology": "invented",
            "node": "",
            "cell": row["cell"],
            "pin": row["input"],
            "facts": {name: float(row[name]) for name in axes},
            "fan_out": 1.0,
            "fixed_inputs": 0.0,
            "flag": row["flag"],
        }
        found += _split(row, common)
    return tuple(found)


def _neighbours(*limits: float) -> list[tuple[float, float]]:
    return list(itertools.pairwise(limits))


def boxes(model: str, cell: str) -> list[Box]:
    """Return the boxes of a model and cell."""
    if model == "virtual-source":
        # the NAND3 was measured on one set at one temperature
        limits, kelvin = (0.2, 0.3, 0.5, 0.7, 1.0), (233.15, 398.15)
        if cell == "nand3":
            limits, kelvin = limits[:-1], (298.15, 298.15)
        return [{"supply": supply, "temperature": kelvin} for supply in _neighbours(*limits)]
    # a switch with less contrast leaks too much to be told from a slow one, so the lowest limit is that of 1e2
    contrasts = [(1.0e3, 1.0e8)] if cell == "nand3" else [(46.0, 1.0e4), (1.0e3, 1.0e8)]
    levels = _neighbours(0.40, 0.50, 0.667, 0.97)
    found: list[Box] = []
    for contrast, level in itertools.product(contrasts, levels):
        common = {"on_off_ratio": contrast, "switching_level": level}
        found.append({"transit_over_rc": (0.0, 0.1)} | common)
        if cell == "nand3":
            continue
        highest = 10.0 if cell == "nand2" else 100.0 if level[1] < 0.7 else 50.0
        qualities = [(0.5, 3.0)] if cell == "nand2" else [(0.5, 1.0), (1.0, 3.0)]
        steps = [step for step in ((0.1, 1.0), (1.0, 10.0), (10.0, highest)) if step[0] < step[1]]
        found += [
            {"transit_over_rc": step} | common | {"quality": quality}
            for step, quality in itertools.product(steps, qualities)
        ]
    return found


def inside(point: TidyPoint, box: Box) -> bool:
    """Tell whether a measured point lies in a box."""
    return all(fits(point.facts[axis], ends) for axis, ends in box.items())


def band_rows() -> list[Row]:
    """Return the table of the program from the measured points; a box without points makes no band."""
    points = tidy_points()
    kinds = dict.fromkeys((p.model, p.cell) for p in points)
    rows = []
    for model, cell in kinds:
        mine = [p for p in points if (p.model, p.cell) == (model, cell)]
        for box, quantity, rule in itertools.product(boxes(model, cell), engine.QUANTITIES, RULES):
            there = [p for p in mine if (p.quantity, p.rule) == (quantity, rule) and inside(p, box)]
            chosen = [p for p in there if not p.flag]
            if chosen and not any(p.flag in FATAL for p in there):
                rows.append(_row((model, quantity, rule, cell), box, [p.ratio for p in chosen]))
    return rows


def _row(names: Sequence[str], box: Box, found: Sequence[float]) -> Row:
    row = dict(zip(("model", "quantity", "rule", "cell"), names, strict=True))
    for axis in AXES:
        low, high = box.get(axis, (None, None))
        row |= {f"{axis}_low": "" if low is None else f"{low:g}", f"{axis}_high": "" if high is None else f"{high:g}"}
    return row | {"ratio_low": f"{min(found):g}", "ratio_high": f"{max(found):g}", "points": str(len(found))}


def write_table() -> None:
    """Write the table of the program."""
    write(PATH, band_rows())
