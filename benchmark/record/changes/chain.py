"""From the changed inputs to the result: what lies between, before and after (layer 8).

Three columns for the candidate's design point under the primary policy: before, the new inputs at the old supply and
choices, and after the search has been made again.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Iterator
from typing import Any

import numpy as np

from benchmark.decide.compare import Comparison, choice_of
from benchmark.devices.record import Switch
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.points import Points, design_points
from benchmark.evaluate.side import SideProblem
from benchmark.record.results import point_row
from benchmark.sets.study import Choice, Study

__all__ = ["causal_chain"]

#: of the switch record: field -> words, unit
_SWITCH = {
    "resistance": ("closed-switch resistance", "ohm"),
    "on_current": ("on-state current", "A"),
    "off_current_path": ("off-state current of the path", "A"),
    "input_capacitance_delay": ("input capacitance in the switching window", "F"),
    "terminal_capacitance_delay": ("terminal capacitance in the switching window", "F"),
    "input_charge": ("input charge over the full swing", "C"),
    "closing_time": ("closing time", "s"),
    "opening_time": ("opening time", "s"),
}
Numbers = dict[str, tuple[float, str, str]]


@dataclasses.dataclass(frozen=True)
class _Best:
    problem: SideProblem
    supply: float
    choice: Choice
    advantage: float


def _best(study: Study) -> _Best | None:
    comparison = Comparison(study, study.pair(study.headline), Batch.best_estimate())
    outcome = comparison.outcome(study.policy.primary)
    side = outcome.candidate
    if not side.found[0]:
        return None
    return _Best(comparison.candidate.problem, float(side.supply[0]), choice_of(side), float(outcome.advantage[0]))


def causal_chain(old: Study, new: Study) -> list[dict[str, Any]]:
    """Return what lies between inputs and result of the candidate, in the order of cause and effect.

    Returns
    -------
    list of dict
        ``stage`` (supply, device, time, energy, limits, result), ``quantity``, ``unit``, ``before``,
        ``at_old_supply``, ``after``; None where there is no number. Empty when neither study has a permitted point.
    """
    before, after = _best(old), _best(new)
    columns: list[Numbers] = [
        _numbers(before, before.supply, before.choice, before.advantage) if before else {},
        _numbers_new(new, before),
        _numbers(after, after.supply, after.choice, after.advantage) if after else {},
    ]
    rows = []
    for name in dict.fromkeys(name for column in columns for name in column):
        _, unit, stage = next(column[name] for column in columns if name in column)
        ends = [column[name][0] if name in column else None for column in columns]
        rows.append(
            {"stage": stage, "quantity": name, "unit": unit}
            | dict(zip(("before", "at_old_supply", "after"), ends, strict=True))
        )
    order = ("supply", "device", "time", "energy", "limits", "result")
    return sorted(rows, key=lambda row: order.index(str(row["stage"])))


def _numbers_new(new: Study, before: _Best | None) -> Numbers:
    """The new study at the old point, where its choices still exist."""
    if before is None or before.choice not in new.candidate.choices:
        return {}
    problem = Comparison(new, new.pair(new.headline), Batch.best_estimate()).candidate.problem
    return _numbers(dataclasses.replace(before, problem=problem), before.supply, before.choice, None)


def _numbers(best: _Best, supply: float, choice: Choice, advantage: float | None) -> Numbers:
    problem = best.problem
    points = design_points(problem, np.array([[supply]]), *choice)
    found = dict(_device(problem, supply, choice, points))
    found |= _of_point(points)
    if advantage is not None:
        found["advantage"] = (advantage, "1", "result")
    return {name: item for name, item in found.items() if np.isfinite(item[0])}


def _device(
    problem: SideProblem, supply: float, choice: Choice, points: Points
) -> Iterator[tuple[str, tuple[float, str, str]]]:
    """The pull-down switch at the slowest temperature, one unit wide."""
    kelvin = problem.study.temperatures[int(points.slowest_temperature[0, 0])]
    shift = problem.device_shift(choice.threshold_shift, choice.back_bias)
    switch: Switch = problem.switches(np.array([[supply]]), shift, (kelvin,)).down
    for name, (array, unit) in switch.intermediates.items():
        yield name, (_first(array), unit, "device")
    for name, (words, unit) in _SWITCH.items():
        yield words, (_first(getattr(switch, name)), unit, "device")


def _first(array: Any) -> float:
    return float(np.ravel(array)[0])


def _of_point(points: Points) -> Numbers:
    row = point_row(points)
    found: Numbers = {"supply": (row["supply"], "V", "supply")}
    found |= {f"time: {name}": (part, "s", "time") for name, part in row["time_parts"].items()}
    found |= {f"share of time: {name}": (part, "1", "time") for name, part in row["delay_shares"].items()}
    found["time of one operation"] = (row["time"], "s", "time")
    found["cycle"] = (row["cycle"], "s", "time")
    found |= {f"energy: {name}": (part, "J", "energy") for name, part in row["energy_parts"].items()}
    found |= {f"share of energy: {name}": (part, "1", "energy") for name, part in row["energy_shares"].items()}
    found["leakage power"] = (row["leakage_power"], "W", "energy")
    found["energy of one operation"] = (row["energy"], "J", "energy")
    found |= {f"margin: {name}": (margin, "1", "limits") for name, margin in row["device_margins"].items()}
    return found
