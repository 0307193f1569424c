"""What can be read off measured curves, and what each reading needs to be told (layer 7.5)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

__all__ = ["KINDS", "Kind", "QuantityName"]

QuantityName = Literal[
    "average_swing",
    "minimum_swing",
    "fitted_swing",
    "threshold_at_current",
    "threshold_extrapolated",
    "current",
    "resistance",
    "effective_current",
    "switching_charge",
    "switching_capacitance",
    "hysteresis_window",
    "contact_resistance",
    "contact_resistivity",
    "sheet_resistance",
    "transfer_length",
    "resistance_slope",
    "log_resistance_slope",
    "pull_in_voltage",
    "pull_out_voltage",
    "cycles_to_failure",
]

_EXAMPLES = {
    "span": 'span = { low = 1e-12, high = 1e-8, unit = "A/um" }, in the unit of what it spans',
    "level": 'level = { value = 1e-7, unit = "A/um" }, in the unit of the column it is a level of',
    "at": 'at = { value = 0.5, unit = "V" }',
    "supply": 'supply = { value = 0.7, unit = "V" }',
    "half_path_voltage": 'half_path_voltage = "subtracted" (small path voltage) or "kept"',
    "sweep": 'sweep = "forward", "backward" or "mean"',
}


@dataclass(frozen=True)
class Kind:
    """One kind of reading.

    ``meaning``: what it is, in words. ``along``: axes it can be read along. ``of``: columns it can be read from.
    ``unit``: unit of the result, from the units of the columns. ``needs`` and ``may``:
    keys of the request. ``measured_in``: key -> "of", or a unit, where it is not in the unit of the axis.
    ``least_points``: fewest neighbouring points of a local slope. ``logarithmic``: a spread of the result is one of its
    logarithm.
    """

    meaning: str
    along: tuple[str, ...]
    of: tuple[str, ...]
    unit: str
    needs: tuple[str, ...] = ()
    may: tuple[str, ...] = ("sweep",)
    measured_in: Mapping[str, str] = field(default_factory=dict)
    least_points: int = 0
    logarithmic: bool = False

    def unit_for(self, of: str, along: str, units: Mapping[str, str]) -> str:
        """Return the unit to print the result in, for a column and an axis with these units."""
        width = "/um" if of.endswith("_per_width") else ""
        read, axis = units[of], units[along]
        charge = read if of.startswith("charge") else f"fC{width}"
        capacitance = read if of.startswith("input_capacitance") else f"fF{width}"
        inside = f"({axis})" if set(axis) & set("/ *") else axis
        return self.unit.format(of=read, along=inside, charge=charge, capacitance=capacitance)

    @staticmethod
    def example(key: str) -> str:
        """Say how a key is written."""
        return _EXAMPLES[key]


_CONTROL = ("control_voltage",)
_CURRENT = ("path_current", "path_current_per_width")
_SWING_SPAN = {"span": "of"}


def _swing(meaning: str, least_points: int = 0) -> Kind:
    may = ("sweep", "points") if least_points else ("sweep",)
    return Kind(meaning, _CONTROL, _CURRENT, "mV/decade", ("span",), may, _SWING_SPAN, least_points)


def _charge(meaning: str, unit: str) -> Kind:
    of = ("input_capacitance", "input_capacitance_per_width", "charge", "charge_per_width")
    return Kind(meaning, _CONTROL, of, unit, ("span",), logarithmic=True)


def _contact(meaning: str, unit: str) -> Kind:
    return Kind(meaning, ("contact_spacing",), ("resistance_width",), unit, (), ("span", "weights"), logarithmic=True)


def _slope(meaning: str, unit: str) -> Kind:
    return Kind(meaning, ("pressure", "control_voltage"), ("path_resistance",), unit, (), ("span", "sweep"))


def _jump(meaning: str) -> Kind:
    of = (*_CURRENT, "displacement")
    return Kind(meaning, _CONTROL, of, "V", (), ("factor", "step"), {"step": "of"})


KINDS: dict[str, Kind] = {
    "average_swing": _swing("subthreshold swing: voltage between two currents, over the decades between them"),
    "minimum_swing": _swing("smallest local subthreshold swing within a span of currents", 2),
    "fitted_swing": _swing("subthreshold swing: least-squares line through the points of a span of currents"),
    "threshold_at_current": Kind(
        "threshold voltage: control voltage at a stated current", _CONTROL, _CURRENT, "V", ("level",),
        measured_in={"level": "of"},
    ),
    "threshold_extrapolated": Kind(
        "threshold voltage: line at the largest transconductance, drawn to zero current", _CONTROL, _CURRENT, "V",
        ("half_path_voltage",), ("sweep", "points"), least_points=3,
    ),
    "current": Kind(
        "current at a stated voltage", ("control_voltage", "path_voltage"), _CURRENT, "{of}", ("at",), logarithmic=True
    ),
    "resistance": Kind(
        "resistance at a stated voltage", ("control_voltage", "path_voltage"), ("path_resistance",), "{of}", ("at",),
        logarithmic=True,
    ),
    "effective_current": Kind(
        "effective current: mean of the currents at full control and half path voltage, and at half control and full "
        "path voltage",
        ("control_voltage", "path_voltage"), _CURRENT, "{of}", ("supply",), logarithmic=True,
    ),
    "switching_charge": _charge("charge of the input over the stated swing of its voltage", "{charge}"),
    "switching_capacitance": _charge("charge of the input over the stated swing, over that swing", "{capacitance}"),
    "hysteresis_window": Kind(
        "control voltage of the forward sweep minus that of the backward sweep at a stated current", _CONTROL, _CURRENT,
        "V", ("level",), (), {"level": "of"},
    ),
    "contact_resistance": _contact("resistance of one contact times its width", "{of}"),
    "contact_resistivity": _contact("contact resistivity, for contacts longer than 1.5 transfer lengths", "ohm m^2"),
    "sheet_resistance": _contact("sheet resistance between the contacts", "ohm"),
    "transfer_length": _contact("transfer length of the contact", "{along}"),
    "resistance_slope": _slope("decades that the resistance falls per unit of the axis", "decade/{along}"),
    "log_resistance_slope": _slope("slope of the natural logarithm of the resistance along the axis", "1/{along}"),
    "pull_in_voltage": _jump("control voltage at which a rising sweep jumps"),
    "pull_out_voltage": _jump("control voltage at which a falling sweep jumps back"),
    "cycles_to_failure": Kind(
        "switching cycles until the column first crosses the stated limit", ("switching_cycles",),
        ("path_resistance", *_CURRENT), "1", ("level",), (), {"level": "of"}, logarithmic=True,
    ),
}  # fmt: skip
