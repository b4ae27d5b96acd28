"""What the steel stage needs to be told, and what it tells besides the tool."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Materials:
    """What each kind of component is made of.

    The default for pins is hot-work steel, hardened [common practice].
    """

    part: str
    cavity: str
    core: str
    core_pin: str = "1.2344"
    ejector_pin: str = "1.2344"


@dataclass(frozen=True)
class Removed:
    """What one pin or the feed takes out of one half [mm^3]."""

    half: str
    purpose: str
    volume_mm3: float


@dataclass(frozen=True)
class Bored:
    """Everything taken out of the halves: cavity, core, part and this together fill the block."""

    removed: tuple[Removed, ...]

    @property
    def total_mm3(self) -> float:
        """Volume taken out of both halves [mm^3]."""
        return sum(r.volume_mm3 for r in self.removed)

    def of(self, half: str) -> float:
        """Return the volume taken out of the "cavity" or the "core" [mm^3]."""
        return sum(r.volume_mm3 for r in self.removed if r.half == half)
