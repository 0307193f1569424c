"""Bit lines, a terminated line and repeaters, through circuits where a circuit says it."""

from __future__ import annotations

from benchmark.circuits import library, operation
from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Net, Wires
from benchmark.physics import wires
from tests.factories import ohmic_pair
from tests.published.rows import Binding

ESTIMATE = "benchmark.circuits.operation:estimate"
BUILD = "benchmark.circuits.library:build"
UM, FF = 1.0e-6, 1.0e-15


def _bit_line(rows: int, drain: float, wire: float, swing: float = 0.1, current: float = 20e-6) -> tuple[float, float]:
    """Delay [s] and capacitance [F] of the bit line of a read path: cells of 1 um, switches without capacitance."""
    scenario = {
        "row_count": float(rows),
        "column_count": 1.0,
        "memory_cell_width": UM,
        "memory_cell_height": UM,
        "memory_cell_word_line_load": 0.0,
        "memory_cell_bit_line_load": drain,
        "memory_cell_read_current": current,
        "memory_cell_supply": 0.7,
        "bit_line_swing": swing,
        "driver_copies": 1.0,
        "fan_out": 1.0,
    }
    pair = ohmic_pair(supply=0.7, input_capacitance=0.0)
    found = operation.estimate(library.build("sram-read", scenario), pair, Wires(0.0, wire / UM), short_circuit=False)
    line = next(stage for stage in found.stages if stage.net.name == "bit line")
    return float(line.delay), float(line.node_capacitance)


def _terminated() -> float:
    net = Net("line", cell("inverter"), fixed_load=2e-12, on_critical_path=1.0)
    pair = ohmic_pair(on_resistance=50.0, input_capacitance=0.0)
    found = operation.estimate(Circuit("line", "", "", (net,)), pair, Wires(0.0, 0.0), "step", short_circuit=False)
    return float(found.path_delay) / 1e-12


def _repeated() -> float:
    """Elmore (F = 1, W = 1/2) with R C = FO4/5 and half of the gate as own capacitance: 1.669 sqrt(FO4 r c)."""
    fo4, r, c = 15e-12, 200e3, 0.2e-9
    per_length = wires.repeated_line_delay_per_length(r, c, fo4 / 5.0, 1.0, 0.5, 0.0, factor=1.0, wire_factor=0.5)
    return float(per_length) / (1e-12 / 1e-3)


BINDINGS = [
    Binding("cir.SRAM-BL", (ESTIMATE, BUILD), lambda: _bit_line(256, 0.1 * FF, 0.05 * FF)[0] / 1e-12),
    Binding("cir.ROM-BL", (ESTIMATE,), lambda: _bit_line(512, 2.6 * FF, 0.8 * FF)[1] / 1e-12),
    Binding("cir.WIRE-TERM", (ESTIMATE,), _terminated),
    Binding("cir.REP-WH", ("benchmark.physics.wires:repeated_line_delay_per_length",), _repeated),
]
