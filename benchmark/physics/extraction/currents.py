"""Effective current of a switch from readings at half and full voltages, and means of sweeps (layer 3)."""

from __future__ import annotations

import math

import numpy as np

from benchmark.physics.extraction.result import (
    SWEEPS,
    Bound,
    CannotExtract,
    Extracted,
    Part,
    gathered,
    half_width,
)

__all__ = ["effective_current", "mean_of_sweeps"]


def _joint_bound(one: Bound, two: Bound) -> Bound:
    """Return the bound of a sum of two terms.

    Raises
    ------
    CannotExtract
        One is an upper, the other a lower bound.
    """
    if one and two and one != two:
        what = "of two numbers to add, one is an upper and one a lower bound"
        raise CannotExtract(what)
    return one or two


def _mean(one: Extracted, two: Extracted, more: tuple[Part, ...] = (), remarks: tuple[str, ...] = ()) -> Extracted:
    bound = _joint_bound(one.bound, two.bound)
    parts = () if bound else (*gathered((*one.parts, *two.parts), 0.5), *more)
    return Extracted(
        0.5 * (one.value + two.value),
        parts,
        one.points + two.points,
        (min(one.span[0], two.span[0]), max(one.span[1], two.span[1])),
        bound,
        np.concatenate([one.line_x, [math.nan], two.line_x]),
        np.concatenate([one.line_y, [math.nan], two.line_y]),
        one.used,
        (*one.remarks, *(remark for remark in two.remarks if remark not in one.remarks), *remarks),
    )


def effective_current(full_control: Extracted, full_path: Extracted) -> Extracted:
    """Return the mean of two currents read off curves: the effective drive current [A or A/m].

    Parameters
    ----------
    full_control : Extracted
        I_H: control at the supply, path at half of it.
    full_path : Extracted
        I_L: control at half the supply, path at the supply.

    Returns
    -------
    Extracted
        (I_H + I_L)/2; M. H. Na et al., "The effective drive current in CMOS inverters", IEDM 2002 (abstract). The
        errors of the two count as independent. With an upper bound in it, it is an upper bound, and likewise below.

    Raises
    ------
    CannotExtract
        One of the two is an upper and the other a lower bound.
    """
    return _mean(full_control, full_path)


def mean_of_sweeps(forward: Extracted, backward: Extracted) -> Extracted:
    """Return the mean of what a forward and a backward sweep give.

    Parameters
    ----------
    forward, backward : Extracted
        The same reading of both.

    Returns
    -------
    Extracted
        The mean; half the difference of the two counts as the half width of what the mean may be off by.

    Raises
    ------
    CannotExtract
        One of the two is an upper and the other a lower bound.
    """
    apart = forward.value - backward.value
    return _mean(
        forward, backward, (Part(SWEEPS, half_width(0.5 * apart)),), ("mean of the forward and backward sweep",)
    )
