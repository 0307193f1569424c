"""How far the closed forms are from circuit simulation: measures the points and writes the bands the program uses.

Run by hand::

    .venv/bin/python -m tests.ngspice.measure_bands

Points are simulated where ``tests/data/closed-form-*.csv`` has none (all of them: some 25 minutes on one core; delete a
file to measure it afresh); ratios and bands are always taken anew, so after a change of a closed form this takes
seconds.
"""

from __future__ import annotations

from tests.ngspice import band_table, measure_references, measure_stress


def main() -> None:
    """Measure what is missing and write both tables of points and the table of bands."""
    measure_stress.measure()
    measure_references.measure()
    band_table.write_table()


if __name__ == "__main__":
    main()
