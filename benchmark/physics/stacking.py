"""Leakage of open switches and current of closed ones in series, from the balance of currents (layer 3).

In a stack of k like devices the same current flows through all of them; the internal nodes settle so that it does.
For transistors an open stack leaks far less than one device divided by k (the nodes lift the sources of the upper
devices); ohmic open switches give exactly 1/k. The usual closed form of the two-stack neglects the drain term and
gives 1 without drain-induced barrier lowering where the balance gives 1.75.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "Balance",
    "Law",
    "Number",
    "series_balance",
    "subthreshold_current",
    "two_stack_reduction",
]

Array = NDArray[np.float64]
Number = float | Array
#: current, derivative by control voltage, derivative by path voltage, all as functions of (control, path)
Law = Callable[[Array, Array], tuple[Array, Array, Array]]

#: smallest output conductance reckoned with [S], so that a saturated top device does not divide by zero
TINY = 1.0e-300
#: Newton steps; 5 to 8 reach rounding, the rest is margin
STEPS = 25
#: largest change of ln(path voltage) in one step
LONGEST = 1.5
#: largest difference of ln(current) of a device from the common one that counts as balanced
BALANCED = 3.0e-6


@dataclass(frozen=True)
class Balance:
    """Current through the stack [A] and voltage across each device [V], rail side first (trailing axis k)."""

    current: Array
    across: Array


def two_stack_reduction(barrier_lowering: Number, swing: Number, supply: Number) -> Number:
    """Return the closed form of single over two-stack leakage, 10^(eta V (1 + eta) / ((1 + 2 eta) S)) [1].

    eta [V/V], S [V/decade], V [V]. Neglects the drain term 1 - exp(-V_DS/phi): wrong (1) at eta = 0. From memory,
    Weste and Harris, CMOS VLSI Design, 4th ed. (2011); Narendra et al., ISLPED 2001. For comparison only.
    """
    eta = barrier_lowering
    return np.power(10.0, eta * supply * (1.0 + eta) / ((1.0 + 2.0 * eta) * swing))


def subthreshold_current(scale: Number, swing: Number, barrier_lowering: Number, thermal_voltage: Number) -> Law:
    """Return the textbook law I = I_0 10^((V_GS + eta V_DS)/S) (1 - exp(-V_DS/phi)) with its derivatives.

    ``scale``: I_0 [A]; S [V/decade], eta [V/V], phi [V]. Source as for ``two_stack_reduction``, from memory.
    """
    per_volt = np.log(10.0) / swing

    def law(control: Array, path: Array) -> tuple[Array, Array, Array]:
        gain = scale * np.exp(per_volt * (control + barrier_lowering * path))
        rest = np.exp(-path / thermal_voltage)
        current = -gain * np.expm1(-path / thermal_voltage)
        by_path = per_volt * barrier_lowering * current + gain * rest / thermal_voltage
        return current, per_volt * current, by_path

    return law


def series_balance(
    law: Law,
    control: Number,
    supply: Array,
    count: int,
    start: list[Array] | None = None,
    access: tuple[Number, Number] = (0.0, 0.0),
) -> Balance:
    """Return the current of ``count`` like devices in series, all controls at ``control``, ``supply`` across the stack.

    Parameters
    ----------
    law : callable
        ``law(control, path)`` -> current [A], its derivatives by control and by path voltage [S]; the control of a
        device counts from its own source. Must be positive for path > 0 and rise with both voltages.
    control : array_like
        Control voltage of every device against the lower rail [V]: 0 for open, the supply for closed devices.
    supply : array_like
        Voltage across the stack [V], > 0; sets the shape.
    count : int
        Number of devices, >= 1.
    start : list of array, optional
        First guess of the voltages across the lower devices, rail side first [V]; equal shares when absent.
    access : pair of array_like
        Resistance at the source and at the drain of every device [ohm], outside ``law``.

    Notes
    -----
    Newton steps on the logarithms of the current and of the voltage across each device. The linear system is solved by
    one sweep up the stack: each device's step is linear in the step of the common current. A step that raises the worst
    imbalance is cut to a quarter. The accepted step is added to the answer, whose error is of the order of
    ``BALANCED`` squared. Every element stops on its own; one that does not converge is nan.
    """
    whole = np.asarray(supply, dtype=np.float64)
    lower = [whole / count] * (count - 1) if start is None else [np.minimum(s, 0.9 * whole / count) for s in start]
    across = [*lower, whole - sum(lower)]
    total = count * (access[0] + np.asarray(access[1]))
    state = [*(np.log(voltage) for voltage in across), _first_current(law, control, across[0], total, whole)]
    best, steps = state, [np.zeros_like(whole)] * (count + 1)
    worst, damping = np.full_like(whole, np.inf), np.ones_like(whole)
    done = np.zeros(whole.shape, dtype=bool)
    for _ in range(STEPS):
        # a law that does not rise may overflow; its elements end as nan
        with np.errstate(over="ignore", invalid="ignore"):
            new_steps, imbalance = _newton_steps(law, control, state, whole, access)
        better = ~(imbalance > worst) & ~done
        damping = np.where(better, np.minimum(1.0, 4.0 * damping), 0.25 * damping)
        best = [np.where(better, new, old) for new, old in zip(state, best, strict=True)]
        steps = [np.where(better, new, old) for new, old in zip(new_steps, steps, strict=True)]
        worst = np.where(better, imbalance, worst)
        done |= (worst <= BALANCED) | np.isnan(imbalance)
        if done.all():
            break
        state = [old + np.clip(damping * step, -LONGEST, LONGEST) for old, step in zip(best, steps, strict=True)]
    answer = [np.exp(np.where(done, log + step, np.nan)) for log, step in zip(best, steps, strict=True)]
    return Balance(answer[-1], np.stack(answer[:-1], axis=-1))


def _first_current(law: Law, control: Number, path: Array, resistance: Array, whole: Array) -> Array:
    """Logarithm of what the lowest device would carry, at most half of what the access resistances allow."""
    current = law(np.asarray(control) + 0.0 * path, path)[0]
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        allowed = 0.5 * whole / resistance
        return np.asarray(np.log(np.minimum(current, allowed)))


def _newton_steps(
    law: Law, control: Number, state: list[Array], whole: Array, access: tuple[Number, Number]
) -> tuple[list[Array], Array]:
    """Steps of ln(voltages) and ln(current) towards equal currents and the whole voltage; worst relative imbalance."""
    *logs, log_current = state
    across, current = [np.exp(log) for log in logs], np.exp(log_current)
    per_device = current * (access[0] + np.asarray(access[1]))
    source = current * access[0]
    # voltage step of a device: fixed + per_log * (step of ln current); the sums are the step of its source
    fixed: list[Array] = []
    per_log: list[Array] = []
    fixed_sum, per_log_sum = np.zeros_like(current), np.asarray(source)
    imbalance = np.zeros_like(current)
    for path in across:
        carried, gate, drain = law(np.asarray(control - source), path)
        excess = np.log(carried) - log_current
        imbalance = np.maximum(imbalance, np.abs(excess))
        per_volt = carried / np.maximum(drain, TINY)
        fixed.append((gate / carried * fixed_sum - excess) * per_volt)
        per_log.append((1.0 + gate / carried * per_log_sum) * per_volt)
        source = source + path + per_device
        fixed_sum, per_log_sum = fixed_sum + fixed[-1], per_log_sum + per_log[-1] + per_device
    source, per_log_sum = source - current * access[0], per_log_sum - current * access[0]
    left = whole - source
    imbalance = np.maximum(imbalance, np.abs(left) / whole)
    common = (left - fixed_sum) / per_log_sum
    moves = [f + p * common for f, p in zip(fixed[:-1], per_log[:-1], strict=True)]
    # the top device takes what the others leave (its own formula cancels where its current is saturated)
    moves.append(left - sum(moves) - len(across) * per_device * common)
    return [*(move / path for move, path in zip(moves, across, strict=True)), common], imbalance
