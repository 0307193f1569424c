"""What the ``table`` model reads, and the interpolants built from it (layer 4)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Final

import numpy as np

from benchmark.devices.model import Default, Input, ModelInputs, Option
from benchmark.devices.record import Array, BoolArray
from benchmark.devices.standing import STANDING_INPUTS, array
from benchmark.measured import MeasuredTable
from benchmark.physics.interpolation import Curve, charge_curve, outside
from benchmark.physics.measured_current import CurrentSurface, current_surface

__all__ = [
    "INPUTS",
    "OPTIONS",
    "PER_WIDTH",
    "REFERENCES",
    "SWEEPS",
    "TABLES",
    "Charge",
    "prepare_charge",
    "prepare_surfaces",
    "sweep_rows",
]

INPUTS: Final = (
    *STANDING_INPUTS,
    Input("saturation_voltage", required=False),
    Input("unit_width", required=False),
    Input("terminal_capacitance", required=False),
    Input("terminal_capacitance_per_width", required=False),
    Input("input_capacitance", required=False),
    Input("gate_capacitance_total", required=False),
    Input("drain_capacitance_share", required=False),
    Input("transit_time"),
    Input(
        "extra_energy_per_cycle",
        required=False,
        default=Default(0.0, "assumed", "not stated: no loss beyond charge times supply"),
    ),
)
OPTIONS: Final = (
    Option("branch", ("pessimistic", "forward", "backward"), "pessimistic"),
    Option("partner", ("mirrored", "none"), "mirrored"),
    Option("size_scaling", ("width",), "width"),
)
TABLES: Final[dict[str, bool]] = {"current": True, "charge": False}
REFERENCES: Final = (
    "monotone interpolation: F. N. Fritsch and J. Butland, SIAM J. Sci. Stat. Comput. 5, 300 (1984)",
    "nothing outside the data: no extrapolation in voltage or temperature",
    "one measured path voltage: R = V / I(V, V), level from I(w V, V) = I(V, V) / 2",
    "several: R = V / (2 ln 2 I_eff), level 0.5 (M. H. Na et al., IEDM 2002, from memory)",
    "pessimistic branch: larger current at zero control, smaller at full control (own form)",
)

PER_WIDTH = "_per_width"
SWEEPS = ("forward", "backward")


def sweep_rows(table: MeasuredTable) -> dict[str, BoolArray]:
    """Return the rows of each sweep; a table without both directions is one sweep."""
    labels = np.asarray(table.labels.get("sweep", ()))
    if labels.size and set(labels.tolist()) == set(SWEEPS):
        return {name: labels == name for name in SWEEPS}
    return {"only": np.full(table.columns[table.value].size, True)}


def _current_columns(table: MeasuredTable) -> dict[str, Array]:
    """Return the axes and the current, with rows at or below the floor set to the floor (their upper bound)."""
    columns = {name: values for name, values in table.columns.items() if name != table.value}
    current = table.columns[table.value]
    floor = table.floor.get(table.value)
    columns["current"] = current if floor is None else np.maximum(current, floor)
    return columns


def _single(value: Array) -> float:
    return float(np.ravel(value)[0])


def prepare_surfaces(
    inputs: ModelInputs, values: Mapping[str, Array]
) -> tuple[dict[str, CurrentSurface], Array, Array | None]:
    """Return the current surface of each sweep, the width that scales them and the floor of the unit switch [A]."""
    table = inputs.tables["current"]
    columns = _current_columns(table)
    paths = columns.get("path_voltage")
    surfaces = {
        name: current_surface(
            {column: data[rows] for column, data in columns.items()},
            None if paths is not None else _single(values["declared_supply"]),
            _single(values["reference_temperature"]),
        )
        for name, rows in sweep_rows(table).items()
    }
    width = values["unit_width"] if table.value.endswith(PER_WIDTH) else array(1.0)
    floor = table.floor.get(table.value)
    return surfaces, width, None if floor is None else floor * width


@dataclass(frozen=True)
class Charge:
    """Input charge of the unit switch: from a table (curves by temperature) or from a constant capacitance."""

    constant: Array | None
    temperatures: Array
    curves: tuple[Curve, ...]
    factor: Array

    def at(self, supply: Array, temperature: Array) -> tuple[Array, dict[str, BoolArray]]:
        """Return Q(V) [C] and, by reason, where the table does not reach; straight in T between temperatures."""
        if self.constant is not None:
            return np.asarray(self.constant * self.factor * supply), {}
        low, high = float(self.temperatures[0]), float(self.temperatures[-1])
        end = min(item.high for item in self.curves)
        beyond_temperature = outside(temperature, low, high)
        inside = np.where(beyond_temperature, low, temperature)
        total: Array = np.asarray(0.0)
        for position, item in enumerate(self.curves):
            unit = np.zeros(self.temperatures.size)
            unit[position] = 1.0
            weight = np.interp(inside, self.temperatures, unit)
            total = total + np.where(weight > 0.0, weight * item(supply), 0.0)
        span = f"{low - 273.15:g} degC only" if low == high else f"{low - 273.15:g} to {high - 273.15:g} degC"
        reasons = {
            f"beyond the measured charge (ends at {end:g} V)": outside(supply, 0.0, end),
            f"beyond the measured charge (measured at {span})": beyond_temperature,
        }
        return np.where(beyond_temperature, np.nan, total * self.factor), reasons


def prepare_charge(inputs: ModelInputs, values: Mapping[str, Array]) -> Charge:
    """Return the input charge of the unit switch as measured."""
    table = inputs.tables.get("charge")
    if table is None:
        constant = values.get("input_capacitance")
        if constant is None:
            constant = values["gate_capacitance_total"] * values["unit_width"]
        return Charge(constant, array([]), (), array(1.0))
    voltage, capacitance = table.columns["control_voltage"], table.columns[table.value]
    temperature = table.columns.get("temperature", np.full(voltage.size, _single(values["reference_temperature"])))
    steps = np.unique(temperature)
    curves = tuple(charge_curve(voltage[temperature == t], capacitance[temperature == t]) for t in steps)
    width = values["unit_width"] if table.value.endswith(PER_WIDTH) else array(1.0)
    return Charge(None, steps, curves, width)
