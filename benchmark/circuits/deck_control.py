"""What a deck measures: analyses and prints of a chain and of a ring, as lines of a control block (layer 5)."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

__all__ = ["CHAIN_RESULTS", "RING_RESULTS", "STATIC_RESULTS", "ChainProbe", "chain_control", "ring_control"]

#: absolute ends of currents over the on-current: a static leakage is many decades below it, in a transient a closer end
#: than this makes the simulator shorten its steps without end
_STATIC_CURRENT, _TRANSIENT_CURRENT = 1.0e-12, 1.0e-7
#: intervals of the static sweep
_POINTS = 400

STATIC_RESULTS = ("gain", "switching_voltage", "noise_margin_low", "noise_margin_high", "leakage_power")
CHAIN_RESULTS = (
    "delay_falling", "delay_rising", "delay", "energy_per_cycle", "leakage_energy", "switching_energy", "ringing_time",
)  # fmt: skip
RING_RESULTS = ("ring_period", "delay", "energy_per_cycle")


@dataclass(frozen=True)
class ChainProbe:
    """Where and how a chain is measured.

    source, output
        Far ends of the wire before the measured stage and of the wire behind it.
    falls_first
        Whether the output falls on the first edge of the period.
    power
        Expression of the power into the measured stage [W].
    supply [V], current [A]
        Supply, and the on-current as a scale.
    step, start, period [s]
        Largest time step, begin of the period, its length.
    """

    source: str
    output: str
    falls_first: bool
    power: str
    supply: float
    current: float
    step: float
    start: float
    period: float


def _whole(analyses: Sequence[str]) -> list[str]:
    return [".control", "set numdgt=10", *analyses, "quit 0", ".endc", ".end"]


def _transient(current: float) -> str:
    return f"option reltol=1e-4 vntol=1e-7 abstol={_TRANSIENT_CURRENT * current!r}"


def _printed(names: Sequence[str]) -> list[str]:
    return [f"print {name}" for name in names]


def chain_control(probe: ChainProbe) -> list[str]:
    """Return the control block of a chain: a static sweep of its input, then one period of pulses."""
    supply, half = repr(probe.supply), repr(0.5 * probe.supply)
    end = repr(probe.start + probe.period)
    # the input of the measured stage is high while its output is low
    first, second = ("out_fall", "out_rise") if probe.falls_first else ("out_rise", "out_fall")
    before, after = ("low", "high") if probe.falls_first else ("high", "low")
    return _whole(
        [
            "* static: transfer curve and power of one stage that stands alone, at both levels of its input",
            f"option reltol=1e-6 vntol=1e-12 abstol={_STATIC_CURRENT * probe.current!r}",
            f"dc vstatic 0 {supply} {probe.supply / _POINTS!r}",
            "let steepness = -deriv(v(sout))",
            "meas dc gain MAX steepness",
            "meas dc switching_voltage WHEN v(sout)=v(sin)",
            "meas dc v_il WHEN steepness=1 RISE=1",
            "meas dc v_ih WHEN steepness=1 FALL=LAST",
            "meas dc out_il FIND v(sout) AT=$&v_il",
            "meas dc out_ih FIND v(sout) AT=$&v_ih",
            "let noise_margin_low = v_il-out_ih",
            "let noise_margin_high = out_il-v_ih",
            f"let leak = -i(vrail)*{supply}-i(vstatic)*v(sin)",
            "let leak_low = leak[0]",
            f"let leak_high = leak[{_POINTS}]",
            "let leakage_power = (leak_low+leak_high)/2",
            "set leak_low = $&leak_low",
            "set leak_high = $&leak_high",
            *_printed(STATIC_RESULTS),
            "* one period",
            _transient(probe.current),
            f"tran {probe.step!r} {end} 0 {probe.step!r}",
            f"meas tran in_rise WHEN v({probe.source})={half} RISE=1",
            f"meas tran in_fall WHEN v({probe.source})={half} FALL=1",
            f"meas tran out_rise WHEN v({probe.output})={half} RISE=1",
            f"meas tran out_fall WHEN v({probe.output})={half} FALL=1",
            f"meas tran out_last WHEN v({probe.output})={half} CROSS=LAST",
            "let delay_falling = out_fall-in_rise",
            "let delay_rising = out_rise-in_fall",
            "let delay = (delay_falling+delay_rising)/2",
            f"let ringing_time = out_last-{second}",
            f"let power = {probe.power}",
            f"meas tran energy_per_cycle INTEG power FROM={probe.start!r} TO={end}",
            f"let inside = {second}-{first}",
            f"let leakage_energy = $leak_{before}*({probe.period!r}-inside)+$leak_{after}*inside",
            "let switching_energy = energy_per_cycle-leakage_energy",
            *_printed(CHAIN_RESULTS),
        ]
    )


def ring_control(node: str, stages: int, supply: float, current: float, step: float, stop: float) -> list[str]:
    """Return the control block of a ring: two periods after the start has been forgotten, energy per stage."""
    half = repr(0.5 * supply)
    return _whole(
        [
            _transient(current),
            f"tran {step!r} {stop!r} 0 {step!r} uic",
            f"meas tran t_first WHEN v({node})={half} RISE=4",
            f"meas tran t_last WHEN v({node})={half} RISE=6",
            "let ring_period = (t_last-t_first)/2",
            f"let delay = ring_period/{2 * stages}",
            f"let power = -i(vdd)*{supply!r}",
            "meas tran heat INTEG power FROM=$&t_first TO=$&t_last",
            f"let energy_per_cycle = heat/{2 * stages}",
            *_printed(RING_RESULTS),
        ]
    )
