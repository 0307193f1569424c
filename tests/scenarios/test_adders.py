"""Eight-bit addition, each side in its own circuit, against hand arithmetic (numbers invented).

Relay, 20 ns per gate whatever its stack: ripple 3 + 2 x 7 + 3 = 20 gates, 400 ns; two groups of four bits 40 ns. Pins
of the complex gates: sums 2 x (20 + 36 + 52 + 68), carries 3 x 34, 9 readers of 2: 472 switches of 0.1 fF at a01 = 1/4
and 0.5 V: 118 x 0.1 fF x 0.25 V^2 = 2.95 fJ. Ripple: the probabilities of one full adder, written out below.
"""

from __future__ import annotations

import itertools
import math
from pathlib import Path

import pytest

from benchmark.record.load import load_study
from benchmark.record.run import run_study
from tests.near import near

#: switches behind the ripple path: n1, n2, n4; n5 and carry of seven bits; n5, n6 and sum of the last
RIPPLE_PINS = (6 + 2 + 4) + 7 * (6 + 4) + (6 + 2 + 2)
STUDY = Path(__file__).parent.parent / "data" / "adders" / "study.toml"


@pytest.fixture(scope="module")
def record():
    study, library = load_study(STUDY)
    return run_study(study, library, created="2026-01-12T00:00:00Z")


def _ripple_pins() -> float:
    """Sum over all nets of a01 x driven switches for eight bits; the carry into each is high half of the time."""
    driven = {"a": 4, "b": 4, "c": 4, "n1": 6, "n2": 2, "n3": 2, "n4": 4, "n5": 6, "n6": 2, "n7": 2, "sum": 2}
    high = dict.fromkeys(driven, 0)
    for a, b, c in itertools.product((0, 1), repeat=3):
        n1 = 1 - a * b
        n2, n3 = 1 - a * n1, 1 - b * n1
        n4 = 1 - n2 * n3
        n5 = 1 - n4 * c
        n6, n7 = 1 - n4 * n5, 1 - c * n5
        values = {"n1": n1, "n2": n2, "n3": n3, "n4": n4, "n5": n5, "n6": n6, "n7": n7, "sum": 1 - n6 * n7}
        for net, value in (values | {"a": a, "b": b, "c": c}).items():
            high[net] += value
    one_bit = sum(pins * high[net] / 8 * (1 - high[net] / 8) for net, pins in driven.items())
    return 8 * one_bit + 2 * 0.25  # the last carry drives one inverter


def test_relay_in_its_own_circuit_and_in_the_common_one(record):
    own, common = record["policies"]
    assert own["policy"] == "declared-point"
    assert common["policy"] == "declared-point, same netlist"
    assert (common["topology"], common["circuit"], common["diagnostic"]) == ("same-netlist", "ripple-adder", True)
    # stack of 5 into the carry of the first four bits (2 switches in each of 4 sums and a carry), of 6 into a reader
    charging = math.log(2.0) * 1e3 * 0.1e-15 * (5 * 10 + 6 * 2)
    assert own["candidate"]["point"]["time"] == near(40e-9 + charging, rel=1e-9)
    charging = 1.5 * math.log(2.0) * 1e3 * 0.1e-15 * RIPPLE_PINS
    assert common["candidate"]["point"]["time"] == near(400e-9 + charging, rel=1e-9)
    assert own["candidate"]["point"]["energy"] == near(2.95e-15, rel=1e-9)
    assert common["candidate"]["point"]["energy"] == near(_ripple_pins() * 0.1e-15 * 0.25, rel=1e-9)


def test_transistor_in_the_common_circuit(record):
    """RC only: a NAND2 falls through 2R and rises through R, mean 1.5 R."""
    time = record["policies"][1]["contenders"][0]["point"]["time"]
    assert time == near(1.5 * math.log(2.0) * 1e6 * 0.05e-15 * RIPPLE_PINS, rel=1e-9)
    own = record["policies"][0]["contenders"][0]["point"]["time"]
    assert own < 0.5 * time


def test_the_verdict_rests_on_the_own_circuits_and_says_so(record):
    verdict = record["verdict"]
    assert verdict["advantage"] == record["policies"][0]["advantage"]
    assert verdict["advantage"] > 4.0 * record["policies"][1]["advantage"]
    assert [side["circuit"] for side in record["sides"]] == ["complex-gate-adder", "sklansky-adder"]
    assert any(text.startswith("complex-gate-adder: 2 groups") for text in record["circuit_assumptions"])
    assert any(text.startswith("sklansky-adder: Prefix graph") for text in record["circuit_assumptions"])
    topology = next(row["text"] for row in record["conventions"] if row["name"] == "topology")
    assert "hand-adder-relay: complex-gate-adder" in topology
    assert "ripple-adder on every side" in topology
    assert all(check["passed"] for check in record["self_checks"])


def test_the_record_without_absolute_values_still_says_the_topologies(record):
    from benchmark.record.ratio_only import ratio_only

    kept = ratio_only(record)
    assert kept["policies"][1]["topology"] == "same-netlist"
    assert kept["policies"][1]["circuit"] == "ripple-adder"
    assert [side["circuit"] for side in kept["sides"]] == ["complex-gate-adder", "sklansky-adder"]
