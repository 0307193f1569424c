"""A study in SI, and the faults of a study that no single edited line can show."""

from __future__ import annotations

import copy
from pathlib import Path

import pytest

from benchmark.catalogue import QUANTITIES
from benchmark.circuits.library import BUILT_IN
from benchmark.devices import MODEL_NAMES, model
from benchmark.errors import InputRefused
from benchmark.record.check import check_paths
from benchmark.record.load import load_study
from benchmark.sets.study import REQUIREMENTS, Study
from benchmark.sets.study_builder import CircuitDeclaration
from tests.refusals import CIRCUIT, STAGES, files
from tests.studies import Inputs, Table, hub, mixed, side, v


def _load(inputs: Inputs, folder: Path) -> Study:
    return load_study(inputs.write(folder))[0]


def _refused(inputs: Inputs, folder: Path) -> list[str]:
    with pytest.raises(InputRefused) as caught:
        load_study(inputs.write(folder))
    return [str(problem).partition(": ")[2] for problem in caught.value.problems]


def test_a_study_in_si(tmp_path: Path):
    study = _load(mixed(), tmp_path)
    assert study.temperatures == (298.15, 358.15)
    assert study.values["clock_frequency"].si.tolist() == [20e6]
    assert study.candidate.supply == (0.2, 0.8)
    assert study.candidate.overhead["level_shifter_delay"].si.tolist() == [20e-12]
    assert [item.id for item in study.contenders] == ["old-switch", "old-switch at 0.3 V"]
    assert study.contenders[0].sizes == (1.0,)
    assert study.contenders[0].threshold_shifts == (0.0,)
    assert [(pair.label, pair.candidate, dict(pair.reference), pair.wires_node) for pair in study.pairs] == [
        ("g1", "g1", {"old-switch": "g1", "old-switch at 0.3 V": "g1"}, "w1"),
        ("g2", "g2", {"old-switch": "g2", "old-switch at 0.3 V": "g2"}, "w2"),
    ]
    assert study.requirements["power_density"].limit == 50e4
    assert study.requirements["process_temperature"].limit == 673.15
    assert study.requirements["endurance"].life == 10 * 365.25 * 86400
    assert study.requirements["deadline"].limit is None  # the clock period
    assert list(study.requirements) == [name for name in REQUIREMENTS if name in study.requirements]
    assert study.policy.required_time == pytest.approx(20e-9)
    assert study.policy.required_energy == pytest.approx(5e-15)
    assert study.policy.also == (
        "declared-point",
        "minimum-energy",
        "minimum-energy-delay",
        "iso-energy",
        "same-supply",
    )
    assert (study.guard_band_delay, study.guard_band_leakage) == (1.1, 1.5)


def test_everything_wrong_with_a_study_and_its_sets_is_listed_in_one_pass(tmp_path: Path):
    inputs = mixed()
    inputs.study["product"]["class"] = "hub"
    inputs.study["value"]["activity"]["value"] = 2
    inputs.study["policy"]["exponent"] = 0
    inputs.sets["technologies/new-switch"]["value"]["closing_delay"]["unit"] = "V"
    inputs.sets["technologies/old-switch"]["value"]["off_curent"] = v(1, "A/m")
    inputs.sets["wires/wires"]["nodes"] = ["w1"]
    with pytest.raises(InputRefused) as caught:
        load_study(inputs.write(tmp_path))
    places = [(problem.file, problem.name) for problem in caught.value.problems]
    assert places == [
        ("nodes/technologies/new-switch.toml", "value.closing_delay.unit"),
        ("nodes/technologies/old-switch.toml", "value.off_curent"),
        ("nodes/wires/wires.toml", "value.wire_resistance_per_length.by_node"),
        ("study.toml", "product.class"),
        ("study.toml", "value.activity.value"),
        ("study.toml", "policy.exponent"),
    ]


# -- sides, nodes, contenders ----------------------------------------------------------------------------------


def test_a_contender_may_be_left_out_of_a_pair_but_not_when_it_sets_the_required_time(tmp_path: Path):
    inputs = mixed()
    inputs.study["nodes"]["pairs"][1]["reference"] = {"old-switch at 0.3 V": "g2"}
    assert dict(_load(copy.deepcopy(inputs), tmp_path / "a").pairs[1].reference) == {"old-switch at 0.3 V": "g2"}
    inputs.study["policy"]["required_time"] = "contender:old-switch"
    assert _refused(inputs, tmp_path / "b") == [
        "nodes.pairs: leaves out the contender that sets the required time; found 'g2'; allowed: old-switch"
    ]


def test_one_comparison_never_takes_two_nodes_of_one_technology(tmp_path: Path):
    inputs = mixed()
    inputs.study["nodes"]["pairs"][1]["reference"] = {"old-switch": "g1", "old-switch at 0.3 V": "g2"}
    assert _refused(inputs, tmp_path) == [
        "nodes.pairs: compares two nodes of old-switch in pair g2; found g1, g2; allowed: one node of a technology per "
        "pair; give the other node a set of its own"
    ]


def test_a_self_comparison_says_so(tmp_path: Path):
    inputs = mixed()
    inputs.study["contender"].append(side("new-switch", "0.2", "0.8", id="new-switch, self-comparison"))
    assert _load(inputs, tmp_path).contenders[2].technology.id == "new-switch"


def test_a_wires_set_is_no_technology_and_the_other_way_round(tmp_path: Path):
    inputs = mixed()
    inputs.sets["wires"] = inputs.sets.pop("wires/wires")
    inputs.sets["new-switch"] = inputs.sets.pop("technologies/new-switch")
    as_technology, as_wires = copy.deepcopy(inputs), copy.deepcopy(inputs)
    assert _load(inputs, tmp_path / "fine").pairs[0].wires.id == "wires"
    as_technology.study["candidate"]["technology"] = "wires"
    assert "candidate.technology: is a wires set; found 'wires'" in _refused(as_technology, tmp_path / "a")
    as_wires.study["conditions"]["wires"] = "new-switch"
    assert "conditions.wires: is not a wires set; found 'new-switch'" in _refused(as_wires, tmp_path / "b")


def test_policies_that_stand_on_declared_supplies_need_them(tmp_path: Path):
    inputs = mixed()
    inputs.sets["technologies/pressed"] = {
        "schema": 1,
        "id": "pressed",
        "title": "Invented",
        "model": "stress-gated",
        "nodes": ["g1"],
        "reference_temperature": {"value": 25, "unit": "degC"},
        "default": inputs.study["default"],
        "option": {"mechanics": "stated-pressure", "pressure_law": "exponential"},
        "value": {
            "actuator_coefficient": v(300, "pm/V"),
            "pressure_per_coefficient_voltage": v(26667, "Pa/fm"),
            "actuator_loss_tangent": v(0),
            "terminal_capacitance": v(0, "aF"),
            "input_capacitance": v(50, "aF"),
            "footprint": v(20000, "nm^2"),
            "breakdown_field": v(50, "MV/m"),
            "stack_thickness": v(60, "nm"),
            "stack_sound_speed": v(4000, "m/s"),
            "resistance_unstressed": v(1, "Gohm"),
            "resistance_slope": v(2, "decade/GPa"),
        },
    }
    inputs.study["candidate"]["technology"] = "pressed"
    inputs.study["nodes"]["pairs"] = inputs.study["nodes"]["pairs"][:1]
    problems = _refused(inputs, tmp_path)
    assert problems == ["policy: declared-point needs declared_supply in the set pressed"]


# -- invented inputs -------------------------------------------------------------------------------------------


def _decided(data: Table) -> None:
    """Make every value of a file a decision of somebody instead of invented."""
    data["default"] = {**data["default"], "evidence": "choice", "source": "team-choice"}


def test_invented_tables_and_stage_results_count_as_invented(tmp_path: Path):
    inputs = mixed()
    for data in (inputs.study, *inputs.sets.values()):
        _decided(data)
    inputs.study["demonstration"] = False
    assert _load(copy.deepcopy(inputs), tmp_path / "fine").demonstration is False

    def with_rival(name: str, texts: dict[str, str]) -> Inputs:
        spoiled = copy.deepcopy(inputs)
        spoiled.texts |= texts
        spoiled.study["contender"] = [side(name, "0.3", "0.3")]
        for pair in spoiled.study["nodes"]["pairs"]:
            pair["reference"] = "g1"
        spoiled.study["conditions"]["temperatures"]["values"] = [25]
        return spoiled

    choice = 'evidence = "choice"\nsource = "team-choice"\nowner = "team"'
    curves = {f"nodes/{name}": text for name, text in files("table").items()}
    set_name = "nodes/technologies/curves.toml"
    curves[set_name] = curves[set_name].replace('evidence = "invented"\nsource = "invented"', choice)
    assert _refused(with_rival("curves", curves), tmp_path / "table") == [
        "demonstration: must be true: a table of an input set is invented; found nodes/tables/curve.csv"
    ]
    stages = STAGES.replace('evidence = "invented"\nsource = "invented"', choice).replace(
        '[[row]]\nnode = "g1"\nsupply = { value = 0.5, unit = "V" }',
        '[[row]]\nevidence = "invented"\nnode = "g1"\nsupply = { value = 0.5, unit = "V" }',
    )
    assert _refused(with_rival("stages", {"nodes/technologies/stages.toml": stages}), tmp_path / "rows") == [
        "demonstration: must be true: stage results of a set are invented; found stages"
    ]


# -- circuits --------------------------------------------------------------------------------------------------


def _bare(circuit: str, values: Table) -> Inputs:
    """The hub with another circuit, self-timed."""
    inputs = hub()
    inputs.study["workload"] |= {"circuit": circuit, "timing": "self-timed", "leakage_accounting": "operation"}
    inputs.study["value"] = values
    inputs.study["requirements"] = {}
    return inputs


@pytest.mark.parametrize("name", BUILT_IN)
def test_every_built_in_circuit_takes_the_values_it_declares(name: str, tmp_path: Path):
    declaration: CircuitDeclaration = BUILT_IN[name]
    names = [*declaration.required, *(group[0] for group in declaration.one_of)]
    values = {value: v(0 if value == "activity" else 3, QUANTITIES[value].unit) for value in names}
    assert set(_load(_bare(name, values), tmp_path).values) == set(names)
    assert set(declaration.whole) <= set(declaration.required)


def test_an_unknown_circuit_brings_no_follow_on_problems(tmp_path: Path):
    inputs = mixed()
    inputs.study["workload"]["circuit"] = "inverter-chian"
    (problem,) = _refused(inputs, tmp_path)
    assert problem.startswith("workload.circuit: there is no such circuit; found 'inverter-chian'; allowed: ")
    assert problem.endswith("; did you mean 'inverter-chain'?")


def test_counts_that_shape_a_netlist_have_no_spread(tmp_path: Path):
    spread = {"shape": "uniform", "low": 3, "high": 7}
    inputs = _bare("ring", {"stage_count": v(5, "1", spread=spread), "fan_out": v(1)})
    assert _refused(inputs, tmp_path) == [
        "value.stage_count.spread: is not possible: the number shapes the netlist of the circuit"
    ]


@pytest.mark.parametrize(
    ("circuit", "values", "message"),
    [
        (
            "ring",
            {"stage_count": v(4), "fan_out": v(1)},
            "workload.circuit: cannot be made with these values: a ring of inverters needs an odd stage_count, not 4",
        ),
        (
            "register",
            {"fan_out": v(1), "activity": {"value": 0, "spread": {"shape": "uniform", "low": 0, "high": 1}}},
            "value.activity.spread: cannot be made with these values: activity of a register's data cannot exceed 0.5 "
            "rising transitions per cycle",
        ),
    ],
)
def test_a_circuit_that_cannot_be_made_is_refused_at_the_value(
    circuit: str, values: Table, message: str, tmp_path: Path
):
    path = _bare(circuit, values).write(tmp_path)
    with pytest.raises(InputRefused) as caught:
        load_study(path)
    assert [str(problem).partition(": ")[2] for problem in caught.value.problems] == [message]
    assert [str(problem).partition(": ")[2] for problem in check_paths([path]).problems] == [message]


def test_a_circuit_file_is_found_beside_the_study(tmp_path: Path):
    inputs = _bare("word-line", {})
    inputs.texts["word-line.toml"] = CIRCUIT
    study = _load(inputs, tmp_path)
    assert study.circuit_spec is not None
    assert study.circuit_spec.file == "word-line.toml"
    inputs.texts["word-line.toml"] = CIRCUIT.replace("count = 2", "count = -2")
    assert _refused(inputs, tmp_path) == ["net.0.loads: has a negative count; found -2"]


def _adders(own: str, topology: str = "own-best", **texts: str) -> Inputs:
    """A ripple-carry adder for all, and a circuit of the candidate's own."""
    inputs = _bare("ripple-adder", {"word_length": v(4)})
    inputs.study["workload"]["topology"] = topology
    inputs.study["candidate"]["circuit"] = own
    inputs.texts |= {f"{name.replace('_', '-')}.toml": text for name, text in texts.items()}
    return inputs


def _stands_for_the_adder(text: str) -> str:
    function = BUILT_IN["ripple-adder"].function
    return text.replace('operation = "one row access"', f'operation = "one addition"\nfunction = "{function}"')


def test_a_side_may_have_a_circuit_of_its_own_that_does_the_same(tmp_path: Path):
    bare = CIRCUIT.partition("[layer.upper]")[0].replace(', layer = "upper"', "")
    study = _load(_adders("word-line", word_line=_stands_for_the_adder(bare)), tmp_path)
    assert study.candidate.id == "relay"


@pytest.mark.parametrize(
    ("inputs", "message"),
    [
        (
            _adders("ripple-adder", topology="same-netlist"),
            "candidate.circuit: is used with workload.topology = own-best only",
        ),
        (
            _adders("ripple-adder"),
            "workload.topology: is own-best, and no side names a circuit other than the common one",
        ),
        (
            _adders("word-line", word_line=CIRCUIT.partition("[layer.upper]")[0].replace(', layer = "upper"', "")),
            "candidate.circuit: does not say its function, so no other circuit can stand for it",
        ),
        (
            _adders("array-multiplier"),
            "candidate.circuit: has another function than the common circuit; found product of two unsigned words of "
            f"word_length bits; allowed: {BUILT_IN['ripple-adder'].function}",
        ),
        (
            _adders("word-line", word_line=_stands_for_the_adder(CIRCUIT)),
            "candidate.circuit: states wire layers of its own; only the common circuit may; found 'word-line'",
        ),
    ],
)
def test_circuits_that_cannot_stand_against_each_other(inputs: Inputs, message: str, tmp_path: Path):
    assert _refused(inputs, tmp_path) == [message]


def test_every_model_declares_what_the_catalogue_knows():
    for name in MODEL_NAMES:
        declared = model(name)
        options = {option.name for option in declared.options}
        assert declared.name == name
        assert all(option.default in option.allowed for option in declared.options)
        assert all(item.when is None or item.when[0] in options for item in declared.inputs)
