"""Contrast ratios of palette colours on white."""

from __future__ import annotations

import re

from benchmark.report import contrast
from tests.published.rows import Binding, load

EXERCISES = ("benchmark.report.contrast:contrast", "benchmark.report.contrast:luminance")


def _ratio(colour: str) -> float:
    return contrast.contrast(colour, "#FFFFFF")


COLOURS = {
    name: re.findall("#[0-9A-F]{6}", row["inputs"])[0] for name, row in load().items() if name.startswith("cir.CR-")
}
BINDINGS = [Binding(name, EXERCISES, lambda colour=colour: _ratio(colour), (0,)) for name, colour in COLOURS.items()]
