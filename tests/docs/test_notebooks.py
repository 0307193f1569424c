"""The worked notebooks run cell by cell, show what their last lines are, and find the numbers of the kept summary."""

from __future__ import annotations

import ast
import json
import re
from pathlib import Path
from typing import Any

import pandas as pd
import pytest

from benchmark import api
from tests.near import near

REPORTS = Path(__file__).resolve().parents[2] / "reports"
NOTEBOOKS = sorted(REPORTS.glob("*/notebook.py"))
CELL = re.compile(r"^# %%(.*)$", flags=re.M)


def cells(text: str) -> list[str]:
    """Code cells in order; a cell of text holds comments only."""
    _, *parts = CELL.split(text)
    found = []
    for kind, body in zip(parts[::2], parts[1::2], strict=True):
        if kind.strip() == "[markdown]":
            assert all(line.startswith("#") for line in body.splitlines() if line.strip())
        else:
            assert kind == ""
            found.append(body)
    return found


def execute(cell: str, names: dict[str, Any]) -> Any:
    """Run one cell and return the value of its last line, as a notebook shows it."""
    tree = ast.parse(cell)
    last = tree.body.pop() if isinstance(tree.body[-1], ast.Expr) else None
    exec(compile(tree, "cell", "exec"), names)
    return None if last is None else eval(compile(ast.Expression(last.value), "cell", "eval"), names)  # type: ignore[attr-defined]


def test_there_is_a_notebook():
    assert [path.parent.name for path in NOTEBOOKS] == ["always-on-hub"]


@pytest.mark.parametrize("path", NOTEBOOKS, ids=lambda path: path.parent.name)
def test_a_notebook_runs_from_any_folder(path: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    monkeypatch.chdir(tmp_path)
    names: dict[str, Any] = {"__name__": "notebook"}
    shown = [execute(cell, names) for cell in cells(path.read_text(encoding="utf-8"))]
    assert len(shown) >= 8
    for value in shown:
        if isinstance(value, (api.SetView, api.StudyView, api.Result, pd.DataFrame)):
            assert len(value._repr_html_()) > 100
    kept = json.loads((path.parent / "summary.json").read_text(encoding="utf-8"))
    assert (names["result"].verdict, names["result"].advantage) == (kept["verdict"], near(kept["advantage"], rel=2e-6))
    answers = names["answers"]
    assert answers["advantage"].iloc[0] == names["result"].advantage
    assert answers["advantage"].nunique() == 2
    assert names["study"].what_if == {}
    curves = names["cheapest"].set_index("side")
    assert set(curves.index) <= {side["id"] for side in names["result"].record["sides"]}
    candidate = names["result"].summary["candidate"]
    assert candidate is not None  # the grid is never better than the refined optimum of the least energy
    assert float(curves.loc[candidate["id"], "energy_J"]) >= candidate["energy"] * (1 - 1e-6)
    assert names["chart"].to_dict()["encoding"]["y"]["scale"]["type"] == "log"
    assert list(tmp_path.iterdir()) == []
