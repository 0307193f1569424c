"""Superseded numbers: kept, checked, shown, and any past state gives the digits of then (all values invented)."""

from __future__ import annotations

import datetime
import json
from decimal import Decimal as D
from pathlib import Path
from typing import Any

import pytest

from benchmark import api
from benchmark.errors import InputRefused
from benchmark.record.load import load_study, load_technology
from benchmark.record.rerun import recreate
from tests.fixed_displacement import fixed_displacement
from tests.near import near
from tests.studies import Inputs, Table

OLD, NEW = datetime.date(2026, 1, 10), datetime.date(2026, 2, 10)
BETWEEN, LATER = datetime.date(2026, 1, 31), datetime.date(2026, 3, 1)


def entry(value: str, supply: bool = False, **more: Any) -> Table:
    own: Table = {"value": D(value), "unit": "V" if supply else "pm/V", "date": OLD, "reason": "a new wafer (invented)"}
    if not supply:
        own["spread"] = {"shape": "lognormal", "ln_sd": D("0.20")}
    return own | more


def remeasured(**more: Any) -> Inputs:
    """S8 after the new measurement, with what was before kept in the file; the supply follows the coefficient."""
    inputs = fixed_displacement(coefficient=("170.0", "0.05"))
    values = inputs.sets["technologies/film-switch"]["value"]
    values["actuator_coefficient"] |= {"date": NEW, "superseded": [entry("200.0") | more]}
    values["declared_supply"] |= {"date": NEW, "superseded": [entry("0.3", supply=True)]}
    return inputs


@pytest.fixture(autouse=True)
def _quick(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("benchmark.record.run.closed_form_differences", lambda *_: [])


def run(path: Path, as_of: datetime.date | None = None) -> dict[str, Any]:
    view = api.load_study(path, as_of=as_of)
    return json.loads(json.dumps(api.run(view, created="2026-03-01T00:00:00Z", draws=64).record))


def test_the_past_state_has_the_digits_of_then(tmp_path: Path):
    """What was run before the new measurement and what is run now as of that day: the same to the last bit."""
    path = remeasured().write(tmp_path / "now")
    then = run(fixed_displacement().write(tmp_path / "then"))
    back = run(path, BETWEEN)
    assert back["as_of"] == "2026-01-31"
    for name in ("verdict", "policies", "uncertainty", "curves", "nodes", "requirements"):
        assert back[name] == then[name], name
    assert run(path)["verdict"]["advantage"] == near(1.445, rel=1e-6)
    assert "as_of" not in run(path)
    assert run(path, LATER)["verdict"] == run(path)["verdict"]


def test_its_record_alone_gives_the_past_state_again(tmp_path: Path):
    back = run(remeasured().write(tmp_path / "now"), BETWEEN)
    (tmp_path / "again").mkdir()
    path, _ = recreate(back, tmp_path / "again")
    assert run(path)["policies"] == back["policies"]


def test_the_history_is_loaded_and_shown(tmp_path: Path):
    remeasured().write(tmp_path)
    value = load_technology("film-switch", tmp_path / "nodes").values["actuator_coefficient"]
    assert float(value.si[0]) == near(170e-12)
    assert [(float(past.value.si[0]), past.value.date, past.reason) for past in value.past] == [
        (near(200e-12), "2026-01-10", "a new wafer (invented)")
    ]


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"unit": "V"}, "wrong dimension"),
        ({"date": NEW}, "entry 1 is not older than what follows"),
        ({"value": D("-1e9")}, "is out of its domain"),
        ({"reason": ""}, "reason"),
        ({"nonsense": 1}, "nonsense"),
        ({"spread": {"shape": "uniform", "low": D("210.0"), "high": D("220.0")}}, "superseded"),
    ],
)
def test_a_wrong_history_is_refused(tmp_path: Path, change: Table, message: str):
    with pytest.raises(InputRefused) as refused:
        load_study(remeasured(**change).write(tmp_path))
    assert message in str(refused.value)
    assert "actuator_coefficient" in str(refused.value)


def test_a_history_needs_a_date_of_the_value_itself(tmp_path: Path):
    inputs = remeasured()
    inputs.sets["technologies/film-switch"]["value"]["actuator_coefficient"].pop("date")
    path = inputs.write(tmp_path)
    with pytest.raises(InputRefused, match="has superseded numbers but no date of its own"):
        load_study(path)
    with pytest.raises(InputRefused, match="has a history without dates"):
        load_study(path, as_of=BETWEEN)


def test_before_the_first_entry_there_is_no_number(tmp_path: Path):
    path = remeasured().write(tmp_path)
    with pytest.raises(InputRefused, match="has no number yet on that day; found 2026-01-09; allowed: 2026-01-10 or"):
        load_study(path, as_of=datetime.date(2026, 1, 9))


def test_only_values_have_a_history(tmp_path: Path):
    inputs = fixed_displacement()
    overhead = inputs.study["candidate"]["overhead"]["overhead_power"]
    overhead |= {"date": NEW, "superseded": [{"value": D("0.0"), "unit": "nW", "date": OLD, "reason": "invented"}]}
    with pytest.raises(InputRefused, match=r"belongs to values in \[value\] alone"):
        load_study(inputs.write(tmp_path))


def test_a_value_of_the_study_goes_back_too(tmp_path: Path):
    inputs = fixed_displacement()
    past = {"value": D("0.25"), "date": OLD, "reason": "counted again (invented)"}
    inputs.study["value"]["activity"] |= {"date": NEW, "superseded": [past]}
    path = inputs.write(tmp_path)
    assert float(load_study(path)[0].values["activity"].si[0]) == 0.5
    assert float(load_study(path, as_of=BETWEEN)[0].values["activity"].si[0]) == 0.25


def test_the_command_line(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]):
    from benchmark.cli import main

    path = remeasured().write(tmp_path)
    calls = [
        (
            ["show", "film-switch.actuator_coefficient", "--nodes", str(tmp_path / "nodes")],
            0,
            "200 pm/V from 2026-01-10",
        ),
        (["check", str(path), "--as-of", "2026-01-31"], 0, "1 file(s) fine"),
        (["check", str(path), "--as-of", "2026-01-01"], 3, "has no number yet on that day"),
        (["run", str(path), "--as-of", "last month"], 2, "--as-of needs a day such as 2026-01-31, found 'last month'"),
    ]
    for arguments, status, text in calls:
        monkeypatch.setattr("sys.argv", ["evenload", *arguments])
        with pytest.raises(SystemExit) as stopped:
            main()
        said = capsys.readouterr()
        assert (stopped.value.code or 0, text in " ".join((said.out + said.err).split())) == (status, True), said


def test_a_history_written_as_tables_of_its_own(tmp_path: Path):
    """``[[value.x.superseded]]`` is the same as ``superseded = [ {...} ]``."""
    path = remeasured().write(tmp_path)
    place = tmp_path / "nodes" / "technologies" / "film-switch.toml"
    text = place.read_text(encoding="utf-8")
    lines = [line for line in text.splitlines() if not line.startswith("superseded")]
    for name, number, unit in (("actuator_coefficient", "200.0", "pm/V"), ("declared_supply", "0.3", "V")):
        lines += [f"[[value.{name}.superseded]]", f"value = {number}", f'unit = "{unit}"']
        lines += ["date = 2026-01-10", 'reason = "a new wafer (invented)"']
    place.write_text("\n".join(lines) + "\n", encoding="utf-8")
    study, _ = load_study(path, as_of=BETWEEN)
    assert float(study.candidate.technology.values["actuator_coefficient"].si[0]) == near(200e-12)
    assert study.candidate.technology.values["actuator_coefficient"].spread is None  # none was stated then
