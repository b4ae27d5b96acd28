"""Lifters: steel that moves sideways under an internal undercut while it rises with the part. Mold frame, mm.

Seen from the part, a lifter moves level along its release direction, over what the ejection stroke gives it, and then
the part is lifted off. Seen from the core, it slides along its own inclined axis in a straight channel.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from moldgen.kernel.mesh_prism import (
    Region,
    bounds,
    box_of,
    grown,
    hull,
    level_section,
    prism,
    rectangle,
    shadow,
    shifted,
    turned,
)
from moldgen.kernel.meshsolid import MeshSolid, piece_mesh, thick_pieces, union
from moldgen.kernel.tracer import Tracer
from moldgen.model.part import Vector
from moldgen.model.side_action import Front, SideKind, across
from moldgen.release.side_choice import as_vector
from moldgen.release.side_outline import Outline, carved_from, is_free, polygons_of
from moldgen.release.side_space import SideSpace, View
from moldgen.release.sweep import EDGE_ON, PrismMaker

LEAST_ANGLE, MOST_ANGLE, ANGLE_STEP = 3.0, 12.0, 0.5
"""Angle [deg] between a lifter and the pull: common practice; finer steps than half a degree are not ground."""

CLEARANCE = 0.5
"""How far [mm] a lifter moves on when its undercut is free: our choice."""

SPARE = 0.5
"""Free way [mm] before plastic, beyond its travel, that a lifter is given where possible: our choice."""

BACKS = (4.0, 2.5, 1.5, 0.8)
"""Thickness [mm] of the lifter before the undercut, along its release; thicker bends less (our choice)."""

LANDS = (0.5, 0.2, 0.06, 0.0)
"""Land [mm] beside the undercut, and into the wall behind it."""

WAYS, STRAY, BLOCKED = 40, 0.02, 0.05
"""Ways that rays are asked for, and the shares of rays that may stray, or meet plastic, before it is tried in full."""

MOMENTS = 9
"""Moments of the ejection stroke at which two lifters are held against each other; both move evenly and straight."""

TOP_STEP, HIGHEST = 0.1, 60.0
"""Steps [mm] in which plastic is looked for over the head of a lifter, and how far."""

BARE = 0.002
"""Area [mm^2] of a lifter's head that plastic need not cover."""

REACHED = 0.1
"""A piece of a lifter that ends this near [mm] to its foot is held by it."""


@dataclass(frozen=True)
class Lifted:
    """A lifter: its view looks down along its axis.

    way : level motion, (3,) [mm], over the whole ejection stroke; stroke : that stroke [mm]
    """

    view: View
    outline: Outline
    near: float
    far: float
    clear: float
    travel: float
    way: np.ndarray
    steel: MeshSolid
    stroke: float

    def front(self, pieces: tuple[int, ...], given: int = -1) -> Front:
        """Return the lifter as the model tells it."""
        length = float(np.linalg.norm(self.way))
        return Front(
            kind=SideKind.LIFTER,
            axis=self.view.direction,
            release=as_vector(np.round(self.way / length, 12) + 0.0),
            outline=polygons_of(self.outline),
            near=self.near,
            far=self.far,
            clear=self.clear,
            travel=self.travel,
            pieces=pieces,
            rung=self.outline.rung,
            given=given,
            stroke=self.stroke,
        )


@dataclass(frozen=True)
class Lifting:
    """What lifters of one part share: its mesh eroded, and how far the ejectors push [mm]."""

    space: SideSpace
    stroke: float
    tracer: Tracer

    @property
    def most(self) -> float:
        """The farthest level way [mm] that the stroke gives."""
        return self.stroke * math.tan(math.radians(MOST_ANGLE))

    def need(self, points: np.ndarray, release: np.ndarray) -> float | None:
        """Return the level way [mm] after which points (k, 3) of a space have no plastic below them, None if
        none does or plastic stands in that way.

        By rays: a proposal, of the ways that the stroke allows.
        """
        way = self.wanted(points, release)
        return way if way is not None and self.gap(points, release) >= way + CLEARANCE else None

    def wanted(self, points: np.ndarray, release: np.ndarray) -> float | None:
        """Return the same way [mm], whatever stands in it."""
        most = self.most - CLEARANCE
        for way in np.linspace(0.0, most, WAYS + 1)[1:]:
            if self.tracer.blocked(points + way * release, (0.0, 0.0, -1.0)).mean() < STRAY:
                return float(way)
        return None

    def gap(self, points: np.ndarray, release: np.ndarray) -> float:
        """Return how far [mm] points can move a level way before they meet plastic, but for a share of `BLOCKED`."""
        gaps = self._before(points, release)
        return float(np.sort(gaps)[int(BLOCKED * len(gaps))])

    def stop(self, points: np.ndarray, release: np.ndarray) -> Vector:
        """Return where the plastic is that ends the gap along a level way (mold frame)."""
        gaps = self._before(points, release)
        nearest = int(np.argsort(gaps, kind="stable")[int(BLOCKED * len(gaps))])
        return as_vector(points[nearest] + gaps[nearest] * release)

    def _before(self, points: np.ndarray, release: np.ndarray) -> np.ndarray:
        """Return the distance to plastic along a way for each point, infinite where there is none, (k,) [mm]."""
        hit = self.tracer.first_triangle(points, release)
        met = hit >= 0
        corners = self.space.corners[hit[met]]
        normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        run = normal @ release
        gaps = np.full(len(points), np.inf)
        gaps[met] = ((corners[:, 0] - points[met]) * normal).sum(axis=1) / np.where(np.abs(run) < 1e-12, 1e-12, run)
        return gaps

    def lifter(self, space: MeshSolid, release: np.ndarray, least: float) -> Lifted | str:
        """Return a lifter that lets a space out along a level direction, or why there is none.

        least : the way [mm] that it must move
        """
        need_way = least + CLEARANCE
        angle = math.degrees(math.atan(need_way / self.stroke))
        angle = max(LEAST_ANGLE, ANGLE_STEP * math.ceil(angle / ANGLE_STEP - 1e-9))
        if angle > MOST_ANGLE:
            most = self.stroke * math.tan(math.radians(MOST_ANGLE))
            return f"needs {need_way:.1f} mm of travel, a stroke of {self.stroke:.1f} mm gives {most:.1f} mm"
        way = self.stroke * math.tan(math.radians(angle))
        lean = math.radians(angle)
        axis = -(math.sin(lean) * release + math.cos(lean) * np.array([0.0, 0.0, 1.0]))
        view = View(self.space, as_vector(np.round(axis / np.linalg.norm(axis), 12) + 0.0))
        for spare in (SPARE, 0.0):
            found = _Trial(
                self.space, view, space, way * release, way + spare, need_way - CLEARANCE, self.stroke
            ).best()
            if isinstance(found, Lifted):
                return found
        return found


@dataclass(frozen=True)
class _Trial:
    """One lifter axis for one space."""

    space: SideSpace
    view: View
    wanted: MeshSolid
    way: np.ndarray
    free: float
    travel: float
    stroke: float

    def best(self) -> Lifted | str:
        """Return the lifter of the best outline that works."""
        seen = self.view.seen(self.wanted)
        near, far = float(box_of(seen)[0][2]), self.view.far
        need = shadow(seen)
        release = self.way / np.linalg.norm(self.way)
        toward = (self.view.rows @ release)[:2]
        toward = toward / np.linalg.norm(toward)
        forbidden = self._forbidden(need, toward, near)
        if not is_free(grown(need, -0.05), forbidden):
            return "plastic stands in its way, or under it"
        shapes = [*_shapes(need, toward), *_carved_shapes(need, toward, forbidden)]
        why = "no outline whose steel holds together"
        for outline in shapes:
            if not is_free(outline.shape, forbidden):
                continue
            top = self._top(outline.shape, near)
            if top < near and not is_free(outline.shape, self._forbidden(need, toward, top)):
                continue
            made = self._settled(seen, outline, top, far)
            if made is not None:
                return made
        return why

    def _top(self, shape: Region, near: float) -> float:
        """Return where the head of a lifter ends: inside the plastic over it, so that no steel of the core stands in
        its way up; at `near` where no plastic covers it.
        """
        highest = float(box_of(self.view.part)[0][2])
        for level in np.arange(near, max(highest, near - HIGHEST), -TOP_STEP):
            if (shape - level_section(self.view.part, float(level))).area() < BARE:
                return float(level)
        return near

    def _settled(self, seen: MeshSolid, outline: Outline, near: float, far: float) -> Lifted | None:
        body = prism(outline.shape, near, far)
        steel = body - self.view.part
        if thick_pieces(seen - prism(outline.shape, near - 0.02, far)):
            return None
        if any(float(box_of(p)[1][2]) < far - REACHED for p in thick_pieces(steel)):
            return None
        plastic = self.view.part ^ body
        clear = float(box_of(plastic)[1][2]) if plastic.num_tri() else near
        return Lifted(self.view, outline, near, far, clear, self.travel, self.way, self.view.back(steel), self.stroke)

    def _forbidden(self, need: Region, toward: np.ndarray, near: float) -> Region:
        """Return where steel of the widest outline would meet plastic on its way, seen along the axis."""
        low, high = bounds(need)
        reach = LANDS[0] + 0.1
        low, high = low - reach, high + reach
        moved = BACKS[0] * toward
        low, high = np.minimum(low, low + moved), np.maximum(high, high + moved)
        steel = self.view.back(prism(rectangle(low, high), near, self.view.far) - self.view.part)
        bad = thick_pieces(steel ^ self._before(steel))
        lifted = steel.translate(tuple(self.way))
        bad += [b.translate(tuple(-self.way)) for b in thick_pieces(lifted ^ self._above(lifted))]
        found = shadow(self.view.seen(union(bad))) if bad else rectangle(low, low)
        return found

    def _before(self, steel: MeshSolid) -> MeshSolid:
        """Return the space from which the level motion runs into plastic."""
        release = self.way / np.linalg.norm(self.way)
        return _swept(self._near(steel, self.free), as_vector(-release), self.free)

    def _above(self, steel: MeshSolid) -> MeshSolid:
        """Return the space from which plastic stands below: the part could not be lifted off."""
        return _swept(self._near(steel, 0.0), (0.0, 0.0, 1.0), None)

    def _near(self, steel: MeshSolid, reach: float) -> MeshSolid:
        low, high = box_of(steel)
        low, high = low - reach - 0.1, high + reach + 0.1
        low[2] = min(low[2], self.space.corners[:, :, 2].min() - 1.0)
        ground = prism(rectangle(low[:2], high[:2]), float(low[2]), float(high[2]))
        return self.space.shrunk ^ ground


def collide(one: Lifted, other: Lifted) -> bool:
    """Return whether two lifters that move together meet, tried at `MOMENTS` moments of the stroke."""
    for share in np.linspace(0.0, 1.0, MOMENTS):
        moved = one.steel.translate(tuple(share * one.way)), other.steel.translate(tuple(share * other.way))
        if thick_pieces(moved[0] ^ moved[1]):
            return True
    return False


def _swept(plastic: MeshSolid, way: tuple[float, float, float], length: float | None) -> MeshSolid:
    """Return the faces of a solid that look along a way, carried along it by a length or clear of everything."""
    if not plastic.num_tri():
        return MeshSolid()
    rows = across(way)
    mesh = piece_mesh(turned(plastic, rows))
    corners = mesh.vertices[mesh.triangles]
    facet = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    chosen = np.flatnonzero(facet[:, 2] > np.maximum(EDGE_ON, 1e-5) * np.linalg.norm(facet, axis=1))
    far = float(mesh.vertices[:, 2].max()) + 50.0
    maker = PrismMaker(mesh.vertices, mesh.triangles, mesh.face, far, 0.5 * np.abs(facet[:, 2]), length)
    return turned(union(maker.prisms(chosen)), rows.T)


def _shapes(need: Region, toward: np.ndarray) -> Iterator[Outline]:
    """Yield outlines: rectangles and hulls with a land, thick before the undercut."""
    low, high = bounds(need)
    for back in BACKS:
        for land in LANDS:
            start, end = low - land, high + land
            ahead = (back - land) * toward
            box = rectangle(np.minimum(start, start + ahead), np.maximum(end, end + ahead))
            yield Outline(box, f"lifter, rectangle {back:g} mm thick, land {land:g} mm")
            run = hull(need + shifted(need, back * toward))
            yield Outline(grown(run, land, 0.02), f"lifter, hull {back:g} mm thick, land {land:g} mm")


def _carved_shapes(need: Region, toward: np.ndarray, forbidden: Region) -> Iterator[Outline]:
    for back in BACKS:
        run = hull(need + shifted(need, back * toward))
        shape = carved_from(grown(run, LANDS[1]), need, forbidden)
        if not shape.is_empty():
            yield Outline(shape, f"lifter, carved, {back:g} mm thick")
