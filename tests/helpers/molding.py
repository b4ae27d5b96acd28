"""From a solid that is pulled along +z to its halves, and to a tool of three bodies."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from moldgen.kernel.body import Body
from moldgen.model.motion import straight_steps
from moldgen.model.proof import Proof
from moldgen.model.tool import Motion, Role
from moldgen.parting.halves import Parted, part_halves
from moldgen.proof.bodies import ProofBody
from moldgen.proof.motion import MovingTool
from moldgen.proof.run import Claims, prove_tool
from moldgen.release.imprint import imprint_silhouettes
from moldgen.release.kinds import face_kinds
from moldgen.release.trapped import trapped_volume

Corners = tuple[np.ndarray, np.ndarray]


def block_around(body: Body, margin: float = 15.0) -> Corners:
    """The corners of a block with this much steel on every side."""
    return body.box[0] - margin, body.box[1] + margin


def block_mm3(corners: Corners) -> float:
    """The volume of the block."""
    return float(np.prod(corners[1] - corners[0]))


@dataclass(frozen=True)
class Molded:
    """The halves of a part and the block that they fill with it."""

    parted: Parted
    corners: Corners

    @property
    def bodies(self) -> list[ProofBody]:
        """The tool that the halves make with the part, without pins."""
        made = self.parted
        return [
            ProofBody("part", Role.PART, Motion.PART, made.body.solid),
            ProofBody("cavity", Role.CAVITY, Motion.CAVITY_HALF, made.cavity),
            ProofBody("core", Role.CORE, Motion.CORE_HALF, made.core),
        ]

    @property
    def claims(self) -> Claims:
        """A block nothing is bored out of."""
        return Claims(block_mm3(self.corners), 0.0, 10.0)


def mold(
    solid: Any,
    *,
    margin: float = 15.0,
    level: float | None = None,
    avoid: tuple[Any, ...] = (),
    corners: Corners | None = None,
) -> Molded:
    """Part a solid that leaves along +z."""
    body = Body(solid)
    body, _ = imprint_silhouettes(body, face_kinds(body))
    kinds = face_kinds(body)
    trapped = trapped_volume(body, kinds)
    corners = corners or block_around(body, margin)
    return Molded(part_halves(body, kinds, trapped.part, corners, level=level, avoid=avoid), corners)


def with_pin(bodies: list[ProofBody], solid: Any, name: str = "ejector pin") -> list[ProofBody]:
    """Add an ejector pin to a tool."""
    return [*bodies, ProofBody(name, Role.EJECTOR_PIN, Motion.EJECTOR, solid)]


def straight(bodies: list[ProofBody], stroke: float = 10.0) -> MovingTool:
    """The bodies as a tool that opens straight along +z."""
    return MovingTool(bodies, straight_steps(stroke, 100.0))


def changed(bodies: list[ProofBody], role: Role, solid: Any) -> list[ProofBody]:
    """Put another solid in the place of one role."""
    return [replace(b, solid=solid) if b.role is role else b for b in bodies]


def unproved(bodies: list[ProofBody], claims: Claims) -> dict[str, Proof]:
    """The proofs that did not pass, by name."""
    return {p.name: p for p in prove_tool(bodies, claims) if not p.passed}
