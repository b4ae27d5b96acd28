"""The surface of one face in plain numbers, whatever way it is written in, and the area that it covers."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.BRepGProp import BRepGProp, BRepGProp_Face
from OCP.BRepTools import BRepTools
from OCP.Geom import (
    Geom_CylindricalSurface,
    Geom_Plane,
    Geom_SphericalSurface,
    Geom_ToroidalSurface,
)
from OCP.gp import gp_Pnt, gp_Vec
from OCP.GProp import GProp_GProps
from OCP.TopoDS import TopoDS_Face

from moldgen.kernel.elementary import bare, frame_of, is_elementary
from moldgen.kernel.heal_fit import elementary_fit
from moldgen.model.face_sign import SurfaceKind

INTEGRATION: Final = 1e-4
"""Relative precision asked of the adaptive integration; on 5 real parts it was within 8e-7 of a finer one, where
the default integration was off by up to 9e-4 on splines (measured)."""


@dataclass(frozen=True)
class FaceSurface:
    """One face: its surface, as in `moldgen.model.face_sign.FaceSign`, and the part of it that it covers [mm].

    origin : a point of the axis, the middle of a sphere or torus, a point of a plane, (3,)
    axis : (3,), see `FaceSign`; growth : of a cone's radius along the axis, tangent of its half angle
    radius : at `origin`; minor : of a torus's tube; side : see `FaceSign`
    area : [mm^2]; center : (3,); products : integral of the products of coordinates about the center, (3, 3) [mm^4]
    """

    kind: SurfaceKind
    origin: np.ndarray
    axis: np.ndarray
    radius: float
    minor: float
    growth: float
    side: int
    area: float
    center: np.ndarray
    products: np.ndarray

    @property
    def reach(self) -> float:
        """How far the face reaches from its center, roughly [mm]."""
        return 2.0 * math.sqrt(max(float(np.trace(self.products)), 0.0) / max(self.area, 1e-300))


def face_surface(face: TopoDS_Face) -> FaceSurface:
    """Return the surface of a face and what it covers of it."""
    area, center, products = _covered(face)
    surface = bare(BRep_Tool.Surface_s(face))
    if not is_elementary(surface):
        fit = elementary_fit(face)
        surface = None if fit is None else bare(fit.surface)
    if surface is None:
        return FaceSurface(SurfaceKind.FREE, center, np.zeros(3), 0.0, 0.0, 0.0, 0, area, center, products)
    point, normal = _outward(face)
    origin, axes = frame_of(surface)
    kind, axis, radius, minor, growth = _numbers(surface, origin, axes[2], point, normal)
    middle = _middle(kind, surface, origin, axis, point)
    side = 0 if kind is SurfaceKind.PLANE else (1 if float(normal @ (point - middle)) > 0.0 else -1)
    return FaceSurface(kind, origin, axis, radius, minor, growth, side, area, center, products)


def _covered(face: TopoDS_Face) -> tuple[float, np.ndarray, np.ndarray]:
    properties = GProp_GProps()
    BRepGProp.SurfaceProperties_s(face, properties, INTEGRATION)
    area = abs(float(properties.Mass()))
    inertia = properties.MatrixOfInertia()
    matrix = np.array([[inertia.Value(i, j) for j in (1, 2, 3)] for i in (1, 2, 3)])
    products = 0.5 * np.trace(matrix) * np.eye(3) - matrix
    return area, np.array(properties.CentreOfMass().Coord()), products


def _outward(face: TopoDS_Face) -> tuple[np.ndarray, np.ndarray]:
    """Return a point of the face's surface and the unit normal there, out of the solid."""
    u0, u1, v0, v1 = BRepTools.UVBounds_s(face)
    tool, point, normal = BRepGProp_Face(face), gp_Pnt(), gp_Vec()
    for share in (0.5, 0.41, 0.63):  # a pole has no normal
        tool.Normal(u0 + share * (u1 - u0), v0 + share * (v1 - v0), point, normal)
        if normal.Magnitude() > 0.0:
            break
    found = np.array([normal.X(), normal.Y(), normal.Z()])
    return np.array(point.Coord()), found / max(float(np.linalg.norm(found)), 1e-300)


def _numbers(
    surface: Any, origin: np.ndarray, along: np.ndarray, point: np.ndarray, normal: np.ndarray
) -> tuple[SurfaceKind, np.ndarray, float, float, float]:
    """Return kind, axis, radius, radius of the tube, and growth of the radius along the axis."""
    if isinstance(surface, Geom_Plane):
        return SurfaceKind.PLANE, along if float(normal @ along) > 0.0 else -along, 0.0, 0.0, 0.0
    if isinstance(surface, Geom_CylindricalSurface):
        return SurfaceKind.CYLINDER, _forward(along), surface.Radius(), 0.0, 0.0
    if isinstance(surface, Geom_SphericalSurface):
        return SurfaceKind.SPHERE, np.zeros(3), surface.Radius(), 0.0, 0.0
    if isinstance(surface, Geom_ToroidalSurface):
        return SurfaceKind.TORUS, _forward(along), surface.MajorRadius(), surface.MinorRadius(), 0.0
    slope = math.tan(surface.SemiAngle())
    here = surface.RefRadius() + float((point - origin) @ along) * slope
    wide = math.copysign(1.0, here) * math.copysign(1.0, slope)  # beyond the tip the cone widens the other way
    return SurfaceKind.CONE, wide * along, math.copysign(1.0, here) * surface.RefRadius(), 0.0, abs(slope)


def _forward(axis: np.ndarray) -> np.ndarray:
    """Return the sense of an axis whose first component that is not 0 is positive: the axis itself has none."""
    first = axis[np.flatnonzero(np.abs(axis) > 1e-6)[0]]
    return axis if first > 0.0 else -axis


def _middle(kind: SurfaceKind, surface: Any, origin: np.ndarray, axis: np.ndarray, point: np.ndarray) -> np.ndarray:
    """Return the point of the axis, or of the ring of a torus, or the middle of a sphere, from which `point` lies."""
    if kind in (SurfaceKind.PLANE, SurfaceKind.SPHERE):
        return origin
    foot = origin + float((point - origin) @ axis) * axis
    if kind is not SurfaceKind.TORUS:
        return np.asarray(foot)
    radial = point - foot
    return np.asarray(origin + surface.MajorRadius() * radial / max(float(np.linalg.norm(radial)), 1e-300))
