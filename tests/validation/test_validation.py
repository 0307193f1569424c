"""The page in ``reports/validation/`` is current, every comparison holds, and no function loses its check."""

from __future__ import annotations

import csv
import dataclasses
import json
import math
import re
from pathlib import Path

import pytest

from tests.near import near
from tests.validation import from_solvers, reach, simulated
from tests.validation.check import KINDS, Check
from tests.validation.dossier import CHECKS, FUNCTIONS, PAGE, Dossier, checks_text, collect
from tests.validation.page import page

REMAKE = "run .venv/bin/python -m tests.remake_validation"
NUMBERS = ("expected", "obtained", "residual", "allowed")
CHECK = Check("closed form", "g", "x [1]", "own calculation", "derived", 1.0, 1.001, 0.01, "test")


@pytest.fixture(scope="module")
def found() -> Dossier:
    return collect()


def _rows(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(text.splitlines()))


def differences(kept: str, now: str) -> list[str]:
    """Words equal; the obtained number within 1e-5, or a fiftieth of what is allowed (draws, solvers, platforms)."""
    before, after = _rows(kept), _rows(now)
    if len(before) != len(after):
        return [f"{len(before)} and {len(after)} rows"]
    problems = []
    for old, new in zip(before, after, strict=True):
        name = old["check"]
        problems += [f"{name}: {c}" for c in old if c not in NUMBERS and old[c] != new[c]]
        expected, allowed = float(old["expected"]), float(old["allowed"])
        problems += [
            f"{name}: {c}"
            for c in ("expected", "allowed")
            if not math.isclose(float(old[c]), float(new[c]), rel_tol=1e-6)
        ]
        if not abs(float(old["obtained"]) - float(new["obtained"])) <= max(1e-5 * abs(expected), 0.02 * allowed):
            problems.append(f"{name}: obtained {old['obtained']} and {new['obtained']}")
    return problems


def words(text: str) -> str:
    """A page without its numbers, drawings and versions, and with the order of the nearest misses left out."""
    text = re.sub(r"<p><b>Software\.</b>.*?</p>", "", text, flags=re.DOTALL)
    text = re.sub(r'<section id="functions".*?</section>', "", text, flags=re.DOTALL)  # has a test of its own
    text = re.sub(r"<svg.*?</svg>", "", text, flags=re.DOTALL)
    text = re.sub(r'<table id="nearest-table-table">.*?</table>', "", text, flags=re.DOTALL)
    return re.sub(r"[-−+]?\d[\d.,]*(?:e[-−+]?\d+)?", "0", text)


def test_every_comparison_holds(found: Dossier):
    failing = [
        f"{one.group}, {one.name}: {one.obtained:.6g}, expected {one.expected:.6g}, allowed {one.allowed:.2g} "
        f"({one.basis}); source: {one.source}"
        for one in found.checks
        if not one.holds
    ]
    assert failing == []


def test_comparisons_have_names_of_their_own(found: Dossier):
    names = [(one.kind, one.group, one.name, one.source, one.note) for one in found.checks]
    assert len(set(names)) == len(names)
    explained = {one.name for one in found.checks}
    unknown = [one.isolates for one in found.checks if one.isolates and one.isolates not in explained]
    assert set(unknown) <= {"capacitance"}  # of the set as a whole
    assert {one.kind for one in found.checks} <= set(KINDS)


def test_no_function_lost_its_outside_check(found: Dossier):
    kept = {row["function"]: row["reached"] == "yes" for row in _rows(FUNCTIONS.read_text(encoding="utf-8"))}
    new = sorted(set(found.functions) - set(kept))
    assert [name for name in found.unreached if kept.get(name, False)] == []
    assert [name for name in new if not found.functions[name]] == [], (
        f"no outside check reaches these; write one, or {REMAKE}"
    )


def test_tables_are_current(found: Dossier):
    assert differences(CHECKS.read_text(encoding="utf-8"), checks_text(found)) == [], REMAKE


def test_page_is_current(found: Dossier):
    assert words(PAGE.read_text(encoding="utf-8")) == words(page(found)), REMAKE


def test_page_asks_for_nothing_and_runs_nothing():
    text = PAGE.read_text(encoding="utf-8")
    assert "<script" not in text
    assert not re.search(r"""(?:src|href)=["'](?!#|checks\.csv|functions\.csv)""", text)


def test_a_failing_comparison_and_an_unreached_function_are_shown():
    failing = dataclasses.replace(CHECK, obtained=2.0, name="far off [1]")
    text = page(Dossier((CHECK, failing), {"physics.roots:falling_root": False}))
    assert "1 comparison outside what is allowed." in text
    assert text.count("far off [1]") >= 2
    assert "physics.roots:falling_root" in text


def test_a_changed_number_is_noticed():
    kept = checks_text(Dossier((CHECK,), {}))
    assert differences(kept, kept) == []
    moved = checks_text(Dossier((dataclasses.replace(CHECK, obtained=1.0013),), {}))
    assert differences(kept, moved) == ["x [1]: obtained 1.001 and 1.0013"]
    assert differences(kept, checks_text(Dossier((CHECK, CHECK), {}))) == ["1 and 2 rows"]


def test_what_is_no_check_is_refused():
    for change in ({"kind": "hearsay"}, {"source": ""}, {"expected": math.nan}):
        with pytest.raises(ValueError, match=r"kind|a check needs"):
            dataclasses.replace(CHECK, **change)
    assert not dataclasses.replace(CHECK, obtained=math.nan).holds


def test_public_functions_are_found_and_reach_is_measured():
    from benchmark.physics import limits

    functions = reach.public_functions()
    assert {"physics.limits:landauer_energy", "decide.steps:combinations"} <= set(functions)
    # words, and a model that is no function
    assert not {"decide.need_words:need_text", "devices.given:MODEL", "circuits.cells:cell"} & set(functions)
    plain, before = limits.landauer_energy(300.0), limits.heisenberg_time.__code__
    with reach.recorded(functions) as reached:
        assert limits.landauer_energy(temperature=300.0) == plain
    assert reached == {"physics.limits:landauer_energy"}
    assert limits.heisenberg_time.__code__ is before


def test_a_simulation_that_is_not_stored_is_named(monkeypatch: pytest.MonkeyPatch):
    from tests.open_cards import freepdk45

    monkeypatch.setattr(simulated, "stored", dict)
    with simulated.answered(), pytest.raises(KeyError, match=r"has no measured_chain of .*--simulate"):
        freepdk45.measured_chain(1.0)
    assert freepdk45.measured_chain is simulated.FUNCTIONS["measured_chain"]


@pytest.mark.spice
@pytest.mark.parametrize("number", [1, 6, 9])
def test_same_equations_are_met_again(number: int):
    case = from_solvers.CASES[number]
    now = from_solvers.simulate(case)
    for name, value in from_solvers.stored()[from_solvers.name_of(case)].items():
        assert now[name] == near(value, rel=1e-3), name


@pytest.mark.spice
@pytest.mark.parametrize("name", sorted(simulated.FUNCTIONS))
def test_stored_simulations_are_met_again(name: str):
    """First, middle and last line of each kind."""
    keys = [text for function, text in simulated.stored() if function == name]
    for text in {keys[0], keys[len(keys) // 2], keys[-1]}:
        now = simulated.numbers(simulated.FUNCTIONS[name](**json.loads(text)))
        for part, values in simulated.stored()[name, text].items():
            assert now[part] == near(values, rel=1e-3), (text, part)


def test_the_files_name_no_place_of_a_machine():
    for path in (CHECKS, FUNCTIONS, PAGE, simulated.PATH, from_solvers.PATH):
        assert not re.search(r"/(?:work|tmp|root|home)\b", Path(path).read_text(encoding="utf-8"))
