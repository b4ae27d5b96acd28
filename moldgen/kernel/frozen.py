"""Objects that hold kernel shapes, as bytes: exact, small, and the same bytes for the same object.

The kernel normalizes directions as it reads a shape, so that a thawed shape differs from the one that was frozen in the
last digit, and only the first time. Whoever wants the same result with and without a store therefore always goes on
with what was thawed.
"""

from __future__ import annotations

import io
import pickle
import struct
from collections.abc import Callable
from typing import Any

from OCP.BinTools import BinTools
from OCP.TopoDS import (
    TopoDS,
    TopoDS_Compound,
    TopoDS_Edge,
    TopoDS_Face,
    TopoDS_Shape,
    TopoDS_Shell,
    TopoDS_Solid,
    TopoDS_Vertex,
    TopoDS_Wire,
)

from moldgen.kernel.topology import compound_of, parts_of

_HEAD = struct.Struct(">Q")

_AS_KIND: dict[type[TopoDS_Shape], Callable[[TopoDS_Shape], TopoDS_Shape]] = {
    TopoDS_Compound: TopoDS.Compound_s,
    TopoDS_Edge: TopoDS.Edge_s,
    TopoDS_Face: TopoDS.Face_s,
    TopoDS_Shell: TopoDS.Shell_s,
    TopoDS_Solid: TopoDS.Solid_s,
    TopoDS_Vertex: TopoDS.Vertex_s,
    TopoDS_Wire: TopoDS.Wire_s,
}
"""The kernel tells an edge from a face by what is in it, Python by the type of the object that holds it."""


def freeze(value: Any) -> bytes:
    """Return `value` as bytes. Shapes that share faces, edges or vertices share them also when thawed.

    Raises
    ------
    TypeError : something in it cannot be frozen, such as a mesh solid
    """
    stream = io.BytesIO()
    writer = _Writer(stream)
    writer.dump(value)
    plain, shapes = stream.getvalue(), io.BytesIO()
    BinTools.Write_s(compound_of(writer.shapes), shapes)
    return _HEAD.pack(len(plain)) + plain + shapes.getvalue()


def thaw(data: bytes) -> Any:
    """Return what was frozen. Only for bytes of our own: like every pickle, foreign ones could run code."""
    (size,) = _HEAD.unpack_from(data)
    plain, shapes = data[_HEAD.size : _HEAD.size + size], data[_HEAD.size + size :]
    shape = TopoDS_Shape()
    BinTools.Read_s(shape, io.BytesIO(shapes))
    return _Reader(io.BytesIO(plain), parts_of(shape)).load()


class _Writer(pickle.Pickler):
    """Collects the shapes it meets, and writes their numbers."""

    def __init__(self, stream: io.BytesIO) -> None:
        super().__init__(stream, protocol=5)
        self.shapes: list[TopoDS_Shape] = []

    def persistent_id(self, value: Any) -> tuple[int, type[TopoDS_Shape] | None] | None:
        """Return the number of a shape and the type that holds it, None for anything else."""
        if not isinstance(value, TopoDS_Shape):
            return None
        self.shapes.append(value)
        return len(self.shapes) - 1, type(value) if type(value) in _AS_KIND else None


class _Reader(pickle.Unpickler):
    def __init__(self, stream: io.BytesIO, shapes: list[TopoDS_Shape]) -> None:
        super().__init__(stream)
        self._shapes = shapes

    def persistent_load(self, told: Any) -> TopoDS_Shape:
        """Return the shape of a number, held as it was."""
        number, kind = told
        return self._shapes[number] if kind is None else _AS_KIND[kind](self._shapes[number])
