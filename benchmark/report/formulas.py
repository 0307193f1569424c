"""Formulas behind the marks of the charts (layer 9): one row per kind of number, which data rows point to."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

from benchmark.report.blocks import Cell, Table, plain

__all__ = ["FORMULAS", "PARTS", "formula_of_part", "formulas"]

Record = Mapping[str, Any]

#: key -> name, formula, what stands in it
FORMULAS: dict[str, tuple[str, str, str]] = {
    "time": (
        "time per operation",
        "T = g Σ k t + t of the level shifters",
        "over the nets of the critical path: k stages like this net, t the mean delay of both edges by the delay rule "
        "of the study; g the guard-band of delays",
    ),
    "energy": (
        "energy per operation",
        "E = (Σ n a E of one net + leakage + bias and overheads + idle) / η + level shifters",
        "over all nets: n nets alike, a rising transitions per operation; η the efficiency of the supply",
    ),
    "advantage": (
        "advantage",
        "A = X of the reference / X of the candidate",
        "X the metric of the study, each side at its own supply under the named policy; the reference is the "
        "strongest contender there",
    ),
    "envelope": (
        "reference, lower envelope",
        "least E of all contenders' feasible points that need at most T",
        "no contender has a feasible swept point that is as fast with less energy",
    ),
    "margin": (
        "requirement margin",
        "offered / demanded where the demand is a least value, demanded / offered where it is a most value",
        "at the candidate's primary design point; the meaning stands beside each requirement",
    ),
    "limit": (
        "what limits",
        "largest part of T, largest part of E",
        "parts as in the rows below, at every swept supply",
    ),
    "swing": (
        "input moved alone",
        "A at the low and at the high end of its range",
        "everything else at its best estimate, both sides re-optimised",
    ),
    "ladder": (
        "rung of a ladder",
        "A with the mitigations of this rung and of those before it",
        "each side at its own supply under the primary policy, with fewer choices than the study offers",
    ),
    "draws": (
        "distribution of the advantage",
        "share of draws with A at most this",
        "every input with a stated range drawn from it, both sides re-optimised in every draw",
    ),
    "step": (
        "step between nodes",
        "factor = exp(mean of the changes of ln A)",
        "the values of a cause put in place in one order and in the opposite one, both sides re-optimised",
    ),
    "break-even": (
        "break-even and required value",
        "x at which A(x) = 1, or A(x) = the required advantage",
        "everything else at its best estimate or as the row says, both sides re-optimised at every x; solved to 1e-13 "
        "in ln A",
    ),
    "change": (
        "part of a change",
        "mean over all orders of the change of ln A",
        "the changed inputs put in place one after another in every order, both sides re-optimised each time; the "
        "parts add up to ln(A after / A before)",
    ),
}

#: formulas of what is not in every record -> where it stands in a record
ON_REQUEST = {"break-even": "need", "change": "change"}

#: part as the record names it -> formula, what stands in it
PARTS: dict[str, tuple[str, str]] = {
    "transit": ("g Σ k t of transit", "the slower of closing and opening, independent of the load"),
    "device RC": ("g Σ k F R (C of own terminals + C of driven inputs)", "R of the driving path, F the delay factor"),
    "wire": (
        "time: g Σ k (F R C + F r C of driven inputs + W r C); energy: Σ n a V² C",
        "r and C of the wire, W its distributed factor, V² as rail times swing",
    ),
    "layout and fixed load": (
        "time: g Σ k F R C; energy: Σ n a V² C",
        "C of pins in the layout, fixed loads and repeater spread",
    ),
    "level shifter": ("as stated by the study", "delay of the level shifters"),
    "device": ("Σ n a V (Q of driven inputs + C V of own terminals)", "charge over the full swing"),
    "losses beyond charge": ("Σ n a E of losses", "what the switch itself loses in a cycle beyond its charge"),
    "short circuit": ("Σ n a V J × ramp", "J the average current of the opening switch while the input ramps"),
    "leakage": ("P of leakage × T charged", "averaged over input states; T the clock period or the path delay"),
    "idle": (
        "power-gated: ((ρ (P of leakage + P of bias) + P of overheads) × idle time + wake-up) / cycles awake",
        "ρ the residual share, wake-up = cycles × C of all nets × V²; ungated: all standing power goes on",
    ),
    "bias and overheads": ("(P of bias + P of overheads) × T charged", "standing power apart from leakage"),
    "supply loss": ("E drawn × (1 / η − 1)", "η the efficiency of the supply"),
    "level shifters": ("as stated by the study", "energy of the level shifters"),
}


def formula_of_part(part: str) -> str:
    """Return the key of a part's formula, fit to be part of an id."""
    return "part-" + re.sub(r"[^a-z0-9]+", "-", part.lower()).strip("-")


def formulas(record: Record) -> Table:
    """Return the formulas of the numbers the charts of this record show, each with an id ``formula-KEY``."""
    shown = dict.fromkeys(
        part
        for policy in record["policies"]
        for side in (policy["candidate"], *policy["contenders"])
        if side["point"]
        for name in ("time_parts", "energy_parts")
        for part in side["point"][name]
    )
    keys = [key for key in FORMULAS if key not in ON_REQUEST or record.get(ON_REQUEST[key])]
    rows: list[tuple[Any, ...]] = [(Cell(name), form, words) for name, form, words in (FORMULAS[key] for key in keys)]
    for part in shown:
        form, words = PARTS.get(part, ("as the device model reports it", ""))
        rows.append((Cell(part, small="part"), form, words))
        keys.append(formula_of_part(part))
    anchors = tuple(f"formula-{key}" for key in keys)
    caption = "Formulas behind the marks of the charts"
    return plain("formulas", caption, ("number", "formula", "what stands in it"), rows, wide=True, anchors=anchors)
