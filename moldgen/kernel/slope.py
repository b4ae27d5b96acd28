"""The slope of a face against the pull, n.d with d = +z, evaluated exactly on its surface."""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable
from typing import Any

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.BRepTools import BRepTools
from OCP.GeomAbs import GeomAbs_C2, GeomAbs_Cone, GeomAbs_Cylinder, GeomAbs_Plane
from OCP.gp import gp_Pnt, gp_Vec
from OCP.TColStd import TColStd_Array1OfReal
from OCP.TopoDS import TopoDS_Face
from scipy.optimize import brentq

from moldgen.kernel.topology import is_reversed

LEVEL = 1e-9
"""|n.d| that counts as zero when signs are compared."""

SAMPLES_A_SPAN = 24
"""Places at which a profile's slope is looked at between two of its knots."""


class Slope:
    """Outward unit normal of a face times +z, as a function of the surface's parameters, minus a wanted value."""

    def __init__(self, face: TopoDS_Face, sine: float = 0.0) -> None:
        self.surface = BRepAdaptor_Surface(face)
        self.side = -1.0 if is_reversed(face) else 1.0
        self.sine = sine
        self.bounds: tuple[float, float, float, float] = BRepTools.UVBounds_s(face)
        self.natural: tuple[float, float, float, float] = BRep_Tool.Surface_s(face).Bounds()
        self._point, self._u, self._v = gp_Pnt(), gp_Vec(), gp_Vec()

    def normal(self, u: float, v: float) -> np.ndarray:
        """Return the outward unit normal, (3,); at a pole, that of a place close by."""
        self.surface.D1(u, v, self._point, self._u, self._v)
        n = self._u.Crossed(self._v)
        size = n.Magnitude()
        if size <= 1e-14 * max(1.0, self._u.Magnitude() * self._v.Magnitude()):
            low_u, high_u, low_v, high_v = self.bounds
            u, v = u + 1e-6 * (0.5 * (low_u + high_u) - u), v + 1e-6 * (0.5 * (low_v + high_v) - v)
            self.surface.D1(u, v, self._point, self._u, self._v)
            n = self._u.Crossed(self._v)
            size = max(n.Magnitude(), 1e-300)
        k = self.side / size
        return np.array([k * n.X(), k * n.Y(), k * n.Z()])

    def __call__(self, u: float, v: float) -> float:
        """Return n.d - sine."""
        self.surface.D1(u, v, self._point, self._u, self._v)
        n = self._u.Crossed(self._v)
        size = n.Magnitude()
        if size < 1e-12:
            return float(self.normal(u, v)[2]) - self.sine
        return float(self.side * n.Z() / size) - self.sine

    def room(self) -> tuple[tuple[float, float], tuple[float, float]]:
        """Return the lower and upper (u, v) up to which the surface goes on beyond the face without meeting a seam."""
        low_u, high_u, low_v, high_v = self.bounds
        end_u, far_u, end_v, far_v = self.natural
        u, v = (low_u, high_u), (low_v, high_v)
        if self.surface.IsUPeriodic():
            spare = 0.4 * max(0.0, self.surface.UPeriod() - (high_u - low_u) - 1e-6)
            u = (low_u - spare, high_u + spare)
        elif not self.surface.IsUClosed():
            u = (min(end_u, low_u), max(far_u, high_u))
        if self.surface.IsVPeriodic():
            spare = 0.4 * max(0.0, self.surface.VPeriod() - (high_v - low_v) - 1e-6)
            v = (low_v - spare, high_v + spare)
        elif not self.surface.IsVClosed():
            v = (min(end_v, low_v), max(far_v, high_v))
        return (u[0], v[0]), (u[1], v[1])

    def along(self, one: np.ndarray, other: np.ndarray) -> float:
        """Return the root between two parameter places of opposite sign, as the share of the way from one to other."""
        way = other - one
        return root_between(lambda t: self(one[0] + t * way[0], one[1] + t * way[1]), 0.0, 1.0)

    def point(self, u: float, v: float) -> np.ndarray:
        """Return the surface point, (3,) [mm]."""
        return np.array(self.surface.Value(u, v).Coord())


def root_between(function: Callable[[float], float], low: float, high: float) -> float:
    """Return a root in a bracket, or the end with the smaller value when the signs do not differ."""
    first, last = function(low), function(high)
    if first == 0.0 or last == 0.0 or (first > 0.0) == (last > 0.0):
        return low if abs(first) <= abs(last) else high
    return float(brentq(function, low, high, xtol=1e-15, rtol=1e-14))


def roots(function: Callable[[float], float], places: np.ndarray) -> list[float]:
    """Return the parameters where a function changes sign, looked for between ascending places.

    Where it stays zero between the signs (a profile with a straight vertical piece) the middle of that stretch counts.
    """
    values = np.array([function(float(t)) for t in places])
    signs = np.where(np.abs(values) < LEVEL, 0, np.sign(values)).astype(int)
    seen = np.flatnonzero(signs)
    found = []
    for one, two in itertools.pairwise(seen):
        if signs[one] == signs[two]:
            continue
        if two == one + 1:
            found.append(root_between(function, float(places[one]), float(places[two])))
        else:
            found.append(float(0.5 * (places[one + 1] + places[two - 1])))
    return found


def angles(amplitude: float, phase: float, wanted: float, low: float, high: float) -> list[float]:
    """Return the angles in low..high where amplitude * cos(angle - phase) crosses the wanted value."""
    if amplitude < LEVEL or abs(wanted) >= amplitude * (1.0 - 1e-12):
        return []
    half = math.acos(wanted / amplitude)
    turn = 2.0 * math.pi
    found = set()
    for start in (phase - half, phase + half):
        angle = start - turn * math.floor((start - low + 1e-9) / turn)
        while angle < high - 1e-9:
            if angle > low + 1e-9:
                found.add(round(angle, 14))
            angle += turn
    return sorted(found)


def axis_parts(position: Any) -> tuple[float, float, float, float]:
    """Return the z components of a local system's x, y and z directions, and its handedness (+1 or -1)."""
    x, y, z = position.XDirection(), position.YDirection(), position.Direction()
    return x.Z(), y.Z(), z.Z(), 1.0 if position.Direct() else -1.0


def profile_places(curve: Any, low: float, high: float) -> np.ndarray:
    """Return the places at which the slope of a profile curve (an adaptor) is looked at."""
    count = curve.NbIntervals(GeomAbs_C2)
    knots = TColStd_Array1OfReal(1, count + 1)
    curve.Intervals(knots, GeomAbs_C2)
    inner = [knots.Value(i) for i in range(1, count + 2) if low < knots.Value(i) < high]
    ends = np.array([low, *inner, high])
    steps = np.linspace(0.0, 1.0, SAMPLES_A_SPAN, endpoint=False)
    return np.append((ends[:-1, None] + steps * np.diff(ends)[:, None]).ravel(), high)


def sine_range(face: TopoDS_Face) -> tuple[float, float] | None:
    """Return the least and greatest n.d over the parameter box of a plane, cylinder or cone; None for other surfaces.

    For a face that does not fill its parameter box the range may be wider than that of the face itself.
    """
    slope = Slope(face)
    kind = slope.surface.GetType()
    low_u, high_u, low_v, high_v = slope.bounds
    middle = 0.5 * (low_v + high_v)
    if kind == GeomAbs_Plane:
        value = slope(low_u, middle)
        return value, value
    if kind == GeomAbs_Cylinder:
        a, b, _, _ = axis_parts(slope.surface.Cylinder().Position())
    elif kind == GeomAbs_Cone:
        a, b, _, _ = axis_parts(slope.surface.Cone().Position())
    else:
        return None
    # n.d is a cosine of u plus a constant: its extremes lie at the ends or where the cosine turns
    places = [low_u, high_u]
    if math.hypot(a, b) > LEVEL:
        turn = math.atan2(b, a)
        places += [turn + k * math.pi for k in range(-4, 5) if low_u < turn + k * math.pi < high_u]
    values = [slope(u, middle) for u in places]
    return min(values), max(values)
