"""Where a feature stands: an origin, two sketch directions, and the direction of growth."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.GeomAbs import GeomAbs_Plane
from OCP.gp import gp_Ax1, gp_Ax2, gp_Ax3, gp_Dir, gp_Pnt, gp_Vec
from OCP.TopoDS import TopoDS_Face

from moldgen.errors import PartError
from moldgen.kernel.topology import edge_points, edges_of, is_reversed
from moldgen.model.recipe import Selector

Array = np.ndarray
X: Final = np.array([1.0, 0.0, 0.0])
Y: Final = np.array([0.0, 1.0, 0.0])
Z: Final = np.array([0.0, 0.0, 1.0])

_AXES: Final = {"x": X, "y": Y, "z": Z}
_PLANES: Final = {"xy": (X, Y, Z), "xz": (X, Z, Y), "yz": (Y, Z, X)}


@dataclass(frozen=True)
class Frame:
    """A sketch plane: point (a, b, c) lies at origin + a u + b v + c grow. It may be left-handed."""

    origin: Array
    u: Array
    v: Array
    grow: Array

    def place(self, a: float, b: float, c: float = 0.0) -> Array:
        """Return the point with these coordinates, (3,) [mm]."""
        return self.origin + a * self.u + b * self.v + c * self.grow  # type: ignore[no-any-return]

    def point(self, a: float, b: float, c: float = 0.0) -> gp_Pnt:
        """Return the same as a kernel point."""
        return pnt(self.place(a, b, c))

    def along(self, angle: float) -> Array:
        """Return the direction in the plane at `angle` [deg] from u."""
        turn = math.radians(angle)
        return math.cos(turn) * self.u + math.sin(turn) * self.v  # type: ignore[no-any-return]

    def axes(self, at: Sequence[float], angle: float = 0.0) -> gp_Ax2:
        """Return right-handed axes at a place of the plane: main axis = growth, x axis at `angle` from u."""
        return gp_Ax2(self.point(*at), direction(self.grow), direction(self.along(angle)))

    def normal(self) -> Array:
        """Return u x v: the normal of the sketch in its own sense (not always the growth direction)."""
        return np.cross(self.u, self.v)

    def plane(self, height: float = 0.0) -> gp_Ax3:
        """Return the sketch plane at a height along the growth direction."""
        return gp_Ax3(self.point(0.0, 0.0, height), direction(self.normal()), direction(self.u))

    def turned(self, at: Sequence[float] | Array, angle: float) -> Frame:
        """Return the frame moved to a place of the plane and turned by `angle` [deg] from u towards v."""
        return Frame(self.place(*at), self.along(angle), self.along(angle + 90.0), self.grow)


def pnt(point: Sequence[float] | Array) -> gp_Pnt:
    """Return a kernel point."""
    return gp_Pnt(float(point[0]), float(point[1]), float(point[2]))


def direction(vector: Sequence[float] | Array) -> gp_Dir:
    """Return a kernel direction."""
    return gp_Dir(float(vector[0]), float(vector[1]), float(vector[2]))


def vec(vector: Sequence[float] | Array) -> gp_Vec:
    """Return a kernel vector."""
    return gp_Vec(float(vector[0]), float(vector[1]), float(vector[2]))


def unit(value: str | Sequence[float]) -> Array:
    """Return the unit vector of ``+x`` ... ``-z`` or of three numbers.

    Raises
    ------
    PartError : three numbers of length zero
    """
    if isinstance(value, str):
        return (-1.0 if value[0] == "-" else 1.0) * _AXES[value[1]]
    vector = np.array(value, dtype=float)
    length = float(np.linalg.norm(vector))
    if length < 1e-9:
        raise PartError("the direction 0, 0, 0 points nowhere", remedy="give a vector longer than zero, or e.g. +z")
    return vector / length  # type: ignore[no-any-return]


def axis(at: Sequence[float], along: str | Sequence[float]) -> gp_Ax1:
    """Return the axis through a point."""
    return gp_Ax1(pnt(at), direction(unit(along)))


def frame_on(on: Mapping[str, Any], choose_face: Callable[[Selector], TopoDS_Face]) -> Frame:
    """Return the frame for the `on` of a feature.

    Parameters
    ----------
    on : plane or face (`Selector`), offset, flip, origin
    choose_face : finds the planar face that a selector means

    Raises
    ------
    PartError : the chosen face is not planar
    """
    sign = -1.0 if on["flip"] else 1.0
    offset = on["offset"] or 0.0
    if on["plane"]:
        u, v, grow = _PLANES[on["plane"]]
        return Frame(offset * grow, u, v, sign * grow)
    face = choose_face(on["face"])
    normal, point = outward_plane(face, on["face"].text)
    u, v = sketch_directions(normal)
    if on["origin"] == "centre":
        rim = np.vstack([edge_points(edge, 17) for edge in edges_of(face)])
        origin = _onto(normal, point, (rim.min(axis=0) + rim.max(axis=0)) / 2)
    else:
        origin = _onto(normal, point, np.zeros(3))
    return Frame(origin + offset * normal, u, v, sign * normal)


def outward_plane(face: TopoDS_Face, name: str) -> tuple[Array, Array]:
    """Return the outward normal of a planar face and a point on it.

    Raises
    ------
    PartError : the face is curved
    """
    surface = BRepAdaptor_Surface(face)
    if surface.GetType() != GeomAbs_Plane:
        raise PartError(
            f"the face '{name}' is curved; a feature can only stand on a plane", remedy="use a plane: xy ..."
        )
    plane = surface.Plane()
    normal = np.array(plane.Position().XDirection().Crossed(plane.Position().YDirection()).Coord())
    return (-normal if is_reversed(face) else normal), np.array(plane.Location().Coord())


def sketch_directions(normal: Array) -> tuple[Array, Array]:
    """Return u and v of a face: the part's x, y (face towards z), x, z (towards y) or y, z, laid into the face."""
    size = np.abs(normal)
    if size[2] >= max(size[0], size[1]) - 1e-9:
        first, second = X, Y
    elif size[1] >= size[0]:
        first, second = X, Z
    else:
        first, second = Y, Z
    u = first - (first @ normal) * normal
    u /= np.linalg.norm(u)
    v = np.cross(normal, u)
    return u, (v if v @ second > 0 else -v)


def _onto(normal: Array, point: Array, other: Array) -> Array:
    return other - ((other - point) @ normal) * normal  # type: ignore[no-any-return]
