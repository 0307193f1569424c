"""Delay rule transient: agrees with the chain rule where that is good, and scales paths and edges."""

from __future__ import annotations

import numpy as np
import pytest

from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Load, Net, Wires
from benchmark.circuits.operation import estimate
from benchmark.circuits.rules import rule_by_name
from tests.near import near
from tests.soft_window import soft_pair


def chain_of(name: str, fan_out: float = 2.0) -> Circuit:
    gate = cell(name)
    net = Net("stage", gate, loads=(Load(gate, "a", fan_out),), rising_per_operation=1.0, on_critical_path=1.0)
    return Circuit("chain", "chain", "one stage", (net,))


@pytest.fixture(scope="module")
def pair():
    return soft_pair(6.0, 0.2, 0.8, switching_level=np.asarray(0.769))


def delay(circuit: Circuit, pair, rule: str) -> float:
    metrics = estimate(circuit, pair, Wires(0.0, 0.0), rule, short_circuit=False)
    return float(metrics.path_delay.ravel()[0])


def test_inverters_agree_with_the_chain_rule(pair):
    circuit = chain_of("inverter")
    assert delay(circuit, pair, "chain") == near(delay(circuit, pair, "transient"), rel=0.08)


def test_twice_the_load_is_twice_the_delay(pair):
    assert delay(chain_of("inverter", 4.0), pair, "transient") == near(
        2.0 * delay(chain_of("inverter", 2.0), pair, "transient"), rel=2e-3
    )


def test_unknown_rule_names_all():
    with pytest.raises(Exception, match="chain, step, integral, transient"):
        rule_by_name("trancient")


def test_points_that_cannot_be_solved_are_nan():
    from benchmark.circuits.rules import EdgeInputs
    from benchmark.circuits.transient_rule import transient

    pair = soft_pair(6.0, 0.2, 0.8, switching_level=np.asarray(0.769))
    nothing = np.array([np.nan])
    found = transient(EdgeInputs(pair.down, pair.up, nothing, nothing, nothing, np.array([0.0])))
    assert np.isnan(found.factor).all()
