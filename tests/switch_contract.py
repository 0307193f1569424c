"""What every device model must return, whatever its physics."""

from __future__ import annotations

import numpy as np

from benchmark.devices.record import Switch, SwitchPair

FIELDS = (
    "resistance",
    "switching_level",
    "on_current",
    "off_current_path",
    "off_current_input_high",
    "off_current_input_low",
    "off_current_body",
    "input_charge",
    "input_capacitance_delay",
    "terminal_capacitance",
    "terminal_capacitance_delay",
    "extra_energy",
    "closing_time",
    "opening_time",
    "natural_frequency",
    "quality",
    "closing_voltage",
    "opening_voltage",
    "area",
    "height",
    "bias_power",
    "retention",
)
UNKNOWN_ALLOWED = {"natural_frequency", "quality", "area", "height", "retention"}


def _inside(switch: Switch, shape: tuple[int, ...]) -> np.ndarray:
    inside = np.full(shape, True)
    for mask in switch.outside.values():
        inside &= ~np.broadcast_to(mask, shape)
    return inside


def check_pair(pair: SwitchPair, tolerance: float = 1e-12) -> None:
    """Shapes, signs and the identities between the current law and the scalar fields."""
    for switch, polarity in ((pair.down, "down"), (pair.up, "up")):
        assert switch.polarity == polarity
        shape = np.broadcast_shapes(
            pair.supply.shape, pair.temperature.shape, *(np.shape(getattr(switch, name)) for name in FIELDS)
        )
        inside = _inside(switch, shape)
        for name in FIELDS:
            value = getattr(switch, name)
            assert isinstance(value, (np.ndarray, np.float64)), name
            assert value.dtype == np.float64, name
            full = np.broadcast_to(value, shape)
            if name not in UNKNOWN_ALLOWED:
                assert np.isfinite(full[inside]).all(), name
                assert (full[inside] >= 0.0).all(), name
        for stack in (switch.stack_on, switch.stack_off):
            full = np.broadcast_to(stack, (*shape, stack.shape[-1]))
            assert np.allclose(full[..., 0][inside], 1.0, rtol=1e-12)
            assert np.isfinite(full[inside]).all()
        assert (np.diff(np.broadcast_to(switch.stack_on, (*shape, switch.stack_on.shape[-1])))[inside] > 0.0).all()
        assert (np.diff(np.broadcast_to(switch.stack_off, (*shape, switch.stack_off.shape[-1])))[inside] < 0.0).all()
        _check_current(pair, switch, shape, inside, tolerance)


def _check_current(
    pair: SwitchPair, switch: Switch, shape: tuple[int, ...], inside: np.ndarray, tolerance: float
) -> None:
    supply = np.broadcast_to(pair.supply, shape)[..., None]
    share = np.linspace(0.0, 1.0, 23)
    current = np.broadcast_to(switch.current(share * supply, supply), (*shape, share.size))[inside]
    assert np.isfinite(current).all()
    assert (current >= 0.0).all()
    assert (np.diff(current) >= -1e-12 * current[:, 1:]).all(), "current falls with the control voltage"
    on = np.broadcast_to(switch.on_current, shape)[inside]
    off = np.broadcast_to(switch.off_current_path, shape)[inside]
    np.testing.assert_allclose(current[:, -1], on, rtol=tolerance)
    np.testing.assert_allclose(current[:, 0], off, rtol=tolerance)
    across = np.broadcast_to(switch.current(supply, share * supply), (*shape, share.size))[inside]
    assert (across[:, 0] == 0.0).all()
    assert (np.diff(across) > 0.0).all(), "current of the closed switch does not rise with the path voltage"
    for mask in switch.outside.values():
        assert mask.dtype == np.bool_
        np.broadcast_to(mask, shape)
