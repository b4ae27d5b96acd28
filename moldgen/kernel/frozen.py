"""Objects that hold kernel shapes, as bytes: exact, small, and the same bytes for the same object.

The kernel normalizes directions as it reads a shape, so that a thawed shape differs from the one that was frozen in the
last digit, and only the first time. Whoever wants the same result with and without a store therefore always goes on
with what was thawed.
"""

from __future__ import annotations

import io
import pickle
import struct
from typing import Any

from OCP.BinTools import BinTools
from OCP.TopoDS import TopoDS_Shape

from moldgen.kernel.topology import compound_of, parts_of

_HEAD = struct.Struct(">Q")


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

    def persistent_id(self, value: Any) -> int | None:
        """Return the number of a shape, None for anything else."""
        if not isinstance(value, TopoDS_Shape):
            return None
        self.shapes.append(value)
        return len(self.shapes) - 1


class _Reader(pickle.Unpickler):
    def __init__(self, stream: io.BytesIO, shapes: list[TopoDS_Shape]) -> None:
        super().__init__(stream)
        self._shapes = shapes

    def persistent_load(self, number: Any) -> TopoDS_Shape:
        """Return the shape of a number."""
        return self._shapes[number]
