"""Further sets of the candidate, such as a target and a physical limit: shown beside it, never judged (layer 8).

Each stands in the candidate's place of the same study, at the headline pair, under the primary policy and at its best
estimate.
"""

from __future__ import annotations

import dataclasses
from typing import Any

from benchmark.decide.compare import Comparison, Outcome
from benchmark.evaluate.batch import Batch
from benchmark.sets.study import Study

__all__ = ["outlook_rows"]


def outlook_rows(study: Study) -> list[dict[str, Any]]:
    """Return one row per further set, in the order of the study: what it stands for, its point and its advantage."""
    found = []
    for item in study.candidate.outlook:
        side = dataclasses.replace(study.candidate, id=item.id, technology=item, outlook=())
        placed = dataclasses.replace(study, candidate=side)
        comparison = Comparison(placed, placed.pair(placed.headline), Batch.best_estimate())
        outcome = comparison.outcome(placed.policy.primary)
        named = {"technology": item.id, "title": item.title, "ambition": item.ambition, "sha256": item.sha256}
        found.append(named | _result(outcome))
    return found


def _result(outcome: Outcome) -> dict[str, Any]:
    mine, strongest = outcome.candidate, outcome.strongest_side
    feasible = bool(mine.found[0])
    return {
        "feasible": feasible,
        "why": mine.why,
        "advantage": float(outcome.advantage[0]),
        "strongest": strongest.id if strongest is not None else "",
        "supply": float(mine.supply[0]) if feasible else None,
        "time": float(mine.time[0]) if feasible else None,
        "energy": float(mine.energy[0]) if feasible else None,
    }
