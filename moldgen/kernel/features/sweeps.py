"""Solids swept from outlines: extruded (with draft), revolved, lofted."""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping
from typing import Any

import numpy as np
from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut
from OCP.BRepBuilderAPI import (
    BRepBuilderAPI_MakeFace,
    BRepBuilderAPI_MakeSolid,
    BRepBuilderAPI_MakeWire,
    BRepBuilderAPI_Sewing,
)
from OCP.BRepFill import BRepFill
from OCP.BRepLib import BRepLib
from OCP.BRepOffsetAPI import BRepOffsetAPI_ThruSections
from OCP.BRepPrimAPI import BRepPrimAPI_MakePrism, BRepPrimAPI_MakeRevol
from OCP.BRepTools import BRepTools
from OCP.gp import gp_Pln
from OCP.LocOpe import LocOpe_DPrism
from OCP.TopoDS import TopoDS, TopoDS_Face, TopoDS_Shape

from moldgen.errors import PartError
from moldgen.kernel.features.frame import Array, Frame, X, Y, axis, unit, vec
from moldgen.kernel.features.profile import inner_faces, outline_face, spline_edge
from moldgen.kernel.features.shapes import checked_solid
from moldgen.kernel.features.tools import Bench, Step, Values
from moldgen.kernel.guard import operation
from moldgen.kernel.topology import edge_points, edges_of, shape_list, vertex_point, vertices_of


def extrude(values: Values, bench: Bench) -> list[Step]:
    """Return an outline moved along the growth direction of its plane."""
    frame = bench.frame(values["on"]).turned(values["at"], 0.0)
    height, draft = values["height"], values["draft"]
    if values["both"]:
        if draft:
            raise PartError("an extrusion to both sides cannot have draft", remedy="make two extrusions")
        frame = Frame(frame.place(0, 0, -height / 2), frame.u, frame.v, frame.grow)
    return [Step(values["mode"], values["body"], prism(values["profile"], frame, height, draft))]


def prism(profile: Mapping[str, Any], frame: Frame, height: float, draft: float) -> TopoDS_Shape:
    """Return an outline extruded along `frame.grow`.

    Parameters
    ----------
    profile : outline, see `profile.outline_face`
    frame : its plane
    height : [mm]
    draft : slope of the walls [deg], positive = seen from the far end: outer walls lean in, inner walls out

    Raises
    ------
    PartError : the draft closes the outline, or the kernel cannot slope it
    """
    solid = _prism_of(outline_face(profile, frame), profile, frame, height, draft)
    inner = [
        _prism_of(face, inner_profile, frame, height, -draft)
        for face, inner_profile in zip(inner_faces(profile, frame), profile["minus"], strict=True)
    ]
    return _without(solid, inner)


def _without(solid: TopoDS_Shape, inner: list[TopoDS_Shape]) -> TopoDS_Shape:
    if not inner:
        return solid
    with operation("cut inner outlines", operands=(solid, *inner)):
        cut = BRepAlgoAPI_Cut()
        cut.SetArguments(shape_list([solid]))
        cut.SetTools(shape_list(inner))
        cut.Build()
    return checked_solid(cut.Shape(), "an outline with inner outlines")


def _prism_of(face: TopoDS_Face, profile: Mapping[str, Any], frame: Frame, height: float, draft: float) -> TopoDS_Shape:
    if abs(draft) < 1e-9:
        with operation("extrude an outline"):
            return BRepPrimAPI_MakePrism(face, vec(height * frame.grow)).Shape()
    if profile["shape"] == "spline":
        return _drafted_spline(profile, frame, height, draft)
    slope = math.radians(draft)
    with operation(f"extrude an outline with {draft:g} deg of draft", remedy="use less draft or a simpler outline"):
        normal = BRepAdaptor_Surface(face).Plane().Axis().Direction()
        sense = 1.0 if np.dot(normal.Coord(), frame.grow) > 0 else -1.0
        # the kernel measures the length along the sloped wall
        shape = LocOpe_DPrism(face, sense * height / math.cos(slope), sense * slope).Shape()
    solid = checked_solid(shape, f"an outline with {draft:g} deg of draft over {height:g} mm")
    _check_height(solid, frame, height)
    return solid


def _check_height(solid: TopoDS_Shape, frame: Frame, height: float) -> None:
    heights = np.array([(vertex_point(v) - frame.origin) @ frame.grow for v in vertices_of(solid)])
    if abs(heights.max() - height) > 1e-4 or abs(heights.min()) > 1e-4:
        raise PartError("the draft closes the outline before its full height", remedy="use less draft or height")


def _drafted_spline(profile: Mapping[str, Any], frame: Frame, height: float, draft: float) -> TopoDS_Shape:
    """Return the ruled solid between a closed spline and its inward offset: the kernel's own draft fails there."""
    points = np.array(profile["points"], dtype=float)
    base = spline_edge(frame, list(points), periodic=True)
    raised = Frame(frame.place(0, 0, height), frame.u, frame.v, frame.grow)
    inset = _inset(points, height * math.tan(math.radians(draft)))
    top = spline_edge(raised, list(inset), periodic=True)
    with operation("build a drafted spline outline"):
        sewing = BRepBuilderAPI_Sewing(1e-6)
        sewing.Add(BRepFill.Face_s(base, top))
        for edge, level in ((base, frame), (top, raised)):
            wire = BRepBuilderAPI_MakeWire(edge).Wire()
            sewing.Add(BRepBuilderAPI_MakeFace(gp_Pln(level.plane()), wire, True).Face())
        sewing.Perform()
        solid = BRepBuilderAPI_MakeSolid(TopoDS.Shell_s(sewing.SewedShape())).Solid()
        BRepLib.OrientClosedSolid_s(solid)
    return checked_solid(solid, f"a spline outline with {draft:g} deg of draft")


def _inset(points: Array, distance: float) -> Array:
    """Return the points of a closed curve moved inward along the bisectors of their neighbours."""
    tangents = np.roll(points, -1, axis=0) - np.roll(points, 1, axis=0)
    normals = np.column_stack([-tangents[:, 1], tangents[:, 0]])
    normals /= np.linalg.norm(normals, axis=1)[:, None]
    x, y = points.T
    area = float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))
    return points + math.copysign(distance, area) * normals  # type: ignore[no-any-return]


def revolve(values: Values, _: Bench) -> list[Step]:
    """Return an outline turned about an axis (u = distance from the axis, v = along it).

    Raises
    ------
    PartError : the outline crosses the axis, or the angle is over 360 deg
    """
    angle = values["angle"]
    if angle > 360 + 1e-9:
        raise PartError(f"an angle of {angle:g} deg is more than a full turn", remedy="use 360 or less")
    frame = _axis_frame(values)
    face = outline_face(values["profile"], frame)
    _check_side(face, frame)
    solids = [_revolved(f, values, angle) for f in (face, *inner_faces(values["profile"], frame))]
    return [Step(values["mode"], values["body"], _without(solids[0], solids[1:]))]


def _revolved(face: TopoDS_Face, values: Values, angle: float) -> TopoDS_Shape:
    with operation("revolve an outline"):
        turn = axis(values["at"], values["axis"])
        if angle >= 360 - 1e-9:
            shape = BRepPrimAPI_MakeRevol(face, turn).Shape()
        else:
            shape = BRepPrimAPI_MakeRevol(face, turn, math.radians(angle)).Shape()
    return checked_solid(shape, "the revolved outline")


def _axis_frame(values: Values) -> Frame:
    """Return the half plane in which the outline lies; the turn goes from u towards v x u."""
    along = unit(values["axis"])
    across = X if abs(along @ X) < 0.9 else Y
    u = across - (across @ along) * along
    u /= np.linalg.norm(u)
    turn = math.radians(values["start"])
    u = math.cos(turn) * u + math.sin(turn) * np.cross(along, u)
    return Frame(np.array(values["at"], dtype=float), u, along, np.cross(u, along))


def _check_side(face: TopoDS_Face, frame: Frame) -> None:
    points = np.vstack([edge_points(edge, 33) for edge in edges_of(face)])
    least = float(((points - frame.origin) @ frame.u).min())
    if least < -1e-6:
        raise PartError(
            f"the outline crosses the axis by {-least:.4g} mm",
            remedy="keep every u (distance from the axis) at 0 or more",
        )


def loft(values: Values, bench: Bench) -> list[Step]:
    """Return the solid through outlines at increasing heights.

    Raises
    ------
    PartError : two outlines at one height, or the kernel cannot join them
    """
    frame = bench.frame(values["on"])
    sections = values["sections"]
    heights = [s["height"] for s in sections]
    if any(b - a < 1e-6 for a, b in itertools.pairwise(heights)):
        raise PartError(f"the heights of the sections must rise: {', '.join(f'{h:g}' for h in heights)}")
    if any(s["profile"]["minus"] for s in sections):
        raise PartError("a section of a loft cannot have inner outlines", remedy="cut a second loft out of the first")
    with operation("loft through outlines"):
        maker = BRepOffsetAPI_ThruSections(True, values["ruled"], 1e-6)
        for section in sections:
            level = Frame(frame.place(0, 0, section["height"]), frame.u, frame.v, frame.grow)
            maker.AddWire(BRepTools.OuterWire_s(outline_face(section["profile"], level)))
        maker.CheckCompatibility(True)
        maker.Build()
        shape = maker.Shape()
    return [Step(values["mode"], values["body"], checked_solid(shape, "the loft"))]
