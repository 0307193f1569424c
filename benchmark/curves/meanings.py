"""What the columns of a raw file may mean (layer 7.5). Ranges are ours, from memory, to catch unit slips."""

from __future__ import annotations

from benchmark.catalogue import Quantity
from benchmark.sets.tables import COLUMN_UNITS

__all__ = ["MEANINGS", "MULTIPLIED", "ONE_SIGN", "PER_WIDTH", "POSITIVE"]

_NAMED = (
    ("control_voltage", "V_c", "voltage of the control terminal", 0.0, 200.0, "any"),
    ("path_voltage", "V_p", "voltage across the switched path", 0.0, 200.0, "any"),
    ("temperature", "T", "temperature", 0.01, 1500.0, "positive"),
    ("path_current", "I", "current of the switched path", 1e-18, 10.0, "any"),
    ("path_current_per_width", "I/W", "current of the switched path per width", 1e-12, 1e5, "any"),
    ("input_capacitance", "C", "capacitance of the control terminal", 1e-21, 1e-3, "positive"),
    ("input_capacitance_per_width", "C/W", "capacitance of the control terminal per width", 1e-15, 1e-3, "positive"),
    ("path_resistance", "R", "resistance of the switched path", 1e-3, 1e18, "positive"),
)
_MORE = (
    Quantity("resistance_width", "R W", "resistance of the path times width", "ohm m", 1e-9, 1e12),
    Quantity("control_current", "I_c", "current of the control terminal", "A", 1e-18, 10.0, "any"),
    Quantity("control_current_per_width", "I_c/W", "the same per width", "A/m", 1e-12, 1e5, "any"),
    Quantity("charge", "Q", "charge of the control terminal", "C", 0.0, 1e-3, "any"),
    Quantity("charge_per_width", "Q/W", "the same per width", "C/m", 0.0, 1e-3, "any"),
    Quantity("pressure", "p", "pressure", "Pa", 0.0, 1e11, "any"),
    Quantity("force", "F", "force", "N", 0.0, 10.0, "any"),
    Quantity("displacement", "u", "displacement", "m", 0.0, 1e-3, "any"),
    Quantity("field", "E", "electric field", "V/m", 0.0, 1e10, "any"),
    Quantity("contact_spacing", "L", "spacing of the contacts of a transmission-line structure", "m", 1e-9, 1e-2),
    Quantity("width", "W", "width of the structure", "m", 1e-9, 1e-2),
    Quantity("time", "t", "time", "s", 0.0, 1e9, "nonnegative"),
    Quantity("switching_cycles", "N", "switching cycles", "1", 0.0, 1e18, "nonnegative"),
    Quantity("frequency", "f", "frequency", "Hz", 1e-6, 1e12),
)

#: meaning -> quantity; the unit fixes the dimension, the range (in SI) is for sizes without sign
MEANINGS: dict[str, Quantity] = {
    name: Quantity(name, symbol, meaning, COLUMN_UNITS[name], low, high, domain)  # type: ignore[arg-type]
    for name, symbol, meaning, low, high, domain in _NAMED
} | {quantity.name: quantity for quantity in _MORE}

#: what a column becomes when the description says ``per_width = true``
PER_WIDTH = {
    "path_current": "path_current_per_width",
    "control_current": "control_current_per_width",
    "input_capacitance": "input_capacitance_per_width",
    "charge": "charge_per_width",
    "path_resistance": "resistance_width",
}
#: of these, what is multiplied by the width
MULTIPLIED = frozenset({"path_resistance"})
#: values of one sign unless the description says otherwise: their logarithm is taken
ONE_SIGN = frozenset({"path_current", "path_current_per_width", "control_current", "control_current_per_width"})
#: values that physics allows above 0 only
POSITIVE = frozenset(name for name, quantity in MEANINGS.items() if quantity.domain == "positive")
