"""Plane, cylinder, cone, sphere and torus in closed form: parameters of points, points of parameters, in arrays."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
from OCP.Geom import (
    Geom_ConicalSurface,
    Geom_CylindricalSurface,
    Geom_ElementarySurface,
    Geom_Plane,
    Geom_RectangularTrimmedSurface,
    Geom_SphericalSurface,
    Geom_Surface,
    Geom_ToroidalSurface,
)
from OCP.gp import gp_Ax3, gp_Dir, gp_Pnt

TURN: Final = 2.0 * np.pi


def bare(surface: Geom_Surface) -> Any:
    """Return the surface that a trimmed one is cut from."""
    while isinstance(surface, Geom_RectangularTrimmedSurface):
        surface = surface.BasisSurface()
    return surface


def is_elementary(surface: Geom_Surface) -> bool:
    """True for planes, cylinders, cones, spheres and tori, trimmed or not."""
    return isinstance(bare(surface), Geom_ElementarySurface)


def goes_round(surface: Geom_Surface) -> tuple[bool, bool]:
    """Return whether u and v are angles that may go all the way round."""
    surface = bare(surface)
    return not isinstance(surface, Geom_Plane), isinstance(surface, Geom_ToroidalSurface)


def frame_of(surface: Geom_Surface) -> tuple[np.ndarray, np.ndarray]:
    """Return the origin (3,) [mm] and the unit axes x, y, z as rows (3, 3) of an elementary surface."""
    at = bare(surface).Position()
    axes = [at.XDirection().Coord(), at.YDirection().Coord(), at.Direction().Coord()]
    return np.array(at.Location().Coord()), np.array(axes)


def parameters_of(surface: Geom_Surface, points: np.ndarray) -> np.ndarray:
    """Return the parameters of the nearest places on an elementary surface, (n, 2); angles within (-pi, pi].

    points : (n, 3) [mm]
    """
    surface = bare(surface)
    origin, axes = frame_of(surface)
    x, y, z = ((points - origin) @ axes.T).T
    if isinstance(surface, Geom_Plane):
        return np.stack([x, y], axis=1)
    u, r = np.arctan2(y, x), np.hypot(x, y)
    if isinstance(surface, Geom_CylindricalSurface):
        v = z
    elif isinstance(surface, Geom_ConicalSurface):
        lean = surface.SemiAngle()
        v = (r - surface.RefRadius()) * np.sin(lean) + z * np.cos(lean)
    elif isinstance(surface, Geom_SphericalSurface):
        v = np.arctan2(z, r)
    else:
        v = np.arctan2(z, r - surface.MajorRadius())
    return np.stack([u, v], axis=1)


def points_at(surface: Geom_Surface, parameters: np.ndarray) -> np.ndarray:
    """Return the places on an elementary surface at parameters (n, 2), (n, 3) [mm]."""
    surface = bare(surface)
    origin, axes = frame_of(surface)
    u, v = parameters.T
    if isinstance(surface, Geom_Plane):
        return np.asarray(origin + np.stack([u, v, np.zeros_like(u)], axis=1) @ axes)
    if isinstance(surface, Geom_CylindricalSurface):
        r, z = np.full_like(u, surface.Radius()), v
    elif isinstance(surface, Geom_ConicalSurface):
        lean = surface.SemiAngle()
        r, z = surface.RefRadius() + v * np.sin(lean), v * np.cos(lean)
    elif isinstance(surface, Geom_SphericalSurface):
        r, z = surface.Radius() * np.cos(v), surface.Radius() * np.sin(v)
    else:
        r, z = surface.MajorRadius() + surface.MinorRadius() * np.cos(v), surface.MinorRadius() * np.sin(v)
    return np.asarray(origin + np.stack([r * np.cos(u), r * np.sin(u), z], axis=1) @ axes)


def from_axis(surface: Geom_Surface, points: np.ndarray) -> np.ndarray:
    """Return the distance of points from the axis of an elementary surface, (n,) [mm]: there u has no meaning."""
    origin, axes = frame_of(surface)
    x, y, _ = ((points - origin) @ axes.T).T
    return np.asarray(np.hypot(x, y))


def turned_about_axis(surface: Geom_Surface, angle: float) -> Geom_Surface:
    """Return a copy whose u counts from `angle` [rad] of the surface's own u."""
    copy = bare(surface).Copy()
    origin, axes = frame_of(surface)
    start = np.cos(angle) * axes[0] + np.sin(angle) * axes[1]
    copy.SetPosition(_axes(origin, axes, start))
    return copy


def _axes(origin: np.ndarray, axes: np.ndarray, start: np.ndarray) -> gp_Ax3:
    at = gp_Ax3(gp_Pnt(*origin.tolist()), gp_Dir(*axes[2].tolist()), gp_Dir(*start.tolist()))
    if np.linalg.det(axes) < 0.0:
        at.YReverse()
    return at


def sphere_about(surface: Geom_SphericalSurface, axis: np.ndarray) -> Geom_Surface:
    """Return the same sphere with its poles along `axis`, (3,)."""
    at = gp_Ax3(surface.Position().Location(), gp_Dir(*axis.tolist()))
    return Geom_SphericalSurface(at, surface.Radius())
