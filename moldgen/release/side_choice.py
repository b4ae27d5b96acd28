"""Directions worth trying for side actions, and how much of each trapped space they let out, asked by rays."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.meshsolid import MeshSolid, piece_mesh
from moldgen.kernel.tracer import Tracer
from moldgen.model.part import Vector
from moldgen.release.trapped import TrapPiece

SAME = 0.9998
"""Cosine (1.1 deg) from which two directions count as one."""

MOST_FACES, MOST_LEVEL, MOST_INCLINED = 12, 48, 60
"""Bounds: faces of a piece asked for their normals and axes, level directions, inclined directions."""

SAMPLES, INSIDE = 240, 0.02
"""Points of a trapped space that rays start from, and how far inside it they lie [mm]."""

STEEPEST, FLATTEST = 0.95, 0.05
"""|z| of inclined directions."""


@dataclass(frozen=True)
class Candidates:
    """Unit vectors, (k, 3): those square to the pull, and inclined ones."""

    level: np.ndarray
    inclined: np.ndarray


def candidates(body: Body, pieces: list[TrapPiece]) -> Candidates:
    """Return the directions that the part itself suggests, the four axes first."""
    level: list[np.ndarray] = [np.array(v, dtype=float) for v in ((1, 0, 0), (-1, 0, 0), (0, 1, 0), (0, -1, 0))]
    inclined: list[np.ndarray] = []
    for axis in _suggested(body, pieces):
        for way in (axis, -axis):
            _add(level, way * np.array([1.0, 1.0, 0.0]), 0.2)
            if FLATTEST < abs(float(way[2])) < STEEPEST:
                _add(inclined, way, 0.5)
    level = level[:MOST_LEVEL]
    for k in range(24):
        _add(level, _at(15.0 * k, 0.0), 0.5)
    inclined = inclined[: MOST_INCLINED // 2]
    for lean in (15.0, -15.0, 30.0, -30.0, 45.0, -45.0):
        for k in range(8):
            _add(inclined, _at(45.0 * k, lean), 0.5)
    return Candidates(np.array(level), np.array(inclined))


def _suggested(body: Body, pieces: list[TrapPiece]) -> list[np.ndarray]:
    """Return normals of flat trapped faces and axes of round ones, those with the most trapped area first."""
    touched: dict[int, float] = {}
    for piece in pieces:
        for face, area in piece.faces[:MOST_FACES]:
            touched[face] = touched.get(face, 0.0) + area
    found: list[np.ndarray] = []
    for face in sorted(touched, key=lambda f: (-round(touched[f], 6), f)):
        found += _axes(body, face)
    return found


def _axes(body: Body, face: int) -> list[np.ndarray]:
    """Return the normal of a flat face and its steepest line, of a round or ruled one what is square to its normals."""
    own = body.mesh.face == face
    normal = body.mesh.normals[own]
    normal = normal / np.maximum(np.linalg.norm(normal, axis=1), 1e-30)[:, None]
    kind = body.surface_kind(face)
    if kind == "plane":
        steep = np.cross(np.cross(normal[0], (0.0, 0.0, 1.0)), normal[0])
        length = float(np.linalg.norm(steep))
        return [normal[0], *([steep / length] if length > 1e-3 and abs(normal[0][2]) > 1e-3 else [])]
    if kind not in ("cylinder", "cone", "extrusion"):
        return []
    weight = np.sqrt(body.triangle_areas[own])[:, None]
    middle = np.average(normal, axis=0, weights=weight[:, 0] ** 2) if kind == "cone" else 0.0
    _, spread, rows = np.linalg.svd(weight * (normal - middle), full_matrices=False)
    return [rows[2]] if len(rows) == 3 and spread[1] > 1e-3 * spread[0] else []


def _at(turn: float, lean: float) -> np.ndarray:
    a, e = np.radians(turn), np.radians(lean)
    return np.array([np.cos(e) * np.cos(a), np.cos(e) * np.sin(a), np.sin(e)])


def _add(known: list[np.ndarray], way: np.ndarray, least: float) -> None:
    length = float(np.linalg.norm(way))
    if length < least:
        return
    way = np.round(way / length, 12) + 0.0
    if all(float(way @ other) < SAME for other in known):
        known.append(way)


def sample(space: MeshSolid) -> np.ndarray:
    """Return points just inside a space's boundary, spread over its area, always the same ones, (k, 3) [mm]."""
    mesh = piece_mesh(space)
    corners = mesh.vertices[mesh.triangles]
    facet = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    length = np.linalg.norm(facet, axis=1)
    place = (np.arange(SAMPLES) + 0.5) / SAMPLES * length.sum()
    own = np.minimum(np.searchsorted(np.cumsum(length), place), len(length) - 1)
    turn = np.arange(SAMPLES)
    u, v = (0.5 + 0.7548776662466927 * (turn + 1)) % 1.0, (0.5 + 0.5698402909980532 * (turn + 1)) % 1.0
    fold = u + v > 1.0
    u, v = np.where(fold, 1.0 - u, u)[:, None], np.where(fold, 1.0 - v, v)[:, None]
    at = corners[own]
    points = at[:, 0] + u * (at[:, 1] - at[:, 0]) + v * (at[:, 2] - at[:, 0])
    return np.asarray(points - INSIDE * facet[own] / np.maximum(length[own], 1e-30)[:, None])


def shares(tracer: Tracer, points: np.ndarray, directions: np.ndarray) -> np.ndarray:
    """Return for each direction (k, 3) the share of points (p, 3) from which a ray along it meets no plastic, (k,)."""
    return np.array([1.0 - float(tracer.blocked(points, way).mean()) for way in directions])


def as_vector(direction: np.ndarray) -> Vector:
    """Return an array (3,) as a tuple."""
    x, y, z = (float(c) for c in direction)
    return x, y, z
