"""The verdict table (layer 7): requirements first, then each input moved alone over its range, capped by evidence.

1. a requirement failed at all permitted points        -> no-go, requirement failed (all failures listed)
2. a requirement unknown                               -> not decidable on this evidence, unless every advantage is
                                                          below M: then no measurement of it can help, and 3 holds
3. every input moved alone: all advantages >= M        -> go
                            all < M                    -> no-go, not better
   straddling, best estimate >= M, and every straddling input of a conditional class
                                                       -> conditional go, inputs and values named
   otherwise                                           -> not decidable, naming what to measure
4. evidence caps the word: an input without a range that moves the result counts as decisive.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from benchmark.catalogue import EVIDENCE, QUANTITIES
from benchmark.circuits.library import BUILT_IN
from benchmark.decide.compare import Comparison, Outcome
from benchmark.decide.assess import RequirementResult
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.side import values_by_key
from benchmark.sets.study import NodePair, Study
from benchmark.sets.values import Value
from benchmark.units import from_si, parse_unit

__all__ = ["WORDS", "InputMove", "Verdict", "judge", "move_inputs"]

WORDS = (
    "go",
    "conditional go",
    "no-go, requirement failed",
    "no-go, not better",
    "not decidable on this evidence",
)
#: relative step by which an input without a range is moved to see whether it matters at all
PROBE = 0.01
#: a smaller relative change of the advantage than this counts as none
NO_EFFECT = 1.0e-9


@dataclass(frozen=True)
class InputMove:
    """One input moved alone. Advantages are nan where a side becomes infeasible.

    ``best``, ``low``, ``high``: in the catalogue's unit (nan when no range is stated), so that a respelled unit in
    a file changes nothing. ``flip``: value at which the advantage equals M; nan when it does not straddle.
    """

    key: str
    name: str
    unit: str
    evidence: str
    best: float
    low: float
    high: float
    advantage_low: float
    advantage_high: float
    ranged: bool
    straddles: bool
    matters: bool
    best_reaches: bool
    flip: float = float("nan")

    @property
    def decisive(self) -> bool:
        """Straddles M over its range, or moves the result and has no range."""
        return self.straddles or (not self.ranged and self.matters)


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


def _probe(value: Value) -> float | None:
    """SI value to which an input without range is moved, or None when it cannot be moved."""
    si = float(value.si[0])
    quantity = QUANTITIES[value.name]
    if si == 0.0 or EVIDENCE.get(value.evidence, EVIDENCE["assumed"]).support == "go":
        return None
    if quantity.domain == "count":
        return si + 1.0
    # a share is moved down: above it may lie a limit of its own (data of a register rise at most every other cycle)
    return si * (1.0 - PROBE if quantity.domain in ("fraction", "share") else 1.0 + PROBE)


def _moves_of(values: Mapping[str, Value], shaping: tuple[str, ...]) -> list[tuple[str, float, float]]:
    """List what is moved; counts that shape the netlist stay, for another netlist is another study."""
    moves: list[tuple[str, float, float]] = []
    for key, value in values.items():
        if value.name in shaping:
            continue
        best = float(value.si[0])
        if value.spread is not None:
            moves += [(key, best, float(value.spread.low[0])), (key, best, float(value.spread.high[0]))]
        else:
            probe = _probe(value)
            if probe is not None:
                moves.append((key, best, probe))
    return moves


def move_inputs(
    study: Study, pair: NodePair, policy: str, frozen: Mapping[str, tuple[float, float]]
) -> tuple[Outcome, list[InputMove]]:
    """Move every input alone over its range, both sides re-optimised in each row (frozen choices kept)."""
    values = values_by_key(study, pair)
    circuit = BUILT_IN.get(study.circuit)
    moves = _moves_of(values, circuit.whole if circuit else ())
    outcome = Comparison(study, pair, Batch.one_at_a_time(moves), frozen=frozen).outcome(policy)
    best = float(outcome.advantage[0])
    rows: dict[str, list[int]] = {}
    for row, (key, _, _) in enumerate(moves, start=1):
        rows.setdefault(key, []).append(row)
    found = []
    for key, positions in rows.items():
        value = values[key]
        advantages = [float(outcome.advantage[row]) for row in positions]
        ranged = value.spread is not None
        changed = any(not (abs(a / best - 1.0) <= NO_EFFECT) for a in advantages)
        unit = parse_unit(QUANTITIES[value.name].unit)
        low = from_si(float(value.spread.low[0]), unit) if value.spread else float("nan")
        high = from_si(float(value.spread.high[0]), unit) if value.spread else float("nan")
        sides = {_reaches(a, study.required_advantage) for a in [best, *advantages]}
        found.append(
            InputMove(
                key,
                value.name,
                unit.text,
                value.evidence,
                from_si(float(value.si[0]), unit),
                low,
                high,
                advantages[0],
                advantages[-1],
                ranged,
                ranged and len(sides) > 1,
                changed,
                _reaches(best, study.required_advantage),
            )
        )
    return outcome, found


def _reaches(advantage: float, required: float) -> bool:
    return bool(advantage >= required)  # nan (infeasible) does not reach


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
    if outcome.strongest[0] < 0:
        unknown.append("no contender meets the hard requirements, so there is nothing to compare with")
    if unknown and np.isfinite(best) and all(not _reaches(a, required) for a in [best, *advantages]):
        # nothing that could be learnt about the unknown requirement can turn this into a go
        aside = tuple(f"not settled, and cannot change the answer: {text}" for text in unknown)
        return Verdict(WORDS[3], (*shortfall, *aside), **common)
    if unknown:
        return Verdict(WORDS[4], tuple(unknown), measure_next=tuple(unknown), **common)
    return _by_ranges(study, best, moves, shortfall, common)


def _failures(outcome: Outcome, requirements: Sequence[RequirementResult]) -> list[str]:
    """Every failed requirement; when the candidate has no permitted point, also why."""
    failed = [_failure(result) for result in requirements if result.state == "fail"]
    if not outcome.candidate.found[0]:
        failed.append(outcome.candidate.why or "no permitted point meets all hard requirements together")
    return failed


def _set_aside(relaxed: Outcome | None, required: float) -> list[str]:
    """What the advantage would be without the hard requirements."""
    if relaxed is None or not np.isfinite(relaxed.advantage[0]):
        return []
    advantage = float(relaxed.advantage[0])
    word = "below" if advantage < required else "at or above"
    return [
        f"with the hard requirements set aside the advantage would be {advantage:.4g}, {word} the required {required:g}"
    ]


def _failure(result: RequirementResult) -> str:
    text = f"requirement {result.name} failed (margin {result.margin:.3g}, needs 1)"
    if result.kind == "report" and result.passes_somewhere and np.isfinite(result.margin):
        text += "; other permitted points meet it: make it hard to bound the search"
    return text


def _shortfall(outcome: Outcome, required: float) -> list[str]:
    advantage = float(outcome.advantage[0])
    if np.isfinite(advantage) and advantage < required:
        return [f"advantage {advantage:.4g} is below the required {required:g}"]
    return []


def _by_ranges(
    study: Study, best: float, moves: Sequence[InputMove], shortfall: Sequence[str], common: Mapping[str, Any]
) -> Verdict:
    required = study.required_advantage
    straddling = [move for move in moves if move.straddles]
    reaches = best >= required
    decisive = [move for move in moves if move.decisive]
    if not straddling and not reaches:
        return Verdict(WORDS[3], tuple(shortfall), **common)
    refused = study.invented_inputs == "refuse"
    supports = {move.key: _support(move.evidence, refused) for move in decisive}
    weak = [move for move in decisive if supports[move.key] == "none"]
    conditional = [move for move in decisive if supports[move.key] == "conditional"]
    if not straddling:
        if weak:
            names = tuple(f"{move.key} ({move.evidence}, no range stated)" for move in weak)
            return Verdict(WORDS[4], ("decisive inputs are judgement without a range",), measure_next=names, **common)
        if conditional:
            return Verdict(
                WORDS[1],
                (f"advantage at least {required:g} over every stated range",),
                conditions=tuple(_condition(move) for move in conditional),
                **common,
            )
        return Verdict(
            WORDS[0], (f"advantage at least {required:g} for every input moved alone over its range",), **common
        )
    if reaches and not weak and all(supports[move.key] == "conditional" for move in straddling):
        return Verdict(
            WORDS[1],
            (f"best estimate reaches {required:g}; the inputs named must hold",),
            conditions=tuple(_condition(move) for move in [*straddling, *(m for m in conditional if not m.straddles)]),
            **common,
        )
    names = tuple(_condition(move) for move in sorted(straddling, key=_swing, reverse=True))
    reason = f"{len(straddling)} input(s) moved alone over the stated range cross the required advantage"
    return Verdict(WORDS[4], (reason, *shortfall), measure_next=names, **common)


def _support(evidence: str, refuse_invented: bool) -> str:
    support = EVIDENCE[evidence].support if evidence in EVIDENCE else "none"
    if support == "demonstration":
        return "none" if refuse_invented else "conditional"
    return support


def _swing(move: InputMove) -> float:
    if not (np.isfinite(move.advantage_low) and np.isfinite(move.advantage_high)):
        return float("inf")
    return abs(float(np.log(move.advantage_high / move.advantage_low)))


def _amount(number: float, unit: str) -> str:
    return f"{number:.4g}" if unit == "1" else f"{number:.4g} {unit}"


def _condition(move: InputMove) -> str:
    if not move.ranged:
        return f"{move.key} stays at {_amount(move.best, move.unit)} ({move.evidence}, no range stated)"
    if not np.isfinite(move.flip):
        return f"{move.key} ({move.evidence})"
    rises = not _reaches(move.advantage_low, 1e-300) or move.advantage_high > move.advantage_low
    word = "at least" if rises else "at most"
    return f"{move.key} {word} {_amount(move.flip, move.unit)} ({move.evidence})"
