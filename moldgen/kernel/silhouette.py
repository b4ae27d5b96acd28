"""Silhouettes of a face seen along +z (n.d = 0), and its isoclines (n.d = sine), as edges that lie on the face."""

from __future__ import annotations

import math

import numpy as np
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeEdge
from OCP.BRepLib import BRepLib
from OCP.GCPnts import GCPnts_AbscissaPoint
from OCP.Geom2d import Geom2d_Curve, Geom2d_Line
from OCP.GeomAbs import (
    GeomAbs_C2,
    GeomAbs_Cone,
    GeomAbs_Cylinder,
    GeomAbs_Plane,
    GeomAbs_Sphere,
    GeomAbs_SurfaceOfExtrusion,
    GeomAbs_SurfaceOfRevolution,
    GeomAbs_Torus,
)
from OCP.gp import gp_Ax2, gp_Circ, gp_Dir, gp_Dir2d, gp_Pnt, gp_Pnt2d
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face

from moldgen.kernel.guard import operation
from moldgen.kernel.marching import level_curves
from moldgen.kernel.mesh import tessellate
from moldgen.kernel.slope import LEVEL, Slope, angles, axis_parts, profile_places, roots
from moldgen.kernel.split import split_shape
from moldgen.kernel.topology import edge_faces_map, edges_of
from moldgen.tolerances import MAX_EDGE_TOLERANCE, SHORT_EDGE

ON_CURVE = 1e-4
"""|n.d - sine| in the middle of an edge that a split made, below which the edge comes from the curve."""

ROOM, ROOM_ANGLE = 0.2, 0.02
"""How far [mm], [rad] lines and circles run past the parameter box of their face before they are clipped."""


def silhouette_edges(face: TopoDS_Face, sine: float = 0.0) -> list[TopoDS_Edge]:
    """Return the curves of a face on which its outward unit normal n satisfies n.z = sine, clipped to the face.

    Exact on cylinders, cones, spheres, extrusions, and tori and surfaces of revolution about z; elsewhere a spline
    through exact points. Pieces shorter than `SHORT_EDGE` and pieces that do not part the face are left out.

    Raises
    ------
    KernelError : the kernel failed while it clipped a curve
    """
    slope = Slope(face, sine)
    raw = _raw_edges(face, slope)
    return _clipped(face, slope, raw) if raw else []


def _raw_edges(face: TopoDS_Face, slope: Slope) -> list[TopoDS_Edge]:
    kind = slope.surface.GetType()
    if kind == GeomAbs_Plane:
        return []
    if kind == GeomAbs_Sphere:
        return _sphere_circle(slope)
    at_u, at_v = _iso_parameters(slope)
    if at_u is None or at_v is None:
        tessellate(face)
        return [_edge_on(face, curve) for curve in level_curves(face, slope)]
    low_u, high_u, low_v, high_v = _widened(slope)
    lines = [((u, low_v), (u, high_v)) for u in at_u] + [((low_u, v), (high_u, v)) for v in at_v]
    return [_iso_edge(face, start, end) for start, end in lines]


def _widened(slope: Slope) -> tuple[float, float, float, float]:
    """Return the parameter box of the face with room around it: a tool that ends on the boundary, give or take the
    boundary's tolerance, leaves a crumb that spoils the split.
    """
    low_u, high_u, low_v, high_v = slope.bounds
    kind = slope.surface.GetType()
    low_u, high_u = _wider_angle(low_u, high_u) if kind != GeomAbs_SurfaceOfExtrusion else (low_u, high_u)
    if kind == GeomAbs_Torus:
        low_v, high_v = _wider_angle(low_v, high_v)
    elif kind in (GeomAbs_Cylinder, GeomAbs_SurfaceOfExtrusion):
        low_v, high_v = low_v - ROOM, high_v + ROOM
    elif kind == GeomAbs_Cone:
        cone = slope.surface.Cone()
        apex = -cone.RefRadius() / math.sin(cone.SemiAngle())
        low_v = max(low_v - ROOM, apex) if low_v >= apex - SHORT_EDGE else low_v - ROOM
        high_v = min(high_v + ROOM, apex) if high_v <= apex + SHORT_EDGE else high_v + ROOM
    return low_u, high_u, low_v, high_v


def _wider_angle(low: float, high: float) -> tuple[float, float]:
    room = min(ROOM_ANGLE, 0.4 * (2.0 * math.pi - (high - low)))
    return (low - room, high + room) if room > 1e-6 else (low, high)


def _iso_parameters(slope: Slope) -> tuple[list[float] | None, list[float] | None]:
    """Return the u and v of the parameter lines that make up the curve, (None, None) if it has others."""
    surface, kind = slope.surface, slope.surface.GetType()
    low_u, high_u, low_v, high_v = slope.bounds
    if kind == GeomAbs_Cylinder:
        a, b, _, hand = axis_parts(surface.Cylinder().Position())
        return angles(math.hypot(a, b), math.atan2(b, a), slope.side * hand * slope.sine, low_u, high_u), []
    if kind == GeomAbs_Cone:
        return _cone_rulings(slope), []
    if kind == GeomAbs_SurfaceOfExtrusion:
        middle = 0.5 * (low_v + high_v)
        return roots(lambda u: slope(u, middle), profile_places(surface.BasisCurve(), low_u, high_u)), []
    if kind == GeomAbs_SurfaceOfRevolution and _upright(surface.AxeOfRevolution().Direction()):
        middle = 0.5 * (low_u + high_u)
        return [], roots(lambda v: slope(middle, v), profile_places(surface.BasisCurve(), low_v, high_v))
    if kind == GeomAbs_Torus:
        return _torus_lines(slope)
    return None, None


def _upright(direction: gp_Dir) -> bool:
    return math.hypot(direction.X(), direction.Y()) < LEVEL


def _cone_rulings(slope: Slope) -> list[float]:
    cone = slope.surface.Cone()
    a, b, c, hand = axis_parts(cone.Position())
    low_u, high_u, low_v, high_v = slope.bounds
    half = cone.SemiAngle()
    # beyond its apex the cone's own normal turns over
    side = slope.side * hand * (1.0 if cone.RefRadius() + 0.5 * (low_v + high_v) * math.sin(half) > 0.0 else -1.0)
    wanted = side * slope.sine + math.sin(half) * c
    return angles(math.cos(half) * math.hypot(a, b), math.atan2(b, a), wanted, low_u, high_u)


def _torus_lines(slope: Slope) -> tuple[list[float] | None, list[float] | None]:
    """Circles about an upright axis; for an axis square to z the top and bottom circle and the two end sections."""
    a, b, c, hand = axis_parts(slope.surface.Torus().Position())
    low_u, high_u, low_v, high_v = slope.bounds
    if math.hypot(a, b) < LEVEL:
        return [], angles(1.0, 0.5 * math.pi, slope.side * hand * slope.sine * math.copysign(1.0, c), low_v, high_v)
    if abs(c) < LEVEL and slope.sine == 0.0:
        return angles(math.hypot(a, b), math.atan2(b, a), 0.0, low_u, high_u), angles(1.0, 0.0, 0.0, low_v, high_v)
    return None, None


def _sphere_circle(slope: Slope) -> list[TopoDS_Edge]:
    sphere = slope.surface.Sphere()
    if abs(slope.sine) >= 1.0 - LEVEL:
        return []
    x, y, z = sphere.Location().Coord()
    hand = 1.0 if sphere.Position().Direct() else -1.0
    height = slope.side * hand * slope.sine * sphere.Radius()
    axes = gp_Ax2(gp_Pnt(x, y, z + height), gp_Dir(0.0, 0.0, 1.0))
    return [BRepBuilderAPI_MakeEdge(gp_Circ(axes, sphere.Radius() * math.sqrt(1.0 - slope.sine**2))).Edge()]


def _iso_edge(face: TopoDS_Face, start: tuple[float, float], end: tuple[float, float]) -> TopoDS_Edge:
    """Return the edge along a parameter line, with the surface's own line or circle as its curve."""
    surface = BRep_Tool.Surface_s(face)
    way = np.subtract(end, start)
    length = float(np.linalg.norm(way))
    if way[0] == 0.0:
        edge = BRepBuilderAPI_MakeEdge(surface.UIso(start[0]), start[1], end[1]).Edge()
        line = Geom2d_Line(gp_Pnt2d(start[0], 0.0), gp_Dir2d(0.0, 1.0))
    else:
        edge = BRepBuilderAPI_MakeEdge(surface.VIso(start[1]), start[0], end[0]).Edge()
        line = Geom2d_Line(gp_Pnt2d(0.0, start[1]), gp_Dir2d(1.0, 0.0))
    if length > 0.0:
        BRep_Builder().UpdateEdge(edge, line, surface, TopLoc_Location(), 1e-7)
    return edge


def _edge_on(face: TopoDS_Face, curve: Geom2d_Curve) -> TopoDS_Edge:
    edge = BRepBuilderAPI_MakeEdge(curve, BRep_Tool.Surface_s(face)).Edge()
    BRepLib.BuildCurves3d_s(edge, 1e-6, GeomAbs_C2, 14, 200)
    return edge


def _clipped(face: TopoDS_Face, slope: Slope, edges: list[TopoDS_Edge]) -> list[TopoDS_Edge]:
    """Split the lone face by the edges and return the pieces between two of its parts."""
    with operation("clip a silhouette to its face", operands=[face, *edges]):
        found = _parting_pieces(face, slope, edges)
        if len(found) >= len(edges):
            return found
        # some exports have boundary curves that miss their own face by a little more than they admit
        loosest = max((BRep_Tool.Tolerance_s(e) for e in edges_of(face)), default=0.0)
        for edge in edges:
            BRep_Builder().UpdateEdge(edge, min(2.0 * loosest, MAX_EDGE_TOLERANCE))
        again = _parting_pieces(face, slope, edges)
        return again if sum(map(_length, again)) > sum(map(_length, found)) + SHORT_EDGE else found


def _parting_pieces(face: TopoDS_Face, slope: Slope, edges: list[TopoDS_Edge]) -> list[TopoDS_Edge]:
    links = edge_faces_map(split_shape(face, edges))
    found = []
    for number in range(1, links.Extent() + 1):
        users = links.FindFromIndex(number)
        if users.Size() != 2 or users.First().IsSame(users.Last()):
            continue
        edge = TopoDS.Edge_s(links.FindKey(number))
        if _on_curve(edge, TopoDS.Face_s(users.First()), slope):
            found.append(edge)
    return found


def _on_curve(edge: TopoDS_Edge, face: TopoDS_Face, slope: Slope) -> bool:
    if _length(edge) < SHORT_EDGE:
        return False
    low, high = BRep_Tool.Range_s(edge)
    curve = BRep_Tool.CurveOnSurface_s(edge, face, low, high)
    return all(abs(slope(*curve.Value(low + t * (high - low)).Coord())) < ON_CURVE for t in (0.3, 0.5, 0.7))


def _length(edge: TopoDS_Edge) -> float:
    return float(GCPnts_AbscissaPoint.Length_s(BRepAdaptor_Curve(edge)))
