"""Word line and read path of a memory, by hand; nets that no gate drives."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Discharge, Load, Net, Wires
from benchmark.circuits.library import build
from benchmark.circuits.operation import estimate
from benchmark.errors import UsageError
from tests.factories import ohmic_pair
from tests.near import near

LN2 = math.log(2.0)
WORD_LINE = {
    "column_count": 128.0,
    "memory_cell_width": 0.5e-6,
    "memory_cell_word_line_load": 0.2e-15,
    "memory_cell_supply": 0.8,
    "driver_copies": 16.0,
}
READ = {
    **WORD_LINE,
    "row_count": 256.0,
    "memory_cell_height": 0.25e-6,
    "memory_cell_bit_line_load": 0.1e-15,
    "memory_cell_read_current": 2.0e-5,
    "bit_line_swing": 0.1,
    "fan_out": 4.0,
}
WIRES = Wires(2.0e7, 2.0e-10, 1.0e-17)


def test_word_line_by_hand():
    pair = ohmic_pair(
        supply=0.5,
        on_resistance=2e4,
        off_resistance=1e9,
        input_capacitance=1e-16,
        terminal_capacitance=5e-17,
        area=1e-14,
    )
    found = estimate(build("sram-word-line", WORD_LINE), pair, WIRES, "step", short_circuit=False)
    pin = 1e-17
    inverter, own = 2e-16, 1e-16
    length = 64e-6
    wire, cells, line_r = 2e-10 * length, 128 * 0.2e-15, 2e7 * length
    first = LN2 * 2e4 * (own + pin + 16 * (inverter + pin))
    second = LN2 * 2e4 / 16 * (16 * (own + pin) + wire + cells) + 0.377 * line_r * (wire + cells)
    assert float(found.path_delay) == near(first + second, rel=1e-12)
    # one row access: the first inverter at the logic supply, the line at that of the cells
    energy = 0.25 * (own + pin + 16 * (inverter + pin)) + 0.64 * (16 * (own + pin) + wire + cells)
    assert float(found.dynamic_energy) == near(energy, rel=1e-12)
    assert float(found.area) == near(17 * 2e-14, rel=1e-12)
    assert float(found.leakage_power) == near(17 * 0.25 / 1e9, rel=1e-12)
    assert float(found.switch_count) == 17 * 2
    assert float(found.dynamic_energy_parts["fixed_load"]) == near(0.64 * cells, rel=1e-12)


def _bit_line(read_current: float, wires: Wires, load: float, near_load: float, length: float) -> float:
    inverter = cell("inverter")
    net = Net(
        "bit line",
        inverter,
        fixed_load=near_load,
        wire_length=length,
        load_per_length=load,
        swing=0.1,
        discharge=Discharge(read_current, 0.7),
        on_critical_path=1.0,
        rising_per_operation=1.0,
    )
    pair = ohmic_pair(supply=0.5, input_capacitance=0.0)
    found = estimate(Circuit("column", "", "", (net,)), pair, wires, short_circuit=True)
    assert float(found.dynamic_energy) == near(
        0.7 * 0.1 * (length * (load + wires.capacitance_per_length) + near_load), rel=1e-12
    )
    return float(found.path_delay)


@pytest.mark.parametrize("near_share", [0.0, 0.3, 3.0])
def test_bit_line_against_a_ladder(near_share):
    """Current at one end of 200 sections, the swing read at the other, where the near load stands."""
    length, r, c, current = 200e-6, 4e7, 4e-10, 1e-5
    near_load = near_share * c * length
    sections = 200
    piece_c, piece_r = c * length / sections, r * length / sections

    def rates(_, v):
        flow = np.diff(v) / piece_r  # towards the current source at index -1
        into = np.zeros_like(v)
        into[:-1] += flow
        into[1:] -= flow
        into[-1] -= current
        capacitance = np.full(v.size, piece_c)
        capacitance[0] += near_load
        return into / capacitance

    def reached(_, v):
        return v[0] + 0.1

    reached.terminal = True  # type: ignore[attr-defined]
    solved = solve_ivp(
        rates, (0.0, 1e-7), np.zeros(sections), events=reached, method="LSODA", rtol=1e-8, atol=1e-10, lband=1, uband=1
    )
    found = _bit_line(current, Wires(r, 0.5 * c), 0.5 * c, near_load, length)
    assert found == near(float(solved.t_events[0][0]), rel=2e-3)
    assert found > 1.01 * 0.1 * (c * length + near_load) / current  # the line's own resistance shows


def test_read_path_is_the_sum_of_its_parts():
    pair = ohmic_pair(supply=0.5, input_capacitance=1e-16, terminal_capacitance=2e-17)
    found = estimate(build("sram-read", READ), pair, WIRES, "step", short_circuit=False)
    stages = {stage.net.name: stage for stage in found.stages}
    assert list(stages) == ["word-line buffer", "word line", "bit line", "sense amplifier", "output"]
    assert float(found.path_delay) == near(sum(float(stage.delay) for stage in stages.values()), rel=1e-12)
    bit_line = 256 * 0.1e-15 + 256 * 0.25e-6 * 2e-10
    end = 2 * 2e-17 + 2e-17 + 2e-16  # own terminals, two pins, one inverter input
    lag = 2e7 * 64e-6 * bit_line * (bit_line / 6 + end / 2) / (bit_line + end)
    assert float(stages["bit line"].delay) == near(0.1 * (bit_line + end) / 2e-5 + lag, rel=1e-12)
    groups = found.dynamic_energy_by_group
    # one of the two lines of a column falls per read and is restored from 0.8 V
    assert float(groups["bit line"]) == near(128 * 0.8 * 0.1 * (bit_line + end), rel=1e-12)
    assert float(groups["sense amplifier"]) == near(128 * 0.25 * (2 * 2e-17 + 3e-17 + 2 * 2e-16), rel=1e-9)
    assert float(found.busiest_rising_per_operation) == 1.0
    assert float(found.cell_count) == 2 * 256 + 4 * 128 + 128


def test_reading_needs_gain_and_no_hysteresis_but_driving_a_line_does_not():
    dull = ohmic_pair(on_resistance=1e4, off_resistance=2e4)
    sticky = ohmic_pair(opening_voltage=np.asarray(0.3), closing_voltage=np.asarray(0.5))
    for pair, word in ((dull, "no gain"), (sticky, "hysteresis")):
        read = estimate(build("sram-read", READ), pair, WIRES)
        assert any(word in reason for reason in read.unable)
        assert np.isnan(read.path_delay)
        assert not estimate(build("sram-word-line", WORD_LINE), pair, WIRES).unable


def test_a_better_driver_shortens_the_word_line_only_until_the_wire_is_left():
    pair = ohmic_pair(on_resistance=2e4, input_capacitance=1e-16)

    def line(copies):
        circuit = build("sram-word-line", {**WORD_LINE, "driver_copies": copies})
        return float(estimate(circuit, pair, Wires(2e7, 2e-10), "step").stages[1].delay)

    wire_alone = 0.377 * 2e7 * 64e-6 * (2e-10 * 64e-6 + 128 * 0.2e-15)
    assert line(1.0) > line(8.0) > line(64.0) > wire_alone
    assert line(1e7) == near(wire_alone, rel=1e-3)


@pytest.mark.parametrize("name", ["memory_cell_width", "memory_cell_height", "memory_cell_read_current"])
def test_cells_without_size_or_current_are_refused(name):
    with pytest.raises(UsageError, match=name):
        build("sram-read", {**READ, name: 0.0})


def test_nets_that_contradict_themselves_are_refused():
    inverter = cell("inverter")
    with pytest.raises(UsageError, match="needs a swing"):
        Net("n", inverter, discharge=Discharge(1e-5, 0.7))
    with pytest.raises(UsageError, match="is no latch"):
        Net("n", inverter, swing=0.1, discharge=Discharge(1e-5, 0.7), latch_from=0.1)


def test_which_nets_are_plain_gates():
    inverter = cell("inverter")
    assert Net("n", inverter).plain
    assert Net("n", inverter, copies=2.0).gated
    assert not Net("n", inverter, copies=2.0).plain
    assert not Net("n", inverter, load_per_length=1e-10).plain
    assert not Net("n", inverter, latch_from=0.1).gated


def test_copies_are_copies():
    """h copies on one net cost what h nets of one copy cost, and drive h times the load as fast."""
    pair = ohmic_pair(input_capacitance=1e-16, terminal_capacitance=3e-17, bias_power=1e-12)
    inverter = cell("inverter")

    def one(copies, count, load):
        net = Net(
            "n", inverter, loads=(Load(inverter, "a", load),), copies=copies, count=count, on_critical_path=1.0,
            rising_per_operation=1.0,
        )  # fmt: skip
        return estimate(Circuit("c", "", "", (net,)), pair, Wires(0.0, 0.0, 1e-17))

    wide, many = one(5.0, 1.0, 20.0), one(1.0, 5.0, 4.0)
    for name in ("path_delay", "dynamic_energy", "leakage_power", "bias_power", "area", "switch_count"):
        assert float(getattr(wide, name)) == near(float(getattr(many, name)), rel=1e-12), name
