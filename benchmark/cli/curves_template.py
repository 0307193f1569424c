"""Text of a new description of a raw measured file, with an invented file to read (layer 10)."""

from __future__ import annotations

import math
from string import Template

from benchmark.cli.templates import comment
from benchmark.curves.meanings import MEANINGS
from benchmark.curves.quantities import KINDS

__all__ = ["curves_template"]

_STEPS = 15
_JUNK = ("Invented parameter analyser", "Wafer: invented; operator: none")
_TEXT = Template(
    """\
# Description of a raw measured file, written by evenload new. Every number of the file is invented: put your
# own file beside this one and describe it. What is not described is refused, not guessed.
schema = 1
kind = "curves"
file = "$stem.csv"
title = "Invented transfer curves of two devices"

# What the numbers are worth and where they come from
evidence = "invented"
source = "invented"                # a key of sources.toml beside this file or of the shipped list
where = "-"
conditions = "25 degC"             # temperature, sample, geometry
hero = false                       # true: one chosen device, not a typical one
# date = 2026-01-31                # day of the measurement
# note = ""
# owner = ""

# How the file is written
encoding = "utf-8"                 # utf-8, utf-16, latin-1, windows-1252
delimiter = ","                    # , ; | \\t whitespace
decimal = "."                      # . or ,
header_starts = "VG"               # what the header line starts with
units = "header"                   # stated: in [[column]]; row: under the header; header: ID (A)
# skip_rows = 2                    # instead of header_starts: lines before the header
# comment = "#"                    # lines that start with this are left out
# ends_before = "END"              # the table ends before the line that starts with this
# has_header = false               # the columns are then called 1, 2, 3 and so on
ignore = ["IG"]                    # columns that are not read

# How the rows make curves
along = "control_voltage"          # meaning of the axis the curves are read along
turns = ["forward", "backward"]    # the axis turns back: names of the parts in order
# sort = true                      # the rows stand in any order (without turns)
# What does not change, by meaning; the temperature is always needed
[fixed]
temperature = { value = 25.0, unit = "degC" }
path_voltage = { value = 0.7, unit = "V" }
width = { value = 2.0, unit = "um" }

# What is fixed for the curves with certain labels only; several such tables are possible
# [[given]]
# labels = { device = "A1" }
# fixed = { width = { value = 2.0, unit = "um" } }
# Columns that stand repeated side by side under the same names: one word per group
# [repeat]
# label = "device"
# words = ["A1", "A2"]

# One table per column that is read, by header or by number (from 1). kind: label (a word per row), axis (what
# was set), value (what was measured). An axis that curves are not read along tells them apart.
$meanings
[[column]]
header = "VG"
meaning = "control_voltage"
kind = "axis"

[[column]]
header = "ID"
meaning = "path_current"
kind = "value"
per_width = true                   # divide by the width
sign = "positive"                  # negative: turned round when read; both: changes its sign
# At or below the floor a reading is an upper bound, at or above the compliance a lower bound
floor = { value = 0.2, unit = "pA" }
compliance = { value = 1.0, unit = "mA" }
# unit = "A"                       # where units = "stated"
# scale = "log10"                  # the file holds base-10 logarithms of numbers in the unit
# saturates = true                 # a flat top at a round value is the sample, no compliance
# unusual = true                   # numbers far outside the usual range are meant
# labels = { device = "A1" }       # for one column per device or sweep beside a shared axis
# fixed = { path_voltage = { value = 0.7, unit = "V" } }

[[column]]
header = "Device"
meaning = "device"                 # a word of your own
kind = "label"
# allowed = ["A1", "A2"]           # words that may stand in it
# number = 4                       # instead of header, from 1

$quantities
[[extract]]
quantity = "average_swing"
span = { low = 1.0e-11, high = 1.0e-7, unit = "A/um" }
sweep = "forward"
over = "median"                    # of the devices, or the word of one
"""
)


def _current(volt: float) -> float:
    """An invented transfer curve: 70 mV per decade, bending below 0.237 mA."""
    return 1.0 / (1.0 / (1e-12 * math.pow(10.0, volt / 0.07)) + 1.0 / 2.37e-4)


def _data() -> str:
    """Two devices, swept up and down, the falling sweep 10 mV beside the rising one."""
    lines = [*_JUNK, "VG (V),ID (A),IG (A),Device"]
    for device, shift in (("A1", 0.0), ("A2", 0.015)):
        up = [(0.05 * step, _current(0.05 * step - shift)) for step in range(_STEPS)]
        down = [(volt, _current(volt - shift + 0.01)) for volt, _ in reversed(up)]
        lines += [f"{volt:.2f},{current:.4E},1.0E-13,{device}" for volt, current in (*up, *down)]
    return "\n".join(lines) + "\n"


def curves_template(stem: str) -> dict[str, str]:
    """Return file name -> text of a description and of the raw file it describes."""
    meanings = "; ".join(f"{name} [{quantity.unit}]" for name, quantity in MEANINGS.items())
    text = _TEXT.substitute(
        stem=stem,
        meanings=comment(f"Meanings: {meanings}"),
        quantities=comment(f"What to read off the curves. Quantities: {', '.join(KINDS)}"),
    )
    return {f"{stem}.toml": text, f"{stem}.csv": _data()}
