"""A NAND2 with one input moving as a pair of switches, so that the program's own transient can solve it.

Pull-down: the switch of the moving input (at the output) in series with a closed one. Pull-up: the switch of the moving
input beside an open one. The balance of the two currents in series is found by bisection of the voltage between them,
once on a grid; between the grid points ln(I / path) is a bicubic spline.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable

import numpy as np
from scipy.interpolate import RectBivariateSpline

from benchmark.devices.record import Array, SwitchPair

__all__ = ["nand2_pair"]

Law = Callable[[Array, Array], Array]

_FIRST = 0.01  # square root of the first path voltage over the supply


def _of(current: Law) -> Law:
    """The law of a record of shape (1, 1, 1) for arrays of one axis."""
    return lambda control, path: np.asarray(current(control.reshape(1, 1, 1, -1), path.reshape(1, 1, 1, -1))).ravel()


def _series(law: Law, lifted: bool, supply: float, control: Array, path: Array) -> Array:
    """Current of a switch at ``control`` above a closed one in series; ``lifted``: it counts from its source."""
    low, high = np.zeros_like(path), path.copy()
    for _ in range(60):
        middle = 0.5 * (low + high)
        top = law(control - middle if lifted else control, path - middle)
        more = top > law(np.full_like(middle, supply), middle)
        low, high = np.where(more, middle, low), np.where(more, high, middle)
    return law(np.full_like(low, supply), 0.5 * (low + high))


def _splined(law: Law, supply: float) -> Law:
    controls, roots = np.linspace(0.0, supply, 201), np.linspace(_FIRST, 1.0, 33)
    u, r = np.meshgrid(controls, roots, indexing="ij")
    path = supply * r**2
    value = np.log(law(u.ravel(), path.ravel()) / path.ravel()).reshape(u.shape)
    spline = RectBivariateSpline(controls, roots, value)

    def current(control: Array, path: Array) -> Array:
        root = np.sqrt(np.clip(path / supply, _FIRST**2, 1.0))
        return np.asarray(path * np.exp(spline.ev(control, root)))

    return current


def nand2_pair(pair: SwitchPair, lifted: bool) -> SwitchPair:
    """Return the gate as a pair at one design point; ``lifted``: controls count from the source, not from a plate."""
    supply = float(pair.supply.ravel()[0])
    down, up = _of(pair.down.current), _of(pair.up.current)

    def beside(control: Array, path: Array) -> Array:
        return up(control, path) + up(np.zeros_like(control), path)

    def stack(control: Array, path: Array) -> Array:
        return _series(down, lifted, supply, control, path)

    lower = dataclasses.replace(pair.down, current=_splined(stack, supply))
    upper = dataclasses.replace(pair.up, current=_splined(beside, supply))
    flat = {name: np.asarray(getattr(pair, name)).reshape(()) for name in ("supply", "temperature")}
    return SwitchPair(_scalar(lower), _scalar(upper), **flat)


def _scalar(switch: object) -> object:
    """Fields of size 1 as scalars, so that the law is called with one axis."""
    changes = {}
    for field in dataclasses.fields(switch):  # type: ignore[arg-type]
        value = getattr(switch, field.name)
        if isinstance(value, (np.ndarray, np.generic)) and not field.name.startswith("stack_"):
            changes[field.name] = np.asarray(value).reshape(())
        elif field.name.startswith("stack_o"):
            changes[field.name] = np.asarray(value).reshape(np.asarray(value).shape[-1:])
    return dataclasses.replace(switch, **changes)  # type: ignore[type-var]
