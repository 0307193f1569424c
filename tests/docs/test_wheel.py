"""The wheel holds what an installed program needs, and works from there alone: schemas, sets, worked reports, page."""

from __future__ import annotations

import os
import subprocess
import sys
import zipfile
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
JUNK = {"__pycache__", ".ipynb_checkpoints"}


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The wheel, built by the back end that pyproject.toml names, without a network."""
    place = tmp_path_factory.mktemp("dist")
    words = [sys.executable, "-m", "hatchling", "build", "-t", "wheel", "-d", str(place)]
    done = subprocess.run(words, cwd=ROOT, capture_output=True, text=True)
    assert done.returncode == 0, done.stderr
    (found,) = place.glob("*.whl")
    return found


def _files(folder: str) -> Iterator[str]:
    for path in (ROOT / folder).rglob("*"):
        if path.is_file() and not JUNK & set(path.parts):
            yield path.relative_to(ROOT).as_posix()


def test_the_wheel_holds_package_sets_schemas_and_reports(wheel: Path):
    with zipfile.ZipFile(wheel) as archive:
        held = {name: archive.read(name) for name in archive.namelist()}
    wanted = {name: name for name in _files("benchmark")}
    wanted |= {name: name.replace("nodes/", "benchmark/_nodes/", 1) for name in _files("nodes")}
    wanted |= {name: name.replace("reports/", "benchmark/_reports/", 1) for name in _files("reports")}
    for name, inside in wanted.items():
        assert held.get(inside) == (ROOT / name).read_bytes(), inside
    for name in (
        "benchmark/_nodes/schema/technology-given.json",
        "benchmark/_nodes/sources.toml",
        "benchmark/_nodes/LICENSE",
        "benchmark/_reports/always-on-hub/study.toml",
        "benchmark/_reports/always-on-hub/notebook.py",
        "benchmark/report/templates/report.css",
        "benchmark/py.typed",
    ):
        assert name in held
    information = {name for name in held if ".dist-info/" in name}
    assert {name.split("/", 1)[1] for name in information} >= {"licenses/LICENSE", "licenses/nodes/LICENSE"}
    assert set(held) - information == set(wanted.values()), "the wheel holds something else"


def test_the_program_works_from_the_wheel_alone(wheel: Path, tmp_path: Path):
    unpacked = tmp_path / "unpacked"
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(unpacked)

    def python(*words: str) -> str:
        environment = {**os.environ, "PYTHONPATH": str(unpacked), "NO_COLOR": "1"}
        done = subprocess.run(
            [sys.executable, "-P", *words], cwd=tmp_path, env=environment, capture_output=True, text=True
        )
        assert done.returncode == 0, done.stderr
        return done.stdout

    shown = python("-c", "from benchmark import api; print(api.__file__); print(repr(api.worked_study()))")
    assert shown.startswith(str(unpacked))
    assert "always-on-hub" in shown
    assert "open-7nm-regular" in python("-m", "benchmark", "show", "technologies")
    python("-m", "benchmark", "new", "technology", "mine.toml", "--model", "table")
    for path in (tmp_path / "mine.toml", tmp_path / "tables" / "mine-current.toml"):
        hint = path.read_text(encoding="utf-8").splitlines()[0].removeprefix("#:schema ")
        schema = (path.parent / hint).resolve()
        assert schema.is_file()
        assert unpacked in schema.parents
    assert "1 file(s) fine" in python("-m", "benchmark", "check", "mine.toml")
