"""Small studies for tests, as plain dictionaries and as TOML: every number of them is chosen here."""

from __future__ import annotations

import datetime
import json
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from decimal import Decimal
from pathlib import Path
from typing import Any

import pytest

from benchmark.record.load import load_study

Table = dict[str, Any]
D = Decimal

#: keys whose dictionary is written as an inline table
INLINE = {
    "spread",
    "by_node",
    "reference_temperature",
    "supply",
    "size",
    "threshold_shift",
    "temperatures",
    "temperature",
    "guard_band",
    "limit",
    "life",
    "required_time",
    "required_energy",
    "reference",
    "wire",
    "swing",
    "fixed_load",
    "floor",
    "interpolate",
}
#: keys whose list of dictionaries is written as an array of tables
ARRAYS = {"contender", "joint", "measurement", "net", "row"}


def _scalar(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, (int, Decimal)):
        return str(value)
    if isinstance(value, float):
        return repr(value)
    if isinstance(value, datetime.date):
        return value.isoformat()
    if isinstance(value, str):
        return json.dumps(value, ensure_ascii=False)
    if isinstance(value, list):
        return "[" + ", ".join(_scalar(item) for item in value) + "]"
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{_key(key)} = {_scalar(item)}" for key, item in value.items()) + " }"
    message = f"cannot write {value!r}"
    raise TypeError(message)


def _key(key: str) -> str:
    return key if key.replace("_", "").replace("-", "").isalnum() and key.isascii() else json.dumps(key)


def toml(data: Table, prefix: str = "") -> str:
    """Write a dictionary as TOML, in the order of its keys (scalars before tables, as TOML needs it)."""
    lines, tables = [], []
    for key, value in data.items():
        dotted = f"{prefix}.{_key(key)}" if prefix else _key(key)
        if isinstance(value, dict) and key not in INLINE:
            tables.append(f"[{dotted}]\n{toml(value, dotted)}")
        elif isinstance(value, list) and key in ARRAYS:
            tables += [f"[[{dotted}]]\n{toml(item, dotted)}" for item in value]
        else:
            lines.append(f"{_key(key)} = {_scalar(value)}\n")
    return "".join([*lines, *tables])


@dataclass
class Inputs:
    """Files of a study: dictionaries by path inside the folder, and raw texts (tables)."""

    study: Table
    sets: dict[str, Table] = field(default_factory=dict)
    texts: dict[str, str] = field(default_factory=dict)

    def files(self) -> dict[str, str]:
        """Every file as text."""
        written = {f"nodes/{name}.toml": toml(data) for name, data in self.sets.items()}
        return {"study.toml": toml(self.study), **written, **self.texts}

    def write(self, folder: Path) -> Path:
        """Write all files and return the study."""
        for name, text in self.files().items():
            place = folder / name
            place.parent.mkdir(parents=True, exist_ok=True)
            place.write_text(text, encoding="utf-8", newline="")
        return folder / "study.toml"

    def value_tables(self) -> Iterator[Table]:
        """Every value table of every file, for mutations."""
        for data in (self.study, *self.sets.values()):
            yield from _value_tables(data)


def _value_tables(data: Any) -> Iterator[Table]:
    if isinstance(data, dict):
        if ("value" in data and not isinstance(data["value"], dict)) or "by_node" in data:
            yield data
        else:
            for item in data.values():
                yield from _value_tables(item)
    elif isinstance(data, list):
        for item in data:
            yield from _value_tables(item)


def run(inputs: Inputs, folder: Path, *, whole: bool = False) -> dict[str, Any]:
    """Write the files, run the study, return its record with a frozen time.

    Unless ``whole``, the comparison of the closed-form delay with a solved transient is left out: it takes most of the
    time of a small study and nothing of the verdict or the summary depends on it.
    """
    from benchmark.record.run import run_study

    study, library = load_study(inputs.write(folder))
    with pytest.MonkeyPatch.context() as patch:
        if not whole:
            patch.setattr("benchmark.record.run.closed_form_differences", lambda *_: [])
        return run_study(study, library, created="2026-01-31T00:00:00Z")


def v(value: Any, unit: str = "", **more: Any) -> Table:
    """One value table."""
    table: Table = {"value": value}
    if unit:
        table["unit"] = unit
    return table | more


DEFAULT: Table = {
    "evidence": "invented",
    "source": "invented",
    "conditions": "-",
    "where": "-",
    "owner": "example team (fictional)",
}


def technology(name: str, model: str, nodes: list[str], options: Table, values: Table, **more: Any) -> Table:
    """A technology set."""
    return {
        "schema": 1,
        "id": name,
        "title": f"Invented {name}",
        "model": model,
        "nodes": nodes,
        "reference_temperature": {"value": D("25.0"), "unit": "degC"},
        "default": dict(DEFAULT),
        "option": options,
        "value": values,
        **more,
    }


def wires(name: str, nodes: list[str], resistance: str, capacitance: str, pin: str) -> Table:
    """A wires set."""
    return {
        "schema": 1,
        "id": name,
        "title": f"Invented {name}",
        "kind": "wires",
        "nodes": nodes,
        "default": dict(DEFAULT),
        "value": {
            "wire_resistance_per_length": v(D(resistance), "ohm/um"),
            "wire_capacitance_per_length": v(D(capacitance), "fF/um"),
            "layout_capacitance_per_pin": v(D(pin), "aF"),
        },
    }


def overhead() -> Table:
    """A ledger of overheads without any cost."""
    return {
        "level_shifter_energy": v(D("0.0"), "fJ"),
        "supply_efficiency": v(D("1.0")),
        "overhead_power": v(D("0.0"), "nW"),
    }


def side(name: str, low: str, high: str, **more: Any) -> Table:
    """A side with a supply range."""
    return {
        "technology": name,
        "knobs": {"supply": {"low": D(low), "high": D(high), "unit": "V"}},
        "overhead": overhead(),
        **more,
    }


# -- scenario S1: always-on hub -------------------------------------------------------------------------------


def _hub_switch(name: str, per_input: str, supply: str, leakage: str, delay: str) -> Table:
    """A switch stated directly; ``per_input`` is the capacitance of an inverter input in fF, so half per switch."""
    leaks = leakage != "0"
    return technology(
        name,
        "given",
        ["n1"],
        {"off_state": "current" if leaks else "none", "supply_dependence": "fixed-point"},
        {
            "on_resistance": v(D("1.0"), "kohm"),
            **({"open_state_current": v(D(leakage), "pA")} if leaks else {}),
            "switching_level": v(D("0.5"), "1"),
            "input_capacitance": v(D(per_input) / 2, "fF"),
            "closing_delay": v(D(delay), "ns"),
            "opening_delay": v(D(delay), "ns"),
            "declared_supply": v(D(supply), "V"),
            "footprint": v(D("0.05"), "um^2"),
        },
    )


def hub(
    *,
    activity: str = "0.02",
    idle: str = "none",
    idle_time: str = "0.99",
    contenders: tuple[str, ...] = ("fast", "low-leakage"),
    relay_delay: str = "100",
    residual: str = "0.05",
    wake: str = "3.0",
    low_leakage_delay: str = "1.0",
) -> Inputs:
    """Scenario S1: a leakage-free relay against two flavours of a transistor, at 100 kHz and depth 20."""
    supplies = {"fast": "0.6", "low-leakage": "0.7"}
    rivals = [side(name, supplies[name], supplies[name]) for name in contenders]
    candidate = side("relay", "2.0", "2.0")
    values: Table = {
        "clock_frequency": v(100, "kHz"),
        "activity": v(D(activity)),
        "logic_depth": v(20),
        "fan_out": v(1),
    }
    if idle != "none":
        values |= {"idle_time": v(D(idle_time), "s"), "active_cycles": v(1000)}
    if idle == "gated":
        # the relay leaks nothing, so it needs no sleep switch: all of no leakage is left, and waking costs nothing
        candidate["gating"] = {"residual_leakage": v(D("1.0")), "wake_energy_cycles": v(D("0.0"))}
        for rival in rivals:
            rival["gating"] = {"residual_leakage": v(D(residual)), "wake_energy_cycles": v(D(wake))}
    study: Table = {
        "schema": 1,
        "id": "hub",
        "title": "Always-on hub",
        "declared": datetime.date(2026, 1, 12),
        "owner": "example team (fictional)",
        "demonstration": True,
        "default": dict(DEFAULT),
        "product": {"class": "always-on hub", "describe": "invented"},
        "workload": {
            "operation": "one clock cycle",
            "circuit": "inverter-chain",
            "timing": "clocked",
            "leakage_accounting": "period",
            "idle": idle,
        },
        "value": values,
        "conditions": {
            "temperatures": {"values": [D("25.0")], "unit": "degC"},
            "delay_rule": "step",
            "short_circuit": "none",
            "wires": "no-wires",
            "guard_band": {"delay": D("1.0"), "leakage": D("1.0")},
        },
        "candidate": candidate,
        "contender": rivals,
        "nodes": {
            "headline": "n1",
            "pairs": [{"label": "n1", "candidate": "n1", "reference": "n1", "wires": "n1"}],
        },
        "requirements": {"deadline": {"limit": "cycle", "kind": "hard"}},
        "policy": {"primary": "minimum-energy", "also": ["declared-point"]},
        "verdict": {"required_advantage": D("1.0")},
        "search": {"supply_points": 11, "refine_relative": D("1e-6")},
    }
    sets = {
        "technologies/fast": _hub_switch("fast", "1.0", "0.6", "100", "0.1"),
        "technologies/low-leakage": _hub_switch("low-leakage", "1.0", "0.7", "1", low_leakage_delay),
        "technologies/relay": _hub_switch("relay", "0.5", "2.0", "0", relay_delay),
        "wires/no-wires": wires("no-wires", ["n1"], "0.0", "0.0", "0.0"),
    }
    used = {f"technologies/{name}" for name in ("relay", *contenders)} | {"wires/no-wires"}
    return Inputs(study, {name: data for name, data in sets.items() if name in used})


# -- a study that uses much of the program in little time -----------------------------------------------------


def _candidate() -> Table:
    return technology(
        "new-switch",
        "given",
        ["g1", "g2"],
        {"off_state": "resistance", "supply_dependence": "constant-resistance"},
        {
            "on_resistance": {
                "by_node": {"g1": D("50.0"), "g2": D("40.0")},
                "unit": "kohm",
                "spread": {"shape": "lognormal", "factor": D("1.5")},
            },
            "off_resistance": v(D("2.0e6"), "Mohm", spread={"shape": "loguniform", "low": D("5e5"), "high": D("8e6")}),
            "switching_level": v(D("0.7"), "1", spread={"shape": "uniform", "low": D("0.6"), "high": D("0.8")}),
            "input_capacitance": {
                "by_node": {"g1": D("0.10"), "g2": D("0.08")},
                "unit": "fF",
                "spread": {"shape": "normal", "percent": D("8")},
            },
            "terminal_capacitance": v(D("0.02"), "fF", evidence="target"),
            "closing_delay": v(D("0.05"), "ns"),
            "opening_delay": v(D("0.04"), "ns", spread={"shape": "normal", "sd": D("0.004")}),
            "declared_supply": v(D("0.4"), "V"),
            "footprint": v(D("0.02"), "um^2"),
            "endurance_cycles": v(D("1.0e17"), "1", bound="at-least"),
            "process_temperature": v(D("380.0"), "degC"),
            "supply_ceiling": v(D("0.9"), "V", spread={"shape": "triangular", "low": D("0.8"), "high": D("1.0")}),
        },
        valid={
            "supply": {"low": D("0.2"), "high": D("0.8"), "unit": "V"},
            "temperature": {"low": D("-40"), "high": D("125"), "unit": "degC"},
        },
    )


def _transistor() -> Table:
    return technology(
        "old-switch",
        "steep-swing",
        ["g1", "g2"],
        {"conduction": "thermionic"},
        {
            "subthreshold_swing": v(D("70.0"), "mV/decade"),
            "on_current": {
                "by_node": {"g1": D("200.0"), "g2": D("240.0")},
                "unit": "uA/um",
                "spread": {"shape": "lognormal", "ln_sd": D("0.1")},
            },
            "off_current": v(D("0.1"), "nA/um"),
            "saturation_voltage": v(D("60.0"), "mV"),
            "gate_capacitance_total": v(D("0.8"), "fF/um"),
            "drain_capacitance_share": v(D("0.4"), "1"),
            "terminal_capacitance_per_width": v(D("0.2"), "fF/um"),
            "transit_time": v(D("0.0"), "ps"),
            "unit_width": v(D("200.0"), "nm"),
            "declared_supply": v(D("0.6"), "V"),
            "footprint": v(D("0.03"), "um^2"),
        },
        valid={"supply": {"low": D("0.2"), "high": D("0.9"), "unit": "V"}},
    )


def mixed() -> Inputs:
    """Two device models, two nodes, all spread shapes, wires, guard-bands, overheads, six policies."""
    candidate = side("new-switch", "0.2", "0.8")
    candidate["overhead"] = {
        "level_shifter_energy": v(D("0.05"), "fJ"),
        "level_shifter_delay": v(D("20.0"), "ps"),
        "supply_efficiency": v(D("0.9")),
        "overhead_power": v(D("0.01"), "nW"),
    }
    study: Table = {
        "schema": 1,
        "id": "mixed",
        "title": "Mixed",
        "declared": datetime.date(2026, 1, 12),
        "owner": "example team (fictional)",
        "demonstration": True,
        "default": dict(DEFAULT),
        "product": {"class": "microcontroller", "describe": "invented"},
        "workload": {
            "operation": "one clock cycle",
            "circuit": "inverter-chain",
            "timing": "clocked",
            "leakage_accounting": "period",
            "idle": "none",
        },
        "value": {
            "clock_frequency": v(D("20.0"), "MHz", spread={"shape": "loguniform", "low": D("10.0"), "high": D("30.0")}),
            "activity": v(D("0.05"), "1", spread={"shape": "uniform", "low": D("0.02"), "high": D("0.1")}),
            "busiest_activity": v(D("1.0")),
            "duty": v(D("0.2")),
            "logic_depth": v(20),
            "fan_out": v(D("3.0")),
            "average_net_length": v(D("2.0"), "um"),
        },
        "conditions": {
            "temperatures": {"values": [D("25.0"), D("85.0")], "unit": "degC"},
            "delay_rule": "chain",
            "short_circuit": "estimated",
            "wires": "wires",
            "guard_band": {"delay": D("1.1"), "leakage": D("1.5")},
        },
        "candidate": candidate,
        "contender": [side("old-switch", "0.2", "0.9"), side("old-switch", "0.3", "0.3", id="old-switch at 0.3 V")],
        "nodes": {
            "headline": "g1",
            "pairs": [
                {"label": "g1", "candidate": "g1", "reference": "g1", "wires": "w1"},
                {"label": "g2", "candidate": "g2", "reference": "g2", "wires": "w2"},
            ],
        },
        "requirements": {
            "deadline": {"limit": "cycle", "kind": "hard"},
            "thermal_noise": {"limit": {"value": D("12.0"), "unit": "1"}, "kind": "hard"},
            "device_limits": {"limit": {"value": D("1.0"), "unit": "1"}, "kind": "hard"},
            "power_density": {"limit": {"value": D("50.0"), "unit": "W/cm^2"}, "kind": "hard"},
            "endurance": {"life": {"value": D("10.0"), "unit": "year"}, "kind": "report"},
            "process_temperature": {"limit": {"value": D("400.0"), "unit": "degC"}, "kind": "report"},
            "area": {"limit": {"value": D("4.0"), "unit": "1"}, "kind": "report"},
        },
        "policy": {
            "primary": "iso-delay",
            "also": ["declared-point", "minimum-energy", "minimum-energy-delay", "iso-energy", "same-supply"],
            "required_time": {"value": D("20.0"), "unit": "ns"},
            "required_energy": {"value": D("5.0"), "unit": "fJ"},
            "exponent": D("1.0"),
            "metric": "energy-per-operation",
        },
        "verdict": {"required_advantage": D("2.0")},
        "search": {"supply_points": 13, "refine_relative": D("1e-4")},
    }
    lines = wires("wires", ["w1", "w2"], "50.0", "0.2", "20.0")
    lines["value"]["wire_capacitance_per_length"]["spread"] = {"shape": "uniform", "low": D("0.15"), "high": D("0.25")}
    lines["value"]["wire_resistance_per_length"] = {"by_node": {"w1": D("50.0"), "w2": D("80.0")}, "unit": "ohm/um"}
    return Inputs(
        study,
        {
            "technologies/new-switch": _candidate(),
            "technologies/old-switch": _transistor(),
            "wires/wires": lines,
        },
    )


def changed(inputs: Inputs, change: Callable[[Table], None]) -> Inputs:
    """Apply a change to the study of some inputs and return them."""
    change(inputs.study)
    return inputs
