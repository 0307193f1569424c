"""Small comparisons for tests: technologies, a study and its outcome, every number chosen by the test."""

from __future__ import annotations

import dataclasses
import datetime
import tempfile
from collections.abc import Iterable, Mapping
from decimal import Decimal
from pathlib import Path
from typing import Any

import numpy as np

from benchmark.decide.compare import Comparison, Outcome
from benchmark.decide.verdict import Verdict
from benchmark.evaluate.batch import Batch
from benchmark.record.load import load_study
from benchmark.record.run import run_study
from benchmark.sets.study import Study
from tests.studies import DEFAULT, Inputs, Table, overhead, technology, v, wires

D = Decimal
NODE = "n1"


def number(value: Any) -> Decimal:
    """Write a float with all its digits."""
    return value if isinstance(value, Decimal) else D(repr(float(value)))


def given(name: str, *, supply: Any = 0.5, options: Table | None = None, **values: Any) -> Table:
    """A switch stated directly; R, C and delays hold at every supply. SI-free: kohm, Mohm, fF, ns as in the file."""
    numbers = {
        "on_resistance": (20.0, "kohm"),
        "off_resistance": (2.0e5, "Mohm"),
        "switching_level": (0.5, "1"),
        "input_capacitance": (0.2, "fF"),
        "closing_delay": (0.0, "ns"),
        "opening_delay": (0.0, "ns"),
        "footprint": (0.02, "um^2"),
    }
    return _technology(
        name, "given", {"supply_dependence": "constant-resistance", **(options or {})}, numbers, values, supply
    )


def steep(name: str, *, supply: Any = 0.5, options: Table | None = None, **values: Any) -> Table:
    """A transistor known by swing, ceiling and floor."""
    numbers = {
        "subthreshold_swing": (70.0, "mV/decade"),
        "on_current": (200.0, "uA/um"),
        "off_current": (0.1, "nA/um"),
        "saturation_voltage": (60.0, "mV"),
        "gate_capacitance_total": (0.8, "fF/um"),
        "drain_capacitance_share": (0.0, "1"),
        "terminal_capacitance_per_width": (0.2, "fF/um"),
        "transit_time": (0.0, "ps"),
        "unit_width": (200.0, "nm"),
        "footprint": (0.03, "um^2"),
        "series_switches_max": (D(2), "1"),
    }
    return _technology(name, "steep-swing", {"conduction": "tunnelling", **(options or {})}, numbers, values, supply)


def pressed(name: str, *, supply: Any = 0.25, options: Table | None = None, **values: Any) -> Table:
    """A stress-gated switch with a stated pressure law."""
    numbers = {
        "actuator_coefficient": (300.0, "pm/V"),
        "pressure_per_coefficient_voltage": (2.6666666666666667e19, "Pa/m"),
        "resistance_unstressed": (1.0e9, "ohm"),
        "resistance_slope": (2.0, "decade/GPa"),
        "stack_thickness": (60.0, "nm"),
        "stack_sound_speed": (4000.0, "m/s"),
        "input_capacitance": (0.05, "fF"),
        "terminal_capacitance": (0.0, "fF"),
        "actuator_loss_tangent": (0.0, "1"),
        "footprint": (0.01, "um^2"),
        "breakdown_field": (6.67, "MV/m"),
    }
    chosen = {"mechanics": "stated-pressure", "pressure_law": "exponential", "complement": "mirrored-plate"}
    return _technology(name, "stress-gated", chosen | (options or {}), numbers, values, supply)


def planar(name: str, *, supply: Any = 0.9, options: Table | None = None, **values: Any) -> Table:
    """A virtual-source transistor, mirrored."""
    numbers = {
        "on_current": (1000.0, "uA/um"),
        "off_current": (10.0, "nA/um"),
        "subthreshold_swing": (90.0, "mV/decade"),
        "drain_barrier_lowering": (100.0, "mV/V"),
        "gate_length": (35.0, "nm"),
        "gate_length_correction": (5.0, "nm"),
        "inversion_capacitance": (25.0, "fF/um^2"),
        "overlap_capacitance": (0.2, "fF/um"),
        "terminal_capacitance_per_width": (0.4, "fF/um"),
        "access_resistance": (80.0, "ohm um"),
        "channel_mobility": (200.0, "cm^2/V/s"),
        "saturation_exponent": (1.8, "1"),
        "fermi_width": (3.5, "1"),
        "threshold_temperature_slope": (-0.8, "mV/K"),
        "mobility_temperature_exponent": (-1.5, "1"),
        "velocity_temperature_exponent": (-0.2, "1"),
        "unit_width": (500.0, "nm"),
        "footprint": (0.5, "um^2"),
        "series_switches_max": (D(2), "1"),
    }
    return _technology(name, "virtual-source", {"partner": "mirrored", **(options or {})}, numbers, values, supply)


def _technology(
    name: str, model: str, options: Table, numbers: Mapping[str, tuple[Any, str]], values: Table, supply: Any
) -> Table:
    """A value may be a number in the usual unit, a whole value table, or None to leave it out."""
    units = {"open_state_current": "pA", "opening_voltage": "V", "closing_voltage": "V", "supply_ceiling": "V"}
    units |= {"endurance_cycles": "1", "process_temperature": "degC", "retention_time": "s", "bias_power": "pW"}
    tables: Table = {"declared_supply": v(number(supply), "V")}
    for key, (usual, unit) in numbers.items():
        chosen = values.get(key, usual)
        if chosen is not None:
            tables[key] = dict(chosen) if isinstance(chosen, dict) else v(number(chosen), unit, unusual=True)
    for key, chosen in values.items():
        if key not in numbers and chosen is not None:
            tables[key] = dict(chosen) if isinstance(chosen, dict) else v(number(chosen), units.get(key, "fF"))
    return technology(name, model, [NODE], options, tables)


def side(name: str, low: Any, high: Any, **more: Any) -> Table:
    """A side with a supply range; ``sizes``, ``shifts`` [mV] are frozen knobs, ``costs`` change the overheads."""
    sizes, shifts = more.pop("sizes", None), more.pop("shifts", None)
    costs: Table = more.pop("costs", {})
    knobs: Table = {"supply": {"low": number(low), "high": number(high), "unit": "V"}}
    if sizes:
        knobs["size"] = {"values": [number(size) for size in sizes]}
    if shifts:
        knobs["threshold_shift"] = {"values": [number(shift) for shift in shifts], "unit": "mV"}
    return {"technology": name, "knobs": knobs, "overhead": overhead() | costs, **more}


#: values of the inverter chain; override or extend them in ``study``
CHAIN: Table = {"activity": v(D("0.05")), "logic_depth": v(20), "fan_out": v(D("1.0"))}


def study(
    candidate: Table,
    contenders: Iterable[Table],
    sets: Iterable[Table],
    *,
    values: Table | None = None,
    circuit: str = "inverter-chain",
    timing: str = "self-timed",
    accounting: str = "operation",
    idle: str = "none",
    rule: str = "step",
    short_circuit: str = "none",
    temperatures: tuple[Any, ...] = (25.0,),
    guard: tuple[Any, Any] = (1.0, 1.0),
    requirements: Table | None = None,
    policy: Table | None = None,
    required: Any = 1.0,
    points: int = 41,
    refine: Any = 1.0e-9,
    line: tuple[str, str, str] = ("0.0", "0.0", "0.0"),
    **more: Any,
) -> Inputs:
    """Files of a comparison; ``line``: wire ohm/um, fF/um and aF per pin."""
    names = [NODE]
    data: Table = {
        "schema": 1,
        "id": "comparison",
        "title": "Comparison",
        "declared": datetime.date(2026, 1, 12),
        "owner": "example team (fictional)",
        "demonstration": True,
        "default": dict(DEFAULT),
        "product": {"class": "other", "describe": "invented"},
        "workload": {
            "operation": "one operation",
            "circuit": circuit,
            "timing": timing,
            "leakage_accounting": accounting,
            "idle": idle,
        },
        "value": {**CHAIN, **(values or {})},
        "conditions": {
            "temperatures": {"values": [number(t) for t in temperatures], "unit": "degC"},
            "delay_rule": rule,
            "short_circuit": short_circuit,
            "wires": "lines",
            "guard_band": {"delay": number(guard[0]), "leakage": number(guard[1])},
        },
        "candidate": candidate,
        "contender": list(contenders),
        "nodes": {
            "headline": NODE,
            "pairs": [{"label": NODE, "candidate": NODE, "reference": NODE, "wires": NODE}],
        },
        "requirements": requirements or {},
        "policy": {"primary": "minimum-energy", **(policy or {})},
        "verdict": {"required_advantage": number(required)},
        "search": {"supply_points": points, "refine_relative": number(refine)},
        **more,
    }
    files = {f"technologies/{item['id']}": item for item in sets}
    return Inputs(data, {**files, "wires/lines": wires("lines", names, *line)})


def load(inputs: Inputs, drop: Iterable[str] = ()) -> Study:
    """Write, read and check a study; ``drop``: values of the chain that this circuit does not use."""
    for name in drop:
        del inputs.study["value"][name]
    with tempfile.TemporaryDirectory() as folder:
        return load_study(inputs.write(Path(folder)))[0]


def record(inputs: Inputs) -> dict[str, Any]:
    """Run a study as the command does."""
    with tempfile.TemporaryDirectory() as folder:
        loaded, library = load_study(inputs.write(Path(folder)))
        return run_study(loaded, library, created="2026-01-31T00:00:00Z")


def compare(loaded: Study, policy: str | None = None, batch: Batch | None = None) -> Outcome:
    """Outcome at the headline pair."""
    return comparison(loaded, batch).outcome(policy or loaded.policy.primary)


def comparison(loaded: Study, batch: Batch | None = None) -> Comparison:
    """Comparison at the headline pair."""
    return Comparison(loaded, loaded.pair(loaded.headline), batch or Batch.best_estimate())


def advantage(inputs: Inputs | Study, policy: str | None = None) -> float:
    """Advantage of the best estimate."""
    loaded = load(inputs) if isinstance(inputs, Inputs) else inputs
    return float(compare(loaded, policy).advantage[0])


def verdict(inputs: Inputs | Study) -> Verdict:
    """Verdict of the primary policy."""
    from benchmark.record.run import _primary, _verdict

    loaded = load(inputs) if isinstance(inputs, Inputs) else inputs
    return _verdict(loaded, _primary(loaded))


def moved(loaded: Study, key: str, si: float) -> Study:
    """The same study with one value of a technology, of the study or of the wires put to another number (SI)."""
    owner, _, name = key.rpartition(".")

    def put(values: Mapping[str, Any]) -> dict[str, Any]:
        return {**values, name: dataclasses.replace(values[name], si=np.array([si]))}

    def on(side: Any) -> Any:
        if side.technology.id != owner:
            return side
        return dataclasses.replace(
            side, technology=dataclasses.replace(side.technology, values=put(side.technology.values))
        )

    if owner == "study":
        return dataclasses.replace(loaded, values=put(loaded.values))
    return dataclasses.replace(
        loaded, candidate=on(loaded.candidate), contenders=tuple(on(side) for side in loaded.contenders)
    )
