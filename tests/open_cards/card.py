"""The open 45 nm cards in ngspice: currents, charges and an inverter chain, measured by decks written here.

Cards: package ``c4m-pdk-freepdk45`` 0.0.1, file ``freepdk45_nom.spi`` (header: Apache-2.0), transistor model level 54
(BSIM4), typical corner, regular threshold. They name version 4.0 of the model; ngspice evaluates them with the nearest
version it has (4.5). Only the text of the cards is read: no code of the package is imported.

Devices as in the stored series: drawn length 50 nm, widths 0.5 um (n) and 1.0 um (p), source and drain area 2.5 L W,
perimeter W + 5 L, 27 degC. All voltages of the p type are given in its own sense.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache
from importlib.metadata import distribution
from pathlib import Path
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from tests.ngspice.runner import run_deck

__all__ = [
    "CELSIUS",
    "LENGTH",
    "WIDTHS",
    "Chain",
    "Flavour",
    "Polarity",
    "capacitances",
    "card_text",
    "chain",
    "currents",
    "model_version",
]

Array = NDArray[np.float64]
Polarity = Literal["n", "p"]
#: regular, low and high threshold
Flavour = Literal["VTG", "VTL", "VTH"]

CELSIUS = 27.0
#: drawn [m]
LENGTH = 50e-9
WIDTHS: dict[Polarity, float] = {"n": 0.5e-6, "p": 1.0e-6}
_SIGN: dict[Polarity, float] = {"n": 1.0, "p": -1.0}


@lru_cache(maxsize=1)
def card_text() -> str:
    """Return the file of the cards as it is in the package."""
    place = distribution("c4m-pdk-freepdk45").locate_file("c4m/pdk/freepdk45/freepdk45_nom.spi")
    return Path(str(place)).read_text(encoding="ascii")


def _device(name: str, nodes: str, polarity: Polarity, size: float = 1.0, flavour: Flavour = "VTG") -> str:
    width = WIDTHS[polarity]
    area, edge = 2.5 * LENGTH * width, width + 5.0 * LENGTH
    return (
        f"m{name} {nodes} {polarity.upper()}MOS_{flavour} L={LENGTH!r} W={width!r} "
        f"AS={area!r} AD={area!r} PS={edge!r} PD={edge!r} m={size!r}"
    )


def _without_tunnelling(text: str) -> str:
    found, count = re.subn(r"ig([cb])mod(\s*)=(\s*)1", r"ig\1mod\2=\g<3>0", text)
    assert count == 16, f"{count} switches of the gate current in the cards"
    return found


def _deck(title: str, lines: list[str], control: list[str], tunnelling: bool = True) -> str:
    return "\n".join(
        [
            f"* {title}",
            card_text() if tunnelling else _without_tunnelling(card_text()),
            f".temp {CELSIUS!r}",
            *lines,
            ".control",
            "set wr_singlescale",
            "set wr_vecnames",
            "set numdgt=12",
            *control,
            "quit 0",
            ".endc",
            ".end",
            "",
        ]
    )


def currents(
    polarity: Polarity, gates: Array, drains: Array, flavour: Flavour = "VTG", terminal: Literal["d", "s"] = "d"
) -> Array:
    """Return the current per device [A], shape (gates, drains), in the device's own sense; evenly spaced axes.

    ``terminal``: ``d`` the drain current, ``s`` the source current, which leaves out what the drain loses to the gate.
    """
    sign = _SIGN[polarity]

    def sweep(axis: Array) -> str:
        step = float(axis[1] - axis[0])
        return f"{sign * float(axis[0])!r} {sign * (float(axis[-1]) + 0.01 * step)!r} {sign * step!r}"

    deck = _deck(
        "drain current",
        [
            _device("1", "d g s 0", polarity, 1.0, flavour),
            "vs s 0 0",
            "vd d 0 0",
            "vg g 0 0",
            ".options gmin=1e-18 reltol=1e-6 abstol=1e-16",
        ],
        [f"dc vd {sweep(drains)} vg {sweep(gates)}", f"wrdata grid.txt i(v{terminal}) v(d) v(g)"],
    )
    table = run_deck(deck, tables={"grid.txt": (f"i(v{terminal})", "v(d)", "v(g)")}).tables["grid.txt"]
    shape = (gates.size, drains.size)
    assert np.allclose(sign * table["v(d)"].reshape(shape), drains, atol=1e-9)
    assert np.allclose(sign * table["v(g)"].reshape(shape), gates[:, None], atol=1e-9)
    out_of_drain = -1.0 if terminal == "d" else 1.0
    return np.asarray(out_of_drain * sign * table[f"i(v{terminal})"].reshape(shape))


@dataclass(frozen=True)
class Chain:
    """Third stage of the chain at one supply, per unit inverter: delays [s], energy [J] and leakage power [W].

    ``energy``: heat of one full cycle less leakage; ``leakage``: mean heat of the two resting states.
    """

    falling: float
    rising: float
    energy: float
    leakage: float

    @property
    def delay(self) -> float:
        """Mean of both edges [s]."""
        return 0.5 * (self.falling + self.rising)


#: sizes of the stages; the third is measured
_SIZES = (1.0, 4.0, 16.0, 64.0, 256.0)
_MEASURED = 2


def _crossing(time: Array, wave: Array, level: float, after: float, rising: bool) -> float:
    """Time of the first crossing of ``level`` after ``after``, linear between steps."""
    above = wave >= level if rising else wave <= level
    turned = np.flatnonzero(~above[:-1] & above[1:] & (time[1:] > after))
    assert turned.size, "no crossing"
    i = turned[0]
    return float(time[i] + (level - wave[i]) / (wave[i + 1] - wave[i]) * (time[i + 1] - time[i]))


def chain(supply: float, pace: float, added: float = 0.0, tunnelling: bool = True, flavour: Flavour = "VTG") -> Chain:
    """Simulate two periods of the chain 1:4:16:64:256, no wires, and measure its third stage in the second one.

    ``pace`` [s] sets edge, period (96 paces) and steps only: a rough delay is enough. ``added`` [F]: linear capacitance
    at the output of every stage, per unit inverter. ``tunnelling`` False: cards without current through the gate.
    """
    half, edge = 48.0 * pace, 2.0 * pace
    lines = [
        f"vdd vdd 0 {supply!r}",
        f"vin s0 0 pulse(0 {supply!r} {pace!r} {edge!r} {edge!r} {half - edge!r} {2.0 * half!r})",
    ]
    for k, size in enumerate(_SIZES):
        rail, gate, out = "vdd", f"s{k}", f"s{k + 1}"
        if k == _MEASURED:
            rail, gate, out = "rail", "gate", "out"
            lines += [f"vrail rail 0 {supply!r}", f"vgate s{k} gate 0", f"vout out s{k + 1} 0"]
        lines += [
            _device(f"n{k}", f"{out} {gate} 0 0", "n", size, flavour),
            _device(f"p{k}", f"{out} {gate} {rail} {rail}", "p", size, flavour),
        ]
        if added > 0.0:
            lines.append(f"c{k} {out} 0 {added * size!r}")
    lines.append(".options reltol=1e-4 abstol=1e-15 chgtol=1e-18 gmin=1e-18 method=trap")
    step = pace / 40.0
    asked = ("time", "v(gate)", "v(out)", "i(vrail)", "i(vgate)", "i(vout)")
    control = [f"tran {step!r} {4.0 * half!r} 0 {step!r}", f"wrdata waves.txt {' '.join(asked[1:])}"]
    deck = _deck("chain", lines, control, tunnelling)
    table = run_deck(deck, tables={"waves.txt": asked}, timeout=120.0).tables["waves.txt"]
    time, gate, out = table["time"], table["v(gate)"], table["v(out)"]
    heat = -supply * table["i(vrail)"] + gate * table["i(vgate)"] - out * table["i(vout)"]
    start, middle, end = 2.0 * half, 3.0 * half, 4.0 * half
    level = 0.5 * supply
    # the input of the measured stage follows the source after two inversions
    rise_in, fall_in = _crossing(time, gate, level, start, True), _crossing(time, gate, level, middle, False)
    falling = _crossing(time, out, level, rise_in, False) - rise_in
    rising = _crossing(time, out, level, fall_in, True) - fall_in

    def used(first: float, last: float) -> float:
        inside = (time >= first) & (time <= last)
        return float(np.trapezoid(heat[inside], time[inside])) / float(np.ptp(time[inside])) * (last - first)

    # the end of each half period, when all has settled; an integral, because single steps of the rule ring
    tail = 10.0 * pace
    resting = 0.5 * (used(middle - tail, middle) + used(end - tail, end)) / tail
    total = used(start, end)
    size = _SIZES[_MEASURED]
    return Chain(falling, rising, (total - resting * 2.0 * half) / size, resting / size)


def capacitances(
    polarity: Polarity, gates: Array, drains: Array, flavour: Flavour = "VTG"
) -> tuple[Array, Array, Array]:
    """Return dQ_gate/dV_gate, -dQ_gate/dV_drain and dQ_drain/dV_drain [F] at pairs of gate and drain voltages.

    Small-signal reactive currents at 1 MHz over the angular frequency: tunnelling through the gate is in phase and
    does not enter. One copy of the device per pair.
    """
    sign, frequency = _SIGN[polarity], 1e6
    lines = []
    for k, (gate, drain) in enumerate(zip(gates, drains, strict=True)):
        for case, (on_gate, on_drain) in {"a": (1, 0), "b": (0, 1)}.items():
            name = f"{case}{k}"
            lines += [
                _device(name, f"d{name} g{name} 0 0", polarity, 1.0, flavour),
                f"vg{name} g{name} 0 dc {sign * float(gate)!r} ac {on_gate}",
                f"vd{name} d{name} 0 dc {sign * float(drain)!r} ac {on_drain}",
            ]
    control = [f"ac lin 1 {frequency!r} {frequency!r}"]
    names = []
    for k in range(gates.size):
        for name, source in ((f"gg{k}", f"vga{k}"), (f"gd{k}", f"vgb{k}"), (f"dd{k}", f"vdb{k}")):
            control += [f"let {name} = -imag(i({source}))/(2*pi*{frequency!r})", f"print {name}"]
            names.append(name)
    found = run_deck(_deck("capacitances", lines, control), names).numbers
    gg, gd, dd = (np.array([found[f"{kind}{k}"] for k in range(gates.size)]) for kind in ("gg", "gd", "dd"))
    return gg, -gd, dd


def model_version() -> str:
    """Return the name of the transistor model that ngspice uses for the cards."""
    deck = _deck(
        "model of the card",
        [_device("1", "d g 0 0", "n"), "vd d 0 1", "vg g 0 1"],
        ["op", "let current = -i(vd)", "print current", "showmod m1 : version"],
    )
    log = run_deck(deck, ["current"]).log
    return next(line.strip() for line in log.splitlines() if "BSIM" in line)
