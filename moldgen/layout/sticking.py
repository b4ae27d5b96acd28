"""Where the part sticks to the core, and how hard: shrink onto closed cores, grip of open walls, vacuum."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.catalog import Resin
from moldgen.finding import Finding, Notes, Severity
from moldgen.layout.sections import PHASE, Sections, cut_sections
from moldgen.layout.view import PartView
from moldgen.quantity import Provenance, Quantity
from moldgen.rules.ejection import draft_factor_menges, vacuum_force
from moldgen.rules.practice import VACUUM_RELIEF_AREA

MOSTLY_CORE: Final = 0.5
"""A hole of a section belongs to the core when the core half forms more than this share of its rim."""

SHOWN_CORES: Final = 6
"""Cores that get a line of their own in the calculation sheet, largest force first."""

VENT_PLACES: Final = 6
"""Places in each hole of a section from which a way out along the pull is looked for."""

SHORTEST_WALL: Final = 0.2
"""mm: lower open walls are not counted."""

_GRIP: Final = (
    "shrink fit of a thin wall on its core, Menges, How to Make Injection Molds, ch. 12, from memory: 2 pi for a round "
    "core, 8 for a box; a closed end divides by 1 - poisson / 2"
)
_OPEN: Final = (
    "the floor between open walls, held by them, cannot contract: at most modulus * strain * wall per length, on walls "
    "that look to the middle of the part; statics, an upper bound"
)


@dataclass(frozen=True)
class Core:
    """One core that the part shrinks onto [mm, N].

    x, y : middle of its foot; z_low, z_high : its extent; area : of its foot; wall : mean wall round it
    draft : mean [deg]; blind : no air can enter through it; friction, vacuum : force to pull the part off
    """

    x: float
    y: float
    z_low: float
    z_high: float
    area: float
    wall: float
    draft: float
    blind: bool
    friction: float
    vacuum: float


@dataclass(frozen=True)
class Sticking:
    """How the part sticks to the core.

    places : (n, 2) in plan [mm]; forces : (n,) what holds the part there [N]
    force : all of it [N]; centre : where one push would lift the part without tilting it, (2,) [mm]
    """

    cores: tuple[Core, ...]
    places: np.ndarray
    forces: np.ndarray
    force: float
    centre: np.ndarray


@dataclass(frozen=True)
class _Side:
    """The half that is asked about: triangles that it forms (t,), and the sign of z in which its drafted walls face."""

    formed: np.ndarray
    sign: float

    def draft(self, view: PartView, triangle: np.ndarray) -> np.ndarray:
        """Return the draft of triangles [deg], 0 for those that lean the other way."""
        lean = self.sign * view.normals[triangle, 2]
        return np.asarray(np.minimum(np.degrees(np.arcsin(np.clip(lean, 0.0, 1.0))), 89.0))


@dataclass(frozen=True)
class _Stiffness:
    """Friction, modulus * strain [MPa] and Poisson's ratio of the resin at ejection."""

    friction: float
    tension: float
    poisson: float


def find_sticking(view: PartView, resin: Resin) -> tuple[Sticking, Notes]:
    """Return where and how hard the part sticks to the core half.

    Each section of the part gives closed rings of plastic round cores; they press as a shrunk sleeve does (source:
    Menges, from memory, see `moldgen.rules.ejection`). Open walls are pressed by the floor between them. Blind cores
    hold the part by vacuum besides.
    """
    strain = _strain(resin)
    stiff = _stiffness(resin, strain)
    half = _Side(view.core_side, -1.0)
    cut = cut_sections(view, half.formed)
    rings = _Rings.of(view, cut, half)
    closed = rings.forces(cut, stiff)
    cores = tuple(_core(cut, rings, root, closed) for root in rings.roots)
    places, forces = [cut.middles], [closed[cut.loop] * cut.lengths / np.maximum(cut.loop_lengths, 1e-12)[cut.loop]]
    open_force = _open_walls(view, cut, rings, stiff, half)
    forces[0] = forces[0] + open_force
    for root, core in zip(rings.roots, cores, strict=True):
        if core.vacuum > 0.0:
            ceiling, share = _ceiling(view, cut, root)
            places.append(ceiling)
            forces.append(core.vacuum * share)
    place, force = np.vstack(places), np.concatenate(forces)
    keep = force > 0.0
    place, force = place[keep], force[keep]
    total = float(force.sum())
    centre = (place * force[:, None]).sum(axis=0) / total if total > 0.0 else view.middle
    found = Sticking(cores, place, force, total, centre)
    return found, _notes(view, resin, found, float(open_force.sum()), strain)


def hold_of_cavity(view: PartView, resin: Resin) -> float:
    """Return the friction with which the part holds to the cavity half, by the same rules, without vacuum [N]."""
    stiff = _stiffness(resin, _strain(resin))
    cavity = _Side(~view.core_side, 1.0)
    cut = cut_sections(view, cavity.formed)
    rings = _Rings.of(view, cut, cavity)
    return float(rings.forces(cut, stiff).sum() + _open_walls(view, cut, rings, stiff, cavity).sum())


def _strain(resin: Resin) -> float:
    return min(resin.shrink_along.low, resin.shrink_across.low) / 100.0


def _stiffness(resin: Resin, strain: float) -> _Stiffness:
    return _Stiffness(resin.friction.mean, resin.ejection_modulus.mean * strain, resin.poisson)


@dataclass(frozen=True)
class _Rings:
    """Loops that enclose a core, and the stacks that they form. root : (l,) foot of each one's stack, else -1."""

    root: np.ndarray
    roots: list[int]
    blind: np.ndarray
    wall: np.ndarray
    draft: np.ndarray

    @classmethod
    def of(cls, view: PartView, cut: Sections, side: _Side) -> _Rings:
        """Find the rings of one half in the sections, foot first."""
        share = cut.mean(side.formed[cut.triangle].astype(float))
        hole = cut.areas < 0.0
        ring = hole & (share > MOSTLY_CORE)
        root = np.full(cut.loops, -1)
        anchor = _anchors(cut)
        below: np.ndarray = np.zeros(0, dtype=int)
        upward = range(len(cut.heights))
        for layer in upward if side.sign < 0.0 else reversed(upward):
            own = np.flatnonzero(ring & (cut.loop_layers == layer))
            before = int(layer + side.sign)
            held = cut.inside(anchor[own], before, below)[:, below] if len(below) else np.zeros((len(own), 0), bool)
            for row, loop in enumerate(own):
                parent = below[held[row]]
                root[loop] = root[parent[0]] if len(parent) else loop
            below = own
        roots = [int(r) for r in np.unique(root[root >= 0])]
        vents = _through_places(view, cut, np.flatnonzero(hole))
        blind = np.zeros(cut.loops, dtype=bool)
        for foot in roots:
            blind[foot] = not cut.inside(vents, int(cut.loop_layers[foot]), np.array([foot]))[:, foot].any()
        wall = cut.mean(view.thickness(_on_segments(cut), view.normals[cut.triangle]))
        draft = cut.mean(side.draft(view, cut.triangle))
        return cls(root, roots, blind, wall, draft)

    def forces(self, cut: Sections, stiff: _Stiffness) -> np.ndarray:
        """Return the friction of each loop over the height that it stands for, (l,) [N]."""
        radius = 2.0 * np.abs(cut.areas) / np.maximum(cut.loop_lengths, 1e-12)
        # An infinitely thick wall presses no harder than one of r / (1 + poisson): closed form for a hole in a solid.
        wall = np.minimum(self.wall, radius / (1.0 + stiff.poisson))
        ease = np.array([draft_factor_menges(stiff.friction, float(d)) for d in self.draft])
        end = np.where(self.blind[np.maximum(self.root, 0)], 1.0 / (1.0 - stiff.poisson / 2.0), 1.0)
        force = stiff.friction * stiff.tension * wall * cut.grip * ease * end * cut.step
        return np.asarray(np.where(self.root >= 0, force, 0.0))


def _anchors(cut: Sections) -> np.ndarray:
    """Return one point just inside the hole that each loop encloses, (l, 2)."""
    inset = np.minimum(0.5 * np.abs(cut.areas) / np.maximum(cut.loop_lengths, 1e-12), 0.3)
    anchor = np.zeros((cut.loops, 2))
    anchor[cut.loop[::-1]] = (cut.middles + cut.outward * inset[cut.loop][:, None])[::-1]
    return anchor


def _on_segments(cut: Sections) -> np.ndarray:
    return np.column_stack([cut.middles, cut.heights[cut.layer]]) if len(cut.loop) else np.zeros((0, 3))


def _through_places(view: PartView, cut: Sections, holes: np.ndarray) -> np.ndarray:
    """Return plan points inside holes of the sections where a line along the pull meets no plastic, (p, 2)."""
    if len(holes) == 0:
        return np.zeros((0, 2))
    middle = np.column_stack([cut.mean(cut.middles[:, k]) for k in (0, 1)])
    reach = np.abs(cut.areas) / np.maximum(cut.loop_lengths, 1e-12)
    own = np.flatnonzero(np.isin(cut.loop, holes))
    own = own[np.argsort(cut.loop[own], kind="stable")]
    turn = np.arange(len(own)) - np.searchsorted(cut.loop[own], cut.loop[own])
    own = own[turn % np.maximum(np.bincount(cut.loop[own])[cut.loop[own]] // VENT_PLACES, 1) == 0]
    beside = cut.middles[own] + (cut.outward[own] * np.minimum(reach[cut.loop[own]], 1.0)[:, None])
    points = np.vstack([middle[holes], beside])
    loops, layers = np.r_[holes, cut.loop[own]], np.r_[cut.loop_layers[holes], cut.layer[own]]
    heights, _ = view.underside(points)
    points, loops, layers = (a[~np.isfinite(heights)] for a in (points, loops, layers))
    within = np.zeros(len(points), dtype=bool)
    for layer in np.unique(layers):
        here = np.flatnonzero(layers == layer)
        within[here] = cut.inside(points[here], int(layer), loops[here])[np.arange(len(here)), loops[here]]
    return np.asarray(points[within])


def _core(cut: Sections, rings: _Rings, root: int, closed: np.ndarray) -> Core:
    stack = np.flatnonzero(rings.root == root)
    own = cut.loop == root
    x, y = ((cut.middles[own, k] * cut.lengths[own]).sum() / cut.lengths[own].sum() for k in (0, 1))
    low, high = cut.loop_layers[stack].min(), cut.loop_layers[stack].max()
    area = float(-cut.areas[root])
    blind = bool(rings.blind[root])
    bottom = float(cut.heights[low] - PHASE * cut.step)
    return Core(
        x=float(x),
        y=float(y),
        z_low=bottom,
        z_high=float(bottom + (high - low + 1) * cut.step),
        area=area,
        wall=float(np.average(rings.wall[stack], weights=cut.loop_lengths[stack])),
        draft=float(np.average(rings.draft[stack], weights=cut.loop_lengths[stack])),
        blind=blind,
        friction=float(closed[stack].sum()),
        vacuum=vacuum_force(area) if blind else 0.0,
    )


def _ceiling(view: PartView, cut: Sections, root: int) -> tuple[np.ndarray, np.ndarray]:
    """Return places of the underside within the foot of a core, and the share of its vacuum that each takes."""
    down = np.flatnonzero(view.core_side & (view.normals[:, 2] < -0.5))
    centres = view.centres[down, :2]
    own = cut.loop == root
    low, high = cut.start[own].min(axis=0), cut.start[own].max(axis=0)
    near = ((centres >= low) & (centres <= high)).all(axis=1)
    down, centres = down[near], centres[near]
    held = cut.inside(centres, int(cut.loop_layers[root]), np.array([root]))[:, root]
    weight = view.body.triangle_areas[down[held]] * -view.normals[down[held], 2]
    if weight.sum() <= 0.0:
        middle = (cut.middles[own] * cut.lengths[own][:, None]).sum(axis=0) / cut.lengths[own].sum()
        return middle[None], np.ones(1)
    return centres[held], weight / weight.sum()


def _open_walls(view: PartView, cut: Sections, rings: _Rings, stiff: _Stiffness, side: _Side) -> np.ndarray:
    """Return the friction at each segment of a wall that stands open in the steel, (s,) [N]."""
    if len(cut.loop) == 0:
        return np.zeros(0)
    heights = view.body.face_heights
    height = (heights[:, 1] - heights[:, 0])[view.mesh.face[cut.triangle]]
    to_middle = view.middle - cut.middles
    to_middle /= np.maximum(np.linalg.norm(to_middle, axis=1), 1e-9)[:, None]
    pressed = np.clip((cut.outward * to_middle).sum(axis=1), 0.0, 1.0)
    values, number = np.unique(np.round(side.draft(view, cut.triangle), 1), return_inverse=True)
    ease = np.array([draft_factor_menges(stiff.friction, float(d)) for d in values])[number]
    wall = stiff.friction * stiff.tension * view.wall * ease * pressed * cut.lengths * cut.step
    counted = (rings.root[cut.loop] < 0) & side.formed[cut.triangle] & (height > SHORTEST_WALL)
    return np.asarray(np.where(counted, wall / np.maximum(height, cut.step), 0.0))


def _notes(view: PartView, resin: Resin, found: Sticking, open_force: float, strain: float) -> Notes:
    drives = "ejection force"
    lines = [
        resin.line("ejection_modulus", drives),
        resin.line("friction", drives),
        Quantity(
            "strain of the part when it is ejected",
            strain,
            "1",
            "smallest shrinkage of the resin, an upper bound of the contraction on the core",
            Provenance.COMMON_PRACTICE,
            drives=drives,
        ),
    ]
    largest = sorted(found.cores, key=lambda c: (-c.friction - c.vacuum, c.x, c.y))
    lines += [_core_line(view, core, number, resin, strain) for number, core in enumerate(largest[:SHOWN_CORES], 1)]
    rest = sum(c.friction + c.vacuum for c in largest[SHOWN_CORES:])
    if rest > 0.0:
        name = f"hold of {len(largest) - SHOWN_CORES} smaller cores"
        lines.append(Quantity(name, rest, "N", _GRIP, Provenance.DERIVED, drives=drives))
    if open_force > 0.0:
        lines.append(
            Quantity("grip of open walls, ribs and bosses", open_force, "N", _OPEN, Provenance.DERIVED, drives=drives)
        )
    lines.append(
        Quantity(
            "ejection force",
            found.force,
            "N",
            "sum over the cores, the open walls and the vacuum",
            Provenance.DERIVED,
            drives="number and size of the ejector pins",
        )
    )
    wide = [c for c in largest if c.blind and c.area > VACUUM_RELIEF_AREA.default]
    findings = tuple(
        Finding(
            "ejection.vacuum",
            Severity.CAUTION,
            f"a blind core of {core.area:.0f} mm^2 holds the part by vacuum with up to {core.vacuum:.0f} N",
            at=view.place((core.x, core.y, core.z_high)),
            value=round(core.area, 1),
            limit=VACUUM_RELIEF_AREA.default,
            unit="mm^2",
            remedy="give the core an air valve, or vent an ejector pin in it",
        )
        for core in wide
    )
    return Notes(findings, quantities=tuple(lines))


def _core_line(view: PartView, core: Core, number: int, resin: Resin, strain: float) -> Quantity:
    x, y, _ = view.place((core.x, core.y, core.z_low))
    return Quantity(
        name=f"hold of core {number} ({'blind' if core.blind else 'open'}) at {x:g}, {y:g}",
        value=core.friction + core.vacuum,
        unit="N",
        source=_GRIP,
        provenance=Provenance.DERIVED,
        formula="grip * friction * modulus * strain * wall * length * draft_factor"
        + (" / (1 - poisson / 2) + vacuum" if core.blind else "")
        + ", added up over level sections; grip 2 pi (round) to 8 (box)",
        inputs={
            "friction": f"{resin.friction.mean:g}",
            "modulus": f"{resin.ejection_modulus.mean:g} MPa",
            "strain": f"{strain:g}",
            "wall": f"{core.wall:.3g} mm",
            "length": f"{core.z_high - core.z_low:.4g} mm",
            "draft": f"{core.draft:.3g} deg",
            "poisson": f"{resin.poisson:g}",
            "vacuum": f"{core.vacuum:.4g} N",
        },
        drives="ejection force",
    )
