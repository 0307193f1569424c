"""Evidence classes and what each may support (layer 1); one closed list for every file."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

__all__ = ["EVIDENCE", "EvidenceClass", "Support"]

Support = Literal["go", "conditional", "none", "demonstration"]


@dataclass(frozen=True)
class EvidenceClass:
    """``support``: the strongest verdict a decisive value of this class may carry.

    ``must_state``: keys that a value of this class has to fill in.
    """

    name: str
    meaning: str
    support: Support
    must_state: tuple[str, ...] = ()


EVIDENCE: dict[str, EvidenceClass] = {
    item.name: item
    for item in (
        EvidenceClass("defined", "physical constant or convention", "go"),
        EvidenceClass("measured", "our samples, at use conditions", "go", ("conditions",)),
        EvidenceClass("published", "published for a like sample at like conditions", "go"),
        EvidenceClass("choice", "a decision of the scenario or layout, with an owner", "go", ("owner",)),
        EvidenceClass("extracted", "read off a figure, or fitted by us", "conditional", ("note",)),
        EvidenceClass("simulated", "from a device or circuit simulation", "conditional"),
        EvidenceClass("derived", "a formula over other names, recomputed by check", "conditional"),
        EvidenceClass("projected", "extrapolated along a trend or taken from a roadmap", "conditional", ("note",)),
        EvidenceClass("target", "wished for by a programme", "conditional", ("owner",)),
        EvidenceClass("assumed", "judgement", "none", ("note",)),
        EvidenceClass("invented", "made up for a demonstration", "demonstration"),
    )
}
