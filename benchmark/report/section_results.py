"""Results in the report: curves, advantage, parts, policies, what moves the answer, nodes (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.report.advantage import crossing_words, levels
from benchmark.report.blocks import (
    Block,
    Bullets,
    Cell,
    Figure,
    Group,
    Groups,
    Notice,
    Paragraph,
    Section,
    Table,
    plain,
)
from benchmark.report.rows import NOT_PERMITTED, flips_of
from benchmark.report.section_points import anchor_of
from benchmark.report.words import amount, is_number, number, plural, policy_name, spaced, volts

__all__ = ["curves", "energy_and_time", "moves", "nodes", "policies", "required_time"]

Record = Mapping[str, Any]
INFEASIBLE = "infeasible"


def _advantage(record: Record, value: Any, reason: str = "") -> str:
    """Print an advantage with its place against 1 and M in words and a symbol."""
    if not is_number(value):
        return f"{INFEASIBLE}: {reason}" if reason else INFEASIBLE
    limits = [level for level, _ in levels(record)]
    shown = number(value, 2, limits)
    if value >= record["study"]["required_advantage"]:
        return f"▲ {shown}, reaches {number(record['study']['required_advantage'], 3)}"
    if value >= 1.0:
        return f"■ {shown}, better, below {number(record['study']['required_advantage'], 3)}"
    return f"▼ {shown}, not better"


def curves(figure: Figure, ribbons: Figure) -> Section:
    """Return the swept curves and what limits them."""
    return Section("curves", "Energy against time", (figure, ribbons))


def _outlook(record: Record) -> list[Block]:
    """Return the candidate's sets side by side: what each stands for, and which one the verdict is made on."""
    beside = record.get("outlook", ())
    if not beside:
        return []
    primary = record["policies"][0]
    side = next(side for side in record["sides"] if side["role"] == "candidate")
    judged = [side["title"], f"{side['ambition']}: carries the verdict", _advantage(record, primary["advantage"])]
    judged += [primary["strongest"] or INFEASIBLE, *_place(primary["candidate"]["point"] or {})]
    rows = [judged]
    for row in beside:
        shown = _advantage(record, row["advantage"], row["why"])
        rows.append([row["title"], row["ambition"], shown, row["strongest"] or INFEASIBLE, *_place(row)])
    columns = ("set of the candidate", "stands for", "advantage", "strongest contender", "supply", "time", "energy")
    caption = "The candidate's sets under the primary policy, at the headline pair"
    return [plain("outlook", caption, columns, rows, wide=True)]


def _place(point: Mapping[str, Any]) -> list[str]:
    if not is_number(point.get("energy")):
        return [INFEASIBLE] * 3
    return [volts(point["supply"], 3), amount(point["time"], "s", 3), amount(point["energy"], "J", 3)]


def required_time(record: Record, figure: Figure) -> Section:
    """Return the advantage for other required times, crossings in words."""
    blocks: list[Block] = [Paragraph(text) for text in crossing_words(record)]
    return Section("required-time", "Advantage against required time", (*blocks, figure))


def _limits(record: Record) -> Table:
    primary = record["policies"][0]
    rows = []
    for role, side in (("candidate", primary["candidate"]), *(("contender", side) for side in primary["contenders"])):
        point = side["point"]
        if point is None:
            why = f"{INFEASIBLE}: {side.get('why') or 'no permitted point'}"
            rows.append((side["id"], role, why, *["–"] * 7))
            continue
        delay = f"{point['delay_limit']}, {number(100 * point['delay_shares'].get(point['delay_limit'], 0.0))} %"
        energy = f"{point['energy_limit']}, {number(100 * point['energy_shares'].get(point['energy_limit'], 0.0))} %"
        rows.append(
            (
                Cell(side["id"], anchor_of(record, role, side["id"])),
                role,
                volts(point["supply"], 3),
                amount(point["time"], "s", 3),
                amount(point["energy"], "J", 3),
                amount(point["leakage_power"], "W", 3),
                amount(point["area"], "m^2", 3),
                amount(point["power_density"], "W/m^2", 3),
                delay,
                energy,
            )
        )
    columns = (
        *("side", "role", "supply", "time per operation", "energy per operation", "leakage power", "area"),
        *("power density", "delay limited by", "energy mostly"),
    )
    return plain("design-points", "Design points of the primary policy", columns, rows, wide=True)


def energy_and_time(record: Record, time: Figure, energy: Figure) -> Section:
    """Return where time and energy go."""
    return Section("parts", "Where time and energy go", (time, energy, _limits(record), *_outlook(record)))


def _policy_cell(side: Mapping[str, Any] | None) -> list[str]:
    if side is None or side["point"] is None:
        why = (side or {}).get("why") or "no permitted point"
        return [f"{INFEASIBLE}: {why}", INFEASIBLE, INFEASIBLE]
    point = side["point"]
    return [volts(point["supply"], 3), amount(point["time"], "s", 3), amount(point["energy"], "J", 3)]


def _contenders(record: Record) -> Table:
    """Return the advantage over each contender, one column per policy."""
    names = [policy_name(policy["policy"]) for policy in record["policies"]]
    rows = []
    for position, side in enumerate(record["policies"][0]["contenders"]):
        found = [policy["contenders"][position] for policy in record["policies"]]
        rows.append((side["id"], *(_advantage(record, one["advantage"], one.get("why", "")) for one in found)))
    caption = "Advantage over each contender, each at its own design point"
    return plain("contenders", caption, ("contender", *names), rows, wide=True)


def policies(record: Record) -> Section:
    """Return every policy asked for; diagnostic ones say so."""
    rows = []
    for position, policy in enumerate(record["policies"]):
        strongest = next((side for side in policy["contenders"] if side["id"] == policy["strongest"]), None)
        role = "diagnostic, not a verdict" if policy["diagnostic"] else "primary" if position == 0 else "robustness"
        name = Cell(policy_name(policy["policy"]), small=role)
        reason = policy["candidate"].get("why", "") if not policy["candidate"]["feasible"] else ""
        rows.append(
            (
                name,
                _advantage(record, policy["advantage"], reason),
                policy["strongest"] or f"{INFEASIBLE}: no contender has a permitted point",
                *_policy_cell(policy["candidate"]),
                policy["candidate"]["at"] or INFEASIBLE,
                *_policy_cell(strongest),
            )
        )
    columns = (
        *("policy", "advantage over the strongest", "strongest contender", "candidate supply", "candidate time"),
        *("candidate energy", "candidate optimum lies", "reference supply", "reference time", "reference energy"),
    )
    blocks: list[Block] = []
    diagnostic = [policy for policy in record["policies"] if policy["diagnostic"]]
    if any("topology" in policy for policy in diagnostic):
        text = (
            f"same netlist is the primary policy with the circuit {record['study']['circuit']} on every side; the "
            "verdict rests on each side in the circuit of its own choice."
        )
        blocks.append(Notice(text, "Beside it:"))
    if any("topology" not in policy for policy in diagnostic):
        text = "same supply for both sides is shown to compare with other texts; it never gives a verdict."
        blocks.append(Notice(text, "Diagnostic:"))
    held = [policy for policy in record["policies"] if not policy["diagnostic"]]
    reach = sum(is_number(p["advantage"]) and p["advantage"] >= record["study"]["required_advantage"] for p in held)
    blocks.append(Paragraph(f"The best estimate reaches the required advantage under {reach} of {len(held)} policies."))
    blocks.append(plain("policies", "Answer under every policy, fixed before the run", columns, rows, wide=True))
    blocks.append(_contenders(record))
    return Section("policies", "Other policies: robustness", tuple(blocks))


def _moved(record: Record, row: Mapping[str, Any], end: str) -> str:
    value = row[f"advantage_{end}"]
    if value is None:
        return NOT_PERMITTED
    return number(value, 3, [level for level, _ in levels(record)])


def _move_row(record: Record, row: Mapping[str, Any]) -> tuple[Any, ...]:
    owner, _, name = row["key"].rpartition(".")
    unit = row["unit"]
    best = spaced(row["best"], unit) if is_number(row["best"]) else "as stated"
    if row["ranged"]:
        found = " and ".join(spaced(value, unit) for value in flips_of(row))
        moved = [spaced(row["low"], unit), spaced(row["high"], unit)]
        moved += [_moved(record, row, "low"), _moved(record, row, "high")]
        moved.append(found or ("not found" if row["straddles"] else "does not flip"))
    else:
        moved = ["no range stated", "no range stated", "–", "–", "–"]
    decisive = "decisive" if row["decisive"] else "no"
    return (Cell(name.replace("_", " "), small=owner), row["evidence"], best, *moved, decisive)


def moves(record: Record, figure: Figure) -> Section:
    """Return what moves the answer: chart, and all inputs with flip values."""
    verdict = record["verdict"]
    columns = (
        *("input", "evidence", "best estimate", "low", "high", "advantage at low", "advantage at high"),
        *("answer flips at", "decisive"),
    )
    rows = [_move_row(record, row) for row in verdict["moves"]]
    caption = "Inputs that move the result, each alone, both sides re-optimised; largest swing first"
    table = plain("moves", caption, columns, rows, wide=True, empty="No input moves the result.")
    counts = (
        f"{plural(verdict['inputs_with_effect'], 'input')} move the result; {verdict['inputs_without_range']} of them "
        f"have no stated range; {verdict['inputs_of_judgement']} are judgement or invented; "
        f"{plural(len(verdict['without_effect']), 'input')} moved without effect."
    )
    complete = [
        Bullets(tuple(verdict[key]), title)
        for key, title in (("conditions", "All conditions"), ("measure_next", "All to be measured before deciding"))
        if verdict[key]
    ]
    blocks = (Paragraph(counts), figure, table, *_elasticities(record), *complete)
    return Section("moves", "What moves the answer", blocks)


def _elasticities(record: Record) -> list[Block]:
    """Return the elasticities, the steepest first; they are physics, and no measure of how much an input matters."""

    def steepness(row: Mapping[str, Any]) -> float:
        known = [abs(row[name]) for name in ("reoptimised", "at_point") if is_number(row[name])]
        return -max(known, default=0.0)

    names = ("at_point", "reoptimised", "of_time", "of_energy")
    rows = []
    for row in sorted(record.get("elasticities", ()), key=steepness):
        owner, _, name = row["key"].rpartition(".")
        shown = [number(row[key], 2) if is_number(row[key]) else "not defined" for key in names]
        rows.append((Cell(name.replace("_", " "), small=owner), *shown))
    if not rows:
        return []
    columns = ("input", "of the advantage, at the points", "of the advantage, re-optimised", "of time", "of energy")
    caption = "Elasticities d ln y / d ln x at the best estimate: per cent per per cent"
    text = (
        "At the points: supplies stay. Re-optimised: each side finds its best supply again. Time and energy: of the "
        "side the input belongs to (of the candidate for shared ones), at its point. A steep input with a narrow range "
        "matters less than a flat one with a wide range: decide by the table above."
    )
    return [plain("elasticities", caption, columns, rows, wide=True), Paragraph(text)]


def _node_side(row: Mapping[str, Any], side: str) -> list[str]:
    supply, time, energy = (row[f"{side}_{name}"] for name in ("supply", "time", "energy"))
    shown = [volts(supply, 3), amount(time, "s", 3), amount(energy, "J", 3)]
    return shown if is_number(energy) else [INFEASIBLE] * 3


def _pair(record: Record, position: int, steps: Sequence[Figure]) -> Group:
    """Return one node pair: both sides, and the step into it."""
    row = record["nodes"][position]
    sides = [
        ("candidate", f"node {row['candidate_node']}", *_node_side(row, "candidate")),
        ("reference", row["strongest"] or INFEASIBLE, *_node_side(row, "reference")),
    ]
    columns = ("side", "node or strongest contender", "supply", "time", "energy")
    caption = f"{row['label']}: advantage {_advantage(record, row['advantage'], row['note'])}"
    table = plain(f"pair-{position + 1}-sides", caption, columns, sides)
    into = [
        figure
        for step, figure in zip(record.get("node_steps", ()), steps, strict=False)
        if step["after"] == row["label"]
    ]
    return Group(f"pair-{position + 1}", row["label"], (table, *into))


def nodes(record: Record, figure: Figure, steps: Sequence[Figure]) -> Section:
    """Return the primary policy at every node pair, and each pair by itself with the step into it."""
    rows = [
        (
            Cell(row["label"], f"#pair-{position}", small=f"candidate node {row['candidate_node']}"),
            _advantage(record, row["advantage"], row["note"]),
            row["strongest"] or INFEASIBLE,
            *_node_side(row, "candidate"),
            *_node_side(row, "reference"),
        )
        for position, row in enumerate(record["nodes"], start=1)
    ]
    columns = (
        *("node", "advantage", "strongest contender", "candidate supply", "candidate time", "candidate energy"),
        *("reference supply", "reference time", "reference energy"),
    )
    table = plain("nodes", "Primary policy at every node pair", columns, rows, wide=True)
    groups = tuple(_pair(record, position, steps) for position in range(len(record["nodes"])))
    blocks: list[Block] = [figure, table]
    if len(groups) < 2:  # nothing between nodes: the one chart says so
        blocks += steps
    return Section("nodes", "Nodes", (*blocks, Groups("pair", "Node pair shown", groups)))
