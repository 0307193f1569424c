"""What physics forbids is flagged or refused, over random sets (property 73), and the limits of temperature (21, 36).

Least heat of erasing a bit k T ln 2: Landauer, IBM J. Res. Dev. 5 (1961) 183, from memory. Thermionic swing
ln(10) k T / q: Fermi-Dirac statistics, common practice. Constants: exact by the SI of 2019. No side of a study can
state a refrigerator, so its least work (Carnot) cannot be undercut.
"""

from __future__ import annotations

import math
from decimal import Decimal as D
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from benchmark.decide.notices import result_warnings
from benchmark.errors import InputRefused
from benchmark.evaluate.points import design_points
from benchmark.record.run import _primary, _verdict
from tests import comparisons as cmp
from tests.comparisons import comparison, load, number, planar, side, steep, study
from tests.near import near
from tests.profiles import costly
from tests.random_sets import factor, two
from tests.studies import Inputs, technology, v
from tests.unit.test_stress_gated import BASE, LOG_SLOPE

few = costly(6)
BOLTZMANN, CHARGE = 1.380649e-23, 1.602176634e-19
HEAT = "C V^2 of a net is below k T ln 2"
SOUND = "is faster than sound crosses"


def warnings_of(inputs: Inputs) -> list[str]:
    loaded = load(inputs)
    primary = _primary(loaded)
    return result_warnings(primary.comparison, primary.outcome, _verdict(loaded, primary))


# -- heat of erasing a bit -------------------------------------------------------------------------------------------


@few
@given(factor(0.02, 50.0), factor(0.02, 0.6), st.integers(-150, 150), st.integers(1, 4))
def test_a_charge_energy_below_the_heat_of_erasure_is_flagged(ratio: float, supply: float, celsius: int, fan_out: int):
    """``ratio``: C V^2 of the only net over k T ln 2; the hottest temperature counts."""
    assume(ratio != 1.0)  # there rounding decides
    heat = BOLTZMANN * (celsius + 273.15) * math.log(2.0)
    per_switch = ratio * heat / supply**2 / (2 * fan_out)  # an inverter input is two switches
    tiny = cmp.given("a", supply=supply, input_capacitance=v(number(per_switch * 1e15), "fF", unusual=True))
    tiny["value"]["declared_supply"]["unusual"] = True
    inputs = study(
        side("a", supply, supply),
        [side("b", 0.5, 0.5)],
        [tiny, cmp.given("b", input_capacitance=20.0)],
        values={"fan_out": v(fan_out)},
        temperatures=(-200.0, float(celsius)),
        points=5,
    )
    found = warnings_of(inputs)
    assert any(text == f"a: {HEAT}, the least heat of erasing a bit" for text in found) == (ratio < 1.0)
    assert not any(text.startswith("b: C V^2") for text in found)


# -- swing -----------------------------------------------------------------------------------------------------------


def swing_limit(celsius: float) -> float:
    """mV per decade."""
    return 1e3 * math.log(10.0) * BOLTZMANN * (celsius + 273.15) / CHARGE


@few
@given(factor(0.8, 1.25), st.integers(-100, 150), st.sampled_from(["steep-swing", "virtual-source"]))
def test_a_swing_below_the_thermionic_limit_is_refused(ratio: float, celsius: int, kind: str):
    swing = swing_limit(celsius) * ratio
    item = (
        steep("a", subthreshold_swing=swing, options={"conduction": "thermionic"})
        if kind == "steep-swing"
        else planar("a", subthreshold_swing=swing)
    )
    item["reference_temperature"] = {"value": D(celsius), "unit": "degC"}
    inputs = two(item, cmp.given("b"))
    inputs.study["conditions"]["temperatures"] = {"values": [D(celsius)], "unit": "degC"}
    if ratio < 1.0:
        with pytest.raises(InputRefused) as caught:
            load(inputs)
        assert any("below the thermionic limit" in problem.what for problem in caught.value.problems)
    else:
        load(inputs)


@few
@given(factor(1.02, 1.4), st.integers(30, 200))
def test_a_swing_that_does_not_follow_the_temperature_is_no_number_where_it_is_too_small(ratio: float, celsius: int):
    """Stated as independent of temperature: allowed up to the temperature whose limit it is."""
    item = steep(
        "a",
        subthreshold_swing=swing_limit(25.0) * ratio,
        swing_temperature_coefficient=v(D("0.0"), "mV/decade/K"),
        options={"conduction": "thermionic"},
    )
    problem = comparison(load(two(item, cmp.given("b"), temperatures=(25.0, float(celsius))))).candidate.problem
    found = design_points(problem, np.array([[0.5]]))
    below = swing_limit(celsius) > swing_limit(25.0) * ratio
    assert bool(found.able[0, 0]) != below
    assert any("thermionic limit" in reason for reason, mask in found.infeasible.items() if mask.any()) == below


@few
@given(factor(1.0, 1.5), factor(0.5, 2.0), factor(1e-4, 1e-1))
def test_thermionic_swing_and_leakage_rise_with_temperature_and_a_floor_keeps_leakage_finite(
    ideality: float, k: float, floor: float
):
    """S in proportion to T: at twice the temperature a decade takes twice the voltage; leakage never falls."""
    item = steep(
        "a",
        subthreshold_swing=swing_limit(25.0) * ideality * 1.0000001,
        off_current=floor,
        options={"conduction": "thermionic"},
    )
    kelvin = np.array([298.15, 298.15 * 1.1, 298.15 * 1.3])
    problem = comparison(load(two(item, cmp.given("b")))).candidate.problem
    leaks, swings = [], []
    for shift in (0.0, 0.03 * k):
        pair = problem.switches(np.array([[0.6]]), shift, tuple(kelvin))
        leaks.append(np.ravel(pair.down.off_current_path))
    swings = 0.03 * k / np.log10(leaks[0] / leaks[1])
    assert np.all(np.diff(leaks[0]) > 0.0)
    assert swings == near(swing_limit(25.0) * 1e-3 * ideality * kelvin / 298.15, rel=2e-3)
    # tunnelling: no thermionic part; cold leaves the stated floor
    cold = steep("a", off_current=floor)
    problem = comparison(load(two(cold, cmp.given("b")))).candidate.problem
    found = [problem.switches(np.array([[0.6]]), 0.0, (t,)).down.off_current_path for t in (298.15, 30.0)]
    assert float(np.ravel(found[1])[0]) == near(float(np.ravel(found[0])[0]), rel=1e-12)


# -- sound -----------------------------------------------------------------------------------------------------------

UNITS = {
    "actuator_coefficient": ("pm/V", 1e12),
    "actuator_compliance": ("1/Pa", 1.0),
    "actuator_permittivity": ("1", 1.0),
    "actuator_coupling_factor": ("1", 1.0),
    "actuator_density": ("kg/m^3", 1.0),
    "actuator_loss_tangent": ("1", 1.0),
    "mechanical_quality": ("1", 1.0),
    "actuator_height": ("m", 1.0),
    "actuator_area": ("m^2", 1.0),
    "layer_count": ("1", 1.0),
    "channel_thickness": ("m", 1.0),
    "channel_area": ("m^2", 1.0),
    "channel_modulus": ("Pa", 1.0),
    "channel_sound_speed": ("m/s", 1.0),
    "frame_compliance": ("m/N", 1.0),
    "punch_modulus": ("Pa", 1.0),
    "punch_poisson_ratio": ("1", 1.0),
    "punch_faces": ("1", 1.0),
    "built_in_interference": ("m", 1.0),
    "contact_resistivity": ("ohm m^2", 1.0),
    "actuator_leakage_resistance": ("ohm", 1.0),
    "terminal_capacitance": ("F", 1.0),
    "footprint": ("m^2", 1.0),
    "breakdown_field": ("V/m", 1.0),
    "depoling_stress": ("Pa", 1.0),
    "channel_strength": ("Pa", 1.0),
    "curie_temperature": ("K", 1.0),
    "resistance_unstressed": ("ohm", 1.0),
    "resistance_floor": ("ohm", 1.0),
    "resistance_slope": ("decade/Pa", 1.0),
    "onset_pressure": ("Pa", 1.0),
    "corner_width": ("Pa", 1.0),
    "unstressed_activation_energy": ("J", 1.0),
}


def column_of(quality: float, floor: float, height: float) -> Any:
    """A stress-gated switch with its force balance; small charges and resistances, so that the column sets the pace."""
    numbers = {**BASE, **LOG_SLOPE, "contact_resistivity": 1e-14, "terminal_capacitance": 1e-20}
    numbers |= {"mechanical_quality": quality, "resistance_floor": floor, "actuator_height": height}
    numbers |= {"channel_strength": 1e11, "depoling_stress": 1e9}  # never what binds
    del numbers["reference_temperature"], numbers["actuator_coupling_factor"]
    values = {
        name: v(number(float(f"{value * UNITS[name][1]:.12g}")), UNITS[name][0], unusual=True)
        for name, value in numbers.items()
    }
    values["declared_supply"] = v(D("0.8"), "V")
    options = {"mechanics": "force-balance", "pressure_law": "log-slope", "complement": "mirrored-plate"}
    return technology("a", "stress-gated", ["n1"], options, values)


@few
@given(
    st.sampled_from(["step", "chain", "integral"]),
    factor(0.7, 5.0),
    factor(1e3, 1e5),
    factor(40e-9, 80e-9),
    factor(0.75, 1.4),
)
def test_no_stage_is_faster_than_sound_unless_it_is_flagged(
    rule: str, quality: float, floor: float, height: float, supply: float
):
    """h / v from the stated constants alone: compliance at constant displacement, density, height."""
    inputs = study(
        side("a", supply, supply),
        [side("b", 0.5, 0.5)],
        [column_of(quality, floor, height), cmp.given("b")],
        rule=rule,
        policy={"primary": "minimum-energy"},
        points=5,
    )
    loaded = load(inputs)
    primary = _primary(loaded)
    assert primary.outcome.candidate.found[0]
    permittivity = BASE["actuator_permittivity"] * 8.8541878188e-12
    coupling = BASE["actuator_coefficient"] ** 2 / (BASE["actuator_compliance"] * permittivity)
    speed = 1.0 / math.sqrt(BASE["actuator_density"] * BASE["actuator_compliance"] * (1.0 - coupling))
    least = 20 * (height / speed + BASE["channel_thickness"] / BASE["channel_sound_speed"])
    flagged = any(
        SOUND in text for text in result_warnings(primary.comparison, primary.outcome, _verdict(loaded, primary))
    )
    assert flagged == (float(primary.outcome.candidate.time[0]) < least * (1.0 - 1e-6))
    assert not (flagged and rule != "integral")


def test_the_two_pole_is_flagged_where_it_runs_ahead_of_the_wave():
    quick = study(
        side("a", 1.0, 1.0),
        [side("b", 0.5, 0.5)],
        [column_of(3.0, 1e3, 60e-9), cmp.given("b")],
        rule="integral",
        points=5,
    )
    found = [text for text in warnings_of(quick) if SOUND in text]
    assert found == [
        "a: a stage is faster than sound crosses the moving body of its switch; the two-pole of the delay rule answers "
        "before the wave arrives"
    ]
    quick.study["conditions"]["delay_rule"] = "chain"
    assert not any(SOUND in text for text in warnings_of(quick))
