"""A long wire cut by repeaters (layer 5).

With stated ``repeater_count`` k and ``driver_copies`` h all technologies get the same line. Without them each
technology gets its own fastest one, from the closed form for pieces of length L/k and drivers of h copies::

    T(k, h) = k [t_int + F R_0 (C_0 + C_self)] + F (R_0/h) c L + F r L h C_0 + W r c L^2 / k
    h = sqrt(R_0 c / (r C_0)),   k = L sqrt(W r c / (t_int + F R_0 (C_0 + C_self)))

R_0, C_0, C_self: one inverter, layout parasitic included, mean of both edges; t_int its load-independent time; F and W
of the delay rule ``step`` when the study uses it, else of ``chain``. k is the better of the two whole numbers beside
the optimum, at least 1, h the nearest whole number, at least 1. A repeater with a long t_int makes few pieces; as
R_0 C_0 falls to nothing the line still takes 2 L sqrt(W r c t_int). (Bakoglu & Meindl, IEEE TED 32 (1985) 903, from
memory; with t_int derived.)
"""

from __future__ import annotations

from typing import Final

import numpy as np

from benchmark.circuits.built_in import BuiltIn, Scenario
from benchmark.circuits.cells import cell
from benchmark.circuits.chain_rule import STEP_FACTOR, chain_factor
from benchmark.circuits.circuit import Circuit, Load, Net, Value, Wires
from benchmark.circuits.rules import STEP_WIRE_FACTOR, StageRule, step
from benchmark.circuits.sized import EDGES, Sized
from benchmark.devices.record import Array
from benchmark.errors import UsageError

__all__ = ["REPEATED_LINE", "best_repeaters"]


def best_repeaters(sized: Sized, wires: Wires, rule: StageRule, length: Value) -> tuple[Array, Array]:
    """Return (number of pieces k, copies h) of the fastest line of ``length`` [m]; 1 and 1 where nothing switches.

    Raises
    ------
    UsageError
        If the wire has no resistance: then the wider the driver the faster, without end.
    """
    inverter = cell("inverter")
    pin = np.asarray(wires.layout_capacitance_per_pin, dtype=np.float64)
    r = np.asarray(wires.resistance_per_length, dtype=np.float64)
    c = np.asarray(wires.capacitance_per_length, dtype=np.float64)
    if np.any(r <= 0.0) or np.any(c <= 0.0):
        message = "wires without resistance or capacitance need no repeaters: state repeater_count and driver_copies"
        raise UsageError(message)
    resistance = _mean([sized.path_resistance(inverter, edge) for edge in EDGES])
    gate = sized.input_capacitance(inverter, "a") + pin
    own = _mean([sized.output_capacitance(inverter, "delay", edge) for edge in EDGES]) + pin
    transit = _mean([sized.transit(inverter, edge) for edge in EDGES])
    if rule is step:
        factor, line = np.asarray(STEP_FACTOR), np.asarray(STEP_WIRE_FACTOR)
    else:
        factor = _mean([chain_factor(sized.switch(edge).switching_level) for edge in EDGES])
        line = np.asarray(0.1 + 0.4 * factor)
    fixed = transit + factor * resistance * (gate + own)
    spread = line * r * c * np.asarray(length, dtype=np.float64) ** 2
    works = np.isfinite(resistance) & np.isfinite(fixed) & np.isfinite(spread) & (fixed > 0.0) & (gate > 0.0)
    best = np.sqrt(np.where(works, spread, 1.0) / np.where(works, fixed, 1.0))
    low, high = np.maximum(np.floor(best), 1.0), np.maximum(np.ceil(best), 1.0)
    pieces = np.where(low * fixed + spread / low <= high * fixed + spread / high, low, high)
    copies = np.maximum(np.rint(np.sqrt(np.where(works, resistance * c / (r * gate), 1.0))), 1.0)
    return np.asarray(np.where(works, pieces, 1.0)), np.asarray(np.where(works, copies, 1.0))


def _mean(values: list[Array]) -> Array:
    return np.asarray(sum(values[1:], values[0]) / len(values))


def _line(which: BuiltIn, scenario: Scenario, pieces: Value, copies: Value, how: str) -> Circuit:
    inverter = cell("inverter")
    piece = Net(
        "piece",
        inverter,
        loads=(Load(inverter, "a", copies),),
        wire_length=np.asarray(scenario["line_length"]) / pieces,
        rising_per_operation=scenario["activity"],
        busiest_per_operation=scenario.get("busiest_activity"),
        count=pieces,
        on_critical_path=pieces,
        copies=copies,
    )
    return Circuit(
        which.name,
        which.title,
        which.operation,
        (piece,),
        assumptions=(
            how,
            "Repeaters are inverters of parallel copies, evenly spaced; the first drives the line and the receiver is "
            "one more of them.",
        ),
    )


def _repeated_line(which: BuiltIn, scenario: Scenario) -> Circuit:
    stated = [name for name in ("repeater_count", "driver_copies") if name in scenario]
    if len(stated) == 1:
        message = (
            f"circuit {which.name!r} needs both repeater_count and driver_copies, or neither, not {stated[0]} alone"
        )
        raise UsageError(message)
    if stated:
        how = "Number and size of the repeaters are stated, the same for every technology."
        return _line(which, scenario, scenario["repeater_count"], scenario["driver_copies"], how)
    how = (
        "Number and size of the repeaters are those of the fastest line of each technology at each design point, at "
        "its highest temperature (whole numbers); the least energy may lie elsewhere."
    )

    def fit(sized: Sized, wires: Wires, rule: StageRule) -> Circuit:
        return _line(which, scenario, *best_repeaters(sized, wires, rule, scenario["line_length"]), how)

    made = _line(which, scenario, 1.0, 1.0, how)
    return Circuit(made.name, made.title, made.operation, made.nets, assumptions=made.assumptions, fit=fit)


REPEATED_LINE: Final = BuiltIn(
    "repeated-line",
    "Long wire with repeaters",
    "one clock cycle of the line",
    _repeated_line,
    ("line_length", "activity"),
    ("repeater_count", "driver_copies", "busiest_activity"),
    at_most_one_of=(),
)
