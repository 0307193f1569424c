"""Opportunity map: where the candidate would be worth it, over the deadline and the activity or the duty (layer 7).

At every point both sides are optimised anew and the advantage is taken against the strongest contender there. The
boundary of a level consists of exact crossings: along the second axis at every deadline, and along the deadline at
every value of the second axis. Where a contender drops out the advantage jumps over a level; such places bound a region
too and are kept apart. Boxes of product classes are usual figures, common practice, no source.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from benchmark.catalogue.product_boxes import PRODUCT_BOXES
from benchmark.decide.axes import DEADLINE, Axis, find_axis, known_axes
from benchmark.decide.profile import Crossing, Line, profiles
from benchmark.decide.trials import Trials
from benchmark.errors import UsageError

__all__ = ["MAP_COLUMNS", "ClassBox", "OpportunityMap", "contours", "map_rows", "opportunity_map"]

Array = NDArray[np.float64]
#: columns of the rows, in order
MAP_COLUMNS = (
    "kind",
    "deadline_s",
    "with",
    "value",
    "advantage",
    "level",
    "strongest",
    "meets_requirements",
    "state",
    "product_class",
    "deadline_to_s",
    "value_to",
)
#: levels of every map, beside the required advantage
CONTOURS = (0.5, 1.0, 10.0)
#: what the second axis of a map is called -> name of the axis
SECOND = {"activity": "activity", "duty": "awake_share"}


@dataclass(frozen=True)
class ClassBox:
    """Usual place of a product class on a map: deadlines [s] and values of the second axis, low and high."""

    name: str
    deadline: tuple[float, float]
    value: tuple[float, float]
    origin: str


@dataclass(frozen=True)
class OpportunityMap:
    """Advantages over (value of the second axis, deadline); nan where ``states`` says who has no permitted point.

    ``boundary``: level -> (deadline, value) of every crossing found. ``jumps``: the same where the advantage jumps over
    the level without taking it, because a contender or a better design point ceases to be permitted. ``today``:
    deadline, value and advantage of the study itself.
    """

    deadline: Axis
    second: Axis
    deadlines: tuple[float, ...]
    values: tuple[float, ...]
    advantage: Array
    strongest: tuple[tuple[str, ...], ...]
    meets: NDArray[np.bool_]
    states: tuple[tuple[str, ...], ...]
    boundary: dict[float, tuple[tuple[float, float], ...]]
    jumps: dict[float, tuple[tuple[float, float], ...]]
    boxes: tuple[ClassBox, ...]
    today: tuple[float, float, float]


def opportunity_map(trials: Trials, kind: str, levels: tuple[float, ...] = (), count: int = 13) -> OpportunityMap:
    """Evaluate the map.

    Parameters
    ----------
    trials : Trials
    kind : "activity" or "duty"
        Second axis: rising transitions per cycle, or the share of the time in which the block is clocked.
    levels : tuple of float
        Levels of the boundary; by default 0.5, 1, the required advantage and 10.
    count : int
        Values of each axis.

    Raises
    ------
    UsageError
        When the study has no deadline to move, or no such second axis.
    """
    if kind not in SECOND:
        message = f"a map over {kind!r} is not known; known are {', '.join(SECOND)}"
        raise UsageError(message)
    known = known_axes(trials)
    if DEADLINE not in known:
        message = "a map needs a clocked study, or a required time that is one number"
        raise UsageError(message)
    if SECOND[kind] not in known and f"study.{SECOND[kind]}" not in known:
        wanted = "an idle scheme with idle_time, active_cycles and a clock" if kind == "duty" else "activity"
        message = f"a map over {kind} needs a study that states {wanted}"
        raise UsageError(message)
    deadline, second = known[DEADLINE], find_axis(trials, SECOND[kind])
    wanted_levels = levels or contours(trials.study.required_advantage)
    across, along = deadline.grid(count), second.grid(count)
    up = profiles(trials, [Line(second, {deadline: float(x)}) for x in across], wanted_levels, count, name_edges=False)
    over = profiles(trials, [Line(deadline, {second: float(y)}) for y in along], wanted_levels, count, name_edges=False)
    answers = trials([Line(deadline, {second: float(y)}).trial(float(x)) for y in along for x in across])
    size = (len(along), len(across))
    names = [answers.names[position] if position >= 0 else "" for position in answers.strongest]
    states = [answers.state(row) for row in range(len(names))]
    crossed = [
        ((float(x), crossing.x), crossing) for x, line in zip(across, up, strict=True) for crossing in line.crossings
    ]
    crossed += [
        ((crossing.x, float(y)), crossing) for y, line in zip(along, over, strict=True) for crossing in line.crossings
    ]
    return OpportunityMap(
        deadline,
        second,
        tuple(map(float, across)),
        tuple(map(float, along)),
        answers.advantage.reshape(size),
        _rows(names, size[1]),
        answers.meets.reshape(size),
        _rows(states, size[1]),
        _places(crossed, wanted_levels, "root"),
        _places(crossed, wanted_levels, "jump"),
        _boxes(kind),
        (deadline.best, second.best, float(trials.best.advantage[0])),
    )


def contours(required: float) -> tuple[float, ...]:
    """Return the levels of a map, in order, each once."""
    return tuple(sorted({*CONTOURS, required}))


def _places(
    crossed: Sequence[tuple[tuple[float, float], Crossing]], levels: Sequence[float], kind: str
) -> dict[float, tuple[tuple[float, float], ...]]:
    """Return the places of the crossings of one kind, level by level."""
    return {
        level: tuple(sorted(place for place, found in crossed if found.level == level and found.kind == kind))
        for level in levels
    }


def _rows(texts: list[str], width: int) -> tuple[tuple[str, ...], ...]:
    return tuple(tuple(texts[start : start + width]) for start in range(0, len(texts), width))


def _boxes(kind: str) -> tuple[ClassBox, ...]:
    found = []
    for name, box in PRODUCT_BOXES.items():
        value = box.activity if kind == "activity" else box.duty
        found.append(ClassBox(name, box.cycle, value, box.origin))
    return tuple(found)


def map_rows(found: OpportunityMap) -> list[dict[str, Any]]:
    """Return rows ready for drawing: kind "today", "point", "boundary", "jump" or "class"."""

    def row(kind: str, deadline: float, value: float, **more: Any) -> dict[str, Any]:
        blank = dict.fromkeys(MAP_COLUMNS, "")
        return blank | {"kind": kind, "deadline_s": deadline, "with": found.second.name, "value": value} | more

    rows = [row("today", found.today[0], found.today[1], advantage=found.today[2])]
    for k, y in enumerate(found.values):
        rows += [
            row(
                "point",
                x,
                y,
                advantage=float(found.advantage[k, i]),
                strongest=found.strongest[k][i],
                meets_requirements="yes" if found.meets[k, i] else "no",
                state=found.states[k][i],
            )
            for i, x in enumerate(found.deadlines)
        ]
    for level, points in found.boundary.items():
        rows += [row("boundary", x, y, advantage=level, level=level) for x, y in points]
    for level, points in found.jumps.items():
        rows += [row("jump", x, y, level=level, state="the advantage jumps over the level") for x, y in points]
    for box in found.boxes:
        rows.append(
            row(
                "class",
                box.deadline[0],
                box.value[0],
                product_class=box.name,
                deadline_to_s=box.deadline[1],
                value_to=box.value[1],
                state=box.origin,
            )
        )
    return rows
