"""Differential equations of one stage and their solution over a period (layer 5).

Scaled units: time in R C of the stage, voltage in the supply V, current in V/R, energy in C V^2.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.integrate import solve_ivp

from benchmark.circuits.law_table import ScalarLaw
from benchmark.circuits.waveform import Signal, Waveform, transported
from benchmark.devices.record import Array, Switch
from benchmark.errors import UsageError

__all__ = ["Actor", "Run", "StageEquations", "actor_of", "response_time", "solve_stage"]

_RTOL = 1e-8
_ATOL = 1e-10


@dataclass(frozen=True)
class Actor:
    """One switch: scaled law, times of pure transport, or frequency and quality of a two-pole actuator."""

    law: Callable[[float, float], float]
    closing: float
    opening: float
    frequency: float  # nan: pure transport
    quality: float

    @property
    def two_pole(self) -> bool:
        """Whether there is an actuator; else the control is the drive, late."""
        return math.isfinite(self.frequency)


def actor_of(switch: Switch, law: ScalarLaw, unit: float, time: float) -> Actor:
    """Return the scaled switch; ``unit`` R/V [1/A], ``time`` R C [s]."""
    frequency = float(switch.natural_frequency)
    current = law.current
    return Actor(
        law=lambda level, path: current(min(max(level, 0.0), 1.0), path) * unit,
        closing=float(switch.closing_time) / time,
        opening=float(switch.opening_time) / time,
        frequency=frequency * time,
        quality=float(switch.quality),
    )


def response_time(actor: Actor) -> tuple[float, float]:
    """Return a generous response time of the actuator and the time its ringing takes to die, scaled."""
    if not actor.two_pole:
        return max(actor.closing, actor.opening), 0.0
    q = actor.quality
    return (3.0 + 3.0 / q) / actor.frequency, 14.0 * (2.0 * q + 1.0 / q) / actor.frequency


@dataclass(frozen=True)
class StageEquations:
    """A stage: its two switches and the nodes it drives, from the output to the far end of the wire."""

    down: Actor
    up: Actor
    capacitance: list[float]  # of the nodes, in the total
    conductance: float  # between neighbours, in 1/R
    half: float  # half the period

    def equations(self, signal: Signal) -> Callable[[float, Array], list[float]]:
        """Return the right-hand side; order of the states: nodes, energy, actuators of the two switches."""
        n = len(self.capacitance)
        input_down = transported(signal, self.down.closing, self.down.opening)
        raised: Signal = lambda t: 1.0 - signal(t)  # noqa: E731
        input_up = transported(raised, self.up.closing, self.up.opening)
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


def _two_pole(actor: Actor, target: float, position: float, speed: float) -> list[float]:
    w = actor.frequency
    return [speed, w * (w * (target - position) - speed / actor.quality)]


@dataclass(frozen=True)
class Run:
    """Waveform at the far node of one stage and the energy it drew in C V^2."""

    far: Waveform
    drawn: float


def solve_stage(problem: StageEquations, signal: Signal, low: float, high: float) -> Run:
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
    return Run(Waveform(fine, values[n - 1]), float(solution.y[n, -1]))
