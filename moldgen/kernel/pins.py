"""Pins whose tip is a piece of the core: the rest of the pin is built onto what its bore took out of the core.

A plug is the steel that a bore takes out. Its faces above the fit are kept, with their own edges; shank and head are
built on those edges, so that no boolean can lose a face and the tip lies in the core's surface exactly.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve, BRepAdaptor_Surface
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeEdge, BRepBuilderAPI_Transform
from OCP.BRepPrimAPI import BRepPrimAPI_MakePrism
from OCP.GeomAbs import GeomAbs_Circle, GeomAbs_Cylinder, GeomAbs_Plane
from OCP.gp import gp_Ax2, gp_Circ, gp_Dir, gp_Trsf, gp_Vec
from OCP.TopoDS import TopoDS, TopoDS_Face, TopoDS_Shape, TopoDS_Wire

from moldgen.errors import KernelError
from moldgen.kernel.build import plane_face, plane_through, point, wire_of
from moldgen.kernel.guard import operation
from moldgen.kernel.measure import area
from moldgen.kernel.merge import merged_faces
from moldgen.kernel.shells import solid_from_faces
from moldgen.kernel.topology import edge_points, edges_of, faces_of, only_solid, vertex_point, vertices_of
from moldgen.kernel.turned import Place
from moldgen.model.part import Vector

LEVEL = 1e-6
"""mm: heights closer than this are the same."""

ALIKE = 1e-5
"""mm: two plugs whose corners, edges and faces lie this close are the same."""


@dataclass(frozen=True)
class Below:
    """The pin below the plug's fit, heights in mm.

    fit_low : lower end of the fit; shoulder : upper face of the head; foot : lower end of the pin
    head : diameter of the head, 0 without one
    shank, shank_top : diameter and upper end of a shank that is thicker than the pin's tip, 0 without one
    """

    fit_low: float
    shoulder: float
    foot: float
    head: float
    shank: float = 0.0
    shank_top: float = 0.0

    @property
    def collars(self) -> tuple[tuple[float, float, float], ...]:
        """Everything thicker than the tip, from the highest down: diameter, upper end, lower end."""
        head = (self.head, self.shoulder, self.foot)
        end = self.shoulder if self.head > 0.0 else self.foot
        found = ((self.shank, self.shank_top, end), head)
        return tuple(c for c in found if c[0] > 0.0)


def flat_top(plug: TopoDS_Shape, fit_low: float) -> float | None:
    """Return the height of a plug's tip if that is one level plane, else None: then the pin is a plain cylinder."""
    upper = _upper_faces(plug, fit_low)
    kinds = [BRepAdaptor_Surface(f).GetType() for f in upper]
    if sorted(k.name for k in kinds) != sorted([GeomAbs_Plane.name, GeomAbs_Cylinder.name]):
        return None
    heights = np.concatenate([edge_points(e, 5)[:, 2] for e in edges_of(upper[kinds.index(GeomAbs_Plane)])])
    return float(heights.max()) if np.ptp(heights) < LEVEL else None


def is_turned(plug: TopoDS_Shape, axis: Place, fit_low: float) -> bool:
    """True when the upper end of a plug is round about its axis: then it does not matter how the pin is turned."""
    for face in _upper_faces(plug, fit_low):
        for edge in edges_of(face):
            if BRep_Tool.Degenerated_s(edge) or BRep_Tool.IsClosed_s(edge, face):
                continue
            points = edge_points(edge, 9)
            reach = np.hypot(points[:, 0] - axis[0], points[:, 1] - axis[1])
            if np.ptp(points[:, 2]) > LEVEL or np.ptp(reach) > LEVEL:
                return False
    return True


def pin_on_plug(plug: TopoDS_Shape, axis: Place, below: Below) -> TopoDS_Shape:
    """Return the pin whose upper end is the upper end of a plug.

    Raises
    ------
    KernelError : the bore breaks through the core's surface beside the fit, or the pin does not close
    """
    with operation("build a pin on its tip", operands=[plug]):
        upper = _upper_faces(plug, below.fit_low)
        made = solid_from_faces([*upper, *_lower_faces(_rim(upper, below.fit_low), axis, below)])
        if made.complaint:
            raise KernelError(f"the pin does not close: {made.complaint}")
        return merged_faces(made.solid)


def faces_below(plug: TopoDS_Shape, fit_low: float) -> int:
    """Return how many faces of a plug lie below the lower end of its fit.

    Raises
    ------
    KernelError : the bore breaks through the core's surface beside the fit
    """
    upper = _upper_faces(plug, fit_low)
    _rim(upper, fit_low)
    return len(faces_of(plug)) - len(upper)


def alike(one: TopoDS_Shape, one_at: Vector, other: TopoDS_Shape, other_at: Vector, *, turned: bool = False) -> bool:
    """True when two solids are the same but for their place: corners, edges and faces fall on each other.

    With `turned`, both are round about an upright axis through their places, and may be turned about it.
    """
    for ours, theirs in zip(_marks(one, one_at, turned), _marks(other, other_at, turned), strict=True):
        if ours.shape != theirs.shape:
            return False
        gap = np.abs(ours[:, None, :] - theirs[None, :, :]).max(axis=2)
        if (gap.min(axis=1) > ALIKE).any() or (gap.min(axis=0) > ALIKE).any():
            return False
    return True


def carried(solid: TopoDS_Shape, by: Vector) -> TopoDS_Shape:
    """Return a copy of a solid at another place, its geometry moved, not only its frame."""
    shift = gp_Trsf()
    shift.SetTranslation(gp_Vec(*by))
    return only_solid(BRepBuilderAPI_Transform(solid, shift, True).Shape())


def level_circles(solid: TopoDS_Shape) -> np.ndarray:
    """Return (x, y, radius, z) of the level circular edges of a solid, sorted, (k, 4) [mm]."""
    found = []
    for edge in edges_of(solid):
        curve = BRepAdaptor_Curve(edge)
        if curve.GetType() == GeomAbs_Circle:
            circle = curve.Circle()
            if abs(circle.Axis().Direction().Z()) > 1.0 - 1e-9:
                x, y, z = circle.Location().Coord()
                found.append((x, y, circle.Radius(), z))
    return np.array(sorted(found)).reshape(-1, 4)


def _upper_faces(plug: TopoDS_Shape, fit_low: float) -> list[TopoDS_Face]:
    return [f for f in faces_of(plug) if _highest(f) > fit_low + 10 * LEVEL]


def _highest(face: TopoDS_Face) -> float:
    """Return the highest z of a face's edges: every face of a plug has one at its top."""
    return max(float(edge_points(e, 5)[:, 2].max()) for e in edges_of(face) if not BRep_Tool.Degenerated_s(e))


def _rim(upper: Sequence[TopoDS_Face], fit_low: float) -> TopoDS_Wire:
    edges = list(solid_from_faces(upper).free)
    heights = [edge_points(e, 5)[:, 2] for e in edges]
    if not edges or np.abs(np.concatenate(heights) - fit_low).max() > LEVEL * 10:
        raise KernelError("the bore breaks through the surface of the core beside its fit")
    return wire_of(edges)


def _lower_faces(rim: TopoDS_Wire, axis: Place, below: Below) -> list[TopoDS_Face]:
    collars = below.collars
    end = collars[0][1] if collars else below.foot
    faces, foot = [], rim
    if below.fit_low - end > LEVEL:
        shank = BRepPrimAPI_MakePrism(rim, gp_Vec(0.0, 0.0, end - below.fit_low))
        faces, foot = faces_of(shank.Shape()), TopoDS.Wire_s(shank.LastShape())
    for diameter, high, low in collars:
        about = gp_Ax2(point((*axis, high)), gp_Dir(0.0, 0.0, 1.0), gp_Dir(1.0, 0.0, 0.0))
        circle = wire_of([BRepBuilderAPI_MakeEdge(gp_Circ(about, diameter / 2)).Edge()])
        collar = BRepPrimAPI_MakePrism(circle, gp_Vec(0.0, 0.0, low - high))
        ring = plane_face(plane_through((0.0, 0.0, high), (0.0, 0.0, 1.0)), circle, [foot])
        faces += [ring, *faces_of(collar.Shape())]
        foot = TopoDS.Wire_s(collar.LastShape())
    return [*faces, _disc(foot, below.foot)]


def _disc(rim: TopoDS_Wire, level: float) -> TopoDS_Face:
    return plane_face(plane_through((0.0, 0.0, level), (0.0, 0.0, 1.0)), rim)


def _marks(solid: TopoDS_Shape, at: Vector, turned: bool) -> Sequence[np.ndarray]:
    corners = np.array([vertex_point(v) for v in vertices_of(solid)]).reshape(-1, 3) - at
    lines = [e for e in edges_of(solid) if not BRep_Tool.Degenerated_s(e)]
    middles = np.array([edge_points(e, 3)[1] for e in lines]).reshape(-1, 3) - at
    faces = np.array([area(f) for f in faces_of(solid)])[:, None]
    if turned:
        corners, middles = (np.column_stack([np.hypot(p[:, 0], p[:, 1]), p[:, 2]]) for p in (corners, middles))
    return corners, middles, faces
