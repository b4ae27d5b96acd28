"""Round holes and rectangular windows."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any, Final

import numpy as np
from OCP.BRepPrimAPI import BRepPrimAPI_MakeCone, BRepPrimAPI_MakeSphere
from OCP.gp import gp_Ax2, gp_Lin
from OCP.IntCurvesFace import IntCurvesFace_ShapeIntersector
from OCP.TopoDS import TopoDS_Shape

from moldgen.errors import PartError
from moldgen.kernel.features.frame import Array, Frame, direction, pnt
from moldgen.kernel.features.primitives import cone_on
from moldgen.kernel.features.shapes import combine, rough_box
from moldgen.kernel.features.sweeps import prism
from moldgen.kernel.features.tools import Bench, Step, Values
from moldgen.kernel.guard import operation

BEYOND: Final = 1.0
"""mm that a through hole runs on behind the body."""

DRILL_POINT: Final = 118.0
"""deg, included angle of a `cone` bottom: the usual twist drill (common practice)."""


def hole(values: Values, bench: Bench) -> list[Step]:
    """Return the solids that cut a round hole with its counterbore and countersink."""
    frame = bench.frame(values["on"])
    entry = frame.place(*values["at"])
    steps = [Step("cut", values["body"], round_hole(bench, entry, -frame.grow, values))]
    axes = gp_Ax2(pnt(entry), direction(-frame.grow))
    if values["counterbore"]:
        bore = values["counterbore"]
        _must_be_wider("counterbore", bore["diameter"], values["diameter"])
        steps.append(Step("cut", values["body"], cone_on(axes, bore["diameter"] / 2, bore["depth"], bore["draft"])))
    if values["countersink"]:
        steps.append(Step("cut", values["body"], _countersink(axes, values)))
    return steps


def round_hole(bench: Bench, entry: Array, inward: Array, values: Mapping[str, Any]) -> TopoDS_Shape:
    """Return the solid of a hole from its entry.

    Parameters
    ----------
    entry, inward : centre of the entry [mm] and unit direction into the material
    values : diameter at the entry, depth (None: through), draft (positive: narrower inward), bottom

    Raises
    ------
    PartError : the draft closes the hole, or a through hole enters behind the body
    """
    depth = values["depth"] if values["depth"] is not None else _through(bench, entry, inward)
    axes = gp_Ax2(pnt(entry), direction(inward))
    radius = values["diameter"] / 2
    solid = cone_on(axes, radius, depth, values["draft"])
    if values["depth"] is None or values["bottom"] == "flat":
        return solid
    end = radius - depth * math.tan(math.radians(values["draft"]))
    far = gp_Ax2(pnt(entry + depth * inward), direction(inward))
    with operation("build the bottom of a hole"):
        if values["bottom"] == "cone":
            tip = BRepPrimAPI_MakeCone(far, end, 0.0, end / math.tan(math.radians(DRILL_POINT / 2))).Solid()
        else:
            tip = BRepPrimAPI_MakeSphere(far, end, 0.0, math.pi / 2).Solid()
    return combine("add", solid, [tip])


def _through(bench: Bench, entry: Array, inward: Array) -> float:
    if bench.body is None:
        raise PartError("there is no body to go through yet", remedy="make the hole after the body")
    low, high = rough_box(bench.body)
    far = float(np.maximum((low - entry) * inward, (high - entry) * inward).sum())
    if far <= 1e-6:
        raise PartError(
            "the whole body lies behind the entry of the hole", remedy="turn its plane with flip, or move it"
        )
    return far + BEYOND


def _countersink(axes: gp_Ax2, values: Values) -> TopoDS_Shape:
    sink = values["countersink"]
    _must_be_wider("countersink", sink["diameter"], values["diameter"])
    if sink["angle"] >= 180:
        raise PartError(f"a countersink of {sink['angle']:g} deg is flat", remedy="use less than 180 deg")
    radius = sink["diameter"] / 2
    with operation("build a countersink"):
        return BRepPrimAPI_MakeCone(axes, radius, 0.0, radius / math.tan(math.radians(sink["angle"] / 2))).Solid()


def _must_be_wider(what: str, diameter: float, than: float) -> None:
    if diameter <= than:
        raise PartError(f"the {what} of {diameter:g} mm must be wider than the hole of {than:g} mm")


def window(values: Values, bench: Bench) -> list[Step]:
    """Return the solid that cuts a rectangular opening through the first wall behind its plane."""
    frame = bench.frame(values["on"]).turned(values["at"], values["angle"])
    start, depth = 0.0, values["depth"]
    if depth is None:
        start, depth = _wall(bench, frame)
    inward = Frame(frame.place(0, 0, -start), frame.u, frame.v, -frame.grow)
    # `size` holds on the plane of the window, so a drafted tool that starts behind it is smaller from the start
    shrink = 2 * start * math.tan(math.radians(values["draft"]))
    size = tuple(s - shrink for s in values["size"])
    if min(size) <= 0:
        raise PartError("the draft closes the window", remedy="use less draft")
    outline = {
        "shape": "rectangle",
        "size": size,
        "radius": values["radius"],
        "at": (0.0, 0.0),
        "angle": 0.0,
        "minus": (),
    }
    return [Step("cut", values["body"], prism(outline, inward, depth, values["draft"]))]


def _wall(bench: Bench, frame: Frame) -> tuple[float, float]:
    """Return start and length, inward from the plane, of a cut through the nearest wall and nothing behind it."""
    if bench.body is None:
        raise PartError("there is no wall to open yet", remedy="make the window after the wall")
    with operation("look for the wall behind a window", operands=(bench.body,)):
        finder = IntCurvesFace_ShapeIntersector()
        finder.Load(bench.body, 1e-7)
        finder.Perform(gp_Lin(frame.point(0, 0), direction(-frame.grow)), -1e-3, 1e5)
        depths = sorted(finder.WParameter(i) for i in range(1, finder.NbPnt() + 1))
    crossings = [d for i, d in enumerate(depths) if i == 0 or d - depths[i - 1] > 1e-6]
    if len(crossings) < 2:
        raise PartError("no wall lies behind the window", remedy="move it, or look from the other side with flip")
    thickness = crossings[1] - crossings[0]
    room = (crossings[2] - crossings[1]) / 2 if len(crossings) > 2 else thickness
    before = min(thickness, max(crossings[0], 0.0))
    return crossings[0] - before, before + thickness + min(room, thickness)
