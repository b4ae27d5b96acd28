"""Channels for the melt, as the solids that fill them: runner with round ends, gate slot."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeEdge, BRepBuilderAPI_MakeFace
from OCP.BRepPrimAPI import BRepPrimAPI_MakePrism, BRepPrimAPI_MakeRevol
from OCP.GC import GC_MakeArcOfCircle
from OCP.gp import gp_Ax1, gp_Dir, gp_Vec
from OCP.TopoDS import TopoDS_Edge, TopoDS_Face, TopoDS_Shape

from moldgen.errors import KernelError
from moldgen.kernel.boolean import fuse
from moldgen.kernel.build import plane_face, plane_through, point, wire_of
from moldgen.kernel.guard import operation
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.topology import only_solid

SLACK = 1e-6
"""Relative error of volumes that is none: pieces of real parts carry curves that are good to that."""


@dataclass(frozen=True)
class Profile:
    """Section of a channel in one half [mm]: round bottom, straight flanks, as a ball-nosed taper cutter leaves it.

    diameter : of the round bottom, and depth below the parting surface; flank : slope of the sides [deg]
    skirt : how far the flanks go on beyond the parting surface, so that they meet it wherever it lies
    upward : the channel lies above the parting surface (in the cavity half), else below it
    """

    diameter: float
    flank: float
    skirt: float
    upward: bool

    @property
    def half_width(self) -> float:
        """Half of the width at the parting surface [mm]."""
        return self._corners(0.0)[1][0]

    def _corners(self, skirt: float) -> tuple[tuple[float, float], tuple[float, float]]:
        """Return (half width, height) where the round bottom ends, and where the flank ends."""
        radius, slope = self.diameter / 2, math.radians(self.flank)
        u, h = radius * math.cos(slope), radius + radius * math.sin(slope)
        return (u, h), (u + (h + skirt) * math.tan(slope), -skirt)

    def face(self, at: np.ndarray, side: np.ndarray, *, whole: bool) -> TopoDS_Face:
        """Return the section as a face across `at` (3,): `whole`, or the half towards the unit vector `side` (3,)."""
        sign = 1.0 if self.upward else -1.0

        def place(u: float, h: float) -> np.ndarray:
            return np.asarray(at + u * side + np.array([0.0, 0.0, sign * h]))

        (u, h), (foot, low) = self._corners(self.skirt)
        radius, turn = self.diameter / 2, 0.5 * (math.pi / 2 + math.radians(self.flank))
        top, end, out = place(0.0, self.diameter), place(u, h), place(foot, low)
        if whole:
            begin, begin_out = place(-u, h), place(-foot, low)
            edges = [_arc(begin, top, end), _line(end, out), _line(out, begin_out), _line(begin_out, begin)]
        else:
            on_arc = place(radius * math.cos(turn), radius + radius * math.sin(turn))
            middle = place(0.0, low)
            edges = [_arc(top, on_arc, end), _line(end, out), _line(out, middle), _line(middle, top)]
        return plane_face(plane_through(at, np.cross(side, (0.0, 0.0, 1.0))), wire_of(edges))

    def area(self) -> float:
        """Area of the section on its side of the parting surface [mm^2]."""
        (u, h), (foot, _) = self._corners(0.0)
        radius, slope = self.diameter / 2, math.radians(self.flank)
        cap = radius**2 * (math.pi / 2 - slope - math.sin(slope) * math.cos(slope))
        return cap + h * (u + foot)


def channel(start: np.ndarray, end: np.ndarray, profile: Profile, *, round_start: bool) -> list[TopoDS_Shape]:
    """Return a straight channel between two points (3,) on one level of the parting surface, its far end round.

    It comes in pieces that share their end faces: joining everything in one go is twice as fast (measured).
    """
    along = end - start
    way = along / np.linalg.norm(along)
    side = np.cross(way, (0.0, 0.0, 1.0))
    with operation("build a runner"):
        middle = BRepPrimAPI_MakePrism(profile.face(start, side, whole=True), gp_Vec(*along)).Shape()
        # turned by half about the upright axis, a half section sweeps the side that lies beyond the end of the way
        places = [(start, -side), (end, side)] if round_start else [(end, side)]
        ends = [_turned(profile.face(at, s, whole=False), at) for at, s in places]
    return [middle, *ends]


def slot(start: np.ndarray, end: np.ndarray, width: float, heights: tuple[float, float]) -> TopoDS_Shape:
    """Return the box around a straight way between two points in plan, (2,) or more, between two heights [mm]."""
    along = np.array([*(end - start)[:2], 0.0])
    side = np.cross(along / np.linalg.norm(along), (0.0, 0.0, 1.0)) * width / 2
    base = np.array([*start[:2], heights[0]])
    corners = [base + side, base + side + along, base - side + along, base - side]
    edges = [_line(corners[i], corners[(i + 1) % 4]) for i in range(4)]
    face = BRepBuilderAPI_MakeFace(wire_of(edges), True).Face()
    return only_solid(BRepPrimAPI_MakePrism(face, gp_Vec(0.0, 0.0, heights[1] - heights[0])).Shape())


def joined(solids: list[TopoDS_Shape], name: str) -> TopoDS_Shape:
    """Return the union of solids that touch or overlap, as one valid solid.

    Raises
    ------
    KernelError : what comes out is not one solid, is invalid, or lost volume
    """
    found = fuse(solids)
    if len(found) != 1:
        raise KernelError(f"{name}: {len(solids)} pieces join to {len(found)} solids, expected one")
    result = found[0]
    sizes = [volume(s) for s in solids]
    if not is_valid(result) or not max(sizes) * (1 - SLACK) <= volume(result) <= sum(sizes) * (1 + SLACK):
        raise KernelError(f"{name}: the union of {len(solids)} pieces is not sound")
    return result


def _turned(face: TopoDS_Face, at: np.ndarray) -> TopoDS_Shape:
    about = gp_Ax1(point(at), gp_Dir(0.0, 0.0, 1.0))
    return only_solid(BRepPrimAPI_MakeRevol(face, about, math.pi).Shape())


def _arc(start: np.ndarray, through: np.ndarray, end: np.ndarray) -> TopoDS_Edge:
    return BRepBuilderAPI_MakeEdge(GC_MakeArcOfCircle(point(start), point(through), point(end)).Value()).Edge()


def _line(one: np.ndarray, other: np.ndarray) -> TopoDS_Edge:
    return BRepBuilderAPI_MakeEdge(point(one), point(other)).Edge()
