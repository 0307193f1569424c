"""The valid files that are spoiled: every kind of file, every device model, every circuit."""

from __future__ import annotations

import functools
import re
from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal

from benchmark.catalogue import QUANTITIES
from benchmark.circuits.library import BUILT_IN
from benchmark.sets.library import shipped_nodes
from tests import refusals
from tests.studies import Inputs, hub, mixed, v

__all__ = ["Seed", "circuit_study", "seeds"]


@dataclass(frozen=True)
class Seed:
    """Files of which the first one is checked; ``spoiled`` are those that are changed; ``share`` of all mutants."""

    files: Mapping[str, str]
    spoiled: tuple[str, ...]
    share: float


#: a value for every scenario name a built-in circuit may need
_SCENARIO = {
    "logic_depth": v(20), "fan_out": v(3), "activity": v(Decimal("0.05")), "busiest_activity": v(1),
    "stage_count": v(5),
    "gate_count": v(6000), "register_count": v(500), "average_net_pitches": v(8), "bit_gate_pitches": v(4),
    "word_length": v(8),
    "group_bits": v(4), "column_count": v(64), "row_count": v(64), "memory_cell_width": v(Decimal("0.5"), "um"),
    "memory_cell_height": v(Decimal("0.3"), "um"), "memory_cell_word_line_load": v(Decimal("0.1"), "fF"),
    "memory_cell_bit_line_load": v(Decimal("0.1"), "fF"), "memory_cell_supply": v(Decimal("0.7"), "V"),
    "memory_cell_read_current": v(10, "uA"), "bit_line_swing": v(Decimal("0.1"), "V"), "driver_copies": v(4),
    "line_length": v(1, "mm"), "rent_exponent": v(Decimal("0.6")),
}  # fmt: skip


def circuit_study(name: str) -> Inputs:
    """The hub study with another circuit."""
    inputs, declared = hub(), BUILT_IN[name]
    needed = [*declared.required, *(group[0] for group in declared.one_of)]
    if name == "random-logic":
        needed = [*declared.required, "average_net_pitches"]
    inputs.study["workload"]["circuit"] = name
    inputs.study["value"] = {"clock_frequency": v(100, "kHz")} | {
        key: _SCENARIO.get(key) or v(Decimal(str(QUANTITIES[key].low)), QUANTITIES[key].unit) for key in needed
    }
    return inputs


def own_circuit_study() -> Inputs:
    """The hub study with a circuit file."""
    inputs = hub()
    inputs.study["workload"]["circuit"] = "word-line"
    inputs.study["value"] = {"clock_frequency": v(100, "kHz")}
    inputs.texts["circuits/word-line.toml"] = refusals.CIRCUIT
    return inputs


def derived_set() -> str:
    """A set with two derived values."""
    return refusals.TECHNOLOGY.replace(
        '[value.opening_delay]\nvalue = 0.05\nunit = "ns"\n',
        '[value.opening_delay]\nvalue = 0.05\nunit = "ns"\nevidence = "derived"\nformula = "closing_delay * 1"\n',
    )


def _shipped(name: str) -> Seed:
    text = (shipped_nodes() / "technologies" / f"{name}.toml").read_text(encoding="utf-8")
    tables = re.findall(r'file = "(tables/[^"]+)\.csv"', text)
    files = {f"technologies/{name}.toml": text}
    for stem in tables:
        for suffix in (".csv", ".toml"):
            files[stem + suffix] = (shipped_nodes() / f"{stem}{suffix}").read_text(encoding="utf-8")
    return Seed(files, tuple(files), 1.0)


def _study(inputs: Inputs, share: float, only: str = "") -> Seed:
    files = inputs.files()
    return Seed(files, tuple(name for name in files if only in name), share)


@functools.cache
def seeds() -> dict[str, Seed]:
    """Every seed by name."""
    found: dict[str, Seed] = {}
    shares = {"technology": 8, "stages": 6, "wires": 6, "circuit": 8, "sources": 5, "table": 8, "curves": 6}
    for kind, share in (shares | {"side-by-side": 5, "requests": 5}).items():
        files = refusals.files(kind)
        found[kind] = Seed(files, tuple(files), share)
    found["derived"] = Seed({"switch.toml": derived_set()}, ("switch.toml",), 4)
    found["steep-swing"] = Seed(
        {"technologies/old-switch.toml": mixed().files()["nodes/technologies/old-switch.toml"]},
        ("technologies/old-switch.toml",),
        5,
    )
    for name in ("demo-stress-gated", "silicon-45nm-low-power", "demo-table", "demo-stage-table", "hand-stress-gated"):
        found[name] = _shipped(name)
        found[name] = Seed(found[name].files, found[name].spoiled, 5.0)
    found["study"] = _study(mixed(), 5, "study.toml")
    found["study with sets"] = _study(mixed(), 3)
    found["hub"] = _study(hub(), 4)
    found["study with a circuit file"] = _study(own_circuit_study(), 3)
    for name in BUILT_IN:
        found[f"study of {name}"] = _study(circuit_study(name), 0.7, "study.toml")
    return found
