"""Trapped volume: the space that no steel moving along the pull can leave without crossing the plastic."""

from __future__ import annotations

from dataclasses import dataclass, replace
from enum import StrEnum

import numpy as np
from scipy.spatial import cKDTree

from moldgen.finding import Point
from moldgen.kernel.body import Body
from moldgen.kernel.meshsolid import MeshSolid, PieceMesh, mesh_solid, piece_mesh, thick_pieces, thickness, without
from moldgen.kernel.tracer import Tracer
from moldgen.release.kinds import FaceKinds, Kind
from moldgen.release.sweep import CAP, WALL, contested_sweeps
from moldgen.tolerances import NOISE_THICKNESS, RUB_THICKNESS

SMALL_TOUCH = 1e-4
"""Area [mm^2] of a trapped piece on a face below which the face is not listed."""

LOOK_OUT = 1e-3
"""How far [mm] outside a side of a piece it is asked whether there is plastic."""

MOST_POINTS = 2000
"""Points of a piece whose distance to open air is measured."""

BEADS = 4000
"""Beads along all open sides of a piece, to find the nearest side by."""


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
    at, face : a point on the trapped face, and its number: of the faces that look along the pull, the one that the
        piece touches most (-1 if the piece touches none)
    faces : (face number, touched area [mm^2]), largest first
    """

    solid: MeshSolid
    grip: Grip
    volume_mm3: float
    thickness_mm: float
    depth_mm: float
    height_mm: float
    at: Point
    face: int
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
    part, above, below : the body; everything above its faces that look up and below those that look down, as far as
        it can matter here (see `contested_sweeps`)
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
    above, below = contested_sweeps(body, kinds)
    return trapped_between(body, kinds, part, above, below)


def trapped_between(body: Body, kinds: FaceKinds, part: MeshSolid, above: MeshSolid, below: MeshSolid) -> Trapped:
    """Return the trapped volume from sweeps that are already known, as those of the same body before a split are.

    The face numbers of `part` are taken for those of `body`; so are those of the sweeps for places where they differ.

    Raises
    ------
    KernelError : the part cannot be taken out of the space between the sweeps
    """
    inside = without(above ^ below, part)
    thick = thick_pieces(inside, NOISE_THICKNESS)
    meshes, sides = _beside(body, [piece_mesh(piece) for piece in thick])
    found = [_measured(body, kinds, p, m, s) for p, m, s in zip(thick, meshes, sides, strict=True)]
    noise = max(0.0, float(inside.volume()) - sum(p.volume_mm3 for p in found))
    found.sort(key=lambda p: (-round(p.volume_mm3, 6), tuple(round(c, 6) for c in p.at)))
    return Trapped(tuple(found), noise, part, above, below)


def _beside(body: Body, meshes: list[PieceMesh]) -> tuple[list[PieceMesh], list[np.ndarray]]:
    """Return the pieces, walls of the sweeps that stand against a vertical face of the body numbered as that face,
    and for each piece the ends of its sides towards open air, seen along the pull, (s, 2, 2) [mm].

    Just outside a wall there is plastic if the next face along the pull looks up; the face between is the nearest one
    on the way back into the piece.
    """
    where = [np.flatnonzero(m.face > CAP) for m in meshes]
    walls = [m.vertices[m.triangles[own]] for m, own in zip(meshes, where, strict=True)]
    if not any(len(w) for w in walls):
        return meshes, [np.zeros((0, 2, 2)) for _ in meshes]
    corners = np.concatenate(walls)
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    outward = normal / np.maximum(np.linalg.norm(normal, axis=1), 1e-30)[:, None]
    outside = corners.mean(axis=1) + LOOK_OUT * outward
    tracer = Tracer(body.mesh)
    first = tracer.first_triangle(outside, (0.0, 0.0, 1.0))
    hit = body.mesh.corners[first]
    closed = (first >= 0) & (np.cross(hit[:, 1] - hit[:, 0], hit[:, 2] - hit[:, 0])[:, 2] > 0.0)
    back = tracer.first_triangle(outside, -outward)
    number = np.where(closed & (back >= 0), body.mesh.face[back], WALL)
    ends = np.cumsum([len(w) for w in walls])[:-1]
    split = zip(meshes, where, np.split(number, ends), strict=True)
    sides = [_longest_edges(wall[free]) for wall, free in zip(walls, np.split(~closed, ends), strict=True)]
    return [_numbered(mesh, own, new) for mesh, own, new in split], sides


def _numbered(mesh: PieceMesh, own: np.ndarray, number: np.ndarray) -> PieceMesh:
    face = mesh.face.copy()
    face[own] = number
    return replace(mesh, face=face)


def _longest_edges(corners: np.ndarray) -> np.ndarray:
    """Return the longest edge of each triangle, seen along the pull, without repeats, (s, 2, 2)."""
    edges = np.stack([corners[:, :, :2], np.roll(corners, -1, axis=1)[:, :, :2]], axis=2)
    longest = np.argmax(np.linalg.norm(edges[:, :, 1] - edges[:, :, 0], axis=2), axis=1)
    chosen = edges[np.arange(len(edges)), longest].reshape(-1, 4)
    return np.unique(np.round(chosen, 6), axis=0).reshape(-1, 2, 2)


def _measured(body: Body, kinds: FaceKinds, piece: MeshSolid, mesh: PieceMesh, sides: np.ndarray) -> TrapPiece:
    corners = mesh.vertices[mesh.triangles]
    area = 0.5 * np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1)
    own = mesh.face < len(body.faces)
    touched = np.bincount(mesh.face[own], area[own], len(body.faces))
    listed = np.flatnonzero(touched > SMALL_TOUCH)
    listed = listed[np.lexsort((listed, -touched[listed]))]
    thin = thickness(piece)
    at, number = _place(corners, area, mesh.face, kinds)
    return TrapPiece(
        solid=piece,
        grip=Grip.RUB if thin < RUB_THICKNESS else Grip.UNDERCUT,
        volume_mm3=float(piece.volume()),
        thickness_mm=thin,
        depth_mm=_depth(mesh, sides),
        height_mm=float(np.ptp(mesh.vertices[:, 2])),
        at=at,
        face=number,
        faces=tuple((int(f), float(touched[f])) for f in listed),
    )


def _place(corners: np.ndarray, area: np.ndarray, face: np.ndarray, kinds: FaceKinds) -> tuple[Point, int]:
    """Return the face that the piece touches most, vertical ones last, and the middle of its largest triangle there."""
    count = len(kinds.kind)
    own = np.flatnonzero(face < count)
    leaning = own[kinds.kind[face[own]] != Kind.VERTICAL]
    chosen = leaning if len(leaning) else own if len(own) else np.arange(len(face))
    most = int(np.argmax(np.bincount(face[chosen], area[chosen])))
    chosen = chosen[face[chosen] == most]
    x, y, z = corners[chosen[np.argmax(np.round(area[chosen], 9))]].mean(axis=0)
    return (float(x), float(y), float(z)), most if len(own) else -1


def _depth(mesh: PieceMesh, sides: np.ndarray) -> float:
    """Return the largest horizontal distance from the piece's boundary to its open sides."""
    corners = mesh.vertices[mesh.triangles]
    edges = 0.5 * (corners + np.roll(corners, 1, axis=1)).reshape(-1, 3)
    points = np.vstack([mesh.vertices, edges, corners.mean(axis=1)])
    points = np.unique(np.round(points[:, :2], 6), axis=0)
    points = points[:: max(1, len(points) // MOST_POINTS)]
    if len(sides) == 0:  # a closed bubble: half its least width
        return 0.5 * _least_width(points)
    return float(_distances(points, sides).max())


def _distances(points: np.ndarray, sides: np.ndarray) -> np.ndarray:
    """Return the distance from each point (p, 2) to the nearest of the segments (s, 2, 2), (p,)."""
    along = sides[:, 1] - sides[:, 0]
    length = np.linalg.norm(along, axis=1)
    # the nearest beads on the segments name the few segments that are worth measuring
    count = np.clip(np.ceil(length / (length.sum() / BEADS)).astype(int), 1, BEADS)
    owner = np.repeat(np.arange(len(sides)), count)
    turn = np.arange(len(owner)) - np.repeat(np.cumsum(count) - count, count)
    beads = sides[owner, 0] + ((turn + 0.5) / count[owner])[:, None] * along[owner]
    near = owner[cKDTree(beads).query(points, k=min(4, len(beads)))[1].reshape(len(points), -1)]
    offset = points[:, None] - sides[near, 0]
    share = np.clip((offset * along[near]).sum(axis=2) / np.maximum(length[near] ** 2, 1e-18), 0.0, 1.0)
    return np.asarray(np.linalg.norm(offset - share[:, :, None] * along[near], axis=2).min(axis=1))


def _least_width(points: np.ndarray) -> float:
    turn = np.linspace(0.0, np.pi, 36, endpoint=False)
    return float(np.ptp(points @ np.stack([np.cos(turn), np.sin(turn)]), axis=0).min())
