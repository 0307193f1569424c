"""Circuits of a study: what own-best allows, what it needs, what it refuses; the same-netlist variant."""

from __future__ import annotations

import dataclasses
from pathlib import Path

import pytest

from benchmark.decide.compare import Comparison
from benchmark.errors import InputRefused
from benchmark.evaluate.batch import Batch
from benchmark.record.load import load_study
from tests.comparisons import given, side, study
from tests.studies import Inputs, v

VALUES = {"word_length": v(4), "group_bits": v(2), "bit_pitch": v(1, "um")}
CIRCUIT = {
    "schema": 1,
    "id": "own-adder",
    "title": "Own adder",
    "operation": "one addition",
    "function": "sum of two words of word_length bits and a carry, with carry out",
    "net": [
        {
            "name": "all",
            "driver": "aoi21",
            "loads": [{"cell": "aoi21", "input": "a", "count": 2}],
            "rising_per_operation": 0.25,
            "count": 8,
            "on_critical_path": 3,
        }
    ],
}


def _inputs(candidate: str = "complex-gate-adder", contender: str = "sklansky-adder", **more) -> Inputs:
    made = study(
        side("new", 0.5, 0.5, **({"circuit": candidate} if candidate else {})),
        [side("old", 0.5, 0.5, **({"circuit": contender} if contender else {}))],
        [given("new", series_switches_max=None), given("old", on_resistance=10.0)],
        circuit=more.pop("circuit", "ripple-adder"),
    )
    made.study["value"] = {name: VALUES[name] for name in more.pop("values", tuple(VALUES))}
    made.study["workload"]["topology"] = more.pop("topology", "own-best")
    if more.pop("file", False):
        made.sets["circuits/own-adder"] = CIRCUIT | more
    return made


def _problems(inputs: Inputs, folder: Path) -> str:
    with pytest.raises(InputRefused) as caught:
        load_study(inputs.write(folder))
    return "\n".join(str(problem) for problem in caught.value.problems)


def test_each_side_has_its_own_circuit_and_the_variant_has_one(tmp_path):
    made, _ = load_study(_inputs().write(tmp_path))
    assert [made.circuit_of(one)[0] for one in made.sides] == ["complex-gate-adder", "sklansky-adder"]
    common = made.same_netlist
    assert [common.circuit_of(one)[0] for one in common.sides] == ["ripple-adder"] * 2
    own, same = (Comparison(which, which.pair(which.headline), Batch.best_estimate()) for which in (made, common))
    assert own.candidate.problem.circuit.name == "complex-gate-adder"
    assert own.contenders["old"].problem.circuit.name == "sklansky-adder"
    assert same.candidate.problem.circuit.name == same.contenders["old"].problem.circuit.name == "ripple-adder"
    assert own.candidate.problem.stack_depth == 4


def test_a_side_without_a_circuit_uses_the_common_one(tmp_path):
    made, _ = load_study(_inputs(contender="", values=("word_length", "group_bits")).write(tmp_path))
    assert made.circuit_of(made.contenders[0])[0] == "ripple-adder"


def test_own_circuits_on_all_sides_alike_are_the_same_netlist(tmp_path):
    """The same circuit named by each side gives to the last bit what it gives as the common circuit."""
    named, _ = load_study(
        _inputs("complex-gate-adder", "complex-gate-adder", values=("word_length", "group_bits")).write(tmp_path)
    )
    common = dataclasses.replace(named, topology="same-netlist", circuit="complex-gate-adder")
    results = [
        Comparison(which, which.pair(which.headline), Batch.best_estimate()).outcome("declared-point").advantage[0]
        for which in (named, common)
    ]
    assert results[0] == results[1]


def test_a_circuit_file_of_the_same_function_may_stand_in(tmp_path):
    made, _ = load_study(_inputs("own-adder", file=True, values=("word_length", "bit_pitch")).write(tmp_path))
    name, spec = made.circuit_of(made.candidate)
    assert name == "own-adder"
    assert spec is not None
    assert [which.id for which in made.circuit_specs] == ["own-adder"]


INVENTED = {"evidence": "invented", "source": "invented"}
LAYER = {
    "far": {
        "resistance_per_length": v(1, "ohm/um", **INVENTED),
        "capacitance_per_length": v(1, "fF/um", **INVENTED),
    }
}


@pytest.mark.parametrize(
    ("inputs", "words"),
    [
        ({"topology": "same-netlist"}, "own-best only"),
        ({"candidate": "", "contender": "", "values": ("word_length",)}, "no side names a circuit"),
        ({"candidate": "ripple-adder", "contender": "", "values": ("word_length",)}, "no side names a circuit"),
        ({"candidate": "array-multiplier", "contender": "", "values": ("word_length",)}, "another function"),
        ({"candidate": "inverter-chain", "contender": "", "values": ("word_length",)}, "does not say its function"),
        ({"candidate": "complex-gate-ader"}, "did you mean"),
        ({"values": ("word_length", "bit_pitch")}, "group_bits"),
        ({"values": ("word_length", "group_bits")}, "bit_pitch"),
        ({"candidate": "own-adder", "file": True, "values": ("word_length", "bit_pitch"), "function": ""}, "function"),
        (
            {
                "candidate": "own-adder",
                "file": True,
                "values": ("word_length", "bit_pitch"),
                "layer": LAYER,
                "net": [CIRCUIT["net"][0] | {"wire": {"length": 1, "length_unit": "um", "layer": "far"}}],
            },
            "only the common circuit may",
        ),
    ],
)
def test_what_cannot_stand_against_each_other_is_refused(inputs, words, tmp_path):
    assert words in _problems(_inputs(**inputs), tmp_path)


def test_a_value_that_no_circuit_reads_is_refused_and_groups_that_do_not_fit_are_said(tmp_path):
    made = _inputs(contender="", values=("word_length", "group_bits"))
    made.study["value"]["bit_pitch"] = v(1, "um")
    assert "value.bit_pitch" in _problems(made, tmp_path / "idle")
    made = _inputs(contender="", values=("word_length", "group_bits"))
    made.study["value"]["group_bits"] = v(5)
    found = _problems(made, tmp_path / "wide")
    assert "candidate.circuit" in found
    assert "at most 4" in found
