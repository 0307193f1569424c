"""Which curves of a file a request reads: by fixed values, labels, direction of the sweep and device (layer 7.5)."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence

from benchmark.curves.record import MeasuredCurves, Sweep
from benchmark.curves.requests import Request
from benchmark.errors import nearest
from benchmark.physics.extraction.result import CannotExtract
from benchmark.units import format_si

__all__ = ["DEVICE", "SWEEP", "curve_words", "directed", "only_curve", "split_by_device", "with_fixed"]

DEVICE, SWEEP = "device", "sweep"
#: two spellings of one temperature or voltage differ by rounding only
ROUNDING = 1e-9


def curve_words(sweep: Sweep) -> str:
    """Name a curve by its labels."""
    return ", ".join(f"{name} {word}" for name, word in sweep.labels.items())


def same(one: float, two: float) -> bool:
    """Whether two stated numbers are the same, apart from rounding."""
    return math.isclose(one, two, rel_tol=ROUNDING, abs_tol=1e-15)


def with_fixed(sweeps: Iterable[Sweep], fixed: Mapping[str, float]) -> list[Sweep]:
    """Return the curves on which all of these values are fixed."""
    return [
        sweep
        for sweep in sweeps
        if all(name in sweep.fixed and same(sweep.fixed[name], number) for name, number in fixed.items())
    ]


def split_by_device(curves: MeasuredCurves, request: Request) -> dict[str, list[Sweep]]:
    """Return the curves that fit a request, by device; one entry with an empty name when the file tells no devices.

    Raises
    ------
    CannotExtract
        No curve fits, a device is asked for that is not there, or there are several and none is chosen.
    """
    found = [
        sweep
        for sweep in with_fixed(curves.sweeps, request.fixed)
        if request.of in sweep.columns and request.labels.items() <= sweep.labels.items()
    ]
    if not found:
        what = "no curve of the file fits the request"
        wanted = [*(f"{name} {_shown(name, number, curves)}" for name, number in request.fixed.items())]
        wanted += [f"{name} {word}" for name, word in request.labels.items()]
        raise CannotExtract(what, ", ".join(wanted), _what_there_is(curves.sweeps, curves))
    devices: dict[str, list[Sweep]] = {}
    for sweep in found:
        devices.setdefault(sweep.labels.get(DEVICE, ""), []).append(sweep)
    for name in request.leave_out:
        if name not in devices:
            what = "a device to leave out is not there"
            raise CannotExtract(what, repr(name), ", ".join(devices), nearest(name, devices))
    devices = {name: group for name, group in devices.items() if name not in request.leave_out}
    if not devices:
        what = "all devices are left out"
        raise CannotExtract(what)
    if request.over == "median":
        if list(devices) == [""]:
            what = "a median over devices needs a label device"
            raise CannotExtract(what, "", 'a label column or a label with meaning = "device"')
        return devices
    if request.over:
        if request.over not in devices:
            what = "there is no such device"
            raise CannotExtract(
                what, repr(request.over), f"median, {', '.join(devices)}", nearest(request.over, devices)
            )
        return {request.over: devices[request.over]}
    if len(devices) > 1:
        what = "the file holds several devices, and the request does not say over which"
        raise CannotExtract(what, "", f'over = "median", or one of {", ".join(devices)}')
    return devices


def directed(sweeps: Sequence[Sweep], direction: str, along: str) -> list[Sweep]:
    """Return the curves of a direction of the sweep; where no label says it, the axis rises forward.

    Raises
    ------
    CannotExtract
        There is no such curve.
    """
    found = [sweep for sweep in sweeps if _direction(sweep, along) == direction]
    if not found:
        what = f"there is no {direction} sweep"
        have = sorted({_direction(sweep, along) for sweep in sweeps})
        raise CannotExtract(what, ", ".join(have), 'curves with the label sweep, or turns = ["forward", "backward"]')
    return found


def _direction(sweep: Sweep, along: str) -> str:
    axis = sweep.columns[along]
    return sweep.labels.get(SWEEP) or ("forward" if axis[-1] > axis[0] else "backward")


def only_curve(sweeps: Sequence[Sweep], curves: MeasuredCurves) -> Sweep:
    """Return the one curve that is left.

    Raises
    ------
    CannotExtract
        Several are left; the message says what tells them apart.
    """
    if len(sweeps) == 1:
        return sweeps[0]
    what = "several curves fit the request, and it does not choose between them"
    raise CannotExtract(what, _what_there_is(sweeps, curves), "a key for what tells them apart")


def _shown(name: str, number: float, curves: MeasuredCurves) -> str:
    return format_si(number, curves.units.get(name, "1"), 6)


def _what_there_is(sweeps: Sequence[Sweep], curves: MeasuredCurves) -> str:
    """Say what is fixed on curves, and their labels, where they differ (or all of it for one curve)."""
    words: list[str] = []
    for name in dict.fromkeys(name for sweep in sweeps for name in sweep.fixed):
        numbers = sorted({sweep.fixed[name] for sweep in sweeps if name in sweep.fixed})
        if len(numbers) > 1 or len(sweeps) == 1:
            words.append(f"{name} {', '.join(_shown(name, number, curves) for number in numbers)}")
    for name in dict.fromkeys(name for sweep in sweeps for name in sweep.labels):
        texts = sorted({sweep.labels[name] for sweep in sweeps if name in sweep.labels})
        if len(texts) > 1 or len(sweeps) == 1:
            words.append(f"{name} {', '.join(texts)}")
    return "; ".join(words)
