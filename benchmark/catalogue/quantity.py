"""What a catalogue entry holds (layer 1)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

__all__ = ["Domain", "Quantity"]

Domain = Literal["positive", "nonnegative", "any", "fraction", "share", "count"]


@dataclass(frozen=True)
class Quantity:
    """One name of the nomenclature.

    ``unit`` fixes the dimension and is the unit in which ``low`` and ``high`` (the usual range) are stated and in
    which reports print the value. Outside the usual range a value is warned about; beyond a factor 1000 it is
    refused unless the file says ``unusual = true``. ``domain`` is never negotiable: positive, nonnegative, any
    sign, fraction (0 to 1), share (above 0, at most 1) or count (whole number >= 1).
    """

    name: str
    symbol: str
    meaning: str
    unit: str
    low: float
    high: float
    domain: Domain = "positive"

    def allows(self, si: float) -> bool:
        """Tell whether an SI value lies in the domain."""
        if self.domain == "positive":
            return si > 0.0
        if self.domain == "nonnegative":
            return si >= 0.0
        if self.domain == "fraction":
            return 0.0 <= si <= 1.0
        if self.domain == "share":
            return 0.0 < si <= 1.0
        if self.domain == "count":
            return si >= 1.0 and float(si).is_integer()
        return True

    @property
    def example(self) -> str:
        """What to write for it, for messages."""
        return "a number" if self.unit == "1" else f"a value in {self.unit}"

    @property
    def domain_text(self) -> str:
        """The domain in words, for messages."""
        return {
            "positive": "above 0",
            "nonnegative": "0 or above",
            "any": "any finite number",
            "fraction": "between 0 and 1",
            "share": "above 0, at most 1",
            "count": "a whole number, 1 or more",
        }[self.domain]
