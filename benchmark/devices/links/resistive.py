"""Links of a switch stated by its resistance (layer 4)."""

from __future__ import annotations

import math

from benchmark.devices.links.link import Link

__all__ = ["GIVEN_LINKS", "SUPPLY_LINK"]

#: as for material constants: two statements of one thing from one sample agree within this (common practice, no source)
WARNED, REFUSED = 0.05, 0.25

SUPPLY_LINK = Link(
    name="declared supply and its ceiling",
    formula="declared_supply at most supply_ceiling",
    place="declared_supply",
    names=("declared_supply", "supply_ceiling"),
    left=lambda v: v["declared_supply"],
    right=lambda v: v["supply_ceiling"],
    unit="V",
    kind="at most",
    warned=0.0,
    refused=None,
    source="definition of both",
    hint="the declared point itself is not allowed",
)

GIVEN_LINKS = (
    SUPPLY_LINK,
    Link(
        name="closing voltage and switching level",
        formula="closing_voltage = switching_level declared_supply",
        place="closing_voltage",
        names=("closing_voltage", "switching_level", "declared_supply"),
        left=lambda v: v["closing_voltage"],
        right=lambda v: v["switching_level"] * v["declared_supply"],
        unit="V",
        kind="equal",
        warned=None,
        refused=0.01,
        source="definition of the switching level; 1 % is rounding of data",
    ),
    Link(
        name="on-resistance and on-state current",
        formula="on_resistance = declared_supply / closed_state_current",
        place="closed_state_current",
        names=("on_resistance", "declared_supply", "closed_state_current"),
        left=lambda v: v["on_resistance"],
        right=lambda v: v["declared_supply"] / v["closed_state_current"],
        unit="kohm",
        kind="equal",
        warned=WARNED,
        refused=REFUSED,
        source="Ohm's law",
        hint="an on-resistance holds at the voltage across the switch that its conditions state",
    ),
    Link(
        name="on-resistance and effective drive current",
        formula="on_resistance = declared_supply / (2 ln 2 effective_drive_current)",
        place="effective_drive_current",
        names=("on_resistance", "declared_supply", "effective_drive_current"),
        left=lambda v: v["on_resistance"],
        right=lambda v: v["declared_supply"] / (2.0 * math.log(2.0) * v["effective_drive_current"]),
        unit="kohm",
        kind="equal",
        warned=WARNED,
        refused=REFUSED,
        source="50 % step delay ln 2 R C of a current source; M. H. Na et al., IEDM 2002 (from memory)",
        hint="the resistance of a current source is its supply over 1.386 times its effective current",
    ),
)
