"""One comparison with something that was not made by this program."""

from __future__ import annotations

import math
from dataclasses import dataclass

__all__ = ["KINDS", "Check"]

#: kind -> what the expected number is
KINDS = {
    "published case": "a number printed by the source, with the inputs as printed",
    "published formula": "a formula of the source, worked out apart from the program",
    "simulator, same equations": "ngspice solves the very constants the program solves",
    "simulator, charges of the device": "ngspice solves the device with charges that follow its voltages",
    "open card": "transistor cards of an open process kit or predictive cards, simulated",
    "stored series": "a series simulated once with a stated simulator and stored as numbers",
    "scaling factors": "published factors between supplies at one node",
    "anchor": "a value published for the process of a shipped set",
    "closed form": "an exact result, worked out with scipy or mpmath by another way than the program's",
}


@dataclass(frozen=True)
class Check:
    """``allowed``: largest difference [unit of the numbers], and ``basis`` says where it comes from.

    ``isolates``: name of the check that this one explains; such a check stands for no result of its own.
    """

    kind: str
    group: str
    name: str
    source: str
    status: str
    expected: float
    obtained: float
    allowed: float
    basis: str
    note: str = ""
    isolates: str = ""

    def __post_init__(self) -> None:
        """Refuse what is no check."""
        if self.kind not in KINDS:
            message = f"{self.name}: kind {self.kind!r}; allowed: {', '.join(KINDS)}"
            raise ValueError(message)
        if not self.source or not self.name or not math.isfinite(self.expected):
            message = f"{self.group}, {self.name}: a check needs a source and a finite expected number"
            raise ValueError(message)

    @property
    def residual(self) -> float:
        """Relative difference [1]; the plain one where 0 is expected."""
        difference = self.obtained - self.expected
        return difference / abs(self.expected) if self.expected else difference

    @property
    def holds(self) -> bool:
        """Whether the difference is allowed (nan is not)."""
        return abs(self.obtained - self.expected) <= self.allowed

    @property
    def word(self) -> str:
        """One word for how the expected number is known."""
        text = self.status.lower()
        if self.kind in ("open card", "stored series") or self.kind.startswith("simulator"):
            return "own simulation"
        if text.startswith(
            ("seen", "published", "abstract seen", "first-moment form seen", "lambda seen", "inputs seen")
        ):
            return "seen" if text.startswith(("seen", "published")) else "seen in part"
        if "restated" in text or "second" in text:
            return "second-hand"
        if "from memory" in text or "not seen" in text:
            return "from memory"
        return "derived"
