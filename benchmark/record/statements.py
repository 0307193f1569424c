"""Conventions, omissions and cautions in words, with the factors in use (layer 8)."""

from __future__ import annotations

from typing import Any

from benchmark.sets.study import Study

__all__ = ["CAUTIONS", "NOT_MODELLED", "conventions"]

#: what the program leaves out, and the side that gains from it
NOT_MODELLED: tuple[dict[str, str], ...] = (
    {
        "what": "variability inside a block (threshold, pressure and resistance spread between switches)",
        "favours": "the side with the steeper switch",
    },
    {"what": "ageing and wear of contacts and films within the endurance limit", "favours": "the new switch"},
    {"what": "soft errors, radiation, security", "favours": "unknown"},
    {"what": "clock tree above the local clock drivers", "favours": "the side with the larger clock energy"},
    {
        "what": "memory, input and output of the product around the block",
        "favours": "the side with the larger advantage in logic",
    },
    {
        "what": "self-heating: all values hold at the listed ambient temperatures",
        "favours": "the side with the higher power density",
    },
    {"what": "resistance of the power grid and of vias", "favours": "the side with the lower supply"},
    {"what": "price, yield, extra masks, packaging", "favours": "the new switch"},
    {
        "what": "glitches: rising transitions beyond the stated activity",
        "favours": "the side with the larger dynamic energy",
    },
    {
        "what": "time and energy to change the supply at run time",
        "favours": "the side that gains most from supply scaling",
    },
)

CAUTIONS: tuple[str, ...] = (
    "This is an estimate from the inputs listed, not a measurement. Before a product depends on it, measure the named "
    "decisive inputs on your own samples under use conditions.",
    "Field, stress and temperature limits are those stated in the sets. High fields, high stresses and heat can hurt "
    "people and equipment: follow local codes and have work done by licensed practice.",
    "A margin above 1 in the requirements table is not a safety factor of a standard.",
)


def conventions(study: Study, factors: dict[str, Any]) -> list[dict[str, str]]:
    """Return every silent factor of two, said aloud. ``factors``: side -> delay factor F at its optimum."""
    rule = {
        "step": "ln 2 for every side (step-driven lumped RC); distributed wire 0.377 r c L^2",
        "chain": "F = max(0.60, ln 1/(1-w)) from each device's own switching level; wire (0.1 + 0.4 F) r c L^2",
        "integral": "solved from the integral of dt/(R C) along the actuator's own motion",
        "transient": "solved as a differential equation",
    }[study.delay_rule]
    sets = ", ".join(item.id for item in study.wires_sets)
    listed = ", ".join(f"{t:.6g} K" for t in study.temperatures)
    time = (
        "the clock period" if study.leakage_accounting == "period" and study.timing == "clocked" else "the path delay"
    )
    rows = [
        (
            "activity",
            "counted in rising transitions per clock cycle per net; one full cycle draws C V^2 from the supply",
        ),
        ("delay factor", rule),
        ("delay factor in use", ", ".join(f"{side}: {value}" for side, value in factors.items())),
        ("effective resistance", "50 % step delay = ln 2 R C; a current source has R = V / (2 ln 2 I_eff)"),
        ("effective current", "I_eff = [I(V, V/2) + I(V/2, V)] / 2"),
        ("leakage", f"average over input states, charged over {time}; never divided by activity"),
        (
            "short circuit",
            "charge through the opening switch while the input ramps"
            if study.short_circuit == "estimated"
            else "left out (an upper bound of what both sides reach)",
        ),
        (
            "temperature",
            f"delay at each side's slowest, leakage and energy at the highest of {listed}",
        ),
        (
            "guard-band",
            f"delay x {study.guard_band_delay:g}, leakage x {study.guard_band_leakage:g}, the same for both sides"
            + ("; 1 means none" if study.guard_band_delay == study.guard_band_leakage == 1.0 else ""),
        ),
        ("advantage", "reference / candidate for costs, so above 1 always favours the candidate"),
        (
            "wires",
            f"{sets}: the same for both sides, layout parasitic per pin likewise",
        ),
        ("registers and clock", "in, for circuits that have them; the clock net rises once per cycle"),
        (
            "idle",
            {
                "none": "not part of this study",
                "ungated": "the supply stays on: leakage, bias and overheads go on while idle",
                "gated": "power-gated on both sides with stated residual leakage and wake cost; overheads go on",
            }[study.idle],
        ),
        ("supply", "each side at its own best supply inside its own range"),
        ("operation", study.operation),
    ]
    return [{"name": name, "text": text} for name, text in rows]
