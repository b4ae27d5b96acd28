"""The way of each body past each other one, while the tool opens in straight steps.

Of a pair only the motion of one body seen from the other counts. The space that a body passes through on a straight
stretch is itself and the prisms over the faces that look along the way: it is swept as a whole, from the place where
the stretch begins. So nothing can be jumped over between samples, however thin, and the steps together leave no gap:
where one ends the next begins, and the first begins with the closed tool, which has a proof of its own. Left out are
only faces whose shadow along the way is narrower than `SIGN_NOISE`: walls along the way, to the accuracy of meshes.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from moldgen.kernel.body import Meshed, TurnedMesh
from moldgen.kernel.meshsolid import MeshSolid
from moldgen.model.motion import Step, total_displacement
from moldgen.model.part import Vector
from moldgen.model.side_action import across
from moldgen.model.tool import Motion
from moldgen.proof.bodies import ProofBody
from moldgen.proof.overlap import NONE, NUMBERS, Depth, deepest
from moldgen.proof.recall import answered, question
from moldgen.release.kinds import face_kinds
from moldgen.release.sweep import OVERRUN, sweep_faces

STILL = 1e-9
"""mm: a motion shorter than this is none; ways are compared as exactly."""

UPRIGHT = 1e-12
"""Share of a way across the pull up to which it runs along the pull."""

STEEP = 1e-3
"""Sine to the way from which a triangle counts as looking along it, where the cost of a sweep is estimated."""

MUCH_CHEAPER, SMALL = 2.0, 200
"""Of a pair the body that moves in the mold is swept, unless the other has so many times fewer triangles to sweep, and
by so many. Our choice: results are the same, and the words are plainer."""


@dataclass(frozen=True)
class Stretch:
    """One straight stretch of the way of a group, seen from another: in which steps, from where, and how far [mm]."""

    steps: tuple[str, ...]
    start: np.ndarray
    way: np.ndarray

    @property
    def length(self) -> float:
        """Length [mm]."""
        return float(np.linalg.norm(self.way))

    def covers(self, other: Stretch) -> bool:
        """True when the other stretch lies wholly on this one, either way along."""
        return all(self._holds(point) for point in (other.start, other.start + other.way))

    def _holds(self, point: np.ndarray) -> bool:
        along = float((point - self.start) @ self.way) / self.length
        off = point - self.start - along / self.length * self.way
        return bool(-STILL <= along <= self.length + STILL and np.linalg.norm(off) <= STILL)


def stretches(steps: Sequence[Step], mover: str, other: str) -> list[Stretch]:
    """Return the way of one group seen from another: steps that run on straight are one stretch, ways back are none."""
    found: list[Stretch] = []
    at = np.zeros(3)
    for step in steps:
        way = np.asarray(step.displacement(mover), float) - np.asarray(step.displacement(other), float)
        if np.linalg.norm(way) <= STILL:
            continue
        last = found[-1] if found else None
        if last is not None and float(last.way @ way) >= (1.0 - UPRIGHT) * last.length * float(np.linalg.norm(way)):
            found[-1] = Stretch((*last.steps, step.name), last.start, last.way + way)
        else:
            found.append(Stretch((step.name,), at, way))
        at = at + way
    return [s for i, s in enumerate(found) if not any(earlier.covers(s) for earlier in found[:i])]


class Meeting(NamedTuple):
    """The deepest overlap of a body on its way with another: depth [mm], and bodies, place and step in words."""

    depth_mm: float
    told: str


class MovingTool:
    """Bodies and the steps in which they move; sweeps are made once for each body and way.

    Whatever the steps leave closed is opened at their end: the cavity half up clear of everything, and the part up
    clear of everything but the cavity half. So a short way cannot hide that the part is held.
    """

    def __init__(self, bodies: Sequence[ProofBody], steps: Sequence[Step]) -> None:
        self.bodies, self.steps = tuple(bodies), tuple(steps)
        self._sweeper = _Sweeper()
        self._opened = self._clear(Motion.CAVITY_HALF, self.steps, ())
        self._freed = self._clear(Motion.PART, self._opened, (Motion.CAVITY_HALF, *self._riders(self._opened)))

    def group(self, name: str) -> list[ProofBody]:
        """Return the bodies that move with a group, in order."""
        return [b for b in self.bodies if b.motion == name]

    def travel(self, name: str) -> np.ndarray:
        """Return how far the steps move a group, seen from the core half, (3,) [mm]."""
        return np.subtract(total_displacement(self.steps, name), total_displacement(self.steps, Motion.CORE_HALF))

    def moves(self, name: str) -> bool:
        """True when any step moves a group, seen from the core half."""
        return bool(stretches(self.steps, name, Motion.CORE_HALF))

    def worst(self, pairs: Sequence[tuple[ProofBody, ProofBody]]) -> Meeting:
        """Return the deepest overlap of any of the pairs on its way, depth 0 if there is none.

        Raises
        ------
        KernelError : the mesh of a body that another comes near does not close
        """
        worst = Meeting(0.0, "")
        for one, other in pairs:
            steps = self._opened if Motion.CAVITY_HALF in (one.motion, other.motion) else self._freed
            for stretch in stretches(steps, one.motion, other.motion):
                met = self._meeting(one, other, stretch)
                if met.depth_mm > worst.depth_mm:
                    worst = met
        return worst

    def _meeting(self, one: ProofBody, other: ProofBody, stretch: Stretch) -> Meeting:
        if _apart(one, other, stretch):
            return Meeting(0.0, "")
        if self._rather_other(one, other, stretch):
            one, other, stretch = other, one, Stretch(stretch.steps, -stretch.start, -stretch.way)
        ways = (*stretch.start, *stretch.way)
        asked = question("overlap on the way", [one.subject, other.subject], ways, NUMBERS)
        found = Depth.of(answered(asked, lambda: self._overlap(one, other, stretch).numbers))
        return Meeting(
            found.depth_mm, f"{one.name} against {other.name} {found.told}, when {' and '.join(stretch.steps)}"
        )

    def _overlap(self, one: ProofBody, other: ProofBody, stretch: Stretch) -> Depth:
        """Return the deepest overlap of the space that a body passes through with another. No more than these enter."""
        swept = self._sweeper.swept(one, stretch, other)
        bounds = np.asarray(swept.bounding_box()) if swept.num_tri() else np.zeros(6)
        low, high = other.body.box
        if not swept.num_tri() or (low > bounds[3:]).any() or (high < bounds[:3]).any():
            return NONE
        return deepest(swept, one.body.mesh, other, stretch.start)

    def _rather_other(self, one: ProofBody, other: ProofBody, stretch: Stretch) -> bool:
        """True when the second of a pair is to be swept: it moves and the first does not, or it is much cheaper."""
        cost, other_cost = self._sweeper.cost(one, stretch.way), self._sweeper.cost(other, -stretch.way)
        if self._stands(one, stretch) and not self._stands(other, stretch):
            return not MUCH_CHEAPER * cost + SMALL < other_cost
        return MUCH_CHEAPER * other_cost + SMALL < cost

    def _stands(self, body: ProofBody, stretch: Stretch) -> bool:
        moves = [step.displacement(body.motion) for step in self._freed if step.name in stretch.steps]
        return not np.any(moves)

    def _clear(self, name: str, steps: tuple[Step, ...], apart_from: tuple[str, ...]) -> tuple[Step, ...]:
        """Return the steps, and one more that lifts a group clear of all others if they do not.

        Side actions that the cavity half has carried up with it stay with it.
        """
        riders = self._riders(steps) if name == Motion.CAVITY_HALF else ()
        along = (name, *riders)
        lows = [b.body.box[0][2] + total_displacement(steps, g)[2] for g in along for b in self.group(g)]
        others = [b for b in self.bodies if b.motion not in (*along, *apart_from)]
        highs = [b.body.box[1][2] + total_displacement(steps, b.motion)[2] for b in others]
        if not lows or not highs or not max(highs) > min(lows):
            return steps
        lift = (0.0, 0.0, float(max(highs) - min(lows)))
        return (*steps, Step(f"the {name} is lifted clear", tuple((group, lift) for group in along)))

    def _riders(self, steps: tuple[Step, ...]) -> tuple[str, ...]:
        """Return the side actions that have risen exactly as far as the cavity half."""
        rise = total_displacement(steps, Motion.CAVITY_HALF)[2]
        groups = sorted({str(b.motion) for b in self.bodies} - {str(m) for m in Motion})
        return tuple(g for g in groups if rise > STILL and abs(total_displacement(steps, g)[2] - rise) <= STILL)


def _apart(one: ProofBody, other: ProofBody, stretch: Stretch) -> bool:
    """True when the box of a body, on its whole way, does not meet that of the other."""
    low, high = (corner + stretch.start for corner in one.body.box)
    other_low, other_high = other.body.box
    low, high = np.minimum(low, low + stretch.way), np.maximum(high, high + stretch.way)
    return bool((low > other_high).any() or (other_low > high).any())


class _Sweeper:
    """Sweeps bodies along ways, each once."""

    def __init__(self) -> None:
        self._swept: dict[tuple[ProofBody, Vector, float | None], MeshSolid] = {}
        self._reach: dict[tuple[ProofBody, Vector], tuple[float, float]] = {}
        self._cost: dict[tuple[ProofBody, Vector], int] = {}
        self._turned: dict[tuple[ProofBody, Vector], TurnedMesh] = {}

    def cost(self, body: ProofBody, way: np.ndarray) -> int:
        """Return how many triangles of a body look along a way."""
        key = (body, _direction(way))
        if key not in self._cost:
            normals = body.body.mesh.normals
            self._cost[key] = int((normals @ np.asarray(key[1]) > STEEP * np.linalg.norm(normals, axis=1)).sum())
        return self._cost[key]

    def swept(self, body: ProofBody, stretch: Stretch, other: ProofBody) -> MeshSolid:
        """Return the space that the faces of a body pass through, in the frame in which `other` stands.

        Where the other body ends before the sweep does, the faces are carried on to a common level behind it: that
        takes a fraction of the time and is the same for all such bodies.
        """
        body.mesh  # noqa: B018  raises for an open mesh: a missing face would sweep nothing, and hide what it meets
        direction = _direction(stretch.way)
        upright = float(np.hypot(direction[0], direction[1])) <= UPRIGHT
        low, high = self._heights(body, direction)
        reach = self._heights(other, direction)[1] - float(stretch.start @ np.asarray(direction))
        clear = reach <= min(low + stretch.length, high + OVERRUN)
        length = None if clear else round(stretch.length, 9)
        key = (body, direction, length)
        if key not in self._swept:
            up = not upright or direction[2] > 0.0
            seen: Meshed = body.body if upright else self._along(body, direction)
            self._swept[key] = sweep_faces(seen, face_kinds(seen), up, length)
            self._swept[key].num_tri()  # the union is made now: moved before, it would be made again at every place
        if upright and not stretch.start.any():
            return self._swept[key]
        turn = np.eye(3) if upright else across(direction).T
        placed: MeshSolid = self._swept[key].transform(np.column_stack([turn, stretch.start]))
        return placed

    def _heights(self, body: ProofBody, direction: Vector) -> tuple[float, float]:
        """Return where a body begins and ends along a direction [mm]."""
        key = (body, direction)
        if key not in self._reach:
            heights = body.body.mesh.vertices @ np.asarray(direction)
            self._reach[key] = float(heights.min()), float(heights.max())
        return self._reach[key]

    def _along(self, body: ProofBody, direction: Vector) -> TurnedMesh:
        key = (body, direction)
        if key not in self._turned:
            self._turned[key] = TurnedMesh(body.body, across(direction))
        return self._turned[key]


def _direction(way: np.ndarray) -> Vector:
    """Return the unit vector of a way, rounded: ways that should be alike then are."""
    x, y, z = (float(v) for v in np.round(way / np.linalg.norm(way), 12) + 0.0)
    return (x, y, z)
