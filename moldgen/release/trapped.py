"""Trapped volume: the space that no steel moving along the pull can leave without crossing the plastic."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

import numpy as np

from moldgen.finding import Point
from moldgen.kernel.body import Body
from moldgen.kernel.meshsolid import MeshSolid, PieceMesh, mesh_solid, piece_mesh, thick_pieces, thickness
from moldgen.release.kinds import FaceKinds, Kind
from moldgen.release.sweep import CAP, sweep_faces
from moldgen.tolerances import NOISE_THICKNESS, RUB_THICKNESS

SMALL_TOUCH = 1e-4
"""Area [mm^2] of a trapped piece on a face below which the face is not listed."""

MOST_POINTS = 2000
"""Points of a piece whose distance to open air is measured."""


class Grip(StrEnum):
    """What a trapped piece does when the mold opens."""

    RUB = "rub"
    UNDERCUT = "undercut"


@dataclass(frozen=True)
class TrapPiece:
    """One connected trapped space, in the mold frame.

    thickness_mm : 2 V / A
    depth_mm : largest distance, square to the pull, from a place in the piece to the open air beside it: how far the
        plastic reaches over it (a window through a wall is open on both sides and counts from its middle)
    height_mm : extent along the pull
    at : a point on the trapped face, that is on the face looking along the pull that the piece touches most
    faces : (face number, touched area [mm^2]), largest first
    """

    solid: MeshSolid
    grip: Grip
    volume_mm3: float
    thickness_mm: float
    depth_mm: float
    height_mm: float
    at: Point
    faces: tuple[tuple[int, float], ...]

    @property
    def area_mm2(self) -> float:
        """Area of plastic that the piece touches."""
        return sum(area for _, area in self.faces)


@dataclass(frozen=True)
class Trapped:
    """The trapped pieces of a body, largest volume first, and the mesh solids they were made from.

    pieces : rubs and undercuts; noise (thinner than `NOISE_THICKNESS`) is left out
    noise_mm3 : volume of what was left out
    part, above, below : the body, everything above its faces that look up, everything below those that look down
    """

    pieces: tuple[TrapPiece, ...]
    noise_mm3: float
    part: MeshSolid
    above: MeshSolid
    below: MeshSolid

    @property
    def undercuts(self) -> tuple[TrapPiece, ...]:
        """The pieces that hold the steel."""
        return tuple(p for p in self.pieces if p.grip is Grip.UNDERCUT)

    @property
    def rubs(self) -> tuple[TrapPiece, ...]:
        """The pieces thin enough that the plastic gives way."""
        return tuple(p for p in self.pieces if p.grip is Grip.RUB)


def trapped_volume(body: Body, kinds: FaceKinds) -> Trapped:
    """Return the space above a face that looks up, below one that looks down, and not plastic.

    Raises
    ------
    KernelError : the mesh of the body is not closed
    """
    part = mesh_solid(body.mesh)
    return trapped_between(body, kinds, part, sweep_faces(body, kinds, up=True), sweep_faces(body, kinds, up=False))


def trapped_between(body: Body, kinds: FaceKinds, part: MeshSolid, above: MeshSolid, below: MeshSolid) -> Trapped:
    """Return the trapped volume from sweeps that are already known, as those of the same body before a split are.

    The face numbers of `part` are taken for those of `body`; so are those of the sweeps for places where they differ.
    """
    inside = (above ^ below) - part
    found = [_measured(body, kinds, piece) for piece in thick_pieces(inside, NOISE_THICKNESS)]
    noise = max(0.0, float(inside.volume()) - sum(p.volume_mm3 for p in found))
    found.sort(key=lambda p: (-round(p.volume_mm3, 6), tuple(round(c, 6) for c in p.at)))
    return Trapped(tuple(found), noise, part, above, below)


def _measured(body: Body, kinds: FaceKinds, piece: MeshSolid) -> TrapPiece:
    mesh = piece_mesh(piece)
    corners = mesh.vertices[mesh.triangles]
    area = 0.5 * np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1)
    own = mesh.face < len(body.faces)
    touched = np.bincount(mesh.face[own], area[own], len(body.faces))
    listed = np.flatnonzero(touched > SMALL_TOUCH)
    listed = listed[np.lexsort((listed, -touched[listed]))]
    thin = thickness(piece)
    return TrapPiece(
        solid=piece,
        grip=Grip.RUB if thin < RUB_THICKNESS else Grip.UNDERCUT,
        volume_mm3=float(piece.volume()),
        thickness_mm=thin,
        depth_mm=_depth(mesh),
        height_mm=float(np.ptp(mesh.vertices[:, 2])),
        at=_place(mesh, corners, area, own, kinds),
        faces=tuple((int(f), float(touched[f])) for f in listed),
    )


def _place(mesh: PieceMesh, corners: np.ndarray, area: np.ndarray, own: np.ndarray, kinds: FaceKinds) -> Point:
    """Return the middle of the largest triangle on the face that the piece touches most, vertical faces last."""
    if not own.any():
        own = np.ones_like(own)
    candidates = np.flatnonzero(own)
    face = np.where(mesh.face < len(kinds.kind), mesh.face, 0)[candidates]
    leaning = kinds.kind[face] != Kind.VERTICAL
    if leaning.any():
        candidates, face = candidates[leaning], face[leaning]
    most = np.argmax(np.bincount(face, area[candidates]))
    candidates = candidates[face == most]
    x, y, z = corners[candidates[np.argmax(np.round(area[candidates], 9))]].mean(axis=0)
    return float(x), float(y), float(z)


def _depth(mesh: PieceMesh) -> float:
    """Return the largest horizontal distance from the piece's boundary to its open sides, the walls of the sweeps."""
    corners = mesh.vertices[mesh.triangles]
    points = np.vstack([mesh.vertices, 0.5 * (corners + np.roll(corners, 1, axis=1)).reshape(-1, 3)])
    points = np.unique(np.round(points[:, :2], 6), axis=0)
    points = points[:: max(1, len(points) // MOST_POINTS)]
    wall = corners[mesh.face > CAP][:, :, :2]
    if len(wall) == 0:  # a closed bubble: no side is open, so half its least width
        return 0.5 * _least_width(points)
    ends = np.stack([wall, np.roll(wall, 1, axis=1)], axis=2).reshape(-1, 2, 2)
    length = np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1).reshape(-1, 3)
    ends = ends.reshape(-1, 3, 2, 2)[np.arange(len(length)), np.argmax(length, axis=1)]
    ends = np.unique(np.round(ends.reshape(-1, 4), 6), axis=0).reshape(-1, 2, 2)
    best = np.full(len(points), np.inf)
    step = max(1, 2_000_000 // max(1, len(points)))
    for start in range(0, len(ends), step):
        best = np.minimum(best, _distances(points, ends[start : start + step]).min(axis=1))
    return float(best.max())


def _distances(points: np.ndarray, ends: np.ndarray) -> np.ndarray:
    """Return the distance from each point (p, 2) to each segment (s, 2, 2), (p, s)."""
    along = ends[:, 1] - ends[:, 0]
    square = np.maximum((along**2).sum(axis=1), 1e-18)
    offset = points[:, None, :] - ends[None, :, 0]
    share = np.clip((offset * along).sum(axis=2) / square, 0.0, 1.0)
    return np.asarray(np.linalg.norm(offset - share[:, :, None] * along, axis=2))


def _least_width(points: np.ndarray) -> float:
    turn = np.linspace(0.0, np.pi, 36, endpoint=False)
    return float(np.ptp(points @ np.stack([np.cos(turn), np.sin(turn)]), axis=0).min())
