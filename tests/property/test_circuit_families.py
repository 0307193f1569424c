"""Properties of adders, multiplier, net lengths, memory and repeated lines over random sizes and operands."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from benchmark.circuits.circuit import Wires
from benchmark.circuits.complex_adder import MOST_GROUP_BITS, complex_gate_adder
from benchmark.circuits.library import build
from benchmark.circuits.multiplier import array_multiplier
from benchmark.circuits.net_length import mean_wire
from benchmark.circuits.netlist import Netlist
from benchmark.circuits.operation import estimate
from benchmark.circuits.patterns import simulate
from benchmark.circuits.prefix import PREFIX_KINDS
from benchmark.circuits.prefix_adder import prefix_adder
from tests.factories import ohmic_pair
from tests.near import near
from tests.profiles import examples

FEW = settings(max_examples=examples(60))


def _result(netlist: Netlist, words: dict[str, int]) -> int:
    """Set the inputs from whole numbers (``a`` -> a0, a1, ..; complements follow) and read the outputs as one."""
    values = {}
    for name in netlist.inputs:
        plain = name.removesuffix("_not")
        word = plain.rstrip("0123456789")
        bit = words[plain] if plain in words else words[word] >> int(plain[len(word) :]) & 1
        values[name] = np.array([bit ^ (plain != name)], dtype=np.uint64)
    found = simulate(netlist, values)
    return sum(int(found[name][0] & np.uint64(1)) << place for place, name in enumerate(netlist.outputs))


@st.composite
def additions(draw):
    bits = draw(st.integers(1, 48))
    word = st.integers(0, 2**bits - 1)
    return bits, {"a": draw(word), "b": draw(word), "carry_in": draw(st.integers(0, 1))}


@FEW
@given(additions(), st.sampled_from(PREFIX_KINDS))
def test_prefix_adders_of_any_width_add(case, kind):
    bits, words = case
    assert _result(prefix_adder(kind, bits).netlist, words) == sum(words.values())


@FEW
@given(additions(), st.integers(1, MOST_GROUP_BITS))
def test_complex_gate_adders_of_any_grouping_add(case, group):
    bits, words = case
    assert _result(complex_gate_adder(bits, min(group, bits)), words) == sum(words.values())


@FEW
@given(st.integers(2, 12), st.integers(2, 12), st.data())
def test_array_multipliers_of_any_shape_multiply(wide, rows, data):
    x, y = data.draw(st.integers(0, 2**wide - 1)), data.draw(st.integers(0, 2**rows - 1))
    assert _result(array_multiplier(wide, rows), {"x": x, "y": y}) == x * y


@FEW
@given(st.floats(4.0, 1e5), st.floats(0.05, 0.95), st.floats(1.0, 3.0))
def test_larger_blocks_and_larger_exponents_have_longer_wires(gates, exponent, more):
    base = mean_wire(gates, exponent)
    assert base >= 1.0
    assert mean_wire(gates * more, exponent) >= base * (1.0 - 1e-12)
    assert mean_wire(gates, exponent + 0.9 * (0.96 - exponent)) >= base * (1.0 - 1e-12)


@FEW
@given(
    st.sampled_from(
        ["kogge-stone-adder", "sklansky-adder", "brent-kung-adder", "complex-gate-adder", "array-multiplier"]
    ),
    st.integers(2, 12),
    st.floats(0.1, 10.0),
)
def test_time_and_energy_scale_with_capacitance(name, bits, factor):
    """All capacitances times x: every R C and every C V^2 times x, whatever the netlist."""
    scenario = {
        "word_length": float(bits),
        "group_bits": float(min(bits, 3)),
        "bit_pitch": 1e-6,
        "average_net_length": 2e-6,
    }
    found = [
        estimate(
            build(name, scenario),
            ohmic_pair(input_capacitance=scale * 1e-16, terminal_capacitance=scale * 3e-17),
            Wires(0.0, scale * 2e-10, scale * 1e-17),
            short_circuit=False,
        )
        for scale in (1.0, factor)
    ]
    assert float(found[1].path_delay) == near(factor * float(found[0].path_delay), rel=1e-12)
    assert float(found[1].dynamic_energy) == near(factor * float(found[0].dynamic_energy), rel=1e-12)
    assert float(found[1].leakage_power) == near(float(found[0].leakage_power), rel=1e-12)


READ = {
    "row_count": 128.0,
    "column_count": 64.0,
    "memory_cell_width": 0.5e-6,
    "memory_cell_height": 0.25e-6,
    "memory_cell_word_line_load": 0.1e-15,
    "memory_cell_bit_line_load": 0.1e-15,
    "memory_cell_read_current": 2e-5,
    "memory_cell_supply": 0.7,
    "bit_line_swing": 0.1,
    "driver_copies": 8.0,
    "fan_out": 2.0,
}


@FEW
@given(
    st.sampled_from(["row_count", "column_count", "memory_cell_word_line_load", "memory_cell_bit_line_load"]),
    st.floats(1.1, 8.0),
)
def test_a_larger_memory_is_slower_and_costs_more_to_read(name, factor):
    pair = ohmic_pair(supply=0.6, on_resistance=2e4, input_capacitance=1e-16)
    base, moved = (
        estimate(build("sram-read", {**READ, name: READ[name] * scale}), pair, Wires(2e7, 2e-10), short_circuit=False)
        for scale in (1.0, factor)
    )
    assert float(moved.path_delay) > float(base.path_delay)
    assert float(moved.dynamic_energy) > float(base.dynamic_energy)


@FEW
@given(st.floats(1e3, 1e6), st.floats(0.0, 1e-9), st.floats(1e-4, 2e-2), st.floats(1.05, 5.0))
def test_fitted_lines_are_never_slower_than_unbroken_ones_and_grow_with_length(resistance, transit, length, more):
    pair = ohmic_pair(on_resistance=resistance, input_capacitance=1e-16, closing_time=transit, opening_time=transit)
    wires = Wires(2e7, 2e-10)

    def delay(metres, **stated):
        scenario = {"line_length": metres, "activity": 0.1, **stated}
        return float(estimate(build("repeated-line", scenario), pair, wires, "step", short_circuit=False).path_delay)

    fitted = delay(length)
    for copies in (1.0, 10.0, 100.0):
        assert fitted <= delay(length, repeater_count=1.0, driver_copies=copies) * (1.0 + 1e-12)
    assert delay(length * more) > fitted
