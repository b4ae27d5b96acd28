"""Sweeps of a body's faces along the pull: where steel would have to pass to leave, or to come."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components

from moldgen.kernel.body import Meshed
from moldgen.kernel.meshsolid import MeshSolid, make_solid, union
from moldgen.release.contested import contested
from moldgen.release.kinds import FaceKinds, Kind

CAP, WALL = 10**7, 2 * 10**7
"""Face numbers on a sweep that belong to no face of the body: its far end, and (from WALL on) its walls."""

OVERRUN = 5.0
"""How far [mm] a sweep runs past the body."""

EDGE_ON = 1e-7
"""|n.d| of a facet below which it sweeps nothing."""

FLAT_AREA = 1e-6
"""Relative difference between a patch's shadow and the sum of its triangles' shadows that shows an overlap; and between
the volume of its prism and the sum of theirs."""


def sweep_faces(body: Meshed, kinds: FaceKinds, up: bool, way: float | None = None) -> MeshSolid:
    """Return everything above the faces that look up, or below those that look down (the face itself included).

    The lower end of an up-sweep keeps the face numbers of the body; ends and walls have numbers from `CAP` on.
    With `way` [mm] the faces are carried just so far instead of clear of the body: with the body itself, that is the
    space it passes through when it moves.
    """
    facing = _Facing(body, kinds)
    return facing.swept(facing.looking(up), up, way)


def contested_sweeps(body: Meshed, kinds: FaceKinds) -> tuple[MeshSolid, MeshSolid]:
    """Return the sweeps up and down, without what cannot matter where the two meet.

    Faces above which nothing looks down are left out, and the other way round, so that the sweeps meet exactly where
    full ones would, for a fraction of the time.
    """
    facing = _Facing(body, kinds)
    upper, lower = facing.looking(True), facing.looking(False)
    corners = body.mesh.corners
    keep_up, keep_down = contested(corners[upper], corners[lower])
    return facing.swept(upper[keep_up], True), facing.swept(lower[keep_down], False)


class _Facing:
    """The triangles of a body by the way they look."""

    def __init__(self, body: Meshed, kinds: FaceKinds) -> None:
        self._body = body
        self._kind = kinds.kind[body.mesh.face]
        corners = body.mesh.corners
        facet = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        self._rise = facet[:, 2]
        self._noise = EDGE_ON * np.linalg.norm(facet, axis=1)

    def looking(self, up: bool) -> np.ndarray:
        """Return the numbers of the triangles that look up, or down."""
        faces = np.isin(self._kind, (Kind.UPPER if up else Kind.LOWER, Kind.STRADDLING))
        return np.flatnonzero(faces & ((self._rise if up else -self._rise) > self._noise))

    def swept(self, chosen: np.ndarray, up: bool, way: float | None = None) -> MeshSolid:
        """Return the union of the prisms over (or under) the chosen triangles."""
        if len(chosen) == 0:
            return MeshSolid()
        mesh, box = self._body.mesh, self._body.box
        far = float(box[1][2] + OVERRUN if up else box[0][2] - OVERRUN)
        shift = None if way is None else (way if up else -way)
        maker = PrismMaker(mesh.vertices, mesh.triangles, mesh.face, far, 0.5 * np.abs(self._rise), shift)
        return union(maker.prisms(chosen))


@dataclass(frozen=True)
class PrismMaker:
    """Makes prisms of patches; the wider the patch, the fewer the prisms.

    vertices (n, 3), triangles (t, 3), face (t,) : the mesh [mm]
    far, shift : the level to which patches are carried, or the way that each is carried instead [mm]
    shadow : (t,) area of each triangle, seen along z
    """

    vertices: np.ndarray
    triangles: np.ndarray
    face: np.ndarray
    far: float
    shadow: np.ndarray
    shift: float | None

    def prisms(self, chosen: np.ndarray) -> list[MeshSolid]:
        """Return prisms that together cover the chosen triangles."""
        made: list[MeshSolid] = []
        for patch in self._patches(chosen):
            made += self._of_patch(patch)
        return made

    def _of_patch(self, patch: np.ndarray) -> list[MeshSolid]:
        """Return one prism of a connected patch, or those of its halves, halved until no half lies over itself."""
        prism = self._injective(patch)
        if prism is not None:
            return [prism]
        if len(patch) == 1:
            return []
        return [p for half in self._halves(patch) for piece in self._patches(half) for p in self._of_patch(piece)]

    def _halves(self, patch: np.ndarray) -> list[np.ndarray]:
        """Return a patch by faces, or a patch of one face cut in two across its longest extent."""
        numbers = np.unique(self.face[patch])
        if len(numbers) > 1:
            return [patch[self.face[patch] == n] for n in numbers]
        middle = self.vertices[self.triangles[patch]].mean(axis=1)
        order = np.argsort(middle[:, np.argmax(np.ptp(middle, axis=0))], kind="stable")
        half = len(patch) // 2
        return [np.sort(patch[order[:half]]), np.sort(patch[order[half:]])]

    def _injective(self, patch: np.ndarray) -> MeshSolid | None:
        """Return the prism of a patch if no two of its points lie on one line along the pull, and it is whole."""
        prism = self._prism(patch)
        if prism is None or len(patch) == 1:
            return prism
        total = float(self.shadow[patch].sum())
        if abs(prism.project().area() - total) > FLAT_AREA * total + 1e-9:
            return None
        # walls over a vertex where the patch touches itself can be joined crosswise: same shadow, other volume
        size = float((self.shadow[patch] * self._ways(patch)).sum())
        return prism if abs(float(prism.volume()) - size) <= FLAT_AREA * size + 1e-9 else None

    def _ways(self, patch: np.ndarray) -> np.ndarray:
        """Return how far each triangle is carried, from its middle [mm]."""
        if self.shift is not None:
            return np.full(len(patch), abs(self.shift))
        return np.asarray(np.abs(self.far - self.vertices[self.triangles[patch], 2].mean(axis=1)))

    def _prism(self, patch: np.ndarray) -> MeshSolid | None:
        """Return the patch carried to the far level as a closed mesh, or None if that bounds no solid."""
        used, near = np.unique(self.triangles[patch], return_inverse=True)
        near = near.reshape(-1, 3)
        count = len(used)
        place = self.vertices[used]
        end = place.copy()
        end[:, 2] = self.far if self.shift is None else end[:, 2] + self.shift
        edges = np.vstack([near[:, [0, 1]], near[:, [1, 2]], near[:, [2, 0]]])
        free = edges[~np.isin(edges[:, 0] * count + edges[:, 1], edges[:, 1] * count + edges[:, 0])]
        a, b = free[:, 0], free[:, 1]
        # each side of the shell turned so that it looks out of the prism
        shell = np.vstack([near[:, ::-1], near + count, np.c_[a, b, b + count], np.c_[a, b + count, a + count]])
        wall = WALL + np.tile(np.arange(len(free)), 2)
        face = np.concatenate([self.face[patch], np.full(len(near), CAP), wall])
        return make_solid(np.vstack([place, end]), shell, face)

    def _patches(self, chosen: np.ndarray) -> list[np.ndarray]:
        """Return the edge-connected groups of triangles, each ascending."""
        triangles, count = self.triangles[chosen], len(chosen)
        ends = np.sort(np.vstack([triangles[:, [0, 1]], triangles[:, [1, 2]], triangles[:, [2, 0]]]), axis=1)
        key = ends[:, 0] * len(self.vertices) + ends[:, 1]
        order = np.argsort(key, kind="stable")
        owner = np.tile(np.arange(count), 3)[order]
        same = np.flatnonzero(np.diff(key[order]) == 0)
        links = coo_matrix((np.ones(len(same), np.int8), (owner[same], owner[same + 1])), shape=(count, count))
        many, label = connected_components(links, directed=False)
        order = np.argsort(label, kind="stable")
        return [chosen[group] for group in np.split(order, np.cumsum(np.bincount(label, minlength=many))[:-1])]
