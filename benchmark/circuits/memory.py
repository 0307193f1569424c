"""Periphery of a static memory: word line, and the whole read path through bit line and sense amplifier (layer 5).

The cells are not made of the technology: their loads, read current and supply come from the scenario and are the same
for both sides. What is judged is the periphery: drivers, precharge and sense amplifiers.
"""

from __future__ import annotations

from typing import Final

import numpy as np

from benchmark.circuits.built_in import BuiltIn, Scenario, wire, wire_remark
from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Discharge, Load, Net, Value
from benchmark.errors import UsageError

__all__ = ["SRAM_READ", "SRAM_WORD_LINE"]

_ASSUMED: Final = (
    "The memory cells are the same for both sides: their loads stand evenly along the lines, their leakage and area "
    "are outside the block.",
    "Word lines swing to the supply of the cells, from a rail of that voltage; the drivers' resistance is that at the "
    "logic supply. Level shifters between the two belong to each side's overheads.",
    "Decoder and address registers are outside the block.",
)


def _positive(scenario: Scenario, *names: str) -> None:
    for name in names:
        if np.any(np.asarray(scenario[name]) <= 0.0):
            message = f"{name} must be above 0 for this circuit"
            raise UsageError(message)


def _word_line(scenario: Scenario, rows: Value) -> tuple[Net, Net]:
    """Return the nets of ``rows`` word lines, one of which rises per operation: first inverter, driver with line."""
    inverter = cell("inverter")
    share = 1.0 / np.asarray(rows, dtype=np.float64)
    buffer = Net(
        "word-line buffer",
        inverter,
        loads=(Load(inverter, "a", scenario["driver_copies"]),),
        rising_per_operation=share,
        busiest_per_operation=1.0,
        count=rows,
        on_critical_path=1.0,
        group="word line",
        **wire(scenario),
    )
    line = Net(
        "word line",
        inverter,
        wire_length=scenario["column_count"] * np.asarray(scenario["memory_cell_width"]),
        load_per_length=np.asarray(scenario["memory_cell_word_line_load"]) / scenario["memory_cell_width"],
        swing=scenario["memory_cell_supply"],
        rising_per_operation=share,
        busiest_per_operation=1.0,
        count=rows,
        on_critical_path=1.0,
        group="word line",
        copies=scenario["driver_copies"],
    )
    return buffer, line


def _sram_word_line(which: BuiltIn, scenario: Scenario) -> Circuit:
    _positive(scenario, "memory_cell_width")
    return Circuit(
        which.name,
        which.title,
        which.operation,
        _word_line(scenario, 1.0),
        assumptions=(*_ASSUMED, *wire_remark(scenario)),
    )


def _sram_read(which: BuiltIn, scenario: Scenario) -> Circuit:
    _positive(scenario, "memory_cell_width", "memory_cell_height", "memory_cell_read_current")
    inverter = cell("inverter")
    columns = np.asarray(scenario["column_count"], dtype=np.float64)
    bit_line = Net(
        "bit line",
        inverter,
        loads=(Load(inverter, "a"),),
        wire_length=scenario["row_count"] * np.asarray(scenario["memory_cell_height"]),
        load_per_length=np.asarray(scenario["memory_cell_bit_line_load"]) / scenario["memory_cell_height"],
        swing=scenario["bit_line_swing"],
        discharge=Discharge(scenario["memory_cell_read_current"], scenario["memory_cell_supply"]),
        rising_per_operation=0.5,
        busiest_per_operation=1.0,
        count=2.0 * columns,
        on_critical_path=1.0,
        group="bit line",
    )
    sense = Net(
        "sense amplifier",
        inverter,
        loads=(Load(inverter, "a", 2.0),),
        latch_from=scenario["bit_line_swing"],
        rising_per_operation=0.5,
        busiest_per_operation=1.0,
        count=2.0 * columns,
        on_critical_path=1.0,
        group="sense amplifier",
    )
    output = Net(
        "output",
        inverter,
        loads=(Load(inverter, "a", scenario["fan_out"]),),
        rising_per_operation=0.25,
        busiest_per_operation=0.5,
        count=columns,
        on_critical_path=1.0,
        group="output",
        **wire(scenario),
    )
    return Circuit(
        which.name,
        which.title,
        which.operation,
        (*_word_line(scenario, scenario["row_count"]), bit_line, sense, output),
        assumptions=(
            *_ASSUMED,
            "One read: one word line rises; of the two bit lines of every column one falls by bit_line_swing, pulled "
            "by the read current of the cell at its far end, and is restored from the supply of the cells; restoring "
            "takes no time on the path.",
            "An inverter's two switches stand for the precharge switch and the write driver of a bit line.",
            "Sense amplifier: two cross-coupled inverters that start bit_line_swing apart at their balance point and "
            "are enabled in time; one of its two nodes moves per read. Every column is read; data are random.",
            *wire_remark(scenario),
        ),
    )


_WORD_LINE: Final = (
    "column_count",
    "memory_cell_width",
    "memory_cell_word_line_load",
    "memory_cell_supply",
    "driver_copies",
)

SRAM_WORD_LINE: Final = BuiltIn(
    "sram-word-line",
    "Word line of a static memory with its driver",
    "one row access: a word line rises and falls",
    _sram_word_line,
    _WORD_LINE,
)

SRAM_READ: Final = BuiltIn(
    "sram-read",
    "Read path of a static memory: word line, bit lines, sense amplifiers, output",
    "one read of a row",
    _sram_read,
    (
        *_WORD_LINE,
        "row_count",
        "memory_cell_height",
        "memory_cell_bit_line_load",
        "memory_cell_read_current",
        "bit_line_swing",
        "fan_out",
    ),
)
