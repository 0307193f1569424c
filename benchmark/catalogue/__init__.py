"""The nomenclature as code (layer 1): every value name a file may use, once, with meaning, unit and usual range."""

from __future__ import annotations

from benchmark.catalogue.evidence import EVIDENCE, EvidenceClass, Support
from benchmark.catalogue.quantity import Quantity
from benchmark.catalogue.study import PRODUCT_CLASSES, STUDY_QUANTITIES
from benchmark.catalogue.technology import TECHNOLOGY_QUANTITIES
from benchmark.catalogue.wires import WIRE_QUANTITIES

__all__ = [
    "EVIDENCE",
    "PRODUCT_CLASSES",
    "QUANTITIES",
    "STUDY_QUANTITIES",
    "TECHNOLOGY_QUANTITIES",
    "WIRE_QUANTITIES",
    "EvidenceClass",
    "Quantity",
    "Support",
]

#: every quantity by name
QUANTITIES: dict[str, Quantity] = {
    quantity.name: quantity for quantity in (*TECHNOLOGY_QUANTITIES, *WIRE_QUANTITIES, *STUDY_QUANTITIES)
}
