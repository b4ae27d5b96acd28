"""One solid and many tools taken apart at once: what is left of the solid, and what each tool takes out of it.

Both come from one calculation, so they fit each other exactly, and twelve bores cost as much as one.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from OCP.BOPAlgo import BOPAlgo_CellsBuilder
from OCP.TopoDS import TopoDS_Shape

from moldgen.errors import KernelError
from moldgen.kernel.guard import operation
from moldgen.kernel.measure import volume
from moldgen.kernel.topology import compound_of, faces_of, same_order, shape_list, solids_of


@dataclass(frozen=True)
class Cells:
    """What is left of a solid, and for each tool the solids that it takes out; nothing of it is judged yet."""

    rest: tuple[TopoDS_Shape, ...]
    plugs: tuple[tuple[TopoDS_Shape, ...], ...]


def take_out(solid: TopoDS_Shape, tools: Sequence[TopoDS_Shape], name: str) -> Cells:
    """Return the cells of a solid and of tools that do not meet each other.

    name : what this is for, in words a user can repeat ("bore the core")

    Raises
    ------
    KernelError : the kernel gave up
    """
    with operation(name, operands=[solid, compound_of(tools)], risky=True, tools=len(tools)):
        builder = BOPAlgo_CellsBuilder()
        builder.SetArguments(shape_list([solid, *tools]))
        builder.SetRunParallel(False)
        builder.SetNonDestructive(True)
        builder.Perform()
        if builder.HasErrors():
            raise KernelError(f"the kernel gave up on {name} with {len(tools)} tools")
        rest = _chosen(builder, [solid], tools)
        plugs = tuple(_chosen(builder, [solid, tool], ()) for tool in tools)
    return Cells(rest, plugs)


def lost_volume(before: TopoDS_Shape, rest: TopoDS_Shape, plugs: Sequence[TopoDS_Shape]) -> float:
    """Return the volume [mm^3] by which what is left and what was taken out fail to make up the solid again.

    Only faces that `before` and `rest` do not share are integrated, all about one point: the rest cancels.
    """
    old, new = faces_of(before), faces_of(rest)
    gone, come = (
        [f for f in faces if others.FindIndex(f) == 0]
        for faces, others in ((old, same_order(new)), (new, same_order(old)))
    )
    return abs(volume(compound_of([*(f.Reversed() for f in gone), *come, *plugs])))


def _chosen(
    builder: BOPAlgo_CellsBuilder, inside: Sequence[TopoDS_Shape], outside: Sequence[TopoDS_Shape]
) -> tuple[TopoDS_Shape, ...]:
    builder.RemoveAllFromResult()
    builder.AddToResult(shape_list(inside), shape_list(outside), 0, False)
    return tuple(solids_of(builder.Shape()))
