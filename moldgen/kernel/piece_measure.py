"""How deep a piece of steel reaches from a surface, and a point inside it."""

from __future__ import annotations

import numpy as np
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeVertex
from OCP.BRepExtrema import BRepExtrema_DistShapeShape
from OCP.gp import gp_Pnt
from scipy.spatial import cKDTree

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.guard import operation
from moldgen.kernel.mesh import SurfaceMesh
from moldgen.kernel.nearest import nearest_triangle
from moldgen.kernel.topology import compound_of

MOST_SAMPLES = 40_000
"""Points on a surface that distances are estimated with (our choice: they lie 0.3 mm apart on a palm-sized part)."""

CLOSEST_SAMPLES = 0.1
"""mm: they need not lie closer (our choice)."""

CLOSE_ENOUGH = 1e-3
"""mm: a depth is not sought more exactly (our choice)."""

MOST_TRIED = 150
"""Points whose distance is measured exactly, the farthest by the estimate first (our choice)."""

EVENLY = np.array([0.7548776662466927, 0.5698402909980532])
"""Steps, modulo 1, whose multiples fill a square evenly: powers of the inverse of the real root of x^3 = x + 1."""

TRIED_INSIDE = 64
"""Faces of the mesh from which a point inside is looked for, the largest first (our choice)."""


def depth_from(piece: Body, steel: Body) -> float:
    """Return the largest distance of a point of a piece from the surface of a solid that it touches [mm].

    The farthest point is found among samples of the piece's mesh, and its distance is the kernel's: right to the sag of
    that mesh.
    """
    reach = float(np.linalg.norm(piece.box[1] - piece.box[0]))
    near = _near(steel.mesh, piece.box, reach)
    if not len(near.triangles):
        return reach
    points = np.vstack([piece.mesh.vertices, _samples(piece.mesh.corners, MOST_SAMPLES // 4)])
    estimate, _ = cKDTree(np.vstack([near.vertices[np.unique(near.triangles)], _samples(near.corners)])).query(points)
    low, high = near.corners.min(axis=1), near.corners.max(axis=1)
    best, chosen, face = -1.0, 0, 0
    for number in np.argsort(-estimate, kind="stable")[:MOST_TRIED]:
        if estimate[number] <= best + CLOSE_ENOUGH:
            break
        point, reach = points[number], float(estimate[number])
        around = near.only(((low <= point + reach) & (high >= point - reach)).all(axis=1))
        triangle, distance = nearest_triangle(around, point)
        if distance > best:
            best, chosen, face = distance, int(number), int(around.face[triangle])
    return _exact(points[chosen], steel, face, best)


def point_inside(piece: Body) -> np.ndarray:
    """Return a point inside a solid, halfway through where it is thickest among a few places, (3,) [mm]."""
    corners, area = piece.mesh.corners, piece.triangle_areas
    best, chosen = -1.0, corners.reshape(-1, 3).mean(axis=0)
    for number in np.lexsort((np.arange(len(area)), -np.round(area, 9)))[:TRIED_INSIDE]:
        a, b, c = corners[number]
        normal = np.cross(b - a, c - a)
        start, inward = (a + b + c) / 3.0, -normal / max(float(np.linalg.norm(normal)), 1e-300)
        through = _first_hit(corners, start, inward, int(number))
        if through > best + 1e-9:
            best, chosen = through, start + 0.5 * through * inward
    return np.asarray(chosen)


def _near(mesh: SurfaceMesh, box: tuple[np.ndarray, np.ndarray], reach: float) -> SurfaceMesh:
    """Return the triangles of a mesh whose boxes come within `reach` [mm] of a box."""
    low, high = mesh.corners.min(axis=1), mesh.corners.max(axis=1)
    return mesh.only(((low <= box[1] + reach) & (high >= box[0] - reach)).all(axis=1))


def _samples(corners: np.ndarray, most: int = MOST_SAMPLES) -> np.ndarray:
    """Return points spread evenly over triangles (t, 3, 3), at least one in each, (n, 3) [mm]."""
    area = 0.5 * np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1)
    each = max(CLOSEST_SAMPLES**2, float(area.sum()) / most)
    count = np.maximum(np.ceil(area / each).astype(int), 1)
    number = np.repeat(np.arange(len(corners)), count)
    u, v = (np.arange(1, len(number) + 1)[:, None] * EVENLY).T % 1.0  # goes on from triangle to triangle: no rows
    u, v = np.where(u + v > 1.0, 1.0 - u, u), np.where(u + v > 1.0, 1.0 - v, v)
    weights = np.stack([1.0 - u - v, u, v], axis=1)
    return np.asarray((weights[:, :, None] * corners[number]).sum(axis=1))


def _exact(point: np.ndarray, steel: Body, face: int, measured: float) -> float:
    """Return the kernel's distance of a point from the face that is nearest by the mesh, and from its neighbors."""
    around = {face} | {int(f) for edge in steel.edges_at_face[face] for f in steel.edge_faces[edge]}
    faces = compound_of(steel.faces[f] for f in sorted(around))
    try:
        with operation("measure a distance"):
            vertex = BRepBuilderAPI_MakeVertex(gp_Pnt(*map(float, point))).Vertex()
            found = BRepExtrema_DistShapeShape(vertex, faces)
            exact = float(found.Value()) if found.IsDone() else measured
    except KernelError:
        return measured
    return exact if abs(exact - measured) < 0.1 else measured


def _first_hit(corners: np.ndarray, start: np.ndarray, way: np.ndarray, leave_out: int) -> float:
    """Return how far a ray goes until it meets a triangle, -1 if it meets none [mm]."""
    a, side, other = corners[:, 0], corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    cross = np.cross(way, other)
    det = (side * cross).sum(axis=1)
    proper = np.abs(det) > 1e-14
    inverse = np.where(proper, 1.0 / np.where(proper, det, 1.0), 0.0)
    off = start - a
    u = (off * cross).sum(axis=1) * inverse
    along = np.cross(off, side)
    v, t = (along @ way) * inverse, (along * other).sum(axis=1) * inverse
    hit = proper & (u >= -1e-9) & (v >= -1e-9) & (u + v <= 1.0 + 1e-9) & (t > 1e-6)
    hit[leave_out] = False
    return float(t[hit].min()) if hit.any() else -1.0
