"""Steel that fronts have cut off from its body goes to a body that touches it and can carry it out."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from moldgen.errors import KernelError, PartError
from moldgen.finding import Decision, Notes
from moldgen.kernel.body import Body
from moldgen.kernel.boolean import copied, fuse
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.meshsolid import MeshSolid, eroded, mesh_solid, overlap_depth, union
from moldgen.kernel.rehearse import made_apart
from moldgen.model.side_action import Front
from moldgen.tolerances import OPEN_OVERLAP

HALVES = ("cavity", "core")

REACH = 0.04
"""mm: how far a piece is grown to find what it touches."""

LEAST_CONTACT = 0.05
"""mm^2: a smaller contact joins nothing."""

CRUMB = 1e-5
"""mm^3: pieces of less volume are noise of the boolean and are dropped."""

STEPS = (0.1, 0.3, 1.0)
"""mm: first steps at which a carried piece is held against the part; then quarters of the way. The motion proof, which
sweeps, decides."""

SAME_VOLUME = 1e-6
"""Relative change of volume by which a joined body may differ from its parts."""


@dataclass(frozen=True)
class Piece:
    """A solid that belongs to a body ("cavity", "core", "slide 1"); `fixed`: it is held there, else it is cut off."""

    owner: str
    solid: Any
    fixed: bool


@dataclass
class _Body:
    """A body of the tool that may take a piece along."""

    name: str
    solids: list[Any]
    way: np.ndarray
    mesh: MeshSolid | None = None
    thin: MeshSolid | None = None

    def thinned(self) -> MeshSolid:
        """Return the mesh of the body, eroded: it touches the pieces that were cut off from it."""
        if self.thin is None:
            found = [eroded(Body(solid).mesh) for solid in self.solids]
            self.thin = union([solid for solid in found if solid is not None])
        return self.thin

    def meshed(self) -> MeshSolid:
        if self.mesh is None:
            self.mesh = union([mesh_solid(Body(solid).mesh) for solid in self.solids])
        return self.mesh


def adopt(pieces: Sequence[Piece], fronts: Mapping[str, Front], part: Body) -> tuple[dict[str, list[Any]], Notes]:
    """Return the solids of each body, cut-off pieces joined to one that touches them and moves clear of the part.

    Raises
    ------
    PartError : a piece is shut in: nothing that touches it can carry it out
    """
    height = float(part.box[1][2] - part.box[0][2])
    bodies = {name: _Body(name, [p.solid for p in pieces if p.owner == name and p.fixed], way)
              for name, way in _ways(fronts, height).items()}  # fmt: skip
    loose = [p for p in pieces if not p.fixed and volume(p.solid) > CRUMB]
    thin = eroded(part.mesh)
    if thin is None:
        raise KernelError("the mesh of the part is not closed")
    decisions = []
    for piece in sorted(loose, key=lambda p: -volume(p.solid)):
        decisions.append(_placed(piece, bodies, thin))
    return {name: body.solids for name, body in bodies.items()}, Notes(decisions=tuple(decisions))


def _ways(fronts: Mapping[str, Front], height: float) -> dict[str, np.ndarray]:
    """Return how each body moves as the part sees it [mm]."""
    ways = {"cavity": np.array([0.0, 0.0, height]), "core": np.array([0.0, 0.0, -height])}
    for name, front in fronts.items():
        ways[name] = np.asarray(front.release) * (front.travel + 1.0)
    return ways


def _placed(piece: Piece, bodies: dict[str, _Body], thin: MeshSolid) -> Decision:
    mesh = Body(piece.solid).mesh
    solid, grown = mesh_solid(mesh), eroded(mesh, -REACH)
    reasons = []
    touching = []
    for body in bodies.values():
        contact = 0.0 if grown is None or not body.solids else float((grown ^ body.meshed()).volume()) / REACH
        if contact > LEAST_CONTACT:
            touching.append((round(contact, 3), body))
    x, y, z = (float(v) for v in 0.5 * (mesh.vertices.min(axis=0) + mesh.vertices.max(axis=0)))
    for contact, body in sorted(touching, key=lambda pair: (-pair[0], pair[1].name)):
        blocked = _blocked(solid, body, bodies, thin)
        if blocked:
            reasons.append(blocked)
            continue
        joined = _joined(body, piece.solid)
        if joined is None:
            reasons.append(f"the kernel cannot join it to {body.name}")
            continue
        body.solids, body.mesh, body.thin = joined, None, None
        size = f"{volume(piece.solid):.2f} mm^3 at {x:.2f}, {y:.2f}, {z:.2f} in the mold"
        why = f"cut off from the {piece.owner}; {body.name} touches it on {contact:.2f} mm^2 and moves clear with it"
        return Decision("steel joined", f"{size} to {body.name}", why, "", tuple(reasons))
    if not touching:
        reasons.append("no steel touches it")
    raise PartError(
        f"{volume(piece.solid):.3f} mm^3 of steel are cut off from the {piece.owner}: {'; '.join(reasons)}",
        where=f"at {x:.2f}, {y:.2f}, {z:.2f} in the mold",
        remedy="give the side actions by hand, or open the undercuts beside it",
    )


def _blocked(solid: MeshSolid, body: _Body, bodies: dict[str, _Body], thin: MeshSolid) -> str:
    """Return what a piece would be pushed into that moves with a body; a side action also leaves both halves."""
    depth = _deepest_on_way(solid, body.way, thin)
    if depth >= OPEN_OVERLAP:
        return f"{body.name} would push it {depth:.2f} mm into the part"
    if body.name in HALVES:
        return ""
    for name in HALVES:
        depth = _deepest_on_way(solid, body.way, bodies[name].thinned())
        if depth >= OPEN_OVERLAP:
            return f"{body.name} would push it {depth:.2f} mm into the {name}"
    return ""


def _deepest_on_way(solid: MeshSolid, way: np.ndarray, thin: MeshSolid) -> float:
    length = float(np.linalg.norm(way))
    steps = sorted({min(s, length) for s in STEPS} | {length * k / 4 for k in range(1, 5)})
    along = way / max(length, 1e-9)
    return max(overlap_depth(solid.translate([float(v) for v in along * s]), thin) for s in steps)


def _joined(body: _Body, piece: Any) -> list[Any] | None:
    """Return the body's solids with the piece joined to them, None if the kernel does not make it sound."""
    before = sum(volume(s) for s in body.solids)
    try:
        made = made_apart(lambda: fuse([copied(piece), *(copied(s) for s in body.solids)]))
    except KernelError:
        return None
    sound = bool(made) and len(made) <= len(body.solids) and all(is_valid(s) for s in made)
    gained = sum(volume(s) for s in made) - before
    return made if sound and abs(gained - volume(piece)) < SAME_VOLUME * before + CRUMB else None
