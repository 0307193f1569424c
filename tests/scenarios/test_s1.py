"""Always-on hub: a leakage-free relay against two transistor flavours and a sleep switch, by hand.

Per gate and clock cycle at 100 kHz, depth 20, in fJ, with a = rising transitions per cycle:
fast 0.36 a + 0.600 (1.0 fF, 0.60 V, 100 pA over 10 us); low-leakage 0.49 a + 0.007 (1.0 fF, 0.70 V, 1 pA);
relay 2 a (0.5 fF, 2.0 V). Twenty gates are one operation. All numbers are invented; the arithmetic is exact.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from benchmark.decide.compare import Comparison, Outcome
from benchmark.evaluate.batch import Batch
from benchmark.record.load import load_study
from tests.studies import hub, run

GATES = 20
CYCLES_AWAKE = 1000
#: relative agreement with hand arithmetic
EXACT = 1e-9


def _outcome(folder: Path, **choices: Any) -> Outcome:
    study, _ = load_study(hub(**choices).write(folder))
    return Comparison(study, study.pair("n1"), Batch.best_estimate()).outcome("minimum-energy")


def _femtojoule(outcome: Outcome) -> dict[str, float]:
    """Energy per gate and operation."""
    sides = (outcome.candidate, *outcome.contenders)
    return {side.id: float(side.energy[0]) / GATES * 1e15 for side in sides}


def _advantage(folder: Path, **choices: Any) -> float:
    return float(_outcome(folder, **choices).advantage[0])


def test_energies_and_advantages_at_an_activity_of_two_percent(tmp_path: Path):
    outcome = _outcome(tmp_path)
    energy = _femtojoule(outcome)
    assert energy["fast"] == pytest.approx(0.6072, rel=EXACT)
    assert energy["low-leakage"] == pytest.approx(0.0168, rel=EXACT)
    assert energy["relay"] == pytest.approx(0.0400, rel=EXACT)
    assert outcome.advantage_over(0) == pytest.approx(15.18, rel=EXACT)
    assert outcome.advantage_over(1) == pytest.approx(0.42, rel=EXACT)
    assert outcome.strongest_side is not None
    assert outcome.strongest_side.id == "low-leakage"
    assert float(outcome.advantage[0]) == pytest.approx(0.42, rel=EXACT)


@pytest.mark.parametrize(("activity", "advantage"), [("0.001", 3.745), ("0.0001", 35.245)])
def test_a_leakage_free_switch_gains_as_activity_falls(activity: str, advantage: float, tmp_path: Path):
    assert _advantage(tmp_path, activity=activity) == pytest.approx(advantage, rel=EXACT)


def test_activity_times_advantage_tends_to_the_ratio_of_leakage_to_charge(tmp_path: Path):
    products = [float(a) * _advantage(tmp_path / a, activity=a) for a in ("0.01", "0.001", "0.0001", "0.00001")]
    assert products == sorted(products, reverse=True)
    # 0.007 / 2 + 0.49 a / 2 exactly
    assert products[-1] == pytest.approx(0.0035 + 0.245e-5, rel=EXACT)


@pytest.mark.parametrize(
    ("contender", "break_even"), [("fast", 0.600 / (2.0 - 0.36)), ("low-leakage", 0.007 / (2.0 - 0.49))]
)
def test_the_break_even_activity_separates_the_sides(contender: str, break_even: float, tmp_path: Path):
    assert break_even == pytest.approx({"fast": 0.3659, "low-leakage": 0.004636}[contender], rel=1e-3)
    below, above = (
        _advantage(tmp_path / str(factor), activity=f"{break_even * factor:.17f}", contenders=(contender,))
        for factor in (1.0 - 1e-9, 1.0 + 1e-9)
    )
    assert below > 1.0 > above


def test_cycle_of_the_relay(tmp_path: Path):
    outcome = _outcome(tmp_path)
    # 20 stages of 100 ns and ln 2 x 1 kohm x 0.5 fF each, well below 10 us
    assert float(outcome.candidate.time[0]) == pytest.approx(2e-6 + 20 * 0.6931471805599453 * 0.5e-12, rel=EXACT)


def test_delay_is_worth_nothing_until_the_deadline(tmp_path: Path):
    quick, slow = run(hub(), tmp_path / "quick"), run(hub(relay_delay="400"), tmp_path / "slow")
    assert slow["policies"][0]["candidate"]["point"]["energy"] == quick["policies"][0]["candidate"]["point"]["energy"]
    assert slow["verdict"]["word"] == quick["verdict"]["word"] == "no-go, not better"
    assert slow["verdict"]["advantage"] == quick["verdict"]["advantage"]


def test_a_missed_deadline_is_infeasible_not_worse(tmp_path: Path):
    record = run(hub(relay_delay="600"), tmp_path)  # 12 us in a cycle of 10 us
    candidate = record["policies"][0]["candidate"]
    assert candidate["feasible"] is False
    assert candidate["point"] is None
    assert record["verdict"]["word"] == "no-go, requirement failed"
    assert record["verdict"]["advantage"] is None
    deadline = next(row for row in record["requirements"] if row["name"] == "deadline")
    assert deadline["state"] == "fail"
    assert deadline["margin"] == pytest.approx(10.0 / 12.0, rel=1e-5)


def test_the_verdict_hangs_on_the_list_of_references(tmp_path: Path):
    both, textbook = run(hub(), tmp_path / "both"), run(hub(contenders=("fast",)), tmp_path / "textbook")
    assert both["verdict"]["word"] == "no-go, not better"
    assert textbook["verdict"]["word"] == "go"  # headed a demonstration, for every number is invented
    assert textbook["study"]["demonstration"]
    assert textbook["verdict"]["advantage"] == pytest.approx(15.18, rel=EXACT)
    assert textbook["policies"][0]["strongest"] == "fast"


def _per_second(folder: Path, **choices: Any) -> dict[str, float]:
    """Femtojoule per gate and second: one wake of 1000 cycles (10 ms) and 0.99 s of idle time."""
    outcome = _outcome(folder, activity="0.05", contenders=("low-leakage",), **choices)
    return {name: energy * CYCLES_AWAKE for name, energy in _femtojoule(outcome).items()}


def test_per_second_with_and_without_a_sleep_switch(tmp_path: Path):
    ungated, gated = _per_second(tmp_path / "ungated", idle="ungated"), _per_second(tmp_path / "gated", idle="gated")
    assert ungated["low-leakage"] == pytest.approx(24.5 + 700.0, rel=EXACT)
    assert gated["low-leakage"] == pytest.approx(24.5 + 7.0 + 34.65 + 1.47, rel=EXACT)
    assert ungated["relay"] == pytest.approx(100.0, rel=EXACT)
    assert gated["relay"] == pytest.approx(100.0, rel=EXACT)
    assert ungated["low-leakage"] / ungated["relay"] == pytest.approx(7.245, rel=EXACT)
    assert gated["low-leakage"] / gated["relay"] == pytest.approx(0.6762, rel=EXACT)


def test_gating_pays_after_its_break_even_idle_time(tmp_path: Path):
    pays = 1.47 / (0.7 * 0.95) * 1e-3  # 2.21 ms
    assert pays == pytest.approx(2.21e-3, rel=1e-3)
    for factor, better in ((0.999999, False), (1.000001, True)):
        time = f"{pays * factor:.15f}"
        ungated = _per_second(tmp_path / f"u{factor}", idle="ungated", idle_time=time)["low-leakage"]
        gated = _per_second(tmp_path / f"g{factor}", idle="gated", idle_time=time)["low-leakage"]
        assert (gated < ungated) is better


def test_the_relay_wins_against_the_sleep_switch_only_beyond_its_idle_break_even(tmp_path: Path):
    break_even = (100.0 - 24.5 - 7.0 - 1.47) / 0.035 * 1e-3
    assert break_even == pytest.approx(1.915, rel=1e-3)
    advantages = [
        _advantage(
            tmp_path / str(factor),
            activity="0.05",
            idle="gated",
            idle_time=f"{break_even * factor:.15f}",
            contenders=("low-leakage",),
        )
        for factor in (0.5, 1.0 - 1e-9, 1.0 + 1e-9, 2.0, 10.0)
    ]
    assert advantages == sorted(advantages)  # longer idle always helps the leakage-free side
    assert [advantage > 1.0 for advantage in advantages] == [False, False, True, True, True]


def test_against_a_perfect_sleep_switch_no_idle_time_helps(tmp_path: Path):
    for time in ("1.0", "1000.0", "100000.0"):
        per_second = _per_second(tmp_path / time, idle="gated", idle_time=time, residual="0.0", wake="0.0")
        assert per_second["low-leakage"] == pytest.approx(31.5, rel=EXACT)
        assert per_second["relay"] == pytest.approx(100.0, rel=EXACT)
