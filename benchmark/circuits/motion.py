"""Charge that runs through a stage while actuators move: both switches conduct in the middle of their way (layer 5).

While the control of the closing switch goes from 0 to V as y(t) and that of the opening one the other way, the two in
series carry V g(y), g = 1/(R_closing(y V) + R_opening((1 - y) V)) at the full supply. If the output follows them at
once (actuators slow against R C) the charge of one edge is::

    Q_motion = V integral [g(y) - g(1)] dt = V integral [g(y) - g(1)] (dt/dy) dy

with t(y) the first passage of the two-pole actuator behind a step. Without a natural frequency a switch makes no way
(it answers late, but at once), and nothing is added. What an output that lags behind leaves of it is up to
``lagging``.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Final

import numpy as np

from benchmark.circuits.cells import Edge
from benchmark.circuits.sized import EDGES, OTHER
from benchmark.devices.record import Array, Switch, SwitchPair
from benchmark.physics.two_pole import time_to_level

__all__ = ["HALF", "lagging", "motion_charges"]

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(24)
#: way of the actuator; the nodes lie symmetrically, so those of the opening switch are the same in reverse
_WAY = 0.5 + 0.5 * _NODES
_WAY_WEIGHTS = 0.5 * _WEIGHTS
#: half step of dt/dy; the first and last node lie further inside than this
_STEP = 1.0e-3
#: charge of motion over charge of the node at which half of it is left (own fit, see ``lagging``)
HALF: Final = 0.15


def _pace(switch: Switch) -> Array:
    """Return dt/dy of the actuator at the nodes [s], with one trailing axis; 0 where there is none."""
    frequency, quality = switch.natural_frequency[..., None], switch.quality[..., None]
    later, earlier = (time_to_level(_WAY + step, frequency, quality) for step in (_STEP, -_STEP))
    return np.asarray(np.where(np.isfinite(frequency), (later - earlier) / (2.0 * _STEP), 0.0))


def motion_charges(pair: SwitchPair) -> Mapping[Edge, Array]:
    """Return Q_motion [C] of two unit switches by the edge that closes; see the module docstring.

    Gauss-Legendre with 24 nodes. Where the two actuators differ the slower one sets the pace. Nothing is
    computed when no switch has a natural frequency.
    """
    switches = {edge: pair.down if edge == "down" else pair.up for edge in EDGES}
    if not any(np.isfinite(switch.natural_frequency).any() for switch in switches.values()):
        return dict.fromkeys(EDGES, np.asarray(0.0))
    supply = np.asarray(pair.supply)[..., None]
    paces = [_pace(switch) for switch in switches.values()]
    weights = np.maximum(paces[0], paces[1]) * _WAY_WEIGHTS
    conductance: dict[Edge, Array] = {}
    open_: dict[Edge, Array] = {}
    for edge, switch in switches.items():
        conductance[edge] = np.asarray(switch.current(_WAY * supply, supply + 0.0 * _WAY) / supply)
        open_[edge] = np.asarray(switch.off_current_path)[..., None] / supply
    found: dict[Edge, Array] = {}
    for edge in EDGES:
        series = _series(conductance[edge], conductance[OTHER[edge]][..., ::-1])
        rest = _series(conductance[edge][..., -1:], open_[OTHER[edge]])
        found[edge] = np.asarray((supply * np.maximum(series - rest, 0.0) * weights).sum(axis=-1))
    return found


def _series(one: Array, other: Array) -> Array:
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(np.where(one + other > 0.0, one * other / (one + other), 0.0))


def lagging(charge: Array, node: Array) -> Array:
    """Return what is left of a charge of motion Q [C] at a node that holds C V [C]: Q^2 / (Q + 0.15 C V).

    An output that has not moved yet has no voltage across the opening switch, so little passes it; the more charge the
    pair could carry against that of the node, the sooner the output follows. Own form with one fitted number, from
    chains in ngspice (``tests/data/closed-form-stress-gated.csv``, transit over R C 1 to 100, where single points ask
    for 0.02 to 0.28).
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        left = charge**2 / (charge + HALF * node)
    return np.asarray(np.where(charge > 0.0, left, 0.0))
