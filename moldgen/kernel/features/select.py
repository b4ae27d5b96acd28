"""Choosing faces and edges by geometry: sides, kinds, the feature they belong to, a box, a nearest point."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from typing import Final

import numpy as np
from OCP.Bnd import Bnd_Box
from OCP.BOPTools import BOPTools_AlgoTools3D
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve, BRepAdaptor_Surface
from OCP.BRepBndLib import BRepBndLib
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeVertex
from OCP.BRepExtrema import BRepExtrema_DistShapeShape
from OCP.BRepTools import BRepTools
from OCP.GeomAbs import GeomAbs_Circle, GeomAbs_Line, GeomAbs_Plane
from OCP.gp import gp_Pnt, gp_Pnt2d, gp_Vec
from OCP.IntTools import IntTools_Context
from OCP.ShapeAnalysis import ShapeAnalysis_Surface
from OCP.TopAbs import TopAbs_EDGE
from OCP.TopoDS import TopoDS_Edge, TopoDS_Face, TopoDS_Shape

from moldgen.errors import PartError
from moldgen.kernel.features.frame import X, Y, Z, pnt
from moldgen.kernel.guard import operation
from moldgen.kernel.topology import edge_faces_map, edge_points, edges_of, faces_of, is_reversed, same_order, walk
from moldgen.model.recipe import Selector

Array = np.ndarray
Boundary = Mapping[str, Sequence[TopoDS_Face]]
"""Feature name -> the faces that bounded its solids when it was made."""

ON_FACE: Final = 1e-4
"""mm: a point this close to a feature's face lies on it."""

FACING: Final = 0.7
"""Least cosine between the normal of a face and the side that it is said to be on (45 deg)."""

WALL: Final = 0.35
"""Largest |n.z| of a wall: 20 deg of draft."""

UPRIGHT: Final = 0.985
"""Least |t.z| of a vertical edge: 10 deg, so that edges of drafted walls still count."""

SMOOTH: Final = 0.9998
"""Cosine above which two faces run into each other without an edge (1 deg)."""

_SIDES: Final = {"top": Z, "bottom": -Z, "left": -X, "right": X, "front": -Y, "back": Y}


class Chooser:
    """Answers selectors for one body.

    Parameters
    ----------
    body : solid
    made : feature name -> faces of the solids that the feature was made from
    """

    def __init__(self, body: TopoDS_Shape, made: Boundary) -> None:
        self.body = body
        self.made = made
        self._boxes = {name: [_box(face) for face in faces] for name, faces in made.items()}
        self._context = IntTools_Context()
        self._owners: dict[tuple[int, str], bool] = {}
        self.all_faces = faces_of(body)
        self._index = same_order(self.all_faces)
        self._middles = [self._inside(face) for face in self.all_faces]
        self._normals = [_normal(face, middle) for face, middle in zip(self.all_faces, self._middles, strict=True)]

    # --- faces -------------------------------------------------------------------------------------------------------
    def faces(self, selectors: Sequence[Selector]) -> list[TopoDS_Face]:
        """Return the faces that any of the selectors means, in the order of the body.

        Raises
        ------
        PartError : a selector means no face
        """
        chosen: set[int] = set()
        for selector in selectors:
            found = self._faces(selector)
            if not found:
                raise PartError(f"no face is '{selector.text}'", remedy=self._hint(selector))
            chosen |= set(found)
        return [self.all_faces[i] for i in sorted(chosen)]

    def planar_face(self, selector: Selector) -> TopoDS_Face:
        """Return the largest planar face that the selector means.

        Raises
        ------
        PartError : there is none
        """
        with operation("choose a face"):
            found = [self.all_faces[i] for i in self._faces(selector)]
            flat = [f for f in found if BRepAdaptor_Surface(f).GetType() == GeomAbs_Plane]
        if not flat:
            kind = "planar face" if not found else "planar face (the one there is curved)"
            raise PartError(f"no {kind} is '{selector.text}'", remedy=self._hint(selector))
        return max(flat, key=_extent)

    def lies_on(self, face: TopoDS_Face, name: str) -> bool:
        """True when the face lies on the boundary of the solids that made the feature `name`."""
        return self._belongs(self._index.FindIndex(face) - 1, name)

    def _faces(self, selector: Selector) -> list[int]:
        found = list(range(len(self.all_faces)))
        if selector.of:
            found = [i for i in found if self._belongs(i, selector.of)]
        if selector.between:
            raise PartError(f"'{selector.text}' means edges, not faces", remedy="write 'top of NAME' or the like")
        for word in selector.words:
            found = self._by_word(found, word)
        if selector.within:
            found = [i for i in found if _in_box(self._middles[i][None, :], selector.within)]
        if selector.at and found:
            at = BRepBuilderAPI_MakeVertex(pnt(selector.at)).Vertex()
            found = [min(found, key=lambda i: _distance(at, self.all_faces[i]))]
        return found

    def _by_word(self, found: list[int], word: str) -> list[int]:
        if word == "walls":
            return [i for i in found if abs(self._normals[i][2]) < WALL]
        if word == "planar":
            return [i for i in found if BRepAdaptor_Surface(self.all_faces[i]).GetType() == GeomAbs_Plane]
        if word == "all":
            return found
        toward = _SIDES[word]
        facing = [i for i in found if self._normals[i] @ toward > FACING]
        if not facing:
            return []
        reach = {i: float(self._middles[i] @ toward) for i in facing}
        best = max(reach.values())
        return [i for i in facing if reach[i] > best - 1e-3]

    def _belongs(self, index: int, name: str) -> bool:
        """True when a point inside the face lies on the boundary of the solids that made the feature."""
        key = (index, name)
        if key not in self._owners:
            middle = self._middles[index]
            vertex = BRepBuilderAPI_MakeVertex(pnt(middle)).Vertex()
            self._owners[key] = any(
                _in_box(middle[None, :], box) and _distance(vertex, face) < ON_FACE
                for face, box in zip(self.made.get(name, ()), self._boxes.get(name, ()), strict=True)
            )
        return self._owners[key]

    def _inside(self, face: TopoDS_Face) -> Array:
        point, uv = gp_Pnt(), gp_Pnt2d()
        if BOPTools_AlgoTools3D.PointInFace_s(face, point, uv, self._context) != 0:
            raise PartError("a face of the body is too thin to find a point in it", remedy="move the feature a little")
        return np.array(point.Coord())

    # --- edges -------------------------------------------------------------------------------------------------------
    def edges(self, selectors: Sequence[Selector]) -> list[TopoDS_Edge]:
        """Return the edges that any of the selectors means; seams and smooth transitions are left out.

        Raises
        ------
        PartError : a selector means no edge
        """
        table = self._edge_table()
        chosen: set[int] = set()
        for selector in selectors:
            found = [i for i, row in enumerate(table) if self._edge_fits(row, selector)]
            if selector.at and found:
                at = BRepBuilderAPI_MakeVertex(pnt(selector.at)).Vertex()
                found = [min(found, key=lambda i: _distance(at, table[i].edge))]
            if not found:
                raise PartError(f"no edge is '{selector.text}'", remedy=self._hint(selector))
            chosen |= set(found)
        return [table[i].edge for i in sorted(chosen)]

    def _edge_table(self) -> list[_Edge]:
        ancestors = edge_faces_map(self.body)
        rows = []
        for edge in edges_of(self.body):
            if BRep_Tool.Degenerated_s(edge):
                continue
            faces = sorted({self._index.FindIndex(f) - 1 for f in ancestors.FindFromKey(edge)})
            if len(faces) != 2:
                continue  # a seam
            bend = _bend(edge, self.all_faces[faces[0]], self.all_faces[faces[1]])
            if bend is not None:
                rows.append(_Edge(edge, (faces[0], faces[1]), bend))
        return rows

    def _edge_fits(self, row: _Edge, selector: Selector) -> bool:
        a, b = row.faces
        if selector.of and not (self._belongs(a, selector.of) or self._belongs(b, selector.of)):
            return False
        if selector.between:
            one, other = selector.between
            pairs = ((a, b), (b, a))
            if not any(self._belongs(p, one) and self._belongs(q, other) for p, q in pairs):
                return False
        sides = [w for w in selector.words if w in _SIDES]
        meant = set(row.faces)
        if sides:
            meant &= set(self._faces(Selector(selector.text, tuple(sides), selector.of)))
            if not meant:
                return False
        on_rim = {_on_outer_wire(row.edge, self.all_faces[i]) for i in meant}
        if ("outer" in selector.words and True not in on_rim) or ("inner" in selector.words and False not in on_rim):
            return False
        if selector.within and not _in_box(edge_points(row.edge, 9), selector.within):
            return False
        return all(_EDGE_TESTS[w](row, self.all_faces) for w in selector.words if w in _EDGE_TESTS)

    def _hint(self, selector: Selector) -> str:
        names = ", ".join(sorted(self.made))
        if selector.of or selector.between:
            return f"the faces may be gone or changed by a later feature; features so far: {names}"
        return "loosen the choice"


class _Edge:
    """An edge with its two faces and how the material bends there."""

    def __init__(self, edge: TopoDS_Edge, faces: tuple[int, int], convex: bool) -> None:
        self.edge = edge
        self.faces = faces
        self.convex = convex


def _is_vertical(row: _Edge, _: Sequence[TopoDS_Face]) -> bool:
    runs = np.diff(edge_points(row.edge, 5), axis=0)  # not one chord: an arc comes back
    return bool((np.abs(runs[:, 2]) > UPRIGHT * np.linalg.norm(runs, axis=1)).all())


def _is_horizontal(row: _Edge, _: Sequence[TopoDS_Face]) -> bool:
    return float(np.ptp(edge_points(row.edge, 9)[:, 2])) < 1e-4


def _is_straight(row: _Edge, _: Sequence[TopoDS_Face]) -> bool:
    return bool(BRepAdaptor_Curve(row.edge).GetType() == GeomAbs_Line)


def _is_round(row: _Edge, _: Sequence[TopoDS_Face]) -> bool:
    return bool(BRepAdaptor_Curve(row.edge).GetType() == GeomAbs_Circle)


_EDGE_TESTS: Final[Mapping[str, Callable[[_Edge, Sequence[TopoDS_Face]], bool]]] = {
    "vertical": _is_vertical,
    "horizontal": _is_horizontal,
    "straight": _is_straight,
    "round": _is_round,
    "convex": lambda row, _: row.convex,
    "concave": lambda row, _: not row.convex,
}


def _on_outer_wire(edge: TopoDS_Edge, face: TopoDS_Face) -> bool:
    return any(edge.IsSame(e) for e in walk(BRepTools.OuterWire_s(face), TopAbs_EDGE))


def _bend(edge: TopoDS_Edge, one: TopoDS_Face, other: TopoDS_Face) -> bool | None:
    """Return True for a convex edge, False for a concave one, None where the faces run on smoothly."""
    curve = BRepAdaptor_Curve(edge)
    point, tangent = gp_Pnt(), gp_Vec()
    curve.D1((curve.FirstParameter() + curve.LastParameter()) / 2, point, tangent)
    place = np.array(point.Coord())
    n1, n2 = _normal(one, place), _normal(other, place)
    if n1 @ n2 > SMOOTH:
        return None
    used = next(e for e in walk(one, TopAbs_EDGE) if e.IsSame(edge))
    along = np.array(tangent.Coord()) * (-1.0 if is_reversed(used) else 1.0)
    into_one = np.cross(n1, along)  # an outer wire has the material of the face on its left
    return bool(into_one @ n2 < 0)


def _normal(face: TopoDS_Face, place: Array) -> Array:
    """Return the outward unit normal of a face near a point."""
    surface = BRepAdaptor_Surface(face)
    uv = ShapeAnalysis_Surface(BRep_Tool.Surface_s(face)).ValueOfUV(pnt(place), 1e-6)
    point, du, dv = gp_Pnt(), gp_Vec(), gp_Vec()
    surface.D1(uv.X(), uv.Y(), point, du, dv)
    normal = np.array(du.Crossed(dv).Coord())
    length = float(np.linalg.norm(normal))
    if length < 1e-12:
        return np.zeros(3)  # the tip of a cone has no normal
    return (-normal if is_reversed(face) else normal) / length  # type: ignore[no-any-return]


def _box(shape: TopoDS_Shape) -> tuple[Array, Array]:
    box = Bnd_Box()
    BRepBndLib.Add_s(shape, box, False)
    low, high = np.array(box.CornerMin().Coord()), np.array(box.CornerMax().Coord())
    # the kernel's box of an extruded spline came out 0.006 mm too small on a 9 mm face (measured)
    margin = ON_FACE + 0.02 * float(np.linalg.norm(high - low))
    return low - margin, high + margin


def _extent(shape: TopoDS_Shape) -> float:
    low, high = _box(shape)
    return float(np.linalg.norm(high - low))


def _in_box(points: Array, box: Sequence[Sequence[float] | Array]) -> bool:
    low, high = np.minimum(*np.array(box)), np.maximum(*np.array(box))
    return bool(((points >= low - 1e-6) & (points <= high + 1e-6)).all())


def _distance(one: TopoDS_Shape, other: TopoDS_Shape) -> float:
    measure = BRepExtrema_DistShapeShape(one, other)
    return float(measure.Value()) if measure.IsDone() else math.inf
