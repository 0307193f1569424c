"""Every comparison of this folder as rows, by title: what a validation report prints.

Rows marked ``simulated now`` run ngspice; everything together takes about half a minute of one core.
"""

from __future__ import annotations

import tempfile
from collections.abc import Callable, Mapping
from pathlib import Path

from tests.open_cards import minimum_energy, open_45nm, predictive, proposed_rule, scaling
from tests.open_cards.row import Row

__all__ = ["COMPARISONS", "Row"]


def _in_folder(rows: Callable[[Path], list[Row]]) -> list[Row]:
    with tempfile.TemporaryDirectory() as folder:
        return rows(Path(folder))


COMPARISONS: Mapping[str, Callable[[], list[Row]]] = {
    "Open 45 nm cards: decks against a stored series": open_45nm.deck_rows,
    "Open 45 nm cards: currents of the extracted set": open_45nm.current_rows,
    "Open 45 nm cards: delay and energy of the extracted set": open_45nm.prediction_rows,
    "Open 45 nm cards: where the differences come from": lambda: [
        row for supply in open_45nm.APART for row in open_45nm.apart(supply)
    ],
    "Open 45 nm cards: solved as differential equations": lambda: list(open_45nm.solved_rows()),
    "Open 45 nm cards: other readings of the edge capacitance": lambda: _in_folder(open_45nm.edge_rows),
    "Open 45 nm cards: low and high threshold, held out": lambda: _in_folder(open_45nm.held_out_rows),
    "Predictive planar cards: delay and energy over supply": lambda: [
        row for cards in predictive.CARDS for row in predictive.predictive_rows(cards)
    ],
    "Open 7 nm kit: delay and energy over supply": predictive.seven_nanometre_rows,
    "Predictive planar cards: second series": minimum_energy.second_series_rows,
    "Open cards: on/off ratio over supply": minimum_energy.on_off_rows,
    "Scaling factors of 2017: printed values": scaling.printed_rows,
    "Scaling factors of 2017: ratios over supply": scaling.ratio_rows,
    "Minimum energy: exponential drive": lambda: [
        row
        for drive in minimum_energy.DRIVES
        for activity in ("0.1", "0.01", "0.0001", "0.000001")
        for row in minimum_energy.exponential_rows(drive, activity)
    ],
    "Minimum energy: simulated series": minimum_energy.series_rows,
    "Delay by a proposed rule, not in use": proposed_rule.rule_rows,
}
