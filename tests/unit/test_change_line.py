"""The list of changes beside the sets: where it is, what a line says, and that files change together or not at all."""

from __future__ import annotations

import datetime
import os
from decimal import Decimal as D
from pathlib import Path

import pytest

from benchmark.errors import InputRefused
from benchmark.sets.change_line import append_change, change_text, changes_file, with_changes, write_files

DAY, NEXT = datetime.date(2026, 2, 10), datetime.date(2026, 3, 1)


def test_where_the_list_is(tmp_path: Path):
    for folder in ("technologies", "wires"):
        assert changes_file(tmp_path / "nodes" / folder / "x.toml") == tmp_path / "nodes" / "CHANGES.md"
    own = tmp_path / "mine" / "x.toml"
    own.parent.mkdir()
    assert changes_file(own) == own.parent / "CHANGES.md"
    (tmp_path / "CHANGES.md").write_text("# Mine\n")
    assert changes_file(own) == tmp_path / "CHANGES.md"
    (own.parent / "CHANGES.md").write_text("# Nearer\n")
    assert changes_file(own) == own.parent / "CHANGES.md"


def test_what_a_line_says():
    text = change_text("actuator_coefficient", D("200.0"), D("170.0"), "pm/V", node="g1", source="film", reason="new")
    assert text == "actuator_coefficient at g1, 200.0 -> 170.0 pm/V, factor 0.85, source film: new"
    assert change_text("layer_count", 1, 2, "1") == "layer_count, 1 -> 2, factor 2"
    assert change_text("x", 0, D("1.0"), "V") == "x, 0 -> 1.0 V"
    assert change_text("x", None, D("1.0"), "V") == "x, absent -> 1.0 V"


def test_a_list_is_made_and_then_grows_at_the_top(tmp_path: Path):
    place = append_change(tmp_path / "film.toml", "a, 1 -> 2", DAY)
    append_change(tmp_path / "film.toml", "a,\n2 -> 3", NEXT)
    assert place.read_text() == (
        "# Changes of the data\n\n- 2026-03-01, film: a, 2 -> 3\n- 2026-02-10, film: a, 1 -> 2\n"
    )
    assert place.stat().st_mode & 0o777 == 0o644
    assert [path.name for path in tmp_path.iterdir()] == ["CHANGES.md"]


@pytest.mark.parametrize(
    ("before", "after"),
    [
        ("", "# Changes of the data\n\n- 2026-02-10, s: x\n- 2026-02-10, s: y\n"),
        ("# Mine", "# Mine\n\n- 2026-02-10, s: x\n- 2026-02-10, s: y\n"),
        ("# Mine\r\n\r\n- old\r\n", "# Mine\r\n\r\n- 2026-02-10, s: x\r\n- 2026-02-10, s: y\r\n- old\r\n"),
        (
            "# Mine\nWords.\n\n- old\n\nEnd.\n",
            "# Mine\nWords.\n\n- 2026-02-10, s: x\n- 2026-02-10, s: y\n- old\n\nEnd.\n",
        ),
    ],
)
def test_new_lines_stand_below_the_heading_in_their_own_order(before: str, after: str):
    assert with_changes(before, "s", ["x", "y"], DAY) == after


def test_a_list_that_is_no_text_is_refused_and_left(tmp_path: Path):
    place = tmp_path / "CHANGES.md"
    place.write_bytes(b"\xff\xfe")
    with pytest.raises(InputRefused, match="is not UTF-8 text; no change was written"):
        append_change(tmp_path / "film.toml", "x", DAY)
    assert place.read_bytes() == b"\xff\xfe"


def test_a_list_that_is_a_folder_is_refused(tmp_path: Path):
    (tmp_path / "CHANGES.md").mkdir()
    with pytest.raises(InputRefused) as refused:
        append_change(tmp_path / "film.toml", "x", DAY)
    assert str(refused.value) == f"{tmp_path}/CHANGES.md: cannot be used (Is a directory); nothing was written"


def test_files_change_together_or_not_at_all(tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    one, two, new = tmp_path / "one", tmp_path / "two", tmp_path / "new"
    one.write_text("old one")
    two.write_text("old two")
    replace, calls = os.replace, []

    def failing(source: Path, target: Path) -> None:
        calls.append(target)
        if len(calls) == 3:
            raise OSError(28, "No space left on device")
        replace(source, target)

    monkeypatch.setattr("benchmark.sets.change_line.os.replace", failing)
    with pytest.raises(InputRefused) as refused:
        write_files({one: "1", new: "3", two: "2"})
    assert str(refused.value) == f"{two}: cannot be used (No space left on device); nothing was written"
    assert calls == [one, new, two]
    assert (one.read_text(), two.read_text(), new.exists()) == ("old one", "old two", False)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["one", "two"]


def test_permissions_stay(tmp_path: Path):
    place = tmp_path / "one"
    place.write_text("old")
    place.chmod(0o600)
    write_files({place: "new"})
    assert (place.read_text(), place.stat().st_mode & 0o777) == ("new", 0o600)


def test_a_link_stays_a_link(tmp_path: Path):
    real, name = tmp_path / "real.toml", tmp_path / "name.toml"
    real.write_text("old")
    name.symlink_to(real)
    write_files({name: "new"})
    assert name.is_symlink()
    assert real.read_text() == "new"
