"""Walking a boundary representation: faces, edges, vertices, and who touches whom."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import Any

import numpy as np
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.TopAbs import TopAbs_EDGE, TopAbs_FACE, TopAbs_REVERSED, TopAbs_ShapeEnum, TopAbs_SOLID, TopAbs_VERTEX
from OCP.TopExp import TopExp, TopExp_Explorer
from OCP.TopoDS import TopoDS, TopoDS_Compound, TopoDS_Edge, TopoDS_Face, TopoDS_Iterator, TopoDS_Shape, TopoDS_Vertex
from OCP.TopTools import (
    TopTools_IndexedDataMapOfShapeListOfShape,
    TopTools_IndexedMapOfShape,
    TopTools_ListOfShape,
)

from moldgen.errors import KernelError


def explore(shape: TopoDS_Shape, kind: TopAbs_ShapeEnum) -> list[TopoDS_Shape]:
    """Return the distinct sub-shapes of a kind, in the kernel's own (reproducible) order."""
    found = TopTools_IndexedMapOfShape()
    TopExp.MapShapes_s(shape, kind, found)
    return [found.FindKey(i) for i in range(1, found.Extent() + 1)]


def faces_of(shape: TopoDS_Shape) -> list[TopoDS_Face]:
    """Return the distinct faces."""
    return [TopoDS.Face_s(f) for f in explore(shape, TopAbs_FACE)]


def edges_of(shape: TopoDS_Shape) -> list[TopoDS_Edge]:
    """Return the distinct edges, degenerated ones included."""
    return [TopoDS.Edge_s(e) for e in explore(shape, TopAbs_EDGE)]


def vertices_of(shape: TopoDS_Shape) -> list[TopoDS_Vertex]:
    """Return the distinct vertices."""
    return [TopoDS.Vertex_s(v) for v in explore(shape, TopAbs_VERTEX)]


def solids_of(shape: TopoDS_Shape) -> list[TopoDS_Shape]:
    """Return the distinct solids."""
    return [TopoDS.Solid_s(s) for s in explore(shape, TopAbs_SOLID)]


def only_solid(shape: TopoDS_Shape) -> TopoDS_Shape:
    """Return the one solid of a shape (a kernel result is often a compound of one solid).

    Raises
    ------
    KernelError : the shape is empty or holds another number of solids
    """
    found = solids_of(shape) if shape is not None else []
    if len(found) != 1:
        raise KernelError(f"expected one solid, the kernel returned {len(found)}")
    return found[0]


def walk(shape: TopoDS_Shape, kind: TopAbs_ShapeEnum) -> Iterator[TopoDS_Shape]:
    """Yield every occurrence of a kind, with the orientation it has inside `shape`."""
    explorer = TopExp_Explorer(shape, kind)
    while explorer.More():
        yield explorer.Current()
        explorer.Next()


def parts_of(shape: TopoDS_Shape) -> list[TopoDS_Shape]:
    """Return the direct parts of a shape, in order, oriented as they are used in it."""
    iterator, found = TopoDS_Iterator(shape), []
    while iterator.More():
        found.append(iterator.Value())
        iterator.Next()
    return found


def shape_list(shapes: Iterable[TopoDS_Shape]) -> TopTools_ListOfShape:
    """Return the kernel's list type."""
    result = TopTools_ListOfShape()
    for shape in shapes:
        result.Append(shape)
    return result


def compound_of(shapes: Iterable[TopoDS_Shape]) -> TopoDS_Compound:
    """Return one compound that holds the shapes, in order."""
    compound = TopoDS_Compound()
    builder = BRep_Builder()
    builder.MakeCompound(compound)
    for shape in shapes:
        builder.Add(compound, shape)
    return compound


def edge_faces_map(shape: TopoDS_Shape) -> TopTools_IndexedDataMapOfShapeListOfShape:
    """Return the map from each edge to the faces that use it (a seam lists its face twice)."""
    result = TopTools_IndexedDataMapOfShapeListOfShape()
    TopExp.MapShapesAndAncestors_s(shape, TopAbs_EDGE, TopAbs_FACE, result)
    return result


def is_reversed(shape: TopoDS_Shape) -> bool:
    """True when the shape is used against its own direction."""
    return bool(shape.Orientation() == TopAbs_REVERSED)


def vertex_point(vertex: TopoDS_Vertex) -> np.ndarray:
    """Return the place of a vertex, (3,) [mm]."""
    return np.array(BRep_Tool.Pnt_s(vertex).Coord())


def edge_points(edge: TopoDS_Edge, count: int) -> np.ndarray:
    """Return `count` points equally spaced in parameter along the edge's curve (orientation ignored), (count, 3)."""
    curve = BRepAdaptor_Curve(edge)
    parameters = np.linspace(curve.FirstParameter(), curve.LastParameter(), count)
    return np.array([curve.Value(float(t)).Coord() for t in parameters])


def directed_points(edge: TopoDS_Edge, count: int) -> np.ndarray:
    """Return points along the edge in the direction in which it is used, (count, 3) [mm]."""
    points = edge_points(edge, count)
    return points[::-1] if is_reversed(edge) else points


def same_order(shapes: Iterable[Any]) -> TopTools_IndexedMapOfShape:
    """Return an index over shapes: ``FindIndex(s) - 1`` is the place of `s` in the given order (-1: absent)."""
    index = TopTools_IndexedMapOfShape()
    for shape in shapes:
        index.Add(shape)
    return index
