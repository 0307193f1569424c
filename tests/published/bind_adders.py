"""Prefix adders and the array multiplier: cells, levels, fan-out, tracks, wire and delay forms."""

from __future__ import annotations

from benchmark.circuits import multiplier, prefix
from tests.published.rows import Binding

PREFIX = "benchmark.circuits.prefix:"
ARRAY = "benchmark.circuits.multiplier:"
KINDS = {"KS": "kogge-stone", "SK": "sklansky", "BK": "brent-kung"}


def _counts(kind: str, bits: int) -> list[float]:
    found = prefix.prefix_counts(prefix.prefix_graph(kind, bits))
    return [found.levels, found.cells, found.gray, found.fan_out, found.tracks, found.wire]


def _delays() -> list[float]:
    graphs = [prefix.prefix_graph(kind, 64) for kind in ("kogge-stone", "brent-kung", "serial")]
    return [prefix.prefix_delay(graph, 4.0, 3.0, 4.0, as_drawn=True) for graph in graphs]


def _array(bits: int) -> list[float]:
    found = multiplier.array_counts(bits, bits)
    return [found["and"], found["full"], found["half"]]


BINDINGS = [
    *(
        Binding(
            f"cir.PFX-{short}-{bits}", (PREFIX + "prefix_counts",), lambda kind=kind, bits=bits: _counts(kind, bits)
        )
        for short, kind in KINDS.items()
        for bits in (8, 16, 32, 64)
        if (short, bits) != ("KS", 8)
    ),
    Binding("cir.PFX-DELAY", (PREFIX + "prefix_delay",), _delays),
    *(Binding(f"cir.MUL-{bits}", (ARRAY + "array_counts",), lambda bits=bits: _array(bits)) for bits in (4, 8)),
    Binding("cir.MUL-delay", (ARRAY + "array_delay",), lambda: multiplier.array_delay(8, 8, 1.0, 3.0, 2.0)),
]
