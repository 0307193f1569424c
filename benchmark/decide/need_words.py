"""Break-even and required values in words and as rows (layer 7)."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np

from benchmark.decide.axes import Axis, deviations
from benchmark.decide.break_even import CUT, Need
from benchmark.decide.profile import Crossing

__all__ = ["NEED_COLUMNS", "need_rows", "need_text", "range_text", "who_wins"]

#: columns of the rows, in order; values in the unit of the axis
NEED_COLUMNS = (
    "name",
    "unit",
    "today",
    "advantage_today",
    "level",
    "answer",
    "value",
    "factor",
    "difference",
    "standard_deviations",
    "advantage_at_or_above_level",
    "meets_requirements",
    "low",
    "high",
    "range",
    "advantage_from",
    "advantage_to",
    "evidence",
    "words",
)


def _level(level: float) -> str:
    return "break-even (advantage 1)" if level == 1.0 else f"advantage {level:.4g}"


def who_wins(crossing: Crossing, better: str = "below", worse: str = "above") -> str:
    """Say on which side of a crossing the candidate is the better one."""
    side = better if crossing.above_below else worse
    if crossing.level == 1.0:
        return f"the candidate is better {side}"
    return f"{crossing.level:.4g} or more {side}"


def _distance(axis: Axis, x: float) -> str:
    """Distance from today's value: factor, difference, standard deviations."""
    parts = []
    if axis.best > 0.0 and x > 0.0 and axis.unit != "degC":
        parts.append(f"{x / axis.best:.4g} times today's {axis.text(axis.best)}")
    else:
        parts.append(f"today {axis.text(axis.best)}")
    difference = axis.shown(x) - axis.shown(axis.best)
    parts.append(f"{difference:+.4g}" + ("" if axis.unit == "1" else f" {axis.unit}"))
    sigmas = deviations(axis.value, x)
    if np.isfinite(sigmas):
        parts.append(f"{sigmas:+.3g} standard deviations of its range")
    return ", ".join(parts)


def range_text(axis: Axis) -> str:
    """Say what the plausible range is and where it comes from."""
    return f"{axis.text(axis.low)} to {axis.text(axis.high)} ({axis.origin})"


def _crossing_text(need: Need, crossing: Crossing) -> str:
    axis = need.axis
    text = f"{axis.text(crossing.x)} ({_distance(axis, crossing.x)}): {who_wins(crossing)}"
    if axis.domain == "count":
        text += f"; whole numbers next to it: {int(np.floor(crossing.x))} and {int(np.floor(crossing.x)) + 1}"
    if crossing.kind == "jump":
        return f"no root but a jump at {text}; {crossing.why}"
    if np.isclose(crossing.x, axis.low, rtol=1e-9, atol=0.0) or np.isclose(crossing.x, axis.high, rtol=1e-9, atol=0.0):
        text += "; on a bound of the range"
    return text if crossing.meets else f"{text}; a listed requirement is missed there"


def _answer(need: Need) -> str:
    axis, level = need.axis, _level(need.level)
    over = range_text(axis)
    if need.kind in ("crossings", "beyond"):
        listed = "; and ".join(_crossing_text(need, crossing) for crossing in need.crossings)
        where = "" if need.kind == "crossings" else f", beyond the plausible range {over}"
        return f"{level} at {listed}{where}"
    if need.kind == "undefined":
        return f"{level}: no value of {over} has an advantage: a side has no permitted point"
    if need.kind == "no effect":
        return f"{level}: none; the advantage stays {need.highest:.4g} over {over}"
    bound = f"; on the {need.on_bound} bound of the range it is the level itself" if need.on_bound else ""
    if need.kind == "always":
        word = "the candidate is always better" if need.level == 1.0 else "always reached"
        return f"{level}: none in the plausible range {over}: {word} (least advantage {need.lowest:.4g}){bound}"
    if need.reach is None:
        word = "the reference is always better" if need.level == 1.0 else "never reached"
        return f"{level}: none in the plausible range {over}: {word} (largest advantage {need.highest:.4g}){bound}"
    reach = need.reach
    limited = f", limited by {reach.limit}" if reach.limit else ""
    if reach.end in ("inside the range", "on the way"):
        return f"{level}: unreachable: the largest advantage is {reach.advantage:.4g}, at {axis.text(reach.x)}{limited}"
    if reach.end == CUT:
        return (
            f"{level}: unreachable: the largest advantage is {reach.advantage:.4g}, at {axis.text(reach.x)}, {CUT}"
            f"{limited}"
        )
    open_end = "" if reach.settled else ", where it still changes"
    return (
        f"{level}: unreachable: even at the ideal limit ({reach.end}{open_end}) the advantage is "
        f"{reach.advantage:.4g}{limited}{bound}"
    )


def need_text(*needs: Need) -> str:
    """Return the answers for one axis, one or several levels, as sentences; what cuts the axis is said once."""
    parts = [_answer(need) for need in needs]
    for edge in needs[0].edges:
        side = "above" if edge.defined_below else "below"
        why = edge.why or "a side has no permitted point"
        parts.append(f"No advantage {side} {needs[0].axis.text(edge.x)} ({why})")
    return ". ".join(text[0].upper() + text[1:] for text in parts)


def _stretch(need: Need) -> tuple[float, float]:
    """Return the ends of the plausible range, drawn in to where both sides still have a permitted point."""
    if need.kind == "undefined":
        return float("nan"), float("nan")
    low = max([edge.x for edge in need.edges if not edge.defined_below], default=need.axis.low)
    high = min([edge.x for edge in need.edges if edge.defined_below], default=need.axis.high)
    # a gap in the middle: the words say it
    return (low, high) if low <= high else (need.axis.low, need.axis.high)


def _row(need: Need, crossing: Crossing | None) -> dict[str, Any]:
    axis = need.axis
    start, end = _stretch(need)
    x = float("nan") if crossing is None else crossing.x
    value = axis.shown(x)
    positive = crossing is not None and axis.best > 0.0 and x > 0.0 and axis.unit != "degC"
    row = {
        "name": axis.name,
        "unit": axis.unit,
        "today": axis.shown(axis.best),
        "advantage_today": need.today,
        "level": need.level,
        "answer": need.kind if crossing is None or crossing.kind == "root" else "jump",
        "value": value,
        "factor": x / axis.best if positive else float("nan"),
        "difference": value - axis.shown(axis.best),
        "standard_deviations": float("nan") if crossing is None else deviations(axis.value, x),
        "advantage_at_or_above_level": "" if crossing is None else ("below" if crossing.above_below else "above"),
        "meets_requirements": "" if crossing is None else ("yes" if crossing.meets else "no"),
        "low": axis.shown(axis.low),
        "high": axis.shown(axis.high),
        "range": axis.origin,
        "advantage_from": axis.shown(start),
        "advantage_to": axis.shown(end),
        "evidence": "" if axis.value is None else axis.value.evidence,
        "words": need_text(need),
    }
    return {column: row[column] for column in NEED_COLUMNS}


def need_rows(needs: Iterable[Need]) -> list[dict[str, Any]]:
    """Return one row per crossing, and one for an answer without crossings."""
    rows = []
    for need in needs:
        listed: Sequence[Crossing | None] = need.crossings or (None,)
        rows += [_row(need, crossing) for crossing in listed]
    return rows
