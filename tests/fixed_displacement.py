"""Scenario S8 as files: a stress-gated switch driven to a fixed displacement of 60 pm, by hand arithmetic.

V = 60 pm / d, E = C V^2 per transition with C = 0.20 fF (ln-sd 0.20), d = 200 pm/V (ln-sd 0.20); the reference spends
36 aJ (ln-sd 0.10). All spreads are log-normal and independent, so ln(advantage) is normal:

    advantage = 36 aJ / (C (60 pm / d)^2), best estimate 2.000, sd sqrt(0.20^2 + (2 0.20)^2 + 0.10^2) = 0.4583

Every number is invented. The off-state resistance is so high that leakage is below 1e-9 of the energy.
"""

from __future__ import annotations

import datetime
from decimal import Decimal as D
from typing import Any

from tests.studies import DEFAULT, Inputs, Table, side, technology, v, wires

#: what a stage spends is C V^2 times this in every row
COEFFICIENT = ("200.0", "0.20")
CAPACITANCE = ("0.20", "0.20")


def _lognormal(ln_sd: str) -> Table:
    return {"spread": {"shape": "lognormal", "ln_sd": D(ln_sd)}}


def fixed_displacement(
    coefficient: tuple[str, str] = COEFFICIENT,
    capacitance: tuple[str, str] = CAPACITANCE,
    required: str = "1.5",
    **more: Any,
) -> Inputs:
    """Return the study; ``coefficient`` in pm/V and ``capacitance`` in fF, each with its ln-sd."""
    supply = D("60.0") / D(coefficient[0])
    switch = technology(
        "film-switch",
        "stress-gated",
        ["n1"],
        {"mechanics": "stated-pressure", "pressure_law": "exponential", "complement": "mirrored-plate"},
        {
            "actuator_coefficient": v(D(coefficient[0]), "pm/V", **_lognormal(coefficient[1])),
            "pressure_per_coefficient_voltage": v(D("2.6666666666666667e19"), "Pa/m"),
            "resistance_unstressed": v(D("1.0e15"), "ohm", unusual=True),
            "resistance_slope": v(D("6.0"), "decade/GPa"),
            "stack_thickness": v(D("60.0"), "nm"),
            "stack_sound_speed": v(D("4000.0"), "m/s"),
            "input_capacitance": v(D(capacitance[0]) / 2, "fF", **_lognormal(capacitance[1])),
            "terminal_capacitance": v(D("0.0"), "fF"),
            "actuator_loss_tangent": v(D("0.0"), "1"),
            "footprint": v(D("0.01"), "um^2"),
            "breakdown_field": v(D("100.0"), "MV/m"),
            "declared_supply": v(
                supply.quantize(D("1e-15")),
                "V",
                evidence="derived",
                formula="6e-11 / actuator_coefficient",
            ),
        },
        valid={"supply": {"low": D("0.05"), "high": D("1.0"), "unit": "V"}},
    )
    reference = technology(
        "stated-reference",
        "given",
        ["n1"],
        {"off_state": "none", "supply_dependence": "fixed-point"},
        {
            "on_resistance": v(D("1.0"), "kohm"),
            "switching_level": v(D("0.5"), "1"),
            # 0.40 fF at 0.30 V: 36 aJ
            "input_capacitance": v(D("0.20"), "fF", **_lognormal("0.10")),
            "closing_delay": v(D("0.01"), "ns"),
            "opening_delay": v(D("0.01"), "ns"),
            "declared_supply": v(D("0.3"), "V"),
            "footprint": v(D("0.05"), "um^2"),
        },
    )
    study: Table = {
        "schema": 1,
        "id": "fixed-displacement",
        "title": "A film driven to a fixed displacement",
        "declared": datetime.date(2026, 1, 12),
        "owner": "example team (fictional)",
        "demonstration": True,
        "default": dict(DEFAULT),
        "product": {"class": "always-on hub", "describe": "invented"},
        "workload": {
            "operation": "one pass through the chain",
            "circuit": "inverter-chain",
            "timing": "self-timed",
            "leakage_accounting": "operation",
        },
        "value": {"activity": v(D("0.5")), "logic_depth": v(20), "fan_out": v(1)},
        "conditions": {
            "temperatures": {"values": [D("25.0")], "unit": "degC"},
            "delay_rule": "step",
            "short_circuit": "none",
            "wires": "no-wires",
            "guard_band": {"delay": D("1.0"), "leakage": D("1.0")},
        },
        "candidate": side("film-switch", "0.05", "1.0"),
        "contender": [side("stated-reference", "0.3", "0.3")],
        "nodes": {
            "headline": "n1",
            "pairs": [{"label": "n1", "candidate": "n1", "reference": "n1", "wires": "n1"}],
        },
        "requirements": {"deadline": {"limit": {"value": D("1.0"), "unit": "us"}, "kind": "hard"}},
        "policy": {"primary": "declared-point"},
        "verdict": {"required_advantage": D(required)},
        "search": {"supply_points": 11, "refine_relative": D("1e-6")},
        **more,
    }
    sets = {
        "technologies/film-switch": switch,
        "technologies/stated-reference": reference,
        "wires/no-wires": wires("no-wires", ["n1"], "0.0", "0.0", "0.0"),
    }
    return Inputs(study, sets)
