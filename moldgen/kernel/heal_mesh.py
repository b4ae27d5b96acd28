"""Faces that the kernel's mesher gives up, or leaves in part: their causes removed, else meshed from their edges."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from typing import Final

import manifold3d
import numpy as np
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve, BRepAdaptor_Surface
from OCP.BRepMesh import BRepMesh_IncrementalMesh
from OCP.BRepTools import BRepTools, BRepTools_WireExplorer
from OCP.GCPnts import GCPnts_TangentialDeflection
from OCP.GeomAbs import GeomAbs_Plane
from OCP.gp import gp_Pnt, gp_Pnt2d, gp_Vec
from OCP.Poly import Poly_PolygonOnTriangulation, Poly_Triangle, Poly_Triangulation
from OCP.TopAbs import TopAbs_EDGE, TopAbs_FORWARD
from OCP.TopExp import TopExp
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Shape
from OCP.TopTools import TopTools_IndexedDataMapOfShapeListOfShape as Links

from moldgen.finding import Point
from moldgen.kernel.heal_seams import straighten_seams
from moldgen.kernel.topology import compound_of, edge_faces_map, is_reversed, parts_of, same_order, vertex_point, walk
from moldgen.tolerances import PROOF_ANGLE, PROOF_DEFLECTION

MOST_ROUNDS: Final = 12
"""Times that sides of triangles may be halved until the mesh follows the surface (our choice): enough for slivers and
for whole cylinders. What bulges still after that, such as a whole sphere, is left without a mesh."""


@dataclass
class _Sheet:
    """A mesh of one face while it grows: parameters, points, and for each use of an edge its nodes in the edge's
    own direction with the curve parameters.
    """

    face: TopoDS_Face
    uv: list[tuple[float, float]] = field(default_factory=list)
    points: list[Point] = field(default_factory=list)
    uses: list[tuple[TopoDS_Edge, list[int], list[float]]] = field(default_factory=list)
    triangles: list[tuple[int, int, int]] = field(default_factory=list)


def is_torn(face: TopoDS_Face) -> bool:
    """True when a face has no triangles, or they do not end exactly at the outline of the face."""
    location = TopLoc_Location()
    mesh = BRep_Tool.Triangulation_s(face, location)
    if mesh is None or mesh.NbTriangles() == 0:
        return True
    rim: set[tuple[int, int]] = set()
    for occurrence in walk(face, TopAbs_EDGE):
        polygon = BRep_Tool.PolygonOnTriangulation_s(TopoDS.Edge_s(occurrence), mesh, location)
        if polygon is not None:
            nodes = [polygon.Node(i) for i in range(1, polygon.NbNodes() + 1)]
            rim.update((min(pair), max(pair)) for pair in pairwise(nodes) if pair[0] != pair[1])
    uses: dict[tuple[int, int], int] = {}
    for i in range(1, mesh.NbTriangles() + 1):
        a, b, c = mesh.Triangle(i).Get()
        for one, other in ((a, b), (b, c), (c, a)):
            key = (min(one, other), max(one, other))
            uses[key] = uses.get(key, 0) + 1
    return {side for side, count in uses.items() if count == 1} != rim or max(uses.values()) > 2


def remesh(faces: Sequence[TopoDS_Face], torn: Sequence[TopoDS_Face]) -> None:
    """Give whole meshes to those of the meshed faces of a solid that have none, or a torn one, where that is possible.

    Two causes were found on real parts (measured). Seams of cones and cylinders whose line in the parameter plane
    leans by some 1e-15: straightened, the kernel meshes the face. Slivers whose long edges run side by side closer
    than the mesher tells apart: these are meshed here from the polygons that their neighbors have along the common
    edges, so the mesh of the whole stays closed whatever the shape of the face. They are meshed as finely as proofs
    ask for, or a later call of the mesher would throw them away.
    """
    whole = compound_of(faces)
    left = []
    for face in torn:
        BRepTools.Clean_s(face)
        if straighten_seams(face):
            BRepMesh_IncrementalMesh(whole, PROOF_DEFLECTION, False, PROOF_ANGLE, True)
        if is_torn(face):
            left.append(face)
    links = edge_faces_map(whole)
    for face in left:
        BRepTools.Clean_s(face)
        _by_hand(face, links)


def _by_hand(face: TopoDS_Face, links: Links) -> None:
    flat = TopoDS.Face_s(face.Oriented(TopAbs_FORWARD))
    sheet = _Sheet(flat)
    outlines = [_outline(sheet, wire, links) for wire in parts_of(flat)]
    outlines = [o for o in outlines if len(o) > 2]
    if not outlines:
        return
    uv = np.array(sheet.uv) * _scale(flat)
    order = np.concatenate(outlines)
    found = manifold3d.triangulate([uv[o] for o in outlines], allow_convex=False)
    sheet.triangles = [tuple(int(order[k]) for k in t) for t in found]  # type: ignore[misc]
    if sheet.triangles and _refine(sheet):
        _store(face, sheet)


def _scale(face: TopoDS_Face) -> np.ndarray:
    """Return how many mm one step of u and of v make in the middle of a face, (2,): angles are judged in space."""
    surface = BRepAdaptor_Surface(face)
    u = 0.5 * (surface.FirstUParameter() + surface.LastUParameter())
    v = 0.5 * (surface.FirstVParameter() + surface.LastVParameter())
    at, along_u, along_v = gp_Pnt(), gp_Vec(), gp_Vec()
    surface.D1(u, v, at, along_u, along_v)
    return np.maximum([along_u.Magnitude(), along_v.Magnitude()], 1e-9)


def _outline(sheet: _Sheet, wire: TopoDS_Shape, links: Links) -> np.ndarray:
    """Add the nodes along a wire, and return their numbers in running order, (n,)."""
    running: list[list[int]] = []
    for occurrence in _in_running_order(sheet.face, wire):
        edge = TopoDS.Edge_s(occurrence)
        points, parameters = _edge_polygon(sheet.face, edge, links)
        curve = BRep_Tool.CurveOnSurface_s(edge, sheet.face, 0.0, 0.0)
        nodes = []
        for point, parameter in zip(points, parameters, strict=True):
            nodes.append(len(sheet.uv))
            sheet.uv.append(curve.Value(parameter).Coord())
            sheet.points.append(point)
        sheet.uses.append((edge, nodes, parameters))
        running.append(nodes[::-1] if is_reversed(edge) else nodes)
    return _joined(sheet, running)


def _joined(sheet: _Sheet, running: list[list[int]]) -> np.ndarray:
    """Make the end of each edge the start of the next one."""
    same = {nodes[-1]: running[(k + 1) % len(running)][0] for k, nodes in enumerate(running)}
    for _, nodes, _ in sheet.uses:
        nodes[:] = [same.get(n, n) for n in nodes]
    return np.array([n for nodes in running for n in nodes[:-1]], dtype=int)


def _in_running_order(face: TopoDS_Face, wire: TopoDS_Shape) -> list[TopoDS_Shape]:
    explorer, found = BRepTools_WireExplorer(TopoDS.Wire_s(wire), face), []
    while explorer.More():
        found.append(explorer.Current())
        explorer.Next()
    return found


def _edge_polygon(face: TopoDS_Face, edge: TopoDS_Edge, links: Links) -> tuple[list[Point], list[float]]:
    """Return points [mm] and parameters along an edge in its curve's direction: those of its neighbor's mesh if any."""
    first, last = BRep_Tool.Range_s(edge)
    if BRep_Tool.Degenerated_s(edge):
        x, y, z = vertex_point(TopExp.FirstVertex_s(edge)).tolist()
        return [(x, y, z)] * 2, [first, last]
    users = links.FindFromKey(edge)
    for other in (TopoDS.Face_s(users.First()), TopoDS.Face_s(users.Last())):
        location = TopLoc_Location()
        mesh = BRep_Tool.Triangulation_s(other, location)
        polygon = None if mesh is None else BRep_Tool.PolygonOnTriangulation_s(edge, mesh, location)
        if other.IsSame(face) or polygon is None or not polygon.HasParameters():
            continue
        move = location.Transformation()
        count = range(1, polygon.NbNodes() + 1)
        points = [mesh.Node(polygon.Node(i)).Transformed(move).Coord() for i in count]
        return points, [polygon.Parameter(i) for i in count]
    curve = BRepAdaptor_Curve(edge)
    steps = GCPnts_TangentialDeflection(curve, PROOF_ANGLE, PROOF_DEFLECTION)
    parameters = [steps.Parameter(i) for i in range(1, steps.NbPoints() + 1)]
    return [curve.Value(t).Coord() for t in parameters], parameters


def _refine(sheet: _Sheet) -> bool:
    """Halve the inner sides of triangles until the surface bulges from none by more than `PROOF_DEFLECTION`."""
    surface = BRepAdaptor_Surface(sheet.face)
    if surface.GetType() == GeomAbs_Plane:
        return True
    for _ in range(MOST_ROUNDS):
        bulging = _bulging(sheet, surface)
        if not bulging:
            return True
        spent: set[int] = set()
        for _, (a, b), touched, at_uv, at in bulging:
            if spent.intersection(touched):
                continue
            new = len(sheet.uv)
            sheet.uv.append(at_uv)
            sheet.points.append(at)
            for k in touched:
                t = sheet.triangles[k]
                spent.update((k, len(sheet.triangles)))
                sheet.triangles.append(tuple(new if n == a else n for n in t))  # type: ignore[arg-type]
                sheet.triangles[k] = tuple(new if n == b else n for n in t)  # type: ignore[assignment]
    return not _bulging(sheet, surface)


def _bulging(
    sheet: _Sheet, surface: BRepAdaptor_Surface
) -> list[tuple[float, tuple[int, int], list[int], tuple[float, float], Point]]:
    """Return the inner sides that the surface leaves, worst first: minus the bulge, nodes, triangles, the middle."""
    sides: dict[tuple[int, int], list[int]] = {}
    for number, t in enumerate(sheet.triangles):
        for k in range(3):
            sides.setdefault((min(t[k], t[k - 1]), max(t[k], t[k - 1])), []).append(number)
    found = []
    for (a, b), users in sides.items():
        if len(users) != 2:
            continue
        u, v = (0.5 * (p + q) for p, q in zip(sheet.uv[a], sheet.uv[b], strict=True))
        at = surface.Value(u, v).Coord()
        bulge = math.dist(at, [0.5 * (p + q) for p, q in zip(sheet.points[a], sheet.points[b], strict=True)])
        if bulge > PROOF_DEFLECTION:
            found.append((-bulge, (a, b), users, (u, v), at))
    return sorted(found)


def _store(face: TopoDS_Face, sheet: _Sheet) -> None:
    """Hand the mesh to the kernel as if it were its own."""
    location = TopLoc_Location()
    BRep_Tool.Surface_s(face, location)
    back = location.Transformation().Inverted()
    mesh = Poly_Triangulation(len(sheet.uv), len(sheet.triangles), True, False)
    for number, (uv, point) in enumerate(zip(sheet.uv, sheet.points, strict=True), start=1):
        mesh.SetNode(number, gp_Pnt(*point).Transformed(back))
        mesh.SetUVNode(number, gp_Pnt2d(*uv))
    for number, (a, b, c) in enumerate(sheet.triangles, start=1):
        mesh.SetTriangle(number, Poly_Triangle(a + 1, b + 1, c + 1))
    mesh.Deflection(PROOF_DEFLECTION)
    builder = BRep_Builder()
    builder.UpdateFace(face, mesh)
    seams: dict[int, tuple[TopoDS_Edge, Poly_PolygonOnTriangulation]] = {}
    index = same_order(edge for edge, _, _ in sheet.uses)
    for edge, nodes, parameters in sheet.uses:
        polygon = _polygon(nodes, parameters)
        key = index.FindIndex(edge)
        if key not in seams:
            seams[key] = (edge, polygon)
            builder.UpdateEdge(edge, polygon, mesh, location)
        else:
            first, other = seams[key]
            pair = (other, polygon) if not is_reversed(first) else (polygon, other)
            builder.UpdateEdge(TopoDS.Edge_s(edge.Oriented(TopAbs_FORWARD)), *pair, mesh, location)


def _polygon(nodes: list[int], parameters: list[float]) -> Poly_PolygonOnTriangulation:
    polygon = Poly_PolygonOnTriangulation(len(nodes), True)
    for number, (node, parameter) in enumerate(zip(nodes, parameters, strict=True), start=1):
        polygon.SetNode(number, node + 1)
        polygon.SetParameter(number, parameter)
    polygon.Deflection(PROOF_DEFLECTION)
    return polygon
