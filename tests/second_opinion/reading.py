"""Read tool.step: solids with the name and place that the assembly gives them, and their triangles."""

from __future__ import annotations

import hashlib
import math
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import manifold3d
import numpy as np
from OCP.BRep import BRep_Tool
from OCP.BRepMesh import BRepMesh_IncrementalMesh
from OCP.BRepTools import BRepTools
from OCP.IFSelect import IFSelect_RetDone
from OCP.ShapeUpgrade import ShapeUpgrade_ShapeDivideAngle
from OCP.STEPCAFControl import STEPCAFControl_Reader
from OCP.TCollection import TCollection_ExtendedString
from OCP.TDataStd import TDataStd_Name
from OCP.TDF import TDF_Label, TDF_LabelSequence
from OCP.TDocStd import TDocStd_Document
from OCP.TopAbs import TopAbs_EDGE, TopAbs_FACE, TopAbs_REVERSED, TopAbs_SOLID
from OCP.TopExp import TopExp, TopExp_Explorer
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS
from OCP.TopTools import TopTools_IndexedMapOfShape
from OCP.XCAFDoc import XCAFDoc_DocumentTool, XCAFDoc_ShapeTool
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components

SAG, ANGLE = 0.01, 0.15
"""mm, rad: how far the triangles may lie from the surface. Half of what moldgen proves with."""

WELDS = (1e-7, 1e-6, 1e-5, 1e-4, 1e-3)
"""mm: how far apart the rims of neighboring faces may lie to be one; the first that closes the mesh is taken."""


@dataclass(eq=False)
class Product:
    """One shape of the file, in its own frame; `meshes` keeps its triangles for each fineness asked for."""

    name: str
    shape: Any
    meshes: dict[float, manifold3d.Manifold] = field(default_factory=dict)

    def solids(self) -> int:
        """How many solids it has."""
        return len(_explored(self.shape, TopAbs_SOLID))

    def mesh(self, fineness: float = 1.0) -> manifold3d.Manifold:
        """Its triangles as a solid, `fineness` times as fine as usual; its `status` says if they do not close."""
        if fineness not in self.meshes:
            mesh = _meshed(self.shape, SAG / fineness, ANGLE / fineness**0.5)
            if mesh.status() != manifold3d.Error.NoError:
                # The kernel left a whole cone of a real part without triangles; in two halves it has them.
                halves = ShapeUpgrade_ShapeDivideAngle(math.pi, self.shape)
                halves.Perform()
                mesh = _meshed(halves.Result(), SAG / fineness, ANGLE / fineness**0.5)
            self.meshes[fineness] = mesh
        return self.meshes[fineness]


@dataclass(frozen=True, eq=False)
class Placed:
    """One component where it stands: its name in the assembly, what it is, and its placement (3, 4)."""

    name: str
    product: Product
    at: np.ndarray

    def mesh(self, fineness: float = 1.0) -> manifold3d.Manifold:
        """The triangles where it stands in the closed mold."""
        return self.product.mesh(fineness).transform(self.at)


def read_tool(path: Path) -> list[Placed]:
    """Return every component of an assembly, in its order. The same bytes are read and meshed once."""
    digest = hashlib.sha256(path.read_bytes()).hexdigest()
    if digest not in _READ:
        _READ.clear()
        _READ[digest] = _read(path)
    return list(_READ[digest])


_READ: dict[str, tuple[Placed, ...]] = {}


def _read(path: Path) -> tuple[Placed, ...]:
    document = TDocStd_Document(TCollection_ExtendedString("second opinion"))
    reader = STEPCAFControl_Reader()
    reader.SetNameMode(True)
    assert reader.ReadFile(str(path)) == IFSelect_RetDone, f"{path} cannot be read"
    assert reader.Transfer(document), f"{path} cannot be transferred"
    shapes = XCAFDoc_DocumentTool.ShapeTool_s(document.Main())
    roots = TDF_LabelSequence()
    shapes.GetFreeShapes(roots)
    products: dict[str, Product] = {}
    found: list[Placed] = []
    for i in range(1, roots.Length() + 1):
        parts = TDF_LabelSequence()
        XCAFDoc_ShapeTool.GetComponents_s(roots.Value(i), parts)
        assert parts.Length(), "the file is no assembly"
        for k in range(1, parts.Length() + 1):
            label, referred = parts.Value(k), TDF_Label()
            assert XCAFDoc_ShapeTool.GetReferredShape_s(label, referred)
            name = _name(referred)
            if name not in products:
                products[name] = Product(name, XCAFDoc_ShapeTool.GetShape_s(referred))
            place = XCAFDoc_ShapeTool.GetLocation_s(label).Transformation()
            at = np.array([[place.Value(row, column) for column in range(1, 5)] for row in range(1, 4)])
            found.append(Placed(_name(label), products[name], at))
    return tuple(found)


def _name(label: TDF_Label) -> str:
    name = TDataStd_Name()
    assert label.FindAttribute(TDataStd_Name.GetID_s(), name), "a component has no name"
    return str(name.Get().ToExtString())


def _explored(shape: Any, kind: Any) -> list[Any]:
    found = []
    explorer = TopExp_Explorer(shape, kind)
    while explorer.More():
        found.append(explorer.Current())
        explorer.Next()
    return found


def _meshed(shape: Any, sag: float, angle: float) -> manifold3d.Manifold:
    BRepTools.Clean_s(shape)
    BRepMesh_IncrementalMesh(shape, sag, False, angle, False)
    edges = TopTools_IndexedMapOfShape()
    TopExp.MapShapes_s(shape, TopAbs_EDGE, edges)
    points: list[tuple[float, float, float]] = []
    triangles: list[tuple[int, int, int]] = []
    rims: dict[int, list[int]] = {}
    same: list[tuple[int, int]] = []
    for face in map(TopoDS.Face_s, _explored(shape, TopAbs_FACE)):
        location = TopLoc_Location()
        patch = BRep_Tool.Triangulation_s(face, location)
        if patch is None:
            continue  # the mesh stays open there, and that is told
        first, turn = len(points) - 1, location.Transformation()
        for i in range(1, patch.NbNodes() + 1):
            p = patch.Node(i).Transformed(turn)
            points.append((p.X(), p.Y(), p.Z()))
        back = face.Orientation() == TopAbs_REVERSED
        for i in range(1, patch.NbTriangles() + 1):
            a, b, c = patch.Triangle(i).Get()
            triangles.append((first + a, first + (c if back else b), first + (b if back else c)))
        for edge in map(TopoDS.Edge_s, _explored(face, TopAbs_EDGE)):
            line = BRep_Tool.PolygonOnTriangulation_s(edge, patch, location)
            if line is None:
                continue
            nodes = [first + line.Node(i) for i in range(1, line.NbNodes() + 1)]
            if BRep_Tool.Degenerated_s(edge):
                same.extend((nodes[0], node) for node in nodes[1:])  # a pole: one point
            before = rims.setdefault(edges.FindIndex(edge), nodes)
            same.extend(zip(before, nodes, strict=False))
    return _joined(np.array(points, dtype=float).reshape(-1, 3), np.array(triangles).reshape(-1, 3), same)


def _joined(points: np.ndarray, triangles: np.ndarray, same: list[tuple[int, int]]) -> manifold3d.Manifold:
    """Return the triangles joined where faces share an edge; if that does not close them, where their rims meet."""
    one, other = np.array(same, dtype=int).reshape(-1, 2).T
    links = coo_matrix((np.ones(len(one)), (one, other)), shape=(len(points), len(points)))
    count, which = connected_components(links, directed=False)
    corners = np.zeros((count, 3))
    corners[which] = points
    kept = which[triangles]
    kept = kept[(kept != np.roll(kept, 1, axis=1)).all(axis=1)].astype(np.uint64)
    solid = manifold3d.Manifold(manifold3d.Mesh64(corners, kept))
    if solid.status() == manifold3d.Error.NoError and solid.num_tri():
        return solid
    for slack in WELDS:
        mesh = manifold3d.Mesh64(points, triangles.astype(np.uint64), tolerance=slack)
        mesh.merge()
        solid = manifold3d.Manifold(mesh)
        if solid.status() == manifold3d.Error.NoError and solid.num_tri():
            return solid.set_tolerance(0.0)
    return solid
