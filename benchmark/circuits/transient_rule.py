"""Delay rule ``transient``: the factor of R C from the differential equations of a chain, point by point (layer 5).

Every point is a separate solution (0.1 to 1 s), so the rule is for declared points and for checking the closed forms,
not for searching a supply.
"""

from __future__ import annotations

import dataclasses
import math

import numpy as np

from benchmark.circuits.rules import EdgeFactors, EdgeInputs
from benchmark.circuits.transient import ChainLoad, chain_transient
from benchmark.devices.record import Array, Switch, SwitchPair

__all__ = ["transient"]

#: an actuator whose 1/w0 is below this share of R C is taken as a pure transport delay of its closing time; the error
#: of the delay is of the order of the share times the difference between transport and two-pole motion
QUASI_STATIC = 1.0e-2
_ARRAYS = tuple(
    field.name
    for field in dataclasses.fields(Switch)
    if field.name
    not in (
        "technology", "polarity", "partner", "resistance_kind", "stack_time", "input_scales_with_size", "current",
        "limits", "capabilities", "outside", "intermediates", "stage_only", "stack_on", "stack_off",
    )
)  # fmt: skip


def _at(switch: Switch, shape: tuple[int, ...], index: tuple[int, ...], quasi_static: float) -> Switch:
    """Return the switch at one point; its current law keeps the whole shape and is read at that point."""
    law = switch.current

    def current(control: Array, path: Array) -> Array:
        control, path = np.broadcast_arrays(control, path)
        whole = (*shape, control.shape[-1])
        found = law(np.broadcast_to(control, whole), np.broadcast_to(path, whole))
        return np.asarray(np.broadcast_to(found, whole)[index])

    changes = {name: np.broadcast_to(getattr(switch, name), shape)[index] for name in _ARRAYS}
    frequency = float(changes["natural_frequency"])
    if math.isfinite(frequency) and frequency * quasi_static > 1.0:
        changes["natural_frequency"] = np.asarray(np.nan)
    return dataclasses.replace(switch, current=current, stage_only="", **changes)


def transient(edge: EdgeInputs) -> EdgeFactors:
    """Stage inside a chain, solved as a differential equation at every point (see ``chain_transient``).

    A driving path of several switches counts as one switch of the path's resistance: its currents are scaled by
    R_switch / R_path, which is the same as scaling the load. F = (delay - t_int) / (R C); the wire factor is
    0.1 + 0.4 F as for ``chain``. nan where a point cannot be solved.
    """
    parts = (edge.supply, edge.resistance, edge.capacitance, edge.transit, edge.closing.resistance)
    shape = np.broadcast_shapes(*(np.shape(part) for part in parts))
    supply, resistance, capacitance, transit_time, own = (np.broadcast_to(part, shape) for part in parts)
    factor = np.full(shape, np.nan)
    for index in np.ndindex(shape):
        quasi_static = QUASI_STATIC * float(resistance[index] * capacitance[index])
        if not math.isfinite(quasi_static) or quasi_static <= 0.0:
            continue
        closing = _at(edge.closing, shape, index, quasi_static)
        opening = _at(edge.opening, shape, index, quasi_static)
        falling = closing.polarity == "down"
        pair = (
            SwitchPair(closing, opening, supply[index], np.asarray(np.nan))
            if falling
            else SwitchPair(opening, closing, supply[index], np.asarray(np.nan))
        )
        load = ChainLoad(float(capacitance[index] * resistance[index] / own[index]))
        result = chain_transient(pair, load)
        delay = result.falling_delay if falling else result.rising_delay
        factor[index] = (delay - float(transit_time[index])) / float(resistance[index] * capacitance[index])
    return EdgeFactors(np.asarray(transit_time), factor, np.asarray(0.1 + 0.4 * factor))
