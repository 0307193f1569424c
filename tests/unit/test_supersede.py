"""A value gets a new number by command: the old one stays, derived values follow, any past state runs as it did."""

from __future__ import annotations

import datetime
import json
from decimal import Decimal as D
from pathlib import Path
from typing import Any

import pytest

from benchmark import api
from benchmark.errors import InputRefused, UsageError
from benchmark.sets.edit import Edit, edited_text
from benchmark.sets.files import TomlFile, parse_toml, read_toml
from benchmark.sets.library import shipped_nodes
from benchmark.sets.problems import Collector
from tests.cli.conftest import Run, evenload
from tests.fixed_displacement import fixed_displacement

__all__ = ["evenload"]

OLD, FIRST, SECOND = datetime.date(2026, 1, 10), datetime.date(2026, 2, 10), datetime.date(2026, 3, 10)
FOLLOWS = "follows actuator_coefficient"
SAID: dict[str, Any] = {
    "unit": "pm/V",
    "evidence": "measured",
    "source": "invented",
    "where": "p. 3",
    "conditions": "25 degC",
    "reason": "a new wafer",
}


@pytest.fixture
def study(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setattr("benchmark.record.run.closed_form_differences", lambda *_: [])
    return fixed_displacement().write(tmp_path)


def place(study: Path, name: str = "film-switch") -> Path:
    return study.parent / "nodes" / "technologies" / f"{name}.toml"


def digits(study: Path, as_of: datetime.date | None = None) -> dict[str, Any]:
    record = api.run(api.load_study(study, as_of=as_of), created="2026-03-01T00:00:00Z", draws=64).record
    told = json.loads(json.dumps(record))
    return {name: told[name] for name in ("verdict", "policies", "uncertainty", "requirements")}


def test_every_past_state_runs_with_the_digits_of_then(study: Path):
    """Two edits by the command, in values that a formula leads to; three states, each the same to the last digit."""
    states = [digits(study)]
    path = place(study)
    edited = api.supersede(
        path, "actuator_coefficient", "170.0", date=FIRST, old_date=OLD, spread="lognormal ln_sd 0.05", **SAID
    )
    assert [row["key"] for row in edited.data["inputs"]] == ["actuator_coefficient", "declared_supply"]
    states.append(digits(study))
    api.supersede(path, "actuator_coefficient", "0.185", date=SECOND, spread="keep", **SAID | {"unit": "nm/V"})
    states.append(digits(study))
    assert len({json.dumps(state) for state in states}) == 3
    for day, state in [
        (datetime.date(2026, 1, 31), states[0]),
        (FIRST, states[1]),
        (datetime.date(2026, 3, 9), states[1]),
        (SECOND, states[2]),
    ]:
        assert digits(study, day) == state, day
    values = api.load_set("film-switch", [study.parent / "nodes"]).parameters.values
    assert [past.reason for past in values["declared_supply"].past] == [FOLLOWS] * 2
    lines = (study.parent / "nodes" / "CHANGES.md").read_text().splitlines()
    assert lines[2:] == [
        f"- {day}, film-switch: {change}, source invented: {why}"
        for day, change, why in [
            ("2026-03-10", "actuator_coefficient, 0.17 -> 0.185 nm/V, factor 1.088", "a new wafer"),
            ("2026-03-10", "declared_supply, 0.352941176471 -> 0.324324324324 V, factor 0.9189", FOLLOWS),
            ("2026-02-10", "actuator_coefficient, 200 -> 170 pm/V, factor 0.85", "a new wafer"),
            ("2026-02-10", "declared_supply, 0.3 -> 0.352941176471 V, factor 1.176", FOLLOWS),
        ]
    ]


def test_the_first_state_comes_back_whole(study: Path):
    """Note, bound, owner and formula of then, too: the table as of the old day is the table of then, with its date."""
    path = place(study, "stated-reference")
    before = read(path).data["value"]["on_resistance"]
    api.supersede(
        path,
        "on_resistance",
        2,
        date=FIRST,
        old_date=OLD,
        note="first",
        owner="example team (fictional)",
        bound="at-most",
        **SAID | {"unit": "kohm"},
    )
    api.supersede(path, "on_resistance", 3, date=SECOND, **SAID | {"unit": "kohm"})
    from benchmark.sets.history import as_it_was

    def then(day: datetime.date) -> dict[str, Any]:
        back = as_it_was(read(path), day, Collector())
        assert back is not None
        return dict(back.data["value"]["on_resistance"])

    assert then(OLD) == {**before, "date": OLD} | {
        key: read(path).data["default"][key] for key in ("evidence", "source", "conditions", "where")
    }
    middle = then(FIRST)
    assert (middle["value"], middle["note"], middle["bound"]) == (2, "first", "at-most")
    assert "bound" not in read(path).data["value"]["on_resistance"]
    assert "note" not in read(path).data["value"]["on_resistance"]


def read(path: Path) -> TomlFile:
    file = read_toml(path, Collector())
    assert file is not None
    return file


LAYOUTS = {
    "tables": '# top\n[value.x]\nvalue = 1.0  # beside\nunit = "V"\nspread = {{ shape = "normal", sd = 0.1 }} # of 40\n'
    "# below\n\n# of y\n[value.y]\nvalue = 2.0\n# end\n",
    "inline": '[value]\nx = {{ value = 1.0, unit = "V", spread = {{ shape = "normal", sd = 0.1 }} }} # beside\n# of y\n'
    "y = {{ value = 2.0 }}\n",
    "sub-tables": '[value.x]\nvalue = 1.0\nunit = "V"\n# of the range\n[value.x.spread]\nshape = "normal"\nsd = 0.1\n\n'
    "# of y\n[value.y]\nvalue = 2.0\n",
    "apart": '[value.x]\nvalue = 1.0\nunit = "V"\nspread.shape = "normal"\nspread.sd = 0.1\n\n# option\n[option]\n'
    'o = "p"\n\n# of y\n[value.y]\nvalue = 2.0\n',
    "by node": '[value.x]\nunit = "V"\nspread = {{ shape = "normal", sd = 0.1 }}\n[value.x.by_node]\n# of g1\n'
    "g1 = 1.0\n\n# of y\n[value.y]\nvalue = 2.0\n",
}


@pytest.mark.parametrize("end", ["\n", "\r\n"])
@pytest.mark.parametrize("layout", LAYOUTS)
def test_layouts_keep_their_comments(layout: str, end: str):
    collector = Collector()
    text = LAYOUTS[layout].format().replace("\n", end)
    for round_, day in enumerate((FIRST, SECOND)):
        file = parse_toml(Path("s.toml"), text, "s.toml", collector)
        assert file is not None
        number: dict[str, Any] = {"value": D("3.0") + round_}
        if layout == "by node":
            number = {"by_node": {"g1": D("3.0") + round_}}
        changed = {**number, "spread": None, "source": "new", "date": day}
        text = edited_text(file, [Edit("x", changed, "why", OLD)], collector) or ""
        assert collector.problems == []
    assert text.count("\n") == text.count(end)
    for comment in (
        "# top",
        "# beside",
        "# below",
        "# of y",
        "# end",
        "# of 40",
        "# of the range",
        "# option",
        "# of g1",
    ):
        assert text.count(comment) == LAYOUTS[layout].count(comment)
    assert text.index("# of y") > text.rindex("superseded")  # what stands above a table stays above it
    data = parse_toml(Path("s.toml"), text, "s.toml", collector).data  # type: ignore[union-attr]
    past = data["value"]["x"]["superseded"]
    assert [entry["reason"] for entry in past] == ["why", "why"]
    assert past[0]["spread"] == {"shape": "normal", "sd": D("0.1")}


def test_every_value_of_the_shipped_sets_can_be_edited():
    """What the editing library does to the layout is held against the data that are meant, for every table there is."""
    for path in sorted(shipped_nodes().glob("*/*.toml")):
        file = read(path)
        names = list(file.data.get("value", {}))
        for name in names[:: max(1, len(names) // 4)]:
            collector = Collector()
            number: dict[str, Any] = {"value": D("1.5"), "by_node": None}
            changed = {**number, "spread": None, "note": None, "source": "s", "date": FIRST}
            text = edited_text(file, [Edit(name, changed, "why", OLD)], collector)
            assert text is not None, (path, name)
            before = [line for line in file.text.splitlines() if line.startswith("#")]
            assert [line for line in text.splitlines() if line.startswith("#")] == before, (path, name)


def test_a_layout_that_cannot_be_edited_is_refused(monkeypatch: pytest.MonkeyPatch):
    file = parse_toml(Path("s.toml"), "[value.x]\nvalue = 1.0\n", "s.toml", Collector())
    assert file is not None
    monkeypatch.setattr("tomlkit.dumps", lambda document: "[value.x]\nvalue = 1.0\n")
    collector = Collector()
    assert edited_text(file, [Edit("x", {"value": D("2.0")})], collector) is None
    (problem,) = collector.problems
    assert str(problem) == "s.toml:1: value.x: stands in a layout that cannot be edited; edit it by hand"


def test_the_unit_of_the_other_nodes_stays(tmp_path: Path):
    path = tmp_path / "demo-stress-gated.toml"
    path.write_bytes((shipped_nodes() / "technologies" / "demo-stress-gated.toml").read_bytes())
    edited = api.supersede(
        path,
        "actuator_coefficient",
        D("0.3"),
        node="g1",
        date=FIRST,
        old_date=OLD,
        spread="keep",
        **SAID | {"unit": "nm/V"},
    )
    table = read(path).data["value"]["actuator_coefficient"]
    assert (table["by_node"], table["unit"]) == ({"g1": 300, "g2": D("300.0"), "g3": D("270.0")}, "pm/V")
    assert [(row["node"], row["old"], row["new"]) for row in edited.data["inputs"] if "value" in row["changed"]] == [
        ("g1", 330.0, 300.0)
    ]
    assert edited.notes == ("evidence, source, place and conditions now stand for the numbers of g2, g3 too",)
    with pytest.raises(
        InputRefused, match="stays in GPa at the other nodes, where the new number is no finite decimal"
    ):
        api.supersede(path, "channel_modulus", 1, node="g1", date=FIRST, old_date=OLD, **SAID | {"unit": "lbf/inch^2"})
    with pytest.raises(InputRefused, match="is asked for a node the set does not have; found g9; allowed: g1, g2, g3"):
        api.supersede(path, "channel_modulus", 1, node="g9", date=FIRST, old_date=OLD, **SAID)


@pytest.mark.parametrize(
    ("name", "number", "more", "message"),
    [
        ("actuator_coefficient", "-5", {}, "is out of its domain; found -5 pm/V; allowed: above 0"),
        ("actuator_coefficient", "0", {}, "is out of its domain; found 0 pm/V"),
        ("actuator_coefficient", "9e299", {"unit": "Gm/V"}, "is beyond the range of the program"),
        ("actuator_coefficient", "170", {"unit": "V"}, "has the wrong dimension"),
        ("actuator_coefficient", "170", {"unit": "pm/vv"}, "unknown unit"),
        ("actuator_coefficient", "170", {"source": "nobody"}, "is not a known source"),
        ("actuator_coefficient", "170", {"evidence": "mesured"}, "did you mean 'measured'?"),
        (
            "actuator_coefficient",
            "170",
            {"old_date": None},
            "does not say from which day its old number held, so its past",
        ),
        ("actuator_coefficient", "170", {"old_date": FIRST}, "is not older than what follows"),
        ("actuator_coeficient", "170", {}, "is not stated in the set; allowed: actuator_coefficient"),
        ("declared_supply", "0.4", {"unit": "V"}, "is derived and follows its formula; change what the formula names"),
    ],
)
def test_what_would_not_pass_is_refused_and_nothing_is_written(
    study: Path, name: str, number: str, more: dict[str, Any], message: str
):
    path = place(study)
    before = path.read_bytes()
    said = {**SAID, "date": FIRST, "old_date": OLD, "spread": "none"} | more
    with pytest.raises(InputRefused) as refused:
        api.supersede(path, name, number, **said)
    assert message in str(refused.value)
    assert path.read_bytes() == before
    assert not (study.parent / "nodes" / "CHANGES.md").exists()


@pytest.mark.parametrize(
    ("number", "more", "message"),
    [
        ("1,7e2", {}, "actuator_coefficient: has a decimal comma; write 1.5, or declare the decimal comma"),
        ("170", {"spread": ""}, "actuator_coefficient has a range; say what becomes of it: a new one, none, or keep"),
        ("170", {"spread": "normal"}, "normal needs one number with its name; such as normal sd 1.25, or percent"),
        ("170", {"spread": "lognormel factor 2"}, "is not a shape of a range; one of none, uniform, loguniform"),
        ("170", {"spread": "uniform 1"}, "needs exactly one low and one high"),
        ("170", {"reason": " ", "where": ""}, "say also where, reason; '-' where there is nothing to say"),
        ("170", {"date": "last week"}, "date: a day such as 2026-01-31 is needed, found 'last week'"),
    ],
)
def test_what_is_not_said_or_not_readable(study: Path, number: str, more: dict[str, Any], message: str):
    with pytest.raises(UsageError) as refused:
        api.supersede(
            place(study),
            "actuator_coefficient",
            number,
            **{**SAID, "date": FIRST, "old_date": OLD, "spread": "none"} | more,
        )
    assert message in str(refused.value)


def test_a_study_is_no_set(study: Path):
    with pytest.raises(InputRefused, match=r"study.toml: is not a set of values \(technology or wires\)"):
        api.supersede(study, "activity", 1, date=FIRST, **SAID)


def test_a_file_that_changes_meanwhile_is_left(study: Path, monkeypatch: pytest.MonkeyPatch):
    from benchmark.errors import EvenloadError
    from benchmark.record import editing

    path = place(study)
    opened = editing.open_set_file(path)
    one = editing.Restated("footprint", {"": D("0.02")}, "um^2", None, {}, FIRST, "why", OLD)
    edited = editing.change_set(opened, [one])
    path.write_text(path.read_text() + "# mine\n")
    with pytest.raises(EvenloadError, match="was changed by something else meanwhile; nothing was written"):
        edited.write()
    assert path.read_text().endswith("# mine\n")


def test_the_command(study: Path, evenload: Run):
    path = place(study)
    said = [item for key, text in SAID.items() for item in (f"--{key}", text)]
    said += ["--date", "2026-02-10", "--old-date", "2026-01-10", "--spread", "none"]
    before = path.read_bytes()
    ran = evenload("supersede", str(path), "actuator_coefficient", "17.0", *said, "--dry-run")
    assert (ran.status, path.read_bytes()) == (0, before)
    assert "Note: actuator_coefficient changed by a factor 0.085: check units first." in ran.out
    assert "Note: declared_supply changed by a factor 11.76: check units first." in ran.out
    ran = evenload("supersede", str(path), "footprint", "0.5", *said, "--unit", "um^2", "--dry-run")
    assert (ran.status, path.read_bytes()) == (0, before)
    assert "Nothing was written: this was a trial." in ran.out
    ran = evenload("supersede", str(path), "footprint", "0.5", *said, "--unit", "um^2")
    assert ran.status == 0
    assert "Note: footprint changed by a factor 50: check units first." in ran.out
    assert "Written: " in ran.out
    assert "CHANGES.md" in ran.out
    ran = evenload(
        "supersede", str(path), "footprint", "0.6", *said, "--unit", "um^2", "--date", "2026-02-11", "--format", "json"
    )
    assert json.loads(ran.out)["inputs"][0]["factor"] == 1.2
    ran = evenload(
        "supersede", str(path), "footprint", "0.6", *said, "--unit", "um^2", "--date", "2026-02-12", "--format", "csv"
    )
    assert ran.out.splitlines()[0].startswith("section,name,node,unit,old,new")
