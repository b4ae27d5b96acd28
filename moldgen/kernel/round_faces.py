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
    """One cylinder or cone face with its axis along z, whose plastic lies outside it: the wall of a round core [mm].

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
        one = _face(body, number, np.array([place.X(), place.Y(), place.Z()]), base, growth)
        if one is not None:
            found.append(one)
    return found


def _face(body: Body, number: int, place: np.ndarray, base: float, growth: float) -> RoundFace | None:
    """Return the face, or None when its plastic lies inside or it is a part of a cone that ends in nothing."""
    own = body.mesh.face == number
    offset = body.mesh.corners[own].mean(axis=1)[:, :2] - place[:2]
    if (offset * body.mesh.normals[own, :2]).sum() >= 0.0:
        return None
    low, high = (float(z) for z in body.face_heights[number])
    radii = (base + growth * (low - float(place[2])), base + growth * (high - float(place[2])))
    height = high - low
    whole = math.pi * abs(sum(radii)) * math.hypot(height, radii[1] - radii[0])
    if height <= 0.0 or whole <= 0.0:
        return None
    turn = 2.0 * math.pi * float(body.face_areas[number]) / whole
    return RoundFace(number, float(place[0]), float(place[1]), abs(radii[0]), abs(radii[1]), low, high, turn)
