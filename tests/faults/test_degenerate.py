"""Studies that are accepted and whose numbers are extreme: whole runs without an exception or a warning."""

from __future__ import annotations

from pathlib import Path

import pytest

from benchmark.errors import InputRefused
from benchmark.record.load import load_study
from benchmark.record.run import run_study
from benchmark.record.write import to_json
from tests.faults.seeds import own_circuit_study
from tests.studies import Inputs, hub


def test_an_operation_that_charges_nothing_is_refused(tmp_path: Path):
    inputs = hub()
    inputs.study["value"]["fan_out"]["value"] = 0
    study = load_study(inputs.write(tmp_path))
    with pytest.raises(InputRefused) as refused:
        run_study(*study)
    assert str(refused.value) == (
        "study.toml: value: one operation costs no energy, so nothing can be compared; found relay; "
        "allowed: a load: driven inputs, wires, terminal capacitances; state what the circuit charges"
    )


def _leakage() -> Inputs:
    inputs = hub()
    inputs.study["policy"]["metric"] = "leakage-power"
    return inputs


def _no_wires_but(name: str, value: int) -> Inputs:
    inputs = hub()
    inputs.study["value"][name]["value"] = value
    return inputs


@pytest.mark.parametrize(
    "inputs",
    [
        _leakage(),
        own_circuit_study(),
        _no_wires_but("activity", 1),
        _no_wires_but("logic_depth", 1),
        _no_wires_but("clock_frequency", 1),
    ],
    ids=["a metric of zero", "layers of a circuit file", "activity 1", "one stage", "a slow clock"],
)
def test_a_whole_run_says_nothing_by_accident(inputs: Inputs, tmp_path: Path):
    record = run_study(*load_study(inputs.write(tmp_path)), created="then")
    assert to_json(record)
    assert [check for check in record["self_checks"] if not check["passed"]] == []
