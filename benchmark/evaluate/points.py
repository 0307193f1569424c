"""Design points of one side: what one operation costs at each supply (layer 6).

Arrays have the shape (row, supply). Temperatures are reduced as the study says: the path delay at the slowest
temperature of the list, leakage and dynamic energy at the highest.

Energy of one operation [J]::

    E = (E_dynamic + (P_leakage + P_bias + P_overhead) T + E_idle) / efficiency + E_level_shifter

T is the clock period under period accounting and the path delay under operation accounting; where the path takes
longer than the clock period (no deadline is required) an operation lasts as long as its path. Nothing that stands goes
away while the block is idle: E_idle per operation is (P_leakage + P_bias + P_overhead) t_idle / n_active when the
supply stays on, and ([r (P_leakage + P_bias) + P_overhead] t_idle + k_wake sum(C V^2)) / n_active when it is gated
with the residual share r. Overheads (pumps, converters, drivers) lie outside the gated supply. Gating is chosen at run
time: a block that may be gated is gated where that costs less.

Parallel copies: n copies take turns, so each may take n times the time between two operations, which is then the path
delay over n; one operation takes as long as before. Every further copy adds the share k to the dynamic energy of an
operation (routing, merging), repeats the share g of the block (g = 1: all of it; less when stages are pipelined) and
takes the share h of its area::

    E_dynamic -> (1 + k (n - 1)) times;   P, sum(C V^2) -> (1 + g (n - 1)) times;   area -> (1 + h (n - 1)) times

(arithmetic of Chandrakasan, Sheng, Brodersen, JSSC 27 (1992) 473, from memory). The overhead power is repeated in
whole, the level shifters are not. Not modelled: the delay of merging. Back bias: see ``SideProblem.device_shift``; any
bias other than 0 adds its stated standing power, also while idle and gated, once per repeated share.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from benchmark.circuits.operation import OperationMetrics, estimate
from benchmark.devices.record import SwitchPair
from benchmark.evaluate.side import SideProblem
from benchmark.sets.study import Choice

__all__ = ["Points", "design_points", "with_cycle"]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]


@dataclass(frozen=True)
class Points:
    """Design points of one side; see the module docstring."""

    supply: Array
    size: float
    threshold_shift: float
    time: Array  # path delay with guard-band and level-shifter delay [s]
    time_parts: Mapping[str, Array]
    slowest_temperature: NDArray[np.intp]  # index into the study's list
    cycle: Array  # T of the energy equation [s]
    energy: Array
    energy_parts: Mapping[str, Array]
    dynamic_parts: Mapping[str, Array]  # before supply efficiency
    leakage_power: Array
    standing_power: Array  # leakage + bias + overheads
    idle_energy: Array
    area: Array
    power_density: Array
    noise_ratio: Array
    hysteresis: Array
    busiest_rising: Array
    margins: Mapping[str, Array]  # device limit name -> smallest margin over temperatures
    hard_limits: frozenset[str]  # names of the limits never to be passed; the others are flags
    infeasible: Mapping[str, Mask]  # reason -> mask, not counting the study's requirements
    capability: Mapping[str, tuple[Array, str]]  # name -> (value (row, 1), bound)
    efficiency: Array = field(default_factory=lambda: np.ones((1, 1)))
    shifter: Array = field(default_factory=lambda: np.zeros((1, 1)))
    copies: float = 1.0
    back_bias: Array = field(default_factory=lambda: np.zeros((1, 1)))  # [V], of the shape of energy
    gated: Mask = field(default_factory=lambda: np.zeros((1, 1), dtype=bool))  # power-gated while idle

    @property
    def interval(self) -> Array:
        """Shortest time between two operations [s]: the path delay shared by the copies."""
        return np.asarray(self.time / self.copies)

    @property
    def able(self) -> Mask:
        """Points at which the numbers mean something."""
        bad = np.zeros(self.energy.shape, dtype=bool)
        for mask in self.infeasible.values():
            bad |= mask
        return ~bad & np.isfinite(self.energy) & np.isfinite(self.time)


def _temperatures(problem: SideProblem, array: Array) -> Array:
    """Broadcast to (row, temperature, supply)."""
    return np.broadcast_to(array, np.broadcast_shapes(np.shape(array), (1, len(problem.study.temperatures), 1)))


def _pick(array: Array, index: NDArray[np.intp]) -> Array:
    """Take the temperature ``index`` (row, supply) of an array (row, temperature, supply)."""
    array = np.broadcast_to(array, (index.shape[0], array.shape[1], index.shape[1]))
    return np.take_along_axis(array, index[:, None, :], axis=1)[:, 0, :]


def design_points(
    problem: SideProblem,
    supply: Array,
    size: float = 1.0,
    threshold_shift: float = 0.0,
    copies: float = 1.0,
    back_bias: float = 0.0,
) -> Points:
    """Evaluate supplies of shape (row or 1, supply) for every row of the batch.

    Parameters
    ----------
    problem : SideProblem
    supply : array [V]
    size : float
        Units of width (or copies) of every switch.
    threshold_shift : float [V]
        Frozen in silicon.
    copies : float [1]
        Parallel copies.
    back_bias : float [V]
        Above 0 it is forward and lowers the threshold.
    """
    shift = problem.device_shift(threshold_shift, back_bias)
    pair = problem.switches(supply, shift, depth=problem.circuit_depth)
    short_circuit: bool | SwitchPair = problem.study.short_circuit == "estimated"
    if short_circuit and len(problem.study.temperatures) > 1:
        # energy is wanted at the highest temperature only
        short_circuit = problem.switches(supply, shift, problem.study.temperatures[-1:], depth=1)
    metrics = estimate(
        problem.circuit_at(supply, size, shift),
        pair,
        problem.wires,
        problem.study.delay_rule,
        size=size,
        size_as=problem.size_as,
        guard_delay=problem.study.guard_band_delay,
        guard_leakage=problem.study.guard_band_leakage,
        short_circuit=short_circuit,
    )
    return _reduce(problem, np.atleast_2d(supply), Choice(size, threshold_shift, copies, back_bias), pair, metrics)


def _repeated(problem: SideProblem, copies: float, name: str) -> Array:
    """Return 1 + share (n - 1), (row or 1, 1)."""
    if copies == 1.0:
        return np.ones((1, 1))
    return np.asarray(1.0 + problem.mitigation[name][:, 0, :] * (copies - 1.0))


def _reduce(problem: SideProblem, supply: Array, choice: Choice, pair: SwitchPair, metrics: OperationMetrics) -> Points:
    study = problem.study
    delay = _temperatures(problem, metrics.path_delay)
    rows = max(problem.batch.rows, supply.shape[0])
    shape = (rows, supply.shape[1])
    delay = np.broadcast_to(delay, (rows, delay.shape[1], shape[1]))
    # where a point cannot switch at some temperature the delay there is not a number; it is infeasible anyway
    slowest = np.argmax(np.where(np.isnan(delay), np.inf, delay), axis=1)
    hot = len(study.temperatures) - 1

    def at_hot(array: Array) -> Array:
        return np.broadcast_to(_temperatures(problem, array)[:, hot, :], shape)

    shifter_delay = problem.overhead.get("level_shifter_delay")
    time_parts = {name: _pick(_temperatures(problem, part), slowest) for name, part in metrics.path_delay_parts.items()}
    if shifter_delay is not None:
        time_parts["level_shifter"] = np.broadcast_to(shifter_delay[:, 0, :], shape)
    time = np.asarray(sum(time_parts.values()))
    repeated = _repeated(problem, choice.copies, "repeated_share")
    leakage = at_hot(metrics.leakage_power) * repeated
    bias = at_hot(metrics.bias_power) * repeated
    overhead_power = np.broadcast_to(problem.overhead["overhead_power"][:, 0, :] * choice.copies, shape)
    if choice.back_bias != 0.0:
        overhead_power = overhead_power + problem.mitigation["back_bias_power"][:, 0, :] * repeated
    standing = leakage + bias + overhead_power
    dynamic = {name: at_hot(part) for name, part in metrics.dynamic_energy_parts.items()}
    if choice.copies != 1.0:
        extra = _repeated(problem, choice.copies, "routing_overhead") - 1.0
        dynamic["copies"] = np.asarray(sum(dynamic.values())) * extra
    full_swing = at_hot(metrics.switched_capacitance) * supply**2 * repeated
    idle_energy, gated = _idle_energy(problem, leakage + bias, overhead_power, full_swing)
    infeasible = _infeasible(problem, supply, shape, metrics)
    points = Points(
        supply=np.broadcast_to(supply, shape),
        size=choice.size,
        threshold_shift=choice.threshold_shift,
        time=time,
        time_parts=time_parts,
        slowest_temperature=slowest,
        cycle=time,
        energy=time,
        energy_parts={},
        dynamic_parts=dynamic,
        leakage_power=leakage,
        standing_power=standing,
        idle_energy=idle_energy,
        area=at_hot(metrics.area) * _repeated(problem, choice.copies, "area_share"),
        power_density=time,
        noise_ratio=np.broadcast_to(_temperatures(problem, metrics.half_swing_over_noise).min(axis=1), shape),
        hysteresis=_hysteresis(problem, pair, shape),
        busiest_rising=at_hot(metrics.busiest_rising_per_operation),
        margins=_margins(problem, pair, shape),
        hard_limits=frozenset(
            limit.name for switch in (pair.down, pair.up) for limit in switch.limits if limit.kind == "hard"
        ),
        infeasible=infeasible,
        capability=_capabilities(problem, pair, rows),
        efficiency=problem.overhead["supply_efficiency"][:, 0, :],
        shifter=problem.overhead["level_shifter_energy"][:, 0, :],
        copies=choice.copies,
        back_bias=np.full(shape, choice.back_bias),
        gated=gated,
    )
    return with_cycle(problem, points, cycle_time(problem))


def cycle_time(problem: SideProblem) -> Array | None:
    """Return the clock period (row or 1, 1) of a clocked study, None when self-timed."""
    if problem.study.timing != "clocked":
        return None
    return np.asarray(1.0 / problem.scenario["clock_frequency"][:, 0, :])


def with_cycle(problem: SideProblem, points: Points, period: Array | None) -> Points:
    """Return the points with their energy at another clock period [s] (None: self-timed)."""
    accounting = problem.study.leakage_accounting
    lasts = points.interval if period is None else np.maximum(period, points.interval)
    cycle = points.interval if accounting == "operation" else lasts
    standing = points.standing_power * cycle
    parts: dict[str, Array] = dict(points.dynamic_parts)
    parts["leakage"] = points.leakage_power * cycle
    parts["bias_and_overheads"] = standing - parts["leakage"]
    parts["idle"] = points.idle_energy
    core = np.asarray(sum(parts.values()))
    parts["supply_loss"] = core * (1.0 / points.efficiency - 1.0)
    parts["level_shifters"] = np.broadcast_to(points.shifter, core.shape)
    energy = np.asarray(core / points.efficiency + points.shifter)
    with np.errstate(divide="ignore", invalid="ignore"):
        density = (energy - points.idle_energy / points.efficiency) / lasts / points.area
    return dataclasses.replace(
        points, cycle=cycle, energy=energy, energy_parts=parts, power_density=np.asarray(density)
    )


def _idle_energy(problem: SideProblem, block: Array, outside: Array, full_swing_energy: Array) -> tuple[Array, Mask]:
    """Energy of one idle period per operation [J], and where the block is gated for it.

    ``block``, ``outside``: standing power of the block and of what lies outside its supply.
    """
    never = np.zeros(block.shape, dtype=bool)
    if problem.study.idle == "none":
        return np.zeros(block.shape), never
    idle = problem.scenario["idle_time"][:, 0, :]
    active = problem.scenario["active_cycles"][:, 0, :]
    stays_on = np.asarray((block + outside) * idle / active)
    if problem.study.idle == "ungated" or not problem.side.may_gate:
        return stays_on, never
    residual = problem.gating["residual_leakage"][:, 0, :]
    wake = problem.gating["wake_energy_cycles"][:, 0, :] * full_swing_energy
    asleep = np.asarray(((residual * block + outside) * idle + wake) / active)
    gated = ~(stays_on <= asleep)
    return np.where(gated, asleep, stays_on), gated


def _infeasible(
    problem: SideProblem, supply: Array, shape: tuple[int, int], metrics: OperationMetrics
) -> dict[str, Mask]:
    found: dict[str, Mask] = {}
    for reason, mask in metrics.unable.items():
        wide = np.broadcast_to(mask, np.broadcast_shapes(mask.shape, (1, len(problem.study.temperatures), 1)))
        found[reason] = np.broadcast_to(wide.any(axis=1), shape)
    valid = problem.side.technology.valid.get("supply")
    if valid is not None:
        # a relative slack of a few units in the last place: limits and grid come from different decimal texts
        outside = (supply < valid[0] * (1.0 - 1e-12)) | (supply > valid[1] * (1.0 + 1e-12))
        if outside.any():
            found["outside the fitted range of the set (supply)"] = np.broadcast_to(outside, shape)
    return found


def _margins(problem: SideProblem, pair: SwitchPair, shape: tuple[int, int]) -> dict[str, Array]:
    found: dict[str, Array] = {}
    for switch in (pair.down, pair.up):
        for limit in switch.limits:
            margin = np.broadcast_to(_temperatures(problem, limit.margin).min(axis=1), shape)
            found[limit.name] = np.minimum(found.get(limit.name, margin), margin)
    return found


def _hysteresis(problem: SideProblem, pair: SwitchPair, shape: tuple[int, int]) -> Array:
    worst = np.zeros(shape)
    for switch in (pair.down, pair.up):
        window = (switch.closing_voltage - switch.opening_voltage) / np.asarray(pair.supply)
        window = np.where(np.isfinite(window), window, 0.0)
        worst = np.maximum(worst, np.broadcast_to(_temperatures(problem, window).max(axis=1), shape))
    return worst


def _capabilities(problem: SideProblem, pair: SwitchPair, rows: int) -> dict[str, tuple[Array, str]]:
    found: dict[str, tuple[Array, str]] = {}
    for name, capability in pair.down.capabilities.items():
        stated = problem.side.technology.values.get(capability.source)
        bound = stated.bound if stated is not None else capability.bound
        found[name] = (_least(capability.value, rows), bound)
    retention = np.asarray(pair.down.retention, dtype=np.float64)
    if np.isfinite(retention).all() or np.isinf(retention).all():
        stated = problem.side.technology.values.get("retention_time")
        bound = stated.bound if stated is not None else ""
        found["retention"] = (_least(retention, rows), bound)
    return found


def _least(value: Any, rows: int) -> Array:
    """Return the smallest value over temperatures and supplies, (row, 1)."""
    array = np.atleast_1d(np.asarray(value, dtype=np.float64))
    cube = array.reshape((1,) * (3 - array.ndim) + array.shape) if array.ndim < 3 else array
    return np.broadcast_to(cube.min(axis=(1, 2))[:, None], (rows, 1))


def cycles_demanded(problem: SideProblem, points: Points, life: float) -> Array:
    """Switching cycles of the busiest net over the life [1]: f a_max duty life (row, supply).

    a_max is the activity stated for the busiest net, or that of a net of the circuit which is busier still (a clock net
    rises once per cycle whatever the study says of its logic). f is the clock frequency; a self-timed block without one
    runs all the time. A parallel copy is charged as if it did all the work of the block.
    """
    scenario = problem.scenario
    busiest = points.busiest_rising
    if "busiest_activity" in scenario:
        busiest = np.maximum(busiest, scenario["busiest_activity"][:, 0, :])
    frequency = scenario["clock_frequency"][:, 0, :] if "clock_frequency" in scenario else 1.0 / points.time
    if problem.study.idle == "none":
        duty = scenario["duty"][:, 0, :]
    else:
        awake = scenario["active_cycles"][:, 0, :] / frequency
        duty = awake / (awake + scenario["idle_time"][:, 0, :])
    return np.asarray(frequency * busiest * duty * life)
