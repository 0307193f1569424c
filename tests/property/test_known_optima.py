"""Optima known in closed form, with device laws made for the test, and a comparison of a law with its table."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from decimal import Decimal as D
from typing import Any

import numpy as np
import pytest
from scipy.special import lambertw

from benchmark.devices.model import DeviceModel
from benchmark.evaluate import side as side_module
from benchmark.evaluate.points import design_points
from tests.comparisons import compare, comparison, given, load, side, steep, study
from tests.factories import ohmic_pair
from tests.near import near
from tests.studies import Inputs, technology, toml, v

LN2 = float(np.log(2.0))
THRESHOLD = 0.2
INVERTER = 0.4e-15  # two switches of 0.2 fF


@pytest.fixture
def law(monkeypatch: pytest.MonkeyPatch) -> Callable[[Callable[..., Any]], None]:
    """Let the model ``given`` answer with another law: supply -> (resistance, off-resistance)."""

    def use(resistances: Callable[[Any], tuple[Any, Any]]) -> None:
        def switch(prepared: Any, supply: Any, temperature: Any, knobs: Any) -> Any:
            on, off = resistances(np.asarray(supply))
            ones = np.ones(np.broadcast_shapes(np.shape(supply), np.shape(temperature)))
            return ohmic_pair(
                supply=supply * ones,
                on_resistance=on * ones,
                off_resistance=off * ones,
                input_capacitance=0.2e-15 * ones,
                temperature=temperature * ones,
                area=1e-14 * ones,
                window=(0.2, 0.8),
                switching_level=0.5 * ones,
            )

        made = DeviceModel("given", "law of a test", (), (), lambda inputs: {"values": inputs.values}, switch)
        monkeypatch.setattr(side_module, "model", lambda name: made)

    return use


def chain(low: float, high: float, **options: Any) -> Inputs:
    more: dict[str, Any] = {"points": 61, "refine": 1e-9} | options
    return study(side("a", low, high), [side("b", low, high)], [given("a"), given("b")], **more)


# -- minimum E T^m under the alpha-power law without leakage (58) ---------------------------------------------------


def alpha_power(exponent: float) -> Callable[[Any], tuple[Any, Any]]:
    def resistances(supply: Any) -> tuple[Any, Any]:
        over = np.where(supply > THRESHOLD, supply - THRESHOLD, np.nan)
        return 1e4 * supply / over**exponent, np.asarray(1e30)

    return resistances


@pytest.mark.parametrize(
    ("exponent", "m", "over_threshold"),
    [(2.0, 1.0, 3.0), (1.3, 1.0, 3.0 / 1.7), (1.0, 1.0, 1.5), (1.3, 2.0, 4.0 / 1.4), (1.0, 0.5, 2.5 / 2.0)],
)
def test_minimum_energy_delay_supply_under_the_alpha_power_law(
    law: Any, exponent: float, m: float, over_threshold: float
):
    """V = (2 + m) V_T / (2 + m - m A): 3 V_T at A = 2, 1.765 V_T at A = 1.3, 1.5 V_T at A = 1 (m = 1)."""
    law(alpha_power(exponent))
    inputs = chain(0.15, 1.5, policy={"primary": "minimum-energy-delay", "exponent": D(repr(m))})
    found = compare(load(inputs)).candidate
    assert (2 + m) / (2 + m - m * exponent) == near(over_threshold, rel=1e-12)
    assert found.supply[0] == near(over_threshold * THRESHOLD, rel=1e-6)
    assert not any(label[0] for label in (found.optimum.at_lower, found.optimum.at_upper, found.optimum.at_limit))
    # and the value itself
    supply = over_threshold * THRESHOLD
    time = 20 * LN2 * 1e4 * supply / (supply - THRESHOLD) ** exponent * INVERTER
    assert found.optimum.value[0] == near(20 * 0.05 * INVERTER * supply**2 * time**m, rel=1e-9)


@pytest.mark.parametrize(("exponent", "m"), [(2.0, 2.0), (2.0, 3.0), (1.5, 4.0)])
def test_without_an_interior_minimum_the_optimum_is_labelled_on_the_bound(law: Any, exponent: float, m: float):
    """m A >= 2 + m: E T^m falls for ever, so the upper end of the range is the answer and says so."""
    law(alpha_power(exponent))
    for high in (0.8, 1.5):
        inputs = chain(0.15, high, policy={"primary": "minimum-energy-delay", "exponent": D(repr(m))})
        found = compare(load(inputs)).candidate
        assert found.supply[0] == high
        assert found.optimum.at_upper[0]


# -- minimum energy of a pure exponential drive (59) ----------------------------------------------------------------

SWING = 0.06
PER_E = SWING / np.log(10.0)


def exponential(supply: Any) -> tuple[Any, Any]:
    """Current I_0 10^(V/S) closed, I_0 open."""
    return supply / (1e-12 * np.exp(supply / PER_E)), supply / 1e-12


def energy(x: Any, activity: float, depth: float) -> Any:
    return depth * INVERTER * (x * PER_E) ** 2 * (activity + LN2 * depth * np.exp(-x))


def with_activity(activity: str, low: float, **options: Any) -> Inputs:
    values = {"activity": v(D(activity)), "logic_depth": v(20)}
    return chain(low, 30 * PER_E, values=values, **options)


FLOOR = {"noise_margin": {"limit": {"value": D("0.1"), "unit": "1"}, "kind": "hard", "fan_in": 1}}


@pytest.mark.parametrize("activity", ["0.3", "0.1", "0.01", "0.0001"])
def test_the_interior_minimum_of_an_exponential_drive(law: Any, activity: str):
    """(x - 2) exp(-x) = 2 a / (kappa N), x = V ln 10 / S, when kappa N / a >= 2 e^3 = 40.17."""
    law(exponential)
    a = float(activity)
    assert LN2 * 20 / a > 2 * np.e**3
    x = 2.0 - float(lambertw(-2.0 * a * np.e**2 / (LN2 * 20), -1).real)
    found = compare(load(with_activity(activity, 2.5 * PER_E))).candidate
    assert found.supply[0] / PER_E == near(x, rel=1e-6)
    assert found.energy[0] == near(float(energy(x, a, 20)), rel=1e-9)
    assert not any(label[0] for label in (found.optimum.at_lower, found.optimum.at_limit))


@pytest.mark.parametrize("activity", ["0.5", "0.9"])
def test_without_an_interior_minimum_the_optimum_is_on_a_bound_never_a_bogus_root(law: Any, activity: str):
    """kappa N / a below 40.17: the energy falls with the supply down to whatever bounds it."""
    law(exponential)
    assert LN2 * 20 / float(activity) < 2 * np.e**3
    free = compare(load(with_activity(activity, 2.0 * PER_E))).candidate
    assert free.supply[0] == near(2.0 * PER_E, rel=1e-12)
    assert free.optimum.at_lower[0]
    floored = compare(load(with_activity(activity, 0.5 * PER_E, requirements=FLOOR, points=41, refine=1e-6))).candidate
    assert floored.optimum.at_limit[0]
    assert floored.supply[0] > 2.0 * PER_E


@pytest.mark.parametrize("activity", ["0.1", "0.01", "0.9"])
def test_with_a_functional_floor_the_start_of_the_search_does_not_matter(law: Any, activity: str):
    """Without one the search falls for a switch that does not switch and costs nothing."""
    law(exponential)
    starts = (2.0, 1.0, 0.1)
    found = [
        compare(load(with_activity(activity, start * PER_E, requirements=FLOOR, points=41, refine=1e-7))).candidate
        for start in starts
    ]
    for other in found[1:]:
        assert other.energy[0] == near(found[0].energy[0], rel=1e-6)
        assert other.supply[0] == near(found[0].supply[0], rel=1e-3)
    bare = [compare(load(with_activity(activity, start * PER_E))).candidate for start in (0.3, 0.1)]
    assert all(one.optimum.at_lower[0] for one in bare)
    assert bare[1].energy[0] < bare[0].energy[0] < found[0].energy[0]


# -- a table of a law against the law (70) --------------------------------------------------------------------------


def tabled(count: int) -> Inputs:
    """``a``: the current of the steep switch ``b`` at count x count voltages, read back as a measured table."""
    base = study(side("b", 0.3, 0.6), [side("c", 0.3, 0.6)], [steep("b"), given("c")])
    problem = comparison(load(base)).candidate.problem
    pair = problem.switches(np.array([[0.6]]), 0.0)
    control, path = np.linspace(0.0, 0.6, count), np.linspace(0.1, 0.6, count)
    grid = np.array([(c, p) for c in control for p in path])
    current = np.ravel(pair.down.current(grid[:, 0][None, None, None, :], grid[:, 1][None, None, None, :]))
    rows = ["control_voltage,path_voltage,current"]
    rows += [f"{c!r},{p!r},{i!r}" for (c, p), i in zip(grid.tolist(), (current / 200e-9).tolist(), strict=True)]
    sidecar = {
        "schema": 1,
        "file": "sampled.csv",
        "evidence": "invented",
        "source": "invented",
        "conditions": "25 degC",
        "interpolate": {"column": "current", "along": "control_voltage", "scale": "log", "method": "monotone"},
        "column": {
            "control_voltage": {"meaning": "control_voltage", "kind": "axis", "unit": "V"},
            "path_voltage": {"meaning": "path_voltage", "kind": "axis", "unit": "V"},
            "current": {"meaning": "path_current_per_width", "kind": "value", "unit": "A/m"},
        },
    }
    known = technology(
        "a",
        "table",
        ["n1"],
        {},
        {
            "declared_supply": v(D("0.5"), "V"),
            "unit_width": v(D("200.0"), "nm"),
            "gate_capacitance_total": v(D("0.8"), "fF/um"),
            "terminal_capacitance_per_width": v(D("0.2"), "fF/um"),
            "drain_capacitance_share": v(D("0.0"), "1"),
            "transit_time": v(D("0.0"), "ps"),
            "footprint": v(D("0.03"), "um^2"),
            "series_switches_max": v(2),
        },
    )
    known["table"] = {"current": {"file": "tables/sampled.csv"}}
    inputs = study(
        side("a", 0.3, 0.6),
        [side("b", 0.3, 0.6)],
        [known, steep("b")],
        policy={"primary": "minimum-energy-delay", "exponent": D("1.0")},
        points=21,
        refine=1e-7,
    )
    inputs.texts = {"nodes/tables/sampled.csv": "\n".join(rows) + "\n", "nodes/tables/sampled.toml": toml(sidecar)}
    return inputs


def test_a_table_of_a_law_ties_with_the_law_the_closer_the_finer_it_is():
    errors = []
    for count in (4, 7, 13, 25):
        found = compare(load(tabled(count)))
        one, other = found.candidate, found.contenders[0]
        assert one.found[0], one.why
        errors.append(abs(one.optimum.value[0] / other.optimum.value[0] - 1.0))
    assert errors[-1] < 1e-3
    assert errors[-1] < 0.1 * errors[0]
    assert all(later <= sooner * 1.5 for sooner, later in itertools.pairwise(errors))


def test_a_supply_search_stops_at_the_end_of_the_data():
    inputs = tabled(7)
    inputs.study["candidate"]["knobs"]["supply"]["high"] = D("0.9")
    inputs.study["policy"] = {"primary": "iso-energy", "required_energy": v(D("1.0"), "pJ")}
    inputs.study["policy"]["metric"] = "time-per-operation"
    found = compare(load(inputs)).candidate
    assert found.supply[0] <= 0.6 * (1 + 1e-12)
    problem = comparison(load(inputs)).candidate.problem
    beyond = design_points(problem, np.array([[0.61]]))
    assert not beyond.able[0, 0]
    assert beyond.infeasible
