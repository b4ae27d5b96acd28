"""Rounding and bevelling edges."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Final

from OCP.BRepFilletAPI import BRepFilletAPI_MakeChamfer, BRepFilletAPI_MakeFillet
from OCP.TopoDS import TopoDS_Edge, TopoDS_Shape

from moldgen.errors import KernelError, PartError
from moldgen.kernel.features.shapes import BOX_SAG, checked_solid, rough_box
from moldgen.kernel.guard import operation

SMALLER: Final = (0.75, 0.5, 0.25, 0.1)
"""Fractions of a refused size that are tried, only to tell the user what would work."""

BULGE: Final = 2 * BOX_SAG
"""mm that the box of a body may seem to grow by rounding."""


def fillet(body: TopoDS_Shape, edges: Sequence[TopoDS_Edge], radius: float) -> TopoDS_Shape:
    """Return the body with the edges (and those that run on smoothly from them) rounded.

    Raises
    ------
    PartError : the radius does not fit, with one that does if there is any
    """
    return _sized("radius", radius, lambda r: _fillet(body, edges, r))


def chamfer(body: TopoDS_Shape, edges: Sequence[TopoDS_Edge], distance: float) -> TopoDS_Shape:
    """Return the body with the edges bevelled by the same distance on both faces.

    Raises
    ------
    PartError : the distance does not fit, with one that does if there is any
    """
    return _sized("distance", distance, lambda d: _chamfer(body, edges, d))


def _sized(what: str, size: float, make: Callable[[float], TopoDS_Shape]) -> TopoDS_Shape:
    try:
        return make(size)
    except (KernelError, PartError):
        for fraction in SMALLER:
            try:
                make(fraction * size)
            except (KernelError, PartError):
                continue
            remedy = f"a {what} of {fraction * size:.3g} mm works"
            raise PartError(f"a {what} of {size:g} mm does not fit these edges", remedy=remedy) from None
        raise PartError(
            f"a {what} of {size:g} mm does not fit these edges, nor does {SMALLER[-1] * size:.2g} mm",
            remedy="choose fewer edges, or make this feature before the ones that end at its edges",
        ) from None


def _fillet(body: TopoDS_Shape, edges: Sequence[TopoDS_Edge], radius: float) -> TopoDS_Shape:
    with operation(f"round {len(edges)} edges", operands=(body,)):
        maker = BRepFilletAPI_MakeFillet(body)
        for edge in edges:
            maker.Add(radius, edge)
        maker.Build()
        shape = maker.Shape()
    return _inside(body, checked_solid(shape, "rounding"))


def _chamfer(body: TopoDS_Shape, edges: Sequence[TopoDS_Edge], distance: float) -> TopoDS_Shape:
    with operation(f"bevel {len(edges)} edges", operands=(body,)):
        maker = BRepFilletAPI_MakeChamfer(body)
        for edge in edges:
            maker.Add(distance, edge)
        maker.Build()
        shape = maker.Shape()
    return _inside(body, checked_solid(shape, "bevelling"))


def _inside(before: TopoDS_Shape, after: TopoDS_Shape) -> TopoDS_Shape:
    """Return `after` if it stays within the box of `before`: a fillet that bulges out is wrong, though it is valid."""
    (low, high), (new_low, new_high) = rough_box(before), rough_box(after)
    if (new_low < low - BULGE).any() or (new_high > high + BULGE).any():
        raise PartError("the edges bulge out of the body")
    return after
