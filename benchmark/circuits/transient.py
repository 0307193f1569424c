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
from bisect import bisect_right
from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.integrate import solve_ivp
from scipy.interpolate import CubicSpline
from scipy.special import expit

from benchmark.circuits.balance import gate_balance, record_shape
from benchmark.circuits.law_table import ScalarLaw, scalar_law
from benchmark.devices.record import Array, Switch, SwitchPair
from benchmark.errors import UsageError

__all__ = ["ChainLoad", "ChainResult", "chain_transient", "headline_difference"]

_RTOL = 1e-8
_ATOL = 1e-10
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


class _Waveform:
    """A signal as a fraction of the supply over scaled time: constant before and after its cubic pieces."""

    def __init__(self, time: Array, value: Array) -> None:
        slope = CubicSpline(time, value).derivative()(time)
        self.time: list[float] = time.tolist()
        self.value: list[float] = value.tolist()
        self.slope: list[float] = slope.tolist()

    def __call__(self, t: float) -> float:
        if t <= self.time[0]:
            return self.value[0]
        if t >= self.time[-1]:
            return self.value[-1]
        i = bisect_right(self.time, t) - 1
        h = self.time[i + 1] - self.time[i]
        s = (t - self.time[i]) / h
        a, b = self.value[i], self.value[i + 1]
        rest = 1.0 - s
        bend = h * s * rest * (rest * self.slope[i] - s * self.slope[i + 1])
        return a + s * s * (3.0 - 2.0 * s) * (b - a) + bend

    def crossings(self) -> list[float]:
        """Return the times of passing 1/2."""
        found = []
        for i in range(len(self.time) - 1):
            a, b = self.value[i] - 0.5, self.value[i + 1] - 0.5
            if (a < 0.0) == (b < 0.0):
                continue
            low, high = self.time[i], self.time[i + 1]
            for _ in range(50):
                middle = 0.5 * (low + high)
                if (self(middle) < 0.5) == (a < 0.0):
                    low = middle
                else:
                    high = middle
            found.append(0.5 * (low + high))
        return found


@dataclass(frozen=True)
class _Edges:
    """Times of the two edges of a signal in one period, scaled, and the number of other crossings of 1/2."""

    first: float
    second: float
    false: int


_Signal = Callable[[float], float]


def _transported(signal: _Signal, closing: float, opening: float) -> _Signal:
    """Return the control that follows ``signal`` late by ``closing`` while it rises and by ``opening`` while it falls.

    The later of the two copies on each edge: the smaller value where closing is the slower one, else the larger.
    """
    if closing == opening:
        return lambda t: signal(t - closing)
    pick = min if closing > opening else max
    return lambda t: pick(signal(t - closing), signal(t - opening))


@dataclass(frozen=True)
class _Actor:
    """One switch of the scaled problem: law [in units of V/R], transport or two-pole actuator."""

    law: Callable[[float, float], float]
    closing: float
    opening: float
    frequency: float  # nan: pure transport
    quality: float

    @property
    def two_pole(self) -> bool:
        return math.isfinite(self.frequency)


def _actor(switch: Switch, law: ScalarLaw, unit: float, time: float) -> _Actor:
    frequency = float(switch.natural_frequency)
    current = law.current
    return _Actor(
        law=lambda level, path: current(min(max(level, 0.0), 1.0), path) * unit,
        closing=float(switch.closing_time) / time,
        opening=float(switch.opening_time) / time,
        frequency=frequency * time,
        quality=float(switch.quality),
    )


def _response_time(actor: _Actor) -> tuple[float, float]:
    """Return a generous response time of the actuator and the time its ringing takes to die, scaled."""
    if not actor.two_pole:
        return max(actor.closing, actor.opening), 0.0
    q = actor.quality
    return (3.0 + 3.0 / q) / actor.frequency, 14.0 * (2.0 * q + 1.0 / q) / actor.frequency


@dataclass(frozen=True)
class _Problem:
    """The chain in scaled units: time in R C, voltage in V, current in V/R."""

    down: _Actor
    up: _Actor
    capacitance: list[float]  # of the nodes, in the total
    conductance: float  # between neighbours, in 1/R
    half: float  # half the period

    def equations(self, signal: _Signal) -> Callable[[float, Array], list[float]]:
        """Return the right-hand side; order of the states: nodes, energy, actuators of the two switches."""
        n = len(self.capacitance)
        input_down = _transported(signal, self.down.closing, self.down.opening)
        raised: _Signal = lambda t: 1.0 - signal(t)  # noqa: E731
        input_up = _transported(raised, self.up.closing, self.up.opening)
        law_down, law_up = self.down.law, self.up.law
        up_at = n + 1 + (2 if self.down.two_pole else 0)

        def rates(t: float, y: Array) -> list[float]:
            state = y.tolist()
            v = state[0]
            out: list[float] = []
            tail: list[float] = []
            if self.down.two_pole:
                control_down = state[n + 1]
                tail += _two_pole(self.down, signal(t), control_down, state[n + 2])
            else:
                control_down = input_down(t)
            if self.up.two_pole:
                control_up = state[up_at]
                tail += _two_pole(self.up, raised(t), control_up, state[up_at + 1])
            else:
                control_up = input_up(t)
            drawn = law_up(control_up, 1.0 - v)
            flow = drawn - law_down(control_down, v)
            for k in range(n - 1):
                onward = self.conductance * (state[k] - state[k + 1])
                out.append((flow - onward) / self.capacitance[k])
                flow = onward
            out.append(flow / self.capacitance[n - 1])
            out.append(drawn)
            return out + tail

        return rates


def _two_pole(actor: _Actor, target: float, position: float, speed: float) -> list[float]:
    w = actor.frequency
    return [speed, w * (w * (target - position) - speed / actor.quality)]


@dataclass(frozen=True)
class _Run:
    """Waveform at the far node of one stage and the energy it drew in C V^2."""

    far: _Waveform
    drawn: float


def _solve_stage(problem: _Problem, signal: _Signal, low: float, high: float) -> _Run:
    """Solve one stage over a full period from its settled state (output ``high`` if the input starts low)."""
    rates = problem.equations(signal)
    n = len(problem.capacitance)
    begin = signal(-math.inf)
    first = [high if begin < 0.5 else low] * n + [0.0]
    if problem.down.two_pole:
        first += [begin, 0.0]
    if problem.up.two_pole:
        first += [1.0 - begin, 0.0]
    end = 2.0 * problem.half
    # a step is at most a tenth of a half-period: no edge can be stepped over
    solution = solve_ivp(
        rates,
        (0.0, end),
        first,
        method="LSODA",
        rtol=_RTOL,
        atol=_ATOL,
        dense_output=True,
        max_step=0.1 * problem.half,
    )
    if not solution.success:
        message = f"transient of the chain did not finish: {solution.message}"
        raise UsageError(message)
    steps = solution.t
    fine = np.unique(np.concatenate([steps, *(steps[:-1] + f * np.diff(steps) for f in (0.25, 0.5, 0.75))]))
    values = solution.sol(fine)
    return _Run(_Waveform(fine, values[n - 1]), float(solution.y[n, -1]))


def _static_levels(pair: SwitchPair) -> tuple[float, float, float, float]:
    """Return the settled low and high output of a long chain [V] over V, and the supply current at each [A]."""
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


def _driving_edge(half: float) -> _Waveform:
    """Return the input of the first stage: exponential edges of one R C, up at 0 and down at half the period."""
    rise = np.linspace(0.0, min(30.0, half), 400) ** 2 / min(30.0, half)
    up = -np.expm1(-rise)
    time = np.concatenate([rise, half + rise])
    value = np.concatenate([up, 1.0 - up])
    keep = np.concatenate([[True], np.diff(time) > 1e-9])
    return _Waveform(time[keep], value[keep])


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


def _scaled(pair: SwitchPair, load: ChainLoad, stages: int) -> tuple[_Problem, float, float]:
    """Return the scaled problem, its unit of time [s] and the error of the tabulated laws."""
    supply = float(pair.supply)
    resistance = max(float(pair.down.resistance), float(pair.up.resistance))
    time = resistance * load.total
    laws = scalar_law(pair.down, supply), scalar_law(pair.up, supply)
    down, up = (
        _actor(switch, law, resistance / supply, time) for switch, law in zip((pair.down, pair.up), laws, strict=True)
    )
    respond, ring = (max(both) for both in zip(_response_time(down), _response_time(up), strict=True))
    nodes, between = load.nodes()
    wire = load.wire_resistance / resistance
    problem = _Problem(
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
    wave: _Signal
    if drive == "step":
        wave, rounds = (lambda t: 1.0 if 0.0 < t <= problem.half else 0.0), 1
        edges = [_Edges(0.0, problem.half, 0)]
    else:
        wave, rounds = _driving_edge(problem.half), stages
        edges = [_edges(wave, problem.half)]
    for _ in range(rounds):
        run = _solve_stage(problem, wave, low, high)
        wave = run.far
        edges.append(_edges(run.far, problem.half))
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


def _edges(wave: _Waveform, half: float) -> _Edges:
    """Return the first crossing of 1/2 in each half of the period; the ringing of the first edge is over by half."""
    times = wave.crossings()
    first = next((t for t in times if t < half), None)
    second = next((t for t in times if t >= half), None)
    if first is None or second is None:
        message = "an edge died out on its way through the chain: the switches do not follow"
        raise UsageError(message)
    return _Edges(first, second, len(times) - 2)


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
