"""Small valid files of every kind, to be spoiled one place at a time, and what the check says about them."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from benchmark.circuits.library import BUILT_IN
from benchmark.record.check import check_paths
from benchmark.sets.library import shipped_nodes
from tests.studies import mixed

DATA = Path(__file__).parent / "data" / "refusals"

TECHNOLOGY = """\
schema = 1
id = "switch"
title = "Switch"
model = "given"
nodes = ["g1", "g2"]
reference_temperature = { value = 25.0, unit = "degC" }
[default]
evidence = "invented"
source = "invented"
conditions = "-"
[option]
off_state = "resistance"
[value.declared_supply]
value = 0.5
unit = "V"
[value.on_resistance]
by_node = { g1 = 50.0, g2 = 40.0 }
unit = "kohm"
[value.off_resistance]
value = 2.0e6
unit = "Mohm"
[value.switching_level]
value = 0.7
[value.input_capacitance]
value = 0.25
unit = "fF"
[value.closing_delay]
value = 0.05
unit = "ns"
[value.opening_delay]
value = 0.05
unit = "ns"
[value.closing_voltage]
value = 0.35
unit = "V"
"""

STAGES = """\
schema = 1
id = "stages"
title = "Stages"
model = "stage-table"
nodes = ["g1"]
reference_temperature = { value = 25.0, unit = "degC" }
[default]
evidence = "invented"
source = "invented"
conditions = "-"
[value.declared_supply]
value = 0.5
unit = "V"
[[row]]
node = "g1"
supply = { value = 0.5, unit = "V" }
temperature = { value = 25.0, unit = "degC" }
delay = { value = 15.0, unit = "ps" }
energy_per_cycle = { value = 0.75, unit = "fJ" }
leakage_power = { value = 20.0, unit = "pW" }
[[row]]
node = "g1"
supply = { value = 0.6, unit = "V" }
temperature = { value = 25.0, unit = "degC" }
delay = { value = 10.0, unit = "ps" }
energy_per_cycle = { value = 1.08, unit = "fJ" }
leakage_power = { value = 27.0, unit = "pW" }
"""

WIRES = """\
schema = 1
id = "lines"
title = "Lines"
kind = "wires"
nodes = ["w1"]
[default]
evidence = "invented"
source = "invented"
[value.wire_resistance_per_length]
value = 50.0
unit = "ohm/um"
[value.wire_capacitance_per_length]
value = 0.2
unit = "fF/um"
[value.layout_capacitance_per_pin]
value = 20.0
unit = "aF"
"""

CIRCUIT = """\
schema = 1
id = "word-line"
title = "Word line"
operation = "one row access"
[default]
evidence = "invented"
source = "invented"
[[net]]
name = "line"
driver = "inverter"
loads = [{ cell = "nand2", input = "a", count = 2 }]
fixed_load = { value = 1.0, unit = "fF" }
wire = { length = 500.0, length_unit = "um", layer = "upper" }
swing = { value = 1.8, unit = "V", reason = "set by the cell" }
rising_per_operation = 0.5
on_critical_path = 1
[layer.upper]
resistance_per_length = { value = 20.0, unit = "ohm/um" }
capacitance_per_length = { value = 0.2, unit = "fF/um" }
"""

SOURCES = """\
schema = 1
[film-batch]
kind = "measurement"
authors = ["example team (fictional)"]
year = 2026
title = "Batch"
read = "original"
"""

TABLE_SET = """\
schema = 1
id = "curves"
title = "Curves"
model = "table"
nodes = ["g1"]
reference_temperature = { value = 25.0, unit = "degC" }
[default]
evidence = "invented"
source = "invented"
conditions = "-"
[table.current]
file = "tables/curve.csv"
[value.declared_supply]
value = 0.3
unit = "V"
[value.saturation_voltage]
value = 60.0
unit = "mV"
[value.unit_width]
value = 1.0
unit = "um"
[value.gate_capacitance_total]
value = 1.0
unit = "fF/um"
[value.terminal_capacitance_per_width]
value = 0.1
unit = "fF/um"
[value.drain_capacitance_share]
value = 0.0
[value.transit_time]
value = 0.0
unit = "ps"
"""

SIDECAR = """\
schema = 1
file = "curve.csv"
evidence = "invented"
source = "invented"
conditions = "25 degC"
floor = { column = "I", value = 1.0e-13, unit = "A/um" }
interpolate = { column = "I", along = "V", scale = "log", method = "monotone" }
[column.sweep]
meaning = "sweep"
kind = "label"
allowed = ["forward", "backward"]
[column.V]
meaning = "control_voltage"
kind = "axis"
unit = "V"
[column.U]
meaning = "path_voltage"
kind = "axis"
unit = "V"
[column.T]
meaning = "temperature"
kind = "axis"
unit = "degC"
[column.I]
meaning = "path_current_per_width"
kind = "value"
unit = "A/um"
"""

CURVE = """\
sweep,V,U,T,I
forward,0.0,0.3,25,1e-12
forward,0.1,0.3,25,1e-10
forward,0.2,0.3,25,1e-8
forward,0.3,0.3,25,1e-6
backward,0.0,0.3,25,6e-12
backward,0.1,0.3,25,6e-10
backward,0.2,0.3,25,6e-8
backward,0.3,0.3,25,1e-6
"""

RAW_CURVES = """\
schema = 1
kind = "curves"
file = "raw.csv"
header_starts = "VG"
units = "row"
comment = "#"
along = "control_voltage"
ignore = ["Time"]
evidence = "invented"
source = "invented"
conditions = "probe station"
fixed = { width = { value = 2.0, unit = "um" } }
[[column]]
header = "VG"
meaning = "control_voltage"
kind = "axis"
[[column]]
header = "VD"
meaning = "path_voltage"
kind = "axis"
[[column]]
header = "T"
meaning = "temperature"
kind = "axis"
[[column]]
header = "Die"
meaning = "device"
kind = "label"
allowed = ["A1", "A2"]
[[column]]
header = "ID"
meaning = "path_current"
kind = "value"
per_width = true
floor = { value = 1.0, unit = "pA" }
compliance = { value = 1.0, unit = "mA" }
"""

RAW = """\
Invented analyser, one wafer
VG,VD,T,Die,ID,Time
V,V,degC,-,uA,s
0.0,0.3,25,A1,1e-6,0
0.1,0.3,25,A1,1e-4,1
0.2,0.3,25,A1,1e-2,2
0.3,0.3,25,A1,1.37,3
# second device
0.0,0.3,25,A2,2e-6,4
0.1,0.3,25,A2,2e-4,5
0.2,0.3,25,A2,2e-2,6
0.3,0.3,25,A2,2.41,7
"""

REQUESTS = f"""\
{RAW_CURVES}
[[extract]]
quantity = "average_swing"
span = {{ low = 1.0e-10, high = 1.0e-8, unit = "A/um" }}
name = "subthreshold_swing"
over = "A1"
"""

SIDE_BY_SIDE = """\
schema = 1
kind = "curves"
file = "side.csv"
delimiter = "\\t"
units = "header"
along = "control_voltage"
turns = ["forward", "backward"]
evidence = "invented"
source = "invented"
conditions = "probe station"
fixed = { temperature = { value = 25.0, unit = "degC" } }
[repeat]
label = "device"
words = ["A1", "A2"]
[[given]]
labels = { device = "A1" }
fixed = { width = { value = 2.0, unit = "um" } }
[[given]]
labels = { device = "A2" }
fixed = { width = { value = 1.0, unit = "um" } }
[[column]]
header = "VG"
meaning = "control_voltage"
kind = "axis"
[[column]]
header = "ID"
meaning = "path_current"
kind = "value"
per_width = true
"""

SIDE = """\
VG (V)\tID (uA)\tVG (V)\tID [nA]
0.0\t1e-6\t0.0\t2e-3
0.1\t1e-4\t0.1\t0.2
0.2\t1e-2\t0.2\t20
0.1\t3e-4\t0.1\t0.6
0.0\t3e-6\t\t
"""


def files(kind: str) -> dict[str, str]:
    """The files of a kind by name; the first one is checked."""
    tables = {"tables/curve.toml": SIDECAR, "tables/curve.csv": CURVE}
    return {
        "technology": {"switch.toml": TECHNOLOGY},
        "stages": {"stages.toml": STAGES},
        "wires": {"lines.toml": WIRES},
        "circuit": {"word-line.toml": CIRCUIT},
        "sources": {"sources.toml": SOURCES},
        "table": {"technologies/curves.toml": TABLE_SET, **tables},
        "curves": {"raw.toml": RAW_CURVES, "raw.csv": RAW},
        "requests": {
            "raw.toml": REQUESTS,
            "raw.csv": RAW.replace("0.2,0.3,25,A1", "0.15,0.3,25,A1,1e-3,1\n0.2,0.3,25,A1"),
        },
        "side-by-side": {"side.toml": SIDE_BY_SIDE, "side.csv": SIDE},
        "study": mixed().files(),
    }[kind]


@dataclass(frozen=True)
class Said:
    """Problems and warnings as the user reads them, with names relative to the folder."""

    refused: list[str]
    warned: list[str]


def check(folder: Path, texts: dict[str, str | bytes]) -> Said:
    """Write the files and check the first one."""
    for name, text in texts.items():
        place = folder / name
        place.parent.mkdir(parents=True, exist_ok=True)
        place.write_bytes(text if isinstance(text, bytes) else text.encode("utf-8"))
    found = check_paths([folder / next(iter(texts))])
    return Said(
        *([str(item).replace(f"{folder}/", "") for item in items] for items in (found.problems, found.warnings))
    )


@dataclass(frozen=True)
class Case:
    """One file spoiled at one place: ``old`` becomes ``new`` in ``file``."""

    kind: str
    file: str
    old: str
    new: str
    refused: tuple[str, ...]
    warned: tuple[str, ...]

    def spoiled(self) -> dict[str, str | bytes]:
        """The files with the change; the old text must stand there exactly once."""
        texts: dict[str, str | bytes] = dict(files(self.kind))
        before = str(texts[self.file])
        if before.count(self.old) != 1:
            message = f"{self.old!r} stands {before.count(self.old)} times in {self.file}"
            raise ValueError(message)
        texts[self.file] = before.replace(self.old, self.new)
        return texts


def _expanded(line: str) -> str:
    """Put in what depends on the sets and circuits that ship."""
    for folder in ("technologies", "wires"):
        shipped = {path.stem for path in (shipped_nodes() / folder).glob("*.toml")}
        own = {"technologies": {"new-switch", "old-switch"}, "wires": {"wires"}}[folder]
        line = line.replace(f"<{folder}>", ", ".join(sorted(shipped | own)))
    return line.replace("<circuits>", ", ".join(BUILT_IN))


def cases() -> Iterator[tuple[str, Case]]:
    """Every case of the data files, with a name for the test."""
    for path in sorted(DATA.glob("*.toml")):
        seen: dict[str, int] = {}
        for item in tomllib.loads(path.read_text(encoding="utf-8"))["case"]:
            case = _case(path.stem, item)
            line = (*case.refused, *case.warned, "fine")[0]
            name = f"{path.stem}: {line.partition(': ')[2][:70] or line}"
            seen[name] = seen.get(name, 0) + 1
            yield (f"{name} ({seen[name]})" if seen[name] > 1 else name), case


def _case(kind: str, item: dict[str, Any]) -> Case:
    return Case(
        kind,
        item.get("file", next(iter(files(kind)))),
        item["old"],
        item["new"],
        tuple(_expanded(line) for line in item.get("refused", [])),
        tuple(_expanded(line) for line in item.get("warned", [])),
    )
