"""What can be moved to ask where the answer changes: an axis with its plausible range (layer 7).

An axis is any value of any set or of the study by its ledger key, or one of

required_time    the required time of the policy, where it is one number
deadline         time per operation: the clock period of a clocked study, else the required time
temperature      the highest temperature of the study
on_off_ratio     current of the closed over current of the open switch, by moving the open state alone
awake_share      share of the time in which the block is clocked, by moving the idle time

The plausible range is the spread the file states (the open side of a bound), else the usual range of the catalogue,
which catches slips of units and is no evidence; an answer says which of them it rests on.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from decimal import Decimal

import numpy as np
from numpy.typing import NDArray

from benchmark.catalogue import QUANTITIES
from benchmark.circuits.library import BUILT_IN
from benchmark.decide.moves import range_of
from benchmark.decide.trials import REQUIRED_TIME, TEMPERATURE, Trials
from benchmark.errors import UsageError, nearest
from benchmark.sets.study import Study
from benchmark.sets.values import Value
from benchmark.units import from_si, parse_unit, to_si

__all__ = ["DEADLINE", "Axis", "deviations", "find_axis", "known_axes", "usual_axes"]

Array = NDArray[np.float64]
Placing = Callable[[float, Mapping[str, float]], dict[str, float]]
DEADLINE = "deadline"
STATED, OPEN_SIDE, USUAL, ASKED = "stated range", "open side of a bound", "usual range of the catalogue", "as asked for"
#: a range whose ends lie further apart than this factor is scanned on a logarithmic scale
LOGARITHMIC = 4.0
#: values of a study that are asked about when no name is given
_USUAL = (
    "activity",
    "idle_time",
    "line_length",
    "average_net_length",
    "average_net_pitches",
    "fan_out",
    "logic_depth",
    "clock_frequency",
)
_ON_OFF = ("off_resistance", "open_state_current", "off_current")


def _as_it_is(key: str) -> Placing:
    return lambda x, other: {key: x}


@dataclass(frozen=True, eq=False)
class Axis:
    """One thing that is moved. ``best``, ``low``, ``high`` are SI; ``domain`` as in the catalogue.

    ``place(x, other)`` gives the trial for one number, in which ``other`` already holds what else is moved.
    """

    name: str
    meaning: str
    unit: str
    domain: str
    best: float
    low: float
    high: float
    origin: str
    place: Placing
    value: Value | None = None
    #: where a logarithmic scale starts when the range starts at 0
    smallest: float = 0.0
    #: values to be scanned instead of an even grid, ascending
    steps: tuple[float, ...] = ()

    @property
    def logarithmic(self) -> bool:
        """Tell whether the range is scanned on a logarithmic scale."""
        start = self.low if self.low > 0.0 else self.smallest
        return self.domain != "count" and self.low >= 0.0 and start > 0.0 and self.high / start > LOGARITHMIC

    def shown(self, si: float) -> float:
        """Express an SI number in the unit of the axis."""
        return from_si(si, parse_unit(self.unit)) if np.isfinite(si) else si

    def text(self, si: float, digits: int = 4) -> str:
        """Write an SI number in the unit of the axis."""
        number = f"{self.shown(si):.{digits}g}"
        return number if self.unit == "1" else f"{number} {self.unit}"

    def si(self, text: str) -> float:
        """Read a number in the unit of the axis.

        Raises
        ------
        UsageError
            When it is no number, or lies outside the domain of the value.
        """
        try:
            found = to_si(Decimal(text.strip()), parse_unit(self.unit))
        except (ArithmeticError, ValueError) as error:
            message = f"{self.name}: {text.strip()!r} is not a number in {self.unit}"
            raise UsageError(message) from error
        name = self.name.rpartition(".")[2]
        if np.isfinite(found) and (name not in QUANTITIES or QUANTITIES[name].allows(found)):
            return found
        allowed = QUANTITIES[name].domain_text if name in QUANTITIES else "a finite number"
        message = f"{self.name}: {text.strip()} is out of its domain; allowed: {allowed}"
        raise UsageError(message)

    def over(self, low: float, high: float) -> Axis:
        """Return the axis with another range.

        Raises
        ------
        UsageError
            When the range is empty.
        """
        if not low < high:
            message = f"{self.name}: the range needs its low end below its high end, found {low:g} and {high:g} (SI)"
            raise UsageError(message)
        return dataclasses.replace(self, low=low, high=high, origin=ASKED)

    def grid(self, count: int) -> Array:
        """Return ``count`` values over the range, evenly spaced on its scale, and the best estimate among them."""
        if self.steps:
            return np.asarray(self.steps)
        if self.logarithmic:
            start = self.low if self.low > 0.0 else self.smallest
            inner = np.concatenate([[self.low], np.geomspace(start, self.high, count)])
        else:
            inner = np.linspace(self.low, self.high, count)
        inner[0], inner[-1] = self.low, self.high
        best = [self.best] if self.low <= self.best <= self.high else []
        return np.unique(np.concatenate([inner, np.asarray(best, dtype=np.float64)]))


def deviations(value: Value | None, x: float) -> float:
    """Distance of a number from the best estimate in standard deviations of the stated spread; nan without one.

    Normal: in the value. Log-normal and log-uniform: in its logarithm. The standard deviation of a uniform spread is
    its width over sqrt(12), of a triangular one that of the triangle. The open side of a bound counts as log-uniform.
    """
    ends = None if value is None else range_of(value)
    if value is None or ends is None:
        return float("nan")
    best, (low, high) = float(value.si[0]), ends
    shape = value.spread.shape if value.spread is not None else "loguniform"
    if shape in ("lognormal", "loguniform"):
        if not (x > 0.0 and low > 0.0 and best > 0.0):
            return float("nan")
        scale = value.spread.scale if value.spread is not None else None
        deviation = float(np.log(high / low)) / np.sqrt(12.0) if scale is None else float(scale[0])
        distance = float(np.log(x / best))
    else:
        distance = x - best
        if shape == "normal" and value.spread is not None and value.spread.scale is not None:
            deviation = float(value.spread.scale[0])
        elif shape == "triangular":
            squares = low**2 + best**2 + high**2 - low * best - low * high - best * high
            deviation = float(np.sqrt(max(squares, 0.0) / 18.0))
        else:
            deviation = (high - low) / float(np.sqrt(12.0))
    return distance / deviation if deviation > 0.0 else float("nan")


def _from_value(key: str, value: Value) -> Axis:
    quantity = QUANTITIES[value.name]
    unit = parse_unit(quantity.unit)
    best = float(value.si[0])
    stated = range_of(value)
    if stated is not None and stated[0] < stated[1]:
        low, high = stated
        origin = STATED if value.spread is not None else OPEN_SIDE
    else:
        low, high = (to_si(Decimal(repr(end)), unit) for end in (quantity.low, quantity.high))
        if quantity.domain in ("fraction", "share") and high > 1.0:
            high = 1.0
        origin = USUAL
        if not low <= best <= high:
            low, high = min(low, best), max(high, best)
            origin = f"{USUAL}, widened to today's value"
    smallest = max(to_si(Decimal(repr(quantity.low)), unit), 0.0)
    return Axis(
        key, quantity.meaning, quantity.unit, quantity.domain, best, low, high, origin, _as_it_is(key), value, smallest
    )


def _shaping(study: Study) -> set[str]:
    """Names of whole numbers that shape the netlist: another number is another circuit."""
    circuits = {study.circuit, *(study.circuit_of(side)[0] for side in study.sides)}
    return {name for circuit in circuits if circuit in BUILT_IN for name in BUILT_IN[circuit].whole}


def _on_off(trials: Trials) -> Axis | None:
    """Return the on/off ratio of the candidate, where its model states both states."""
    owner = trials.study.candidate.technology.id
    values = {name: trials.values.get(f"{owner}.{name}") for name in (*_ON_OFF, "on_resistance", "on_current")}
    name = next((name for name in _ON_OFF if values[name] is not None), None)
    if name is None:
        return None
    part = values[name]
    on_name = "on_current" if name == "off_current" else "on_resistance"
    on = values[on_name]
    if part is None or on is None or float(part.si[0]) <= 0.0:
        return None
    supply = trials.best_values.get(f"{owner}.declared_supply", float("nan"))

    def ratio(x: float, closed: float) -> float:
        if name == "off_resistance":
            return (closed + x) / closed
        return closed / x if name == "off_current" else supply / (closed * x)

    def place(target: float, other: Mapping[str, float]) -> dict[str, float]:
        closed = other.get(f"{owner}.{on_name}", float(on.si[0]))
        if name == "off_resistance":
            return {f"{owner}.{name}": closed * (target - 1.0)}
        return {f"{owner}.{name}": closed / target if name == "off_current" else supply / (closed * target)}

    closed = float(on.si[0])
    source = _from_value(f"{owner}.{name}", part)
    ends = sorted(ratio(x, closed) for x in (source.low, source.high))
    # the open state carries less than half of the closed one, or it is no switch
    low = max(ends[0], 2.5)
    meaning = f"current of the closed over current of the open switch of {owner}, moving its {name}"
    best = ratio(float(part.si[0]), closed)
    return Axis("on_off_ratio", meaning, "1", "positive", best, low, max(ends[1], best), source.origin, place)


def _awake_share(trials: Trials) -> Axis | None:
    needed = ("study.idle_time", "study.active_cycles", "study.clock_frequency")
    if not all(key in trials.best_values for key in needed):
        return None

    def awake(other: Mapping[str, float]) -> float:
        active, clock = (other.get(key, trials.best_values[key]) for key in needed[1:])
        return active / clock

    def place(share: float, other: Mapping[str, float]) -> dict[str, float]:
        return {"study.idle_time": awake(other) * (1.0 - share) / share}

    idle = trials.best_values["study.idle_time"]
    best = awake({}) / (idle + awake({}))
    meaning = "share of the time in which the block is clocked, moving the idle time"
    return Axis("awake_share", meaning, "1", "share", best, min(best, 1e-6), 1.0, USUAL, place)


def _deadline(trials: Trials, required: Axis | None) -> Axis | None:
    clock = "study.clock_frequency"
    if trials.study.timing != "clocked" or clock not in trials.values:
        return None if required is None else dataclasses.replace(required, name=DEADLINE)
    source = _from_value(clock, trials.values[clock])

    def place(x: float, other: Mapping[str, float]) -> dict[str, float]:
        return {clock: 1.0 / x}

    meaning = "time per operation, moving the clock frequency"
    best, low, high = 1.0 / source.best, 1.0 / source.high, 1.0 / source.low
    return Axis(DEADLINE, meaning, "ns", "positive", best, low, high, source.origin, place)


def _special(trials: Trials) -> dict[str, Axis]:
    found: dict[str, Axis] = {}
    required = trials.study.policy.required_time
    if isinstance(required, float):
        found[REQUIRED_TIME] = Axis(
            REQUIRED_TIME,
            "required time of the policy",
            "ps",
            "positive",
            required,
            required / 100.0,
            required * 100.0,
            "two decades on either side of the study's",
            _as_it_is(REQUIRED_TIME),
        )
    low, high = 233.15, 398.15
    origin = "-40 to 125 degC (common practice, no source)"
    for problem in trials.problems.values():
        valid = problem.side.technology.valid.get("temperature")
        if valid is not None and (valid[0] > low or valid[1] < high):
            low, high, origin = max(low, valid[0]), min(high, valid[1]), "range in which every set is valid"
    hottest = trials.study.temperatures[-1]
    low, high = min(low, hottest), max(high, hottest)
    if low < high:
        meaning = "highest temperature of the study"
        found[TEMPERATURE] = Axis(
            TEMPERATURE, meaning, "degC", "any", hottest, low, high, origin, _as_it_is(TEMPERATURE)
        )
    for axis in (_on_off(trials), _awake_share(trials), _deadline(trials, found.get(REQUIRED_TIME))):
        if axis is not None:
            found[axis.name] = axis
    return found


def known_axes(trials: Trials) -> dict[str, Axis]:
    """Return every axis of a study by name; whole numbers that shape a netlist are not among them."""
    shaping = _shaping(trials.study)
    found = {key: _from_value(key, value) for key, value in trials.values.items() if value.name not in shaping}
    return found | _special(trials)


def find_axis(trials: Trials, name: str) -> Axis:
    """Return one axis by ledger key or, where only one owner has it, by the name of the value alone.

    Raises
    ------
    UsageError
        When there is none, or several owners have it, or it shapes the netlist.
    """
    known = known_axes(trials)
    if name in known:
        return known[name]
    if f"study.{name}" in known:
        return known[f"study.{name}"]
    alike = [key for key in known if key.rpartition(".")[2] == name]
    if len(alike) == 1:
        return known[alike[0]]
    if alike:
        message = f"{name!r} is a value of several owners; name one of {', '.join(alike)}"
        raise UsageError(message)
    if name.rpartition(".")[2] in _shaping(trials.study):
        message = f"{name!r} shapes the netlist of the circuit: another number is another study"
        raise UsageError(message)
    names = {key.rpartition(".")[2] for key in known} | set(known)
    message = f"there is no value {name!r} in this study; {nearest(name, sorted(names))}".rstrip("; ")
    raise UsageError(message)


def usual_axes(trials: Trials) -> list[Axis]:
    """Return the axes asked about when none is named: workload, wires, timing, supplies, temperature, on/off ratio."""
    known = known_axes(trials)
    keys: Iterable[str] = [f"study.{name}" for name in _USUAL]
    keys = [*keys, "awake_share", REQUIRED_TIME, TEMPERATURE, "on_off_ratio"]
    keys += [
        f"{problem.side.technology.id}.declared_supply"
        for problem in trials.problems.values()
        if _declared_supply_counts(trials)
    ]
    return [known[key] for key in dict.fromkeys(keys) if key in known]


def _declared_supply_counts(trials: Trials) -> bool:
    return trials.policy in ("declared-point", "same-supply")
