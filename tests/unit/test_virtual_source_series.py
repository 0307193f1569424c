"""Virtual-source transistors against a stored series of circuit simulations with almost the same equations.

The series (tests/data/virtual-source-series.csv) was simulated in ngspice from sub-circuits that were written before
this program and share nothing with it: three invented pairs, 0.2 to 0.9 V. Their equations lack F_pre and V_corr, which
raise the current at small path voltages (2 % at 50 mV, nothing in saturation); so on-, off- and effective currents must
agree, and delays here must come out somewhat shorter, most near 0.35 V. What is not compared: the ring of the series,
whose gate-drain capacitances hold half of the channel, a split that this program does not make.
"""

from __future__ import annotations

import csv
import dataclasses
from pathlib import Path

import numpy as np
import pytest

from benchmark.circuits.transfer import functional, transfer_curve
from benchmark.circuits.transient import ChainLoad, chain_transient
from benchmark.devices.record import Switch, SwitchPair
from benchmark.physics import drive
from benchmark.physics import virtual_source as vs
from tests.factories import ohmic_switch

KELVIN = 300.15
FAN_OUT = 4.0


@dataclasses.dataclass(frozen=True)
class Pair:
    """Both transistors of a set; edge and junction capacitance per width [F/m]."""

    n: vs.Transistor
    p: vs.Transistor
    edge: float
    junction: float


def _transistor(width, length, c_inv, velocity, mobility, swing, delta, resistance, threshold, beta) -> vs.Transistor:
    phi = vs.thermal_voltage(KELVIN)
    return vs.Transistor(
        width=width, length=length, inversion_capacitance=c_inv, source_resistance=resistance,
        drain_resistance=resistance, velocity=velocity, mobility=mobility, threshold=threshold,
        slope_factor=vs.slope_factor(swing, KELVIN), barrier_lowering=delta, fermi_width=3.5,
        saturation_exponent=beta, thermal_voltage=phi,
    )  # fmt: skip


SETS = {
    "45-like": Pair(
        _transistor(0.4e-6, 35e-9, 0.020, 1.15e5, 0.022, 0.100, 0.13, 80e-6, 0.5184054369929391, 1.8),
        _transistor(0.6e-6, 35e-9, 0.019, 0.80e5, 0.012, 0.102, 0.14, 90e-6, 0.5165840586551139, 1.6),
        0.25e-9,
        0.50e-9,
    ),
    "14-like": Pair(
        _transistor(0.2e-6, 20e-9, 0.026, 1.10e5, 0.020, 0.070, 0.050, 130e-6, 0.40361940982830896, 1.8),
        _transistor(0.2e-6, 20e-9, 0.025, 0.95e5, 0.015, 0.071, 0.055, 140e-6, 0.40620321567878626, 1.7),
        0.32e-9,
        0.25e-9,
    ),
    "3-like": Pair(
        _transistor(0.2e-6, 13e-9, 0.030, 1.20e5, 0.016, 0.072, 0.040, 150e-6, 0.40798543247661223, 1.8),
        _transistor(0.2e-6, 13e-9, 0.030, 1.10e5, 0.014, 0.073, 0.045, 160e-6, 0.4132309535939272, 1.7),
        0.40e-9,
        0.20e-9,
    ),
}


def _rows() -> list[tuple[str, float, dict[str, float]]]:
    path = Path(__file__).parent.parent / "data" / "virtual-source-series.csv"
    with path.open(newline="", encoding="utf-8") as stream:
        return [
            (row["set"], float(row["supply_V"]), {k: float(v) for k, v in row.items() if k not in ("set", "source")})
            for row in csv.DictReader(stream)
        ]


ROWS = _rows()


def _each(*supplies: float) -> pytest.MarkDecorator:
    chosen = [row for row in ROWS if not supplies or row[1] in supplies]
    return pytest.mark.parametrize(("name", "supply", "row"), chosen, ids=[f"{n}-{v}" for n, v, _ in chosen])


each = _each()
#: where a differential equation is solved: weak, moderate and strong inversion
some = _each(0.2, 0.35, 0.5, 0.9)


def _current(t: vs.Transistor, control: float, path: float) -> float:
    return float(vs.drain_current(t, np.asarray(control), np.asarray(path)))


def _effective(t: vs.Transistor, supply: float) -> float:
    high, low = _current(t, supply, 0.5 * supply), _current(t, 0.5 * supply, supply)
    return float(drive.effective_current(high, low))


def _switch(t: vs.Transistor, supply: float, up: bool) -> Switch:
    resistance = supply / (2.0 * np.log(2.0) * _effective(t, supply))
    plain = ohmic_switch(
        polarity="up" if up else "down",
        supply=supply,
        on_resistance=resistance,
        off_resistance=supply / _current(t, 0.0, supply),
        switching_level=0.5,
    )
    return dataclasses.replace(
        plain, resistance_kind="effective", current=lambda control, path: vs.drain_current(t, control, path)
    )


def _pair(known: Pair, supply: float) -> SwitchPair:
    return SwitchPair(
        _switch(known.n, supply, False), _switch(known.p, supply, True), np.asarray(supply), np.asarray(KELVIN)
    )


@each
def test_currents(name, supply, row):
    for t, polarity in ((SETS[name].n, "n"), (SETS[name].p, "p")):
        assert _current(t, supply, supply) * 1e6 == pytest.approx(row[f"on_{polarity}_uA"], rel=1e-4)
        assert _current(t, 0.0, supply) * 1e9 == pytest.approx(row[f"off_{polarity}_nA"], rel=1e-4)
        # half the supply across the path: V_corr is almost gone
        assert _effective(t, supply) * 1e6 == pytest.approx(row[f"effective_{polarity}_uA"], rel=2e-3)


@some
def test_fan_out_4_with_lumped_capacitance(name, supply, row):
    """Delay 0 to 1.3 % shorter (V_corr); energy to 0.1 %, where leakage is small beside it."""
    known = SETS[name]
    gates = [float(t.width * (t.inversion_capacitance * t.length + 2.0 * known.edge)) for t in (known.n, known.p)]
    junctions = [float(t.width * known.junction) for t in (known.n, known.p)]
    here = chain_transient(_pair(known, supply), ChainLoad(FAN_OUT * sum(gates) + sum(junctions)))
    for delay, column in ((here.falling_delay, "falling"), (here.rising_delay, "rising")):
        assert -0.013 < delay * 1e12 / row[f"lumped_delay_{column}_ps"] - 1.0 < 1e-3
    # the series subtracts leakage as a mean power times its window: for 45-like at 0.2 V that is 64 % of the heat
    bound = {0.2: 0.03, 0.25: 6e-3, 0.3: 1.5e-3}.get(supply, 5e-4) if name == "45-like" else 1.5e-3
    assert here.switching_energy * 1e15 == pytest.approx(row["lumped_energy_fJ"], rel=bound)


@some
def test_static_curve(name, supply, row):
    pair = _pair(SETS[name], supply)
    found = functional(pair, 1, "accurate")
    crossing = transfer_curve(pair, points=401).switching_voltage.item()
    assert crossing == pytest.approx(row["switching_voltage_V"], abs=3e-4 * supply)
    assert found.noise_margin_low.item() == pytest.approx(row["noise_margin_low_V"], abs=5e-3 * supply)
    assert found.noise_margin_high.item() == pytest.approx(row["noise_margin_high_V"], abs=5e-3 * supply)
    assert found.gain.item() == pytest.approx(row["gain"], rel=7e-3)


@each
def test_leakage(name, supply, row):
    known = SETS[name]
    closed = 0.5 * supply * (_current(known.n, 0.0, supply) + _current(known.p, 0.0, supply))
    assert closed * 1e9 == pytest.approx(row["leakage_nW"], rel=3e-3)


@each
def test_closed_forms_with_charge_that_follows_the_gate(name, supply, row):
    """Delay -13 to +4 % (the steep sets -7 to +4 %), energy -3 to +5 %: what the closed forms are worth here."""
    known = SETS[name]
    capacitance = energy = slowness = 0.0
    for t in (known.n, known.p):
        width, v = float(t.width), np.float64(supply)
        ratio = _current(t, 0.75 * supply, 0.75 * supply) / _current(t, supply, 0.5 * supply)
        weight = drive.miller_weight(ratio)
        capacitance += FAN_OUT * float(drive.switching_capacitance(t, v, known.edge, weight))
        capacitance += (drive.OUTPUT_WEIGHT * known.edge + known.junction) * width
        energy += FAN_OUT * float(drive.switching_capacitance(t, v, known.edge, drive.ENERGY_WEIGHT)) * supply**2
        energy += (drive.ENERGY_WEIGHT * known.edge + known.junction) * width * supply**2
        slowness += 0.5 / _effective(t, supply)
    delay = float(drive.drive_delay(capacitance, supply, 1.0)) * slowness
    low = -0.135 if name == "45-like" else -0.07
    assert low < delay * 1e12 / row["charge_delay_ps"] - 1.0 < 0.04
    assert -0.03 < energy * 1e15 / row["charge_energy_fJ"] - 1.0 < 0.05
