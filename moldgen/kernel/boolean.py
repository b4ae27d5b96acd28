"""Booleans that are never trusted: the caller always learns what came out."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from OCP.BRepAlgoAPI import BRepAlgoAPI_Common, BRepAlgoAPI_Cut, BRepAlgoAPI_Fuse
from OCP.BRepBuilderAPI import BRepBuilderAPI_Copy
from OCP.BRepPrimAPI import BRepPrimAPI_MakePrism
from OCP.gp import gp_Vec
from OCP.TopoDS import TopoDS_Face, TopoDS_Shape

from moldgen.errors import KernelError
from moldgen.kernel.guard import operation
from moldgen.kernel.measure import bounding_box
from moldgen.kernel.topology import compound_of, shape_list, solids_of


def copied(shape: TopoDS_Shape) -> TopoDS_Shape:
    """Return an independent copy: results of splits and booleans share history that breaks later booleans."""
    return BRepBuilderAPI_Copy(shape).Shape()


def cut(shape: TopoDS_Shape, tools: Sequence[TopoDS_Shape], fuzzy: float = 0.0) -> list[TopoDS_Shape]:
    """Return the solids left of `shape` when all tools are cut from it at once.

    fuzzy : what lies this close [mm] is taken for one; 0 for the kernel's own tolerance
    """
    tool = BRepAlgoAPI_Cut()
    if fuzzy:
        tool.SetFuzzyValue(fuzzy)
    return _run("cut", tool, [shape], tools)


def fuse(shapes: Sequence[TopoDS_Shape]) -> list[TopoDS_Shape]:
    """Return the solids of the union."""
    if len(shapes) == 1:
        return solids_of(shapes[0])
    return _run("fuse", BRepAlgoAPI_Fuse(), shapes[:1], shapes[1:])


def common(one: TopoDS_Shape, other: TopoDS_Shape) -> list[TopoDS_Shape]:
    """Return the solids that two shapes share."""
    return _run("common", BRepAlgoAPI_Common(), [one], [other])


def prism(face: TopoDS_Face, height: float) -> TopoDS_Shape:
    """Return a face carried along z by `height` [mm], as a solid."""
    return BRepPrimAPI_MakePrism(copied(face), gp_Vec(0.0, 0.0, height)).Shape()


def _run(name: str, tool: Any, arguments: Sequence[TopoDS_Shape], tools: Sequence[TopoDS_Shape]) -> list[TopoDS_Shape]:
    with operation(name, operands=[compound_of(arguments), compound_of(tools)], risky=True):
        tool.SetArguments(shape_list(arguments))
        tool.SetTools(shape_list(tools))
        tool.SetRunParallel(False)
        tool.SetNonDestructive(True)
        tool.Build()
        if not tool.IsDone() or tool.Shape() is None:
            raise KernelError(f"the kernel gave up on a {name} of {len(arguments)} and {len(tools)} shapes")
        return solids_of(tool.Shape())


def inside_box(shape: TopoDS_Shape, low: np.ndarray, high: np.ndarray, slack: float = 0.1) -> bool:
    """True when a shape lies inside a box widened by `slack` [mm]."""
    own_low, own_high = bounding_box(shape)
    return bool((own_low > low - slack).all() and (own_high < high + slack).all())
