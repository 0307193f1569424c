"""Every number and word that is accepted matters: changing it changes a result, and changing a neutral thing none.

Results are what a run works out (``tests.faults.results.RESULTS``), not what a record repeats from the files. Neutral
are title, note, where, conditions, owner, describe, operation, source, dates, ``unusual``, comments, blanks, order of
keys and tables, and other spellings of the same number or unit. What does not bind is listed with its reason.
"""

from __future__ import annotations

import random
import re
from collections.abc import Callable, Iterator
from decimal import Decimal
from pathlib import Path

import pytest

from benchmark.errors import InputRefused
from tests.faults.guard import KEY, Folder, mutants
from tests.faults.mutate import NUMBER
from tests.faults.results import differences, found_by
from tests.faults.seeds import Seed, own_circuit_study
from tests.studies import Inputs, hub, mixed

#: what may be changed a little without a change of any result, and why; no other number may
SLACK = {
    "id": "the name of the study is a label",
    "schema": "another number is another file format and refused",
    "reference_temperature.value": "no value of a switch stated directly depends on temperature",
    "value.switching_level.value": "the delay rule step takes the resistance alone",
    "search.supply_points": "supplies that are given leave nothing to search",
    "search.refine_relative": "supplies that are given leave nothing to search; else a finer step may find the same",
    "candidate.gating.residual_leakage.value": "the switch does not leak",
    "policy.required_energy.value": "both sides reach their fastest point with less",
}
#: the same by pattern, for words and ranges spoiled at random
LABELS = {
    r"net\.\d+\.name": "the name of a net is a label",
    r".*\.evidence": "what a value is worth carries nothing where the value has no effect",
    r"value\.\w+\.spread\..*": "a range of no width, or of a contender that is not the strongest",
}
#: besides these, in the study whose inputs are not moved over their ranges
RANGES = re.compile(r"\.spread\.|^valid\.temperature\.")


def _changed(text: str, match: re.Match[str], share: Decimal) -> str:
    """The text with one number a little larger or smaller; whole numbers by one."""
    number = Decimal(match[0])
    if not number:
        new = "0.001" if share > 1 else "-0.001"
    elif re.fullmatch(r"[+-]?\d+", match[0]):
        new = str(int(number) + (1 if share > 1 else -1))
    else:
        new = str(number * share)
    return text[: match.start()] + new + text[match.end() :]


def _unmoved(inputs: Inputs, folder: Path, *, moved: bool, some: int = 0) -> tuple[set[str], int]:
    """Names of numbers that change no result, whether they grow or shrink, and how many were tried."""
    study = inputs.write(folder)
    before = found_by(study, moved=moved)
    places = [(name, match) for name, text in inputs.files().items() for match in NUMBER.finditer(text)]
    if some:
        places = random.Random(f"{KEY}/numbers").sample(places, some)
    still: set[str] = set()
    for name, match in places:
        text, same = inputs.files()[name], True
        for share in (Decimal("1.04"), Decimal("0.96")):
            new = _changed(text, match, share)
            (folder / name).write_text(new, encoding="utf-8")
            try:
                same = found_by(study, moved=moved) == before
            except InputRefused:
                continue
            if not same:
                break
        if same:
            still |= differences(text, new)
        (folder / name).write_text(text, encoding="utf-8")
    return still, len(places)


@pytest.mark.parametrize("idle", ["none", "gated"])
def test_every_number_matters(idle: str, tmp_path: Path):
    still, tried = _unmoved(hub(idle=idle), tmp_path, moved=True)
    assert tried >= 55
    assert still - set(SLACK) == set()
    assert len(still) <= 6


def test_numbers_of_a_study_with_wires_and_a_search_matter(tmp_path: Path):
    inputs = mixed()
    inputs.study["search"] = {"supply_points": 7, "refine_relative": Decimal("1e-3")}
    still, tried = _unmoved(inputs, tmp_path, moved=False, some=10)
    assert tried == 10
    assert {name for name in still - set(SLACK) if not RANGES.search(name)} == set()


def test_a_number_that_does_not_matter_here_matters_where_it_binds(tmp_path: Path):
    """The list above hides nothing: the required energy of the mixed study, once it is scarce."""
    found = []
    for number in ("0.4", "0.2"):
        inputs = mixed()
        inputs.study["search"] = {"supply_points": 7, "refine_relative": Decimal("1e-3")}
        inputs.study["policy"]["required_energy"]["value"] = Decimal(number)
        found.append(found_by(inputs.write(tmp_path), moved=False))
    assert found[0] != found[1]


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("low = 0.02, high = 0.1 }", "low = 0.01, high = 0.1 }"),
        ("low = 0.15, high = 0.25 }", "low = 0.1, high = 0.25 }"),
        ("percent = 8 }", "percent = 12 }"),
    ],
)
def test_ranges_matter(old: str, new: str, tmp_path: Path):
    inputs = mixed()
    inputs.study["search"] = {"supply_points": 5, "refine_relative": Decimal("1e-2")}
    inputs.study["policy"] = {"primary": "minimum-energy"}
    study = inputs.write(tmp_path)
    before = found_by(study)
    ((name, text),) = [(name, text) for name, text in inputs.files().items() if old in text]
    (tmp_path / name).write_text(text.replace(old, new), encoding="utf-8")
    assert found_by(study) != before


# -- neutral ---------------------------------------------------------------------------------------------------


def _reordered(text: str) -> str:
    blocks = re.split(r"(?m)^(?=\[value\.)", text)
    return text if len(blocks) < 4 else "".join([blocks[0], *reversed(blocks[1:-1]), blocks[-1]])


NEUTRAL_CHANGES: dict[str, Callable[[str], str]] = {
    "title": lambda text: re.sub(r'(?m)^title = "[^"]*"', 'title = "Ein anderer Titel µ"', text),
    "note": lambda text: (
        re.sub(r"(?m)^(id = .*)$", r'\1\nnote = "new"', text, count=1) if "kind =" not in text else text
    ),
    "where": lambda text: text.replace('where = "-"', 'where = "page 7"'),
    "conditions": lambda text: text.replace('conditions = "-"', 'conditions = "25 degC"'),
    "owner": lambda text: text.replace("example team (fictional)", "another team (fictional)"),
    "describe": lambda text: text.replace('describe = "invented"', 'describe = "something else"'),
    "operation": lambda text: text.replace('operation = "one clock cycle"', 'operation = "a cycle"'),
    "declared": lambda text: text.replace("declared = 2026-01-12", "declared = 2025-12-31"),
    "comments": lambda text: "# a comment\n" + text.replace("\n[", "\n\n# another # one\n\n["),
    "blanks": lambda text: text.replace(" = ", "   =\t").replace("\n", "   \n"),
    "line ends": lambda text: text.replace("\n", "\r\n"),
    "order of tables": _reordered,
    "zeros": lambda text: re.sub(r"(?m)^value = (\d+\.\d+)$", r"value = \g<1>000", text),
    "powers of ten": lambda text: re.sub(r"(?m)^value = (\d+\.\d+)$", r"value = \g<1>e0", text),
    "units": lambda text: re.sub(
        r'(?m)^value = (\d+\.\d+)\nunit = "ns"$', lambda m: f'value = {Decimal(m[1]) * 1000}\nunit = "ps"', text
    ),
    "spelling of units": lambda text: (
        text.replace('"um^2"', '"µm²"').replace('"kohm"', '"kΩ"').replace('"kHz"', '"1/ms"')
    ),
    "unusual": lambda text: re.sub(r"(?m)^(value = [\d.]+)$", r"\1\nunusual = true", text),
    "date": lambda text: re.sub(r"(?m)^(value = [\d.]+)$", r"\1\ndate = 2025-06-01", text),
}


@pytest.mark.parametrize("kind", NEUTRAL_CHANGES)
def test_what_is_neutral_leaves_every_result_as_it_is(kind: str, tmp_path: Path):
    study = hub().write(tmp_path)
    before, changed = found_by(study), 0
    for name, text in hub().files().items():
        new = NEUTRAL_CHANGES[kind](text)
        changed += new != text
        (tmp_path / name).write_text(new, encoding="utf-8", newline="")
    assert changed
    title = "Ein anderer Titel µ"
    after = found_by(study)
    assert after.replace(title, "") == before or after == before


# -- at random -------------------------------------------------------------------------------------------------


def _accepted(name: str, seed: Seed, folder: Path, count: int) -> Iterator[tuple[str, str, str, Path]]:
    """Mutants that the check accepts: name, text before, text after, study."""
    files = Folder(folder, seed)
    for mutant in mutants(name, seed, count):
        with files.spoiled(mutant) as path:
            try:
                text = mutant.raw.decode()
                found = found_by(path)
            except (InputRefused, UnicodeDecodeError):
                continue
            yield f"{mutant.name} ({mutant.how}): {found}", seed.files[mutant.file], text, path


@pytest.mark.parametrize(
    ("name", "inputs"), [("hub moves", hub(idle="gated")), ("own circuit moves", own_circuit_study())]
)
def test_an_accepted_mutant_moves_a_result_or_is_neutral(name: str, inputs: Inputs, tmp_path: Path):
    files = inputs.files()
    seed = Seed(files, tuple(files), 1.0)
    before = found_by(inputs.write(tmp_path / "base"))
    moved = neutral = 0
    wrong: list[str] = []
    for said, old, new, _ in _accepted(name, seed, tmp_path / "mutants", 500):
        who, _, after = said.partition("): ")
        matters = differences(old, new)
        if not matters:
            neutral += 1
            if after != before:
                wrong.append(f"{who}) is neutral and moves a result")
        elif after != before:
            moved += 1
        elif {name for name in matters - set(SLACK) if not re.fullmatch("|".join(LABELS), name)}:
            wrong.append(f"{who}) moves nothing: {sorted(matters)}")
    assert wrong == []
    assert moved >= 8
    assert neutral >= 5
