"""Blocks, cylinders, balls and rings."""

from __future__ import annotations

import math

from OCP.BRepPrimAPI import (
    BRepPrimAPI_MakeCone,
    BRepPrimAPI_MakeCylinder,
    BRepPrimAPI_MakeSphere,
    BRepPrimAPI_MakeTorus,
)
from OCP.gp import gp_Ax2
from OCP.TopoDS import TopoDS_Shape

from moldgen.errors import PartError
from moldgen.kernel.features.frame import direction, pnt, unit
from moldgen.kernel.features.sweeps import prism
from moldgen.kernel.features.tools import Bench, Step, Values
from moldgen.kernel.guard import operation


def block(values: Values, bench: Bench) -> list[Step]:
    """Return a block standing on its plane, with rounded upright edges and draft if wanted."""
    frame = bench.frame(values["on"]).turned(values["at"], values["angle"])
    length, width, height = values["size"]
    outline = {
        "shape": "rectangle",
        "size": (length, width),
        "radius": values["radius"],
        "at": (0.0, 0.0),
        "angle": 0.0,
        "minus": (),
    }
    return [Step(values["mode"], values["body"], prism(outline, frame, height, values["draft"]))]


def cylinder(values: Values, bench: Bench) -> list[Step]:
    """Return a cylinder, or a cone where there is draft."""
    axes = bench.frame(values["on"]).axes(values["at"])
    solid = cone_on(axes, values["diameter"] / 2, values["height"], values["draft"])
    return [Step(values["mode"], values["body"], solid)]


def cone_on(axes: gp_Ax2, radius: float, height: float, draft: float) -> TopoDS_Shape:
    """Return a round solid from its base upward along the main axis.

    Parameters
    ----------
    axes : centre of the base and direction
    radius : at the base [mm]
    height : [mm]
    draft : slope of the wall [deg], positive = smaller at the far end

    Raises
    ------
    PartError : the draft closes it before its full height
    """
    far = radius - height * math.tan(math.radians(draft))
    if far <= 1e-6:
        raise PartError(
            f"a draft of {draft:g} deg closes a diameter of {2 * radius:g} mm before its height of {height:g} mm",
            remedy="use less draft or height, or a larger diameter",
        )
    with operation("build a round solid"):
        if abs(far - radius) < 1e-9:
            return BRepPrimAPI_MakeCylinder(axes, radius, height).Solid()
        return BRepPrimAPI_MakeCone(axes, radius, far, height).Solid()


def sphere(values: Values, _: Bench) -> list[Step]:
    """Return a ball."""
    with operation("build a ball"):
        solid = BRepPrimAPI_MakeSphere(pnt(values["at"]), values["diameter"] / 2).Solid()
    return [Step(values["mode"], values["body"], solid)]


def torus(values: Values, _: Bench) -> list[Step]:
    """Return a ring of round section.

    Raises
    ------
    PartError : the section is too thick for the ring
    """
    ring, section = values["diameter"] / 2, values["section"] / 2
    if section >= ring:
        raise PartError(
            f"a section of {2 * section:g} mm closes the ring of {2 * ring:g} mm", remedy="use a smaller section"
        )
    with operation("build a ring"):
        solid = BRepPrimAPI_MakeTorus(gp_Ax2(pnt(values["at"]), direction(unit(values["axis"]))), ring, section).Solid()
    return [Step(values["mode"], values["body"], solid)]
