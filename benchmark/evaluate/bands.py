"""Error bands of the closed forms: how far they were from circuit simulation, and where that was measured (layer 6).

``closed-form-bands.csv`` beside this module holds one band per line: the smallest and the largest ratio closed over
simulated of all measured points inside a box. The command ``tests/ngspice/measure_bands.py`` writes it from the
measured points (``tests/data/closed-form-*.csv``); nothing else does, and nothing here fits or smooths. A stage outside
every box has no band, and the reason is named.

Quantities: ``delay`` of a stage (mean of both edges), ``energy`` of one full cycle without leakage, with the
short-circuit estimate or ``energy without short circuit``, and ``leakage`` (mean over input states). A box bounds the
facts of a stage on these axes, where its model has them:

supply [V], temperature [K]
transit_over_rc [1]
    Load-independent time over R C of the driving path.
on_off_ratio, switching_level [1]
    Of the switch at this supply. A level of 0.5 is a supply of about twice the closing voltage.
quality [1]
    Of the actuator; not an axis where the actuator is fast against R C.

An actuator beyond its ringing limit (``rings``) has no band either: outputs may switch falsely, so the time of the
first crossing means nothing.
"""

from __future__ import annotations

import csv
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from importlib.resources import files
from typing import Final

import numpy as np

from benchmark.circuits.circuit import Value
from benchmark.circuits.sized import EDGES, Sized
from benchmark.circuits.stage import StageDetail
from benchmark.physics import acoustics

__all__ = ["AXES", "FAST", "QUANTITIES", "Band", "Found", "bands", "find", "fits", "read_bands", "rings", "stage_facts"]

AXES: Final = {
    "supply": "V",
    "temperature": "K",
    "transit_over_rc": "1",
    "on_off_ratio": "1",
    "switching_level": "1",
    "quality": "1",
}
QUANTITIES: Final = ("delay", "energy", "energy without short circuit", "leakage")
#: transit over R C up to which the quality of an actuator is without effect
FAST: Final = 0.1
#: relative slack of a box: limits are written with few digits, facts come from a calculation
_SLACK: Final = 0.01
_FILE: Final = "closed-form-bands.csv"
_WORDS: Final = {
    "supply": "supply",
    "temperature": "temperature",
    "transit_over_rc": "transit over R C",
    "on_off_ratio": "on/off ratio",
    "switching_level": "switching level",
    "quality": "quality",
}


@dataclass(frozen=True)
class Band:
    """Ratio closed over simulated, ``low`` to ``high`` [1], over ``points`` measured points inside a box."""

    model: str
    quantity: str
    rule: str
    cell: str
    box: Mapping[str, tuple[float, float]]
    low: float
    high: float
    points: int

    def holds(self, facts: Mapping[str, float]) -> bool:
        """Tell whether a stage lies inside the box; an unknown fact lies in no range."""
        return all(fits(facts[axis], ends) for axis, ends in self.box.items())


@dataclass(frozen=True)
class Found:
    """The band of one stage: the widest of all that hold; without one ``why`` names the reason and ``points`` is 0."""

    low: float
    high: float
    points: int
    over: str
    why: str = ""


def fits(value: float, ends: tuple[float, float]) -> bool:
    """Tell whether a value lies between two ends, one percent beyond them included."""
    return ends[0] * (1.0 - _SLACK) <= value <= ends[1] * (1.0 + _SLACK)


def read_bands(lines: Sequence[str]) -> tuple[Band, ...]:
    """Read bands from lines of CSV; an axis without numbers bounds nothing."""
    found = []
    for row in csv.DictReader(lines):
        box = {
            axis: (float(row[f"{axis}_low"]), float(row[f"{axis}_high"])) for axis in AXES if row[f"{axis}_low"] != ""
        }
        ends = float(row["ratio_low"]), float(row["ratio_high"])
        found.append(Band(row["model"], row["quantity"], row["rule"], row["cell"], box, *ends, int(row["points"])))
    return tuple(found)


@lru_cache(maxsize=1)
def bands() -> tuple[Band, ...]:
    """Return every stored band."""
    return read_bands(files("benchmark.evaluate").joinpath(_FILE).read_text(encoding="utf-8").splitlines())


def stage_facts(detail: StageDetail, sized: Sized, temperature: float) -> dict[str, float]:
    """Return the facts of one stage at one design point, by axis.

    Parameters
    ----------
    detail : StageDetail
        By any rule: R C follows from the part of the delay that is no transit.
    sized : Sized
        The switches it was estimated with.
    temperature : float
        [K].

    Notes
    -----
    ``transit_over_rc`` is the sum of both edges' transits over the sum of their R C, as the delay is their mean. Of
    two unlike switches the smaller on/off ratio, the higher level and the higher quality count.
    """
    transit, charging = 0.0, 0.0
    for edge, found in zip(EDGES, (detail.falling, detail.rising), strict=True):
        transit += _one(sized.transit(detail.net.driver, edge))
        charging += (_one(found.delay) - _one(found.parts["transit"])) / _one(found.factor)
    switches = (sized.pair.down, sized.pair.up)
    leakages = [_one(switch.off_current_path) for switch in switches]
    moving = [_one(switch.quality) for switch in switches if math.isfinite(_one(switch.natural_frequency))]
    return {
        "supply": _one(sized.pair.supply),
        "temperature": temperature,
        "transit_over_rc": transit / charging if charging > 0.0 else math.inf,
        "on_off_ratio": min(
            _one(switch.on_current) / leakage if leakage > 0.0 else math.inf
            for switch, leakage in zip(switches, leakages, strict=True)
        ),
        "switching_level": max(_one(switch.switching_level) for switch in switches),
        "quality": max(moving) if moving else math.nan,
    }


def _one(value: Value) -> float:
    return float(np.asarray(value).ravel()[0])


def find(quantity: str, model: str, rule: str, cell: str, facts: Mapping[str, float]) -> Found:
    """Return the band of one stage, or why there is none.

    Parameters
    ----------
    quantity : str
        One of ``QUANTITIES``.
    model, rule, cell : str
        Device model, delay rule and cell that drives.
    facts : mapping
        Value on every axis (``edge_facts``).
    """
    listed = [band for band in bands() if band.quantity == quantity]
    for name, value in (("model", model), ("rule", rule), ("cell", cell)):
        kept = [band for band in listed if getattr(band, name) == value]
        if not kept:
            words = {"model": "device model", "rule": "delay rule", "cell": "cell"}[name]
            known = ", ".join(dict.fromkeys(getattr(band, name) for band in listed))
            return _none(f"{words} {value} (measured: {known or 'none'})")
        listed = kept
    limit = rings(facts)
    if not math.isnan(limit):
        found = _amount("quality", facts["quality"])
        return _none(f"quality {found} beyond the ringing limit of {limit:.3g}: outputs may switch falsely")
    holding = [band for band in listed if band.holds(facts)]
    if not holding:
        return _none(_outside(listed, facts))
    low, high = min(band.low for band in holding), max(band.high for band in holding)
    return Found(low, high, sum(band.points for band in holding), _over(holding))


def rings(facts: Mapping[str, float]) -> float:
    """Return the ringing limit of the quality [1] where it is passed, else nan.

    Q <= min(4.5, 0.8 pi / ln(V/V_on)) (``acoustics.quality_limit_chain``). Up to a transit of a tenth of R C the node
    follows none of the ringing, whatever the quality (own simulation: no false switching there up to Q = 3).
    """
    if not facts["transit_over_rc"] > FAST * (1.0 + _SLACK) or math.isnan(facts["quality"]):
        return math.nan
    limit = float(acoustics.quality_limit_chain(facts["switching_level"]))
    return limit if facts["quality"] > limit * (1.0 + _SLACK) else math.nan


def _none(why: str) -> Found:
    return Found(math.nan, math.nan, 0, "", why)


def _span(listed: Sequence[Band], axis: str) -> tuple[float, float] | None:
    ends = [band.box[axis] for band in listed if axis in band.box]
    return (min(low for low, _ in ends), max(high for _, high in ends)) if ends else None


def _amount(axis: str, value: float) -> str:
    return f"{value:.3g}" + ("" if AXES[axis] == "1" else f" {AXES[axis]}")


def _range(axis: str, ends: tuple[float, float]) -> str:
    return f"{_WORDS[axis]} {ends[0]:.3g} to {_amount(axis, ends[1])}"


def _outside(listed: Sequence[Band], facts: Mapping[str, float]) -> str:
    """Name the axes that leave the whole measured range; where none does, only the combination was not measured."""
    beyond = []
    for axis in AXES:
        span = _span(listed, axis)
        if span is not None and not fits(facts[axis], span):
            found = "not stated" if math.isnan(facts[axis]) else _amount(axis, facts[axis])
            beyond.append(f"{_WORDS[axis]} {found} (measured: {_range(axis, span).removeprefix(_WORDS[axis]).strip()})")
    if beyond:
        return ", ".join(beyond)
    shown = [f"{_WORDS[axis]} {_amount(axis, facts[axis])}" for axis in AXES if _span(listed, axis) is not None]
    return f"this combination of {', '.join(shown)}"


def _over(holding: Sequence[Band]) -> str:
    spans = {axis: _span(holding, axis) for axis in AXES}
    return ", ".join(_range(axis, ends) for axis, ends in spans.items() if ends is not None)
