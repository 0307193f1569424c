"""Wires: delay of lines, repeaters, narrow-line resistivity, capacitance, length distributions."""

from __future__ import annotations

import numpy as np

from benchmark.constants import VACUUM_PERMITTIVITY
from benchmark.physics import wire_lengths, wires
from tests.published.rows import Binding

WIRES = "benchmark.physics.wires:"
LENGTHS = "benchmark.physics.wire_lengths:"
NM, UM, MM, CM = 1e-9, 1e-6, 1e-3, 1e-2
FREE = 39.9 * NM


def _film(thickness: float, specularity: float) -> list[float]:
    return [
        float(wires.fuchs_sondheimer(thickness, FREE, specularity)),
        float(wires.fuchs_sondheimer_thick(thickness, FREE, specularity)),
    ]


def _narrow(width: float, specularity: float, reflection: float) -> list[float]:
    rho = wires.narrow_line_resistivity(width, 2 * width, specularity, reflection)
    return [float(rho) / 1e-8, float(wires.line_resistance_per_length(rho, width, 2 * width)) / 1e6]


def _coupled(relative_permittivity: float) -> float:
    return float(wires.coupled_line_capacitance(1.0, 1.0, 1.0, 1.0, relative_permittivity))


def _repeaters() -> list[float]:
    count, size, total = wires.repeater_optimum(2e3, 2e-12, 10e3, 1e-15)
    return [float(count), float(size), float(total) / 1e-12]


BINDINGS = [
    *(
        Binding(
            f"cir.ELM-ladder-{n}",
            (WIRES + "uniform_ladder", WIRES + "elmore_delay"),
            lambda n=n: wires.uniform_ladder(1.0, 1.0, n),
        )
        for n in (1, 2, 5, 10)
    ),
    *(
        Binding(f"cir.RC-dist-{name}", (WIRES + "distributed_rc_time",), lambda y=level: wires.distributed_rc_time(y))
        for name, level in (("50", 0.5), ("63", 1 - np.exp(-1.0)), ("90", 0.9))
    ),
    Binding(
        "cir.RC-dist-1090",
        (WIRES + "distributed_rc_time",),
        lambda: wires.distributed_rc_time(0.9) - wires.distributed_rc_time(0.1),
    ),
    Binding(
        "cir.WIRE-RC1",
        (WIRES + "distributed_rc_time",),
        lambda: wires.distributed_rc_time(0.5) * (10.0 * 1000.0) * ((0.058 + 2 * 0.043) * 1e-15 * 1000.0) / 1e-9,
    ),
    Binding(
        "cir.WIRE-C",
        (WIRES + "plate_and_edge_capacitance",),
        lambda: wires.plate_and_edge_capacitance(10 * CM, 4 * UM, 0.031e-15 / UM**2, 0.044e-15 / UM) / 1e-12,
    ),
    Binding(
        "cir.WIRE-BUF",
        (WIRES + "segmented_line",),
        lambda: np.array([1.0, 1e9]) * np.array(wires.segmented_line(13.537e-9, 0.5e-9)),
    ),
    *(
        Binding(
            f"cir.FS-{d}-p{p}",
            (WIRES + "fuchs_sondheimer", WIRES + "fuchs_sondheimer_thick"),
            lambda d=d, p=p: _film(d * NM, p),
        )
        for d, p in ((20, 0.0), (20, 0.5), (40, 0.0), (100, 0.0))
    ),
    *(
        Binding(
            f"cir.MS-{d}-R{r}", (WIRES + "mayadas_shatzkes",), lambda d=d, r=r: wires.mayadas_shatzkes(d * NM, FREE, r)
        )
        for d, r in ((20, 0.2), (20, 0.3), (100, 0.3))
    ),
    *(
        Binding(
            f"cir.CUWIRE-{w}-p{p}-R{r}",
            (WIRES + "narrow_line_resistivity", WIRES + "line_resistance_per_length", WIRES + "mayadas_shatzkes"),
            lambda w=w, p=p, r=r: _narrow(w * NM, p, r),
        )
        for w, p, r in ((20, 0.0, 0.3), (40, 0.0, 0.3), (100, 0.0, 0.3), (20, 0.25, 0.25))
    ),
    Binding(
        "cir.CAP-ST",
        (WIRES + "single_line_capacitance", WIRES + "coupled_line_capacitance"),
        lambda: [
            float(wires.single_line_capacitance(1.0, 1.0, 1.0)) / VACUUM_PERMITTIVITY,
            _coupled(1.0) / VACUUM_PERMITTIVITY,
        ],
    ),
    Binding("cir.CAP-ST-um", (WIRES + "coupled_line_capacitance",), lambda: _coupled(2.7) / (1e-15 / UM)),
    Binding("cir.REP-coef", (WIRES + "repeater_optimum",), lambda: wires.repeater_optimum(1.0, 1.0, 1.0, 1.0)[2]),
    Binding("cir.REP-ex", (WIRES + "repeater_optimum",), _repeaters),
    *(
        Binding(f"cir.TOF-{e}", (WIRES + "time_of_flight",), lambda e=e: wires.time_of_flight(e) / (1e-12 / MM))
        for e in (1.0, 2.7, 3.9)
    ),
    Binding("cir.RENT-MPU", (LENGTHS + "rent_terminals",), lambda: wire_lengths.rent_terminals(144500, 0.89, 0.45)),
    Binding("cir.RENT-SRAM", (LENGTHS + "rent_terminals",), lambda: wire_lengths.rent_terminals(144500, 6.9, 0.12)),
    *(
        Binding(
            f"cir.DAVIS-{n}-p{p}",
            (LENGTHS + "davis_continuous",),
            lambda n=n, p=p: wire_lengths.davis_continuous(float(n), p, 4.0, 3.0),
        )
        for n, p in (
            ("1e+04", 0.45),
            ("1e+04", 0.6),
            ("1e+04", 0.75),
            ("1e+06", 0.45),
            ("1e+06", 0.6),
            ("1e+08", 0.45),
            ("1e+08", 0.75),
        )
    ),
    *(
        Binding(
            f"cir.DAVIS-disc-{n}",
            (LENGTHS + "davis_discrete",),
            lambda n=n: wire_lengths.davis_discrete(n, 0.6, 4.0, 3.0),
        )
        for n in (1024, 10000, 1000000)
    ),
    *(
        Binding(
            f"cir.DONATH-{n}-p{p}",
            (LENGTHS + "donath_mean_length",),
            lambda n=n, p=p: wire_lengths.donath_mean_length(float(n), p),
        )
        for n, p in (
            (1024, 0.45),
            (1024, 0.75),
            (10000, 0.45),
            (10000, 0.6),
            (10000, 0.75),
            (1000000, 0.45),
            (1000000, 0.6),
        )
    ),
    Binding(
        "cir.DONATH-pair",
        (LENGTHS + "donath_pair_distance",),
        lambda: [wire_lengths.donath_pair_distance(1.0), wire_lengths.donath_pair_distance(4.0)],
    ),
    Binding(
        "cir.RLB-net",
        (LENGTHS + "net_length", LENGTHS + "davis_discrete"),
        lambda: [
            length := wire_lengths.net_length(wire_lengths.davis_discrete(10**6, 0.6, 4.0, 3.0)[1], 3.0),
            length * 0.2,
            length * 0.2 * 0.2,
        ],
    ),
]
