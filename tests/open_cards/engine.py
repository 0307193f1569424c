"""What the program says of a set at any supply: the set is loaded as a user's file is."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

import numpy as np

from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Load, Net, Wires
from benchmark.circuits.operation import estimate
from benchmark.devices import model
from benchmark.devices.model import DeviceModel, ModelInputs, Prepared
from benchmark.devices.record import Array, SwitchPair
from benchmark.evaluate.batch import Batch, resolve
from benchmark.record.load import load_technology

__all__ = ["Stage", "pair_at", "stage"]


@lru_cache(maxsize=16)
def _known(name: str, folders: tuple[Path, ...]) -> tuple[DeviceModel, Prepared, Array]:
    technology = load_technology(name, *folders)
    node = technology.nodes[0]
    values = resolve(technology.id, technology.at(node), Batch.best_estimate())
    device = model(technology.model)
    prepared = device.prepare(ModelInputs(values, technology.options, {}))
    return device, prepared, values["reference_temperature"].reshape(1, 1, 1)


def pair_at(name: str, supply: float, *folders: Path) -> SwitchPair:
    """Switches of a set at one supply and its reference temperature."""
    device, prepared, kelvin = _known(name, folders)
    pair: SwitchPair = device.switch(
        prepared,
        np.full((1, 1, 1), supply),
        kelvin,
        {"threshold_shift": np.zeros((1, 1, 1)), "stack_depth": np.ones((1, 1, 1))},
    )
    return pair


@dataclass(frozen=True)
class Stage:
    """Fan-out-of-four inverter without wires: delay [s], energy per cycle without leakage [J], leakage power [W]."""

    delay: float
    energy: float
    leakage: float


def stage(pair: SwitchPair, added: float = 0.0, rule: str = "chain") -> Stage:
    """Estimate the stage; ``added`` [F]: linear capacitance at its output; ``rule``: delay rule."""
    inverter = cell("inverter")
    net = Net(
        "stage",
        inverter,
        loads=(Load(inverter, "a", 4.0),),
        fixed_load=added,
        rising_per_operation=1.0,
        on_critical_path=1.0,
    )
    found = estimate(Circuit("fan-out-4", "fan-out 4", "one full cycle", (net,)), pair, Wires(0.0, 0.0), rule)
    return Stage(found.path_delay.item(), found.dynamic_energy.item(), found.leakage_power.item())
