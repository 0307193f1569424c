"""How strong the reference is and how robust the answer: rows of the record, and one sentence each (layer 8)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.decide.compare import Comparison, Outcome
from benchmark.decide.ladder import SCALED, Ladder, ladders
from benchmark.decide.robustness import COARSE, Robustness, robustness
from benchmark.sets.study import Side, Study

__all__ = [
    "ladder_rows",
    "mitigation_conventions",
    "robustness_row",
    "side_choices",
]


def side_choices(study: Study, side: Side) -> dict[str, list[float]]:
    """Return the copies and back biases a side may choose from, where any side of the study has a choice."""
    found: dict[str, list[float]] = {}
    if any(other.copies != (1.0,) for other in study.sides):
        found["copies"] = list(side.copies)
    if any(other.back_biases != (0.0,) for other in study.sides):
        found["back_biases"] = list(side.back_biases)
    return found


def ladder_rows(comparison: Comparison, outcome: Outcome) -> list[dict[str, Any]]:
    """Return the ladder of the reference and that of the candidate."""
    return [_ladder_row(ladder) for ladder in ladders(comparison, outcome)]


def _ladder_row(ladder: Ladder) -> dict[str, Any]:
    return {
        "of": ladder.of,
        "state": ladder.state,
        "turn": ladder.turn,
        "rungs": [dict(vars(rung)) for rung in ladder.rungs],
    }


def robustness_row(study: Study, known: Mapping[tuple[str, str], Outcome]) -> dict[str, Any]:
    """Return all cells; ``known``: (pair, policy) -> outcome, where it has been evaluated already."""
    return _robustness_row(robustness(study, known))


def _robustness_row(found: Robustness) -> dict[str, Any]:
    return {
        "cells": [dict(vars(cell)) for cell in found.cells],
        "reaching": found.reaching,
        "better": found.better,
        "infeasible": found.infeasible,
        "worst": None if found.worst is None else found.cells.index(found.worst),
    }


def mitigation_conventions(study: Study) -> list[dict[str, str]]:
    """Return the conventions on ladder, robustness, copies, back bias and gating that this study uses."""
    supply = (
        "each rung allows one mitigation more and keeps those before it; the other side keeps everything the study "
        f"offers it; own best supply goes down to {SCALED:g} of the declared supply (common practice, no source), the "
        "near-threshold rung over the whole range of the study; before the rung best flavour the reference is the "
        "first contender of the study"
    )
    cells = (
        "best estimates; the required time stays as it is in every cell; each temperature also alone; "
        f"cells that no other part of the answer needs search the supply to a relative step of {COARSE:g}"
    )
    found = [{"name": "ladder", "text": supply}, {"name": "robustness", "text": cells}]
    if study.idle == "gated":
        text = "power-gated while idle where that costs less, at each design point"
        found.append({"name": "power gating", "text": text})
    if any(side.copies != (1.0,) for side in study.sides):
        text = (
            "n copies take turns: each may take n times the clock cycle or the required time; one operation takes as "
            "long as before (a deadline stated as a time is not relaxed); each further copy adds the routing overhead "
            "to the dynamic energy of an operation, the repeated share to leakage and wake-up energy, and the area "
            "share to the area; operations must not depend on each other; endurance is asked of each copy as if it did "
            "all the work; the delay of distributing and merging is not modelled"
        )
        found.append({"name": "parallel copies", "text": text})
    if any(side.back_biases != (0.0,) for side in study.sides):
        text = (
            "a back bias shifts the threshold of both polarities by the body factor times the bias, forward lowers it; "
            "any bias other than 0 costs its stated standing power, also while idle; changing the bias costs nothing"
        )
        found.append({"name": "back bias", "text": text})
    return found
