"""Numbers read off curves as plain data and in words (layer 8)."""

from __future__ import annotations

import math
from typing import Any

from benchmark.curves.choosing import curve_words
from benchmark.curves.extraction import DeviceReading, Found
from benchmark.curves.record import MeasuredCurves
from benchmark.units import format_si, from_si, parse_unit

__all__ = [
    "COLUMNS",
    "digits_of",
    "found_data",
    "found_rows",
    "how_read",
    "in_unit",
    "number_text",
    "size_in_unit",
    "two_digits",
]

#: columns of the flat table, one row per number and per device
COLUMNS = (
    *("quantity", "name", "node", "device", "value", "standard_uncertainty", "unit", "bound", "from", "to"),
    *("along", "along_unit", "points", "curves"),
)


def in_unit(si: float, unit: str) -> float:
    """Return an SI number in a unit."""
    return from_si(si, parse_unit(unit))


def size_in_unit(si: float | None, unit: str) -> float | None:
    """Return a difference in a unit (degrees without their zero); None stays None."""
    return None if si is None else float(si / float(parse_unit(unit).factor))


def _curve_list(one: DeviceReading) -> str:
    return "; ".join(dict.fromkeys(words for sweep in one.sweeps if (words := curve_words(sweep))))


def found_rows(one: Found, curves: MeasuredCurves) -> list[dict[str, Any]]:
    """Return the number as a flat row, and before it one row per device where it is a median."""
    request, axis = one.request, curves.units.get(curves.along, "1")

    def row(
        device: str, value: float, uncertainty: float | None, bound: str, read: DeviceReading | None
    ) -> dict[str, Any]:
        span = (math.nan, math.nan) if read is None else read.read.span
        return {
            "quantity": request.quantity,
            "name": request.name,
            "node": request.node,
            "device": device,
            "value": in_unit(value, request.unit),
            "standard_uncertainty": size_in_unit(uncertainty, request.unit),
            "unit": request.unit,
            "bound": bound,
            "from": None if read is None else in_unit(span[0], axis),
            "to": None if read is None else in_unit(span[1], axis),
            "along": curves.along,
            "along_unit": axis,
            "points": None if read is None else read.read.points,
            "curves": "" if read is None else _curve_list(read),
        }

    rows = [row(read.device, read.read.value, read.read.uncertainty, read.read.bound, read) for read in one.devices]
    if one.over is not None:
        rows.append(row(f"median of {one.over.count}", one.value, one.uncertainty, one.bound, None))
    return rows


def found_data(one: Found, curves: MeasuredCurves) -> dict[str, Any]:
    """Return everything about one number as plain data, in its unit."""
    request, unit = one.request, one.request.unit
    over = one.over
    return {
        "quantity": request.quantity,
        "meaning": one.kind.meaning,
        "asked": dict(request.said),
        "name": request.name,
        "node": request.node,
        "value": in_unit(one.value, unit),
        "standard_uncertainty": size_in_unit(one.uncertainty, unit),
        "unit": unit,
        "bound": one.bound,
        "parts": [
            {
                "name": part.name,
                "size": size_in_unit(part.size, unit),
                "degrees_of_freedom": part.freedom if math.isfinite(part.freedom) else None,
            }
            for part in one.parts
        ],
        "devices": [
            {
                key: row[key]
                for key in ("device", "value", "standard_uncertainty", "bound", "from", "to", "points", "curves")
            }
            for row in found_rows(one, curves)[: len(one.devices)]
        ],
        "over_devices": None
        if over is None
        else {
            "count": over.count,
            "bounds": over.bounds,
            "lower_quartile": None if over.lower_quartile is None else in_unit(over.lower_quartile, unit),
            "upper_quartile": None if over.upper_quartile is None else in_unit(over.upper_quartile, unit),
            "spread_seen": size_in_unit(over.seen_spread, unit),
            "spread_of_devices": size_in_unit(over.device_spread, unit),
            "uncertainty_of_one": size_in_unit(over.measured, unit),
        },
        "warnings": list(one.warnings),
    }


def how_read(one: Found, curves: MeasuredCurves) -> str:
    """Say in one sentence how a number was read, for the note of a value."""
    request = one.request
    asked = ", ".join(f"{key.replace('_', ' ')} {text}" for key, text in request.said.items())
    words = [f"Read off {curves.file.rsplit('/', 1)[-1]}: {one.kind.meaning}"]
    words += [asked] if asked else []
    words += [f"{request.sweep} sweep" if request.sweep != "mean" else "mean of both sweeps"] if request.sweep else []
    if one.over is not None:
        words.append(f"median of {one.over.count} devices")
    elif one.devices[0].device:
        words.append(f"device {one.devices[0].device}")
    sweeps = [sweep for device in one.devices for sweep in device.sweeps]
    for name in dict.fromkeys(name for sweep in sweeps for name in sweep.fixed):
        numbers = sorted({sweep.fixed[name] for sweep in sweeps if name in sweep.fixed})
        shown = ", ".join(format_si(number, curves.units.get(name, "1"), 6) for number in numbers)
        words += [f"{name.replace('_', ' ')} {shown}"]
    if curves.hero:
        words.append("a hero device, not a typical one")
    if request.leave_out:
        words.append(f"without {', '.join(request.leave_out)}")
    return "; ".join(words) + "."


def two_digits(uncertainty: float) -> str:
    """Print an uncertainty with two significant digits."""
    power = math.floor(math.log10(float(f"{uncertainty:.1e}")))
    return f"{uncertainty:.{1 - power}f}" if -4 <= power <= 1 else f"{float(f'{uncertainty:.1e}'):.3g}"


def digits_of(value: float, uncertainty: float | None) -> str:
    """Print a number with digits down to the second one of its uncertainty, four where there is none."""
    if not uncertainty or value == 0.0:
        return f"{value:.4g}"
    power = math.floor(math.log10(float(f"{uncertainty:.1e}")))
    size = math.floor(math.log10(abs(value)))
    if -4 <= power <= 1 and size < 6:
        return f"{value:.{max(0, 1 - power)}f}"
    return f"{value:.{min(12, max(2, size - power + 2))}g}"


def number_text(one: Found) -> str:
    """Say a number with its uncertainty, or that it is a bound."""
    unit = one.request.unit
    value, uncertainty = in_unit(one.value, unit), size_in_unit(one.uncertainty, unit)
    name = one.request.quantity.replace("_", " ")
    before = {"at-least": "at least ", "at-most": "at most "}.get(one.bound, "")
    over = "" if one.over is None else f" (median of {one.over.count})"
    said = f"{name}{over} {before}{digits_of(value, uncertainty)}"
    if uncertainty:
        said += f" ± {two_digits(uncertainty)}"
    return f"{said} {unit}".removesuffix(" 1")
