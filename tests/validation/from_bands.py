"""Closed forms against the simulator with the charges of the device: stored points, closed forms obtained anew.

Allowed is the error band that the program states at the point. The band was made of these points, so such a check
shows that the closed forms and the bands belong together; how good the closed forms are is said by the bands
themselves, which the page draws.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from types import ModuleType

from benchmark.evaluate.bands import find
from tests.ngspice import measure_references, measure_stress
from tests.ngspice.measured_rows import Row, stored
from tests.validation.check import Check

__all__ = ["STRIDES", "checks"]

#: every n-th point of a design is obtained anew
STRIDES: tuple[tuple[ModuleType, int, str, str], ...] = (
    (measure_references, 2, "virtual-source", "chain"),
    (measure_stress, 15, "stress-gated", "integral"),
)
QUANTITIES = {"delay": "delay_{rule}", "energy": "energy_{rule}", "leakage": "leakage"}


def _facts(model: str, row: Row) -> dict[str, float]:
    if model == "virtual-source":
        known = {"supply": float(row["supply_V"]), "temperature": float(row["temperature_K"])}
        free = {"transit_over_rc": 0.0, "on_off_ratio": math.inf, "switching_level": 0.5, "quality": math.nan}
        return free | known
    axes = ("transit_over_rc", "on_off_ratio", "switching_level", "quality")
    return {"supply": 0.5, "temperature": 298.15} | {axis: float(row[axis]) for axis in axes}


def _of(module: ModuleType, stride: int, model: str, rule: str) -> Iterator[Check]:
    rows = stored(module.PATH)[::stride]
    for point, kept in zip(list(module.design())[::stride], rows, strict=True):
        if kept.get("flag"):
            continue
        now = module.row(point, {name: kept[name] for name in module.SIMULATED})
        place = " ".join(module.key(point))
        for quantity, column in QUANTITIES.items():
            name = column.format(rule=rule) if column.format(rule=rule) in now else quantity
            if not now[name]:
                continue
            band = find(quantity, model, rule, kept["cell"], _facts(model, kept))
            if band.why:
                continue
            allowed = max(abs(band.low - 1.0), abs(band.high - 1.0)) + 1e-3
            yield Check(
                "simulator, charges of the device", f"{model}, rule {rule}, {kept['cell']}",
                f"{quantity}, closed over simulated: {place} [1]", kept["source"], "simulated", 1.0, float(now[name]),
                allowed, f"error band stated there: {band.low:.3f} to {band.high:.3f}", f"over {band.over}",
            )  # fmt: skip


def checks() -> list[Check]:
    """Every chosen point that has a band."""
    return [check for one in STRIDES for check in _of(*one)]
