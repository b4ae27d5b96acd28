"""The kernel's solid of a straight prism with a polygonal outline, in any direction."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from OCP.BRepPrimAPI import BRepPrimAPI_MakePrism
from OCP.gp import gp_Vec
from OCP.TopoDS import TopoDS_Shape, TopoDS_Wire

from moldgen.errors import KernelError
from moldgen.kernel.build import line_edge, plane_face, plane_through, vertex_at, wire_of
from moldgen.kernel.guard import operation
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.polygon import contains, signed_area

SHORTEST = 1e-4
"""mm: a shorter prism is none."""

SAME_VOLUME = 1e-6
"""Relative difference between the prism's volume and area x length that is noise."""


def outline_prism(outline: Sequence[np.ndarray], frame: np.ndarray, near: float, far: float) -> list[TopoDS_Shape]:
    """Return the solids of a prism, one for each outer polygon of its outline.

    outline : polygons (k, 2) [mm]; outer ones run counterclockwise, holes clockwise, none touches another
    frame : (3, 3), rows x, y, z of the prism's frame; it runs along z from `near` to `far` [mm]

    Raises
    ------
    KernelError : an outline crosses itself, a hole lies outside, or the prism has no length
    """
    if far - near < SHORTEST:
        raise KernelError(f"a side action's front is {far - near:.4f} mm long")
    areas = [signed_area(p) for p in outline]
    outer = [p for p, a in zip(outline, areas, strict=True) if a > 0]
    holes = [p for p, a in zip(outline, areas, strict=True) if a < 0]
    if not outer:
        raise KernelError("the outline of a side action encloses nothing")
    along = frame[2] * (far - near)
    with operation("make the front of a side action"):
        return [_solid(polygon, holes, frame, (near, far), along) for polygon in outer]


def _solid(
    polygon: np.ndarray, holes: Sequence[np.ndarray], frame: np.ndarray, ends: tuple[float, float], along: np.ndarray
) -> TopoDS_Shape:
    near, far = ends
    inside = [h for h in holes if contains(polygon, h[:1])[0]]
    plane = plane_through(frame[2] * near, frame[2])
    wires = [_wire(p, frame, near) for p in (polygon, *inside)]
    face = plane_face(plane, wires[0], wires[1:])
    solid = BRepPrimAPI_MakePrism(face, gp_Vec(*(float(v) for v in along))).Shape()
    expected = (signed_area(polygon) + sum(signed_area(h) for h in inside)) * (far - near)
    found = volume(solid)
    if not is_valid(solid) or abs(abs(found) - expected) > SAME_VOLUME * expected:
        raise KernelError(f"the outline of a side action gives {abs(found):.4f} mm^3 instead of {expected:.4f}")
    return solid if found > 0 else solid.Reversed()


def _wire(polygon: np.ndarray, frame: np.ndarray, height: float) -> TopoDS_Wire:
    places = np.column_stack([polygon, np.full(len(polygon), height)]) @ frame
    corners = [vertex_at(p) for p in places]
    return wire_of([line_edge(a, b) for a, b in zip(corners, corners[1:] + corners[:1], strict=True)])
