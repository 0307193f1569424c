"""Value names of wires sets (layer 1)."""

from __future__ import annotations

from benchmark.catalogue.quantity import Quantity

__all__ = ["WIRE_QUANTITIES"]

WIRE_QUANTITIES: tuple[Quantity, ...] = (
    Quantity(
        "wire_resistance_per_length",
        "r",
        "resistance of a local wire per length",
        "ohm/um",
        0.05,
        2000.0,
        "nonnegative",
    ),
    Quantity(
        "wire_capacitance_per_length", "c", "capacitance of a local wire per length", "fF/um", 0.05, 0.5, "nonnegative"
    ),
    Quantity(
        "layout_capacitance_per_pin",
        "C_pin",
        "layout parasitic of every gate input and output, both sides",
        "aF",
        0.1,
        1000.0,
        "nonnegative",
    ),
)
