"""Whether an overlap of meshes is one of the solids themselves: the kernel's surfaces asked at points of it.

Needed because the kernel meshes some spline faces worse than it is asked to, however fine: two bodies that share such a
face seemed to overlap by 0.05 mm on a real part (measured), and by the surfaces themselves did not.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from OCP.BRepClass3d import BRepClass3d_SolidClassifier
from OCP.gp import gp_Dir, gp_Lin, gp_Pnt
from OCP.IntCurvesFace import IntCurvesFace_ShapeIntersector
from OCP.TopAbs import TopAbs_IN

from .reading import Placed

ON = 1e-6
"""mm: points this close to a surface are not inside."""


def overlap(
    points: np.ndarray, movers: Sequence[Placed], start: np.ndarray, way: np.ndarray, others: Sequence[Placed]
) -> bool:
    """Return whether any of the points lies inside one of the other solids, and inside what the movers pass through.

    points : (n, 3) [mm]; start, way : where the movers begin, seen from the closed mold, and how far they go, (3,) [mm]
    """
    for point in points:
        if any(_inside(body, point) for body in others) and any(_passed(body, point - start, way) for body in movers):
            return True
    return False


def _local(body: Placed, point: np.ndarray) -> np.ndarray:
    return body.at[:, :3].T @ (point - body.at[:, 3])


def _inside(body: Placed, point: np.ndarray) -> bool:
    local = _local(body, point)
    low, high = np.asarray(body.product.mesh().bounding_box()).reshape(2, 3)
    if (local < low - 1.0).any() or (local > high + 1.0).any():
        return False
    classifier = BRepClass3d_SolidClassifier(body.product.shape)
    classifier.Perform(gp_Pnt(*map(float, local)), ON)
    return bool(classifier.State() == TopAbs_IN)


def _passed(body: Placed, point: np.ndarray, way: np.ndarray) -> bool:
    """True when a body that starts in place and goes a straight way passes over a point: it lies behind the point."""
    length = float(np.linalg.norm(way))
    if _inside(body, point):
        return True
    if length == 0.0:
        return False
    back = -(body.at[:, :3].T @ way) / length
    finder = IntCurvesFace_ShapeIntersector()
    finder.Load(body.product.shape, ON)
    finder.Perform(gp_Lin(gp_Pnt(*map(float, _local(body, point))), gp_Dir(*map(float, back))), 0.0, length)
    met = sorted(finder.WParameter(i) for i in range(1, finder.NbPnt() + 1))
    middles = [(a + b) / 2.0 for a, b in zip([0.0, *met], [*met, length], strict=True) if b - a > ON]
    unit = way / length
    return any(_inside(body, point - m * unit) for m in middles)
