"""The verdict table (layer 7): requirements first, then each input moved alone over its range, capped by evidence.

1. a requirement failed at all permitted points        -> no-go, requirement failed (all failures listed)
2. a requirement unknown                               -> not decidable on this evidence, unless every advantage is
                                                          below M: then no measurement of it can help, and 3 holds
3. every input moved alone: all advantages >= M        -> go
                            all < M                    -> no-go, not better
   straddling, best estimate >= M, and every straddling input of a conditional class
                                                       -> conditional go, inputs and values named
   otherwise                                           -> not decidable, naming what to measure
4. evidence caps the word: an input without a range that moves the result counts as decisive. Invented inputs carry any
   verdict of a demonstration (unless the study refuses them), and one that straddles is named as a condition.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from benchmark.catalogue import EVIDENCE
from benchmark.decide.assess import RequirementResult
from benchmark.decide.compare import Outcome
from benchmark.decide.moves import InputMove, move_inputs, reaches
from benchmark.decide.wording import apart, beyond
from benchmark.sets.study import Study

__all__ = ["WORDS", "InputMove", "Verdict", "judge", "move_inputs"]

WORDS = (
    "go",
    "conditional go",
    "no-go, requirement failed",
    "no-go, not better",
    "not decidable on this evidence",
)


@dataclass(frozen=True)
class Verdict:
    """The answer with what carries it."""

    word: str
    reasons: tuple[str, ...]
    advantage: float
    advantage_low: float
    advantage_high: float
    moves: tuple[InputMove, ...]
    conditions: tuple[str, ...] = ()
    measure_next: tuple[str, ...] = ()
    unranged: int = 0
    judgement: int = 0
    inputs_with_effect: int = 0
    extra: Mapping[str, Any] = field(default_factory=dict)


def judge(
    study: Study,
    outcome: Outcome,
    requirements: Sequence[RequirementResult],
    moves: Sequence[InputMove],
    relaxed: Outcome | None = None,
) -> Verdict:
    """Apply the verdict table at the best estimate (row 0).

    Parameters
    ----------
    study : Study
    outcome : Outcome
        Primary policy.
    requirements : sequence of RequirementResult
    moves : sequence of InputMove
        Empty when a side has no permitted point.
    relaxed : Outcome, optional
        The same policy with the hard requirements set aside, when the candidate has no permitted point: says what the
        advantage would be.
    """
    required = study.required_advantage
    best = float(outcome.advantage[0])
    advantages = [a for move in moves if move.ranged for a in (move.advantage_low, move.advantage_high)]
    known = [a for a in [best, *advantages] if np.isfinite(a)]
    low, high = (min(known), max(known)) if known else (float("nan"), float("nan"))
    effective = [move for move in moves if move.matters]
    common: dict[str, Any] = {
        "advantage": best,
        "advantage_low": low,
        "advantage_high": high,
        "moves": tuple(moves),
        "unranged": sum(not move.ranged for move in effective),
        "judgement": sum(move.evidence in ("assumed", "invented") for move in effective),
        "inputs_with_effect": len(effective),
    }
    shortfall = _shortfall(outcome, required)
    failed = _failures(outcome, requirements)
    if failed:
        return Verdict(WORDS[2], tuple(dict.fromkeys([*failed, *shortfall, *_set_aside(relaxed, required)])), **common)
    unknown = [f"{r.name}: {r.note or 'cannot be judged'}" for r in requirements if r.state == "unknown"]
    unknown += list(outcome.unknown)
    if outcome.strongest[0] < 0 and not outcome.unknown:
        unknown.append("no contender meets the hard requirements, so there is nothing to compare with")
    if unknown and np.isfinite(best) and all(not reaches(a, required) for a in [best, *advantages]):
        # nothing that could be learnt about the unknown requirement can turn this into a go
        aside = tuple(f"not settled, and cannot change the answer: {text}" for text in unknown)
        return Verdict(WORDS[3], (*shortfall, *aside), **common)
    if unknown:
        return Verdict(WORDS[4], tuple(unknown), measure_next=tuple(unknown), **common)
    return _by_ranges(study, best, moves, shortfall, common)


def _failures(outcome: Outcome, requirements: Sequence[RequirementResult]) -> list[str]:
    """Every failed requirement; when the candidate has no permitted point, also why."""
    failed = [_failure(result) for result in requirements if result.state == "fail"]
    if not outcome.candidate.found[0] and (outcome.candidate.why or not outcome.unknown):
        failed.append(outcome.candidate.why or "no permitted point meets all hard requirements together")
    return failed


def _set_aside(relaxed: Outcome | None, required: float) -> list[str]:
    """What the advantage would be without the hard requirements."""
    if relaxed is None or not np.isfinite(relaxed.advantage[0]):
        return []
    advantage, limit = apart(float(relaxed.advantage[0]), required)
    word = "below" if float(relaxed.advantage[0]) < required else "at or above"
    return [f"with the hard requirements set aside the advantage would be {advantage}, {word} the required {limit}"]


def _failure(result: RequirementResult) -> str:
    margin, one = apart(result.margin, 1.0, 3)
    text = f"requirement {result.name} failed (margin {margin}, needs {one})"
    if result.kind == "report" and result.passes_somewhere and np.isfinite(result.margin):
        text += "; other permitted points meet it: make it hard to bound the search"
    return text


def _shortfall(outcome: Outcome, required: float) -> list[str]:
    advantage = float(outcome.advantage[0])
    if np.isfinite(advantage) and advantage < required:
        reached, limit = apart(advantage, required)
        return [f"advantage {reached} is below the required {limit}"]
    return []


def _by_ranges(
    study: Study, best: float, moves: Sequence[InputMove], shortfall: Sequence[str], common: Mapping[str, Any]
) -> Verdict:
    required = study.required_advantage
    straddling = [move for move in moves if move.straddles]
    reached = reaches(best, required)
    decisive = [move for move in moves if move.decisive]
    if not straddling and not reached:
        return Verdict(WORDS[3], tuple(shortfall), **common)
    refused = study.invented_inputs == "refuse"
    supports = {move.key: _support(move.evidence, refused) for move in decisive}
    weak = [move for move in decisive if supports[move.key] == "none"]
    conditional = [move for move in decisive if supports[move.key] == "conditional"]
    if not straddling:
        if weak:
            names = tuple(_condition(move, required) for move in weak)
            return Verdict(WORDS[4], ("decisive inputs are judgement without a range",), measure_next=names, **common)
        if conditional:
            return Verdict(
                WORDS[1],
                (f"advantage at least {required:g} over every stated range",),
                conditions=tuple(_condition(move, required) for move in conditional),
                **common,
            )
        return Verdict(
            WORDS[0], (f"advantage at least {required:g} for every input moved alone over its range",), **common
        )
    conditions = [*straddling, *(move for move in conditional if not move.straddles)]
    if reached and not weak and all(supports[move.key] != "go" or _invented(move) for move in straddling):
        return Verdict(
            WORDS[1],
            (f"best estimate reaches {required:g}; the inputs named must hold",),
            conditions=tuple(_condition(move, required) for move in conditions),
            **common,
        )
    named = [*sorted(straddling, key=_swing, reverse=True), *(move for move in weak if not move.straddles)]
    reason = f"{len(straddling)} input(s) moved alone over the stated range cross the required advantage"
    return Verdict(
        WORDS[4], (reason, *shortfall), measure_next=tuple(_condition(move, required) for move in named), **common
    )


def _support(evidence: str, refuse_invented: bool) -> str:
    """The strongest word a decisive input of this class may carry: go, conditional or none."""
    support = EVIDENCE[evidence].support if evidence in EVIDENCE else "none"
    if support == "demonstration":
        return "none" if refuse_invented else "go"
    return support


def _invented(move: InputMove) -> bool:
    return move.evidence in EVIDENCE and EVIDENCE[move.evidence].support == "demonstration"


def _swing(move: InputMove) -> float:
    pair = (move.advantage_low, move.advantage_high)
    if not all(np.isfinite(pair)) or min(pair) <= 0.0:
        return float("inf")
    return abs(float(np.log(move.advantage_high / move.advantage_low)))


def _amount(text: str, unit: str) -> str:
    return text if unit == "1" else f"{text} {unit}"


def _condition(move: InputMove, required: float) -> str:
    """What an input must do for the answer to reach M. A limit is rounded to the safe side."""
    if not move.ranged:
        if not np.isfinite(move.best):
            return f"{move.key} as stated ({move.evidence}, no range stated)"
        return f"{move.key} stays at {_amount(f'{move.best:.4g}', move.unit)} ({move.evidence}, no range stated)"
    # reaching lies above the low flip and below the high one when the best estimate reaches, else outside them
    inward = move.best_reaches
    limits = []
    if np.isfinite(move.flip_low):
        limits.append(f"{'at least' if inward else 'at most'} {beyond(move.flip_low, up=inward)}")
    if np.isfinite(move.flip_high):
        limits.append(f"{'at most' if inward else 'at least'} {beyond(move.flip_high, up=not inward)}")
    if not limits:
        return f"{move.key} ({move.evidence})"
    return f"{move.key} {_amount((' and ' if inward else ' or ').join(limits), move.unit)} ({move.evidence})"
