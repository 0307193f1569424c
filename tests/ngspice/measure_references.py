"""How far the closed forms are from circuit simulation: measures ``tests/data/closed-form-bands.csv``.

Run by hand (some minutes)::

    .venv/bin/python -m tests.ngspice.measure_bands

Four reference sets, 0.2 V to the declared supply, an inverter with fan-out 4 and a NAND2 with fan-out 3 (one input
moving, the other held at the supply). ngspice solves the sub-circuits with the charges of the device; the closed forms
are those of the rule ``chain``: delay C V / (2 I_eff) with its capacitance weights, energy C V^2 with and without the
short-circuit estimate, leakage averaged over input states. Every ratio is closed over simulated.
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np

from tests.ngspice.benches import bench, four_states

SETS = (
    ("open-7nm-regular", "n7", 0.7),
    ("silicon-14nm-finfet", "n14", 0.7),
    ("silicon-32nm-high-performance", "n32", 1.0),
    ("silicon-45nm-high-performance", "n45", 1.0),
)
#: cell, moving input, fan-out; input b of the NAND2 is the one next to the rail
STAGES = (("inverter", "a", 4.0), ("nand2", "a", 3.0), ("nand2", "b", 3.0))
PATH = Path(__file__).parent.parent / "data" / "closed-form-bands.csv"
RATIOS = ("delay", "delay_falling", "delay_rising", "energy", "energy_without_short_circuit", "leakage")
SOURCE = "own simulation, ngspice 39.3, tests/ngspice/measure_bands.py"


def measure(technology: str, node: str, supply: float, cell_name: str, pin: str, fan_out: float) -> dict[str, float]:
    """Return the simulated numbers of one stage and the ratios closed over simulated."""
    one = bench(technology, node, supply, cell_name=cell_name, pin=pin, fan_out=fan_out)
    spice, closed = one.chain("device"), one.estimate()
    leakage = spice["leakage_power"] if cell_name == "inverter" else float(np.mean(four_states(one)))
    stage = closed.stages[0]
    energy = closed.dynamic_energy.item()
    return {
        "simulated_delay_ps": spice["delay"] * 1e12,
        "simulated_energy_fJ": spice["switching_energy"] * 1e15,
        "simulated_leakage_nW": leakage * 1e9,
        "delay": closed.path_delay.item() / spice["delay"],
        "delay_falling": stage.falling.delay.item() / spice["delay_falling"],
        "delay_rising": stage.rising.delay.item() / spice["delay_rising"],
        "energy": energy / spice["switching_energy"],
        "energy_without_short_circuit": (energy - closed.dynamic_energy_parts["short_circuit"].item())
        / spice["switching_energy"],
        "leakage": closed.leakage_power.item() / leakage,
    }


def main() -> None:
    """Measure every point and write the table."""
    rows = []
    for technology, node, declared in SETS:
        for supply in np.round(np.arange(0.2, declared + 0.01, 0.1), 6).tolist():
            for cell_name, pin, fan_out in STAGES:
                found = measure(technology, node, supply, cell_name, pin, fan_out)
                numbers = {name: f"{value:.5g}" for name, value in found.items()}
                place = {"technology": technology, "node": node, "supply_V": f"{supply:g}"}
                stage = {"cell": cell_name, "input": pin, "fan_out": f"{fan_out:g}"}
                rows.append({**place, **stage, **numbers, "source": SOURCE})
                print(*rows[-1].values())
    with PATH.open("w", newline="", encoding="utf-8") as stream:
        writer = csv.DictWriter(stream, list(rows[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)


if __name__ == "__main__":
    main()
