"""Links between stated values against a published ceramic and against definitions worked out apart."""

from __future__ import annotations

import tempfile
from collections.abc import Iterator
from pathlib import Path

import mpmath
import numpy as np

from benchmark.devices import model
from benchmark.devices.links import judged
from benchmark.evaluate.links import link_rows
from benchmark.record.editing import open_set_file
from tests.refusals import TECHNOLOGY
from tests.validation.check import Check

__all__ = ["checks"]

GROUP = "Links between stated values"
#: two currents of one switch (invented), beside its 50 and 40 kohm at 0.5 V
CURRENTS = """\
[value.closed_state_current]
by_node = { g1 = 10.0, g2 = 12.4 }
unit = "uA"
[value.effective_drive_current]
by_node = { g1 = 7.1, g2 = 9.2 }
unit = "uA"
"""


def _ceramic() -> Iterator[Check]:
    """Navy type VI: constants and k33 of one table."""
    values = {"actuator_coefficient": 593e-12, "actuator_compliance": 20.7e-12, "actuator_permittivity": 3400.0}
    arrays = {name: np.asarray(value) for name, value in values.items()} | {
        "actuator_coupling_factor": np.asarray(0.75)
    }
    found = judged(model("stress-gated").links, arrays, {"mechanics": "force-balance"})
    link = next(item for item in found if item.link.place == "actuator_coupling_factor")
    yield Check(
        "published case",
        GROUP,
        "k33 that coefficient, compliance and permittivity of PZT-5H imply [1]",
        "A. Erturk and D. J. Inman, Piezoelectric Energy Harvesting (2011), table E.1",
        "seen",
        0.75,
        float(link.right),
        0.005,
        "two digits printed",
    )


def _currents() -> Iterator[Check]:
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "switch.toml"
        path.write_text(TECHNOLOGY + CURRENTS, encoding="utf-8")
        rows = link_rows(open_set_file(path).item)
    for node, current, effective in (("g1", "10e-6", "7.1e-6"), ("g2", "12.4e-6", "9.2e-6")):
        # a current source takes C V / (2 I) to half the supply; a resistor that takes as long has ln 2 R C
        half = mpmath.mpf("0.5") / 2 / mpmath.mpf(effective) / mpmath.log(2)
        for place, source, expected in (
            ("closed_state_current", "Ohm's law, mpmath", mpmath.mpf("0.5") / mpmath.mpf(current)),
            ("effective_drive_current", "time to half the supply, mpmath", half),
        ):
            row = next(row for row in rows if (row.place, row.node) == (place, node))
            kohm = float(expected / 1000)
            name = f"on-resistance that {place} implies, {node} [kohm]"
            yield Check(
                "closed form", GROUP, name, source, "derived", kohm, row.right, 1e-12 * kohm, "1e-12 relative: rounding"
            )


def checks() -> list[Check]:
    """Every result."""
    return [*_ceramic(), *_currents()]
