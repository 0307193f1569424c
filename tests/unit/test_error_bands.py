"""Measured bands at the design points: found or refused by name, put together, and held against the advantage."""

from __future__ import annotations

import dataclasses
import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Load, Net, Wires
from benchmark.circuits.operation import estimate
from benchmark.circuits.sized import Sized
from benchmark.decide.compare import Comparison, Outcome
from benchmark.decide.curves import Envelope
from benchmark.decide.error_bands import AdvantageBand, SideBand, advantage_band, band_warnings, side_bands
from benchmark.evaluate import bands as engine
from benchmark.evaluate.bands import AXES, find, read_bands, rings, stage_facts
from benchmark.evaluate.batch import Batch
from benchmark.record.load import load_study
from tests.factories import ohmic_pair
from tests.near import near

STUDY = Path(__file__).parent.parent / "data" / "error-bands" / "study.toml"
HEAD = "model,quantity,rule,cell," + ",".join(f"{axis}_low,{axis}_high" for axis in AXES)
HEAD += ",ratio_low,ratio_high,points"
FACTS = {
    "supply": 0.5,
    "temperature": 300.0,
    "transit_over_rc": 1.0,
    "on_off_ratio": 1e5,
    "switching_level": 0.7,
    "quality": 1.0,
}
LINES = [
    HEAD,
    "m,delay,chain,inverter,0.3,0.5,,,,,,,,,,,0.9,1.1,5",
    "m,delay,chain,inverter,0.5,0.7,,,,,,,,,,,0.95,1.2,7",
    "m,delay,chain,nand2,,,,,0,1,1e4,1e6,0.5,0.9,0.5,2,0.8,1.3,9",
    "other,delay,step,inverter,,,,,,,,,,,,,0.5,0.6,2",
]


@pytest.fixture
def few(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(engine, "bands", lambda: read_bands(LINES))


@pytest.mark.usefixtures("few")
def test_a_stage_on_a_shared_limit_gets_the_wider_of_both_bands():
    inside = find("delay", "m", "chain", "inverter", FACTS | {"supply": 0.4})
    assert (inside.low, inside.high, inside.points, inside.over) == (0.9, 1.1, 5, "supply 0.3 to 0.5 V")
    shared = find("delay", "m", "chain", "inverter", FACTS)
    assert (shared.low, shared.high, shared.points, shared.over) == (0.9, 1.2, 12, "supply 0.3 to 0.7 V")
    assert shared.why == ""


@pytest.mark.usefixtures("few")
@pytest.mark.parametrize(
    ("asked", "facts", "why"),
    [
        (("delay", "new", "chain", "inverter"), {}, "device model new (measured: m, other)"),
        (("delay", "m", "step", "inverter"), {}, "delay rule step (measured: chain)"),
        (("delay", "m", "chain", "nor2"), {}, "cell nor2 (measured: inverter, nand2)"),
        (("leakage", "m", "chain", "inverter"), {}, "device model m (measured: none)"),
        (("delay", "m", "chain", "inverter"), {"supply": 0.2}, "supply 0.2 V (measured: 0.3 to 0.7 V)"),
        (
            ("delay", "m", "chain", "nand2"),
            {"on_off_ratio": 1e9, "transit_over_rc": 3.0},
            "transit over R C 3 (measured: 0 to 1), on/off ratio 1e+09 (measured: 1e+04 to 1e+06)",
        ),
        (("delay", "m", "chain", "nand2"), {"quality": math.nan}, "quality not stated (measured: 0.5 to 2)"),
        (
            ("delay", "m", "chain", "nand2"),
            {"quality": 3.0, "switching_level": 0.4},
            "quality 3 beyond the ringing limit of 2.74: outputs may switch falsely",
        ),
    ],
)
def test_without_a_band_the_reason_is_named(asked: tuple[str, str, str, str], facts: dict[str, float], why: str):
    found = find(*asked, FACTS | facts)
    assert found.why == why
    assert found.points == 0
    assert math.isnan(found.low)


def test_a_combination_that_was_not_measured_is_said_to_be_one(monkeypatch: pytest.MonkeyPatch):
    lines = [
        HEAD,
        "m,delay,chain,inverter,0.3,0.5,200,250,,,,,,,,,0.9,1.1,5",
        "m,delay,chain,inverter,0.5,0.7,250,350,,,,,,,,,0.9,1.1,5",
    ]
    monkeypatch.setattr(engine, "bands", lambda: read_bands(lines))
    found = find("delay", "m", "chain", "inverter", FACTS | {"supply": 0.35})
    assert found.why == "this combination of supply 0.35 V, temperature 300 K"


def test_ringing_limit_needs_an_actuator_that_is_not_fast():
    facts = FACTS | {"quality": 3.0, "switching_level": 0.4}
    assert rings(facts) == near(0.8 * math.pi / math.log(2.5))
    assert math.isnan(rings(facts | {"transit_over_rc": 0.1}))
    assert math.isnan(rings(facts | {"quality": 2.7}))
    assert math.isnan(rings(facts | {"quality": math.nan}))
    assert rings(facts | {"quality": 5.0, "switching_level": 0.9}) == 4.5


def test_facts_of_a_stage_by_hand():
    """R C of an inverter with fan-out 1: 1e4 ohm x 1 fF x 2 inputs; transit 5 ps."""
    pair = ohmic_pair(
        supply=0.8,
        on_resistance=1e4,
        off_resistance=1e9,
        input_capacitance=1e-15,
        closing_time=5e-12,
        opening_time=5e-12,
        natural_frequency=np.asarray(1e11),
        quality=np.asarray(0.7),
        up={"off_resistance": 1e8},
    )
    gate = cell("inverter")
    net = Net("stage", gate, loads=(Load(gate, "a", 1.0),), rising_per_operation=1.0, on_critical_path=1.0)
    for rule in ("chain", "step"):
        made = estimate(Circuit("stage", "stage", "one cycle", (net,)), pair, Wires(0.0, 0.0), rule)
        facts = stage_facts(made.stages[0], Sized(pair), 300.0)
        assert facts["transit_over_rc"] == near(5e-12 / 2e-11)
        assert facts["on_off_ratio"] == near(1e4)
        assert (facts["supply"], facts["temperature"], facts["quality"]) == (0.8, 300.0, 0.7)
        # the level of the switch with the larger contrast: 0.8 - 0.6 ln 2 / ln 1e5
        assert facts["switching_level"] == near(0.8 - 0.6 * math.log(2.0) / math.log(1e5))


def _outcome(**changes: str) -> tuple[Comparison, Outcome]:
    study, _ = load_study(STUDY, overrides=changes)
    comparison = Comparison(study, study.pair(study.headline), Batch.best_estimate())
    return comparison, comparison.outcome(study.policy.primary)


def _table(delay: str, energy: str, leakage: str = "1,1") -> list[str]:
    """Bands of both models for an inverter, everywhere."""
    rows = []
    for model in ("virtual-source", "stress-gated"):
        for quantity, ends in (("delay", delay), ("energy", energy), ("leakage", leakage)):
            rows.append(f"{model},{quantity},chain,inverter,{','.join([''] * 12)},{ends},10")
    return [HEAD, *rows]


def test_both_sides_of_a_study_have_bands_of_their_own_points():
    bands = {(band.role, band.quantity): band for band in side_bands(*_outcome())}
    assert len(bands) == 8
    assert all(band.covered == near(1.0) and not band.missing for band in bands.values())
    assert all(band.low <= band.high for band in bands.values())
    stored = find("delay", "virtual-source", "chain", "inverter", FACTS | {"supply": 0.232, "temperature": 298.15})
    reference = bands["contender", "delay"]
    assert (reference.low, reference.high, reference.points) == (near(stored.low), near(stored.high), stored.points)
    assert "supply 0.2 to 0.3 V" in reference.over


def test_energy_per_operation_is_put_together_from_its_parts(monkeypatch: pytest.MonkeyPatch):
    """Self-timed: leakage lasts as long as the path, so its share errs with the delay too."""
    monkeypatch.setattr(engine, "bands", lambda: read_bands(_table("0.5,2", "0.8,1.25", "0.9,1.1")))
    comparison, outcome = _outcome()
    bands = {band.quantity: band for band in side_bands(comparison, outcome) if band.role == "contender"}
    points = outcome.strongest_side.optimum.points
    leak = float(points.energy_parts["leakage"][0, 0] / points.energy[0, 0])
    assert 0.05 < leak < 0.95
    whole = bands["energy per operation"]
    assert whole.low == near(1.0 / ((1.0 - leak) / 0.8 + leak / 0.5 / 0.9))
    assert whole.high == near(1.0 / ((1.0 - leak) / 1.25 + leak / 2.0 / 1.1))


def _flat(energy: float = 1.0) -> Envelope:
    time = np.geomspace(1e-9, 1e-6, 31)
    same = np.full(time.shape, energy)
    return Envelope(time, same, same, ("x",) * 31, same)


def test_advantage_errs_as_both_energies_do(monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setattr(engine, "bands", lambda: read_bands(_table("1,1", "0.8,1.25")))
    comparison, outcome = _outcome()
    bands = side_bands(comparison, outcome)
    mine, theirs = (next(b for b in bands if (b.role, b.quantity) == (r, "energy per operation")) for r in
                    ("candidate", "contender"))  # fmt: skip
    found = advantage_band(comparison, outcome, _flat(), bands)
    best = float(outcome.advantage[0])
    assert found is not None
    assert found.low == near(best * mine.low / theirs.high)
    assert found.high == near(best * mine.high / theirs.low)
    assert not found.straddles


def test_a_wrong_delay_is_paid_at_the_required_time(monkeypatch: pytest.MonkeyPatch):
    """Energy falls with the square of time here: half the time costs four times the energy."""
    monkeypatch.setattr(engine, "bands", lambda: read_bands(_table("0.5,1", "1,1")))
    comparison, outcome = _outcome()
    time = np.geomspace(1e-9, 1e-6, 31)
    energy = (time / 1e-8) ** -2.0
    envelope = Envelope(time, energy, energy, ("x",) * 31, energy)
    exact = [dataclasses.replace(b, low=1.0, high=1.0) if b.quantity == "energy per operation" else b
             for b in side_bands(comparison, outcome)]  # fmt: skip
    found = advantage_band(comparison, outcome, envelope, exact)
    best = float(outcome.advantage[0])
    assert found is not None
    assert (found.low, found.high) == (near(best / 4.0, rel=1e-9), near(best * 4.0, rel=1e-9))
    late = Envelope(time, np.where(time < 1.5e-8, np.nan, energy), energy, ("x",) * 31, energy)
    missed = advantage_band(comparison, outcome, late, exact)
    assert missed is not None
    assert missed.low == 0.0


@pytest.mark.parametrize(("times_the_advantage", "turns"), [(0.9, True), (1.1, True), (0.5, False), (2.0, False)])
def test_an_error_that_can_turn_the_answer_is_a_warning(
    times_the_advantage: float, turns: bool, monkeypatch: pytest.MonkeyPatch
):
    monkeypatch.setattr(engine, "bands", lambda: read_bands(_table("1,1", "0.8,1.25")))
    comparison, outcome = _outcome()
    bands = side_bands(comparison, outcome)
    limit = float(outcome.advantage[0]) * times_the_advantage
    comparison.study = dataclasses.replace(comparison.study, required_advantage=limit)
    found = advantage_band(comparison, outcome, _flat(), bands)
    assert found is not None
    assert found.straddles is turns
    texts = band_warnings(comparison.study, bands, found)
    assert len(texts) == turns
    if turns:
        assert texts[0].startswith(
            "the measured error of the closed forms can turn the answer: they leave the advantage"
        )


def _band(**changes: Any) -> SideBand:
    known: dict[str, Any] = {
        "side": "new", "role": "candidate", "quantity": "delay", "low": 0.9, "high": 1.1, "covered": 0.8,
        "points": 3, "over": "here", "missing": ((0.2, "cell nor2 (measured: inverter)"),),
    }  # fmt: skip
    return SideBand(**known | changes)


def test_what_was_not_measured_is_one_warning_for_each_side_and_reason():
    comparison, _ = _outcome()
    whole = _band(quantity="leakage", missing=((1.0, "cell nor2 (measured: inverter)"),))
    crumb = _band(quantity="dynamic energy", missing=((5e-4, "something small"),))
    inside = AdvantageBand(3.0, 4.0, False)
    assert band_warnings(comparison.study, [_band(), whole, crumb], inside) == [
        "new: closed form not measured here for delay (20 %) and leakage: cell nor2 (measured: inverter)"
    ]
    assert band_warnings(comparison.study, [], None) == []
