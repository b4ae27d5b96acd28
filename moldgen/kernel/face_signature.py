"""The signs of all faces of a part: independent of the CAD system's order, seams, splits and ways of writing.

Faces that lie on one surface and touch are one face here, so that a cylinder in two halves is a cylinder. Splines that
are elementary surfaces are read as those.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeVertex
from OCP.BRepExtrema import BRepExtrema_DistShapeShape
from OCP.BRepGProp import BRepGProp
from OCP.gp import gp_Pnt
from OCP.GProp import GProp_GProps
from OCP.TopoDS import TopoDS_Shape
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components

from moldgen.kernel.body import Body
from moldgen.kernel.face_compare import same_form
from moldgen.kernel.face_surface import FaceSurface, face_surface
from moldgen.kernel.guard import operation
from moldgen.kernel.nearest import nearest_triangle
from moldgen.model.face_sign import MOST_TWINS, FaceSign, SurfaceKind
from moldgen.model.part import Vector, vector
from moldgen.tolerances import SAME_SURFACE


@dataclass(frozen=True, eq=False)
class PartSigns:
    """A part and the signs of its faces, in the order of the lowest face number of each.

    of_face : (f,) int, the sign that each face of the body belongs to
    """

    body: Body
    signs: tuple[FaceSign, ...]
    of_face: np.ndarray

    def nearest(self, point: Vector) -> tuple[int, float]:
        """Return the number of the sign nearest to a point and its distance [mm], measured on the mesh."""
        face, distance = self.body.nearest_face(np.asarray(point, dtype=float))
        return int(self.of_face[face]), distance

    @cached_property
    def links(self) -> tuple[frozenset[int], ...]:
        """The signs that each sign touches along an edge."""
        around: list[set[int]] = [set() for _ in self.signs]
        for a, b in self.of_face[self.body.edge_faces]:
            if a != b:
                around[a].add(int(b))
                around[b].add(int(a))
        return tuple(frozenset(s) for s in around)

    def samples(self, number: int, count: int) -> np.ndarray:
        """Return middles of a face's largest triangles, at most `count`, (n, 3) [mm]: on round faces only near it."""
        own = self._triangles(number)
        order = np.lexsort((own, -self.body.triangle_areas[own]))[:count]
        return np.asarray(self.body.mesh.corners[own[order]].mean(axis=1))

    def vertices(self, number: int, count: int) -> np.ndarray:
        """Return points that lie on a face exactly, at most `count`, (n, 3) [mm]."""
        used = np.unique(self.body.mesh.triangles[self._triangles(number)])
        if len(used) > count:
            used = used[np.linspace(0, len(used) - 1, count).round().astype(int)]
        return np.asarray(self.body.mesh.vertices[used])

    def box(self, number: int) -> tuple[np.ndarray, np.ndarray]:
        """Return the lower and upper corner of a face's mesh, (3,), (3,) [mm]."""
        corners = self.body.mesh.corners[self._triangles(number)].reshape(-1, 3)
        return corners.min(axis=0), corners.max(axis=0)

    @cached_property
    def _own(self) -> list[np.ndarray]:
        """The triangles of each sign."""
        owner = self.of_face[self.body.mesh.face]
        order = np.argsort(owner, kind="stable")
        return np.split(order, np.searchsorted(owner[order], np.arange(1, len(self.signs))))

    def _triangles(self, number: int) -> np.ndarray:
        return self._own[number]

    def exact_distance(self, number: int, point: np.ndarray) -> float:
        """Return the distance of a point from the faces of one sign [mm], measured on the surfaces themselves."""
        with operation("measure how far a point is from a face", operands=(self.body.solid,)):
            vertex = BRepBuilderAPI_MakeVertex(gp_Pnt(*point.tolist())).Vertex()
            faces = [self.body.faces[f] for f in self.signs[number].faces]
            return min(float(BRepExtrema_DistShapeShape(vertex, face).Value()) for face in faces)

    def distance(self, number: int, point: Vector) -> float:
        """Return the distance of a point from the faces of one sign [mm], measured on the mesh."""
        return nearest_triangle(self.body.mesh.only(self._triangles(number)), np.asarray(point, dtype=float))[1]


def part_signs(part: Body | TopoDS_Shape) -> PartSigns:
    """Return the signs of all faces of a solid.

    part : a healed solid (`read_step`, `build_recipe`) or its body, in the coordinates that the signs shall have

    Raises
    ------
    KernelError : the kernel threw
    """
    body = part if isinstance(part, Body) else Body(part)
    with operation("read the faces of a part", operands=(body.solid,)):
        surfaces = [face_surface(face) for face in body.faces]
        lines = np.array([_line(edge) for edge in body.edges]).reshape(-1, 4)
    groups = _groups(body, surfaces)
    between = groups[body.edge_faces[:, 0]] != groups[body.edge_faces[:, 1]]
    rims = np.zeros((int(groups.max()) + 1, 4))
    for k in (0, 1):
        np.add.at(rims, groups[body.edge_faces[between, k]], lines[between])
    members: list[list[int]] = [[] for _ in rims]
    for face, group in enumerate(groups):
        members[group].append(face)
    signs = [_sign(surfaces, tuple(own), rims[g]) for g, own in enumerate(members)]
    return PartSigns(body, _with_twins(signs), groups)


def _line(edge: TopoDS_Shape) -> list[float]:
    """Return the length of an edge, and its length times its center, 4 numbers."""
    properties = GProp_GProps()
    BRepGProp.LinearProperties_s(edge, properties)
    length = float(properties.Mass())
    return [length, *(length * v for v in properties.CentreOfMass().Coord())]


def _groups(body: Body, surfaces: list[FaceSurface]) -> np.ndarray:
    """Return for each face the number of its sign: neighbours on one surface share theirs, (f,) int."""
    same = np.array([on_one_surface(surfaces[a], surfaces[b]) for a, b in body.edge_faces], dtype=bool)
    pairs = body.edge_faces[same] if len(same) else body.edge_faces
    count = len(surfaces)
    links = coo_matrix((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(count, count))
    labels = connected_components(links, directed=False)[1]
    _, first, inverse = np.unique(labels, return_index=True, return_inverse=True)
    rank = np.empty(len(first), dtype=int)
    rank[np.argsort(first)] = np.arange(len(first))
    return np.asarray(rank[inverse])


def on_one_surface(a: FaceSurface, b: FaceSurface) -> bool:
    """True when two faces lie on one surface, from the same side, as well as splines are recognized."""
    if a.kind is not b.kind or a.side != b.side or a.kind is SurfaceKind.FREE:
        return False
    span = a.reach + b.reach + float(np.linalg.norm(a.center - b.center))
    offset = b.origin - a.origin
    if a.kind is SurfaceKind.PLANE:
        tilt = float(np.linalg.norm(a.axis - b.axis)) * span
        return tilt <= SAME_SURFACE and abs(float((b.center - a.center) @ a.axis)) <= SAME_SURFACE
    if a.kind in (SurfaceKind.SPHERE, SurfaceKind.TORUS):
        sizes = abs(a.radius - b.radius) + abs(a.minor - b.minor) + float(np.linalg.norm(offset))
        tilt = float(np.linalg.norm(np.cross(a.axis, b.axis))) * span
        return sizes <= SAME_SURFACE and tilt <= SAME_SURFACE
    along = float(offset @ a.axis)
    if float(np.linalg.norm(np.cross(a.axis, b.axis))) * span > SAME_SURFACE or abs(a.growth - b.growth) * span > 1e-4:
        return False
    if a.kind is SurfaceKind.CONE and float(a.axis @ b.axis) < 0.0:
        return False
    beside = float(np.linalg.norm(offset - along * a.axis))
    return beside <= SAME_SURFACE and abs(a.radius + along * a.growth - b.radius) <= SAME_SURFACE


def _sign(surfaces: list[FaceSurface], faces: tuple[int, ...], rim: np.ndarray) -> FaceSign:
    """Return the sign of some faces on one surface; the largest tells what the surface is.

    rim : length of the boundary [mm], and its length times its center, (4,)
    """
    own = [surfaces[f] for f in faces]
    lead = max(own, key=lambda s: s.area)
    area = sum(s.area for s in own)
    center = np.sum([s.area * s.center for s in own], axis=0) / max(area, 1e-300)
    products = np.sum([s.products + s.area * np.outer(s.center - center, s.center - center) for s in own], axis=0)
    spread = products / max(area, 1e-300)
    at, radius = lead.origin, lead.radius
    if lead.kind in (SurfaceKind.CYLINDER, SurfaceKind.CONE):
        along = float((center - lead.origin) @ lead.axis)
        at, radius = lead.origin + along * lead.axis, lead.radius + along * lead.growth
    elif lead.kind in (SurfaceKind.PLANE, SurfaceKind.FREE):
        at = center
    return FaceSign(
        kind=lead.kind,
        area_mm2=area,
        center=vector(center),
        spread=(*np.diag(spread).tolist(), float(spread[0, 1]), float(spread[0, 2]), float(spread[1, 2])),
        axis=vector(lead.axis),
        at=vector(at),
        radius=float(radius),
        minor=float(lead.minor),
        angle_deg=float(np.degrees(np.arctan(lead.growth))),
        side=lead.side,
        perimeter_mm=float(rim[0]),
        rim=vector(rim[1:] / rim[0] if rim[0] > 0.0 else center),
        faces=faces,
    )


def _with_twins(signs: list[FaceSign]) -> tuple[FaceSign, ...]:
    alike = same_form(signs, signs)
    centers = np.array([s.center for s in signs])
    full = []
    for number, sign in enumerate(signs):
        others = np.flatnonzero(alike[number])
        others = others[others != number]
        far = np.round(np.linalg.norm(centers[others] - centers[number], axis=1), 6)
        order = np.lexsort((others, far))[:MOST_TWINS]
        full.append(replace(sign, twins=tuple(signs[k].center for k in others[order])))
    return tuple(full)
