"""Vertices, edges, wires and faces made by hand, sharing what they have in common."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.BRepBuilderAPI import (
    BRepBuilderAPI_MakeEdge,
    BRepBuilderAPI_MakeFace,
    BRepBuilderAPI_MakeVertex,
    BRepBuilderAPI_MakeWire,
)
from OCP.Geom import Geom_BSplineCurve, Geom_Surface, Geom_TrimmedCurve
from OCP.GeomConvert import GeomConvert
from OCP.gp import gp_Dir, gp_Pln, gp_Pnt
from OCP.ShapeFix import ShapeFix_Face
from OCP.TopAbs import TopAbs_FORWARD, TopAbs_WIRE
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Vertex, TopoDS_Wire

from moldgen.errors import KernelError
from moldgen.kernel.measure import is_valid
from moldgen.kernel.topology import explore, shape_list
from moldgen.tolerances import MAX_EDGE_TOLERANCE


def point(p: Sequence[float] | np.ndarray) -> gp_Pnt:
    """Return a kernel point."""
    return gp_Pnt(float(p[0]), float(p[1]), float(p[2]))


def vertex_at(p: Sequence[float] | np.ndarray) -> TopoDS_Vertex:
    """Return a new vertex [mm]."""
    return BRepBuilderAPI_MakeVertex(point(p)).Vertex()


def line_edge(start: TopoDS_Vertex, end: TopoDS_Vertex) -> TopoDS_Edge:
    """Return a straight edge between two vertices.

    Raises
    ------
    KernelError : the vertices coincide
    """
    made = BRepBuilderAPI_MakeEdge(start, end)
    if not made.IsDone():
        raise KernelError("a straight edge between coincident vertices was asked for")
    return made.Edge()


def forward(edge: TopoDS_Edge) -> TopoDS_Edge:
    """Return the edge in its own direction."""
    return TopoDS.Edge_s(edge.Oriented(TopAbs_FORWARD))


def backward(edge: TopoDS_Edge) -> TopoDS_Edge:
    """Return the edge used the other way round."""
    return TopoDS.Edge_s(edge.Reversed())


def wire_of(edges: Sequence[TopoDS_Edge]) -> TopoDS_Wire:
    """Return a wire of edges that share vertices, given in any order.

    Raises
    ------
    KernelError : the edges do not form one wire
    """
    maker = BRepBuilderAPI_MakeWire()
    maker.Add(shape_list(edges))  # all at once: one by one, the kernel forgets that an early edge did not connect
    if not maker.IsDone():
        raise KernelError(f"{len(edges)} edges do not form one wire")
    return maker.Wire()


def plane_through(origin: Sequence[float] | np.ndarray, normal: Sequence[float] | np.ndarray) -> gp_Pln:
    """Return a kernel plane."""
    return gp_Pln(point(origin), gp_Dir(float(normal[0]), float(normal[1]), float(normal[2])))


def plane_face(plane: gp_Pln, outer: TopoDS_Wire, holes: Sequence[TopoDS_Wire] = ()) -> TopoDS_Face:
    """Return a plane face inside `outer` and outside `holes`; wires may run either way round.

    Raises
    ------
    KernelError : the kernel cannot make it
    """
    maker = BRepBuilderAPI_MakeFace(plane, outer, True)
    for hole in holes:
        maker.Add(TopoDS.Wire_s(hole))
    if not maker.IsDone():
        raise KernelError("no plane face inside this wire")
    return mended_face(maker.Face())


def mended_face(face: TopoDS_Face) -> TopoDS_Face:
    """Return the face, its wires turned the right way round if the kernel calls it invalid. Its edges stay the same."""
    if is_valid(face):
        return face
    fixer = ShapeFix_Face(face)
    fixer.FixOrientation()
    fixed = fixer.Face()
    wires = explore(face, TopAbs_WIRE)
    if is_valid(fixed) or len(wires) != 1:
        return fixed
    # edges that miss the surface by nearly their tolerance fool the repair. A full one widens the tolerances in place;
    # what it returns may have other edges and is not used, but the same edges then make a valid face
    ShapeFix_Face(face).Perform()
    for wire in (wires[0], wires[0].Reversed()):
        made = BRepBuilderAPI_MakeFace(BRep_Tool.Surface_s(face), TopoDS.Wire_s(wire), True)
        if made.IsDone() and is_valid(made.Face()):
            return made.Face()
    return fixed


def flattened_curve(edge: TopoDS_Edge, axis: int, value: float) -> Geom_BSplineCurve:
    """Return the edge's curve as a B-spline projected along an axis (0 x, 1 y, 2 z) onto the plane where that
    coordinate is `value` [mm]: exact, since projection is affine.
    """
    adaptor = BRepAdaptor_Curve(edge)
    base = adaptor.Curve().Curve().Transformed(adaptor.Trsf())
    trimmed = Geom_TrimmedCurve(base, adaptor.FirstParameter(), adaptor.LastParameter())
    curve = GeomConvert.CurveToBSplineCurve_s(trimmed)
    for i in range(1, curve.NbPoles() + 1):
        pole = list(curve.Pole(i).Coord())
        pole[axis] = value
        curve.SetPole(i, point(pole))
    return curve


def curve_edge(curve: Geom_BSplineCurve, ends: tuple[TopoDS_Vertex, TopoDS_Vertex]) -> TopoDS_Edge:
    """Return the whole of a curve as an edge between two vertices that may miss its ends by an edge tolerance.

    Raises
    ------
    KernelError : they miss by more
    """
    first, last = curve.FirstParameter(), curve.LastParameter()
    maker = BRepBuilderAPI_MakeEdge(curve, *ends, first, last)
    if not maker.IsDone():  # real exports place vertices up to 2e-2 mm off their curves
        builder = BRep_Builder()
        for end in ends:
            builder.UpdateVertex(end, MAX_EDGE_TOLERANCE)
        maker = BRepBuilderAPI_MakeEdge(curve, *ends, first, last)
    if not maker.IsDone():
        raise KernelError("a projected curve misses its vertices")
    return maker.Edge()


def with_curves_on_surface(face: TopoDS_Face, surface: Geom_Surface) -> TopoDS_Face:
    """Let the kernel add the missing curves in the surface's parameters; turn the wire if it ran the wrong way.

    Raises
    ------
    KernelError : the kernel returns no face
    """
    fixer = ShapeFix_Face(face)
    fixer.SetPrecision(1e-6)
    fixer.FixWireTool().FixAddPCurveMode = 1
    fixer.Perform()
    fixed = fixer.Face()
    if fixed is None:
        raise KernelError("a ruled face cannot be mended")
    fixed = TopoDS.Face_s(fixed)
    if not is_valid(fixed):
        wire = TopoDS.Wire_s(explore(fixed, TopAbs_WIRE)[0].Reversed())
        turned = BRepBuilderAPI_MakeFace(surface, wire, False).Face()
        if is_valid(turned):
            return turned
    return fixed
