"""The nomenclature: every value has a name of its own."""

from __future__ import annotations

from collections import Counter

from benchmark.catalogue import QUANTITIES, STUDY_QUANTITIES, TECHNOLOGY_QUANTITIES, WIRE_QUANTITIES


def test_no_name_stands_for_two_values():
    names = [item.name for item in (*TECHNOLOGY_QUANTITIES, *WIRE_QUANTITIES, *STUDY_QUANTITIES)]
    assert [name for name, count in Counter(names).items() if count > 1] == []
    assert set(names) == set(QUANTITIES)
