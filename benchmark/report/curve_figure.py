"""Measured points with what was read off them drawn over: one figure per measured column (layer 9)."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from pathlib import Path

import numpy as np

from benchmark.catalogue import QUANTITIES
from benchmark.curves.choosing import curve_words
from benchmark.curves.extraction import Found
from benchmark.curves.meanings import MEANINGS
from benchmark.curves.record import Array, MeasuredCurves, Sweep
from benchmark.record.extracted import in_unit, number_text
from benchmark.report.compose import printed, to_bitmap, to_pdf
from benchmark.report.drawing import Canvas, Label
from benchmark.report.figure import Chart, Row, checked, to_svg
from benchmark.report.placing import Box, Placer, fitted
from benchmark.report.style import GREY, INK, LinearAxis, LogAxis, spec
from benchmark.report.words import flat_powers, number, plural, visible

__all__ = ["curve_chart", "curve_figures", "write_curve_figures"]

WIDTH, HEIGHT = 600.0, 340.0
MARGINS = (72.0, 12.0, 14.0, 50.0)
FIT, POINT = "#A34800", "#005A8D"
#: columns whose size spans decades
_LOGARITHMIC = frozenset(
    {"path_current", "path_current_per_width", "path_resistance", "control_current", "control_current_per_width"}
)
#: axes that span decades
_DECADES = frozenset({"switching_cycles", "frequency", "time"})
#: most curves that are named in the drawing
NAMED = 4
#: points of a line that is straight on a linear scale and bent on a logarithmic one
BENT = 60
_SHAPES = {"reading": "circle", "upper bound": "triangle-down", "lower bound": "triangle-up"}


class _Powers(LogAxis):
    """A logarithmic axis whose ticks are plain numbers such as 1e-7, as its title says the unit."""

    def label(self, tick: float) -> str:
        return flat_powers(number(tick, 1))


def curve_figures(curves: MeasuredCurves, found: Sequence[Found]) -> dict[str, Chart]:
    """Return measured column -> chart, for every column that a number was read off."""
    columns = dict.fromkeys(one.request.of for one in found)
    return {of: curve_chart(curves, [one for one in found if one.request.of == of]) for of in columns}


def write_curve_figures(
    curves: MeasuredCurves, found: Sequence[Found], path: Path, width_mm: float
) -> tuple[Path, ...]:
    """Write each figure in the form its ending names, with caption and alternative text beside it.

    Raises
    ------
    OSError
        When a file cannot be written.
    """
    charts = curve_figures(curves, found)
    written = []
    for of, chart in charts.items():
        place = path if len(charts) == 1 else path.with_name(f"{path.stem}-{of.replace('_', '-')}{path.suffix}")
        svg = printed(to_svg(chart.spec or {}), chart.key, width_mm, chart.title, visible(chart.alternative))
        if place.suffix == ".svg":
            place.write_text(svg, encoding="utf-8")
        else:
            place.write_bytes(to_pdf(svg) if place.suffix == ".pdf" else to_bitmap(svg))
        words = f"Caption\n\n{visible(chart.caption)}\n\nAlternative text\n\n{visible(chart.alternative)}\n"
        place.with_suffix(".txt").write_text(words, encoding="utf-8")
        written.append(place)
    return tuple(written)


def curve_chart(curves: MeasuredCurves, found: Sequence[Found]) -> Chart:
    """Draw the curves of one measured column that numbers were read off, and the numbers.

    Readings are dots joined by straight lines; a reading at the floor or at the compliance is a triangle that points
    where the true value lies. What was read is a thicker line with its number written beside it.
    """
    of = found[0].request.of
    sweeps = list({id(sweep): sweep for one in found for device in one.devices for sweep in device.sweeps}.values())
    log = of in _LOGARITHMIC
    rows = [row for sweep in sweeps for row in _rows(sweep, of, curves)]
    drawn = [row for row in rows if not log or row["b"] > 0.0]
    x, y = _axes(curves, of, [*drawn, *_ends(curves, found, log)], log)
    canvas, placer = Canvas(x, y), Placer(Box(3.0, 3.0, WIDTH - 3.0, HEIGHT - 3.0))
    canvas.frame()
    for run in dict.fromkeys(row["run"] for row in drawn):
        placer.avoid_line([(x.pixel(row["a"]), y.pixel(row["b"])) for row in drawn if row["run"] == run])
    canvas.path([row for row in drawn if row["what"] == "reading"], "a", "b", color=GREY, strokeWidth=0.8)
    for what, shape in _SHAPES.items():
        filled = what == "reading"
        canvas.marks(
            [row for row in drawn if row["what"] == what], "a", "b",
            shape=shape, size=20 if filled else 46, filled=filled, color=POINT, strokeWidth=1.2,
        )  # fmt: skip
    labels = [*_fits(canvas, placer, curves, found, log), *_names(placer, canvas, sweeps, drawn)]
    canvas.leaders(labels)
    canvas.backs(labels)
    canvas.words([words for label in labels for words in label.words()])
    caption = _caption(curves, found, sweeps, rows, len(rows) - len(drawn))
    told = "; ".join(number_text(one) for one in found)
    column = _meaning(of)
    alternative = (
        f"Measured {column} against {_meaning(curves.along)}, {plural(len(drawn), 'point')} on "
        f"{plural(len(sweeps), 'curve')}, with what was read off: {told}. {caption}"
    )
    drawing = checked(spec(canvas.layers, WIDTH, HEIGHT, MARGINS))
    title = f"{column[:1].upper()}{column[1:]}"
    return Chart(f"curves-{of.replace('_', '-')}", title, drawing, caption, alternative, tuple(drawn))


def _meaning(name: str) -> str:
    quantity = MEANINGS.get(name) or QUANTITIES.get(name)
    return quantity.meaning if quantity else name.replace("_", " ")


def _rows(sweep: Sweep, of: str, curves: MeasuredCurves) -> Iterator[Row]:
    """Points of a curve in the units of the file; a reading at the floor stands at the floor."""
    axis, unit = curves.units.get(curves.along, "1"), curves.units[of]
    low, high, floor = sweep.at_floor[of], sweep.at_compliance[of], sweep.floor.get(of)
    words = curve_words(sweep)
    for position in np.argsort(sweep.columns[curves.along], kind="stable").tolist():
        si = float(sweep.columns[of][position])
        what = "upper bound" if low[position] else "lower bound" if high[position] else "reading"
        yield {
            "a": in_unit(float(sweep.columns[curves.along][position]), axis),
            "b": in_unit(floor if floor is not None and low[position] else si, unit),
            "what": what,
            "curve": words,
            "row": int(sweep.rows[position]),
            "run": f"{words} {id(sweep)}",
        }


def _axes(
    curves: MeasuredCurves, of: str, drawn: Sequence[Row], log: bool
) -> tuple[LogAxis | LinearAxis, LogAxis | LinearAxis]:
    axis, unit = curves.units.get(curves.along, "1"), curves.units[of]
    places = [row["a"] for row in drawn]
    along = f"{_meaning(curves.along)} [{axis}]".removesuffix(" [1]")
    decades = curves.along in _DECADES and min(places) > 0.0
    x = _Powers.around(places, WIDTH, "1", along) if decades else _linear(places, WIDTH, along)
    values = [row["b"] for row in drawn]
    title = f"{_meaning(of)} [{unit}]"
    if log:
        return x, _Powers.around(values, HEIGHT, "1", title, vertical=True)
    return x, _linear(values, HEIGHT, title, vertical=True)


def _ends(curves: MeasuredCurves, found: Sequence[Found], log: bool) -> list[Row]:
    """Points of what was read that linear axes must hold: a line may begin beyond the readings, as at spacing 0."""
    if log:
        return []
    axis = curves.units.get(curves.along, "1")
    return [
        {"a": in_unit(a, axis), "b": in_unit(b, curves.units[one.request.of])}
        for one in found
        for device in one.devices
        for a, b in zip(device.read.line_x.tolist(), device.read.line_y.tolist(), strict=True)
        if math.isfinite(a) and math.isfinite(b)
    ]


def _linear(values: Sequence[float], size: float, title: str, *, vertical: bool = False) -> LinearAxis:
    """Return a linear axis around values with ticks at 1, 2 or 5 times a power of ten."""
    low, high = min(values), max(values)
    margin = 0.05 * (high - low or abs(high) or 1.0)
    low, high = low - margin, high + margin
    rough = (high - low) / 6.0
    power = 10.0 ** math.floor(math.log10(rough))
    step = next(factor * power for factor in (1.0, 2.0, 5.0, 10.0) if factor * power >= rough)
    ticks = [count * step for count in range(math.ceil(low / step), math.floor(high / step) + 1)]
    shown = tuple((float(f"{tick:.12g}"), number(float(f"{tick:.6g}"), 4)) for tick in ticks)
    return LinearAxis(low, high, size, title, shown, vertical)


def _fits(canvas: Canvas, placer: Placer, curves: MeasuredCurves, found: Sequence[Found], log: bool) -> list[Label]:
    """Draw what was read, and write each number beside it."""
    labels = []
    for one in found:
        pixels: list[tuple[float, float]] = []
        weight = 2.4 if len(one.devices) <= NAMED else 1.0
        for position, device in enumerate(one.devices):
            runs = _line(device.read.line_x, device.read.line_y, log)
            for line_x, line_y in runs:
                rows = _shown(line_x, line_y, curves, one.request.of, canvas)
                if len(rows) > 1:
                    canvas.path([row | {"run": ""} for row in rows], "a", "b", color=FIT, strokeWidth=weight)
                elif rows:
                    canvas.marks(rows, "a", "b", shape="cross", size=110, color=FIT)
                if position == 0:
                    pixels += [(canvas.x.pixel(row["a"]), canvas.y.pixel(row["b"])) for row in rows]
        if not pixels:
            continue
        placer.avoid_line(pixels)
        places = [pixels[len(pixels) // 2], pixels[0], pixels[-1]]
        lines = fitted(number_text(one), 320.0, 2)
        placed = placer.place(lines, places)
        labels += [Label(placed, FIT)] if placed else []
    return labels


def _line(line_x: Array, line_y: Array, log: bool) -> Iterator[tuple[Array, Array]]:
    """Cut a line where it is interrupted; a line that meets zero is bent on a logarithmic axis."""
    gaps = np.flatnonzero(np.isnan(line_x))
    for xs, ys in zip(np.split(line_x, gaps), np.split(line_y, gaps), strict=True):
        kept = ~np.isnan(xs)
        one_x, one_y = xs[kept], ys[kept]
        if log and one_x.size == 2 and np.any(one_y <= 0.0) and np.any(one_y > 0.0):
            share = np.linspace(0.0, 1.0, BENT)
            one_x, one_y = (
                one_x[0] + share * np.ptp(one_x) * np.sign(one_x[1] - one_x[0]),
                one_y[0] + share * (one_y[1] - one_y[0]),
            )
        if one_x.size:
            yield one_x, one_y


def _shown(line_x: Array, line_y: Array, curves: MeasuredCurves, of: str, canvas: Canvas) -> list[Row]:
    """Points of a line in the units of the file, as far as they lie on the axes."""
    axis, unit = curves.units.get(curves.along, "1"), curves.units[of]
    rows = [
        {"a": in_unit(float(a), axis), "b": in_unit(float(b), unit)}
        for a, b in zip(line_x.tolist(), line_y.tolist(), strict=True)
    ]
    low, high = (min(canvas.y.value(0.0), canvas.y.value(HEIGHT)), max(canvas.y.value(0.0), canvas.y.value(HEIGHT)))
    left, right = canvas.x.value(0.0), canvas.x.value(WIDTH)
    return [row for row in rows if low <= row["b"] <= high and left <= row["a"] <= right]


def _names(placer: Placer, canvas: Canvas, sweeps: Sequence[Sweep], drawn: Sequence[Row]) -> list[Label]:
    """Write the name of each curve at its end, while there are few."""
    if not 1 < len(sweeps) <= NAMED:
        return []
    labels = []
    for run in dict.fromkeys(row["run"] for row in drawn):
        rows = [row for row in drawn if row["run"] == run]
        if not rows[0]["curve"]:
            continue
        places = [(canvas.x.pixel(rows[k]["a"]), canvas.y.pixel(rows[k]["b"])) for k in (-1, len(rows) * 3 // 4, 0)]
        placed = placer.place(fitted(rows[0]["curve"], 200.0, 1), places)
        labels += [Label(placed, INK)] if placed else []
    return labels


def _caption(
    curves: MeasuredCurves, found: Sequence[Found], sweeps: Sequence[Sweep], rows: Sequence[Row], dropped: int
) -> str:
    words = [f"{curves.file.rsplit('/', 1)[-1]}: {plural(len(sweeps), 'curve')}, dots are readings."]
    fixed = []
    for name in dict.fromkeys(name for sweep in sweeps for name in sweep.fixed):
        numbers = sorted({sweep.fixed[name] for sweep in sweeps if name in sweep.fixed})
        unit = curves.units.get(name, "1")
        shown = ", ".join(number(in_unit(one, unit), 4) for one in numbers[:6])
        fixed.append(f"{_meaning(name)} {shown} {unit}".removesuffix(" 1"))
    words += [f"Fixed: {'; '.join(fixed)}."] if fixed else []
    for what, shape in (("upper bound", "downwards"), ("lower bound", "upwards")):
        count = sum(row["what"] == what for row in rows)
        if count:
            cause = "at the floor of the instrument" if what == "upper bound" else "at its compliance"
            words.append(f"{plural(count, 'triangle')} {shape}: {what} {cause}.")
    if dropped:
        words.append(f"{plural(dropped, 'reading')} not above 0 cannot be drawn on the logarithmic axis.")
    words.append("Thick lines and crosses show what was read off; ± is one standard uncertainty.")
    words += [
        f"{warning[:1].upper()}{warning[1:]}." for warning in dict.fromkeys(w for one in found for w in one.warnings)
    ]
    words.append(f"Evidence of the data: {curves.evidence}, {curves.conditions}. Data sha256 {curves.digest[:16]}.")
    return " ".join(words)
