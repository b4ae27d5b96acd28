"""Bosses, ribs, gussets and snap hooks."""

from __future__ import annotations

import math

import numpy as np
from OCP.BRepPrimAPI import BRepPrimAPI_MakeWedge
from OCP.gp import gp_Ax2
from OCP.TopoDS import TopoDS_Shape

from moldgen.errors import PartError
from moldgen.kernel.features.frame import Frame, direction, pnt
from moldgen.kernel.features.holes import round_hole
from moldgen.kernel.features.primitives import cone_on
from moldgen.kernel.features.shapes import combine, polyhedron
from moldgen.kernel.features.sweeps import prism
from moldgen.kernel.features.tools import Bench, Step, Values
from moldgen.kernel.guard import operation


def boss(values: Values, bench: Bench) -> list[Step]:
    """Return a post, its gussets, and the hole from its free end.

    Raises
    ------
    PartError : the hole is as wide as the post
    """
    frame = bench.frame(values["on"])
    height, draft = values["height"], values["draft"]
    foot = values["diameter"] / 2 + height * math.tan(math.radians(draft))
    steps = [Step("add", values["body"], cone_on(frame.axes(values["at"]), foot, height, draft))]
    if values["gussets"]:
        local = frame.turned(values["at"], 0.0)
        steps += [Step("add", values["body"], solid) for solid in _gussets(values["gussets"], local, foot, height)]
    if values["hole"]:
        if values["hole"]["diameter"] >= values["diameter"]:
            raise PartError(
                f"a hole of {values['hole']['diameter']:g} mm leaves no wall in a boss of {values['diameter']:g} mm",
                remedy="use a smaller hole or a larger boss",
            )
        top = frame.turned(values["at"], 0.0).place(0, 0, height)
        steps.append(Step("cut", values["body"], round_hole(bench, top, -frame.grow, values["hole"])))
    return steps


def _gussets(values: Values, frame: Frame, foot: float, boss_height: float) -> list[TopoDS_Shape]:
    if values["height"] >= boss_height:
        raise PartError(f"gussets of {values['height']:g} mm must be lower than the boss of {boss_height:g} mm")
    thickness, height = values["thickness"], values["height"]
    half = thickness / 2
    top = half - height * math.tan(math.radians(values["draft"]))
    if top <= 0:
        raise PartError(f"the draft closes gussets of {thickness:g} mm", remedy="use less draft or more thickness")
    inner, outer = foot / 2, foot + values["length"]
    solids = []
    for index in range(values["count"]):
        local = frame.turned((0.0, 0.0), values["start"] + 360.0 * index / values["count"])
        corners = [
            local.place(inner, -half, 0),
            local.place(outer, -half, 0),
            local.place(outer, half, 0),
            local.place(inner, half, 0),
            local.place(inner, -top, height),
            local.place(inner, top, height),
        ]
        solids.append(polyhedron(corners, [(0, 3, 2, 1), (0, 1, 4), (3, 5, 2), (1, 2, 5, 4), (0, 4, 5, 3)]))
    return solids


def rib(values: Values, bench: Bench) -> list[Step]:
    """Return a straight rib, sloped on its sides and, if wanted, its ends.

    Raises
    ------
    PartError : no length, ends at different heights, or the draft closes the rib
    """
    frame = bench.frame(values["on"])
    start, end = (np.array([*values[k], 0.0][:3]) for k in ("start", "end"))
    if abs(start[2] - end[2]) > 1e-9:
        raise PartError("both ends of a rib must have the same height above its plane")
    run = (end - start)[:2]
    length = float(np.hypot(*run))
    if length < 1e-6:
        raise PartError("the rib has no length: start and end are the same point")
    turned = frame.turned(start, math.degrees(math.atan2(run[1], run[0])))
    solid = frustum(turned, (length, values["thickness"]), values["height"], (values["end_draft"], values["draft"]))
    return [Step(values["mode"], values["body"], solid)]


def frustum(frame: Frame, size: tuple[float, float], height: float, draft: tuple[float, float]) -> TopoDS_Shape:
    """Return a straight-sided block that narrows upward: from u = 0 to the length, centred on v = 0.

    Parameters
    ----------
    frame : foot
    size : length along u and thickness along v at the foot [mm]
    height : [mm]
    draft : slope of the ends (u) and of the sides (v) [deg]
    """
    length, thickness = size
    in_u, in_v = (height * math.tan(math.radians(d)) for d in draft)
    if thickness - 2 * in_v <= 1e-6 or length - 2 * in_u <= 1e-6:
        raise PartError(
            f"the draft closes a {length:g} x {thickness:g} mm foot before the height of {height:g} mm",
            remedy="use less draft or height, or more thickness",
        )
    with operation("build a rib"):
        # the kernel's wedge grows along its second axis, so its third one is u x grow
        third = np.cross(frame.u, frame.grow)
        axes = gp_Ax2(pnt(frame.origin - thickness / 2 * third), direction(third), direction(frame.u))
        wedge = BRepPrimAPI_MakeWedge(axes, length, height, thickness, in_u, in_v, length - in_u, thickness - in_v)
        return wedge.Solid()


def snap_hook(values: Values, bench: Bench) -> list[Step]:
    """Return a bending hook: the face that carries the lip stands over `at`, the beam lies behind it.

    Raises
    ------
    PartError : the slopes close the beam or the lip
    """
    frame = bench.frame(values["on"]).turned(values["at"], values["toward"])
    length, width, lip = values["length"], values["width"], values["lip"]
    front = length * math.tan(math.radians(values["front_draft"]))
    under = lip / math.tan(math.radians(values["return_angle"])) if values["return_angle"] < 90 else 0.0
    lead = lip / math.tan(math.radians(values["lead_angle"]))
    top = length + max(values["lip_height"], under + 1e-3)
    back = -values["thickness"] + (top + lead) * math.tan(math.radians(values["back_draft"]))
    nose = -front + lip
    if back >= -front - 1e-3:
        raise PartError("the slopes close the beam of the hook", remedy="use less draft or a thicker hook")
    outline = [
        (-values["thickness"], 0.0),
        (0.0, 0.0),
        (-front, length),
        (nose, length + under),
        (nose, top),
        (-front, top + lead),
        (back, top + lead),
    ]
    side = Frame(frame.origin, frame.u, frame.grow, frame.v)
    path = {
        "shape": "path",
        "start": outline[0],
        "steps": tuple({"line": p, "round": None} for p in outline[1:]),
        "round": None,
        "minus": (),
    }
    middle = Frame(side.place(0, 0, -width / 2), side.u, side.v, side.grow)
    solid = prism(path, middle, width, 0.0)
    if values["side_draft"]:
        depth = values["thickness"] + lip + 2
        foot = Frame(frame.place(-values["thickness"] - 1, 0), frame.u, frame.v, frame.grow)
        solid = combine("intersect", solid, [frustum(foot, (depth, width), top + lead, (0.0, values["side_draft"]))])
    return [Step("add", values["body"], solid)]
