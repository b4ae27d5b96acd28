"""The round cores in the part's holes: coaxial steps of cylinders and cones that the core half forms."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Final

import numpy as np

from moldgen.kernel.round_faces import RoundFace, hollow_round_faces
from moldgen.layout.view import PartView

COAXIAL: Final = 0.02
"""mm: axes closer than this are one."""

WHOLE_TURN: Final = 0.97
"""Share of the full circle that the faces of a round core must cover at every height."""

JOINED: Final = 0.5
"""Gap along the axis, as a share of the radius, over which two steps are one core: room for a rounding or chamfer."""

RING: Final = 24
"""Directions in which the surroundings of a core are felt."""


@dataclass(frozen=True)
class RoundCore:
    """One round core [mm]. base_z : lower end; top_z : tip; largest, smallest : diameters; wall : of the part round it.

    blind : the hole has a floor over the tip; closed : round all the way, without windows or slots
    """

    x: float
    y: float
    base_z: float
    top_z: float
    largest: float
    smallest: float
    wall: float
    blind: bool
    closed: bool
    steps: tuple[RoundFace, ...]

    @property
    def length(self) -> float:
        """Height of the core [mm]."""
        return self.top_z - self.base_z

    @property
    def slenderness(self) -> float:
        """Height over the smallest diameter."""
        return self.length / self.smallest


def find_round_cores(view: PartView, largest: float) -> list[RoundCore]:
    """Return the round cores of the core half whose diameter is at most `largest` [mm], by place.

    Of a stepped core whose foot is thicker, the slender upper part is taken.
    """
    cavity_side = np.asarray(view.halves.cavity_side, bool)
    faces = [f for f in hollow_round_faces(view.body) if not cavity_side[f.face]]
    thin = [f for f in faces if 2 * max(f.radius_low, f.radius_high) <= largest + 1e-9]
    found = []
    for axis in coaxial(thin):
        for chain in chains(axis):
            core = _core(view, chain)
            if core is not None:
                found.append(core)
    return sorted(found, key=lambda c: (round(c.x, 3), round(c.y, 3), c.base_z))


def coaxial(faces: list[RoundFace]) -> list[list[RoundFace]]:
    """Return the faces in groups that share an axis, by place."""
    groups: list[list[RoundFace]] = []
    for face in sorted(faces, key=lambda f: (f.x, f.y, f.z_low, f.face)):
        home = next((g for g in groups if math.hypot(g[0].x - face.x, g[0].y - face.y) < COAXIAL), None)
        if home is None:
            groups.append([face])
        else:
            home.append(face)
    return groups


def chains(faces: list[RoundFace]) -> list[list[RoundFace]]:
    """Return coaxial faces in groups, divided where there is a gap along the axis."""
    found: list[list[RoundFace]] = []
    top = -math.inf
    for face in sorted(faces, key=lambda f: (f.z_low, f.face)):
        gap = JOINED * max(face.radius_low, face.radius_high)
        if not found or face.z_low > top + gap:
            found.append([])
            top = -math.inf
        found[-1].append(face)
        top = max(top, face.z_high)
    return found


def _core(view: PartView, steps: list[RoundFace]) -> RoundCore | None:
    """Return the core of a chain, None when steel cannot reach it from below (the hole is closed there)."""
    x, y = steps[0].x, steps[0].y
    base, top = min(f.z_low for f in steps), max(f.z_high for f in steps)
    radii = [r for f in steps for r in (f.radius_low, f.radius_high)]
    tip = min(steps, key=lambda f: (-f.z_high, f.face))
    turn = 2 * np.pi * np.arange(RING) / RING
    ring = np.column_stack([np.cos(turn), np.sin(turn)])
    reach = tip.radius_high * np.array([0.0, 0.5, 0.9])
    points = np.array([x, y]) + (reach[:, None, None] * ring).reshape(-1, 2)
    height, _ = view.underside(points)
    if (height < top - 0.1 * (top - base) - 0.05).any():
        return None
    blind = bool(np.isfinite(height[0]))
    own = np.isin(view.mesh.face, [f.face for f in steps])
    wall = float(np.average(view.triangle_walls[own], weights=view.body.triangle_areas[own]))
    return RoundCore(
        x=x,
        y=y,
        base_z=base,
        top_z=max(top, float(height[np.isfinite(height)].max())) if blind else top,
        largest=2 * max(radii),
        smallest=2 * max(min(max(f.radius_low, f.radius_high) for f in steps), 1e-3),
        wall=wall,
        blind=blind,
        closed=_closed(steps),
        steps=tuple(steps),
    )


def _closed(steps: list[RoundFace]) -> bool:
    """True when at every height the faces go round the whole circle."""
    ends = sorted({z for f in steps for z in (f.z_low, f.z_high)})
    for low, high in pairwise(ends):
        middle = 0.5 * (low + high)
        turn = sum(f.turn for f in steps if f.z_low <= middle <= f.z_high)
        if high - low > COAXIAL and 0.0 < turn < WHOLE_TURN * 2 * math.pi:
            return False
    return True


def underside_ring(view: PartView, core: RoundCore, radius: float) -> np.ndarray:
    """Return the height of the part's underside on a circle about the core, (24,) [mm]; inf where there is no part."""
    turn = 2 * np.pi * np.arange(RING) / RING
    ring = np.column_stack([np.cos(turn), np.sin(turn)])
    return view.underside(np.array([core.x, core.y]) + radius * ring)[0]


def with_base(core: RoundCore, base_z: float) -> RoundCore:
    """Return the core with its foot at another height [mm]."""
    return replace(core, base_z=base_z)
