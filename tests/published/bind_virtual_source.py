"""Check rows of the virtual-source transistor, its calibration, effective current and open stacks."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np

from benchmark.physics import calibration, drive, stacking
from benchmark.physics import virtual_source as vs
from tests.published.rows import Binding

BINDINGS: list[Binding] = []


def _bind(row: str, exercises: str, obtain: Callable[[], object], picks: tuple[int, ...] | None = None) -> None:
    """``exercises``: 'module:function' names below benchmark.physics, separated by blanks."""
    names = tuple(f"benchmark.physics.{name}" for name in exercises.split())
    BINDINGS.append(Binding(row, names, obtain, picks))  # type: ignore[arg-type]


# --- M1: sets printed in the handbook section of the model (nm, uF/cm2, ohm um, cm/s, cm2/Vs) -------------------------


def _transistor(
    gate: float,
    correction: float,
    capacitance: float,
    delta: float,
    n0: float,
    resistance: float,
    velocity: float,
    mobility: float,
    beta: float,
    kelvin: float,
    threshold: float,
    n_d: float = 0.0,
    gamma: float | None = None,
) -> vs.Transistor:
    """One micrometre wide, alpha 3.5, phi_b 1.2 V."""
    return vs.Transistor(
        width=1e-6,
        length=(gate - correction) * 1e-9,
        inversion_capacitance=capacitance * 1e-2,
        source_resistance=resistance * 1e-6,
        drain_resistance=resistance * 1e-6,
        velocity=velocity * 1e-2,
        mobility=mobility * 1e-4,
        threshold=threshold,
        slope_factor=n0,
        barrier_lowering=delta,
        fermi_width=3.5,
        saturation_exponent=beta,
        thermal_voltage=vs.thermal_voltage(kelvin),
        punch_through=n_d,
        body_factor=gamma,
        body_potential=1.2,
    )


def _default() -> vs.Transistor:
    return _transistor(80.0, 10.5, 2.2, 0.10, 1.5, 100.0, 0.765e7, 200.0, 1.7, 298.0, 0.486)


def _demo_n() -> vs.Transistor:
    return _transistor(32.0, 9.0, 2.57, 0.15, 1.68, 100.0, 1.2e7, 200.0, 1.8, 300.0, 0.4, 0.1, 0.1)


def _demo_p() -> vs.Transistor:
    return _transistor(32.0, 8.0, 2.57, 0.15, 1.68, 100.0, 7542204.0, 165.0, 1.8, 300.0, 0.5535, 0.1, 0.1)


CURRENT = "virtual_source:drain_current"
for _make, _points in (
    (
        _default,
        {"": (1, 1), ".2": (0, 1), ".3": (1, 0.5), ".4": (0.5, 1), ".5": (1, 0.05), ".6": (0.5, 0.5)},
    ),
    (_demo_n, {".7": (1, 1), ".11": (1, 0.05), ".12": (0.5, 0.5)}),
    (_demo_p, {".14": (0, 1), ".15": (1, 0.5), ".16": (0.5, 1), ".17": (1, 0.05), ".18": (0.5, 0.5)}),
):
    for _suffix, (_gate, _drain) in _points.items():
        _bind(
            f"dev.M1-Id{_suffix}",
            CURRENT,
            lambda make=_make, gate=_gate, drain=_drain: vs.drain_current(make(), np.float64(gate), np.float64(drain)),
        )

for _make, _suffixes in (
    (_default, ("", ".2", ".3")),
    (_demo_n, (".4", ".5", ".6")),
    (_demo_p, (".7", ".8", ".9")),
):
    for _suffix, _pick in zip(
        _suffixes,
        (
            lambda state: state.charge * 1e-4,  # C/m2 -> C/cm2
            lambda state: state.saturation,
            lambda state: state.saturation_voltage,
        ),
        strict=True,
    ):
        _bind(
            f"dev.M1-int{_suffix}",
            "virtual_source:channel_state",
            lambda make=_make, pick=_pick: pick(vs.channel_state(make(), np.float64(0.8), np.float64(0.6))),
        )

# --- M2: calibration on published current pairs, effective current --------------------------------------------------

#: gate length, correction [nm], C_inv [uF/cm2], delta, R [ohm um], mobility [cm2/Vs], on-current [uA/um]
PAIRS = {
    "n32": (32.0, 9.0, 2.57, 0.12, 75.0, 200.0, 1340.0),
    "p32": (32.0, 9.0, 2.57, 0.12, 75.0, 165.0, 940.0),
    "n45": (40.0, 10.0, 2.20, 0.13, 85.0, 200.0, 1150.0),
    "p45": (40.0, 10.0, 2.20, 0.13, 85.0, 150.0, 785.0),
}


def _calibrated(name: str) -> vs.Transistor:
    """On-current as listed and 100 nA/um at 1.0 V, 300 K."""
    gate, correction, capacitance, delta, resistance, mobility, on = PAIRS[name]
    template = _transistor(gate, correction, capacitance, delta, 1.40, resistance, 1e7, mobility, 1.8, 300.0, 0.4)
    return calibration.calibrate(template, calibration.Targets(1.0, on, 0.1)).applied_to(template)


def _effective(t: vs.Transistor, supply: float) -> float:
    v = np.float64(supply)
    return float(drive.effective_current(vs.drain_current(t, v, 0.5 * v), vs.drain_current(t, 0.5 * v, v)))


SOLVE = "calibration:calibrate"
for _suffix, _name in (("", "n32"), (".3", "p32"), (".5", "n45"), (".7", "p45")):
    _bind(f"dev.M2-cal{_suffix}", SOLVE, lambda name=_name: _calibrated(name).threshold)
for _suffix, _name in ((".2", "n32"), (".6", "n45"), (".8", "p45")):
    _bind(f"dev.M2-cal{_suffix}", SOLVE, lambda name=_name: np.asarray(_calibrated(name).velocity) * 100.0)
for _suffix, _name in (("", "n32"), (".2", "p32"), (".3", "n45"), (".4", "p45")):
    _bind(
        f"dev.M2-Ieff{_suffix}",
        f"drive:effective_current {CURRENT}",
        lambda name=_name: _effective(_calibrated(name), 1.0),
    )


# --- M3: stage delay C V / (2 I_eff), mean of both polarities, 3 fF -------------------------------------------------


def _mean_delay(supply: float) -> float:
    return 0.5 * sum(
        float(drive.drive_delay(3e-15, supply, _effective(_calibrated(name), supply))) for name in ("n32", "p32")
    )


for _suffix, _supply in ((".2", 1.0), (".4", 0.8), (".6", 0.6), (".8", 0.5)):
    _bind(f"dev.M3-delay{_suffix}", "drive:drive_delay", lambda supply=_supply: _mean_delay(supply))

_bind(
    "cir.IEFF",
    "drive:drive_delay drive:effective_current",
    lambda: float(drive.drive_delay(1e-15, 1.0, drive.effective_current(0.8e-3, 0.4e-3))) * 1e12,
)


# --- M5: off-current of n32 when hot; M7: switching capacitance ------------------------------------------------------


def _hot_off_current(kelvin: float) -> float:
    cold = _calibrated("n32")
    hot = replace(
        cold,
        threshold=vs.threshold_at(cold.threshold, -0.7e-3, kelvin - 300.0),
        mobility=vs.power_law(cold.mobility, -1.2, kelvin / 300.0),
        velocity=vs.power_law(cold.velocity, -0.4, kelvin / 300.0),
        thermal_voltage=vs.thermal_voltage(kelvin),
    )
    return float(vs.drain_current(hot, np.float64(0.0), np.float64(1.0)))


for _suffix, _kelvin in ((".3", 358.0), (".5", 398.0)):
    _bind(
        f"dev.M5-temp{_suffix}",
        "virtual_source:threshold_at virtual_source:power_law virtual_source:thermal_voltage",
        lambda kelvin=_kelvin: _hot_off_current(kelvin),
    )

_bind(
    "dev.M7-Cin",
    "virtual_source:channel_state",
    lambda: vs.channel_state(_calibrated("n32"), np.float64(1.0), np.float64(0.0)).charge * 1e-4,
)
#: outer fringe 1.47e-12 F/cm plus overlap 0.345e-12 F/cm x (9 nm / 2) / 1.3 nm, in F/m
EDGE = 1.47e-10 + 0.345e-10 * 4.5e-9 / 1.3e-9
_bind(
    "dev.M7-Cin.2",
    "drive:switching_capacitance",
    lambda: drive.switching_capacitance(_calibrated("n32"), np.float64(1.0), EDGE),
)

# --- open stacks -----------------------------------------------------------------------------------------------------

for _eta, _swing, _supply in ((0.1, 0.1, 1.0), (0.05, 0.08, 0.7), (0.0, 0.09, 0.7)):
    _bind(
        f"cir.STACK-eta{_eta}",
        "stacking:two_stack_reduction",
        lambda eta=_eta, swing=_swing, supply=_supply: stacking.two_stack_reduction(eta, swing, supply),
    )


def _two_stack(eta: float, swing: float, supply: float) -> list[float]:
    """Single over two-stack leakage, and the voltage of the internal node [mV]; phi = 25.852 mV."""
    law = stacking.subthreshold_current(1e-9, swing, eta, 0.025852)
    whole = np.float64(supply)
    pair = stacking.series_balance(law, 0.0, whole, 2)
    return [float(law(np.float64(0.0), whole)[0] / pair.current), float(pair.across[0]) * 1e3]


EXACT = "stacking:series_balance"
_bind("cir.STACK-exact", EXACT, lambda: _two_stack(0.1, 0.1, 1.0))
_bind("cir.STACK-exact0", EXACT, lambda: _two_stack(0.0, 0.09, 0.7))


def _ohmic(control: np.ndarray, path: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """One megohm, whatever the control."""
    return np.asarray(path * 1e-6), np.zeros_like(path), np.full_like(path, 1e-6)


_bind("cir.STACK-ohmic", EXACT, lambda: 1e-6 / float(stacking.series_balance(_ohmic, 0.0, np.float64(1.0), 2).current))
