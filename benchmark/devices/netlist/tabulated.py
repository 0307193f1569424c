"""Any current law as a look-up table in a sub-circuit, for models without a closed form (layer 4).

ln(I / path) is tabulated over control and path voltage and interpolated linearly in both: one ``pwl`` of the control
per path voltage, weighted by hat functions of the path voltage. Path voltages are spaced as squares; below the first
one the conductance is constant. The control is held between zero and the supply, a negative path voltage reverses the
sign.
"""

from __future__ import annotations

from typing import Final

import numpy as np

from benchmark.devices.netlist.parts import (
    Polarity,
    SubCircuits,
    SwitchText,
    control_path,
    held,
    named,
    number,
    scalar,
)
from benchmark.devices.record import Array, Switch, SwitchPair
from benchmark.errors import UsageError

__all__ = ["LARGEST_ERROR", "tabulated"]

CONTROLS: Final = 161
PATHS: Final = 25
FIRST_PATH: Final = 1.0e-3  # of the supply
#: error of ln I at the middles of the cells beyond which no table is written
LARGEST_ERROR: Final = 0.02
#: a switch that carries nothing at all is written with this conductance [S]
_NOTHING: Final = 1.0e-30


def _log_conductance(switch: Switch, control: Array, path: Array) -> Array:
    """Return ln(I/path) on the product of two axes, shape (paths, controls)."""
    dimensions = np.ndim(switch.resistance)
    volts, over = np.tile(control, len(path)), np.repeat(path, len(control))
    shape = (1,) * dimensions + (-1,)
    current = np.asarray(switch.current(volts.reshape(shape), over.reshape(shape)), dtype=np.float64).reshape(-1)
    return np.asarray(np.log(np.maximum(current / over, _NOTHING)).reshape(len(path), len(control)))


def _pairs(x: Array, y: Array) -> str:
    """Return the points of a pwl, a few per line."""
    points = [f"{number(a)},{number(b)}" for a, b in zip(x, y, strict=True)]
    return ",\n+ ".join(", ".join(points[i : i + 4]) for i in range(0, len(points), 4))


def _one(switch: Switch, polarity: Polarity, supply: float) -> tuple[SwitchText, float]:
    control = np.linspace(0.0, supply, CONTROLS)
    path = supply * np.linspace(np.sqrt(FIRST_PATH), 1.0, PATHS) ** 2
    value = _log_conductance(switch, control, path)
    if not np.isfinite(value).all():
        message = "the current of this switch is not known over the whole swing: no netlist"
        raise UsageError(message)
    middle = _log_conductance(switch, 0.5 * (control[1:] + control[:-1]), 0.5 * (path[1:] + path[:-1]))
    mean = 0.25 * (value[1:, 1:] + value[:-1, 1:] + value[1:, :-1] + value[:-1, :-1])
    lines, acting = control_path(switch, polarity)
    lines += (f"Bheld held 0 V={held(acting, supply)}",)
    terms = []
    flat = np.abs(value - value[0]).max() < 1.0e-12  # ohmic: one row says it all
    for k in range(1 if flat else PATHS):
        lines += (f"Brow{k} row{k} 0 V=pwl(v(held),\n+ {_pairs(control, value[k])})",)
        hat = np.zeros(PATHS)
        hat[k] = 1.0
        terms.append(f"v(row{k})" if flat else f"v(row{k})*v(hat{k})")
        if not flat:
            lines += (f"Bhat{k} hat{k} 0 V=pwl(abs(v(d,s)),\n+ {_pairs(path, hat)})",)
    lines += (f"Bpath d s I={{size}}*v(d,s)*exp(\n+ {_sum(terms)})",)
    error = float(np.abs(mean - middle).max())
    return SwitchText(named(lines, "current law as a table"), None, scalar(switch.terminal_capacitance)), error


def _sum(terms: list[str]) -> str:
    return "\n+ +".join("+".join(terms[i : i + 6]) for i in range(0, len(terms), 6))


def tabulated(pair: SwitchPair) -> SubCircuits:
    """Return both switches of a pair as tables.

    Raises
    ------
    UsageError
        If a current is not known over the whole swing or the tables would not be good to 2 %.
    """
    supply = scalar(pair.supply)
    down, error_down = _one(pair.down, "down", supply)
    up, error_up = _one(pair.up, "up", supply)
    error = max(error_down, error_up)
    if error > LARGEST_ERROR:
        message = (
            f"this current law has no closed form, and as a table it would be off by up to {100.0 * error:.2g} % "
            f"(allowed {100.0 * LARGEST_ERROR:g} %): no netlist"
        )
        raise UsageError(message)
    note = f"The current is a table of {CONTROLS} by {PATHS} points, good to {100.0 * error:.2g} % between them."
    return SubCircuits(down, up, (note,))
