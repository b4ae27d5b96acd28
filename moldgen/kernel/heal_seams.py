"""Outlines in the parameter plane that lean by rounding, made straight: the mesher needs them exact."""

from __future__ import annotations

from typing import Final

from OCP.BRep import BRep_Tool
from OCP.Geom2d import Geom2d_Line
from OCP.gp import gp_Dir2d
from OCP.TopAbs import TopAbs_EDGE
from OCP.TopoDS import TopoDS, TopoDS_Face

from moldgen.kernel.topology import walk

LEANS: Final = 1e-9
"""Lean [rad] under which a line is meant to run along the parameter plane: a seam of 1 m moves by 1 nm (our choice)."""


def straighten_seams(face: TopoDS_Face) -> int:
    """Straighten the lines of a face that lean by less than `LEANS`; return how many did.

    Seen in real exports (measured): the seam of a full cone that leans by 2e-15 leaves the cone without a mesh. The
    lines are moved where they are: no edge, vertex or surface changes.
    """
    count = 0
    for occurrence in walk(face, TopAbs_EDGE):
        line = BRep_Tool.CurveOnSurface_s(TopoDS.Edge_s(occurrence), face, 0.0, 0.0)
        if not isinstance(line, Geom2d_Line):
            continue
        x, y = line.Direction().Coord()
        if 0.0 < min(abs(x), abs(y)) < LEANS:
            line.SetDirection(gp_Dir2d(0.0 if abs(x) < abs(y) else x, 0.0 if abs(y) < abs(x) else y))
            count += 1
    return count
