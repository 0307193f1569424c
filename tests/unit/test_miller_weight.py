"""Closed-form stage delay against a chain of inverters with nonlinear gate charge, solved as differential equations.

Charges: channel charge of each transistor at its own gate and drain voltage, split between source and drain, plus
constant edges from the gate to source and drain. Nothing of the closed form is used in the chain.
"""

from __future__ import annotations

from dataclasses import fields, replace

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from benchmark.physics import drive
from benchmark.physics import virtual_source as vs
from benchmark.physics.calibration import Targets, calibrate

STAGES = 6
FAN_OUT = 4.0


def _calibrated(template: vs.Transistor, targets: Targets) -> vs.Transistor:
    found = calibrate(template, targets)
    assert found.solved
    return found.applied_to(template)


def _planar(on: float, mobility: float) -> vs.Transistor:
    template = vs.Transistor(
        width=1.0, length=23e-9, inversion_capacitance=0.0257, source_resistance=75e-6, drain_resistance=75e-6,
        velocity=1e5, mobility=mobility, threshold=0.0, slope_factor=1.4, barrier_lowering=0.12, fermi_width=3.5,
        saturation_exponent=1.8, thermal_voltage=vs.thermal_voltage(300.0),
    )  # fmt: skip
    return _calibrated(template, Targets(1.0, on, 0.1))


def _fin(on: float, off: float, total: float, effective: float | None) -> vs.Transistor:
    template = vs.Transistor(
        width=1.0, length=21e-9, inversion_capacitance=0.025, source_resistance=140e-6, drain_resistance=140e-6,
        velocity=1e5, mobility=0.02, threshold=0.0, slope_factor=1.0193, barrier_lowering=0.0213, fermi_width=2.0,
        saturation_exponent=1.8, thermal_voltage=vs.thermal_voltage(298.15),
    )  # fmt: skip
    return _calibrated(template, Targets(0.7, on, off, effective, total, 0.16e-9))


#: n, p, capacitance of one edge [F/m], supplies [V]
PAIRS = {
    "planar 32 nm": (_planar(1340.0, 0.02), _planar(940.0, 0.0165), 0.20e-9, (0.5, 1.0)),
    "fin 7 nm regular": (
        _fin(537.0, 0.27e-3, 0.756e-9, None), _fin(466.0, 0.321e-3, 0.756e-9, 200.0), 0.16e-9, (0.35, 0.7),
    ),
    "fin 7 nm super-low": (
        _fin(720.0, 34.7e-3, 0.868e-9, None), _fin(647.0, 34.2e-3, 0.868e-9, 321.0), 0.16e-9, (0.4,),
    ),
}  # fmt: skip
CASES = [(name, supply) for name, pair in PAIRS.items() for supply in pair[3]]


def _both(n: vs.Transistor, p: vs.Transistor) -> vs.Transistor:
    """One transistor record with a leading axis of polarity."""
    values = {f.name: (getattr(n, f.name), getattr(p, f.name)) for f in fields(n)}
    joined = {name: np.array([float(a), float(b)])[:, None] for name, (a, b) in values.items() if a is not None}
    return replace(n, **joined)


class _Chain:
    """Nodes 1 to STAGES of a chain; each stage drives FAN_OUT copies of the next."""

    def __init__(self, n: vs.Transistor, p: vs.Transistor, edge: float, supply: float) -> None:
        self.t, self.edge, self.supply = _both(n, p), edge, supply

    def _swapped(self, gate: np.ndarray, drain: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Exchange source and drain where the drain is below the source."""
        reversed_ = drain < 0.0
        return reversed_, np.where(reversed_, gate - drain, gate), np.abs(drain)

    def _charges(self, entry: np.ndarray, exit_: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Charge on the input and on the output side of inverters."""
        gate, drain = np.stack([entry, self.supply - entry]), np.stack([exit_, self.supply - exit_])
        reversed_, g, d = self._swapped(gate, drain)
        state = vs.channel_state(self.t, g, d)
        wide = self.t.fermi_width * self.t.thermal_voltage
        beta = np.asarray(self.t.saturation_exponent)
        r = d / np.sqrt(state.fermi * wide**2 + (state.charge / self.t.inversion_capacitance) ** 2)
        source, drain_share = drive.charge_partition(1.0 - r * (1.0 + r**beta) ** (-1.0 / beta))
        charge = self.t.length * state.charge
        at_drain = charge * np.where(reversed_, source, drain_share)
        total = charge * (source + drain_share)
        edges = 2.0 * self.edge
        on_input = total[0] - total[1] + edges * entry + edges * (entry - exit_)
        on_output = -(at_drain[0] - at_drain[1]) + edges * (exit_ - entry)
        return on_input, on_output

    def node_charges(self, nodes: np.ndarray, source: float) -> np.ndarray:
        on_input, charge = self._charges(np.concatenate([[source], nodes[:-1]]), nodes)
        charge = charge.copy()
        charge[:-1] += FAN_OUT * on_input[1:]
        charge[-1] += FAN_OUT * self._charges(nodes[-1:], np.array([0.5 * self.supply]))[0][0]
        return charge

    def node_currents(self, nodes: np.ndarray, source: float) -> np.ndarray:
        entry = np.concatenate([[source], nodes[:-1]])
        reversed_, g, d = self._swapped(np.stack([entry, self.supply - entry]), np.stack([nodes, self.supply - nodes]))
        current = vs.drain_current(self.t, g, d)
        current = np.where(reversed_, -current, current)
        return np.asarray(current[1] - current[0])

    def delay(self, ramp: float) -> float:
        """Mean of a falling and a rising stage delay in the middle of the chain [s]."""
        step = 1e-5 * self.supply

        def slope(time: float, nodes: np.ndarray) -> np.ndarray:
            source = self.supply * min(max(time / ramp, 0.0), 1.0)
            capacitance = np.empty((STAGES, STAGES))
            for k in range(STAGES):
                moved = np.zeros(STAGES)
                moved[k] = step
                high, low = self.node_charges(nodes + moved, source), self.node_charges(nodes - moved, source)
                capacitance[:, k] = (high - low) / (2.0 * step)
            coupled = (self.node_charges(nodes, source + step) - self.node_charges(nodes, source - step)) / (2.0 * step)
            rate = self.supply / ramp if 0.0 <= time < ramp else 0.0
            return np.linalg.solve(capacitance, self.node_currents(nodes, source) - coupled * rate)

        start = self.supply * (np.arange(STAGES) % 2 == 0)
        solved = solve_ivp(
            slope, (0.0, 8.0 * ramp), start, method="LSODA", rtol=1e-5, atol=1e-6 * self.supply, max_step=ramp / 15.0
        )
        crossings = []
        for level in solved.y - 0.5 * self.supply:
            (k, *_) = np.flatnonzero(np.diff(np.sign(level)))
            crossings.append(solved.t[k] - level[k] * (solved.t[k + 1] - solved.t[k]) / (level[k + 1] - level[k]))
        delays = np.diff(crossings)
        return float(0.5 * (delays[2] + delays[3]))


def _closed_form(n: vs.Transistor, p: vs.Transistor, edge: float, supply: float) -> float:
    v = np.float64(supply)
    capacitance, slowness = 0.0, 0.0
    for t in (n, p):
        high, low = vs.drain_current(t, v, 0.5 * v), vs.drain_current(t, 0.5 * v, v)
        weight = drive.miller_weight(vs.drain_current(t, 0.75 * v, 0.75 * v) / high)
        capacitance += FAN_OUT * float(drive.switching_capacitance(t, v, edge, weight)) + 2.0 * edge
        slowness += 0.5 / float(drive.effective_current(high, low))
    return float(drive.drive_delay(capacitance, supply, 1.0) * slowness)


@pytest.mark.parametrize(("name", "supply"), CASES)
def test_closed_form_is_within_six_per_cent_of_the_chain(name: str, supply: float):
    n, p, edge, _ = PAIRS[name]
    closed = _closed_form(n, p, edge, supply)
    assert closed == pytest.approx(_Chain(n, p, edge, supply).delay(3.0 * closed), rel=0.06)
