"""Energy per operation against time per operation: what is plotted, and its words (layer 9)."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from benchmark.record.shown_units import unit_words
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.rows import curve_rows, envelope_rows, policy_rows
from benchmark.report.style import LogAxis, positive, spec
from benchmark.report.words import amount, is_number, plural, state_word

__all__ = [
    "FEASIBLE",
    "Limits",
    "Plane",
    "chosen_curves",
    "energy_delay",
    "envelope_path",
    "limits_of",
    "outlook_path",
    "plane_of",
    "side_key",
    "side_name",
]

Record = Mapping[str, Any]
WIDTH, HEIGHT = 610.0, 420.0
MARGINS = (74.0, 10.0, 12.0, 48.0)
POLICY_SHAPES = ("circle", "square", "diamond", "triangle-up", "cross", "triangle-down")
FEASIBLE = state_word(True)
#: what a set may stand for, in order
AMBITIONS = ("today", "target", "limit")
#: how far beyond the feasible points the chart looks
BEYOND = 4.0
#: least distance of the bars of a side [pixel]
BARS_APART = 75.0


@dataclass(frozen=True)
class Limits:
    """Bounds of the plane that come from the study: None when there is none."""

    deadline: float | None
    energy: float | None


def limits_of(record: Record) -> Limits:
    """Return the deadline [s] and, when a policy uses it, the allowed energy [J]."""
    deadline = next((row["demanded"] for row in record["requirements"] if row["name"] == "deadline"), None)
    if not is_number(deadline):
        deadline = record["study"]["required_time"]
    energy = record["study"]["required_energy"]
    uses = {record["study"]["primary_policy"], *record["study"]["also"]}
    return Limits(
        deadline if is_number(deadline) else None, energy if is_number(energy) and "iso-energy" in uses else None
    )


def side_key(row: Mapping[str, Any]) -> str:
    """Return the key of a side: both roles may carry the same id."""
    return f"{row['role']} {row['side']}"


def side_name(record: Record, key: str) -> str:
    """Return the words for a side: the title of a set of the candidate, the name the study gives a contender."""
    beside = {f"candidate {row['technology']}": str(row["title"]) for row in record.get("outlook", ())}
    if key in beside:
        return beside[key]
    side = next(side for side in record["sides"] if f"{side['role']} {side['id']}" == key)
    return str(side["title"] if side["role"] == "candidate" else side["id"])


def chosen_curves(record: Record) -> dict[str, list[Row]]:
    """Return side key -> swept points of the choice that is drawn."""
    return _drawn(record)[0]


def _drawn(record: Record) -> tuple[dict[str, list[Row]], int]:
    """Return side key -> points of the frozen choice of the primary policy (else the first), and how many are left."""
    chosen = {
        side_key(row): (row["size"], row["threshold_shift_V"])
        for row in policy_rows(record)
        if row["policy"] == record["policies"][0]["policy"] and row["state"] == FEASIBLE
    }
    groups: dict[str, dict[tuple[float, float], list[Row]]] = {}
    for row in curve_rows(record):
        groups.setdefault(side_key(row), {}).setdefault((row["size"], row["threshold_shift_V"]), []).append(row)
    drawn, left_out = {}, 0
    for key, choices in groups.items():
        choice = chosen.get(key, next(iter(choices)))
        drawn[key] = choices.get(choice, next(iter(choices.values())))
        left_out += len(choices) - 1
    return drawn, left_out


@dataclass(frozen=True)
class Plane:
    """The axes with everything plotted on them."""

    x: LogAxis
    y: LogAxis
    curves: dict[str, list[Row]]
    envelope: list[Row]
    marks: list[Row]
    limits: Limits
    dropped: int
    outside: int
    left_out: int
    bands: list[Row]

    def pixel(self, row: Mapping[str, Any]) -> tuple[float, float]:
        """Return the place of a point in pixels."""
        return self.x.pixel(row["time_s"]), self.y.pixel(row["energy_J"])


def _marks(record: Record) -> list[Row]:
    """Design points: the candidate and the strongest contender of each policy."""
    shapes = {policy["policy"]: POLICY_SHAPES[i % len(POLICY_SHAPES)] for i, policy in enumerate(record["policies"])}
    ambition = {f"{side['role']} {side['id']}": side["ambition"] for side in record["sides"]}
    columns = ("policy", "role", "side", "supply_V", "time_s", "energy_J")
    rows = [
        {name: row[name] for name in columns}
        | {"shape": shapes[row["policy"]], "ambition": ambition.get(side_key(row), "today")}
        | {"path": row["role"] == "candidate" and row["policy"] == record["policies"][0]["policy"]}
        for row in policy_rows(record)
        if row["state"] == FEASIBLE and (row["role"] == "candidate" or row["strongest"])
    ]
    primary = record["policies"][0]["policy"]
    rows += [
        {"policy": primary, "role": "candidate", "side": row["technology"], "supply_V": row["supply"]}
        | {"time_s": row["time"], "energy_J": row["energy"], "shape": shapes[primary], "ambition": row["ambition"]}
        | {"path": True}
        for row in record.get("outlook", ())
        if row["feasible"]
    ]
    return positive(rows, "time_s", "energy_J")[0]


def outlook_path(plane: Plane) -> list[Row]:
    """Return the candidate's primary points from today's set to the target to the limit; empty with fewer than two."""
    mine = {mark["ambition"]: mark for mark in plane.marks if mark["role"] == "candidate" and mark["path"]}
    path = [mine[ambition] for ambition in AMBITIONS if ambition in mine]
    return path if len(path) > 1 else []


def plane_of(record: Record, width: float, height: float) -> Plane | None:
    """Return the plane of the chart of some size; None when no side has a point with positive time and energy."""
    drawn, left_out = _drawn(record)
    usable, dropped = {}, 0
    for key, rows in drawn.items():
        usable[key], lost = positive(rows, "time_s", "energy_J")
        dropped += lost
    everything = list(itertools.chain.from_iterable(usable.values()))
    if not everything:
        return None
    envelope, marks = positive(envelope_rows(record), "time_s", "energy_J")[0], _marks(record)
    core: list[Row] = [row for row in everything if row["state"] == FEASIBLE] or everything
    core = [*core, *envelope, *marks]
    limits = limits_of(record)
    times, energies = [row["time_s"] for row in core], [row["energy_J"] for row in core]
    if limits.deadline is not None and min(times) / 1e3 < limits.deadline < max(times) * 1e3:
        times.append(limits.deadline)
    ends = [min(times) / BEYOND, max(times) * BEYOND]
    x = LogAxis.around(ends, width, "s", f"time per operation ({unit_words('s')})", room=0.0)
    span = [min(energies) / 2.0, max(energies) * BEYOND]
    y = LogAxis.around(span, height, "J", f"energy per operation ({unit_words('J')})", vertical=True, room=0.0)
    curves = {
        key: [row for row in rows if x.holds(row["time_s"]) and y.holds(row["energy_J"])]
        for key, rows in usable.items()
    }
    shown = sum(map(len, curves.values()))
    bands = _bands(record, usable, x, y)
    return Plane(x, y, curves, envelope, marks, limits, dropped, len(everything) - shown, left_out, bands)


def _bands(record: Record, curves: Mapping[str, Sequence[Row]], x: LogAxis, y: LogAxis) -> list[Row]:
    """Return what 80 % of the draws hold of the energy of the candidate and of the strongest contender, on the axes.

    A bar stands at the time that the best estimate takes at its supply, between the swept points; bars that would crowd
    the chart are in the table of the bands only.
    """
    found = record.get("uncertainty")
    strongest = record["policies"][0]["strongest"]
    rows: list[Row] = []
    for band in found["bands"] if found else ():
        key = f"{band['role']} {band['side']}"
        curve = sorted(curves.get(key, ()), key=lambda row: row["supply_V"])
        if not curve or (band["role"] != "candidate" and band["side"] != strongest):
            continue
        before = [row for row in curve if row["supply_V"] <= band["supply"]]
        after = [row for row in curve if row["supply_V"] >= band["supply"]]
        if not before or not after:
            continue
        low, high = before[-1], after[0]
        span = high["supply_V"] - low["supply_V"]
        share = (band["supply"] - low["supply_V"]) / span if span > 0.0 else 0.0
        time = low["time_s"] * (high["time_s"] / low["time_s"]) ** share
        apart = all(abs(x.pixel(time) - x.pixel(row["time_s"])) > BARS_APART for row in rows if side_key(row) == key)
        if apart and x.holds(time) and y.holds(band["energy_low"]) and y.holds(band["energy_high"]):
            place = {"role": band["role"], "side": band["side"], "supply_V": band["supply"], "time_s": time}
            rows.append(place | {"low_J": band["energy_low"], "high_J": band["energy_high"]})
    return rows


def envelope_path(envelope: Sequence[Row]) -> list[Row]:
    """Join neighbours of one curve straight, and steps between curves at a right angle (nothing lies between them)."""
    path: list[Row] = []
    for row in envelope:
        if path and row["side"] != path[-1]["side"]:
            path.append({**path[-1], "time_s": row["time_s"], "corner": True})
        path.append({**row, "corner": False})
    return path


def _points(plane: Plane) -> tuple[Row, ...]:
    """Return the plotted points as one table."""
    place = ("role", "side", "supply_V", "time_s", "energy_J")
    rows: list[Row] = [
        {"series": "curve"} | {name: row[name] for name in (*place, "state", "reason")} | {"policy": ""}
        for points in plane.curves.values()
        for row in points
    ]
    for row in envelope_path(plane.envelope):
        series = "reference envelope corner" if row["corner"] else "reference envelope"
        named = {"role": "contender"} | {name: row[name] for name in place[1:]}
        rows.append({"series": series} | named | {"state": FEASIBLE, "reason": "", "policy": ""})
    rows += [
        {"series": "design point"}
        | {name: row[name] for name in place}
        | {"state": FEASIBLE, "reason": "", "policy": row["policy"]}
        for row in plane.marks
    ]
    rows += [
        {"series": f"{share} % of the draws"}
        | {name: row[name] for name in place[:4]}
        | {"energy_J": row[end], "state": "", "reason": "", "policy": ""}
        for row in plane.bands
        for share, end in ((10, "low_J"), (90, "high_J"))
    ]
    return tuple(rows)


def _caption(plane: Plane) -> str:
    words = [
        "Each technology is a curve swept over its supply, with supplies marked along it: drawn through where every "
        "hard requirement holds, dotted where one fails."
    ]
    if plane.envelope:
        words.append(
            "The broad grey line is the reference: least energy of the contenders' feasible points for each time."
        )
    else:
        words.append("No contender has a feasible point, so there is no reference line.")
    if plane.marks:
        words.append("Larger symbols are the design points of the policies, one shape per policy on either side.")
        stand = [word for word in AMBITIONS if any(m["ambition"] == word for m in plane.marks)]
        looks = {
            "today": "filled: today's",
            "target": "hollow: a target",
            "limit": "outlined, broken: a physical limit",
        }
        words.append(f"What the technology stands for: {'; '.join(looks[word] for word in stand)}.")
    if plane.bands:
        words.append(
            "Bars: 10 to 90 % of the draws of all stated ranges, for the energy of the candidate and of the strongest "
            "contender at some supplies (all of them: table uncertainty_bands)."
        )
    if outlook_path(plane):
        words.append("The thin line leads from one set of the candidate to the next, at the primary policy.")
    deadline = plane.limits.deadline
    if deadline is not None:
        here = plane.x.holds(deadline)
        words.append(f"{'Hatched: later than' if here else 'Outside the axes:'} the deadline {amount(deadline, 's')}.")
    energy = plane.limits.energy
    if energy is not None:
        here = plane.y.holds(energy)
        words.append(f"{'Hatched: above' if here else 'Outside the axes:'} the allowed energy {amount(energy, 'J')}.")
    if plane.outside:
        words.append(f"{plural(plane.outside, 'swept point')} outside the axes not shown.")
    if plane.dropped:
        words.append(f"{plural(plane.dropped, 'point')} without a positive time and energy dropped from the log axes.")
    if plane.left_out:
        words.append(f"{plural(plane.left_out, 'other frozen choice')} (size, threshold shift) only in the tables.")
    return " ".join(words)


def _alternative(record: Record, plane: Plane) -> str:
    words = []
    for key, rows in sorted(plane.curves.items()):
        good = [row for row in rows if row["state"] == FEASIBLE]
        name = side_name(record, key)
        if not good:
            words.append(f"{name}: no feasible point.")
            continue
        fast = min(good, key=lambda row: row["time_s"])
        least = min(good, key=lambda row: row["energy_J"])
        words.append(
            f"{name}: fastest feasible point {amount(fast['time_s'], 's')} at {amount(fast['energy_J'], 'J')}, "
            f"least energy {amount(least['energy_J'], 'J')} at {amount(least['time_s'], 's')}."
        )
    return "Energy per operation against time per operation. " + " ".join(words)


def energy_delay(record: Record, width: float = WIDTH, height: float = HEIGHT) -> Chart:
    """Draw swept curves, the reference envelope and the design points of all policies, on a plane of some size."""
    from benchmark.report.energy_delay_layers import layers, supplies_of
    from benchmark.report.energy_delay_spots import spots

    title = "Energy against time per operation"
    plane = plane_of(record, width, height)
    if plane is None:
        words = "Not drawn: no design point of any side has a positive time and energy."
        return Chart("energy-delay", title, None, words, words)
    supplies = supplies_of(plane)
    drawing = checked(spec(layers(record, plane, supplies), width, height, MARGINS))
    found = spots(record, plane, supplies, MARGINS[:2])
    return Chart("energy-delay", title, drawing, _caption(plane), _alternative(record, plane), _points(plane), found)
