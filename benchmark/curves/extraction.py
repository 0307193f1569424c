"""From requests to numbers: every curve that a request names is read, one number per device (layer 7.5)."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from benchmark.curves.choosing import curve_words, directed, only_curve, split_by_device, with_fixed
from benchmark.curves.quantities import KINDS, Kind
from benchmark.curves.record import MeasuredCurves, Sweep
from benchmark.curves.requests import Request
from benchmark.errors import Problem
from benchmark.physics.extraction.charge import charge_between, charge_from_capacitance, over_swing
from benchmark.physics.extraction.contacts import Contacts, contacts, log_slope
from benchmark.physics.extraction.currents import effective_current, mean_of_sweeps
from benchmark.physics.extraction.devices import OverDevices, over_devices
from benchmark.physics.extraction.jumps import cycles_to_failure, jump_voltage
from benchmark.physics.extraction.points import LEAST, Points, read_at
from benchmark.physics.extraction.result import (
    Accuracy,
    Bound,
    CannotExtract,
    Extracted,
    Part,
    Told,
    gathered,
    opposite,
)
from benchmark.physics.extraction.swing import average_swing, fitted_swing, minimum_swing
from benchmark.physics.extraction.threshold import extrapolated_threshold, hysteresis_window, threshold_at_current
from benchmark.sets.problems import Collector
from benchmark.units import format_si

__all__ = ["DeviceReading", "Found", "extract_all"]

#: devices that are named in a remark
MOST_NAMED = 6


@dataclass(frozen=True)
class DeviceReading:
    """What one device gives, and the curves it was read from."""

    device: str
    read: Extracted
    sweeps: tuple[Sweep, ...]


@dataclass(frozen=True)
class Found:
    """The answer to one request, SI.

    ``value``, ``uncertainty`` (standard; None for a bound or where it is not known) and ``bound``: of the one device,
    or of the median over them. ``over``: what many devices say. ``warnings``: what a reader must be told.
    """

    request: Request
    value: float
    uncertainty: float | None
    bound: Bound
    devices: tuple[DeviceReading, ...]
    over: OverDevices | None
    warnings: tuple[str, ...]

    @property
    def kind(self) -> Kind:
        """What was read."""
        return KINDS[self.request.quantity]

    @property
    def parts(self) -> tuple[Part, ...]:
        """Parts of the uncertainty: of the device, or of the median."""
        if self.over is None:
            return self.devices[0].read.parts
        if self.over.median_error is None:
            return ()
        sampling = math.sqrt(max(self.over.median_error**2 - self.over.common**2, 0.0))
        parts = (Part(f"median of {self.over.count} devices", sampling), Part("reading and setting", self.over.common))
        return tuple(part for part in parts if part.size > 0.0)

    @property
    def spread(self) -> float | None:
        """Standard deviation to write into a set, as the request asks; None for none."""
        if self.request.spread == "devices" and self.over is not None:
            return self.over.device_spread
        return self.uncertainty if self.request.spread == "uncertainty" else None


def extract_all(curves: MeasuredCurves, collector: Collector) -> list[Found]:
    """Answer every request of a description.

    Parameters
    ----------
    curves : MeasuredCurves
        Curves and requests.
    collector : Collector
        Takes every problem, of every request and device; a request with a problem has no answer.
    """
    found = []
    for request in curves.extract:
        before = len(collector.problems)
        readings = _readings(request, curves, collector)
        if len(collector.problems) > before:
            continue
        try:
            found.append(_answer(request, curves, readings))
        except CannotExtract as error:
            collector.add(_problem(error, request, curves, None))
    return found


def _readings(request: Request, curves: MeasuredCurves, collector: Collector) -> list[DeviceReading]:
    try:
        devices = split_by_device(curves, request)
    except CannotExtract as error:
        collector.add(_problem(error, request, curves, None))
        return []
    found = []
    for device, sweeps in devices.items():
        try:
            used = _used(request, sweeps, curves)
        except CannotExtract as error:
            collector.add(_problem(error, request, curves, None, device))
            continue
        reader = _Reader(request, curves)
        try:
            found.append(DeviceReading(device, reader.read(used), used))
        except CannotExtract as error:
            collector.add(_problem(error, request, curves, reader.at, device))
    return found


def _answer(request: Request, curves: MeasuredCurves, readings: Sequence[DeviceReading]) -> Found:
    first = readings[0].read
    warnings = [f"{curves.file} holds a hero device: one chosen sample, not a typical one"] if curves.hero else []
    if request.leave_out:
        warnings.append(f"left out, as the description says: {', '.join(request.leave_out)}")
    if request.over != "median":
        warnings += first.remarks
        return Found(request, first.value, first.uncertainty, first.bound, tuple(readings), None, tuple(warnings))
    over = over_devices([one.read for one in readings])
    warnings += _shared_remarks(readings)
    if over.bounds:
        warnings.append(f"{over.bounds} of {over.count} devices are known only by a bound")
    if over.device_spread is None and over.seen_spread is not None:
        warnings.append("the uncertainty of the single numbers explains all of the spread between devices")
    if request.spread == "devices" and over.device_spread is None:
        what = "the spread between devices cannot be told from the uncertainty of measurement, or rests on bounds"
        raise CannotExtract(what, hint='state spread = "uncertainty" or "none"')
    return Found(request, over.median, over.median_error, over.median_bound, tuple(readings), over, tuple(warnings))


def _shared_remarks(readings: Sequence[DeviceReading]) -> list[str]:
    """Say each remark once, with the devices it is about where it is not about all of them."""
    about: dict[str, list[str]] = {}
    for one in readings:
        for remark in one.read.remarks:
            about.setdefault(remark, []).append(one.device)
    said = []
    for remark, devices in about.items():
        names = ", ".join(devices[:MOST_NAMED]) + (
            f" and {len(devices) - MOST_NAMED} more" * (len(devices) > MOST_NAMED)
        )
        said.append(remark if len(devices) == len(readings) else f"{names}: {remark}")
    return said


def _used(request: Request, sweeps: Sequence[Sweep], curves: MeasuredCurves) -> tuple[Sweep, ...]:
    """Choose the curves of one device, in the order the reader takes them."""
    along = curves.along
    if request.quantity == "hysteresis_window" or request.sweep == "mean":
        directions = [directed(sweeps, direction, along) for direction in ("forward", "backward")]
    elif request.quantity in ("pull_in_voltage", "pull_out_voltage"):
        directions = [directed(sweeps, "forward" if request.quantity == "pull_in_voltage" else "backward", along)]
    elif request.sweep:
        directions = [directed(sweeps, request.sweep, along)]
    else:
        directions = [list(sweeps)]
    if request.quantity != "effective_current":
        return tuple(only_curve(group, curves) for group in directions)
    other = "path_voltage" if along == "control_voltage" else "control_voltage"
    supply = request.measures["supply"]
    pairs = []
    for group in directions:
        for voltage in (0.5 * supply, supply):
            chosen = with_fixed(group, {other: voltage})
            if not chosen:
                have = sorted({sweep.fixed[other] for sweep in group if other in sweep.fixed})
                what = f"the effective current needs a curve at {other} {format_si(voltage, 'V', 6)}"
                raise CannotExtract(what, ", ".join(format_si(one, "V", 6) for one in have) or "no such value")
            pairs.append(only_curve(chosen, curves))
    return tuple(pairs)


class _Reader:
    """Reads the curves of one device for one request; ``at`` is the curve in hand, for messages."""

    def __init__(self, request: Request, curves: MeasuredCurves) -> None:
        self.request, self.curves = request, curves
        self.accuracy = Accuracy(request.reading, request.setting)
        self.at: Sweep | None = None

    def read(self, sweeps: tuple[Sweep, ...]) -> Extracted:
        """Read one number."""
        if self.request.quantity == "hysteresis_window":
            forward, backward = (self.points(sweep) for sweep in sweeps)
            return hysteresis_window(forward, backward, self.request.measures["level"], self.accuracy)
        each = 2 if self.request.quantity == "effective_current" else 1
        found = [self._of_one(sweeps[start : start + each]) for start in range(0, len(sweeps), each)]
        return found[0] if len(found) == 1 else mean_of_sweeps(*found)

    def points(self, sweep: Sweep) -> Points:
        """Take a curve in hand."""
        self.at = sweep
        of, along = self.request.of, self.curves.along
        return Points.of(
            sweep.columns[along],
            sweep.columns[of],
            sweep.at_floor.get(of),
            sweep.at_compliance.get(of),
            sweep.floor.get(of),
        )

    def _of_one(self, sweeps: tuple[Sweep, ...]) -> Extracted:
        request = self.request
        if request.quantity == "effective_current":
            return self._effective(sweeps)
        if KINDS[request.quantity].along == ("contact_spacing",):
            found: Extracted = getattr(self._contacts(sweeps[0]), request.quantity)
            return found
        return _SINGLE[request.quantity](self.points(sweeps[0]), request, self.accuracy, sweeps[0])

    def _effective(self, sweeps: tuple[Sweep, ...]) -> Extracted:
        """Two curves, at half the supply and at the supply: of the path, or of the control."""
        supply = self.request.measures["supply"]
        half, full = (
            read_at(self.points(sweep), place, "log", self.accuracy)
            for sweep, place in zip(sweeps, (supply, 0.5 * supply), strict=True)
        )
        return effective_current(half, full)

    def _contacts(self, sweep: Sweep) -> Contacts:
        self.at = sweep
        of, measures = self.request.of, self.request.measures
        spacing, product = sweep.columns[self.curves.along], sweep.columns[of]
        chosen = np.flatnonzero((spacing >= measures.get("low", 0.0)) & (spacing <= measures.get("high", math.inf)))
        bounds = chosen[sweep.at_floor[of][chosen] | sweep.at_compliance[of][chosen]]
        if bounds.size:
            what = "a resistance is only a bound"
            raise CannotExtract(what, at=bounds)
        if chosen.size < LEAST:
            what = "the span has too few structures"
            raise CannotExtract(what, str(chosen.size), f"{LEAST} or more", at=chosen)
        return contacts(spacing[chosen], product[chosen], self.request.weights, self.accuracy)


def _charge(points: Points, request: Request, accuracy: Accuracy) -> Extracted:
    of_charge = request.of.startswith("charge")
    read = charge_between if of_charge else charge_from_capacitance
    return read(points, request.measures["low"], request.measures["high"], accuracy)


def _slope(points: Points, request: Request, accuracy: Accuracy) -> Extracted:
    return log_slope(points, request.measures.get("low"), request.measures.get("high"), accuracy)


def _decades(one: Extracted) -> Extracted:
    """Turn d ln R/dx into the decades that the resistance falls."""
    factor = -1.0 / math.log(10.0)
    return dataclasses.replace(
        one, value=one.value * factor, parts=gathered(one.parts, factor), bound=opposite(one.bound)
    )


def _threshold(points: Points, request: Request, accuracy: Accuracy, sweep: Sweep) -> Extracted:
    path = 0.0
    if request.half_path_voltage:
        if "path_voltage" not in sweep.fixed:
            what = "half the path voltage is to be subtracted, and no path voltage is stated for the curve"
            raise CannotExtract(what, hint="state it in the description: fixed.path_voltage")
        path = sweep.fixed["path_voltage"]
    return extrapolated_threshold(points, request.points, path, accuracy)


def _jump(points: Points, request: Request, accuracy: Accuracy) -> Extracted:
    return jump_voltage(points, request.measures.get("factor"), request.measures.get("step"), accuracy)


_Single = Callable[[Points, Request, Accuracy, Sweep], Extracted]
_SINGLE: dict[str, _Single] = {
    "average_swing": lambda p, r, a, s: average_swing(p, r.measures["low"], r.measures["high"], a),
    "minimum_swing": lambda p, r, a, s: minimum_swing(p, r.measures["low"], r.measures["high"], r.points, a),
    "fitted_swing": lambda p, r, a, s: fitted_swing(p, r.measures["low"], r.measures["high"], a),
    "threshold_at_current": lambda p, r, a, s: threshold_at_current(p, r.measures["level"], a),
    "threshold_extrapolated": _threshold,
    "current": lambda p, r, a, s: read_at(p, r.measures["at"], "log", a),
    "resistance": lambda p, r, a, s: read_at(p, r.measures["at"], "log", a),
    "switching_charge": lambda p, r, a, s: _charge(p, r, a),
    "switching_capacitance": lambda p, r, a, s: over_swing(_charge(p, r, a)),
    "log_resistance_slope": lambda p, r, a, s: _slope(p, r, a),
    "resistance_slope": lambda p, r, a, s: _decades(_slope(p, r, a)),
    "pull_in_voltage": lambda p, r, a, s: _jump(p, r, a),
    "pull_out_voltage": lambda p, r, a, s: _jump(p, r, a),
    "cycles_to_failure": lambda p, r, a, s: cycles_to_failure(p, r.measures["level"]),
}


def _problem(
    error: CannotExtract, request: Request, curves: MeasuredCurves, sweep: Sweep | None, device: str = ""
) -> Problem:
    """Say what cannot be read, at the row of the file it is about, else at the request."""
    units = {"x": curves.units.get(curves.along, "1"), "y": curves.units.get(request.of, "1")}

    def told(text: str | Told) -> str:
        return text if isinstance(text, str) else text.text(lambda axis, number: format_si(number, units[axis], 6))

    rows = [] if sweep is None else [int(sweep.rows[place]) for place in error.at]
    words = curve_words(sweep) if sweep is not None else f"device {device}" if device else ""
    what = f"{request.quantity}{f' ({words})' if words else ''}: {error.what}"
    if len(rows) > 1:
        what += f" (rows {min(rows)} to {max(rows)})"
    if not rows:
        return Problem(
            curves.description, request.line, request.dotted, what, told(error.found), told(error.allowed), error.hint
        )
    return Problem(curves.file, min(rows), request.of, what, told(error.found), told(error.allowed), error.hint)
