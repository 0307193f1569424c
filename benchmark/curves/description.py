"""The description of a raw file, as a strict pydantic model (layer 7.5)."""

from __future__ import annotations

import datetime
from typing import Annotated, Literal

from pydantic import Field

from benchmark.curves.requests import ExtractTable
from benchmark.sets.schema import FileModel, FreeNote, Measure, Schema, Text, Whole

__all__ = ["ColumnTable", "CurvesFile", "GivenTable", "RepeatTable"]

Labels = Annotated[dict[Text, Text], Field(description="Words of your own by name, such as device or sweep")]
Fixed = Annotated[dict[Text, Measure], Field(description="What does not change, by meaning, such as width")]


class ColumnTable(FileModel):
    """What one column of the raw file means."""

    header: Text | None = Field(default=None, description="Name of the column in the file")
    number: Whole | None = Field(default=None, description="Or its position, counted from 1")
    meaning: Text = Field(description="What the column holds; for labels: a name of your own, such as device")
    kind: Literal["label", "axis", "value"] = Field(
        description="label: a word per row; axis: what was set; value: what was measured"
    )
    unit: Text | None = Field(
        default=None, description="Unit of the numbers; left out where the file itself states it (key units)"
    )
    sign: Literal["positive", "negative", "both"] = Field(
        default="positive",
        description="negative: the numbers are turned round when read; both: a current may change its sign",
    )
    scale: Literal["linear", "log10"] | None = Field(
        default=None, description="log10: the file holds base-10 logarithms of numbers in the unit; default linear"
    )
    per_width: bool = Field(default=False, description="true: divide by the width (a resistance is multiplied)")
    floor: Measure | None = Field(default=None, description="Instrument floor: a size at or below is an upper bound")
    compliance: Measure | None = Field(default=None, description="Compliance: a size at or above is a lower bound")
    saturates: bool = Field(default=False, description="true: a flat top at a round value is the sample, no compliance")
    unusual: bool = Field(default=False, description="true: yes, numbers far outside the usual range are meant")
    allowed: list[Text] | None = Field(default=None, description="Words a label may have")
    labels: Labels = {}
    fixed: Fixed = {}


class RepeatTable(FileModel):
    """Groups of columns that stand repeated side by side under the same names."""

    label: Text = Field(description="What tells the groups apart, such as device")
    words: list[Text] = Field(min_length=2, description="One word per group, from left to right")


class GivenTable(FileModel):
    """What is fixed for the curves with certain labels, such as the width of one device."""

    labels: Labels
    fixed: Fixed


class CurvesFile(FileModel):
    """The description of a raw measured table."""

    schema_: Schema
    kind: Literal["curves"] = Field(description="Kind of the file")
    title: Text = Field(default="", description="One line for lists and figures")
    file: Text = Field(description="Name of the raw file beside this file")
    encoding: Literal["utf-8", "utf-16", "latin-1", "windows-1252"] = Field(
        default="utf-8", description="Encoding of the raw file; a byte order mark may stand before it"
    )
    delimiter: Literal[",", ";", "\t", "|", "whitespace"] = Field(
        default=",", description="What stands between two cells; whitespace: any run of blanks and tabs"
    )
    decimal: Literal[".", ","] = Field(default=".", description="Decimal sign of the numbers")
    comment: Text = Field(default="", description="Lines that start with this are left out")
    skip_rows: Whole = Field(default=0, ge=0, description="Lines before the header that are left out")
    header_starts: Text = Field(default="", description="Or: the text the header line starts with")
    has_header: bool = Field(default=True, description="false: no header; the columns are called 1, 2, 3 and so on")
    ends_before: Text = Field(default="", description="The table ends before the line that starts with this")
    units: Literal["stated", "row", "header"] = Field(
        default="stated",
        description="stated: each column says its unit here; row: a row of units follows the header; "
        "header: units stand in the header, such as ID (A), ID [A] or ID / A",
    )
    along: Text = Field(description="Meaning of the axis the curves are read along")
    sort: bool = Field(default=False, description="true: rows stand in any order; sort them along the axis")
    turns: list[Text] = Field(
        default=[],
        description="The axis turns back within a curve: names of the parts in order, such as forward, backward",
    )
    ignore: list[Text] = Field(default=[], description="Names of columns that are not read")
    fixed: Fixed = {}
    repeat: RepeatTable | None = Field(default=None, description="Columns repeated side by side under the same names")
    given: list[GivenTable] = Field(default=[], description="What is fixed for the curves with certain labels")
    column: list[ColumnTable] = Field(min_length=1, description="One table per column that is read")
    hero: bool = Field(default=False, description="true: one chosen device, not a typical one; it is named as such")
    evidence: Text = Field(description="What the numbers are worth: their evidence class")
    source: Text = Field(description="Where the numbers come from: a key of sources.toml")
    where: Text = Field(default="-", description="Place in the source: table, figure, page")
    conditions: Text = Field(description="What the numbers hold for: temperature, sample, geometry")
    date: datetime.date | None = Field(default=None, description="Day of the measurement, such as 2026-01-31")
    note: FreeNote = ""
    owner: Text = Field(default="", description="Who decided, for choices and targets")
    extract: list[ExtractTable] = Field(default=[], description="What is extracted from the curves")
