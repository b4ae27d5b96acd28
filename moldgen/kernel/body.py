"""A solid with its faces, edges and mesh in one indexing: what every analysis of the part works on."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from functools import cached_property
from typing import Any, Protocol

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Shape

from moldgen.kernel.mesh import SurfaceMesh, surface_mesh, tessellate
from moldgen.kernel.nearest import nearest_triangle
from moldgen.kernel.topology import edge_faces_map, edge_points, faces_of, same_order
from moldgen.tolerances import MESH_ANGLE, MESH_DEFLECTION

EDGE_SAMPLES = 9


class Meshed(Protocol):
    """What sweeps along z need to know: a mesh by faces, and its box and areas."""

    @property
    def faces(self) -> Sequence[Any]:
        """The faces, as many as the mesh numbers."""

    @property
    def mesh(self) -> SurfaceMesh:
        """The mesh."""

    @property
    def box(self) -> tuple[np.ndarray, np.ndarray]:
        """Lower and upper corner of the mesh [mm]."""

    @property
    def triangle_areas(self) -> np.ndarray:
        """Area of each triangle of the mesh, (t,) [mm^2]."""


class Body:
    """One solid, read-only.

    Face and edge numbers are places in `faces` and `edges`; only edges between two different faces are listed (seams
    and degenerated edges are not). Arrays are computed when first asked for and kept.
    """

    def __init__(self, solid: TopoDS_Shape, deflection: float = MESH_DEFLECTION, angle: float = MESH_ANGLE) -> None:
        self.solid = solid
        self.faces: list[TopoDS_Face] = faces_of(solid)
        self._deflection, self._angle = deflection, angle
        self.face_index = same_order(self.faces)
        self.edges: list[TopoDS_Edge] = []
        pairs = []
        links = edge_faces_map(solid)
        for i in range(1, links.Extent() + 1):
            edge = TopoDS.Edge_s(links.FindKey(i))
            if BRep_Tool.Degenerated_s(edge):
                continue
            users = links.FindFromIndex(i)
            if users.Size() != 2:
                continue
            # First and Last: iterating a kernel list from Python takes 0.15 ms a step
            used = sorted({self.face_index.FindIndex(f) - 1 for f in (users.First(), users.Last())})
            if len(used) == 2:
                self.edges.append(edge)
                pairs.append(used)
        self.edge_index = same_order(self.edges)
        self.edge_faces = np.array(pairs, dtype=int).reshape(-1, 2)
        """The two faces of each edge, (m, 2) int."""

    def __getstate__(self) -> dict[str, Any]:
        """Return what `moldgen.kernel.frozen` keeps: the rest follows from it, but another mesh could come out."""
        return {"solid": self.solid, "fineness": (self._deflection, self._angle), "mesh": self.__dict__.get("mesh")}

    def __setstate__(self, state: dict[str, Any]) -> None:
        """Begin anew with the solid."""
        self.__init__(state["solid"], *state["fineness"])  # type: ignore[misc]
        if state["mesh"] is not None:
            self.__dict__["mesh"] = state["mesh"]

    def take_mesh(self, mesh: SurfaceMesh) -> None:
        """Use a mesh that was made of the same solid, as finely, before."""
        self.__dict__["mesh"] = mesh

    def like(self, solid: TopoDS_Shape) -> Body:
        """Return a body of another solid, meshed as finely as this one."""
        return Body(solid, self._deflection, self._angle)

    @cached_property
    def mesh(self) -> SurfaceMesh:
        """The welded mesh at the body's deflection."""
        tessellate(self.solid, self._deflection, self._angle)
        return surface_mesh(self.faces)

    @cached_property
    def box(self) -> tuple[np.ndarray, np.ndarray]:
        """Lower and upper corner of the mesh [mm]."""
        return self.mesh.vertices.min(axis=0), self.mesh.vertices.max(axis=0)

    @cached_property
    def diagonal(self) -> float:
        """Length of the bounding box's diagonal [mm]."""
        return float(np.linalg.norm(self.box[1] - self.box[0]))

    @cached_property
    def triangle_areas(self) -> np.ndarray:
        """Area of each triangle of the mesh, (t,) [mm^2]."""
        return self.mesh.areas()

    @cached_property
    def face_areas(self) -> np.ndarray:
        """Mesh area of each face [mm^2]."""
        return np.bincount(self.mesh.face, self.triangle_areas, len(self.faces))

    @cached_property
    def face_centres(self) -> np.ndarray:
        """Area-weighted centre of each face's mesh, (f, 3) [mm]: a place to report, not always on the face."""
        middle = self.mesh.corners.mean(axis=1) * self.triangle_areas[:, None]
        total = np.maximum(self.face_areas, 1e-300)
        return np.stack([np.bincount(self.mesh.face, middle[:, k], len(self.faces)) / total for k in range(3)], axis=1)

    @cached_property
    def face_places(self) -> np.ndarray:
        """A point on each face: the centre of its triangle nearest to the face's centre, (f, 3) [mm]."""
        middle = self.mesh.corners.mean(axis=1)
        gap = np.linalg.norm(middle - self.face_centres[self.mesh.face], axis=1)
        order = np.lexsort((gap, self.mesh.face))
        first = order[np.r_[True, np.diff(self.mesh.face[order]) > 0]]
        places = np.zeros((len(self.faces), 3))
        places[self.mesh.face[first]] = middle[first]
        return places

    @cached_property
    def face_heights(self) -> np.ndarray:
        """Lowest and highest z of each face's mesh, (f, 2) [mm]."""
        z = self.mesh.corners[:, :, 2]
        heights = np.column_stack([np.full(len(self.faces), np.inf), np.full(len(self.faces), -np.inf)])
        np.minimum.at(heights[:, 0], self.mesh.face, z.min(axis=1))
        np.maximum.at(heights[:, 1], self.mesh.face, z.max(axis=1))
        return heights

    @cached_property
    def edge_points(self) -> np.ndarray:
        """Points along each edge, equally spaced in parameter, (m, 9, 3) [mm]."""
        if not self.edges:
            return np.zeros((0, EDGE_SAMPLES, 3))
        return np.stack([edge_points(e, EDGE_SAMPLES) for e in self.edges])

    @cached_property
    def edge_lengths(self) -> np.ndarray:
        """Length of each edge's chord polygon [mm]."""
        return np.asarray(np.linalg.norm(np.diff(self.edge_points, axis=1), axis=2).sum(axis=1))

    @cached_property
    def edges_at_face(self) -> list[list[int]]:
        """Edge numbers around each face."""
        around: list[list[int]] = [[] for _ in self.faces]
        for number, (a, b) in enumerate(self.edge_faces):
            around[a].append(number)
            around[b].append(number)
        return around

    def surface_kind(self, face: int) -> str:
        """Return the kind of a face's surface: plane, cylinder, cone, sphere, torus, bspline, extrusion, ..."""
        name: str = BRepAdaptor_Surface(self.faces[face]).GetType().name
        return name.removeprefix("GeomAbs_").removeprefix("SurfaceOf").removesuffix("Surface").lower()

    def nearest_face(self, point: np.ndarray) -> tuple[int, float]:
        """Return the face nearest to a point and its distance [mm], measured on the mesh."""
        triangle, distance = nearest_triangle(self.mesh, np.asarray(point, dtype=float))
        return int(self.mesh.face[triangle]), distance


class TurnedMesh:
    """The mesh of a body in another frame, given by the rows x, y, z of a rotation, (3, 3)."""

    def __init__(self, body: Body, rows: np.ndarray) -> None:
        self.faces: Sequence[Any] = body.faces
        self.mesh = replace(body.mesh, vertices=body.mesh.vertices @ rows.T, normals=body.mesh.normals @ rows.T)
        self.box = self.mesh.vertices.min(axis=0), self.mesh.vertices.max(axis=0)
        self.triangle_areas = body.triangle_areas
