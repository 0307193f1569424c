"""What a study file says of draws and of measurements that could be made (layer 2)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any, Protocol

from benchmark.errors import nearest
from benchmark.sets.study import DrawSettings, NodePair, PossibleMeasurement, Side, draws_allowed
from benchmark.sets.study_schema import StudyFile
from benchmark.sets.values import Value

__all__ = ["read_draws", "read_measurements"]


class Builder(Protocol):
    """What this module needs of the study builder."""

    @property
    def parsed(self) -> StudyFile: ...
    def refuse(self, dotted: str, what: str, found: str = "", allowed: str = "", hint: str = "") -> None: ...
    def number(self, dotted: str, value: Any, low: float, high: float) -> float: ...


def read_measurements(
    build: Builder,
    values: Mapping[str, Value],
    sides: Sequence[Side],
    pairs: Sequence[NodePair],
) -> tuple[PossibleMeasurement, ...]:
    """Read the possible measurements; each must be of a value with a spread, once."""
    owners = {side.technology.id: side.technology for side in sides}
    owners |= {pair.wires.id: pair.wires for pair in pairs}
    known = {f"{owner}.{name}": value for owner, item in owners.items() for name, value in item.values.items()}
    known |= {f"study.{name}": value for name, value in values.items()}
    drawn = sorted(key for key, value in known.items() if value.spread is not None)
    found: dict[str, PossibleMeasurement] = {}
    for position, table in enumerate(build.parsed.measurement):
        dotted = f"measurement.{position}"
        if table.value not in drawn:
            what = "has no spread that a measurement could narrow" if table.value in known else "is not a known key"
            build.refuse(f"{dotted}.value", what, repr(table.value), ", ".join(drawn), nearest(table.value, drawn))
        elif table.value in found:
            build.refuse(f"{dotted}.value", "is measured by an earlier entry too", repr(table.value))
        cost = build.number(f"{dotted}.cost", table.cost, 1e-9, 1e12)
        reachable = build.number(f"{dotted}.reachable_percent", table.reachable_percent, 1e-6, 1e3) / 100.0
        found.setdefault(table.value, PossibleMeasurement(table.value, cost, reachable))
    return tuple(found.values())


def read_draws(build: Builder) -> DrawSettings:
    """Read how many draws are made, from which seed, and what is called likely."""
    table = build.parsed.uncertainty
    if table.draws != 0 and (allowed := draws_allowed(table.draws)):
        build.refuse("uncertainty.draws", "is no number of draws", str(table.draws), f"0 for none, or {allowed}")
    if table.seed < 0:
        build.refuse("uncertainty.seed", "is negative", str(table.seed), "0 or above")
    likely = build.number("uncertainty.likely", table.likely, 0.5, 1.0)
    unlikely = build.number("uncertainty.unlikely", table.unlikely, 0.0, 0.5)
    return DrawSettings(table.draws, table.seed, likely, unlikely)
