"""Measured curves as the description of a raw file made them (layer 7.5): SI arrays, marks and provenance."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from benchmark.curves.requests import Request

__all__ = ["Array", "BoolArray", "IntArray", "MeasuredCurves", "Sweep"]

Array = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
IntArray = NDArray[np.int64]


@dataclass(frozen=True)
class Sweep:
    """One curve, in the order it was measured.

    Attributes
    ----------
    labels : mapping of str to str
        What tells this curve from the others in words, such as device and sweep (forward, backward).
    fixed : mapping of str to float
        Meaning -> SI: what does not change along the curve (temperature, path_voltage, width, ...).
    columns : mapping of str to array
        Meaning -> SI, shape (points,): the axis read along and every value column. The axis rises or falls strictly.
    rows : array of int, shape (points,)
        Line of the file each point stands on, counted from 1.
    at_floor, at_compliance : mapping of str to array of bool
        Value meaning -> shape (points,), for every value column: the size of the value is only an upper bound
        (at or below the declared floor), or only a lower bound (at or above the declared compliance). Below the
        floor a value may have either sign: it is noise, and the floor is the bound.
    floor, compliance : mapping of str to float
        Value meaning -> SI, only where declared, in the dimension of the column here (divided by the width like it).
    """

    labels: Mapping[str, str]
    fixed: Mapping[str, float]
    columns: Mapping[str, Array]
    rows: IntArray
    at_floor: Mapping[str, BoolArray]
    at_compliance: Mapping[str, BoolArray]
    floor: Mapping[str, float] = field(default_factory=dict)
    compliance: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True)
class MeasuredCurves:
    """Every curve of one raw file.

    ``name``: stem of the description; ``file`` and ``description``: the two files as shown to the user; ``digest`` and
    ``description_digest``: sha256 of their bytes. ``along``: meaning of the axis the curves are read along.
    ``units``: meaning -> unit to print it in. ``hero``: the file says it is one chosen device, not a typical one.
    ``notes``: everything that was done to the file, in plain sentences. ``extract``: the requests of the description.
    """

    name: str
    file: str
    description: str
    digest: str
    description_digest: str
    along: str
    sweeps: tuple[Sweep, ...]
    units: Mapping[str, str]
    notes: tuple[str, ...]
    evidence: str
    source: str
    where: str
    conditions: str
    date: str
    owner: str
    note: str = ""
    title: str = ""
    hero: bool = False
    extract: tuple[Request, ...] = ()
