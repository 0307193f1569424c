"""Static balance of a stage's output: pull-down current against pull-up current (layer 5).

At input voltage v_in the output settles where the pull-down network carries what the pull-up network carries::

    a_down I_down(v_in + h_down, v_out) = a_up I_up(V - v_in + h_up, V - v_out)

``a`` scales one switch to its network (series: 1 / resistance ratio of the stack; parallel: number of switches).
The output is sought as z = ln(v_out / (V - v_out)): both rails are then equally well resolved, over any number of
decades of on/off ratio. In z the residual r = ln(a_down I_down) - ln(a_up I_up) never falls, because path currents
never fall with path voltage (contract of the ``Switch`` record); a device with negative differential resistance is
outside that contract and gets one of its solutions.

Hysteresis: ``current`` is read as the closing branch; the opening branch is the same law moved by
h = closing voltage - opening voltage, held at full control. A closing or opening voltage of nan means no hysteresis.

Every function takes inputs with one trailing axis more than the record's shape S.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import expit

from benchmark.devices.record import Array, Switch, SwitchPair
from benchmark.errors import UsageError

__all__ = ["Z_MAX", "Balance", "gate_balance", "record_shape"]

#: |z| beyond this counts as the rail: 2e-35 of the supply
Z_MAX = 80.0

#: halvings of the bracket of 2 Z_MAX: resolution 4e-14 in z
_HALVINGS = 52

#: elements evaluated at once; limits the memory of the temporaries of a current law
_BLOCK = 2_000_000

_NO_CURRENT = 1e-300


def record_shape(pair: SwitchPair) -> tuple[int, ...]:
    """Return the common shape S of a pair."""
    fields = (pair.supply, pair.temperature, pair.down.resistance, pair.up.resistance)
    levels = (pair.down.on_current, pair.up.on_current, pair.down.closing_voltage, pair.up.closing_voltage)
    return np.broadcast_shapes(*(np.shape(x) for x in (*fields, *levels)))


def _log_current(switch: Switch, control: Array, path: Array) -> Array:
    """Return ln I; no current at all counts as 1e-300 A."""
    columns = control.shape[-1]
    width = max(1, _BLOCK // max(1, control.size // columns))
    parts = [switch.current(control[..., i : i + width], path[..., i : i + width]) for i in range(0, columns, width)]
    current = parts[0] if len(parts) == 1 else np.concatenate(parts, axis=-1)
    return np.asarray(np.log(np.maximum(current, _NO_CURRENT)))


def _window(switch: Switch, supply: Array) -> Array:
    """Return closing minus opening voltage as a fraction of the supply, shape S + (1,)."""
    window = np.broadcast_to(switch.closing_voltage - switch.opening_voltage, supply.shape[:-1])[..., None]
    return np.asarray(np.where(np.isfinite(window), window, 0.0) / supply)


@dataclass(frozen=True)
class Balance:
    """One network pair at the output. Levels are fractions of the supply.

    ``log_ratio`` ln(a_down / a_up), ``lead_down`` and ``lead_up`` h / V: arrays of shape S + (1,) or S + (n,), where
    n is the number of inputs evaluated (several gates side by side).
    """

    pair: SwitchPair
    supply: Array
    log_ratio: Array
    lead_down: Array
    lead_up: Array

    def residual(self, level: Array, z: Array) -> Array:
        """Return r(level, z) [1] from the current laws; ``level`` and ``z`` have shape S + (n,)."""
        volts = np.broadcast_to(self.supply, z.shape)
        down = np.minimum(level + self.lead_down, 1.0) * volts
        up = np.minimum(1.0 - level + self.lead_up, 1.0) * volts
        pull_down = _log_current(self.pair.down, down, expit(z) * volts)
        pull_up = _log_current(self.pair.up, up, expit(-z) * volts)
        return np.asarray(pull_down - pull_up + self.log_ratio)

    def solve(self, level: Array) -> Array:
        """Return z of the output at each input level by bisection (52 evaluations of both currents)."""
        low = np.full(level.shape, -Z_MAX)
        high = np.full(level.shape, Z_MAX)
        for _ in range(_HALVINGS):
            middle = 0.5 * (low + high)
            residual = self.residual(level, middle)
            low, high = np.where(residual < 0.0, middle, low), np.where(residual < 0.0, high, middle)
        return np.asarray(np.where(np.isnan(residual), np.nan, 0.5 * (low + high)))

    def columns(self, chosen: list[int]) -> Balance:
        """Return the balance whose column j is column ``chosen[j]`` of this one."""

        def take(x: Array) -> Array:
            return np.asarray(x[..., chosen] if x.shape[-1] > 1 else x)

        return Balance(self.pair, self.supply, take(self.log_ratio), take(self.lead_down), take(self.lead_up))


def gate_balance(pair: SwitchPair, fan_in_down: int, fan_in_up: int, opening: str = "none") -> Balance:
    """Return the balance of a gate whose inputs move together.

    Parameters
    ----------
    pair : SwitchPair
        The pair.
    fan_in_down : int
        k switches in series in the pull-down network against k in parallel in the pull-up (a k-input NAND).
    fan_in_up : int
        k switches in series in the pull-up network against k in parallel in the pull-down (a k-input NOR).
    opening : {"none", "down", "up"}
        The switch taken on its opening branch (hysteresis).

    Notes
    -----
    All inputs together is the worst case for the weak level: k closed in series against k open in parallel. The
    series stack is scaled by its closed resistance ``stack_on`` over the whole curve; while it opens it would leak
    less (``stack_off``), which only helps the strong level.
    """
    known = min(pair.down.stack_on.shape[-1], pair.up.stack_on.shape[-1])
    if not (1 <= fan_in_down <= known and 1 <= fan_in_up <= known):
        message = f"fan-in must be 1 to {known} for this device; found {fan_in_down} and {fan_in_up}"
        raise UsageError(message)
    shape = record_shape(pair)
    supply = np.broadcast_to(np.asarray(pair.supply, dtype=np.float64), shape)[..., None]
    stack_down = np.broadcast_to(pair.down.stack_on[..., fan_in_down - 1], shape)[..., None]
    stack_up = np.broadcast_to(pair.up.stack_on[..., fan_in_up - 1], shape)[..., None]
    log_ratio = np.log(fan_in_up / stack_down) - np.log(fan_in_down / stack_up)
    none = np.zeros_like(log_ratio)
    return Balance(
        pair,
        supply,
        log_ratio,
        _window(pair.down, supply) if opening == "down" else none,
        _window(pair.up, supply) if opening == "up" else none,
    )
