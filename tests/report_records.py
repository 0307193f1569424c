"""Records for tests of the report: real runs of small studies, and changed copies of them."""

from __future__ import annotations

import copy
import functools
import itertools
import math
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

from tests import studies
from tests.fixed_displacement import fixed_displacement

__all__ = ["HOSTILE", "changed", "crossing", "hostile", "hub", "infeasible", "mixed", "remeasured"]

Record = dict[str, Any]


@functools.cache
def _run(name: str) -> Record:
    inputs = getattr(studies, name)()
    with tempfile.TemporaryDirectory() as folder:
        return studies.run(inputs, Path(folder), whole=True)


def mixed() -> Record:
    """Two device models, two nodes, six policies, ranges, wires."""
    return copy.deepcopy(_run("mixed"))


def hub() -> Record:
    """Sides stated at one supply each, no ranges."""
    return copy.deepcopy(_run("hub"))


@functools.cache
def _remeasured() -> Record:
    from benchmark import api

    with tempfile.TemporaryDirectory() as folder:
        place = Path(folder)
        old = api.run(fixed_displacement().write(place / "old"), created="2026-01-31T00:00:00Z", draws=64)
        again = fixed_displacement(("170.0", "0.05"), ("0.18", "0.02")).write(place / "new")
        return dict(api.run(again, created="2026-02-28T00:00:00Z", draws=64, since=old).record)


def remeasured() -> Record:
    """Scenario S8 after both measurements, with what changed since the record before them."""
    return copy.deepcopy(_remeasured())


def changed(record: Record, change: Callable[[Record], None]) -> Record:
    """Return a changed copy."""
    copied = copy.deepcopy(record)
    change(copied)
    return copied


def infeasible() -> Record:
    """A record in which the candidate has no permitted point anywhere, as a deadline out of reach gives it."""

    def change(record: Record) -> None:
        for curve in record["curves"]:
            for point in curve["points"]:
                point["feasible"] = False
                point["reasons"] = ["requirement deadline"]
        for row in record["advantage_against_time"]:
            row |= {"advantage": None, "candidate_energy": "infinite", "reference_energy": "infinite", "strongest": ""}
        for policy in record["policies"]:
            policy["advantage"], policy["strongest"] = None, ""
            for side in (policy["candidate"], *policy["contenders"]):
                side |= {"feasible": False, "point": None, "at": "", "why": "cannot reach 1e-12 s per operation"}
            for side in policy["contenders"]:
                side["advantage"] = None
        for row in record["nodes"]:
            for key in row:
                if key not in ("label", "candidate_node", "strongest", "note"):
                    row[key] = None
            row["strongest"], row["note"] = "", "candidate infeasible"
        record["crossings"], record["node_crossings"], record["closed_form"] = [], [], []
        for step in record["node_steps"]:
            step |= {"total": None, "parts": {}, "note": "one of the nodes has no advantage"}
        record["verdict"] |= {
            "word": "no-go, requirement failed",
            "reasons": ["requirement deadline failed (margin 0.01, needs 1)"],
            "conditions": [],
            "advantage": None,
            "advantage_low": None,
            "advantage_high": None,
            "moves": [],
        }
        record["requirements"][0] |= {"state": "fail", "margin": 0.01, "passes_somewhere": False}
        record["requirements"][1] |= {"state": "unknown", "margin": None, "offered": None}
        record["requirements"][2] |= {"state": "pass", "margin": "infinite", "offered": 0.0}
        record["requirements"][3] |= {"state": "fail", "margin": "-infinite"}

    return changed(mixed(), change)


def crossing() -> Record:
    """A record whose advantage crosses 1 and the required 2 over time and nodes, with inputs that flip it."""

    def change(record: Record) -> None:
        rows = [row for row in record["advantage_against_time"] if row["advantage"] is not None]
        for position, row in enumerate(rows):
            row["advantage"] = 0.5 * 16.0 ** (position / (len(rows) - 1))
            row["reference_energy"] = row["advantage"] * row["candidate_energy"]
        record["crossings"] = [
            {"level": level, "time": 0.5 * (a["time"] + b["time"])}
            for level in (1.0, 2.0)
            for a, b in itertools.pairwise(rows)
            if (a["advantage"] >= level) != (b["advantage"] >= level)
        ]
        record["nodes"][0]["advantage"], record["nodes"][1]["advantage"] = 1.9, 2.1
        record["node_steps"][0] |= {"total": math.log(2.1 / 1.9), "parts": {"wires": -0.2, "reference values": 0.3}}
        record["node_steps"][0]["parts"]["not carried by values"] = math.log(2.1 / 1.9) - 0.1
        record["node_crossings"] = [{"level": 2.0, "between": ["g1", "g2"], "advantages": [1.9, 2.1]}]
        ranged = [row for row in record["verdict"]["moves"] if row["ranged"]]
        for row in ranged[:3]:
            row |= {"advantage_low": 1.0, "advantage_high": 4.0, "straddles": True, "decisive": True}
            row["flip"] = row["flip_low"] = 0.5 * (row["low"] + row["high"])
        ranged[2] |= {"advantage_high": None, "flip": None, "flip_low": None, "flip_high": None}
        while len(record["verdict"]["moves"]) < 40:
            extra = dict(ranged[-1])
            extra["key"] = f"{extra['key']}_{len(record['verdict']['moves'])}"
            record["verdict"]["moves"].append(extra)

    return changed(mixed(), change)


#: one text with everything that may run, load, end an element or confuse a parser
HOSTILE = (
    "</script></style></title>--><!--<script><script>document.title='owned'</script>"
    "<img src=x onerror=\"document.title='owned'\">"
    "<svg/onload=document.title='owned'>{{7*7}}{% raw %}${7*7}]]>&lt;b&gt;'\"`\\u003cb\\u003e"
    "<a href=\"javascript:document.title='owned'\">url(http://example.invalid/x)</a>\x01\u202edatum['x']"
)
#: keys whose words the program itself chooses from closed lists, or numbers said as words
_CLOSED = {
    *("role", "state", "kind", "policy", "primary_policy", "also", "evidence", "set_by", "timing", "idle", "metric"),
    *("leakage_accounting", "unit", "bound", "ambition", "required_time", "margin", "demanded", "offered", "shape"),
    *("sha256", "candidate_energy", "reference_energy", "of", "when", "scale", "quantity"),
}


def hostile(record: Record, payload: str = HOSTILE) -> Record:
    """Put a payload before every free text of a record, the same text always becoming the same."""

    def walk(value: Any, key: str) -> Any:
        if isinstance(value, dict):
            if key in (
                "sources",
                "device_margins",
                "time_parts",
                "energy_parts",
                "delay_shares",
                "energy_shares",
                "parts",
            ):
                return {payload + name: walk(item, "") for name, item in value.items()}
            if key == "reference":
                return {payload + name: walk(item, "") for name, item in value.items()}
            return {name: walk(item, name) for name, item in value.items()}
        if isinstance(value, list):
            return [walk(item, key) for item in value]
        if isinstance(value, str) and key not in _CLOSED and value not in ("", "deadline", "infinite", "-infinite"):
            return payload + value
        return value

    return {key: walk(value, key) for key, value in record.items()}
