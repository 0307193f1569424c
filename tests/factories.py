"""A synthetic ohmic switch for tests of the circuits: every number of it is chosen by the test."""

from __future__ import annotations

from typing import Any, Literal

import numpy as np

from benchmark.devices.record import Array, Switch, SwitchPair


def _log_linear_current(supply: Array, on: Array, off: Array, window: tuple[float, float]) -> Any:
    """Path current of R = R_off below w1 V, R_on above w2 V, log-linear in the control voltage between."""
    low, high = window

    def current(control: Array, path: Array) -> Array:
        level = control / supply[..., None]
        share = np.clip((level - low) / (high - low), 0.0, 1.0)
        resistance = np.exp(np.log(off)[..., None] * (1.0 - share) + np.log(on)[..., None] * share)
        return np.asarray(path / resistance, dtype=np.float64)

    return current


def ohmic_switch(
    *,
    polarity: Literal["down", "up"] = "down",
    supply: Any = 1.0,
    on_resistance: Any = 1.0e4,
    off_resistance: Any = 1.0e10,
    input_capacitance: Any = 1.0e-15,
    input_capacitance_delay: Any = None,
    terminal_capacitance: Any = 0.0,
    terminal_capacitance_delay: Any = None,
    closing_time: Any = 0.0,
    opening_time: Any = 0.0,
    extra_energy: Any = 0.0,
    input_leakage: Any = 0.0,
    body_leakage: Any = 0.0,
    bias_power: Any = 0.0,
    area: Any = 1.0e-14,
    window: tuple[float, float] = (0.2, 0.8),
    switching_level: Any = None,
    partner: Literal["own", "mirrored", "mirrored-plate", "none"] = "own",
    stack_time: Literal["simultaneous", "sequential"] = "simultaneous",
    input_scales_with_size: bool = True,
    k_max: int = 6,
    **replace: Any,
) -> Switch:
    """Return one ohmic switch: k closed in series are k R_on, k open in series leak 1/k.

    All numbers may be arrays; they broadcast together. ``switching_level`` None: w2 - (w2 - w1) ln 2 / ln rho,
    where the log-linear resistance is twice the one at full control. ``replace``: any further field of ``Switch``.
    """
    v, on, off, q, c_d, t, t_d, close, opening, extra, leak, body, bias, size = (
        np.array(x)
        for x in np.broadcast_arrays(
            *(
                np.asarray(x, dtype=np.float64)
                for x in (
                    supply,
                    on_resistance,
                    off_resistance,
                    input_capacitance,
                    input_capacitance if input_capacitance_delay is None else input_capacitance_delay,
                    terminal_capacitance,
                    terminal_capacitance if terminal_capacitance_delay is None else terminal_capacitance_delay,
                    closing_time,
                    opening_time,
                    extra_energy,
                    input_leakage,
                    body_leakage,
                    bias_power,
                    area,
                )
            )
        )
    )
    low, high = window
    level = high - (high - low) * np.log(2.0) / np.log(off / on) if switching_level is None else switching_level
    k = np.arange(1.0, k_max + 1.0)
    fields: dict[str, Any] = {
        "technology": "synthetic ohmic switch",
        "polarity": polarity,
        "partner": partner,
        "resistance_kind": "path",
        "stack_time": stack_time,
        "input_scales_with_size": input_scales_with_size,
        "resistance": on,
        "switching_level": np.broadcast_to(np.asarray(level, dtype=np.float64), v.shape),
        "current": _log_linear_current(v, on, off, window),
        "on_current": v / on,
        "off_current_path": v / off,
        "off_current_input_high": leak,
        "off_current_input_low": np.zeros_like(v),
        "off_current_body": body,
        "stack_on": np.broadcast_to(k, (*v.shape, k_max)),
        "stack_off": np.broadcast_to(1.0 / k, (*v.shape, k_max)),
        "input_charge": q * v,
        "input_capacitance_delay": c_d,
        "terminal_capacitance": t,
        "terminal_capacitance_delay": t_d,
        "extra_energy": extra,
        "closing_time": close,
        "opening_time": opening,
        "natural_frequency": np.full_like(v, np.nan),
        "quality": np.full_like(v, np.nan),
        "closing_voltage": 0.5 * v,
        "opening_voltage": 0.5 * v,
        "area": size,
        "height": np.full_like(v, np.nan),
        "bias_power": bias,
        "retention": np.full_like(v, np.inf),
    }
    return Switch(**{**fields, **replace})


def ohmic_pair(*, up: dict[str, Any] | None = None, temperature: Any = 300.0, **fields: Any) -> SwitchPair:
    """Return a pair of ohmic switches; ``up`` holds what the pull-up has different from the pull-down."""
    down_switch = ohmic_switch(**{**fields, "polarity": "down"})
    up_switch = ohmic_switch(**{**fields, **(up or {}), "polarity": "up"})
    shape = np.broadcast_shapes(down_switch.resistance.shape, up_switch.resistance.shape)
    return SwitchPair(
        down=down_switch,
        up=up_switch,
        supply=np.broadcast_to(np.asarray(fields.get("supply", 1.0), dtype=np.float64), shape),
        temperature=np.broadcast_to(np.asarray(temperature, dtype=np.float64), shape),
    )
