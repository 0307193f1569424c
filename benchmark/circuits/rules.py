"""Delay rules: the factor of R C and the wire term of one edge (layer 5).

A rule sees one output edge: the switch that closes and drives it, the switch that opens, the resistance of the driving
path and the lumped capacitance. It answers with the load-independent time, the factor F of every R C product and the
factor of r c L^2. ``chain`` and ``step`` are closed forms, ``integral`` solves for the factor.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

import numpy as np

from benchmark.circuits.chain_rule import STEP_FACTOR, chain_factor
from benchmark.circuits.integral import integral_factors
from benchmark.devices.record import Array, Switch
from benchmark.errors import UsageError, nearest

__all__ = [
    "RULES",
    "STEP_WIRE_FACTOR",
    "EdgeFactors",
    "EdgeInputs",
    "StageRule",
    "chain",
    "integral",
    "rule_by_name",
    "step",
]

#: t50 of a distributed line behind a step: 0.377 r c L^2 (Sakurai, IEEE JSSC 18 (1983) 418, from memory).
#: 0.1 + 0.4 ln 2 = 0.37726 is the same number rounded differently; the printed constant is used.
STEP_WIRE_FACTOR: Final = 0.377


@dataclass(frozen=True)
class EdgeInputs:
    """What a rule may use about one output edge.

    closing, opening
        The switch (unit size) that closes and drives the edge, and the one that opens. On this edge the next stage
        closes a switch like ``opening`` (of the other polarity than the driver).
    supply [V], resistance [ohm] of the driving path, capacitance [F] lumped at the output (own, wire, inputs, fixed),
    transit [s] = max(closing time of the stack, opening time).
    """

    closing: Switch
    opening: Switch
    supply: Array
    resistance: Array
    capacitance: Array
    transit: Array


@dataclass(frozen=True)
class EdgeFactors:
    """Answer of a rule: load-independent time [s], factor of R C [1], factor of r c L^2 [1]."""

    transit: Array
    factor: Array
    wire_factor: Array


StageRule = Callable[[EdgeInputs], EdgeFactors]


def chain(edge: EdgeInputs) -> EdgeFactors:
    """Stage inside a chain: F = max(0.60, ln 1/(1 - w)), wire factor 0.1 + 0.4 F.

    w is the switching level of the switch that this edge closes in the *next* stage, so it belongs to the polarity
    that opens here; for pairs of equal switches the distinction vanishes. nan when it does not switch. Wire form:
    Sakurai (from memory), within 1 % of the exact open line at its 50, 63 and 90 % points; with a driver and a load
    up to 3.3 % too short at 50 %. Error of F: see ``chain_factor``.
    """
    waited = chain_factor(edge.opening.switching_level)
    factor = np.where(np.isfinite(waited), waited, np.nan)  # a level never reached is no switching
    return EdgeFactors(edge.transit, factor, 0.1 + 0.4 * factor)


def step(edge: EdgeInputs) -> EdgeFactors:
    """Stage behind an ideal step: F = ln 2 (exact for a lumped R C), wire factor 0.377.

    A switch that does not switch (switching level nan) has no delay either.
    """
    factor = np.where(np.isnan(edge.closing.switching_level), np.nan, STEP_FACTOR)
    return EdgeFactors(edge.transit, factor, np.asarray(factor / STEP_FACTOR * STEP_WIRE_FACTOR))


def integral(edge: EdgeInputs) -> EdgeFactors:
    """Stage inside a chain, solved with the actuators of both switches still under way; see ``integral_factors``.

    F is the marginal factor of R C at this point, the rest of the delay counts as load-independent. Wire factor
    0.1 + 0.4 F as for ``chain``.
    """
    found = integral_factors(
        edge.closing,
        edge.supply,
        edge.capacitance,
        resistance=edge.resistance,
        opening=edge.opening,
        transit=edge.transit,
    )
    return EdgeFactors(found.transit, found.factor, 0.1 + 0.4 * found.factor)


RULES: Final = MappingProxyType({"chain": chain, "step": step, "integral": integral})


def rule_by_name(name: str) -> StageRule:
    """Return the rule of that name.

    Raises
    ------
    UsageError
        If there is none.
    """
    if name == "transient":
        from benchmark.circuits.transient_rule import transient  # it builds on this module, and needs an ODE solver

        return transient
    if name not in RULES:
        message = f"no delay rule {name!r}; known are {', '.join(RULES)}, transient; {nearest(name, RULES)}"
        raise UsageError(message)
    return RULES[name]
