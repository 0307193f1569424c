"""A signal over one period and its passages of half the swing (layer 5)."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Callable
from dataclasses import dataclass

from scipy.interpolate import CubicSpline

from benchmark.devices.record import Array
from benchmark.errors import UsageError

__all__ = ["Edges", "Signal", "Waveform", "edge_times", "transported"]

Signal = Callable[[float], float]


class Waveform:
    """A signal as a fraction of the supply over scaled time: constant before and after its cubic pieces."""

    def __init__(self, time: Array, value: Array) -> None:
        slope = CubicSpline(time, value).derivative()(time)
        self.time: list[float] = time.tolist()
        self.value: list[float] = value.tolist()
        self.slope: list[float] = slope.tolist()

    def __call__(self, t: float) -> float:
        """Return the value at scaled time t."""
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
class Edges:
    """Times of the two edges of a signal in one period, scaled, and the number of other crossings of 1/2."""

    first: float
    second: float
    false: int


def edge_times(wave: Waveform, half: float) -> Edges:
    """Return the first crossing of 1/2 in each half of the period; the ringing of the first edge is over by half."""
    times = wave.crossings()
    first = next((t for t in times if t < half), None)
    second = next((t for t in times if t >= half), None)
    if first is None or second is None:
        message = "an edge died out on its way through the chain: the switches do not follow"
        raise UsageError(message)
    return Edges(first, second, len(times) - 2)


def transported(signal: Signal, closing: float, opening: float) -> Signal:
    """Return the control that follows ``signal`` late by ``closing`` while it rises and by ``opening`` while it falls.

    The later of the two copies on each edge: the smaller value where closing is the slower one, else the larger.
    """
    if closing == opening:
        return lambda t: signal(t - closing)
    pick = min if closing > opening else max
    return lambda t: pick(signal(t - closing), signal(t - opening))
