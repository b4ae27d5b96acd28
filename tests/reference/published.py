"""One published figure, and how ours may differ from it."""

from __future__ import annotations

from dataclasses import dataclass

INCH = 25.4
POUND = 4.4482216
PSI = 0.0068947573


@dataclass(frozen=True)
class Figure:
    """What a source prints, and half a unit of its last printed digit (or the stated difference) as tolerance."""

    source: str
    printed: float
    within: float
    why: str

    def agrees(self, ours: float) -> bool:
        """Return whether ours is the printed figure within what its rounding or its misprint explains."""
        return abs(ours - self.printed) <= self.within

    def explain(self, ours: float) -> str:
        """Return the text for a failed comparison."""
        return f"{self.source} prints {self.printed:g}, ours is {ours:.6g}, explained {self.within:g}: {self.why}"
