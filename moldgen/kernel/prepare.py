"""The preparation ladder: the same solid with its faces cut up differently, until the rest of the method copes."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from typing import Final, NamedTuple

from OCP.BRepTools import BRepTools
from OCP.ShapeUpgrade import ShapeUpgrade_ShapeDivideAngle, ShapeUpgrade_ShapeDivideClosed, ShapeUpgrade_UnifySameDomain
from OCP.TopoDS import TopoDS, TopoDS_Shape, TopoDS_Solid

from moldgen.errors import KernelError
from moldgen.kernel.guard import operation, present
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.sew import open_edges
from moldgen.kernel.topology import only_solid
from moldgen.tolerances import HEAL_VOLUME


class Preparation(NamedTuple):
    """One form of the solid that is valid and has its volume; `refused` says why the rungs before it were not."""

    rung: str
    solid: TopoDS_Solid
    refused: tuple[str, ...]


def preparations(solid: TopoDS_Solid, volume_mm3: float | None = None) -> Iterator[Preparation]:
    """Yield forms of `solid` that differ only in how its surface is cut into faces, each computed when asked for.

    Merged faces come first: fewer faces, fewer splinters. But merging left a cone that could not be meshed, and
    cylinders that go round a little more than once, on real parts; therefore the faces as read come next, then faces
    cut at half turns, then closed faces cut open.

    Parameters
    ----------
    solid : a sound solid
    volume_mm3 : its volume by the kernel's default integration, if known already (a tenth of a second on splines)
    """
    expected = volume(solid) if volume_mm3 is None else volume_mm3
    refused: tuple[str, ...] = ()
    for rung, make in _RUNGS:
        try:
            with operation(f"prepare the part ({rung})", operands=(solid,)):
                candidate = TopoDS.Solid_s(only_solid(present(make(solid), rung)))
        except KernelError as error:
            refused += (f"{rung}: {error.what}",)
            continue
        fault = "" if candidate.IsSame(solid) else _fault(candidate, expected)
        if fault:
            refused += (f"{rung}: {fault}",)
        else:
            yield Preparation(rung, candidate, refused)


def _merged(solid: TopoDS_Solid) -> TopoDS_Shape:
    merger = ShapeUpgrade_UnifySameDomain(solid, True, True, False)
    merger.Build()
    return merger.Shape()


def _as_read(solid: TopoDS_Solid) -> TopoDS_Shape:
    return solid


def _at_half_turns(solid: TopoDS_Solid) -> TopoDS_Shape:
    divider = ShapeUpgrade_ShapeDivideAngle(math.pi, solid)
    divider.Perform()
    return divider.Result()


def _opened(solid: TopoDS_Solid) -> TopoDS_Shape:
    divider = ShapeUpgrade_ShapeDivideClosed(solid)
    divider.Perform()
    return divider.Result()


_RUNGS: Final[tuple[tuple[str, Callable[[TopoDS_Solid], TopoDS_Shape]], ...]] = (
    ("faces merged", _merged),
    ("faces as read", _as_read),
    ("faces cut at half turns", _at_half_turns),
    ("closed faces cut open", _opened),
)


def _fault(candidate: TopoDS_Solid, expected: float) -> str:
    found = volume(candidate)
    if abs(found - expected) > HEAL_VOLUME * abs(expected):
        return f"volume {found:.6g} instead of {expected:.6g} mm^3"
    if open_edges(candidate):
        return "open edges"
    if not is_valid(candidate):
        BRepTools.Clean_s(candidate)  # the check also judges triangulations left by an earlier, coarser meshing
        if not is_valid(candidate):
            return "not valid"
    return ""
