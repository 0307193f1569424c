"""A stress-gated switch made to order: transit over R C, on/off ratio, quality, window and supply are asked for.

Every number is invented. Geometry and materials are one consistent column; what is asked for is reached by the channel
alone (floor, ceiling, onset and slope of its log-slope law), so transit, capacitances and the motion of the column
stay the same over the whole design and only what the closed forms speak of changes.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from scipy.optimize import brentq

from benchmark.circuits.cells import cell
from benchmark.constants import ELEMENTARY_CHARGE
from benchmark.devices import model
from benchmark.devices.model import ModelInputs, Prepared
from benchmark.evaluate.deck import switch_texts
from benchmark.physics.pressure_resistance import log_slope_resistance
from tests.ngspice.benches import Bench
from tests.stress_column import COLUMN

__all__ = ["CLOSING_VOLTAGE", "Asked", "stress_bench"]

MODEL = model("stress-gated")
#: control at which the resistance is twice its floor [V]; invented
CLOSING_VOLTAGE = 0.3
#: width of both soft corners over the pressure of the floor; invented
_CORNER = 0.02
#: without loss, contacts and leakage of the actuator, so that the closed form and the deck differ in the method alone
_COLUMN: dict[str, float] = {
    **COLUMN,
    "actuator_loss_tangent": 0.0,
    "contact_resistivity": 0.0,
    "actuator_leakage_resistance": 1e16,
    "unstressed_activation_energy": 0.45 * ELEMENTARY_CHARGE,
}


@dataclass(frozen=True)
class Asked:
    """One point of the design.

    transit_over_rc [1]
        Acoustic transit over R C of the inverter with one input as load, at the floor of the resistance.
    decades [1]
        log10 of ceiling over floor.
    quality [1]
        Mechanical quality of the column.
    placement [1]
        Supply over the closing voltage (R = twice the floor).
    start [1]
        Pressure at which the resistance begins to fall, over the pressure of its floor.
    """

    transit_over_rc: float
    decades: float
    quality: float
    placement: float
    start: float


def _closing(decades: float, start: float) -> float:
    """Return the pressure at which R is twice its floor, over the pressure of the floor."""

    def excess(pressure: float) -> float:
        found = log_slope_resistance(pressure, 10.0**decades, 1.0, start, 1.0, _CORNER)
        return float(np.log(found / 2.0))

    return float(brentq(excess, start, 1.5))


def _prepare(values: dict[str, float]) -> Prepared:
    options = {option.name: option.default for option in MODEL.options}
    options |= {"mechanics": "force-balance", "pressure_law": "log-slope", "complement": "mirrored-plate"}
    return MODEL.prepare(ModelInputs({name: np.full((1, 1, 1), x) for name, x in values.items()}, options, {}))


def _channel(asked: Asked, floor: float, per_volt: float) -> dict[str, float]:
    saturation = per_volt * CLOSING_VOLTAGE / _closing(asked.decades, asked.start)
    onset = asked.start * saturation
    return {
        "mechanical_quality": asked.quality,
        "resistance_floor": floor,
        "resistance_unstressed": floor * 10.0**asked.decades,
        "onset_pressure": onset,
        "resistance_slope": asked.decades / (saturation - onset),
        "corner_width": _CORNER * saturation,
    }


@lru_cache(maxsize=1)
def _column() -> tuple[float, float]:
    """Return the pressure per volt [Pa/V] and the transit [s] of the column."""
    any_channel = _channel(Asked(1.0, 4.0, 1.0, 1.0, 0.0), 1e4, 1e9)
    column = _prepare(_COLUMN | any_channel)["column"]
    return float(column["pressure_per_volt"].item()), float(column["transit"].item())


def _bench(asked: Asked, floor: float, cell_name: str, pin: str, fan_out: float) -> Bench:
    prepared = _prepare(_COLUMN | _channel(asked, floor, _column()[0]))
    knobs: dict[str, Any] = {"threshold_shift": np.zeros((1, 1, 1))}
    supply = np.full((1, 1, 1), asked.placement * CLOSING_VOLTAGE)
    pair = MODEL.switch(prepared, supply, np.full((1, 1, 1), _COLUMN["reference_temperature"]), knobs)
    return Bench(pair, switch_texts(MODEL, prepared, pair, knobs), cell(cell_name), fan_out, pin)


def stress_bench(asked: Asked, cell_name: str = "inverter", pin: str = "a", fan_out: float = 1.0) -> Bench:
    """Return the switch in stages of one cell; the floor follows from R C of the inverter that drives its own kind."""
    trial = _bench(asked, 1.0, "inverter", "a", 1.0)
    capacitance = trial.load("delay").total
    return _bench(asked, _column()[1] / (asked.transit_over_rc * capacitance), cell_name, pin, fan_out)
