"""Closed forms against circuit simulation: stored points, the bands made of them, some points measured again."""

from __future__ import annotations

import pytest

from benchmark.evaluate.bands import FAST, QUANTITIES, bands, find, rings
from tests.ngspice import band_table, measure_references, measure_stress
from tests.ngspice.measured_rows import RATIOS, RULES, Row, stored
from tests.ngspice.stress_switch import CLOSING_VOLTAGE, stress_bench

REFERENCES, STRESS = stored(measure_references.PATH), stored(measure_stress.PATH)
POINTS = band_table.tidy_points()
#: as far as rounding in the files goes
KEPT = 5e-4


def _key(row: Row, names: tuple[str, ...]) -> tuple[str, ...]:
    return tuple(row[name] for name in names)


def test_every_point_of_both_designs_is_there_once():
    for rows, module in ((REFERENCES, measure_references), (STRESS, measure_stress)):
        wanted = [module.key(point) for point in module.design()]
        assert [_key(row, module.INPUTS) for row in rows] == wanted
        assert len(set(wanted)) == len(wanted)


def test_the_program_reads_what_the_points_say():
    """Every band is the smallest and the largest ratio of the points in its box, and every box has points."""
    assert stored(band_table.PATH) == band_table.band_rows()
    assert all(band.points > 0 and band.low <= band.high for band in bands())
    kinds = {(band.model, band.cell) for band in bands()}
    assert kinds == {(m, c) for m in ("virtual-source", "stress-gated") for c in ("inverter", "nand2", "nand3")}


def test_a_measured_point_lies_in_the_band_the_program_finds_for_it():
    """For every quantity and rule; a flagged point beyond the ringing limit is refused by name."""
    found = 0
    for point in POINTS:
        facts = {"supply": 0.5, "temperature": 298.15, "transit_over_rc": 0.0, "on_off_ratio": 1e5} | point.facts
        facts = {"switching_level": 0.5, "quality": float("nan")} | facts
        band = find(point.quantity, point.model, point.rule, point.cell, facts)
        if point.flag == "beyond the ringing limit":
            assert "ringing limit" in band.why
        if not point.flag and not band.why:
            found += 1
            assert band.low <= point.ratio <= band.high
    assert found > 0.8 * len(POINTS)


def test_stored_ratios_are_those_of_the_closed_forms_as_they_are():
    """A changed closed form shows here; then ``measure_bands`` takes ratios and bands anew."""
    listed = [(measure_references, list(measure_references.design())[::23], REFERENCES[::23])]
    listed += [(measure_stress, list(measure_stress.design())[::37], STRESS[::37])]
    for module, points, rows in listed:
        for point, kept in zip(points, rows, strict=True):
            now = module.row(point, {name: kept[name] for name in module.SIMULATED})
            for name in RATIOS:
                assert (now[name] == "") == (kept[name] == "")
                if kept[name]:
                    assert float(now[name]) == pytest.approx(float(kept[name]), rel=KEPT), (point, name)
            assert now.get("flag") == kept.get("flag")


def _span(
    model: str, cell: str, quantity: str, rule: str = "chain", **limits: tuple[float, float]
) -> tuple[float, float]:
    chosen = [
        point.ratio
        for point in POINTS
        if (point.model, point.cell, point.quantity, point.rule, point.flag) == (model, cell, quantity, rule, "")
        and all(low <= point.facts[axis] <= high for axis, (low, high) in limits.items())
    ]
    return min(chosen), max(chosen)


@pytest.mark.parametrize(
    ("cell", "quantity", "low", "high"),
    [
        # worst at 0.2 V for planar sets, and near 0.5 V for the 14 nm set
        ("inverter", "delay", 0.90, 1.09),
        ("inverter", "energy", 0.83, 1.07),  # lowest at fan-out 1, where coupling weighs most
        ("inverter", "leakage", 0.9999, 1.002),
        # the closed form counts the input next to the rail as the last to switch, every internal node over the full
        # swing, and the stack by what it carries with all gates together
        ("nand2", "delay", 1.06, 1.32),
        ("nand2", "energy", 0.92, 1.21),
        # a closed n switch at the output passes less than the supply to the open one below it
        ("nand2", "leakage", 1.00, 1.08),
    ],
)
def test_reference_transistors(cell: str, quantity: str, low: float, high: float):
    """What the closed forms are worth from 0.2 V to the declared supply, -40 to 125 degC."""
    least, most = _span("virtual-source", cell, quantity)
    assert low <= least
    assert most <= high
    assert most - least > 0.5 * (high - low)  # no band wider than twice what was measured


def test_for_a_transistor_the_three_closed_rules_are_one():
    for row in REFERENCES:
        assert len({row[f"delay_{rule}"] for rule in RULES}) == 1


def test_fast_actuators_follow_the_rule_of_chains_and_all_follow_the_integral():
    """On/off ratio 1e3 or more; the step rule is no rule for chains (factor 5 where the switch closes late)."""
    strong = {"on_off_ratio": (1e3, 1e9)}
    for cell in ("inverter",):
        low, high = _span("stress-gated", cell, "delay", "chain", transit_over_rc=(0.0, 0.05), **strong)
        assert (low, high) == (pytest.approx(0.95, abs=0.03), pytest.approx(1.03, abs=0.03))
        low, high = _span("stress-gated", cell, "delay", "integral", **strong)
        assert low > 0.77
        assert high < 1.13
        assert _span("stress-gated", cell, "delay", "step", **strong)[0] < 0.3


def test_energy_holds_up_to_twice_the_closing_voltage_and_is_followed_beyond():
    """C V^2 alone is up to 40 times too small with slow actuators above; what runs through both closes that."""
    below = {"switching_level": (0.6, 1.0), "on_off_ratio": (1e3, 1e9), "transit_over_rc": (0.0, 12.0)}
    low, high = _span("stress-gated", "inverter", "energy", **below)
    assert low > 0.98
    assert high < 1.04
    far = {"switching_level": (0.39, 0.51), "on_off_ratio": (1e3, 1e9), "transit_over_rc": (5.0, 110.0)}
    assert _span("stress-gated", "inverter", "energy without short circuit", **far)[0] < 0.1
    low, high = _span("stress-gated", "inverter", "energy", **far)
    assert low > 0.86
    assert high < 1.09


def test_within_the_ringing_limit_nothing_switches_falsely():
    """Q <= min(4.5, 0.8 pi/ln(V/V_on)), and any quality up to 3 where the actuator is fast.

    Not so with an on/off ratio of 1e2 and a transit of 100 R C: at Q = 3 it rings within the rule, so there is no band.
    """
    quiet = 0
    for row in STRESS:
        if row["outcome"] != "solved":
            continue
        facts = {name: float(row[name]) for name in ("transit_over_rc", "switching_level", "quality")}
        limit = rings(facts)
        if limit != limit:
            rang = float(row["ringing_over_delay"]) > 0.0
            assert not rang or (row["asked_transit_over_rc"], row["decades"], row["quality"]) == ("100", "2", "3"), row
            quiet += not rang
    assert quiet > 300


def test_shares_of_the_design_that_the_method_refuses():
    flags = [row["flag"] for row in STRESS]
    assert flags.count("") > 0.8 * len(flags)
    assert flags.count("false switching") + flags.count("edge before that of its input") == 3
    assert set(flags) <= {"", "beyond the ringing limit", "levels far from the rails", *band_table.FATAL}
    assert FAST == 0.1
    assert QUANTITIES[0] == "delay"


def test_the_switch_made_to_order_is_what_was_asked_for():
    for cell, pin, asked in list(measure_stress.design())[5:400:61]:
        one = stress_bench(asked, cell, pin)
        down = one.pair.down
        assert one.supply == pytest.approx(asked.placement * CLOSING_VOLTAGE)
        controls = [[[[CLOSING_VOLTAGE, 10.0]]]]
        import numpy as np

        across = np.full((1, 1, 1, 2), 0.1)
        closing, floor = down.current(np.asarray(controls), across).ravel()
        assert floor / closing == pytest.approx(2.0, rel=1e-6)
        capacitance = stress_bench(asked).load("delay").total
        assert down.closing_time.item() * floor / 0.1 / capacitance == pytest.approx(asked.transit_over_rc, rel=1e-6)


@pytest.mark.spice
@pytest.mark.parametrize("position", [2, 40, 61, 97])
def test_references_measured_again(position: int):
    point, kept = list(measure_references.design())[position], REFERENCES[position]
    found = measure_references.simulate(point)
    for name in measure_references.SIMULATED:
        assert float(found[name]) == pytest.approx(float(kept[name]), rel=2e-3), name


@pytest.mark.spice
@pytest.mark.parametrize("position", [14, 98, 190, 275, 350])
def test_stress_gated_points_measured_again(position: int):
    point, kept = list(measure_stress.design())[position], STRESS[position]
    found = measure_stress.simulate(point)
    assert found["outcome"] == kept["outcome"] == "solved"
    for name in ("simulated_delay_s", "simulated_energy_J", "simulated_leakage_W"):
        assert float(found[name]) == pytest.approx(float(kept[name]), rel=2e-3), name
