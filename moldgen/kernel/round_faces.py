"""Cylinders and cones that stand along the pull, with their exact axis and radius."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.GeomAbs import GeomAbs_Cone, GeomAbs_Cylinder

from moldgen.kernel.body import Body

PARALLEL = 1e-6
"""Sine of the angle up to which an axis counts as parallel to the pull."""


@dataclass(frozen=True)
class RoundFace:
    """One cylinder or cone face with its axis along z: the wall of a hole, or the outside of something round [mm].

    x, y : axis; radius_low, radius_high : at the lower and the upper end; z_low, z_high : its ends
    turn : angle that the face covers about the axis [rad], by its area
    """

    face: int
    x: float
    y: float
    radius_low: float
    radius_high: float
    z_low: float
    z_high: float
    turn: float


def hollow_round_faces(body: Body) -> list[RoundFace]:
    """Return the faces of holes along z, cylindrical or conical, in the order of their numbers."""
    return _round_faces(body, hollow=True)


def standing_round_faces(body: Body) -> list[RoundFace]:
    """Return the outer faces of bosses and pins along z, cylindrical or conical, in the order of their numbers."""
    return _round_faces(body, hollow=False)


def _round_faces(body: Body, *, hollow: bool) -> list[RoundFace]:
    found = []
    for number in range(len(body.faces)):
        surface = BRepAdaptor_Surface(body.faces[number])
        kind = surface.GetType()
        if kind == GeomAbs_Cylinder:
            cylinder = surface.Cylinder()
            axis, base, growth = cylinder.Axis(), cylinder.Radius(), 0.0
        elif kind == GeomAbs_Cone:
            cone = surface.Cone()
            axis, base, growth = cone.Axis(), cone.RefRadius(), math.tan(cone.SemiAngle())
        else:
            continue
        along = axis.Direction()
        if math.hypot(along.X(), along.Y()) > PARALLEL:
            continue
        place = axis.Location()
        growth = math.copysign(1.0, along.Z()) * growth
        one = _face(body, number, np.array([place.X(), place.Y(), place.Z()]), (base, growth), hollow=hollow)
        if one is not None:
            found.append(one)
    return found


def _face(body: Body, number: int, place: np.ndarray, slope: tuple[float, float], *, hollow: bool) -> RoundFace | None:
    """Return the face, or None when its plastic lies on the other side or it is part of a cone that ends in nothing.

    slope : radius at the height of `place` and its growth with the height
    """
    base, growth = slope
    own = body.mesh.face == number
    offset = body.mesh.corners[own].mean(axis=1)[:, :2] - place[:2]
    if ((offset * body.mesh.normals[own, :2]).sum() < 0.0) != hollow:
        return None
    low, high = (float(z) for z in body.face_heights[number])
    radii = (base + growth * (low - float(place[2])), base + growth * (high - float(place[2])))
    height = high - low
    whole = math.pi * abs(sum(radii)) * math.hypot(height, radii[1] - radii[0])
    if height <= 0.0 or whole <= 0.0:
        return None
    turn = 2.0 * math.pi * float(body.face_areas[number]) / whole
    return RoundFace(number, float(place[0]), float(place[1]), abs(radii[0]), abs(radii[1]), low, high, turn)
