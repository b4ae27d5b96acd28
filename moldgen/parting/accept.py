"""Whether two halves may leave the ladder: a quick check, before the proofs on the exported files."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.meshsolid import MeshSolid, eroded, mesh_solid, overlap_depth
from moldgen.tolerances import BALANCE, OPEN_OVERLAP

NOT_MEASURED = 1e9


@dataclass(frozen=True)
class HalvesCheck:
    """How well two halves fit the part.

    balance : |cavity + core + part - block| / block by volume
    static_mm : thickest overlap of two of the three at rest
    cavity_mm, core_mm : thickest overlap with the part while that half opens (two places of its way)
    """

    balance: float
    static_mm: float
    cavity_mm: float
    core_mm: float

    @property
    def worst(self) -> float:
        """One figure to compare failures by."""
        return max(self.static_mm, self.cavity_mm, self.core_mm) + self.balance

    @property
    def proved(self) -> bool:
        """True when every figure is inside its limit."""
        thickest = max(self.static_mm, self.cavity_mm, self.core_mm)
        return self.balance < BALANCE and thickest < OPEN_OVERLAP

    @property
    def complaint(self) -> str:
        """What is outside its limit, in words."""
        return (
            f"volume balance {self.balance:.1e} (limit {BALANCE:.0e}), overlap at rest {self.static_mm:.3f} mm, "
            f"cavity opening {self.cavity_mm:.3f} mm, core opening {self.core_mm:.3f} mm (limit {OPEN_OVERLAP} mm)"
        )


def check_halves(cavity: Any, core: Any, body: Body, block_volume: float) -> HalvesCheck:
    """Return the figures of two halves of a body whose pull is +z.

    The halves share the faces of the part and of the parting surface, and so their meshes: the volumes balance to the
    last digits when every face is where it belongs, without integrating a single surface.
    """
    try:
        lower_mesh = body.like(core).mesh
        upper, lower, part = mesh_solid(body.like(cavity).mesh), mesh_solid(lower_mesh), mesh_solid(body.mesh)
    except KernelError:
        return HalvesCheck(NOT_MEASURED, NOT_MEASURED, NOT_MEASURED, NOT_MEASURED)
    gap = abs(upper.volume() + lower.volume() + part.volume() - block_volume) / block_volume
    thin_lower, thin_part = eroded(lower_mesh), eroded(body.mesh)
    if thin_lower is None or thin_part is None:
        return HalvesCheck(gap, NOT_MEASURED, NOT_MEASURED, NOT_MEASURED)
    static = max(overlap_depth(*p) for p in ((upper, thin_lower), (upper, thin_part), (lower, thin_part)))
    height = float(body.box[1][2] - body.box[0][2])
    ways = (0.1, height / 2)
    return HalvesCheck(
        gap, static, _worst_on_way(upper, thin_part, ways), _worst_on_way(lower, thin_part, tuple(-w for w in ways))
    )


def _worst_on_way(mover: MeshSolid, part: MeshSolid, ways: tuple[float, ...]) -> float:
    worst = 0.0
    for way in ways:
        worst = max(worst, overlap_depth(mover.translate((0.0, 0.0, way)), part))
        if worst >= OPEN_OVERLAP:
            break
    return worst
