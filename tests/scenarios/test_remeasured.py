"""Scenario S8 by hand on files: a number is edited in a set, the study is run again, and what changed is asked for.

Every step is a command on files, as a user types it. Hand arithmetic as in ``tests/fixed_displacement.py`` (all
invented): V = 60 pm / d, advantage = 36 aJ / (C V^2) for C = 0.20 fF in two gate capacitances of 0.10 fF; required 1.5.

    d 200 -> 170 pm/V:      2.0000 -> 1.4450, ln -2 ln(200/170) = -0.32504, all of it from d
    and C 0.20 -> 0.18 fF:  1.4450 -> 1.6056, ln(0.20/0.18) = +0.10536; both together -0.21968

The probability of 1.5: 0.735, then 0.439 (mean moved alone 0.468, spread narrowed alone 0.880), then 0.683.
"""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from scipy.special import ndtr

from tests.cli.conftest import Ran, read
from tests.fixed_displacement import fixed_displacement
from tests.near import near

Run = Callable[..., Ran]
SET = Path("nodes") / "technologies" / "film-switch.toml"
COEFFICIENT, CAPACITANCE = "film-switch.actuator_coefficient", "film-switch.input_capacitance"
DRAWS = "2048"
#: what is typed into the set file, in the order of the scenario
COEFFICIENT_AGAIN = [
    ('value = 200.0\nunit = "pm/V"\nspread = { shape = "lognormal", ln_sd = 0.20 }',
     'value = 170.0\nunit = "pm/V"\nspread = { shape = "lognormal", ln_sd = 0.05 }'),
]  # fmt: skip
SUPPLY_AGAIN = [("value = 0.300000000000000\n", "value = 0.352941176470588\n")]
CAPACITANCE_AGAIN = [
    ('value = 0.10\nunit = "fF"\nspread = { shape = "lognormal", ln_sd = 0.20 }',
     'value = 0.09\nunit = "fF"\nspread = { shape = "lognormal", ln_sd = 0.02 }'),
]  # fmt: skip


def edit(pairs: list[tuple[str, str]], *, back: bool = False) -> None:
    """Replace exactly one place of the set file for each pair."""
    text = SET.read_text(encoding="utf-8")
    for old, new in pairs:
        was, becomes = (new, old) if back else (old, new)
        assert text.count(was) == 1, was
        text = text.replace(was, becomes)
    SET.write_text(text, encoding="utf-8")


def run(evenload: Run, out: str, *more: str) -> Ran:
    ran = evenload("run", "study.toml", "--out", out, "--draws", DRAWS, "--quiet", *TIME, *more)
    assert ran.status == 0, ran.err
    return ran


TIME = ("--freeze-time", "2026-01-31T00:00:00Z")


def rows(evenload: Run, old: str, new: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(evenload("changes", old, new, "--format", "csv").out)))


def parts(found: list[dict[str, str]], quantity: str = "advantage", scale: str = "logarithm") -> dict[str, float]:
    return {
        row["name"]: float(row["part"])
        for row in found
        if row["section"] == f"part, {scale}" and row["node"] == quantity
    }


def files(folder: str) -> dict[str, bytes]:
    place = Path(folder)
    return {str(path.relative_to(place)): path.read_bytes() for path in sorted(place.rglob("*")) if path.is_file()}


@pytest.fixture
def first(evenload: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> dict[str, bytes]:
    """The study on files, run once into ``first``."""
    monkeypatch.setattr("benchmark.record.run.closed_form_differences", lambda *_: [])
    fixed_displacement().write(tmp_path)
    run(evenload, "first")
    return files("first")


def test_edit_run_compare_edit_back(evenload: Run, first: dict[str, bytes], tmp_path: Path):
    # -- the coefficient is measured again: the stale supply is named with the number it should have
    edit(COEFFICIENT_AGAIN)
    refused = evenload("run", "study.toml", "--out", "second", "--quiet")
    assert refused.status == 3
    assert "is stale: its formula gives another number; found 0.3 V; allowed: 0.352941 V" in refused.err
    edit(SUPPLY_AGAIN)
    ran = run(evenload, "second", "--since", "first")
    assert "Verdict flipped: conditional go -> not decidable on this evidence; advantage 2 -> 1.445." in ran.out
    assert f"Most of it by {COEFFICIENT} (x 0.7225)." in ran.out

    # -- one input and what follows from it; all of the change is its work
    found = rows(evenload, "first", "second")
    changed = {row["name"]: row for row in found if row["section"] == "input"}
    assert set(changed) == {COEFFICIENT, "film-switch.declared_supply"}
    assert [changed[COEFFICIENT][name] for name in ("old", "new", "factor", "unit", "note")] == [
        "200.0", "170.0", "0.85", "pm/V", "value, range",
    ]  # fmt: skip
    assert parts(found) == {
        COEFFICIENT: near(-2.0 * math.log(200 / 170), rel=0, abs=1e-7),
        "total": near(-0.32504, rel=0, abs=5e-6),
    }
    split = read(tmp_path / "second", "record.json")["change"]["probability"]
    _holds(split, {"old": 0.735, "moved": 0.468, "narrowed": 0.880, "new": 0.439})

    # -- what does not depend on it is the same to the last bit
    identical = {row["name"] for row in found if row["section"] == "identical"}
    results = {row["name"] for row in found if row["section"] == "result"}
    reference = {name for name in identical | results if "stated-reference" in name}
    assert len(reference) >= 10
    assert reference <= identical
    assert _of_reference("first") == _of_reference("second")

    # -- the capacitance too: the parts of both edits beside the first record
    edit(CAPACITANCE_AGAIN)
    run(evenload, "third", "--since", "first")
    found = rows(evenload, "first", "third")
    assert parts(found) == {
        COEFFICIENT: near(-0.32504, rel=0, abs=5e-6),
        CAPACITANCE: near(0.10536, rel=0, abs=5e-6),
        "total": near(-0.21968, rel=0, abs=5e-6),
    }
    assert math.fsum(parts(found).values()) == near(2.0 * parts(found)["total"], rel=0, abs=1e-9)
    # ten stages: 10 x 18 -> 10 x 22.422 aJ; order-averaged +6.568 and -2.146
    joules = parts(found, "candidate energy", "additive")
    assert [joules[name] / 10.0 for name in (COEFFICIENT, CAPACITANCE, "total")] == near(
        [6.568e-18, -2.146e-18, 4.422e-18], rel=0, abs=5e-22
    )
    uncertainty = read(tmp_path / "third", "record.json")["uncertainty"]
    assert abs(uncertainty["reaches"]["value"] - 0.6830) <= 4.0 * uncertainty["reaches"]["error"] + 5e-5
    measure = [_first_to_measure(name) for name in ("first", "second")]
    assert measure == [COEFFICIENT, CAPACITANCE]

    # -- edited back: every file of the record has its bytes again, and nothing changed
    edit([*CAPACITANCE_AGAIN, *SUPPLY_AGAIN, *COEFFICIENT_AGAIN], back=True)
    run(evenload, "again")
    assert files("again") == first
    found = rows(evenload, "first", "again")
    told = {row["section"] for row in found if not row["section"].startswith(("chain, ", "part, "))}
    assert told == {"verdict", "probability", "identical", "resolution"}  # the last says how fine the search is
    assert all(row["old"] == row["new"] for row in found if row["section"].startswith("chain, "))
    assert set(parts(found).values()) == {0.0}


def _holds(split: dict[str, Any], expected: dict[str, float]) -> None:
    """The four states within their sampling error of the normal distribution, and of the printed three digits."""
    wide, narrow = math.sqrt(0.04 + 0.16 + 0.01), math.sqrt(0.04 + 0.01 + 0.01)
    means = math.log(2.0 / 1.5), math.log(1.445 / 1.5)
    exact = {"old": means[0] / wide, "moved": means[1] / wide, "narrowed": means[0] / narrow, "new": means[1] / narrow}
    for name, printed in expected.items():
        assert float(ndtr(exact[name])) == near(printed, rel=0, abs=6e-4)
        assert abs(split[name]["value"] - float(ndtr(exact[name]))) <= 4.0 * split[name]["error"]
        assert split[name]["error"] < 0.01
    total = split["new"]["value"] - split["old"]["value"]
    assert split["part_moved"] + split["part_narrowed"] == near(total, rel=0, abs=1e-12)
    assert split["part_moved"] < 0.0 < split["part_narrowed"]


def _of_reference(folder: str) -> str:
    """Everything the record says of the reference's design points and curve."""
    record = json.loads((Path(folder) / "record.json").read_text(encoding="utf-8"))
    points = [side["point"] for policy in record["policies"] for side in policy["contenders"]]
    curves = [curve for curve in record["curves"] if curve["role"] == "contender"]
    return json.dumps([points, curves])


def _first_to_measure(folder: str) -> str:
    record = json.loads((Path(folder) / "record.json").read_text(encoding="utf-8"))
    return str(min(record["uncertainty"]["shares"], key=lambda row: row["place"])["key"])
