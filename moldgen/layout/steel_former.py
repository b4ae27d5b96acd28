"""The real part as its steel sees it: which component forms a place of its surface, and distances through it."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.nearest import nearest_triangle
from moldgen.kernel.probe import Probe
from moldgen.layout.keep_out import OFF, in_front
from moldgen.layout.view import PartView
from moldgen.model.layout import Layout

ON_PIN: Final = 0.1
"""mm: a surface this close to a core pin is formed by it."""


@dataclass(frozen=True)
class Ends:
    """A dimension in the mold: its two ends (3,) [mm], and the outward normal of the plastic at each, (3,)."""

    one: np.ndarray
    other: np.ndarray
    one_normal: np.ndarray
    other_normal: np.ndarray

    @property
    def length(self) -> float:
        """Distance of the ends [mm]."""
        return float(np.linalg.norm(self.other - self.one))

    @property
    def middle(self) -> np.ndarray:
        """Between the ends, (3,) [mm]."""
        return np.asarray(0.5 * (self.one + self.other))


class FormedPart:
    """The part as it is molded, in the mold frame [mm], and what forms it."""

    def __init__(self, view: PartView, layout: Layout) -> None:
        self._view, self._pins = view, layout.core_pins
        held = [pin for slide in view.sides.slides for pin in slide.core_pins] if view.sides is not None else []
        self._held = {pin.front: pin.name for pin in held}
        self.body: Body = view.body if view.halves.part is None else Body(view.halves.part)
        self.mesh = self.body.mesh

    @cached_property
    def probe(self) -> Probe:
        """Rays against the part."""
        return Probe(self.mesh)

    @cached_property
    def by_side(self) -> np.ndarray:
        """Number of the side action that forms each triangle, -1 for none, (t,)."""
        found = np.full(len(self.mesh.centres), -1)
        for number, side in reversed(list(enumerate(self._view.halves.sides))):
            found[in_front(side, self.mesh.centres + OFF * self.mesh.facet_normals)] = number
        return found

    def former(self, point: np.ndarray, normal: np.ndarray) -> str:
        """Return the name of the component that forms a place (3,) of the surface with this outward normal (3,)."""
        before = (point + OFF * normal)[None, :]
        for side in self._view.halves.sides:
            if in_front(side, before)[0]:
                return self._held.get(side.name, side.name)
        triangle, _ = nearest_triangle(self._view.mesh, point)
        if bool(self._view.halves.cavity_side[self._view.mesh.face[triangle]]):
            return "cavity"
        for pin in self._pins:
            off = math.hypot(point[0] - pin.x, point[1] - pin.y) - pin.diameter / 2
            if off <= ON_PIN and pin.base_z - ON_PIN <= point[2] <= pin.top_z + ON_PIN:
                return pin.name
        return "core"

    def face_place(self, face: int) -> tuple[np.ndarray, np.ndarray]:
        """Return a point in the middle of a face and the outward normal there, (3,) each."""
        rows = np.flatnonzero(self.mesh.face == face)
        gap = np.linalg.norm(self.mesh.centres[rows] - self.body.face_centres[face], axis=1)
        row = rows[int(np.argmin(gap))]
        return self.mesh.centres[row], self.mesh.facet_normals[row]

    def inside(self, point: np.ndarray) -> bool:
        """Return whether a point (3,) lies in plastic: the first surface over it is met from inside."""
        for way in ((0.0, 0.0, 1.0), (0.6, 0.0, 0.8)):  # the second where the first only touches a wall
            _, triangle = self.probe.first(point[None, :], np.array(way))
            if triangle[0] < 0:
                return False
            rise = float(self.mesh.facet_normals[triangle[0]] @ np.array(way))
            if abs(rise) > 1e-3:
                return rise > 0.0
        return False

    def across(self, points: np.ndarray, ways: np.ndarray) -> list[Ends | None]:
        """Return what lies both ways of points along unit vectors (k, 3) each: None where one way meets nothing."""
        ahead, hit = self.probe.first(points, ways)
        back, met = self.probe.first(points, -ways)
        found: list[Ends | None] = []
        for i, (point, way) in enumerate(zip(points, ways, strict=True)):
            if not (np.isfinite(ahead[i]) and np.isfinite(back[i])):
                found.append(None)
                continue
            one, other = point - back[i] * way, point + ahead[i] * way
            found.append(Ends(one, other, self.mesh.facet_normals[met[i]], self.mesh.facet_normals[hit[i]]))
        return found
