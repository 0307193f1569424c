"""Stress-gated switch, coefficient halved (hand arithmetic, step rule; every number invented).

p = b d V with b = 2.667e19 Pa/m; R = 1e9 ohm x 10^(-2 p/GPa); stack 60 nm at 4000 m/s: 15 ps; C = 0.1 fF; depth 20,
activity 0.05, self-timed; field limit 0.40 V; reference 36 aJ per full cycle at the same time; M = 2.
E_leak/E_dyn = N t/(a R_0 C), the whole supply across the open switch.
"""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from benchmark.record.load import load_study
from benchmark.record.run import run_study
from tests.near import near

STUDY = Path(__file__).parent.parent / "data" / "stress-hand" / "study.toml"


def run(coefficient: float, supply: float, policy: int = 0):
    what_if = {
        "hand-stress-gated.actuator_coefficient": repr(coefficient),
        "hand-stress-gated.declared_supply": repr(supply),
    }
    study, library = load_study(STUDY, overrides=what_if)
    record = run_study(study, library, created="2026-01-12T00:00:00Z")
    return record, record["policies"][policy]["candidate"]["point"]


@pytest.mark.parametrize(
    (
        "coefficient",
        "supply",
        "stage_ps",
        "transit_share",
        "cycle_aj",
        "leak_over_dynamic",
        "dynamic_advantage",
        "limit",
    ),
    [
        (300.0, 0.25, 21.93, 0.684, 6.25, 0.0877, 5.76, "transit"),
        (150.0, 0.25, 708.1, 0.021, 6.25, 2.833, 5.76, "device RC"),
        (150.0, 0.40, 58.73, 0.255, 16.0, 0.235, 2.25, "device RC"),
    ],
)
def test_table_row(coefficient, supply, stage_ps, transit_share, cycle_aj, leak_over_dynamic, dynamic_advantage, limit):
    _, point = run(coefficient, supply)
    assert point["time"] / 20 == near(stage_ps * 1e-12, rel=2.5e-4)
    assert point["delay_shares"]["transit"] == near(transit_share, rel=0, abs=6e-4)
    per_cycle = point["energy_parts"]["device"] / (20 * 0.05)
    assert per_cycle == near(cycle_aj * 1e-18, rel=1e-9)
    assert point["energy_parts"]["leakage"] / point["energy_parts"]["device"] == near(leak_over_dynamic, rel=1e-3)
    assert 36e-18 / per_cycle == near(dynamic_advantage, rel=1e-9)
    assert point["delay_limit"] == limit


def test_beyond_the_field_limit_both_reasons_are_listed():
    record, point = run(150.0, 0.50)
    assert point is None
    assert record["verdict"]["word"] == "no-go, requirement failed"
    text = " | ".join(record["verdict"]["reasons"])
    assert "device_limits failed (margin 0.8" in text
    assert "below the required 2" in text


def test_the_limit_changes_at_274_9():
    assert run(275.0, 0.25)[1]["delay_limit"] == "transit"
    assert run(274.8, 0.25)[1]["delay_limit"] == "device RC"


def test_reoptimised_for_the_old_delay_the_supply_doubles_and_the_field_limit_forbids_it():
    _, before = run(300.0, 0.25, policy=1)
    assert before["supply"] == near(0.25, rel=1e-5)
    record, after = run(150.0, 0.25, policy=1)
    assert after is None
    assert "fastest permitted point 1.17" in record["policies"][1]["candidate"]["why"]


def test_elasticity_of_delay_to_the_coefficient():
    steps = (1e-4, -1e-4)
    for coefficient, expected in ((300.0, -2.911), (150.0, -4.508)):
        up, down = (run(coefficient * (1 + step), 0.25)[1]["time"] for step in steps)
        assert (math.log(up) - math.log(down)) / (2e-4) == near(expected, rel=5e-4)
    # transit-limited: at a very large coefficient the delay stops moving
    fast = run(2000.0, 0.25)[1]["time"] / run(2000.0 * 1.01, 0.25)[1]["time"]
    assert fast == near(1.0, rel=1e-6)


def test_twice_the_coefficient_buys_at_most_1_462():
    base, fast = run(300.0, 0.25)[1]["time"], run(600.0, 0.25)[1]["time"]
    assert base / fast == near(1.462, rel=1e-3)
    assert base / fast < 21.931472 / 15.0
