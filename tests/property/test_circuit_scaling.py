"""Scaling laws, limits and sums every correct estimate obeys, on random ohmic technologies and circuits."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Load, Net, Wires
from benchmark.circuits.library import build
from benchmark.circuits.operation import OperationMetrics, estimate
from tests.factories import ohmic_pair
from tests.near import near
from tests.profiles import examples

LIMITED = settings(max_examples=examples(40))

RULES = st.sampled_from(["chain", "step"])
SCALE = st.floats(0.01, 100.0)


def _log(low: float, high: float) -> st.SearchStrategy[float]:
    return st.floats(np.log10(low), np.log10(high)).map(lambda x: 10.0**x)


FIELDS = st.fixed_dictionaries(
    {
        "supply": _log(0.1, 3.0),
        "on_resistance": _log(1e3, 1e6),
        "input_capacitance": _log(1e-17, 1e-14),
        "terminal_capacitance": _log(1e-18, 1e-15),
        "closing_time": _log(1e-13, 1e-8),
        "opening_time": _log(1e-13, 1e-8),
    }
)
RATIO = _log(1e2, 1e9)
CELL = st.sampled_from(["inverter", "nand2", "nand3", "nor2", "aoi21"])
WIRES = st.builds(Wires, _log(1e4, 1e8), _log(1e-11, 1e-9), _log(1e-19, 1e-16))


@st.composite
def technologies(draw: st.DrawFn) -> dict[str, Any]:
    fields = draw(FIELDS)
    return {**fields, "off_resistance": fields["on_resistance"] * draw(RATIO)}


@st.composite
def circuits(draw: st.DrawFn, wire: bool = True) -> Circuit:
    which, reader = cell(draw(CELL)), cell(draw(CELL))
    net = Net(
        "stage",
        which,
        loads=(Load(reader, "a", draw(st.floats(0.5, 8.0))),),
        fixed_load=draw(_log(1e-18, 1e-14)),
        wire_length=draw(_log(1e-7, 1e-3)) if wire else 0.0,
        rising_per_operation=draw(_log(1e-3, 1.0)),
        count=float(draw(st.integers(1, 100))),
        on_critical_path=float(draw(st.integers(1, 40))),
    )
    other = Net("other", cell("inverter"), loads=(Load(which, "a"),), rising_per_operation=1.0, group="clock")
    return Circuit("random", "", "", (net, other))


def _scaled_circuit(circuit: Circuit, capacitance: float) -> Circuit:
    return replace(circuit, nets=tuple(replace(net, fixed_load=net.fixed_load * capacitance) for net in circuit.nets))


def _scaled(fields: dict[str, Any], **factors: float) -> dict[str, Any]:
    return {**fields, **{name: fields[name] * factor for name, factor in factors.items()}}


def _wires(wires: Wires, r: float, c: float) -> Wires:
    return Wires(
        wires.resistance_per_length * r, wires.capacitance_per_length * c, wires.layout_capacitance_per_pin * c
    )


def _same(found: Any, expected: Any) -> None:
    np.testing.assert_allclose(found, expected, rtol=1e-9)


def _rc(found: OperationMetrics) -> Any:
    return found.path_delay - found.path_delay_parts["transit"]


def _rc_parts(found: OperationMetrics) -> Any:
    return sum(value for name, value in found.path_delay_parts.items() if name != "transit")


@LIMITED
@given(technologies(), circuits(), WIRES, RULES, SCALE)
def test_all_capacitances_times_k(fields, circuit, wires, rule, k):
    fields = {**fields, "opening_time": fields["closing_time"]}  # overlap energy has no capacitance in it
    before = estimate(circuit, ohmic_pair(**fields), wires, rule)
    after = estimate(
        _scaled_circuit(circuit, k),
        ohmic_pair(**_scaled(fields, input_capacitance=k, terminal_capacitance=k)),
        _wires(wires, 1.0, k),
        rule,
    )
    _same(_rc_parts(after), k * _rc_parts(before))
    _same(after.path_delay_parts["transit"], before.path_delay_parts["transit"])
    _same(after.dynamic_energy, k * before.dynamic_energy)
    _same(after.leakage_power, before.leakage_power)


@LIMITED
@given(technologies(), circuits(), WIRES, RULES, SCALE)
def test_all_resistances_times_k(fields, circuit, wires, rule, k):
    fields = {**fields, "opening_time": fields["closing_time"]}
    before = estimate(circuit, ohmic_pair(**fields), wires, rule)
    after = estimate(
        circuit, ohmic_pair(**_scaled(fields, on_resistance=k, off_resistance=k)), _wires(wires, k, 1.0), rule
    )
    _same(_rc_parts(after), k * _rc_parts(before))
    _same(after.dynamic_energy, before.dynamic_energy)
    _same(after.leakage_power, before.leakage_power / k)


@LIMITED
@given(technologies(), circuits(), WIRES, RULES, SCALE)
def test_impedance(fields, circuit, wires, rule, k):
    before = estimate(circuit, ohmic_pair(**fields), wires, rule)
    after = estimate(
        _scaled_circuit(circuit, 1 / k),
        ohmic_pair(
            **_scaled(fields, on_resistance=k, off_resistance=k, input_capacitance=1 / k, terminal_capacitance=1 / k)
        ),
        _wires(wires, k, 1 / k),
        rule,
    )
    _same(after.path_delay, before.path_delay)
    _same(after.dynamic_energy, before.dynamic_energy / k)
    _same(after.leakage_power, before.leakage_power / k)


@LIMITED
@given(technologies(), circuits(), WIRES, RULES, SCALE)
def test_time(fields, circuit, wires, rule, k):
    before = estimate(circuit, ohmic_pair(**fields), wires, rule)
    after = estimate(
        _scaled_circuit(circuit, k),
        ohmic_pair(**_scaled(fields, input_capacitance=k, terminal_capacitance=k, closing_time=k, opening_time=k)),
        _wires(wires, 1.0, k),
        rule,
    )
    _same(after.path_delay, k * before.path_delay)
    _same(after.dynamic_energy, k * before.dynamic_energy)
    _same(after.leakage_power, before.leakage_power)


@LIMITED
@given(technologies(), technologies(), circuits(), WIRES, RULES, SCALE)
def test_capacitance_of_both_sides_leaves_the_advantage(one, two, circuit, wires, rule, k):
    supply = np.linspace(0.2, 2.0, 37)

    def energies(fields, scale):
        swept = {**fields, "supply": supply, "closing_time": 0.0, "opening_time": 0.0}
        # a drive that weakens at low supply, so that an energy minimum inside the range is possible
        swept["on_resistance"] = fields["on_resistance"] * (1.0 + np.exp(-8.0 * (supply - 0.6)))
        swept["off_resistance"] = np.full_like(supply, fields["off_resistance"] * 50.0)
        swept = _scaled(swept, input_capacitance=scale, terminal_capacitance=scale)
        found = estimate(_scaled_circuit(circuit, scale), ohmic_pair(**swept), _wires(wires, 1.0, scale), rule)
        return found.dynamic_energy + found.leakage_power * found.path_delay

    before, after = [energies(f, 1.0) for f in (one, two)], [energies(f, k) for f in (one, two)]
    _same(after[1] / after[0], before[1] / before[0])
    for early, late in zip(before, after, strict=True):
        assert late[np.argmin(early)] <= late.min() * (1.0 + 1e-9)


@LIMITED
@given(technologies(), circuits(wire=False), RULES, st.floats(1.1, 50.0))
def test_width_times_k_without_wire(fields, circuit, rule, k):
    bare = replace(circuit, nets=tuple(replace(net, fixed_load=0.0) for net in circuit.nets))
    pair = ohmic_pair(**fields)
    before = estimate(bare, pair, Wires(0.0, 0.0), rule)
    for size_as in ("width", "copies"):
        after = estimate(bare, pair, Wires(0.0, 0.0), rule, size=k, size_as=size_as)
        _same(after.path_delay, before.path_delay)
        _same(after.dynamic_energy, k * before.dynamic_energy)
        _same(after.leakage_power, k * before.leakage_power)


@LIMITED
@given(technologies(), circuits(), WIRES, RULES, st.floats(1.1, 50.0))
def test_width_times_k_with_wire(fields, circuit, wires, rule, k):
    pair = ohmic_pair(**fields)
    lumped = replace(wires, resistance_per_length=0.0)  # with wire resistance a wider *load* costs delay again
    before, after = (estimate(circuit, pair, lumped, rule, size=size) for size in (1.0, k))
    unloaded = estimate(
        replace(circuit, nets=tuple(replace(net, fixed_load=0.0, wire_length=0.0) for net in circuit.nets)),
        pair,
        Wires(0.0, 0.0),
        rule,
    )
    assert unloaded.path_delay <= after.path_delay * (1.0 + 1e-12)
    loaded = float(before.path_delay - unloaded.path_delay)
    assert float(after.path_delay - unloaded.path_delay) == near(
        loaded / k, rel=1e-6, abs=1e-12 * float(before.path_delay)
    )


@LIMITED
@given(technologies(), circuits(), WIRES, RULES, SCALE)
def test_supply_times_k_at_fixed_resistance(fields, circuit, wires, rule, k):
    before = estimate(circuit, ohmic_pair(**fields), wires, rule)
    after = estimate(circuit, ohmic_pair(**_scaled(fields, supply=k)), wires, rule)
    _same(after.path_delay, before.path_delay)
    _same(after.dynamic_energy, k**2 * before.dynamic_energy)
    _same(after.leakage_power, k**2 * before.leakage_power)


@LIMITED
@given(technologies(), circuits(), WIRES, RULES, st.integers(2, 50))
def test_identical_blocks(fields, circuit, wires, rule, blocks):
    many = replace(circuit, nets=tuple(replace(net, count=net.count * blocks) for net in circuit.nets))
    one, all_of_them = (estimate(c, ohmic_pair(**fields), wires, rule) for c in (circuit, many))
    _same(all_of_them.path_delay, one.path_delay)
    for name in ("dynamic_energy", "leakage_power", "area", "switch_count", "switched_capacitance"):
        _same(getattr(all_of_them, name), blocks * getattr(one, name))
    _same(all_of_them.gate_pitch, one.gate_pitch)


@LIMITED
@given(technologies(), RULES, st.floats(0.5, 30.0), st.integers(1, 60))
def test_fan_out_and_chains(fields, rule, fan_out, depth):
    def chain(values, n, f):
        scenario = {"logic_depth": float(n), "fan_out": f, "activity": 0.1}
        return estimate(build("inverter-chain", scenario), ohmic_pair(**values), Wires(0.0, 0.0), rule)

    fanned = chain(fields, 1, fan_out)
    lumped = chain(_scaled(fields, input_capacitance=fan_out), 1, 1.0)
    _same(fanned.path_delay, lumped.path_delay)
    _same(fanned.dynamic_energy, lumped.dynamic_energy)
    long = chain(fields, depth, fan_out)
    _same(long.path_delay, depth * fanned.path_delay)
    _same(long.dynamic_energy, depth * fanned.dynamic_energy)


@LIMITED
@given(technologies(), circuits(), WIRES, RULES)
def test_swing_of_the_supply_is_no_swing_at_all(fields, circuit, wires, rule):
    pair = ohmic_pair(**fields)
    plain = estimate(circuit, pair, wires, rule)
    for swing_from in ("own-rail", "supply"):
        nets = tuple(replace(net, swing=fields["supply"], swing_from=swing_from) for net in circuit.nets)
        _same(estimate(replace(circuit, nets=nets), pair, wires, rule).dynamic_energy, plain.dynamic_energy)


@LIMITED
@given(technologies(), circuits(), WIRES, RULES, st.floats(0.1, 0.9))
def test_partial_swing_from_the_supply_is_linear_and_from_its_own_rail_quadratic(fields, circuit, wires, rule, share):
    pair = ohmic_pair(**fields)
    full = estimate(circuit, pair, wires, rule, short_circuit=False).dynamic_energy
    for swing_from, power in (("supply", 1), ("own-rail", 2)):
        nets = tuple(replace(net, swing=share * fields["supply"], swing_from=swing_from) for net in circuit.nets)
        part = estimate(replace(circuit, nets=nets), pair, wires, rule, short_circuit=False).dynamic_energy
        _same(part, share**power * full)


@LIMITED
@given(technologies(), st.floats(0.5, 8.0), st.integers(1, 60), _log(1e-4, 1.0))
def test_self_timed_leakage_over_dynamic(fields, fan_out, depth, activity):
    """kappa N / (a rho): nothing else enters when the delay is R C alone and loads are the stage's own."""
    fields = {**fields, "closing_time": 0.0, "opening_time": 0.0}
    scenario = {"logic_depth": float(depth), "fan_out": fan_out, "activity": activity}
    found = estimate(
        build("inverter-chain", scenario), ohmic_pair(**fields), Wires(0.0, 0.0), "step", short_circuit=False
    )
    ratio = fields["off_resistance"] / fields["on_resistance"]
    _same(found.leakage_power * found.path_delay / found.dynamic_energy, np.log(2.0) * depth / (activity * ratio))


@LIMITED
@given(technologies(), circuits(), WIRES, RULES)
def test_small_activity_leaves_leakage_alone(fields, circuit, wires, rule):
    quiet = replace(circuit, nets=tuple(replace(net, rising_per_operation=0.0) for net in circuit.nets))
    found, busy = (
        estimate(quiet, ohmic_pair(**fields), wires, rule),
        estimate(circuit, ohmic_pair(**fields), wires, rule),
    )
    assert found.dynamic_energy == 0.0
    _same(found.leakage_power, busy.leakage_power)  # never divided by activity
    _same(found.path_delay, busy.path_delay)


@LIMITED
@given(technologies(), technologies(), _log(1e4, 1e8), _log(1e-11, 1e-9), RULES)
def test_long_wires_forget_the_switch(one, two, r, c, rule):
    def line(fields, resistance):
        net = Net("line", cell("inverter"), loads=(Load(cell("inverter"), "a"),), wire_length=1e6,
                  rising_per_operation=1.0, on_critical_path=1.0)  # fmt: skip
        return estimate(
            Circuit("line", "", "", (net,)),
            ohmic_pair(**{**fields, "switching_level": 0.6}),
            Wires(resistance, c),
            rule,
            short_circuit=False,
        )

    with_r, without_r = [line(f, r) for f in (one, two)], [line(f, 0.0) for f in (one, two)]
    assert with_r[0].dynamic_energy / with_r[1].dynamic_energy == near((one["supply"] / two["supply"]) ** 2, rel=1e-2)
    assert with_r[0].path_delay / with_r[1].path_delay == near(1.0, abs=0.02)
    assert without_r[0].path_delay / without_r[1].path_delay == near(
        one["on_resistance"] / two["on_resistance"], rel=0.02
    )


@LIMITED
@given(technologies(), circuits(), WIRES, RULES)
def test_short_wires_give_the_unloaded_values(fields, circuit, wires, rule):
    pair = ohmic_pair(**fields)
    short = replace(circuit, nets=tuple(replace(net, wire_length=1e-15) for net in circuit.nets))
    none = replace(circuit, nets=tuple(replace(net, wire_length=0.0) for net in circuit.nets))
    pins = Wires(0.0, 0.0, wires.layout_capacitance_per_pin)
    found, bare = estimate(short, pair, wires, rule), estimate(none, pair, pins, rule)
    np.testing.assert_allclose(found.path_delay, bare.path_delay, rtol=1e-6)
    np.testing.assert_allclose(found.dynamic_energy, bare.dynamic_energy, rtol=1e-6)


@LIMITED
@given(technologies())
def test_large_fan_out_forgets_transit_and_own_capacitance(fields):
    fan_out = 1e12
    scenario = {"logic_depth": 1.0, "fan_out": fan_out, "activity": 1.0}
    found = estimate(
        build("inverter-chain", scenario), ohmic_pair(**fields), Wires(0.0, 0.0), "step", short_circuit=False
    )
    per_input = 2.0 * fields["input_capacitance"]  # two switches per inverter input
    assert found.path_delay / fan_out == near(np.log(2.0) * fields["on_resistance"] * per_input, rel=1e-3)
    assert found.dynamic_energy / fan_out == near(per_input * fields["supply"] ** 2, rel=1e-6)


@LIMITED
@given(technologies(), circuits(), WIRES, RULES)
def test_transit_and_resistance_limits(fields, circuit, wires, rule):
    no_transit = estimate(circuit, ohmic_pair(**{**fields, "closing_time": 0.0, "opening_time": 0.0}), wires, rule)
    whole = estimate(circuit, ohmic_pair(**fields), wires, rule)
    _same(no_transit.path_delay, _rc(whole))
    ideal = {**fields, "on_resistance": 1e-9, "switching_level": 0.6}
    perfect = estimate(circuit, ohmic_pair(**ideal), wires, rule)
    better = estimate(circuit, ohmic_pair(**{**ideal, "on_resistance": 0.5e-9}), wires, rule)
    floor = perfect.path_delay_parts["transit"] + perfect.path_delay_parts["wire"]
    np.testing.assert_allclose(perfect.path_delay, floor, rtol=1e-9)
    np.testing.assert_allclose(better.path_delay, perfect.path_delay, rtol=1e-9)


@LIMITED
@given(technologies(), circuits(), WIRES, RULES, st.floats(1.1, 10.0))
def test_leakage_share_rises_with_depth_and_falls_with_activity_and_ratio(fields, circuit, wires, rule, k):
    def share(values, made):
        found = estimate(made, ohmic_pair(**values), wires, rule, short_circuit=False)
        leakage = found.leakage_power * found.path_delay
        return float(leakage / (leakage + found.dynamic_energy))

    def nets(**factors):
        return replace(
            circuit,
            nets=tuple(
                replace(net, **{name: getattr(net, name) * factor for name, factor in factors.items()})
                for net in circuit.nets
            ),
        )

    fixed = {**fields, "switching_level": 0.6}
    base = share(fixed, circuit)
    assert share(fixed, nets(on_critical_path=k)) > base
    assert share(fixed, nets(rising_per_operation=k)) < base
    assert share(_scaled(fixed, off_resistance=k), circuit) < base


@LIMITED
@given(technologies(), circuits(), WIRES, RULES, st.floats(1.0, 3.0), st.floats(1.0, 3.0), _log(1e-20, 1e-16))
def test_parts_sum(fields, circuit, wires, rule, guard_delay, guard_leakage, extra):
    pair = ohmic_pair(**fields, extra_energy=extra, input_leakage=1e-12, body_leakage=1e-13)
    found = estimate(circuit, pair, wires, rule, guard_delay=guard_delay, guard_leakage=guard_leakage)
    for total, parts in (
        (found.path_delay, found.path_delay_parts),
        (found.dynamic_energy, found.dynamic_energy_parts),
        (found.dynamic_energy, found.dynamic_energy_by_group),
        (found.leakage_power, found.leakage_power_parts),
        *((s.delay, s.delay_parts) for s in found.stages),
        *((s.energy, s.energy_parts) for s in found.stages),
        *((s.falling.delay, s.falling.parts) for s in found.stages),
    ):
        np.testing.assert_allclose(sum(parts.values()), total, rtol=1e-12)


@LIMITED
@given(st.permutations(range(4)), technologies(), WIRES, RULES)
def test_elements_are_independent(order, fields, wires, rule):
    """An array element's result does not depend on its neighbours (no loop, no shared state)."""
    supply = fields["supply"] * np.array([0.5, 1.0, 1.5, 2.0])
    circuit = build("inverter-chain", {"logic_depth": 5.0, "fan_out": 2.0, "activity": 0.1})
    whole = estimate(circuit, ohmic_pair(**{**fields, "supply": supply}), wires, rule)
    shuffled = estimate(circuit, ohmic_pair(**{**fields, "supply": supply[list(order)]}), wires, rule)
    np.testing.assert_array_equal(shuffled.path_delay, whole.path_delay[list(order)])
    np.testing.assert_array_equal(shuffled.dynamic_energy, whole.dynamic_energy[list(order)])
