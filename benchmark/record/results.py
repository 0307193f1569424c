"""Results as plain numbers and words for the record (layer 8)."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from benchmark.decide.assess import RequirementResult
from benchmark.decide.compare import Outcome, SideOutcome
from benchmark.decide.curves import Envelope, Swept
from benchmark.decide.error_bands import AdvantageBand, SideBand
from benchmark.decide.limiting import DELAY_GROUPS, ENERGY_GROUPS, groups_of, limiting
from benchmark.decide.moves import InputMove
from benchmark.decide.verdict import Verdict
from benchmark.evaluate.points import Points

__all__ = [
    "clean",
    "envelope_rows",
    "error_band_row",
    "outcome_row",
    "point_row",
    "requirement_rows",
    "swept_rows",
    "verdict_row",
]


def clean(value: Any) -> Any:
    """Make a value fit for JSON: numpy numbers become Python numbers, nan and infinity become words."""
    if isinstance(value, dict):
        return {str(key): clean(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [clean(item) for item in value]
    if isinstance(value, np.ndarray):
        return clean(value.tolist())
    if isinstance(value, (np.bool_, bool)):
        return bool(value)
    if isinstance(value, (np.integer, int)):
        return int(value)
    if isinstance(value, (np.floating, float)):
        number = float(value)
        if math.isnan(number):
            return None
        return number if math.isfinite(number) else ("infinite" if number > 0 else "-infinite")
    return value


def _cell(array: Any, row: int, column: int) -> float:
    return float(np.broadcast_to(array, (max(row + 1, array.shape[0]), array.shape[1]))[row, column])


def point_row(points: Points, row: int = 0, column: int = 0) -> dict[str, Any]:
    """Everything about one design point."""
    shares = limiting(points, row, column)
    return {
        "supply": _cell(points.supply, row, column),
        "size": points.size,
        "threshold_shift": points.threshold_shift,
        "copies": points.copies,
        "back_bias": _cell(points.back_bias, row, column),
        "gated": bool(_cell(points.gated, row, column)),
        "time": _cell(points.time, row, column),
        "cycle": _cell(points.cycle, row, column),
        "energy": _cell(points.energy, row, column),
        "leakage_power": _cell(points.leakage_power, row, column),
        "area": _cell(points.area, row, column),
        "power_density": _cell(points.power_density, row, column),
        "time_parts": {k: _cell(v, row, column) for k, v in groups_of(points.time_parts, DELAY_GROUPS).items()},
        "energy_parts": {k: _cell(v, row, column) for k, v in groups_of(points.energy_parts, ENERGY_GROUPS).items()},
        "delay_shares": dict(shares.delay_shares),
        "energy_shares": dict(shares.energy_shares),
        "delay_limit": shares.delay_limit,
        "energy_limit": shares.energy_limit,
        "device_margins": {k: _cell(v, row, column) for k, v in points.margins.items()},
    }


def side_row(side: SideOutcome) -> dict[str, Any]:
    """One side of an outcome."""
    found = bool(side.found[0])
    row: dict[str, Any] = {"id": side.id, "feasible": found, "why": side.why, "at": "", "point": None}
    if found:
        row["point"] = point_row(side.optimum.points)
        row["at"] = (
            "lower end of the supply range"
            if side.optimum.at_lower[0]
            else "upper end of the supply range"
            if side.optimum.at_upper[0]
            else "where a requirement or limit stops the search"
            if side.optimum.at_limit[0]
            else "inside the supply range"
        )
    return row


def outcome_row(outcome: Outcome, diagnostic: bool) -> dict[str, Any]:
    """One policy."""
    strongest = outcome.strongest_side
    return {
        "policy": outcome.policy,
        "diagnostic": diagnostic,
        "advantage": float(outcome.advantage[0]),
        "strongest": strongest.id if strongest else "",
        "candidate": side_row(outcome.candidate),
        "contenders": [
            {**side_row(side), "advantage": outcome.advantage_over(position)}
            for position, side in enumerate(outcome.contenders)
        ],
    }


def requirement_rows(results: list[RequirementResult]) -> list[dict[str, Any]]:
    """The requirements table."""
    return [
        {
            "name": r.name,
            "kind": r.kind,
            "state": r.state,
            "demanded": r.demanded,
            "offered": r.offered,
            "margin": r.margin,
            "unit": r.unit,
            "meaning": r.meaning,
            "passes_somewhere": r.passes_somewhere,
            "note": r.note,
        }
        for r in results
    ]


def move_row(move: InputMove) -> dict[str, Any]:
    """One input moved alone."""
    return {
        "key": move.key,
        "name": move.name,
        "unit": move.unit,
        "evidence": move.evidence,
        "best": move.best,
        "low": move.low,
        "high": move.high,
        "advantage_low": move.advantage_low,
        "advantage_high": move.advantage_high,
        "ranged": move.ranged,
        "straddles": move.straddles,
        "matters": move.matters,
        "decisive": move.decisive,
        "flip": move.flip,
        "flip_low": move.flip_low,
        "flip_high": move.flip_high,
    }


def verdict_row(verdict: Verdict) -> dict[str, Any]:
    """The verdict, with inputs ordered by how far they move the advantage."""

    def swing(move: InputMove) -> float:
        pair = (move.advantage_low, move.advantage_high)
        if not all(np.isfinite(pair)) or min(pair) <= 0:
            return math.inf
        return abs(math.log(pair[1] / pair[0]))

    moves = sorted((m for m in verdict.moves if m.matters), key=lambda m: (not m.ranged, -swing(m), m.key))
    return {
        "word": verdict.word,
        "reasons": list(verdict.reasons),
        "conditions": list(verdict.conditions),
        "measure_next": list(verdict.measure_next),
        "advantage": verdict.advantage,
        "advantage_low": verdict.advantage_low,
        "advantage_high": verdict.advantage_high,
        "inputs_with_effect": verdict.inputs_with_effect,
        "inputs_without_range": verdict.unranged,
        "inputs_of_judgement": verdict.judgement,
        "moves": [move_row(move) for move in moves],
        "without_effect": sorted(m.key for m in verdict.moves if not m.matters),
    }


def swept_rows(curve: Swept) -> list[dict[str, Any]]:
    """Every grid point of one curve."""
    points = curve.points
    rows = []
    for column in range(points.energy.shape[1]):
        time, energy = _cell(points.time, 0, column), _cell(points.energy, 0, column)
        plottable = math.isfinite(time) and math.isfinite(energy)
        shares = limiting(points, 0, column) if plottable else None
        rows.append(
            {
                "supply": _cell(points.supply, 0, column),
                "time": time if plottable else math.nan,
                "energy": energy if plottable else math.nan,
                "feasible": bool(curve.feasible[column]),
                "reasons": list(curve.reasons[column]),
                "delay_limit": shares.delay_limit if shares else "",
                "energy_limit": shares.energy_limit if shares else "",
            }
        )
    return rows


def envelope_rows(envelope: Envelope) -> list[dict[str, Any]]:
    """Advantage against required time."""
    return [
        {
            "time": float(envelope.time[i]),
            "advantage": float(envelope.advantage[i]),
            "strongest": envelope.strongest[i],
            "candidate_energy": float(envelope.candidate_energy[i]),
            "reference_energy": float(envelope.reference_energy[i]),
        }
        for i in range(envelope.time.size)
    ]


def error_band_row(bands: list[SideBand], advantage: AdvantageBand | None) -> dict[str, Any]:
    """Measured bands of the closed forms at the design points, and what they leave of the advantage."""
    kept = ("side", "role", "quantity", "covered", "points", "over")
    sides = [
        {name: getattr(band, name) for name in kept}
        | {"ratio_low": band.low, "ratio_high": band.high}
        | {"missing": [{"share": share, "why": why} for share, why in band.missing]}
        for band in bands
    ]
    if advantage is None:
        return {"sides": sides, "advantage": None}
    ends = {"advantage_low": advantage.low, "advantage_high": advantage.high, "straddles": advantage.straddles}
    return {"sides": sides, "advantage": ends}
