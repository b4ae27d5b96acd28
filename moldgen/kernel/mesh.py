"""One watertight triangle mesh of a solid, welded by topology, as plain arrays."""

from __future__ import annotations

import io
from dataclasses import dataclass, fields, replace
from functools import cached_property

import numpy as np
from OCP.BinTools import BinTools, BinTools_FormatVersion
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepLib import BRepLib_ToolTriangulatedShape
from OCP.BRepMesh import BRepMesh_IncrementalMesh
from OCP.BRepTools import BRepTools
from OCP.Message import Message_ProgressRange
from OCP.TopAbs import TopAbs_EDGE, TopAbs_REVERSED
from OCP.TopExp import TopExp
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS, TopoDS_Compound, TopoDS_Face, TopoDS_Shape
from OCP.TopTools import TopTools_IndexedMapOfShape
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components

from moldgen.errors import KernelError
from moldgen.kernel.heal_mesh import is_torn, remesh
from moldgen.kernel.topology import compound_of, walk
from moldgen.tolerances import MESH_ANGLE, MESH_DEFLECTION, PROOF_ANGLE, PROOF_DEFLECTION


@dataclass(frozen=True)
class SurfaceMesh:
    """Triangles of a solid's boundary.

    vertices : (n, 3) float [mm], shared between neighbouring faces
    triangles : (t, 3) int, counter-clockwise seen from outside
    face : (t,) int, index of the face that each triangle approximates
    normals : (t, 3) float, mean of the exact surface normals at the triangle's corners, outward, not normalised
    bulge : (t, 3) float [mm], how far the surface bulges outward from the middle of each side: the chord of an arc with
        unit normals n1, n2 at its ends p1, p2 has the sag (p2 - p1) . (n2 - n1) / 8
    """

    vertices: np.ndarray
    triangles: np.ndarray
    face: np.ndarray
    normals: np.ndarray
    bulge: np.ndarray

    @cached_property
    def corners(self) -> np.ndarray:
        """Corner points of each triangle, read-only, (t, 3, 3) [mm]."""
        points = np.asarray(self.vertices[self.triangles])
        points.flags.writeable = False
        return points

    def only(self, chosen: np.ndarray) -> SurfaceMesh:
        """Return the mesh of some triangles, by their numbers or by (t,) bool; all vertices stay."""
        own = {name: getattr(self, name)[chosen] for name in ("triangles", "face", "normals", "bulge")}
        return replace(self, **own)

    @cached_property
    def centres(self) -> np.ndarray:
        """Centre of each triangle, (t, 3) [mm]."""
        return np.asarray(self.corners.mean(axis=1))

    @cached_property
    def facet_normals(self) -> np.ndarray:
        """Outward unit normal of each triangle as it lies, (t, 3)."""
        p = self.corners
        normal = np.cross(p[:, 1] - p[:, 0], p[:, 2] - p[:, 0])
        return np.asarray(normal / np.maximum(np.linalg.norm(normal, axis=1), 1e-30)[:, None])

    def __getstate__(self) -> dict[str, np.ndarray]:
        """Return what is pickled: the rest follows from it."""
        return {field.name: getattr(self, field.name) for field in fields(self)}

    @cached_property
    def sag(self) -> np.ndarray:
        """Largest distance of the surface from a side of each triangle, either way, (t,) [mm]."""
        return np.asarray(np.abs(self.bulge).max(axis=1))

    def volume(self) -> float:
        """Return the volume [mm^3] inside the surface, not inside the facets: right to 2e-5 on spline parts (measured).

        A quadratic patch over a triangle with mid-side heights b has the volume area * mean(b) under it.
        """
        a, b, c = (self.corners[:, k] for k in range(3))
        facets = float((np.cross(a, b) * c).sum()) / 6.0
        return facets + float((self.areas() * self.bulge.mean(axis=1)).sum())

    def areas(self) -> np.ndarray:
        """Area of each triangle, (t,) [mm^2]."""
        p = self.corners
        return np.asarray(0.5 * np.linalg.norm(np.cross(p[:, 1] - p[:, 0], p[:, 2] - p[:, 0]), axis=1))


@dataclass(frozen=True)
class _Raw:
    """The kernel's own triangulations, one after the other, faces not yet joined."""

    nodes: np.ndarray
    normals: np.ndarray
    triangles: np.ndarray
    face: np.ndarray
    offsets: dict[int, int]


def tessellate(shape: TopoDS_Shape, deflection: float = MESH_DEFLECTION, angle: float = MESH_ANGLE) -> None:
    """Let the kernel triangulate every face that has no triangulation of at least this quality yet."""
    BRepMesh_IncrementalMesh(shape, deflection, False, angle, True)


def surface_mesh(faces: list[TopoDS_Face]) -> SurfaceMesh:
    """Return the welded mesh of already tessellated faces.

    Faces are joined through the nodes of their common edges and vertices, never by rounding coordinates: real parts
    have features smaller than any rounding that would close the gaps. Faces that the kernel left without a mesh, or
    with a torn one, are meshed again; so are all, as finely as proofs ask for, where two divide an edge unequally.

    Raises
    ------
    KernelError : a face has no triangles
    """
    location = TopLoc_Location()
    missing = [f for f in faces if BRep_Tool.Triangulation_s(f, location) is None]
    if missing:
        remesh(faces, missing)
    mesh = _welded(faces)
    beside = [faces[i] for i in _at_open_sides(mesh)]
    torn = [f for f in beside if is_torn(f)]
    if torn:
        remesh(faces, torn)
    elif _disagree(beside):
        BRepTools.Clean_s(whole := compound_of(faces))
        tessellate(whole, PROOF_DEFLECTION, PROOF_ANGLE)
    else:
        return mesh
    return _welded(faces)


def _disagree(faces: list[TopoDS_Face]) -> bool:
    """True when two faces divide a common edge into different numbers of pieces: both are whole, the mesh is not.

    Seen on a real part (measured): a face that a silhouette was imprinted on is meshed anew while its neighbor keeps
    the finer mesh it had.
    """
    index, counts = TopTools_IndexedMapOfShape(), dict[int, int]()
    location = TopLoc_Location()
    for face in faces:
        mesh = BRep_Tool.Triangulation_s(face, location)
        for edge in walk(face, TopAbs_EDGE):
            polygon = BRep_Tool.PolygonOnTriangulation_s(TopoDS.Edge_s(edge), mesh, location)
            if polygon is not None and counts.setdefault(index.Add(edge), polygon.NbNodes()) != polygon.NbNodes():
                return True
    return False


def _at_open_sides(mesh: SurfaceMesh) -> list[int]:
    """Return the numbers of the faces with a side of a triangle that no other triangle runs the other way."""
    t, count = mesh.triangles.astype(np.int64), len(mesh.vertices)
    start, end = t.ravel(), np.roll(t, -1, axis=1).ravel()
    alone = ~np.isin(start * count + end, end * count + start)
    return [int(i) for i in np.unique(np.repeat(mesh.face, 3)[alone])]


def _welded(faces: list[TopoDS_Face]) -> SurfaceMesh:
    raw = _read_triangulations(faces)
    label = _weld(faces, raw)
    first = np.full(label.max() + 1, -1)
    first[label[::-1]] = np.arange(len(label))[::-1]
    triangles = label[raw.triangles]
    proper = (
        (triangles[:, 0] != triangles[:, 1])
        & (triangles[:, 1] != triangles[:, 2])
        & (triangles[:, 2] != triangles[:, 0])
    )
    corner_normals = raw.normals[raw.triangles][proper]
    bulge = _bulge(raw.nodes[raw.triangles][proper], corner_normals)
    return SurfaceMesh(raw.nodes[first], triangles[proper], raw.face[proper], corner_normals.mean(axis=1), bulge)


def _bulge(corners: np.ndarray, normals: np.ndarray) -> np.ndarray:
    unit = normals / np.maximum(np.linalg.norm(normals, axis=2), 1e-300)[:, :, None]
    along, turn = np.roll(corners, -1, axis=1) - corners, np.roll(unit, -1, axis=1) - unit
    return np.asarray((along * turn).sum(axis=2) / 8.0)


def _read_triangulations(faces: list[TopoDS_Face]) -> _Raw:
    """Read all nodes in one go: through the kernel's binary writer it takes a tenth of the time of single calls."""
    builder = BRep_Builder()
    holder = TopoDS_Compound()
    builder.MakeCompound(holder)
    locations = []
    location = TopLoc_Location()
    for number, face in enumerate(faces):
        triangulation = BRep_Tool.Triangulation_s(face, location)
        if triangulation is None or triangulation.NbTriangles() == 0:
            raise KernelError(f"face {number} of {len(faces)} has no triangles", where=_face_place(face))
        if not triangulation.HasNormals():
            BRepLib_ToolTriangulatedShape.ComputeNormals_s(face, triangulation)
        copy = triangulation.Copy()  # equal triangulations are written once: a copy keeps one entry a face
        bare = TopoDS_Face()
        builder.MakeFace(bare, copy)
        builder.Add(holder, bare)
        locations.append(None if location.IsIdentity() else _matrix(location))
    stream = io.BytesIO()
    BinTools.Write_s(
        holder, stream, True, True, BinTools_FormatVersion.BinTools_FormatVersion_CURRENT, Message_ProgressRange()
    )
    return _parse(stream.getvalue(), faces, locations)


def _parse(data: bytes, faces: list[TopoDS_Face], locations: list[np.ndarray | None]) -> _Raw:
    head = data.index(b"\nTriangulations ") + 1
    place = data.index(b"\n", head) + 1
    if int(data[head + 15 : place]) != len(faces):
        raise KernelError("the kernel merged triangulations of different faces")
    nodes, normals, triangles, face_of, offsets, start = [], [], [], [], {}, 0
    for number, face in enumerate(faces):
        n, t = np.frombuffer(data, "<i4", 2, place)
        has_uv, has_normals = data[place + 8], data[place + 9]
        place += 18  # two counts, two flags, the deflection
        point = np.frombuffer(data, "<f8", 3 * n, place).reshape(-1, 3)
        place += 24 * n + (16 * n if has_uv else 0)
        triangle = np.frombuffer(data, "<i4", 3 * t, place).reshape(-1, 3) - 1
        place += 12 * t
        normal = np.frombuffer(data, "<f4", 3 * n, place).reshape(-1, 3).astype(float)
        place += 12 * n if has_normals else 0
        matrix = locations[number]
        if matrix is not None:
            point, normal = point @ matrix[:, :3].T + matrix[:, 3], normal @ matrix[:, :3].T
        if face.Orientation() == TopAbs_REVERSED:
            triangle, normal = triangle[:, ::-1], -normal
        offsets[number] = start
        nodes.append(point)
        normals.append(normal)
        triangles.append(triangle + start)
        face_of.append(np.full(t, number))
        start += int(n)
    return _Raw(np.vstack(nodes), np.vstack(normals), np.vstack(triangles), np.concatenate(face_of), offsets)


def _weld(faces: list[TopoDS_Face], raw: _Raw) -> np.ndarray:
    """Return for each node the number of the welded vertex it belongs to."""
    edge_index, vertex_index = TopTools_IndexedMapOfShape(), TopTools_IndexedMapOfShape()
    at_edge: dict[int, list[list[int]]] = {}
    at_vertex: dict[int, list[int]] = {}
    location = TopLoc_Location()
    for number, face in enumerate(faces):
        triangulation = BRep_Tool.Triangulation_s(face, location)
        for occurrence in walk(face, TopAbs_EDGE):
            edge = TopoDS.Edge_s(occurrence)
            polygon = BRep_Tool.PolygonOnTriangulation_s(edge, triangulation, location)
            if polygon is None:
                continue
            shift = raw.offsets[number] - 1
            nodes = [polygon.Node(i) + shift for i in range(1, polygon.NbNodes() + 1)]
            first = vertex_index.Add(TopExp.FirstVertex_s(edge))
            last = vertex_index.Add(TopExp.LastVertex_s(edge))
            if BRep_Tool.Degenerated_s(edge):
                at_vertex.setdefault(first, []).extend(nodes)
                continue
            at_vertex.setdefault(first, []).append(nodes[0])
            at_vertex.setdefault(last, []).append(nodes[-1])
            at_edge.setdefault(edge_index.Add(edge), []).append(nodes)
    one: list[int] = []
    other: list[int] = []
    for group in at_vertex.values():
        one += [group[0]] * (len(group) - 1)
        other += group[1:]
    for uses in at_edge.values():
        for nodes in uses[1:]:
            if len(nodes) == len(uses[0]):
                one += uses[0]
                other += nodes
    size = len(raw.nodes)
    links = coo_matrix((np.ones(len(one), dtype=np.int8), (one, other)), shape=(size, size))
    return np.asarray(connected_components(links, directed=False)[1])


def _matrix(location: TopLoc_Location) -> np.ndarray:
    transformation = location.Transformation()
    return np.array([[transformation.Value(i, j) for j in range(1, 5)] for i in range(1, 4)])


def _face_place(face: TopoDS_Shape) -> str:
    for vertex in walk(face, TopAbs_EDGE):
        x, y, z = BRep_Tool.Pnt_s(TopExp.FirstVertex_s(TopoDS.Edge_s(vertex))).Coord()
        return f"face at {x:.3f}, {y:.3f}, {z:.3f}"
    return ""
