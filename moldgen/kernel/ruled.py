"""Ruled faces: straight lines from each place of one edge to the same place of another."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeFace
from OCP.Geom import Geom_BSplineCurve, Geom_BSplineSurface, Geom_Surface, Geom_TrimmedCurve
from OCP.GeomAbs import GeomAbs_Line
from OCP.GeomAPI import GeomAPI_Interpolate
from OCP.GeomConvert import GeomConvert
from OCP.GeomFill import GeomFill
from OCP.TColgp import TColgp_HArray1OfPnt
from OCP.TColStd import TColStd_HArray1OfReal
from OCP.TopoDS import TopoDS_Edge, TopoDS_Face, TopoDS_Vertex

from moldgen.errors import KernelError
from moldgen.kernel.build import (
    curve_edge,
    line_edge,
    plane_face,
    plane_through,
    point,
    wire_of,
    with_curves_on_surface,
)
from moldgen.kernel.measure import is_valid
from moldgen.kernel.topology import directed_points, is_reversed

INNER_KNOTS = (0.25, 0.5, 0.75)
"""Shares of a twisted surface's width and length at which it gets knots: its meshes then stray by a sixteenth."""

FLAT = 1e-7
"""mm: four corners that leave a plane by no more lie on it."""


def is_straight(edge: TopoDS_Edge) -> bool:
    """True for an edge on a line."""
    return bool(BRepAdaptor_Curve(edge).GetType() == GeomAbs_Line)


def spline_of(edge: TopoDS_Edge) -> Geom_BSplineCurve:
    """Return the curve of an edge as a B-spline that runs the way the edge is used, exact."""
    adaptor = BRepAdaptor_Curve(edge)
    base = adaptor.Curve().Curve().Transformed(adaptor.Trsf())
    trimmed = Geom_TrimmedCurve(base, adaptor.FirstParameter(), adaptor.LastParameter())
    curve = GeomConvert.CurveToBSplineCurve_s(trimmed)
    if is_reversed(edge):
        curve.Reverse()
    return curve


def spline_through(points: np.ndarray, parameters: np.ndarray) -> Geom_BSplineCurve:
    """Return the cubic B-spline through points (n, 3) [mm] at ascending parameters (n,).

    Raises
    ------
    KernelError : the kernel finds none
    """
    places = TColgp_HArray1OfPnt(1, len(points))
    times = TColStd_HArray1OfReal(1, len(points))
    for i, (place, time) in enumerate(zip(points, parameters, strict=True), start=1):
        places.SetValue(i, point(place))
        times.SetValue(i, float(time))
    maker = GeomAPI_Interpolate(places, times, False, 1e-7)
    maker.Perform()
    if not maker.IsDone():
        raise KernelError(f"no curve through {len(points)} points")
    return maker.Curve()


def spline_edge(curve: Geom_BSplineCurve, start: TopoDS_Vertex, end: TopoDS_Vertex) -> TopoDS_Edge:
    """Return the whole of a curve as an edge between two vertices, or a straight edge for a curve of two points."""
    if curve.NbPoles() == 2:
        return line_edge(start, end)
    return curve_edge(curve, (start, end))


def ruled_face(base: TopoDS_Edge, far: TopoDS_Edge, sides: Sequence[TopoDS_Edge]) -> TopoDS_Face:
    """Return the face of straight lines between two edges that run the same way; `sides` join their ends.

    The lines join places of equal share of the curves' parameters. Two straight edges of one plane make a plane face.

    Raises
    ------
    KernelError : the kernel makes no valid face
    """
    wire = wire_of([base, far, *sides])
    if is_straight(base) and is_straight(far):
        plane = _common_plane(directed_points(base, 2), directed_points(far, 2))
        if plane is not None:
            return plane_face(plane_through(*plane), wire)
    one, other = spline_of(base), spline_of(far)
    surface = _with_inner_knots(GeomFill.Surface_s(one, other))
    maker = BRepBuilderAPI_MakeFace(surface, wire, False)
    if not maker.IsDone():
        raise KernelError("no ruled face between two edges")
    face = with_curves_on_surface(maker.Face(), surface)
    if not is_valid(face):
        raise KernelError("a ruled face between two edges is invalid")
    return face


def _with_inner_knots(surface: Geom_Surface) -> Geom_Surface:
    """Return the surface between two lines with knots inside it, shape unchanged; other surfaces as they are.

    The kernel meshes a twisted surface without inner knots by two triangles, over either diagonal: the meshes of two
    halves that share it then seem to overlap by its whole twist.
    """
    if not isinstance(surface, Geom_BSplineSurface) or surface.UDegree() > 1 or surface.VDegree() > 1:
        return surface
    surface.IncreaseDegree(2, 2)  # knots of a surface of first degree would break its tangents
    low_u, high_u, low_v, high_v = surface.Bounds()
    for share in INNER_KNOTS:
        surface.InsertUKnot(low_u + share * (high_u - low_u), 1, 1e-9)
        surface.InsertVKnot(low_v + share * (high_v - low_v), 1, 1e-9)
    return surface


def _common_plane(one: np.ndarray, other: np.ndarray) -> tuple[np.ndarray, np.ndarray] | None:
    """Return a point and the normal of the plane through two straight edges (2, 3), None if they have none."""
    corners = np.vstack([one, other])
    centre = corners.mean(axis=0)
    normal = np.linalg.svd(corners - centre)[2][2]
    return (centre, normal) if np.abs((corners - centre) @ normal).max() < FLAT else None
