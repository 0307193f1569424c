"""Delay, energy and ringing of a chain of stages from the differential equations themselves (layer 5).

Every stage is a pull-up and a pull-down switch at one output node::

    C dv/dt = I_up(u_up, V - v) - I_down(u_down, v)          [A]

The control u of a switch follows the stage's input (for the pull-up: V minus the input)

- through a pure transport: closing_time late while it rises, opening_time late while it falls; or
- where ``natural_frequency`` w0 is finite, through the two-pole actuator u'' + w0 u'/Q + w0^2 u = w0^2 input. The
  actuator then *is* the load-independent time; closing_time and opening_time are not added.

A control beyond the rails (overshoot) is held at the rail: the record is rated at its supply, and overshoot could only
shorten the delay. Loads are lumped capacitances; a wire is a ladder of pi sections. Nothing acts backwards from input
to output (Miller charge belongs into the capacitances), so the stages are solved one after the other with exact
delays, and the last stage stands for any interior stage.

Checks: own chains of log-linear switches and of virtual-source transistors (rows C1-chain, M3-delay); ngspice and
scipy agree on such chains to 5e-5 (own measurement).
"""

from __future__ import annotations

import dataclasses
import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.special import expit

from benchmark.circuits.balance import gate_balance, record_shape
from benchmark.circuits.law_table import scalar_law
from benchmark.circuits.stage_equations import StageEquations, actor_of, response_time, solve_stage
from benchmark.circuits.waveform import Edges, Signal, Waveform, edge_times
from benchmark.devices.record import Array, Switch, SwitchPair
from benchmark.errors import UsageError

__all__ = ["ChainLoad", "ChainResult", "chain_transient", "headline_difference"]

#: of the supply: a chain that keeps less swing than this has no edges to time
_LEAST_SWING = 0.01


@dataclass(frozen=True)
class ChainLoad:
    """What one stage of the chain drives.

    near [F]
        At the output: own terminals and pins.
    far [F]
        Behind the wire: inputs (fan-out times one input) and fixed loads.
    wire_resistance [ohm], wire_capacitance [F]
        Totals of the wire, as ``sections`` equal pi sections (3: 50 % delay of a driven line within 0.5 %).
    """

    near: float
    far: float = 0.0
    wire_resistance: float = 0.0
    wire_capacitance: float = 0.0
    sections: int = 3

    def nodes(self) -> tuple[list[float], float]:
        """Return the capacitance of every node [F] from the output on, and the resistance between neighbours [ohm]."""
        if self.wire_resistance == 0.0:
            return [self.near + self.wire_capacitance + self.far], 0.0
        share = self.wire_capacitance / self.sections
        middle = [share] * (self.sections - 1)
        ends = [self.near + 0.5 * share, *middle, self.far + 0.5 * share]
        return ends, self.wire_resistance / self.sections

    @property
    def total(self) -> float:
        """All capacitance [F]."""
        return self.near + self.far + self.wire_capacitance


@dataclass(frozen=True)
class ChainResult:
    """One interior stage over one full cycle of its input.

    delay, falling_delay, rising_delay [s]
        50 % of the input (far end of the previous wire) to 50 % of the output (far end): mean of both edges, output
        falling, output rising; first crossings.
    energy [J]
        Drawn from the supply over the cycle of length ``period`` [s].
    leakage_energy [J]
        Static part of it: the supply current of the settled states, each for the time the stage is in it.
    false_crossings
        50 % crossings of the output beyond the two of the cycle (ringing).
    unsettled [1]
        |delay / delay of the stage before - 1|: how far the chain still is from a repeating pattern.
    table_error [1]
        Largest error of ln I of the tabulated laws; 0 when the laws were called directly.
    """

    delay: float
    falling_delay: float
    rising_delay: float
    energy: float
    leakage_energy: float
    false_crossings: int
    unsettled: float
    table_error: float
    period: float

    @property
    def switching_energy(self) -> float:
        """Energy of the cycle without leakage [J]."""
        return self.energy - self.leakage_energy


def _static_levels(pair: SwitchPair) -> tuple[float, float, float, float]:
    """Return the settled low and high output of a long chain over V [1], and the supply current at each [A]."""
    balance = gate_balance(pair, 1, 1)
    level = np.zeros(1)
    high = low = level
    for _ in range(24):
        high = expit(balance.solve(level))
        low = expit(balance.solve(high))
        level = low
    if float(high[0] - low[0]) < _LEAST_SWING:
        message = "the levels die out in a chain: the switches do not regenerate"
        raise UsageError(message)
    supply = float(pair.supply)
    leak_high = pair.up.current((1.0 - low) * supply, (1.0 - high) * supply)
    leak_low = pair.up.current((1.0 - high) * supply, (1.0 - low) * supply)
    return float(low[0]), float(high[0]), float(leak_low[0]), float(leak_high[0])


def _driving_edge(half: float) -> Waveform:
    """Return the input of the first stage: exponential edges of one R C, up at 0 and down at half the period."""
    rise = np.linspace(0.0, min(30.0, half), 400) ** 2 / min(30.0, half)
    up = -np.expm1(-rise)
    time = np.concatenate([rise, half + rise])
    value = np.concatenate([up, 1.0 - up])
    keep = np.concatenate([[True], np.diff(time) > 1e-9])
    return Waveform(time[keep], value[keep])


def _check(pair: SwitchPair, stages: int) -> None:
    size = math.prod(record_shape(pair))
    if size != 1:
        message = f"the transient solves one design point at a time, found {size}"
        raise UsageError(message)
    if stages < 5:
        message = f"a chain needs at least 5 stages before its edges repeat, found {stages}"
        raise UsageError(message)


def _flat_switch(switch: Switch, dimensions: int) -> Switch:
    changes: dict[str, object] = {}
    for field in dataclasses.fields(switch):
        value = getattr(switch, field.name)
        if isinstance(value, (np.ndarray, np.generic, float)):
            array = np.asarray(value)
            changes[field.name] = array.reshape(array.shape[-1:] if field.name.startswith("stack_") else ())
    law = switch.current

    def current(control: Array, path: Array) -> Array:
        shape = (1,) * dimensions + (-1,)
        return np.asarray(law(control.reshape(shape), path.reshape(shape))).reshape(-1)

    return dataclasses.replace(switch, **changes, current=current)  # type: ignore[arg-type]


def _flat(pair: SwitchPair) -> SwitchPair:
    """Return the same design point with scalars for arrays of size 1."""
    dimensions = len(record_shape(pair))
    return SwitchPair(
        down=_flat_switch(pair.down, dimensions),
        up=_flat_switch(pair.up, dimensions),
        supply=np.asarray(pair.supply).reshape(()),
        temperature=np.asarray(pair.temperature).reshape(()),
    )


def _scaled(pair: SwitchPair, load: ChainLoad, stages: int) -> tuple[StageEquations, float, float]:
    """Return the scaled problem, its unit of time [s] and the error of the tabulated laws."""
    supply = float(pair.supply)
    resistance = max(float(pair.down.resistance), float(pair.up.resistance))
    time = resistance * load.total
    laws = scalar_law(pair.down, supply), scalar_law(pair.up, supply)
    down, up = (
        actor_of(switch, law, resistance / supply, time) for switch, law in zip((pair.down, pair.up), laws, strict=True)
    )
    respond, ring = (max(both) for both in zip(response_time(down), response_time(up), strict=True))
    nodes, between = load.nodes()
    wire = load.wire_resistance / resistance
    problem = StageEquations(
        down=down,
        up=up,
        capacitance=[c / load.total for c in nodes],
        conductance=resistance / between if between > 0.0 else 0.0,
        half=stages * (6.0 + respond + 4.0 * wire) + 20.0 * (1.0 + wire) + ring,
    )
    return problem, time, max(law.error for law in laws)


def chain_transient(
    pair: SwitchPair, load: ChainLoad, stages: int = 6, drive: Literal["chain", "step"] = "chain"
) -> ChainResult:
    """Return delay, energy and false crossings of an interior stage of a chain of inverters.

    Parameters
    ----------
    pair : SwitchPair
        At ONE design point (every field a scalar or of size 1).
    load : ChainLoad
        Of every stage.
    stages : int
        Stages before and including the measured one, at least 5 (the first ones shape the edge).
    drive : {"chain", "step"}
        "step": a single stage behind an ideal step instead.

    Returns
    -------
    ChainResult
        See there.

    Raises
    ------
    UsageError
        If the pair holds more than one point, there are fewer than 5 stages, the levels die out in the chain (no
        regeneration), or the solver fails.

    Notes
    -----
    LSODA, relative tolerance 1e-8. Delay good to about 1e-5 and the error of the tabulated law.
    """
    _check(pair, stages)
    pair = _flat(pair)
    problem, time, table_error = _scaled(pair, load, stages)
    low, high, leak_low, leak_high = _static_levels(pair)
    period = 2.0 * problem.half
    wave: Signal
    if drive == "step":
        wave, rounds = (lambda t: 1.0 if 0.0 < t <= problem.half else 0.0), 1
        edges = [Edges(0.0, problem.half, 0)]
    else:
        wave, rounds = _driving_edge(problem.half), stages
        edges = [edge_times(wave, problem.half)]
    for _ in range(rounds):
        run = solve_stage(problem, wave, low, high)
        wave = run.far
        edges.append(edge_times(run.far, problem.half))
    source, output = edges[-2:]
    first, second = output.first - source.first, output.second - source.second
    # an odd number of stages turns the rising input of the chain into a falling output
    falling, rising = (first, second) if rounds % 2 == 1 else (second, first)
    unsettled = 0.0
    if drive == "chain":
        before = source.first - edges[-3].first + source.second - edges[-3].second
        unsettled = abs((first + second) / before - 1.0)
    inside = output.second - output.first
    at_low = inside if rounds % 2 == 1 else period - inside
    leakage = leak_low * at_low + leak_high * (period - at_low)
    supply = float(pair.supply)
    return ChainResult(
        delay=0.5 * (first + second) * time,
        falling_delay=falling * time,
        rising_delay=rising * time,
        energy=run.drawn * supply**2 * load.total,
        leakage_energy=supply * leakage * time,
        false_crossings=output.false,
        unsettled=unsettled,
        table_error=table_error,
        period=period * time,
    )


def headline_difference(closed_delay: float, pair: SwitchPair, load: ChainLoad, stages: int = 6) -> float:
    """Return closed form over transient, minus 1, for the stage delay at one design point [1].

    Parameters
    ----------
    closed_delay : float
        Stage delay by a closed rule, mean of both edges [s].
    pair, load, stages
        As for ``chain_transient``: the same point and the same capacitances the rule saw.
    """
    return closed_delay / chain_transient(pair, load, stages).delay - 1.0
