"""Spelling, order, names and repetition change no number (properties 1, 2, 7, 8, 9 and 10 of a correct engine)."""

from __future__ import annotations

import copy
import itertools
import json
import random
from collections.abc import Callable
from decimal import Decimal
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from benchmark.errors import InputRefused
from benchmark.record.load import load_study
from benchmark.record.rerun import recreate
from benchmark.record.run import run_study
from benchmark.record.write import summary, to_json
from tests.fixed_displacement import fixed_displacement
from tests.profiles import examples
from tests.studies import Inputs, Table, hub, mixed, run, toml

D = Decimal
#: unit -> other spellings with the exact factor the number takes
SPELLINGS: dict[str, tuple[tuple[str, Decimal], ...]] = {
    "1": (("percent", D(100)), ("dimensionless", D(1))),
    "V": (("mV", D(1000)), ("kV", D("0.001")), ("volt", D(1))),
    "mV": (("V", D("0.001")), ("uV", D(1000))),
    "kohm": (("ohm", D(1000)), ("kΩ", D(1)), ("V/mA", D(1))),
    "Mohm": (("Tohm", D("1e-6")), ("ohm", D("1e6"))),
    "fF": (("aF", D(1000)), ("F", D("1e-15")), ("fC/V", D(1))),
    "aF": (("fF", D("0.001")), ("F", D("1e-18"))),
    "pA": (("fA", D(1000)), ("A", D("1e-12"))),
    "ns": (("ps", D(1000)), ("s", D("1e-9"))),
    "ps": (("ns", D("0.001")), ("fs", D(1000))),
    "s": (("ms", D(1000)), ("us", D("1e6"))),
    "year": (("day", D("365.25")), ("s", D("31557600"))),
    "um": (("m", D("1e-6")), ("nm", D(1000)), ("µm", D(1)), ("μm", D(1))),
    "nm": (("um", D("0.001")), ("pm", D(1000))),
    "um^2": (("nm^2", D("1e6")), ("m^2", D("1e-12")), ("um**2", D(1))),
    "fJ": (("aJ", D(1000)), ("J", D("1e-15")), ("fF V^2", D(1))),
    "nW": (("W", D("1e-9")), ("pW", D(1000))),
    "MHz": (("kHz", D(1000)), ("1/us", D(1))),
    "kHz": (("Hz", D(1000)), ("MHz", D("0.001"))),
    "W/cm^2": (("W/m^2", D(10000)), ("mW/mm^2", D(10))),
    "mV/decade": (("V/dec", D("0.001")), ("uV/decade", D(1000))),
    "uA/um": (("A/m", D(1)), ("mA/um", D("0.001"))),
    "nA/um": (("pA/um", D(1000)), ("A/m", D("0.001"))),
    "fF/um": (("pF/mm", D(1)), ("aF/nm", D(1))),
    "ohm/um": (("kohm/mm", D(1)), ("ohm/nm", D("0.001"))),
    "degC": (("K", D(1)), ("celsius", D(1))),
}
ZERO_CELSIUS = D("273.15")


def _bytes(record: dict[str, Any]) -> str:
    return to_json(summary(record))


@pytest.fixture(scope="module")
def baseline(tmp_path_factory: pytest.TempPathFactory) -> str:
    return _bytes(run(mixed(), tmp_path_factory.mktemp("baseline")))


# -- 1: units -------------------------------------------------------------------------------------------------


def _respell(data: Any, choose: Callable[[str], tuple[str, Decimal]]) -> Any:
    """Write every number with a unit in another spelling; spreads in absolute terms follow their value."""
    if isinstance(data, list):
        return [_respell(item, choose) for item in data]
    if not isinstance(data, dict):
        return data
    if not isinstance(data.get("unit"), str):
        return {key: _respell(item, choose) for key, item in data.items()}
    unit, factor = choose(data["unit"])
    shift = ZERO_CELSIUS if (data["unit"], unit) == ("degC", "K") else D(0)

    def number(value: Any, offset: Decimal = shift) -> Any:
        if isinstance(value, dict):
            return {key: number(item) for key, item in value.items()}
        if isinstance(value, list):
            return [number(item) for item in value]
        return value * factor + offset if isinstance(value, (int, Decimal)) else value

    written = {**data, "unit": unit}
    for key in ("value", "by_node", "low", "high", "values"):
        if key in data:
            written[key] = number(data[key])
    if "spread" in data:
        spread = dict(data["spread"])
        written["spread"] = {
            key: number(item, D(0)) if key == "sd" else number(item) if key in ("low", "high") else item
            for key, item in spread.items()
        }
    return written


def _with(inputs: Inputs, change: Callable[[Table], Table]) -> Inputs:
    return Inputs(change(inputs.study), {name: change(data) for name, data in inputs.sets.items()}, inputs.texts)


def _units_in(data: Any) -> set[str]:
    if isinstance(data, dict):
        own = {data["unit"]} if isinstance(data.get("unit"), str) else set()
        return own.union(*(_units_in(item) for item in data.values()))
    return set().union(*(_units_in(item) for item in data)) if isinstance(data, list) else set()


@pytest.mark.parametrize("position", [0, 1, 2, 3])
def test_respelled_units_leave_the_summary_byte_identical(position: int, baseline: str, tmp_path: Path):
    inputs = mixed()
    used = _units_in(inputs.study).union(*(_units_in(data) for data in inputs.sets.values()))
    assert used <= set(SPELLINGS)  # so that every number with a unit is respelled below
    counter = itertools.count(position)

    def choose(unit: str) -> tuple[str, Decimal]:
        others = SPELLINGS[unit]
        return others[position % len(others)] if position < 3 else others[next(counter) % len(others)]

    respelled = _with(inputs, lambda data: _respell(data, choose))
    assert toml(respelled.study) != toml(inputs.study)
    assert _bytes(run(respelled, tmp_path)) == baseline


def test_a_unit_of_another_size_is_noticed(baseline: str, tmp_path: Path):
    """The comparison above can fail: the same digits with another unit change the summary."""
    inputs = mixed()
    inputs.sets["technologies/new-switch"]["value"]["terminal_capacitance"]["unit"] = "aF"
    assert _bytes(run(inputs, tmp_path)) != baseline


# -- 2: order -------------------------------------------------------------------------------------------------


def _shuffled(data: Any, mixer: random.Random) -> Any:
    """Shuffle keys, and lists of tables, nodes, temperatures and policies; nothing in them has an order that counts."""
    if isinstance(data, dict):
        items = [(key, _shuffled(item, mixer)) for key, item in data.items()]
        mixer.shuffle(items)
        return dict(items)
    if isinstance(data, list):
        items = [_shuffled(item, mixer) for item in data]
        mixer.shuffle(items)
        return items
    return data


@settings(max_examples=examples(4), suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(seed=st.integers(0, 2**32))
def test_order_of_keys_nodes_contenders_and_pairs_does_not_matter(
    seed: int, baseline: str, tmp_path_factory: pytest.TempPathFactory
):
    mixer = random.Random(seed)
    record = run(_with(mixed(), lambda data: _shuffled(data, mixer)), tmp_path_factory.mktemp("order"))
    assert _bytes(record) == baseline


# -- 7: what carries no number ---------------------------------------------------------------------------------


def _words_changed(data: Any) -> Any:
    """Other titles, notes, conditions, places, owners and dates of declaration; numbers and choices stay."""
    if isinstance(data, dict):
        words = {"title", "note", "conditions", "where", "owner", "describe", "operation"}
        return {
            key: f"{item} (said in other words)" if key in words and isinstance(item, str) else _words_changed(item)
            for key, item in data.items()
        }
    return [_words_changed(item) for item in data] if isinstance(data, list) else data


def test_comments_notes_titles_and_conditions_change_no_number(baseline: str, tmp_path: Path):
    inputs = _with(mixed(), _words_changed)
    inputs.study |= {"note": "a note", "title": "another title"}
    commented = {name: f"# {name}\n\n{text}\n\n# the end\n" for name, text in inputs.files().items()}
    assert _bytes(run(Inputs({}, {}, commented), tmp_path)) == baseline


@pytest.mark.parametrize(
    ("name", "value", "message"),
    [
        ("technologies/new-switch", "actuator_coefficient", "is not used by the model given"),
        ("technologies/old-switch", "on_resistance", "is not used by the model steep-swing"),
        ("wires/wires", "on_resistance", "is not used by wires sets"),
        ("study", "word_length", "is not used by this circuit, timing, idle mode and requirements"),
        ("study", "idle_time", "is not used by this circuit, timing, idle mode and requirements"),
    ],
)
def test_a_value_nothing_uses_is_refused(name: str, value: str, message: str, tmp_path: Path):
    inputs = mixed()
    data = inputs.study if name == "study" else inputs.sets[name]
    data["value"][value] = {"value": D("300.0"), "unit": "pm/V"}
    with pytest.raises(InputRefused) as caught:
        load_study(inputs.write(tmp_path))
    assert [problem.what for problem in caught.value.problems] == [message]
    assert [problem.name for problem in caught.value.problems] == [f"value.{value}"]


# -- 8: repetition ---------------------------------------------------------------------------------------------


def test_same_inputs_give_the_same_record_byte_for_byte(tmp_path: Path):
    first, second = (run(mixed(), tmp_path / name, whole=True) for name in ("first", "second"))
    assert to_json(first) == to_json(second)


# -- 9: out and in again ---------------------------------------------------------------------------------------


def _without_time(record: dict[str, Any]) -> str:
    """Everything but when the record, and its criteria with it, were made."""
    kept = {key: item for key, item in record.items() if key != "created"}
    return to_json(kept | {"criteria": {**record["criteria"], "fixed": ""}})


def _again(record: dict[str, Any], folder: Path) -> dict[str, Any]:
    folder.mkdir()
    study, overrides = recreate(json.loads(to_json(record)), folder)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("benchmark.record.run.closed_form_differences", lambda *_: [])  # as in tests.studies.run
        return run_study(*load_study(study, (), overrides), created="another time")


def drawn() -> Inputs:
    """A study that asks for draws itself."""
    inputs = fixed_displacement()
    inputs.study["uncertainty"] = {"draws": 16, "seed": 3}
    return inputs


@pytest.mark.parametrize("make", [mixed, hub, drawn])
def test_a_record_runs_again_from_its_own_files_with_every_number(make: Callable[[], Inputs], tmp_path: Path):
    record = run(make(), tmp_path / "first")
    again = _again(record, tmp_path / "again")
    assert _without_time(again) == _without_time(record)
    assert again["created"] != record["created"]


def test_a_record_brings_its_own_sources_and_what_if_numbers(tmp_path: Path):
    inputs = mixed()
    inputs.texts["nodes/sources.toml"] = (
        'schema = 1\n[film-batch-12]\nkind = "measurement"\nauthors = ["A \\"team\\"", "Ω"]\nyear = 2026\n'
        'title = "Batch 12\\t\\u007f"\nread = "original"\n'
    )
    inputs.sets["technologies/new-switch"]["value"]["terminal_capacitance"]["source"] = "film-batch-12"
    overrides = {"activity": "0.08", "old-switch.off_current": "0.2"}
    study, library = load_study(inputs.write(tmp_path / "first"), (), overrides)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("benchmark.record.run.closed_form_differences", lambda *_: [])
        record = run_study(study, library, created="now")
    plain = run(inputs, tmp_path / "plain")
    assert record["verdict"]["advantage"] != plain["verdict"]["advantage"]
    record["what_if"] = overrides
    again = _again(record, tmp_path / "again")
    again["what_if"] = overrides
    assert _without_time(again) == _without_time(record)


# -- 10: names -------------------------------------------------------------------------------------------------

RENAMED = {
    "new-switch": "Kandidat.2",
    "old-switch": "zz-reference",
    "old-switch at 0.3 V": "fixed supply",
    "wires": "aa-lines",
    "g1": "label-b",
    "g2": "label-a",
    "w1": "metal-z",
    "w2": "metal-a",
    "mixed": "renamed",
}


def _renamed(data: Any) -> Any:
    if isinstance(data, dict):
        return {
            RENAMED.get(key, key) if key != "wires" else key: item
            if key in ("model", "unit", "kind", "option")
            else _renamed(item)
            for key, item in data.items()
        }
    if isinstance(data, list):
        return [_renamed(item) for item in data]
    return RENAMED.get(data, data) if isinstance(data, str) else data


def _numbers(data: Any) -> Any:
    """Every number, by place, without names."""
    if isinstance(data, dict):
        return {key: _numbers(item) for key, item in data.items()}
    if isinstance(data, list):
        return [_numbers(item) for item in data]
    return "text" if isinstance(data, str) else data


def test_renaming_sets_nodes_and_contenders_changes_labels_only(baseline: str, tmp_path: Path):
    inputs = mixed()
    sets = {f"technologies/{RENAMED['new-switch']}": _renamed(inputs.sets["technologies/new-switch"])}
    sets[f"technologies/{RENAMED['old-switch']}"] = _renamed(inputs.sets["technologies/old-switch"])
    lines = copy.deepcopy(inputs.sets["wires/wires"])
    lines = _renamed(lines) | {"id": RENAMED["wires"], "kind": "wires"}
    sets[f"wires/{RENAMED['wires']}"] = lines
    study = _renamed(inputs.study)
    study["conditions"]["wires"] = RENAMED["wires"]
    changed = summary(run(Inputs(study, sets), tmp_path))
    before = json.loads(baseline)
    assert changed["study"] == "renamed"
    assert changed["strongest_contender"] == RENAMED[before["strongest_contender"]]
    assert _numbers(changed) == _numbers(before)
    words = " ".join(changed["conditions"] + changed["measure_next"])
    assert not any(old in words for old in ("new-switch", "old-switch", "wires."))
    assert RENAMED["new-switch"] in words
