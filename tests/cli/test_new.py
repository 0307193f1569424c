"""``evenload new``: templates that pass the check as written, and never overwrite."""

from __future__ import annotations

import contextlib
import tomllib
from pathlib import Path

import pytest

from benchmark.catalogue import QUANTITIES
from benchmark.cli.study_template import CONTENDERS
from benchmark.cli.template_numbers import SPREADS, STUDY_NUMBERS, TECHNOLOGY_NUMBERS
from benchmark.curves.description import ColumnTable, CurvesFile, GivenTable, RepeatTable
from benchmark.curves.meanings import MEANINGS
from benchmark.devices import MODEL_NAMES, model
from tests.cli.conftest import Run


@pytest.mark.parametrize("name", MODEL_NAMES)
def test_a_new_technology_of_every_model_passes_the_check_as_written(name: str, tmp_path: Path, evenload: Run):
    ran = evenload("new", "technology", "my-switch.toml", "--model", name)
    assert (ran.status, ran.err) == (0, "")
    assert ran.out.startswith("Written: my-switch.toml\n")
    assert ran.out.endswith("Next:    evenload check my-switch.toml\n")
    checked = evenload("check", "my-switch.toml")
    assert checked.status == 0
    data = tomllib.loads((tmp_path / "my-switch.toml").read_text(encoding="utf-8"))
    assert (data["id"], data["model"]) == ("my-switch", name)
    assert data["default"]["evidence"] == data["default"]["source"] == "invented"
    assert all("evidence" not in table for table in data["value"].values())  # every number invented


@pytest.mark.parametrize("name", MODEL_NAMES)
def test_a_template_says_what_every_slot_means(name: str, tmp_path: Path, evenload: Run):
    evenload("new", "technology", "my-switch.toml", "--model", name)
    text = (tmp_path / "my-switch.toml").read_text(encoding="utf-8")
    words = " ".join(text.replace("#", " ").split())
    for item in model(name).inputs:
        if item.name != "reference_temperature":
            assert f"[value.{item.name}]" in text
            assert f"{QUANTITIES[item.name].meaning[1:]} ({QUANTITIES[item.name].symbol})" in words
    for option in model(name).options:
        assert f'{option.name} = "{option.default}"' in text
        assert " | ".join(option.allowed) in words
    assert max(len(line) for line in text.splitlines()) <= 120


def test_a_table_model_brings_its_curve_and_the_description_of_it(tmp_path: Path, evenload: Run):
    ran = evenload("new", "technology", "my-switch.toml", "--model", "table")
    written = ["my-switch.toml", "tables/my-switch-current.csv", "tables/my-switch-current.toml"]
    assert sorted(str(path.relative_to(tmp_path)) for path in tmp_path.rglob("*.*")) == written
    assert all(f"Written: {name}\n" in ran.out for name in written)
    (tmp_path / "my-switch.toml").unlink()
    again = evenload("new", "technology", "my-switch.toml", "--model", "table")
    assert again.status == 2
    assert again.err == "evenload: tables/my-switch-current.csv exists; nothing was written\n"
    assert not (tmp_path / "my-switch.toml").exists()


def test_a_new_circuit_passes_the_check_and_runs(tmp_path: Path, evenload: Run):
    from benchmark.decide.compare import Comparison
    from benchmark.evaluate.batch import Batch
    from benchmark.record.load import load_study
    from tests.studies import hub

    assert evenload("new", "circuit", "my-line.toml").status == 0
    assert evenload("check", "my-line.toml").status == 0
    inputs = hub()
    inputs.study["workload"]["circuit"] = "my-line"
    del inputs.study["value"]["activity"], inputs.study["value"]["logic_depth"], inputs.study["value"]["fan_out"]
    study, _ = load_study(inputs.write(tmp_path))
    outcome = Comparison(study, study.pair("n1"), Batch.best_estimate()).outcome("minimum-energy")
    assert outcome.candidate.found[0]


def test_a_new_study_passes_the_check_as_written(tmp_path: Path, evenload: Run):
    assert evenload("new", "study", "my-study.toml").status == 0
    ran = evenload("check", "my-study.toml")
    assert (ran.status, ran.out) == (0, "1 file(s) fine\n")
    data = tomllib.loads((tmp_path / "my-study.toml").read_text(encoding="utf-8"))
    assert data["demonstration"] is True
    assert data["default"]["evidence"] == "invented"
    assert [side["technology"] for side in data["contender"]] == list(CONTENDERS)


def test_a_new_study_runs(tmp_path: Path, evenload: Run):
    """The primary policy finds a point for both sides at every node pair."""
    from benchmark.decide.compare import Comparison
    from benchmark.evaluate.batch import Batch
    from benchmark.record.load import load_study

    evenload("new", "study", "my-study.toml")
    study, _ = load_study(tmp_path / "my-study.toml")
    for pair in study.pairs:
        outcome = Comparison(study, pair, Batch.best_estimate()).outcome(study.policy.primary)
        assert outcome.advantage[0] > 0.0, pair.label


def test_a_new_description_of_a_raw_file_passes_the_check_as_written(tmp_path: Path, evenload: Run):
    ran = evenload("new", "curves", "my-wafer.toml")
    then = "Next:    evenload check my-wafer.toml, evenload extract my-wafer.toml\n"
    assert ran.out == f"Written: my-wafer.toml\nWritten: my-wafer.csv\n{then}"
    checked = evenload("check", "my-wafer.toml")
    assert (checked.status, checked.out, checked.err) == (0, "1 file(s) fine\n", "")
    data = tomllib.loads((tmp_path / "my-wafer.toml").read_text(encoding="utf-8"))
    assert data["evidence"] == data["source"] == "invented"
    assert "nvented" in (tmp_path / "my-wafer.csv").read_text(encoding="utf-8").splitlines()[0]
    assert "70.0" in evenload("extract", "my-wafer.toml").out  # the swing of the invented curves
    (tmp_path / "my-wafer.toml").unlink()
    again = evenload("new", "curves", "my-wafer.toml")
    assert (again.status, again.err) == (2, "evenload: my-wafer.csv exists; nothing was written\n")


def test_a_description_of_a_raw_file_names_every_key_there_is(tmp_path: Path, evenload: Run):
    """Keys that the template does not use stand in comments that become keys when the sign is taken off."""
    evenload("new", "curves", "my-wafer.toml")
    text = (tmp_path / "my-wafer.toml").read_text(encoding="utf-8")
    commented = [line.removeprefix("# ") for line in text.splitlines() if line.startswith("# ")]
    keys = {line.partition(" = ")[0] for line in text.splitlines() if " = " in line and not line.startswith("#")}
    for line in commented:
        with contextlib.suppress(tomllib.TOMLDecodeError):
            keys |= set(tomllib.loads(line))
    models = (CurvesFile, ColumnTable, RepeatTable, GivenTable)
    known = {info.alias or key for item in models for key, info in item.model_fields.items()}
    tables = {"fixed", "repeat", "given", "column", "extract"}
    assert known - keys - tables == set()
    assert all(name in text for name in MEANINGS)
    assert max(len(line) for line in text.splitlines()) <= 120


# -- refusals --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (
            ["technolgy", "a.toml"],
            "there is no template 'technolgy'; known are study, technology, circuit, curves; "
            "did you mean 'technology'?",
        ),
        (
            ["curves", "a.toml", "--model", "given"],
            "--model belongs to a new technology; a description of curves has none",
        ),
        (["zzz", "a.toml"], "there is no template 'zzz'; known are study, technology, circuit, curves"),
        (["study", "a.tml"], "a.tml: the name of a new file ends in .toml"),
        (["study", "a"], "a: the name of a new file ends in .toml"),
        (["study", ".toml"], ".toml: the name of a new file ends in .toml"),
        (["study", "none/a.toml"], "none: there is no such folder"),
        (
            ["study", "a b.toml"],
            "a b.toml: the name is also the id, so only letters, digits, '.', '-' and '_' are allowed",
        ),
        (
            ["study", "Größe.toml"],
            "Größe.toml: the name is also the id, so only letters, digits, '.', '-' and '_' are allowed",
        ),
        (
            ["technology", "sources.toml"],
            "sources.toml: the name 'sources' has a meaning of its own; choose another one",
        ),
        (["circuit", "ring.toml"], "ring.toml: the name 'ring' has a meaning of its own; choose another one"),
        (
            ["technology", "a.toml", "--model", "givn"],
            f"there is no model 'givn'; known are {', '.join(MODEL_NAMES)}; did you mean 'given'?",
        ),
    ],
)
def test_what_cannot_be_written(arguments: list[str], message: str, tmp_path: Path, evenload: Run):
    ran = evenload("new", *arguments)
    assert (ran.status, ran.out, ran.err) == (2, "", f"evenload: {message}\n")
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("kind", ["study", "technology", "circuit", "curves"])
def test_nothing_is_overwritten(kind: str, tmp_path: Path, evenload: Run):
    (tmp_path / "a.toml").write_text("mine")
    (tmp_path / "dangling.toml").symlink_to("nowhere")
    for name in ("a.toml", "dangling.toml"):
        ran = evenload("new", kind, name)
        assert (ran.status, ran.err) == (2, f"evenload: {name} exists; nothing was written\n")
    assert (tmp_path / "a.toml").read_text() == "mine"
    assert not (tmp_path / "nowhere").exists()


def test_a_disk_that_is_full_leaves_nothing(tmp_path: Path, evenload: Run, monkeypatch: pytest.MonkeyPatch):
    opened = Path.open

    def full(path: Path, mode: str = "r", *arguments: object, **options: object) -> object:
        if path.suffix == ".csv":
            raise OSError(28, "No space left on device", str(path))
        return opened(path, mode, *arguments, **options)  # type: ignore[call-overload]

    monkeypatch.setattr(Path, "open", full)
    ran = evenload("new", "technology", "a.toml", "--model", "table")
    assert ran.status == 2
    assert ran.err == "evenload: tables/a-current.csv: cannot be written (No space left on device)\n"
    assert list(tmp_path.iterdir()) == []


# -- the numbers behind the templates --------------------------------------------------------------------------


def test_every_invented_number_belongs_to_something():
    assert set(TECHNOLOGY_NUMBERS) == set(MODEL_NAMES)
    for name, numbers in TECHNOLOGY_NUMBERS.items():
        assert set(numbers) <= {item.name for item in model(name).inputs}, name
    assert set(STUDY_NUMBERS) | set(SPREADS) <= set(QUANTITIES)
