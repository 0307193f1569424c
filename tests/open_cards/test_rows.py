"""The rows as a report takes them, and the extracted set in a whole study."""

from __future__ import annotations

import math
import tomllib
from pathlib import Path

import pytest

from benchmark.record.load import load_study
from benchmark.record.run import run_study
from tests.comparisons import compare, side, study
from tests.near import near
from tests.open_cards.engine import pair_at, stage
from tests.open_cards.freepdk45 import PLACE, ROOT, SET
from tests.open_cards.predictive import CARDS
from tests.open_cards.row import Row, failures
from tests.open_cards.rows import COMPARISONS
from tests.studies import Inputs, wires


@pytest.mark.spice
@pytest.mark.parametrize("title", COMPARISONS)
def test_rows_are_tidy_and_hold(title: str):
    rows = COMPARISONS[title]()
    assert not failures(rows)
    assert len({(row.quantity, row.note) for row in rows}) == len(rows)
    for row in rows:
        assert row.source
        assert row.status in {"simulated now", "simulated", "published", "closed form"}
        assert math.isfinite(row.expected)
        assert row.expected > 0.0
        assert 0.0 < row.tolerance <= 0.52
        assert row.quantity.endswith("]"), row.quantity


def test_a_row_that_is_off_or_nan_does_not_hold():
    assert failures([])
    assert failures([Row("x [1]", "test", "published", 1.0, 1.11, 0.10)])
    assert failures([Row("x [1]", "test", "published", 1.0, math.nan, 0.10)])
    assert not failures([Row("x [1]", "test", "published", 1.0, 1.09, 0.10)])


def test_the_extracted_set_runs_in_a_study(tmp_path: Path):
    """Inverter chain of fan-out four, set of the open cards against that of the predictive ones at fixed supplies."""
    rival = CARDS[0].name
    files = study(side(SET, 1.0, 1.0), [side(rival, 1.0, 1.0)], [], rule="chain", short_circuit="estimated")
    files.study["value"]["fan_out"] = {"value": 4}
    files.study["nodes"] = {
        "headline": "n45",
        "pairs": [{"label": "n45", "candidate": "n45", "reference": "n45", "wires": "n45"}],
    }
    files.study["conditions"]["temperatures"] = {"values": [27], "unit": "degC"}
    inputs = Inputs(files.study, {"wires/lines": wires("lines", ["n45"], "0.0", "0.0", "0.0")})
    loaded, library = load_study(inputs.write(tmp_path), nodes=[ROOT])
    outcome = compare(loaded)
    anchors = {(row["name"], row["supply"]): row for row in run_study(loaded, library, created="")["anchors"]}
    for found, name in ((outcome.candidate, SET), (outcome.contenders[0], rival)):
        here = stage(pair_at(name, 1.0, ROOT))
        assert found.time[0] == near(20.0 * here.delay, rel=1e-9)
        # activity 0.05, every stage leaks for the whole path
        assert found.energy[0] == near(20.0 * (0.05 * here.energy + 20.0 * here.delay * here.leakage), rel=1e-9)
    simulated = {name: row["published"] for (name, supply), row in anchors.items() if supply == 1.0}
    assert simulated.keys() >= {"fan_out_4_delay", "fan_out_4_energy"}
    card = tomllib.loads(PLACE.read_text(encoding="utf-8"))["anchor"]["fan_out_4_delay__1_00V"]["value"]
    assert outcome.candidate.time[0] == near(20.0 * card * 1e-12, rel=0.05)
