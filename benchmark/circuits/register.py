"""The register: a positive-edge-triggered D flip-flop of six NAND gates, and what its netlist says (layer 5).

One netlist for every technology. Setup and clock-to-output paths and the activity of every internal net are found by
simulating it, gate by gate, in unit stages. (Six-NAND flip-flop: the classic edge-triggered circuit of data books,
common practice, no source.)
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from functools import lru_cache

from benchmark.circuits.netlist import Gate, Netlist, Settled, settle

__all__ = ["FLIP_FLOP", "RegisterFacts", "register_facts"]

#: s, r: set and reset of the output latch (active low); p, m: the input latches
FLIP_FLOP = Netlist(
    "six-NAND flip-flop",
    inputs=("clock", "data"),
    gates=(
        Gate("m", "nand2", ("p", "s")),
        Gate("s", "nand2", ("m", "clock")),
        Gate("r", "nand3", ("s", "clock", "p")),
        Gate("p", "nand2", ("r", "data")),
        Gate("q", "nand2", ("s", "q_bar")),
        Gate("q_bar", "nand2", ("q", "r")),
    ),
    outputs=("q", "q_bar"),
)


@dataclass(frozen=True)
class RegisterFacts:
    """What the walk of the flip-flop finds.

    setup, clock_to_output
        The nets of the longest path from a data change to a settled input latch, and from the rising clock to ``q``.
    rising_quiet, rising_toggle
        Rising transitions of every driven net per clock cycle when the data stays, and when it changes (each the
        mean over the two data values). Data changes once per cycle, while the clock is low.
    """

    setup: tuple[str, ...]
    clock_to_output: tuple[str, ...]
    rising_quiet: dict[str, float]
    rising_toggle: dict[str, float]


def _at_rest(stored: bool) -> dict[str, bool]:
    """Return the settled state with the clock low, ``stored`` both stored and at the data input."""
    start = {"clock": False, "data": stored, "s": True, "r": True, "q": stored, "q_bar": not stored}
    start["p"] = not stored  # nand(r = 1, data)
    start["m"] = stored  # nand(p, s = 1)
    return start


@lru_cache(maxsize=1)
def register_facts() -> RegisterFacts:
    """Simulate the flip-flop for every (stored value, next value) through one whole clock cycle."""
    setup: tuple[str, ...] = ()
    output: tuple[str, ...] = ()
    counts: dict[bool, dict[str, float]] = {True: {}, False: {}}
    for old, new in itertools.product((False, True), repeat=2):
        arrive = settle(FLIP_FLOP, _at_rest(old), {"data": new})
        rise = settle(FLIP_FLOP, arrive.values, {"clock": True})
        fall = settle(FLIP_FLOP, rise.values, {"clock": False})
        setup = max(setup, _slowest(arrive), key=len)
        if "q" in rise.changed_at:
            output = max(output, rise.path_to("q"), key=len)
        seen = counts[old != new]
        for gate in FLIP_FLOP.gates:
            net = gate.output
            seen[net] = seen.get(net, 0.0) + 0.5 * sum(part.rising.get(net, 0) for part in (arrive, rise, fall))
    return RegisterFacts(setup, output, counts[False], counts[True])


def _slowest(settled: Settled) -> tuple[str, ...]:
    if not settled.cause:
        return ()
    last = max(settled.cause, key=lambda net: settled.changed_at[net])
    return settled.path_to(last)
