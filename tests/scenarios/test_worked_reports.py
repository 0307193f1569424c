"""The worked reports in ``reports/`` are current: running their studies again gives the same numbers and words."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import pytest

from benchmark.record.load import load_study
from benchmark.record.run import run_study
from benchmark.record.write import summary
from tests.remake_reports import KEPT, studies


def differences(kept: Any, now: Any, where: str = "") -> list[str]:
    """Numbers within 1e-6 relative (the refinement of the search), all else equal."""
    if isinstance(kept, dict) and isinstance(now, dict):
        if kept.keys() != now.keys():
            return [f"{where}: keys {sorted(kept.keys() ^ now.keys())}"]
        return [text for key in kept for text in differences(kept[key], now[key], f"{where}.{key}")]
    if isinstance(kept, list) and isinstance(now, list):
        if len(kept) != len(now):
            return [f"{where}: length {len(kept)} and {len(now)}"]
        return [t for i, pair in enumerate(zip(kept, now, strict=True)) for t in differences(*pair, f"{where}[{i}]")]
    if isinstance(kept, float) and isinstance(now, (int, float)):
        return [] if math.isclose(kept, now, rel_tol=2e-6, abs_tol=0.0) else [f"{where}: {kept!r} and {now!r}"]
    return [] if kept == now else [f"{where}: {kept!r} and {now!r}"]


@pytest.mark.parametrize("path", studies(), ids=lambda path: path.parent.name)
def test_report_is_current(path: Path):
    for name in KEPT:
        assert (path.parent / name).is_file(), f"run tests/remake_reports.py: {name} is missing"
    kept = json.loads((path.parent / "summary.json").read_text(encoding="utf-8"))
    study, library = load_study(path)
    record = run_study(study, library, created=f"{study.declared}T00:00:00Z")
    now = json.loads(json.dumps(summary(record)))
    assert differences(kept, now) == []
    assert all(check["passed"] for check in record["self_checks"])


def test_a_changed_number_is_noticed():
    assert differences({"a": [1.0, 2.0]}, {"a": [1.0, 2.00001]}) == [".a[1]: 2.0 and 2.00001"]
    assert differences({"a": 1.0}, {"b": 1.0})
