"""Links of transistors known by their currents (layer 4)."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from benchmark.devices.links.link import Link, Values
from benchmark.devices.links.resistive import SUPPLY_LINK
from benchmark.devices.record import Array

__all__ = ["STEEP_SWING_LINKS", "VIRTUAL_SOURCE_LINKS"]

_PARTNER = {"partner": ("own",)}


def _decades(v: Values, suffix: str) -> Array:
    return np.asarray(np.log10(v[f"on_current{suffix}"] / v[f"off_current{suffix}"]))


def _swings(v: Values, suffix: str) -> Array:
    return np.asarray(v["declared_supply"] / v[f"subthreshold_swing{suffix}"])


def _span(suffix: str, refused: float | None, hint: str) -> Link:
    """No current rises faster than its swing: the decades between off and on need so many swings of supply."""
    names = tuple(f"{name}{suffix}" for name in ("on_current", "off_current", "subthreshold_swing"))
    return Link(
        name=f"on-current, off-current and swing{' of the p type' if suffix else ''}",
        formula=f"log10({names[0]} / {names[1]}) at most declared_supply / {names[2]}",
        place=names[2],
        names=("declared_supply", *names),
        left=lambda v: _decades(v, suffix),
        right=lambda v: _swings(v, suffix),
        unit="decade",
        kind="at most",
        warned=None if refused is not None else 0.0,
        refused=refused,
        source="definition of the swing: volts per decade where the current rises fastest",
        hint=hint,
        when=_PARTNER if suffix else None,
    )


def _effective(suffix: str) -> Link:
    names = (f"effective_current{suffix}", f"on_current{suffix}")
    side: Callable[[int], Callable[[Values], Array]] = lambda position: lambda v: v[names[position]]  # noqa: E731
    return Link(
        name=f"effective current and on-current{' of the p type' if suffix else ''}",
        formula=f"{names[0]} at most {names[1]}",
        place=names[0],
        names=names,
        left=side(0),
        right=side(1),
        unit="uA/um",
        kind="at most",
        warned=None,
        refused=0.0,
        source="I_eff = [I(V, V/2) + I(V/2, V)]/2, both below I(V, V): M. H. Na et al., IEDM 2002 (from memory)",
        when=_PARTNER if suffix else None,
    )


def _access(suffix: str) -> Link:
    current = f"on_current{suffix}"
    return Link(
        name=f"access resistance, on-current and supply{' of the p type' if suffix else ''}",
        formula=f"2 access_resistance {current} at most declared_supply",
        place="access_resistance",
        names=("access_resistance", current, "declared_supply"),
        left=lambda v: 2.0 * v["access_resistance"] * v[current],
        right=lambda v: v["declared_supply"],
        unit="V",
        kind="at most",
        warned=None,
        refused=0.0,
        source="Ohm's law: both sides in series with the channel",
        when=_PARTNER if suffix else None,
    )


VIRTUAL_SOURCE_LINKS = (
    SUPPLY_LINK,
    *(
        _span(suffix, 0.0, "a transistor of this swing cannot have this on/off ratio at this supply")
        for suffix in ("", "_p")
    ),
    *(_effective(suffix) for suffix in ("", "_p")),
    *(_access(suffix) for suffix in ("", "_p")),
    Link(
        name="gate capacitance and its edges",
        formula="3 overlap_capacitance at most gate_capacitance_total",
        place="gate_capacitance_total",
        names=("overlap_capacitance", "gate_capacitance_total"),
        left=lambda v: 3.0 * v["overlap_capacitance"],
        right=lambda v: v["gate_capacitance_total"],
        unit="fF/um",
        kind="at most",
        warned=None,
        refused=0.0,
        source="switching charge of two edges, that of the drain counted twice",
    ),
    Link(
        name="gate length and pitch",
        formula="gate_length at most contacted_gate_pitch",
        place="contacted_gate_pitch",
        names=("gate_length", "contacted_gate_pitch"),
        left=lambda v: v["gate_length"],
        right=lambda v: v["contacted_gate_pitch"],
        unit="nm",
        kind="at most",
        warned=0.0,
        refused=None,
        source="geometry",
    ),
)

STEEP_SWING_LINKS = (
    SUPPLY_LINK,
    _span("", None, "the ceiling of the current is not reached at the declared supply"),
)
