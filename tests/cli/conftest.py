"""Running the command line inside the test process, exactly as the ``evenload`` program does."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

from benchmark.cli import main


@dataclass(frozen=True)
class Ran:
    """Exit status and what was printed."""

    status: int
    out: str
    err: str


Run = Callable[..., Ran]


@pytest.fixture
def evenload(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Run:
    """Call the program in the test's folder; a plain terminal of 100 columns."""
    monkeypatch.chdir(tmp_path)
    for name, text in {"NO_COLOR": "1", "TERM": "dumb", "COLUMNS": "100"}.items():
        monkeypatch.setenv(name, text)

    def call(*arguments: object) -> Ran:
        monkeypatch.setattr("sys.argv", ["evenload", *map(str, arguments)])
        capsys.readouterr()
        with pytest.raises(SystemExit) as stopped:
            main()
        said = capsys.readouterr()
        assert "Traceback" not in said.err
        code = stopped.value.code
        return Ran(code if isinstance(code, int) else 0, said.out, said.err)

    return call


def _small_folder(place: Path, record: dict[str, Any]) -> None:
    """What a record folder needs at least: no charts and no report, which take seconds."""
    from benchmark.record.write import summary, to_json

    (place / "record.json").write_text(to_json(record), encoding="utf-8")
    (place / "summary.json").write_text(to_json(summary(record)), encoding="utf-8")
    (place / "report.html").write_text("not made here\n", encoding="utf-8")


@pytest.fixture
def quick(monkeypatch: pytest.MonkeyPatch) -> None:
    """Leave out what takes long and what the command line does not decide: charts, report, transients."""
    monkeypatch.setattr("benchmark.report.folder.fill_folder", _small_folder)
    monkeypatch.setattr("benchmark.record.run.closed_form_differences", lambda *_: [])


def read(folder: Path, name: str = "summary.json") -> dict[str, Any]:
    """Read a file of a record folder."""
    found: dict[str, Any] = json.loads((folder / name).read_text(encoding="utf-8"))
    return found
