"""Which plane, cylinder, cone, sphere or torus a face written as a spline is, and how far it lies from it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.BRepTools import BRepTools
from OCP.Geom import (
    Geom_BezierSurface,
    Geom_BSplineSurface,
    Geom_RectangularTrimmedSurface,
    Geom_SphericalSurface,
    Geom_Surface,
    Geom_SurfaceOfLinearExtrusion,
    Geom_SurfaceOfRevolution,
)
from OCP.GeomConvert import GeomConvert, GeomConvert_SurfToAnaSurf
from OCP.TopoDS import TopoDS_Face

from moldgen.kernel.elementary import (
    TURN,
    bare,
    from_axis,
    goes_round,
    is_elementary,
    parameters_of,
    points_at,
    sphere_about,
    turned_about_axis,
)
from moldgen.kernel.topology import edge_points, edges_of
from moldgen.tolerances import SAME_SURFACE

GRID: Final = 17
"""Places along u and along v at which a face is held against what it seems to be, at least (our choice)."""

MOST_PLACES: Final = 65

EDGE_PLACES: Final = 23

LARGEST_TURN: Final = 0.75 * np.pi
"""Steps of an angle from one place of the grid to the next may not be larger: there is a pole between them."""

_LOOKED_AT: Final = (
    Geom_BSplineSurface,
    Geom_BezierSurface,
    Geom_SurfaceOfLinearExtrusion,
    Geom_SurfaceOfRevolution,
)
"""The kernel throws when it is asked about offset surfaces (measured)."""


@dataclass(frozen=True)
class Fit:
    """An elementary surface in the place of a face's own.

    surface : u counts from where the face begins, so no face crosses the seam
    chart : stations of the old u (a,) and v (b,), and the parameters of the new surface there, (a, b, 2), unwrapped
    flipped : the normals of both surfaces are opposite
    off_mm : the largest distance between both
    mean_off_mm : how far the new one lies along the normal of the old one, on average
    """

    surface: Geom_Surface
    chart: tuple[np.ndarray, np.ndarray, np.ndarray]
    flipped: bool
    off_mm: float
    mean_off_mm: float

    def near(self, uv: np.ndarray) -> np.ndarray:
        """Return roughly where places of the old surface (n, 2) lie on the new one, (n, 2)."""
        stations_u, stations_v, new = self.chart
        i, s = _cell(stations_u, uv[:, 0])
        j, t = _cell(stations_v, uv[:, 1])
        low, high = ((1.0 - t) * new[k, j] + t * new[k, j + 1] for k in (i, i + 1))
        return np.asarray((1.0 - s) * low + s * high)


def _cell(stations: np.ndarray, values: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return the number of the station below each value, (n,), and the share of the way to the next one, (n, 1)."""
    place = np.clip(np.searchsorted(stations, values, side="right") - 1, 0, len(stations) - 2)
    share = (values - stations[place]) / (stations[place + 1] - stations[place])
    return place, np.clip(share, 0.0, 1.0)[:, None]


def elementary_fit(face: TopoDS_Face) -> Fit | None:
    """Return the elementary surface that a face keeps to within `SAME_SURFACE` all over, or None."""
    surface = BRep_Tool.Surface_s(face)
    if not isinstance(bare(surface), _LOOKED_AT):
        return None
    u, v = _stations(face, surface)
    points = _grid_points(surface, u, v)
    found = _candidate(_as_spline(surface, u, v), points)
    if found is None:
        return None
    flat = points.reshape(-1, 3)
    edges = np.vstack([edge_points(e, EDGE_PLACES) for e in edges_of(face) if not BRep_Tool.Degenerated_s(e)] or [flat])
    off = max(_off(found, flat), _off(found, edges))
    if off > SAME_SURFACE:
        return None
    return _charted(found, u, v, points, off)


def _stations(face: TopoDS_Face, surface: Geom_Surface) -> tuple[np.ndarray, np.ndarray]:
    u0, u1, v0, v1 = BRepTools.UVBounds_s(face)
    spans = (surface.NbUKnots(), surface.NbVKnots()) if isinstance(surface, Geom_BSplineSurface) else (2, 2)
    counts = [min(MOST_PLACES, max(GRID, 4 * (s - 1) + 1)) for s in spans]
    return np.linspace(u0, u1, counts[0]), np.linspace(v0, v1, counts[1])


def _grid_points(surface: Geom_Surface, u: np.ndarray, v: np.ndarray) -> np.ndarray:
    return np.array([[surface.Value(float(a), float(b)).Coord() for b in v] for a in u])


def _as_spline(surface: Geom_Surface, u: np.ndarray, v: np.ndarray) -> Geom_BSplineSurface:
    """Return the surface, or the piece of it that a face uses, as a spline: the kernel throws on trimmed ones."""
    if isinstance(surface, Geom_BSplineSurface):
        return surface
    ends = (float(u[0]), float(u[-1]), float(v[0]), float(v[-1]))
    return GeomConvert.SurfaceToBSplineSurface_s(Geom_RectangularTrimmedSurface(bare(surface), *ends))


def _candidate(spline: Geom_BSplineSurface, points: np.ndarray) -> Geom_Surface | None:
    """Ask the kernel what the surface is, and lay the poles of a sphere where the surface has its own."""
    found = GeomConvert_SurfToAnaSurf(spline).ConvertToAnalytical(SAME_SURFACE)
    if found is None or not isinstance(found, Geom_Surface) or not is_elementary(found):
        return None
    if not isinstance(found, Geom_SphericalSurface):
        return found
    center = np.array(found.Position().Location().Coord())
    for side in (points[0], points[-1], points[:, 0], points[:, -1]):
        if np.ptp(side, axis=0).max() < SAME_SURFACE:
            return sphere_about(found, side[0] - center)
    middle = points[len(points) // 2]
    normal = np.cross(middle[len(middle) // 2] - middle[0], middle[-1] - middle[0])
    return sphere_about(found, normal) if np.linalg.norm(normal) > SAME_SURFACE**2 else found


def _off(surface: Geom_Surface, points: np.ndarray) -> float:
    return float(np.linalg.norm(points - points_at(surface, parameters_of(surface, points)), axis=1).max())


def _charted(surface: Geom_Surface, u: np.ndarray, v: np.ndarray, points: np.ndarray, off: float) -> Fit | None:
    flat = points.reshape(-1, 3)
    uv = parameters_of(surface, flat).reshape(*points.shape[:2], 2)
    round_u, round_v = goes_round(surface)
    if round_u:
        at_axis = (from_axis(surface, flat) < SAME_SURFACE).reshape(points.shape[:2])
        angle = _unwrapped(uv[..., 0], at_axis)
        if angle is None:
            return None
        start = float(angle.min())
        if np.ptp(angle) > TURN + 1e-6:
            return None
        surface = turned_about_axis(surface, start)
        uv[..., 0] = angle - start
    if round_v:
        turns = _unwrapped(uv[..., 1], np.zeros(points.shape[:2], dtype=bool))
        if turns is None or np.ptp(turns) > TURN + 1e-6:
            return None
        uv[..., 1] = turns - TURN * np.floor((turns.min() + 1e-9) / TURN)
    signs = _turning(uv)
    if np.any(signs > 0.0) and np.any(signs < 0.0):
        return None
    return Fit(surface, (u, v, uv), bool(signs.sum() < 0.0), off, _mean_off(surface, flat, u, v))


def _turning(uv: np.ndarray) -> np.ndarray:
    """Return for each cell of the grid whether the new parameters run round it as the old ones do: 1, 0 or -1."""
    du, dv = np.diff(uv, axis=0)[:, :-1], np.diff(uv, axis=1)[:-1]
    cross = du[..., 0] * dv[..., 1] - du[..., 1] * dv[..., 0]
    return np.asarray(np.sign(np.where(np.abs(cross) > 1e-6 * np.abs(cross).max(), cross, 0.0)))


def _unwrapped(angle: np.ndarray, lost: np.ndarray) -> np.ndarray | None:
    """Return the angles over the grid without jumps, or None where that cannot be: round a pole inside the face.

    lost : (a, b) bool, where the angle has no meaning: on the axis. There it is taken from beside
    """
    if lost[1:-1, 1:-1].any():
        return None
    angle = angle.copy()
    for rows, gone in ((angle, lost), (angle.T, lost.T)):
        for side, beside in ((0, 1), (-1, -2)):
            rows[side] = np.where(gone[side], rows[beside], rows[side])
    along = np.unwrap(angle, axis=1)
    first = np.unwrap(along[:, 0])
    whole = along + (first - along[:, 0])[:, None]
    steps = max(float(np.abs(np.diff(whole, axis=k)).max()) for k in (0, 1))
    return whole if steps < LARGEST_TURN else None


def _mean_off(surface: Geom_Surface, old: np.ndarray, u: np.ndarray, v: np.ndarray) -> float:
    """Return how far the new surface lies outside the old one along the old normal, on average over the grid [mm]."""
    grid = old.reshape(len(u), len(v), 3)
    along_u, along_v = np.gradient(grid, axis=0), np.gradient(grid, axis=1)
    normals = np.cross(along_u, along_v)
    size = np.linalg.norm(normals, axis=2)
    new = points_at(surface, parameters_of(surface, old)).reshape(grid.shape)
    return float(((new - grid) * normals).sum() / max(float(size.sum()), 1e-300))
