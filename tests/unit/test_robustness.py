"""Robustness: cells against runs of the study with that choice, the declared cell, lists of contenders, counts."""

from __future__ import annotations

import dataclasses
import functools
import itertools
import tempfile
from collections.abc import Iterable
from pathlib import Path

import numpy as np
import pytest

from benchmark.decide.compare import Comparison
from benchmark.decide.robustness import COARSE, Cell, Robustness, contender_lists, robustness
from benchmark.evaluate.batch import Batch
from benchmark.record.load import load_study
from benchmark.record.text import cell_words, robustness_words
from benchmark.sets.study import Study
from tests.near import near
from tests.studies import hub, mixed


@functools.cache
def _loaded(name: str) -> Study:
    with tempfile.TemporaryDirectory() as folder:
        return load_study({"hub": hub, "mixed": mixed}[name]().write(Path(folder)))[0]


@functools.cache
def _found(name: str) -> Robustness:
    found = _loaded(name)
    known = {(found.headline, name): outcome for name, outcome in _outcomes(found).items()}
    return robustness(found, known)


def _outcomes(found: Study):
    comparison = Comparison(found, found.pair(found.headline), Batch.best_estimate())
    return {name: comparison.outcome(name) for name in (found.policy.primary, *found.policy.also)}


def _where(cells: Iterable[Cell], **wanted: object) -> list[Cell]:
    return [cell for cell in cells if all(getattr(cell, name) == value for name, value in wanted.items())]


def test_lists_of_contenders():
    assert contender_lists(["a"]) == {"all": ("a",)}
    assert contender_lists(["a", "b"]) == {"all": ("a", "b"), "without a": ("b",), "without b": ("a",)}
    three = contender_lists(["a", "b", "c"])
    assert three["without b"] == ("a", "c")
    assert three["only b"] == ("b",)
    assert len(three) == 7


def test_the_hub_hangs_on_its_list_of_contenders():
    """0.6072, 0.0168 and 0.0400 fJ; M is 1."""
    found = _found("hub")
    assert [(cell.policy, cell.contenders) for cell in found.cells] == list(
        itertools.product(["minimum-energy", "declared-point"], ["all", "without fast", "without low-leakage"])
    )
    numbers = [0.42, 0.42, 15.18] * 2
    assert [cell.advantage for cell in found.cells] == [near(number, rel=1e-9) for number in numbers]
    assert [cell.level for cell in found.cells] == ["not better", "not better", "reaches"] * 2
    assert [cell.declared for cell in found.cells] == [True] + [False] * 5
    assert (found.reaching, found.better, found.infeasible) == (2, 2, 0)
    assert found.worst is found.cells[0]


def test_the_declared_cell_is_the_answer_and_stands_once():
    found, outcomes = _found("mixed"), _outcomes(_loaded("mixed"))
    (declared,) = _where(found.cells, declared=True)
    assert declared.advantage == float(outcomes["iso-delay"].advantage[0])  # bit for bit
    assert (declared.policy, declared.contenders, declared.pair) == ("iso-delay", "all", "g1")
    assert declared.temperatures == _loaded("mixed").temperatures
    for policy in ("declared-point", "minimum-energy"):
        (cell,) = _where(found.cells, policy=policy, contenders="all", pair="g1", temperatures=declared.temperatures)
        assert cell.advantage == float(outcomes[policy].advantage[0])


def test_every_combination_stands_once_and_diagnostics_do_not():
    study = _loaded("mixed")
    cells = _found("mixed").cells
    keys = [(cell.policy, cell.contenders, cell.pair, cell.temperatures) for cell in cells]
    assert len(set(keys)) == len(keys)
    assert len(keys) == 5 * 3 * 2 * 3  # policies without same-supply, lists, pairs, both temperatures and each alone
    assert {key[2] for key in keys if len(key[3]) == 1} == {pair.label for pair in study.pairs}


@pytest.mark.parametrize("pair", ["g1", "g2"])
@pytest.mark.parametrize("policy", ["iso-delay", "minimum-energy-delay", "iso-energy", "declared-point"])
@pytest.mark.parametrize("position", [0, 1])
def test_a_cell_is_the_study_with_that_choice(pair: str, policy: str, position: int):
    """Run anew: one temperature, and one contender taken away."""
    study = _loaded("mixed")
    kelvin = study.temperatures[position]
    removed, kept = study.contenders
    one = dataclasses.replace(study.pair(pair), reference={kept.id: study.pair(pair).reference[kept.id]})
    alone = dataclasses.replace(study, temperatures=(kelvin,), contenders=(kept,), pairs=(one,))
    advantage = float(Comparison(alone, one, Batch.best_estimate()).outcome(policy).advantage[0])
    cells = _found("mixed").cells
    label = f"without {removed.id}"
    (cell,) = _where(cells, policy=policy, contenders=label, pair=pair, temperatures=(kelvin,))
    if np.isnan(advantage):
        assert cell.level == "infeasible"
        assert cell.why
    else:
        # on a limit the energy moves with the supply, which is searched to COARSE in one and more finely in the other
        assert cell.advantage == near(advantage, rel=20 * COARSE)


def test_the_strongest_reference_is_the_least_over_those_listed():
    cells = _found("mixed").cells
    for key in {(cell.policy, cell.pair, cell.temperatures) for cell in cells}:
        policy, pair, temperatures = key
        found = {c.contenders: c for c in _where(cells, policy=policy, pair=pair, temperatures=temperatures)}
        others = [cell.advantage for name, cell in found.items() if name != "all"]
        known = [advantage for advantage in others if not np.isnan(advantage)]
        if np.isnan(found["all"].advantage):
            assert not known
        else:
            assert found["all"].advantage == min(known)  # bit for bit


def test_counts_and_the_worst_cell():
    found = _found("mixed")
    numbers = [cell.advantage for cell in found.cells if cell.level != "infeasible"]
    assert found.reaching == sum(number >= 2.0 for number in numbers)
    assert found.better == sum(number > 1.0 for number in numbers)
    assert found.infeasible == len(found.cells) - len(numbers)
    assert found.worst is not None
    assert found.worst.advantage == min(numbers)
    for cell in found.cells:
        assert (cell.level == "infeasible") == bool(cell.why)
        assert (cell.level == "infeasible") == np.isnan(cell.advantage)


def test_two_policies_that_ask_the_same_agree():
    """With a required time the least energy within it is what both minimum energy and equal delay look for."""
    cells = _found("mixed").cells
    for cell in _where(cells, policy="iso-delay"):
        (other,) = _where(
            cells, policy="minimum-energy", contenders=cell.contenders, pair=cell.pair, temperatures=cell.temperatures
        )
        assert other.advantage == cell.advantage or (np.isnan(other.advantage) and np.isnan(cell.advantage))


def test_words_of_the_table():
    cells = [
        {"policy": "iso-delay", "contenders": "all", "pair": "n1", "temperatures": [298.15, 358.15], "advantage": 0.5},
        {"policy": "iso-energy", "contenders": "only b", "pair": "n1", "temperatures": [298.15], "advantage": 0.996},
    ]
    row = {"cells": cells, "reaching": 0, "better": 0, "infeasible": 0, "worst": 1}
    record = {"study": {"required_advantage": 2.0}, "robustness": row}
    assert robustness_words(record) == (
        "Robustness: 0 of 2 cells reach 2, 0 are above 1; "
        "worst 0.996 (iso-energy, contenders only b, pair n1, 298.15 K)."
    )
    assert cell_words(cells[0]) == "iso-delay, contenders all, pair n1, all temperatures"
    row |= {"infeasible": 2, "worst": None}
    assert robustness_words(record) == "Robustness: 0 of 2 cells reach 2, 0 are above 1, 2 are infeasible."
