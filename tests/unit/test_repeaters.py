"""Repeated line: the best number and size by brute force, the closed form per length, the transit-limited case."""

from __future__ import annotations

import math

import numpy as np
import pytest

from benchmark.circuits.circuit import Wires
from benchmark.circuits.library import build
from benchmark.circuits.operation import estimate
from benchmark.circuits.repeaters import best_repeaters
from benchmark.circuits.rules import chain, step
from benchmark.circuits.sized import Sized
from benchmark.errors import UsageError
from benchmark.physics.wires import repeated_line_delay_per_length
from tests.factories import ohmic_pair
from tests.near import near

WIRES = Wires(2.0e7, 2.0e-10)


def _delay(pair, scenario, rule="step", wires=WIRES):
    return float(estimate(build("repeated-line", scenario), pair, wires, rule, short_circuit=False).path_delay)


@pytest.mark.parametrize("transit", [0.0, 2e-12, 2e-10])
@pytest.mark.parametrize("rule", ["step", "chain"])
def test_no_other_whole_numbers_are_faster(transit, rule):
    pair = ohmic_pair(
        on_resistance=2e4,
        input_capacitance=1e-16,
        terminal_capacitance=5e-17,
        closing_time=transit,
        opening_time=transit,
        window=(0.3, 0.7),
    )
    scenario = {"line_length": 1e-3, "activity": 0.1}
    wires = Wires(2.0e7, 2.0e-10, 1e-17)
    fitted = estimate(build("repeated-line", scenario), pair, wires, rule, short_circuit=False)
    pieces, copies = (float(value) for value in (fitted.stages[0].net.count, fitted.stages[0].net.copies))
    best = float(fitted.path_delay)
    for k in range(max(1, int(pieces) - 3), int(pieces) + 4):
        for h in range(max(1, int(copies) - 3), int(copies) + 4):
            other = _delay(pair, {**scenario, "repeater_count": float(k), "driver_copies": float(h)}, rule, wires)
            assert best <= other * (1.0 + 1e-12), (k, h)


@pytest.mark.parametrize("transit", [0.0, 1e-12, 1e-10, 1e-8])
def test_long_lines_take_the_closed_form_per_length(transit):
    """Wide drivers and many pieces: rounding to whole numbers does not show."""
    pair = ohmic_pair(
        on_resistance=2e6,
        input_capacitance=1e-18,
        terminal_capacitance=0.5e-18,
        closing_time=transit,
        opening_time=transit,
    )
    length = 0.2
    per_length = repeated_line_delay_per_length(2e7, 2e-10, 2e6, 2e-18, 0.5, transit)
    assert _delay(pair, {"line_length": length, "activity": 0.1}) == near(float(per_length) * length, rel=1e-4)


def test_a_transit_limited_repeater_leaves_the_square_root():
    """R_0 C_0 -> 0: 2 L sqrt(0.377 r c t), and pieces of sqrt(t/(0.377 r c)); less R_0 C_0 gains nothing more."""
    length, transit = 20e-3, 1e-9
    quick = ohmic_pair(on_resistance=1.0, input_capacitance=1e-20, closing_time=transit, opening_time=transit)
    found = estimate(build("repeated-line", {"line_length": length, "activity": 0.1}), quick, WIRES, "step")
    rc = 2e7 * 2e-10
    assert float(found.path_delay) == near(2 * length * math.sqrt(0.377 * rc * transit), rel=1e-3)
    assert float(found.cell_count) == round(length * math.sqrt(0.377 * rc / transit))


def test_each_point_of_an_array_has_its_own_design():
    resistance = np.array([1e3, 1e4, 1e5, np.nan])
    pair = ohmic_pair(on_resistance=resistance, input_capacitance=1e-16, switching_level=0.5)
    pieces, copies = best_repeaters(Sized(pair), WIRES, step, 2e-3)
    assert (np.diff(pieces[:3]) < 0.0).all()
    assert (np.diff(copies[:3]) > 0.0).all()
    assert pieces[3] == copies[3] == 1.0
    short, same = best_repeaters(Sized(pair), WIRES, step, 1e-6)
    assert (short == 1.0).all()  # a short wire is one piece
    assert (same == copies).all()  # the best width does not depend on the length


def test_the_chain_rule_designs_with_its_own_factors():
    late = ohmic_pair(on_resistance=1e4, input_capacitance=1e-16, window=(0.6, 0.95))
    by_step, by_chain = (best_repeaters(Sized(late), WIRES, rule, 5e-3)[0] for rule in (step, chain))
    # F above ln 2 makes the wire's own term and the gates' dearer alike, but the wire's keeps its 0.1
    assert float(by_step) != float(by_chain)


def test_stated_repeaters_are_taken_as_they_are():
    pair = ohmic_pair(on_resistance=2e4, input_capacitance=1e-16)
    scenario = {"line_length": 1e-3, "activity": 0.25, "repeater_count": 4.0, "driver_copies": 10.0}
    found = estimate(build("repeated-line", scenario), pair, WIRES, "step", short_circuit=False)
    piece = 250e-6
    wire, load = 2e-10 * piece, 10 * 2e-16
    delay = math.log(2.0) * (2e3 * (wire + load) + 2e7 * piece * load) + 0.377 * 2e7 * piece * wire
    assert float(found.path_delay) == near(4 * delay, rel=1e-12)
    assert float(found.dynamic_energy) == near(0.25 * 4 * (wire + load), rel=1e-12)
    assert float(found.switch_count) == 4 * 10 * 2


@pytest.mark.parametrize("name", ["repeater_count", "driver_copies"])
def test_half_a_design_is_refused(name):
    with pytest.raises(UsageError, match="or neither"):
        build("repeated-line", {"line_length": 1e-3, "activity": 0.1, name: 4.0})


def test_a_wire_without_resistance_has_no_best_repeater():
    with pytest.raises(UsageError, match="without resistance"):
        _delay(ohmic_pair(), {"line_length": 1e-3, "activity": 0.1}, wires=Wires(0.0, 2e-10))
