"""Cells, stages and circuits: efforts, paths, activity, leakage and adders, all through ``estimate``.

Logical-effort rows use unit switches with the pull-up mu times as wide (equal drive, mu times the capacitance), a step
rule and no internal nodes: the conventions of the tables. One tau is ln 2 R C_inverter.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

from scipy.optimize import minimize_scalar

from benchmark.circuits import adder, library, netlist, operation, sized
from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Load, Net, Wires
from benchmark.devices.record import SwitchPair
from tests.factories import ohmic_pair
from tests.published.rows import Binding

ESTIMATE = "benchmark.circuits.operation:estimate"
NETLIST = "benchmark.circuits.netlist:"
R, C = 1.0e4, 1.0e-15
NO_WIRE = Wires(0.0, 0.0)


def _pair(mu: float = 2.0, own: float = 1.0) -> SwitchPair:
    """Switches of equal drive, the pull-up mu times as capacitive; ``own``: terminal over input capacitance."""
    return ohmic_pair(
        on_resistance=R,
        input_capacitance=C,
        terminal_capacitance=own * C,
        up={"input_capacitance": mu * C, "terminal_capacitance": mu * own * C},
    )


def _effort(name: str, mu: float = 2.0) -> float:
    """Logical effort: how much one more input of its own kind delays a cell, in tau."""
    return _delay([_stage(name, 4.0)], mu=mu) - _delay([_stage(name, 3.0)], mu=mu)


def _delay(nets: Sequence[Net], own: float = 1.0, mu: float = 2.0) -> float:
    """Path delay in tau."""
    found = operation.estimate(
        Circuit("path", "", "", tuple(nets)),
        _pair(mu, own),
        NO_WIRE,
        "step",
        sizing="equal-drive",
        internal_nodes=False,
        short_circuit=False,
    )
    return float(found.path_delay) / (math.log(2.0) * R * (1.0 + mu) * C)


def _stage(name: str, driven: float, times: float = 1.0, label: str = "stage") -> Net:
    """Stage driving ``driven`` inputs of its own kind (a wider next stage is that many inputs)."""
    which = cell(name)
    return Net(label, which, loads=(Load(which, "a", driven),), on_critical_path=times)


def _path(names: Sequence[str], branching: float, electrical: float) -> float:
    """Least delay [tau] of a path: every stage at the effort (G B H)^(1/N)."""
    efforts = [_effort(name) for name in names]
    best = (math.prod(efforts) * branching * electrical) ** (1.0 / len(names))
    return _delay(
        [_stage(name, best / g, label=f"{i}") for i, (name, g) in enumerate(zip(names, efforts, strict=True))]
    )


def _sizes() -> list[float]:
    stage = 5.0
    y = 45.0 * _effort("nor2") / stage
    return [y, 2.0 * y * _effort("nand3") / stage]


def _decoder32() -> list[float]:
    f = _effort("nand5") * 16.0 * 192.0 / 60.0
    return [f, math.sqrt(f), _path(["nand5", "inverter"], 16.0, 192.0 / 60.0)]


def _best_effort(p: float) -> float:
    def per_octave(rho: float) -> float:
        return _delay([_stage("inverter", rho)], own=p) / math.log(rho)

    return float(minimize_scalar(per_octave, bounds=(1.5, 8.0), method="bounded", options={"xatol": 1e-9}).x)


def _ring_frequency() -> float:
    tau = 3e-12
    ring = library.build("ring", {"stage_count": 31.0, "fan_out": 1.0})
    pair = ohmic_pair(on_resistance=tau / (math.log(2.0) * 2.0 * C), input_capacitance=C, terminal_capacitance=C)
    return float(1.0 / operation.estimate(ring, pair, NO_WIRE, "step").path_delay) / 1e9


def _adder(bits: int) -> dict[str, float]:
    """Gates, delay [tau], total capacitance [C_inv] and energy [C_inv V^2], the operands' input pins included."""
    net = adder.ripple_adder(bits)
    activity = netlist.rising_probability(net) if bits <= 4 else adder.ripple_adder_activity(bits)
    nets = library.netlist_nets(net, activity, netlist.longest_path(net), cell("inverter"), {})
    pair = _pair()
    found = operation.estimate(
        Circuit("adder", "", "", nets),
        pair,
        NO_WIRE,
        "step",
        sizing="equal-drive",
        internal_nodes=False,
        short_circuit=False,
    )
    made, inverter = sized.Sized(pair, sizing="equal-drive"), 3.0 * C
    pins = {
        name: sum(float(made.input_charge(load.cell, load.input)) for load in netlist.loads(net, name))
        for name in net.inputs
    }
    capacitance = (float(found.switched_capacitance) + sum(pins.values())) / inverter
    energy = (float(found.dynamic_energy) + sum(activity[name] * pins[name] for name in pins)) / inverter
    return {
        "gates": float(found.cell_count),
        "delay": float(found.path_delay) / (math.log(2.0) * R * inverter),
        "Ctot": capacitance,
        "Esw": energy,
        "alpha": energy / capacitance,
    }


def _gate_activity(gates: tuple[netlist.Gate, ...], output: str) -> float:
    return netlist.rising_probability(netlist.Netlist("gate", ("x", "y"), gates, (output,)))[output]


XOR = (
    netlist.Gate("n", "nand2", ("x", "y")),
    netlist.Gate("l", "nand2", ("x", "n")),
    netlist.Gate("r", "nand2", ("n", "y")),
    netlist.Gate("out", "nand2", ("l", "r")),
)


def _leak(name: str, pair: SwitchPair, count: float = 1.0) -> float:
    circuit = Circuit("cell", "", "", (Net("out", cell(name), count=count),))
    return float(operation.estimate(circuit, pair, NO_WIRE).leakage_power)


def _fixed(nets: Sequence[tuple[float, float]], supply: float) -> float:
    """Energy per cycle [J] of nets given as (capacitance, rising transitions per cycle)."""
    made = tuple(Net(f"{i}", cell("inverter"), fixed_load=c, rising_per_operation=a) for i, (c, a) in enumerate(nets))
    pair = ohmic_pair(supply=supply)
    return float(operation.estimate(Circuit("nets", "", "", made), pair, NO_WIRE, short_circuit=False).dynamic_energy)


def _bit_line() -> float:
    line = Net(
        "bit line",
        cell("inverter"),
        fixed_load=256 * 0.15e-15,
        swing=0.1,
        swing_from="supply",
        rising_per_operation=1.0,
    )
    pair = ohmic_pair(supply=0.7)
    found = operation.estimate(Circuit("column", "", "", (line,)), pair, NO_WIRE, short_circuit=False)
    return float(found.dynamic_energy) / 1e-15


def _ratio_for_leakage_share(share: float) -> float:
    """On/off ratio at which leakage is ``share`` of switching, from one estimate (leakage goes as 1/ratio)."""
    tried = 1e6
    chain = library.build("inverter-chain", {"logic_depth": 20.0, "fan_out": 1.0, "activity": 0.05})
    pair = ohmic_pair(on_resistance=R, off_resistance=tried * R)
    found = operation.estimate(chain, pair, NO_WIRE, "step", short_circuit=False)
    return float(tried * found.leakage_power * found.path_delay / found.dynamic_energy / share)


def _chip() -> float:
    logic, memory = 50e6 * 12 * 25e-9 * 1.8e-9, 950e6 * 4 * 25e-9 * 1.8e-9
    return _fixed([(logic, 0.1), (memory, 0.02)], 1.0) * 1e9


BINDINGS = [
    Binding("cir.LE-FO4-p", (ESTIMATE,), lambda: _delay([_stage("inverter", 4.0)], own=0.5)),
    *(
        Binding(f"cir.LE-g-{name.upper()}", (ESTIMATE,), lambda name=name: _effort(name))
        for name in ("nand2", "nor2", "nand3", "nand4", "nor4")
    ),
    *(
        Binding(f"cir.LE-g-{name.upper()}-mu{mu}", (ESTIMATE,), lambda name=name, mu=mu: _effort(name, mu))
        for name, mu in (
            ("nand2", 1.0),
            ("nor2", 1.0),
            ("nand2", 1.5),
            ("nand2", 2.0),
            ("nor2", 2.0),
            ("nand2", 3.0),
        )
    ),
    Binding("cir.LE-RO31-65", (ESTIMATE, "benchmark.circuits.library:build"), _ring_frequency),
    Binding("cir.LE-3NAND-H1", (ESTIMATE,), lambda: _path(["nand2"] * 3, 1.0, 1.0)),
    Binding("cir.LE-3NAND-H8", (ESTIMATE,), lambda: _path(["nand2"] * 3, 1.0, 8.0)),
    Binding("cir.LE-3NAND-B6", (ESTIMATE,), lambda: _path(["nand2"] * 3, 6.0, 4.5)),
    Binding("cir.LE-WH-22", (ESTIMATE,), lambda: _path(["nand2", "nand3", "nor2"], 6.0, 45.0 / 8.0)),
    Binding("cir.LE-WH-22-sizes", (ESTIMATE,), _sizes),
    *(
        Binding(
            f"cir.LE-AND8-{row}", (ESTIMATE,), lambda names=names: [_path(names, 1.0, 1.0), _path(names, 1.0, 12.0)]
        )
        for row, names in (
            ("NAND4-NOR2", ["nand4", "nor2"]),
            ("NAND2-NOR2-NAND2-INV", ["nand2", "nor2", "nand2", "inverter"]),
        )
    ),
    *(
        Binding(
            f"cir.LE-DEC-{row}",
            (ESTIMATE,),
            lambda row=row: _path([n.lower().replace("inv", "inverter") for n in row.split("-")], 8.0, 9.6),
        )
        for row in (
            "NAND4-INV",
            "INV-NAND4-INV",
            "NAND4-INV-INV-INV",
            "NAND2-NOR2-INV-INV",
            "NAND2-INV-NAND2-INV",
            "NAND2-INV-NAND2-INV-INV-INV",
        )
    ),
    Binding("cir.LE-DEC32", (ESTIMATE,), _decoder32),
    *(Binding(f"cir.LE-rho-p{p}", (ESTIMATE,), lambda p=p: _best_effort(p)) for p in (0, 0.5, 1.0, 2.0)),
    Binding(
        "cir.ACT-NAND2",
        (NETLIST + "rising_probability",),
        lambda: _gate_activity((netlist.Gate("out", "nand2", ("x", "y")),), "out"),
    ),
    Binding("cir.ACT-XOR2", (NETLIST + "rising_probability",), lambda: _gate_activity(XOR, "out")),
    Binding("cir.LEAK-NAND2-ohm", (ESTIMATE,), lambda: _leak("nand2", ohmic_pair(off_resistance=1e9)) * 1e9),
    Binding("cir.RATIO-LEAK", (ESTIMATE,), lambda: _ratio_for_leakage_share(0.1)),
    Binding(
        "cir.RATIO-CHIP",
        (ESTIMATE,),
        lambda: _leak("inverter", ohmic_pair(supply=0.7, on_resistance=9e3, off_resistance=10e3), 1e9) / 1.0,
    ),
    Binding("cir.PDYN-WH", (ESTIMATE,), _chip, (2,)),
    Binding("cir.SRAM-E", (ESTIMATE,), _bit_line),
    Binding("cir.FF-E", (ESTIMATE,), lambda: _fixed([(4e-15, 1.0), (6e-15, 0.1)], 0.7) / 1e-15),
    *(
        Binding(
            f"cir.RCA-{what}-{bits}",
            (ESTIMATE, NETLIST + "rising_probability"),
            lambda what=what, bits=bits: _adder(bits)[what],
        )
        for what, bits in (
            ("gates", 1),
            ("delay", 1),
            ("Ctot", 1),
            ("Esw", 1),
            ("gates", 4),
            ("delay", 4),
            ("Esw", 4),
            ("alpha", 4),
            ("gates", 8),
            ("delay", 8),
            ("Ctot", 8),
            ("Esw", 8),
            ("gates", 16),
            ("delay", 16),
            ("Ctot", 16),
            ("gates", 32),
            ("delay", 32),
        )
    ),
    Binding("cir.RCA-slope", (ESTIMATE,), lambda: (_adder(32)["delay"] - _adder(16)["delay"]) / 16.0),
]
