"""A joint specification sheet in words and as rows (layer 7)."""

from __future__ import annotations

from typing import Any

import numpy as np

from benchmark.decide.axes import Axis
from benchmark.decide.joint_sheet import JointSheet, Moved
from benchmark.sets.values import Value
from benchmark.units import from_si, parse_unit

__all__ = ["JOINT_COLUMNS", "joint_facts", "joint_rows", "spread_text"]

#: columns of the rows, in order; values in the unit of the row
JOINT_COLUMNS = (
    "name",
    "unit",
    "evidence",
    "today",
    "required",
    "spread_today",
    "required_at_probability",
    "spread_at_probability",
    "low_at_probability",
    "high_at_probability",
    "steps",
    "steps_at_probability",
    "probability",
    "probability_today",
    "probability_reached",
    "probability_error",
    "advantage_with_it",
)


def spread_text(value: Value, axis: Axis, digits: int = 12) -> str:
    """Return the spread as a file states it, in the unit of the axis."""
    spread = value.spread
    if spread is None:
        return ""
    if spread.shape == "lognormal" and spread.scale is not None:
        return f"lognormal, ln_sd = {float(spread.scale[0]):.{digits}g}"
    if spread.shape == "normal" and spread.scale is not None:
        best = float(value.si[0])
        return f"normal, sd = {axis.shown(best + float(spread.scale[0])) - axis.shown(best):.{digits}g}"
    low, high = axis.shown(float(spread.low[0])), axis.shown(float(spread.high[0]))
    return f"{spread.shape}, low = {low:.{digits}g}, high = {high:.{digits}g}"


def joint_rows(sheet: JointSheet) -> list[dict[str, Any]]:
    """Return one row per parameter of the sheet; nan where the level is not reached."""
    nan = float("nan")
    rows = []
    for item in sheet.moved:
        axis = item.axis
        plain = None if np.isnan(sheet.steps) else item.at(sheet.steps)
        drawn = None if np.isnan(sheet.steps_drawn) else item.at(sheet.steps_drawn)
        spread = None if drawn is None else drawn.spread
        row = {
            "name": axis.name,
            "unit": axis.unit,
            "evidence": item.value.evidence,
            "today": axis.shown(axis.best),
            "required": nan if plain is None else axis.shown(float(plain.si[0])),
            "spread_today": spread_text(item.value, axis),
            "required_at_probability": nan if drawn is None else axis.shown(float(drawn.si[0])),
            "spread_at_probability": "" if drawn is None else spread_text(drawn, axis),
            "low_at_probability": nan if spread is None else axis.shown(float(spread.low[0])),
            "high_at_probability": nan if spread is None else axis.shown(float(spread.high[0])),
            "steps": sheet.steps * item.towards,
            "steps_at_probability": sheet.steps_drawn * item.towards,
            "probability": nan if sheet.probability is None else sheet.probability,
            "probability_today": sheet.today,
            "probability_reached": sheet.reached,
            "probability_error": sheet.error,
            "advantage_with_it": sheet.advantage if sheet.probability is not None else sheet.level,
        }
        rows.append({column: row[column] for column in JOINT_COLUMNS})
    return rows


def joint_facts(sheet: JointSheet) -> list[tuple[str, str]]:
    """Return the sheet as sentences: the rule, what it takes, every value with its spread, what follows."""
    rule = (
        "one standard deviation of a value counts as hard as halving its spread; every value goes the same number of "
        "such steps towards what helps the candidate"
    )
    facts = [("rule", rule), ("best estimates alone", _plain_text(sheet))]
    if sheet.probability is not None:
        facts.append((f"with probability {sheet.probability:g}", _drawn_text(sheet)))
    return facts + [(item.axis.name, _value_text(sheet, item)) for item in sheet.moved] + _follows_text(sheet)


def _steps_text(steps: float) -> str:
    if steps < 0.0:
        return f"{-steps:.4g} steps may be given up"
    return f"{steps:.4g} steps are needed"


def _span_text(sheet: JointSheet) -> str:
    low, high = sheet.span
    return f"between {low:g} and {high:g} steps"


def _plain_text(sheet: JointSheet) -> str:
    if np.isnan(sheet.steps):
        return f"{sheet.level:.4g} is not met {_span_text(sheet)} (today {sheet.best:.4g})"
    return f"{sheet.level:.4g} is met exactly where {_steps_text(sheet.steps)} (today {sheet.best:.4g})"


def _drawn_text(sheet: JointSheet) -> str:
    today = f"today {sheet.today:.4g}, error {sheet.error:.2g} with {sheet.draws} draws"
    if np.isnan(sheet.steps_drawn):
        return f"not reached {_span_text(sheet)}; {today}"
    return (
        f"{_steps_text(sheet.steps_drawn)}: probability {sheet.reached:.4g} ({today}); the best estimates of the sheet "
        f"give {sheet.advantage:.4g}"
    )


def _value_text(sheet: JointSheet, item: Moved) -> str:
    axis = item.axis
    parts = [f"today {axis.text(axis.best)}, {spread_text(item.value, axis, 4)}"]
    if not np.isnan(sheet.steps):
        parts.append(f"best estimates alone: {axis.text(float(item.at(sheet.steps).si[0]))}")
    if not np.isnan(sheet.steps_drawn):
        value = item.at(sheet.steps_drawn)
        parts.append(f"with the probability: {axis.text(float(value.si[0]), 12)}, {spread_text(value, axis)}")
    return "; ".join(parts)


def _follows_text(sheet: JointSheet) -> list[tuple[str, str]]:
    """Say which derived values follow, as the file has to state them."""
    return [
        (key, f"follows by its formula: {from_si(number, parse_unit(unit)):.12g}" + ("" if unit == "1" else f" {unit}"))
        for key, unit, number in sheet.follows
    ]
