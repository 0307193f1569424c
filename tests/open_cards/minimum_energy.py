"""Supply of minimum energy: closed form for an exponential drive, and simulated series of open cards.

Closed form. N stages, activity a, every stage C: with currents I_0 e^x closed and I_0 open, x = V ln 10 / S,

    E = N C V^2 [a + N e^(-x)],   minimum at (x - 2) e^(-x) = 2 a / N,   x = 2 - W_-1(-2 a e^2 / N)

(lower branch of Lambert's function). Form after Calhoun, Wang, Chandrakasan, IEEE JSSC 40 (2005) 1778 (abstract read,
formula from memory), minimum derived. The delay is C V / (2 I_eff) with I_eff = [I(V, V/2) + I(V/2, V)]/2, so that the
second current, e^(-x/2) of the first, and the drain factor f of the device stay: exactly

    E = N C V^2 [a + N f(V) / (e^x f(V/2) + e^(x/2) f(V))]

is what the program must minimise (to the tolerance of its search), and the closed form is met as x grows. The devices
are invented so that the drive is exponential over the whole search: threshold or ceiling far above, no barrier
lowering, constant capacitance.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from decimal import Decimal

import numpy as np
from scipy.optimize import minimize_scalar
from scipy.special import lambertw

from benchmark.physics.virtual_source import thermal_voltage
from tests.comparisons import compare, given, load, planar, side, steep, study
from tests.open_cards.engine import pair_at, stage
from tests.open_cards.predictive import CARDS, SUPPLIED
from tests.open_cards.row import DATA, Row, read_csv
from tests.studies import Table, v

__all__ = ["DRIVES", "Drive", "exponential_rows", "on_off_rows", "second_series_rows", "series_rows"]

STAGES = 20
KELVIN = 298.15
CALHOUN = "closed form (Lambert), after Calhoun, Wang, Chandrakasan, IEEE JSSC 40 (2005) 1778; minimum derived"
Factor = Callable[[float], float]


@dataclass(frozen=True)
class Drive:
    """An invented set with exponential drive: swing [V/decade], load of a stage [F], drain factor."""

    name: str
    swing: float
    load: float
    table: Table
    factor: Factor


def _saturation(path: float) -> float:
    """V_dsat = kT/q below threshold, exponent 3 (virtual source)."""
    ratio = path / float(thermal_voltage(KELVIN))
    return float(ratio / (1.0 + ratio**3) ** (1.0 / 3.0))


def _exponential(path: float) -> float:
    """1 - exp(-V / 5 mV) (steep swing)."""
    return float(-np.expm1(-path / 5e-3))


DRIVES = (
    Drive(
        "virtual source, far below threshold",
        0.070,
        # terminals of both switches, 0.4 fF/um on 0.5 um; the channel holds no charge and there are no edges
        2.0 * 0.4e-9 * 0.5e-6,
        planar(
            "drive",
            supply=1.4,
            on_current=10.0,
            off_current=1e-12,
            subthreshold_swing=70.0,
            drain_barrier_lowering=0.0,
            overlap_capacitance=0.0,
            access_resistance=0.0,
            saturation_exponent=3.0,
            fermi_width=1.0,
        ),
        _saturation,
    ),
    Drive(
        "steep swing, far below its ceiling",
        0.040,
        # gate of the driven switches (0.8 fF/um, none of it to the drain) and terminals (0.2), 0.2 um
        2.0 * (0.8e-9 + 0.2e-9) * 0.2e-6,
        steep(
            "drive",
            supply=0.6,
            on_current=1e5,
            off_current=1e-9,
            subthreshold_swing=40.0,
            saturation_voltage=5.0,
        ),
        _exponential,
    ),
)


def _energy(drive: Drive, supply: float, activity: float) -> float:
    """The exact expression of the module docstring [J]."""
    x, f = supply * np.log(10.0) / drive.swing, drive.factor
    slowness = f(supply) / (np.exp(x) * f(0.5 * supply) + np.exp(0.5 * x) * f(supply))
    return float(STAGES * drive.load * supply**2 * (activity + STAGES * slowness))


def exponential_rows(drive: Drive, activity: str) -> list[Row]:
    """Supply and energy of the minimum that the search finds, beside the exact expression and the closed form."""
    a = float(activity)
    x = 2.0 - float(lambertw(-2.0 * a * np.e**2 / STAGES, -1).real)
    volt = drive.swing / np.log(10.0)
    low, high = 2.5 * volt, 1.6 * x * volt
    files = study(
        side("drive", low, high),
        [side("other", 0.3, 0.5)],
        [drive.table, given("other")],
        values={"activity": v(Decimal(activity)), "logic_depth": v(STAGES)},
        points=61,
        refine=1e-9,
    )
    found = compare(load(files)).candidate
    exact = minimize_scalar(
        lambda supply: _energy(drive, supply, a), bounds=(low, high), method="bounded", options={"xatol": 1e-12}
    )
    pure = STAGES * drive.load * (x * volt) ** 2 * (a + STAGES * np.exp(-x))
    # the closed form leaves out the second current and the drain factor: neither supply nor energy moves by more
    left_out = float(np.exp(-0.5 * x)) + 1.0 - drive.factor(0.5 * x * volt)
    at = f"{drive.name}, activity {activity}"
    supply, energy = float(found.supply[0]), float(found.energy[0])
    kind, volts, joules = "closed form", "supply of minimum energy", "minimum energy"
    return [
        Row(f"{volts}, {at} [V]", "derived", kind, float(exact.x), supply, 1e-6, "exact currents"),
        Row(f"{joules}, {at} [J]", "derived", kind, float(exact.fun), energy, 1e-7, "exact currents"),
        Row(f"{volts}, {at}, pure exponential [V]", CALHOUN, kind, x * volt, supply, left_out),
        Row(f"{joules}, {at}, pure exponential [J]", CALHOUN, kind, float(pure), energy, left_out),
    ]


#: cards -> set, folders, nominal supply
_SETS = {
    **{cards.title: (cards.name, (DATA / "open-cards",), cards.nominal) for cards in CARDS},
    "open 7 nm kit, regular": ("open-7nm-regular", (), 0.7),
    "open 7 nm kit, low": ("open-7nm-low", (), 0.7),
}


def _cycle(cards: str, supply: float, activity: float, depth: float) -> float:
    """Energy of a gate per cycle as long as ``depth`` stages [J]: activity times switching, and its leakage."""
    name, folders, _ = _SETS[cards]
    here = stage(pair_at(name, supply, *folders))
    return activity * here.energy + depth * here.delay * here.leakage


def series_rows() -> list[Row]:
    """Supply and relative energy of the minimum on the grid of the series (50 mV)."""
    rows = []
    for row in read_csv("minimum-energy-cards.csv"):
        if row["at_grid_edge"] == "yes":
            continue
        cards, activity, depth = row["cards"], float(row["activity"]), float(row["depth_fan_out_of_four"])
        nominal, lowest = _SETS[cards][2], float(row["lowest_of_grid_V"])
        grid = [round(supply, 2) for supply in np.arange(lowest, nominal + 0.01, 0.05)]
        energies = {supply: _cycle(cards, supply, activity, depth) for supply in grid}
        best = min(energies, key=energies.__getitem__)
        at, expected = f"{cards}, activity {row['activity']}", float(row["supply_of_minimum_V"])
        rows += [
            Row(
                f"supply of minimum energy, {at} [V]", row["source"], row["status"], expected, best, 0.0501 / expected,
                "grid of 50 mV: one step either way",
            ),
            Row(
                f"minimum energy over that at {nominal:.1f} V, {at} [1]", row["source"], row["status"],
                float(row["minimum_over_nominal"]), energies[best] / energies[nominal], 0.10,
            ),
        ]  # fmt: skip
    return rows


def on_off_rows() -> list[Row]:
    """On/off ratio of the n type over supply, 0.2 V to nominal.

    The 7 nm series was made with another version of the transistor model than the sets were fitted to: its off-currents
    are smaller. The second rows compare the off-current alone with the series of the version of the sets.
    """
    rows = []
    for row in read_csv("on-off-cards.csv"):
        name, folders, nominal = _SETS[row["cards"]]
        supply = float(row["supply_V"])
        if not 0.2 <= supply <= nominal:
            continue
        down = pair_at(name, supply, *folders).down
        ratio = down.on_current.item() / down.off_current_path.item()
        at, kit = f"{row['cards']}, {supply:.2f} V", row["cards"].startswith("open 7 nm")
        allowed, expected = 0.45 if kit else 0.12, float(row["on_off_ratio"])
        rows.append(Row(f"on/off ratio, {at} [1]", row["source"], row["status"], expected, ratio, allowed))
    for row in read_csv("fo4-open-7nm.csv"):
        cards, supply = f"open 7 nm kit, {row['flavour']}", float(row["supply_V"])
        if cards not in _SETS or supply > 0.7:
            continue
        name, folders, _ = _SETS[cards]
        off, at = pair_at(name, supply, *folders).down.off_current_path.item(), f"{cards}, {supply:.2f} V"
        expected, isolates = float(row["off_current_n_nA"]) * 1e-9, f"on/off ratio, {at} [1]"
        rows.append(Row(f"off-current n, {at} [A]", row["source"], "simulated", expected, off, 0.30, "", isolates))
    return rows


def second_series_rows() -> list[Row]:
    """Delay and energy over their nominal values in a second simulation of the planar cards, 0.3 V to nominal."""
    rows, table = [], read_csv("fo4-planar-cards-second.csv")
    for cards in CARDS:
        known = {float(row["supply_V"]): row for row in table if row["cards"] == cards.title}
        if not known:
            continue
        base, here_base = known[cards.nominal], stage(pair_at(cards.name, cards.nominal, SUPPLIED))
        for supply, row in known.items():
            if not 0.3 <= supply < cards.nominal:
                continue
            here, at = stage(pair_at(cards.name, supply, SUPPLIED)), f"{cards.title}, {supply:.2f} V"
            delay = float(row["delay_ps"]) / float(base["delay_ps"])
            energy = float(row["energy_per_cycle_fJ_um"]) / float(base["energy_per_cycle_fJ_um"])
            quick, small = here.delay / here_base.delay, here.energy / here_base.energy
            rows += [
                Row(f"delay over nominal, {at} [1]", row["source"], row["status"], delay, quick, 0.15),
                Row(f"energy over nominal, {at} [1]", row["source"], row["status"], energy, small, 0.10),
            ]
    return rows
