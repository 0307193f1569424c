"""Word-line driver under a memory array: three failures in one run (hand arithmetic, numbers invented).

Line 500 um, 20 ohm/um, 0.2 fF/um. Reference 0.6931 x 2 kohm x 100 fF + 0.377 ns = 515.6 ps; new 15 + 13.9 + 377 ps =
405.9 ps; advantage 1.270 for a ten times better driver. Energy 324 fJ on both sides (the swing is fixed), with level
shifters 329 and 344 fJ. Busiest net 200e6 x 0.5 x 0.2 x 3.15576e8 = 6.31e15 cycles against 1e14 shown; process
550 degC against 400 degC.
"""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from benchmark.record.load import load_study
from benchmark.record.run import run_study
from benchmark.record.text import verdict_text
from tests.near import near

STUDY = Path(__file__).parent.parent / "data" / "word-line" / "study.toml"


@pytest.fixture(scope="module")
def record():
    study, library = load_study(STUDY)
    return run_study(study, library, created="2026-01-12T00:00:00Z")


def test_delays_and_energies(record):
    primary = record["policies"][0]
    candidate, reference = primary["candidate"]["point"], primary["contenders"][0]["point"]
    ln2 = math.log(2.0)
    assert reference["time"] == near(ln2 * 2e3 * 100e-15 + 0.377e-9, rel=1e-12)
    assert candidate["time"] == near(15e-12 + ln2 * 200 * 100e-15 + 0.377e-9, rel=1e-12)
    assert primary["advantage"] == near(1.270, rel=0.0005)
    assert reference["energy"] == near(329e-15, rel=1e-12)
    assert candidate["energy"] == near(344e-15, rel=1e-12)
    assert reference["energy"] / candidate["energy"] == near(0.956, rel=0.0005)
    assert candidate["delay_limit"] == "wire"


def test_all_three_failures_in_one_run(record):
    verdict = record["verdict"]
    assert verdict["word"] == "no-go, requirement failed"
    text = " | ".join(verdict["reasons"])
    assert "endurance" in text
    assert "process_temperature" in text
    assert "below the required 1.5" in text
    assert len(verdict["reasons"]) == 3
    rows = {row["name"]: row for row in record["requirements"]}
    assert rows["deadline"]["state"] == "pass"
    assert rows["endurance"]["state"] == "fail"
    assert rows["endurance"]["demanded"] == near(6.31152e15, rel=1e-9)
    assert 1.0 / rows["endurance"]["margin"] == near(63.1, rel=0.001)
    assert rows["process_temperature"]["offered"] - rows["process_temperature"]["demanded"] == near(150.0, rel=1e-9)


def test_the_naive_supply_ratio_appears_nowhere(record):
    assert "51.84" not in verdict_text(record)
    assert all(policy["advantage"] is None or policy["advantage"] < 2 for policy in record["policies"])
