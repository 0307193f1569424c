"""The command ``export``: what it writes and what it refuses."""

from __future__ import annotations

from pathlib import Path

from benchmark.record.write import to_json
from tests.report_records import mixed


def _record(place: Path) -> Path:
    place.mkdir()
    (place / "record.json").write_text(to_json(mixed()), encoding="utf-8")
    return place


def test_tables_and_figures_are_written_and_other_files_stay(evenload, tmp_path: Path):
    folder = _record(tmp_path / "record")
    (tmp_path / "out").mkdir()
    (tmp_path / "out" / "mine.txt").write_text("mine", encoding="utf-8")
    ran = evenload("export", folder, "--figures", "out", "--tables", "out", "--format", "latex")
    assert ran.status == 0, ran.err
    names = {place.name for place in (tmp_path / "out").iterdir()}
    assert {"mine.txt", "ledger.tex", "sources.md", "one-page-a4.pdf", "energy-delay-88mm.png"} <= names
    assert not any(name.startswith(".") for name in names)
    assert {"energy-delay-88mm.svg", "energy-delay-88mm.txt", "energy-delay-180mm.svg"} <= names


def test_nothing_asked_for_and_unknown_formats_are_refused(evenload, tmp_path: Path):
    folder = _record(tmp_path / "record")
    nothing = evenload("export", folder)
    assert nothing.status == 2
    assert "--figures" in nothing.err
    wrong = evenload("export", folder, "--tables", "out", "--format", "xls")
    assert wrong.status == 2
    assert "csv, md, latex" in wrong.err
    assert not (tmp_path / "out").exists()


def test_what_is_no_record_is_refused(evenload, tmp_path: Path):
    ran = evenload("export", tmp_path, "--tables", "out")
    assert ran.status == 3
    assert "record.json: does not exist" in ran.err


def test_ratios_only_from_an_ordinary_record(evenload, tmp_path: Path):
    folder = _record(tmp_path / "record")
    ran = evenload("export", folder, "--tables", "out", "--ratio-only")
    assert ran.status == 0, ran.err
    head = (tmp_path / "out" / "policies.csv").read_text(encoding="utf-8").splitlines()[0]
    assert "energy (E0)" in head
    assert "(J)" not in head
