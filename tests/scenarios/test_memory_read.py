"""Read path of a small memory and a repeated line as whole studies, against hand arithmetic (numbers invented).

Memory, 256 x 64 cells of 0.5 x 0.25 um, 20 ohm/um, 0.2 fF/um. Word line 32 um: 6.4 fF of wire and 6.4 fF of cells,
640 ohm; bit line 64 um: 12.8 fF and 25.6 fF, 1280 ohm, 0.1 V at 20 uA. Transistor 20 kohm, 0.2 fF per inverter input,
driver of 20 copies. The relay has hysteresis: no sense amplifier, so no number.
"""

from __future__ import annotations

import dataclasses
import math
from pathlib import Path

import numpy as np
import pytest

from benchmark.cli.trace_point import trace_point
from benchmark.decide.compare import Comparison
from benchmark.evaluate.batch import Batch
from benchmark.record.load import load_study
from benchmark.record.run import run_study
from tests.near import near

DATA = Path(__file__).parent.parent / "data"
LN2 = math.log(2.0)


def _run(name):
    study, library = load_study(DATA / name / "study.toml")
    return study, run_study(study, library, created="2026-01-12T00:00:00Z")


@pytest.fixture(scope="module")
def memory():
    return _run("memory")


@pytest.fixture(scope="module")
def line():
    return _run("repeated-line")


def _read(resistance: float, inverter: float, transit: float) -> float:
    """Word-line buffer and line, bit line, output inverter; the sense amplifier is left out."""
    buffer = transit + LN2 * resistance * 20 * inverter
    word_line = transit + LN2 * resistance / 20 * 12.8e-15 + 0.377 * 640 * 12.8e-15
    c_line, c_end = 38.4e-15, inverter
    bit_line = 0.1 * (c_line + c_end) / 20e-6 + 1280 * c_line * (c_line / 6 + c_end / 2) / (c_line + c_end)
    return buffer + word_line + bit_line + transit + LN2 * resistance * 4 * inverter


def test_read_path_but_for_the_sense_amplifier(memory):
    study, record = memory
    comparison = Comparison(study, study.pair("hand"), Batch.best_estimate())
    runs = {"hand-memory-new": comparison.candidate, **comparison.contenders}
    primary = record["policies"][0]
    sides = {side["id"]: side for side in (primary["candidate"], *primary["contenders"])}
    for name, numbers in {
        "hand-memory-transistor": (20e3, 0.2e-15, 0.0),
        "hand-memory-new": (40e3, 0.1e-15, 20e-12),
    }.items():
        problem = runs[name].problem
        lines = trace_point(problem, 0.5, 1.0, 0.0)
        assert sum("agrees" in text for text in lines) == 3
        assert not any("DISAGREES" in text for text in lines)
        sense = next(float(text.split("=")[-1].split()[0]) for text in lines if text.startswith("  t_4 ="))
        assert sides[name]["point"]["time"] - sense == near(_read(*numbers), rel=1e-6)
        assert 1e-12 < sense < 50e-12


def test_read_energy(memory):
    """Word line at 0.7 V, 64 bit lines by 0.1 V from 0.7 V; 32 of 64 outputs rise every second read."""
    _, record = memory
    transistor = record["policies"][0]["contenders"][0]["point"]
    inverter = 0.2e-15
    expected = 0.25 * 20 * inverter + 0.49 * 12.8e-15 + 64 * 0.07 * (38.4e-15 + inverter)
    expected += 64 * 0.25 * 2 * inverter + 16 * 0.25 * 4 * inverter
    leakage = transistor["energy_parts"]["leakage"]
    assert transistor["energy"] - leakage == near(expected, rel=1e-9)


def test_a_switch_with_hysteresis_is_not_evaluated(memory):
    _, record = memory
    relay = record["policies"][0]["contenders"][1]
    assert relay["point"] is None
    assert "not evaluated: the switch has hysteresis" in relay["why"]
    curve = next(row for row in record["curves"] if row["side"] == "hand-memory-relay")
    assert all(point["time"] is None and not point["feasible"] for point in curve["points"])


def test_every_technology_has_its_own_repeaters(line):
    """10 mm: r c L^2 = 20e6 x 0.2e-9 x 1e-4 = 400 ns. Slow: 200 ps, so k = sqrt(0.377 x 400/0.2001) = 27.5."""
    study, record = line
    primary = record["policies"][0]
    slow, quick = primary["candidate"]["point"], primary["contenders"][0]["point"]
    rc, length = 20e6 * 0.2e-9, 10e-3
    per_length = 2 * math.sqrt(0.377 * rc * (200e-12 + LN2 * 1e3 * 0.1e-15)) + 2 * LN2 * math.sqrt(1e3 * 0.1e-15 * rc)
    assert slow["time"] == near(per_length * length, rel=2e-3)
    assert slow["time_parts"]["transit"] == near(27 * 200e-12, rel=1e-12)
    bare = 2 * (math.sqrt(0.377 * LN2) + LN2) * math.sqrt(1e4 * 0.1e-15 * rc)
    assert quick["time"] == near(bare * length, rel=2e-3)
    pieces = round(length * math.sqrt(0.377 * rc / (LN2 * 1e4 * 0.1e-15)))
    assert quick["energy_parts"]["device"] == near(0.1 * 0.25 * pieces * 32 * 0.1e-15, rel=1e-9)
    comparison = Comparison(study, study.pair("hand"), Batch.best_estimate())
    for run in (comparison.candidate, *comparison.contenders.values()):
        assert sum("agrees" in text for text in trace_point(run.problem, 0.5, 1.0, 0.0)) == 3


def test_one_design_serves_all_temperatures(line):
    """Repeaters are made for the highest temperature: adding a lower one changes no count."""
    study, _ = line
    both = dataclasses.replace(study, temperatures=(273.15, 298.15))
    points = {}
    for name, which in (("one", study), ("both", both)):
        run = Comparison(which, which.pair("hand"), Batch.best_estimate()).candidate
        points[name] = run.problem.circuit_at(run.problem.declared_supply[:, 0, :], 1.0, 0.0).nets[0]
        assert np.shape(points[name].count) == (1, 1, 1)
    assert points["one"].count.item() == points["both"].count.item() == 27.0


def test_the_conventions_are_printed(memory, line):
    assert any("Sense amplifier" in text for text in memory[1]["circuit_assumptions"])
    assert any("fastest line of each technology" in text for text in line[1]["circuit_assumptions"])
    for _, record in (memory, line):
        assert all(check["passed"] for check in record["self_checks"])
        assert record["closed_form"]
        assert all(row["net"] not in ("bit line", "sense amplifier") for row in record["closed_form"])
