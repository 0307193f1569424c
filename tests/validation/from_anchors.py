"""Anchors of every shipped reference set: what was published for the process beside what the set predicts.

A value that the set was solved for says nothing about the model; it is listed and is no check.
"""

from __future__ import annotations

from functools import lru_cache

from benchmark.evaluate.anchors import AnchorResult, anchor_results
from benchmark.record.load import load_technology
from benchmark.sets.library import shipped_nodes
from tests.validation.check import Check

__all__ = ["ALLOWED", "checks", "results"]

#: aim of the project for a quantity that was not fitted [1]
ALLOWED = 0.10
#: sets of the demonstrations are invented, so nothing was published for them
INVENTED = ("demo-", "hand-")


@lru_cache(maxsize=1)
def results() -> tuple[tuple[str, tuple[AnchorResult, ...]], ...]:
    """Return every reference set with its anchors."""
    names = sorted(path.stem for path in (shipped_nodes() / "technologies").glob("*.toml"))
    return tuple(
        (name, tuple(anchor_results(load_technology(name)))) for name in names if not name.startswith(INVENTED)
    )


def checks() -> list[Check]:
    """Every anchor that the set was not solved for."""
    found = []
    for name, anchors in results():
        for one in anchors:
            if one.fitted:
                continue
            allowed = max(ALLOWED * one.published, one.high - one.published, one.published - one.low)
            found.append(
                Check(
                    "anchor",
                    name,
                    f"{one.name.replace('_', ' ')}, {name}, {one.node}, {one.supply:g} V [SI of {one.unit}]",
                    f"{one.source}, {one.where}",
                    "own simulation" if one.source == "open-card-simulation" else "seen",
                    one.published,
                    one.predicted,
                    allowed,
                    "10 %, or the spread of the source where it is wider",
                    one.conditions,
                )
            )
    return found
