"""Closed delay and energy of the steep-swing model against its own law in a simulated chain of inverters."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from benchmark.devices.model import ModelInputs
from benchmark.devices.record import Switch
from benchmark.devices.steep_swing import MODEL

LN2 = np.log(2.0)
STAGES, MEASURED = 7, 4
#: what the module states for a drain share of 0 and of 0.8
BANDS = {0.0: ((-0.25, 0.13), (-0.01, 0.01)), 0.8: ((-0.42, 0.56), (-0.12, 0.09))}


def switch_at(swing: float, saturation: float, supply: float, share: float) -> Switch:
    values = {
        "reference_temperature": 298.15,
        "declared_supply": supply,
        "subthreshold_swing": swing,
        "on_current": 1.0,
        "off_current": 1e-7,
        "saturation_voltage": saturation,
        "gate_capacitance_total": 1.0,
        "drain_capacitance_share": share,
        "terminal_capacitance_per_width": 0.1,
        "transit_time": 0.0,
        "unit_width": 1.0,
        "series_switches_max": 1.0,
    }
    given = ModelInputs({k: np.asarray(v) for k, v in values.items()}, {"conduction": "other"}, {})
    knobs = {"threshold_shift": np.zeros(())}
    return MODEL.switch(MODEL.prepare(given), np.asarray(supply), np.asarray(298.15), knobs).down


def simulate(switch: Switch, supply: float, share: float, fan_out: float) -> tuple[float, float]:
    """Mean 50 % delay of one stage and heat of one cycle in it: sizes grow by the fan-out from stage to stage."""
    sizes = fan_out ** np.arange(STAGES)
    gate, coupled, terminal = 2.0 * (1.0 - share), 2.0 * share, 0.2
    matrix, injected = np.zeros((STAGES, STAGES)), np.zeros(STAGES)
    for k, size in enumerate(sizes):
        matrix[k, k] += size * (terminal + coupled)
        if k == 0:
            injected[0] = size * coupled
            continue
        matrix[k - 1, k - 1] += size * (gate + coupled)
        matrix[k - 1, k] -= size * coupled
        matrix[k, k - 1] -= size * coupled
    matrix[-1, -1] += sizes[-1] * fan_out * (gate + coupled)
    inverse = np.linalg.inv(matrix)
    tau = fan_out * 2.0 * LN2 * float(switch.resistance)
    half = (20.0 + 3.0 * STAGES) * tau

    def signed(control: np.ndarray, path: np.ndarray) -> np.ndarray:
        """Odd in the path voltage with terminals exchanged: the output overshoots its rails."""
        forward = switch.current(control, np.maximum(path, 0.0))
        backward = switch.current(control - np.minimum(path, 0.0), np.maximum(-path, 0.0))
        return forward - backward

    def source(t: float) -> tuple[float, float]:
        up, down = (t - 2.0 * tau) / (2.0 * tau), (t - half) / (2.0 * tau)
        slope = (0.0 < up < 1.0) * 1.0 - (0.0 < down < 1.0) * 1.0
        return supply * (np.clip(up, 0.0, 1.0) - np.clip(down, 0.0, 1.0)), slope * supply / (2.0 * tau)

    def rate(t: float, state: np.ndarray) -> np.ndarray:
        out = state[:STAGES]
        first, slope = source(t)
        into = np.concatenate(([first], out[:-1]))
        pull_down = signed(into, out)
        pull_up = signed(supply - into, supply - out)
        heat = sizes[MEASURED] * (pull_down * out + pull_up * (supply - out))[MEASURED]
        return np.concatenate((inverse @ (sizes * (pull_up - pull_down) + injected * slope), [heat]))

    start = np.array([supply if k % 2 == 0 else 0.0 for k in range(STAGES)] + [0.0])
    found = solve_ivp(rate, (0.0, 2.0 * half), start, method="LSODA", rtol=1e-7, atol=1e-10, max_step=tau / 2.0)
    delays = []
    for rising in (True, False):
        after = crossing(found.t, found.y[MEASURED] - 0.5 * supply, rising)
        delays.append(after - crossing(found.t, found.y[MEASURED - 1] - 0.5 * supply, not rising))
    leaked = float(switch.off_current_path) * supply * 2.0 * half
    return float(np.mean(delays)), float(found.y[STAGES, -1] / sizes[MEASURED]) - leaked


def crossing(time: np.ndarray, value: np.ndarray, rising: bool) -> float:
    signed_value = value if rising else -value
    at = int(np.nonzero((signed_value[:-1] < 0.0) & (signed_value[1:] >= 0.0))[0][0])
    share = signed_value[at] / (signed_value[at] - signed_value[at + 1])
    return float(time[at] + share * (time[at + 1] - time[at]))


@pytest.mark.parametrize(
    ("swing", "saturation", "supply", "share", "fan_out"),
    [
        (0.040, 0.060, 0.32, 0.0, 4.0),
        (0.020, 0.060, 0.12, 0.0, 4.0),
        (0.040, 0.060, 0.24, 0.8, 4.0),
        (0.065, 0.040, 0.52, 0.8, 1.5),
    ],
)
def test_closed_forms_stay_in_their_stated_bands(swing, saturation, supply, share, fan_out):
    switch = switch_at(swing, saturation, supply, share)
    delay, energy = simulate(switch, supply, share, fan_out)
    node = 2.0 * (switch.terminal_capacitance_delay + fan_out * switch.input_capacitance_delay)
    charge = 2.0 * (switch.terminal_capacitance * supply + fan_out * switch.input_charge)
    off_delay = float(LN2 * switch.resistance * node) / delay - 1.0
    off_energy = float(charge * supply) / energy - 1.0
    (low, high), (least, most) = BANDS[share]
    assert low <= off_delay <= high
    assert least <= off_energy <= most
