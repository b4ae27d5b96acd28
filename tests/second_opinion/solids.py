"""Swept motion, overlap and shrinking with triangles, each by a way of our own. Lengths in mm."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from manifold3d import Error, Manifold, Mesh64, OpType

SHRINK = 0.015
"""mm: two meshes of one curved wall cut into each other by up to the larger of their sags (0.01 mm). One body of each
pair is shrunk by a little more than that, and it is added to the thickness of what remains."""

SPECK = 1e-5
"""mm^3: less is no overlap. A cube of 0.03 mm has 2.7e-5 mm^3."""

FLAT = 1e-12
"""mm^2: a triangle whose shadow along the way is smaller covers nothing."""

_PRISM = np.array([(0, 1, 2), (3, 5, 4), (0, 4, 1), (0, 3, 4), (1, 5, 2), (1, 4, 5), (2, 3, 0), (2, 5, 3)])
"""Triangles of a prism, looking out: its corners 0 to 2 are a triangle that looks down, 3 to 5 the same higher up."""


def arrays(solid: Manifold) -> tuple[np.ndarray, np.ndarray]:
    """Return the vertices (n, 3) and triangles (m, 3) of a solid."""
    mesh = solid.to_mesh64()
    return np.asarray(mesh.vert_properties)[:, :3], np.asarray(mesh.tri_verts).astype(np.int64)


def _made(points: np.ndarray, triangles: np.ndarray) -> Manifold:
    made = Manifold(Mesh64(np.ascontiguousarray(points), np.ascontiguousarray(triangles.astype(np.uint64))))
    assert made.status() == Error.NoError, f"a mesh became {made.status()}"
    return made


def shrunk(solid: Manifold, by: float = SHRINK) -> Manifold:
    """Return a solid all of whose faces have gone in by about `by`.

    Every vertex moves to where the planes of its faces meet after they went in, in the least squares sense, each
    weighted with its corner there; where faces nearly coincide the regularized answer is the mean way. It moves by 4
    times `by` at most: at knife edges faces give way by less.
    """
    points, triangles = arrays(solid)
    corners = points[triangles]
    normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    normals /= np.maximum(np.linalg.norm(normals, axis=1), 1e-300)[:, None]
    squares, sums = np.zeros((len(points), 3, 3)), np.zeros((len(points), 3))
    for k in range(3):
        one, other = (corners[:, (k + i) % 3] - corners[:, k] for i in (1, 2))
        lengths = np.maximum(np.linalg.norm(one, axis=1) * np.linalg.norm(other, axis=1), 1e-300)
        weight = np.arccos(np.clip((one * other).sum(axis=1) / lengths, -1.0, 1.0))
        np.add.at(squares, triangles[:, k], weight[:, None, None] * normals[:, :, None] * normals[:, None, :])
        np.add.at(sums, triangles[:, k], weight[:, None] * normals)
    trace = np.maximum(np.trace(squares, axis1=1, axis2=2), 1e-9)
    squares += 1e-3 * trace[:, None, None] * np.eye(3)
    step = np.linalg.solve(squares, sums[:, :, None])[:, :, 0]
    step *= np.minimum(1.0, 4.0 / np.maximum(np.linalg.norm(step, axis=1), 1e-300))[:, None]
    return _made(points - by * step, triangles)


def thickest(solid: Manifold) -> tuple[float, np.ndarray]:
    """Return the thickness 2V/A of the thickest connected piece [mm] and points inside it (n, 3); 0 for only specks."""
    worst, best = 0.0, None
    for piece in solid.decompose() if solid.num_tri() else []:
        volume = piece.volume()
        if volume > SPECK and 2.0 * volume / piece.surface_area() > worst:
            worst, best = 2.0 * volume / piece.surface_area(), piece
    return worst, np.zeros((1, 3)) if best is None else _within(best, worst)


def _within(piece: Manifold, depth: float) -> np.ndarray:
    """Return points below the middles of the largest triangles of a piece, a quarter and a half of its thickness in."""
    points, triangles = arrays(piece)
    corners = points[triangles]
    normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    size = np.linalg.norm(normals, axis=1)
    largest = np.argsort(-size, kind="stable")[:20]
    middles, inward = corners[largest].mean(axis=1), normals[largest] / np.maximum(size[largest], 1e-300)[:, None]
    return np.concatenate([middles - share * depth * inward for share in (0.25, 0.5)])


class Way:
    """A straight way, and a frame in which it runs up: there the box of a prism is hardly larger than the prism."""

    def __init__(self, way: np.ndarray) -> None:
        self.length = float(np.linalg.norm(way))
        up = way / self.length
        side = np.cross(up, np.eye(3)[int(np.argmin(np.abs(up)))])
        side /= np.linalg.norm(side)
        self.frame = np.vstack([side, np.cross(up, side), up])

    def turned(self, solid: Manifold) -> Manifold:
        """Return a solid in the frame of the way."""
        return solid.transform(np.column_stack([self.frame, np.zeros(3)]))

    def back(self, point: Sequence[float]) -> np.ndarray:
        """Return a point of that frame in the frame of the mold."""
        return np.asarray(point) @ self.frame


def trailing_prisms(solid: Manifold, length: float, low: np.ndarray, high: np.ndarray) -> np.ndarray:
    """Return the prisms (k, 6, 3) that the trailing triangles of a solid pass through on its way up.

    Only those that come within the box `low`, `high`. A triangle trails if the solid lies above it.
    """
    points, triangles = arrays(solid)
    corners = points[triangles]
    shadow = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])[:, 2]
    corners = corners[shadow < -FLAT]
    first, last = corners.min(axis=1), corners.max(axis=1) + np.array([0.0, 0.0, length])
    near = corners[(first <= high).all(axis=1) & (last >= low).all(axis=1)]
    return np.concatenate([near, near + np.array([0.0, 0.0, length])], axis=1)


def loose(prisms: np.ndarray) -> Manifold:
    """Return all prisms as one mesh, not joined: where they overlap it counts more than once."""
    triangles = (np.arange(len(prisms))[:, None, None] * 6 + _PRISM).reshape(-1, 3)
    return _made(prisms.reshape(-1, 3), triangles)


def sweep_overlap(mover: Manifold, way: np.ndarray, others: Sequence[Manifold]) -> tuple[float, np.ndarray]:
    """Return how thick what a body meets on a straight way is [mm], 0 for nothing, and points of it (n, 3).

    mover : where it starts; others : bodies that stand still, already shrunk. What the mover covers is the place where
    it ends and the prisms over its trailing triangles; where it starts is covered by them too, but for what already
    overlapped there.
    """
    start = np.asarray(mover.bounding_box()).reshape(2, 3)
    covers = np.minimum(start[0], start[0] + way), np.maximum(start[1], start[1] + way)
    boxes = [np.asarray(other.bounding_box()).reshape(2, 3) for other in others]
    others = [o for o, b in zip(others, boxes, strict=True) if (b[0] <= covers[1]).all() and (b[1] >= covers[0]).all()]
    if not others:
        return 0.0, np.zeros((1, 3))
    line = Way(way)
    body = line.turned(mover)
    box = np.asarray(body.bounding_box())
    still = []
    for other in others:
        turned = line.turned(other)
        low, high = np.split(np.asarray(turned.bounding_box()), 2)
        if (low <= box[3:] + np.array([0.0, 0.0, line.length])).all() and (high >= box[:3]).all():
            still.append(turned)
    if not still:
        return 0.0, np.zeros((1, 3))
    obstacle = Manifold.compose(still)
    low, high = np.split(np.asarray(obstacle.bounding_box()), 2)
    pieces = [body.translate((0.0, 0.0, line.length)) ^ obstacle]
    prisms = trailing_prisms(body, line.length, low, high)
    if len(prisms):
        met = loose(prisms) ^ obstacle
        if met.num_tri():
            pieces.append(_joined(prisms, met) ^ obstacle)
    depth, at = thickest(Manifold.batch_boolean(pieces, OpType.Add))
    return depth, line.back(at)


def _joined(prisms: np.ndarray, met: Manifold) -> Manifold:
    """Return the union of the prisms whose boxes hold something of what was met."""
    low, high = prisms.min(axis=1), prisms.max(axis=1)
    hit = np.zeros(len(prisms), dtype=bool)
    for piece in met.decompose():
        start, end = np.split(np.asarray(piece.bounding_box()), 2)
        hit |= (low <= end).all(axis=1) & (high >= start).all(axis=1)
    return Manifold.batch_boolean([loose(prism[None]) for prism in prisms[hit]], OpType.Add)


def lift(height: float) -> np.ndarray:
    """Return a way straight up."""
    return np.array([0.0, 0.0, height])
