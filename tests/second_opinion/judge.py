"""Judge an output folder of `moldgen build` from outside: tool.step, and who moves how from manifest.json."""

from __future__ import annotations

import json
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from itertools import combinations
from pathlib import Path

import numpy as np
from manifold3d import Error, Manifold

from . import exact
from .reading import Placed, read_tool
from .solids import SHRINK, lift, shrunk, sweep_overlap, thickest

LIMIT = 0.03
"""mm: an overlap as thick is one. The limit of the task, the same as moldgen's."""

FINER = 4.0
"""How many times finer an overlap over the limit is asked for again: a real one stays, that of meshes shrinks."""

DOUBTFUL = 0.2
"""mm: no mesh feigns more. The kernel was seen to sag by 0.08 mm where 0.02 were asked for."""

CAVITY, CORE, PART = "cavity half", "core half", "part"


@dataclass(frozen=True)
class Figure:
    """One answer: what was asked, how thick the worst overlap is [mm], where, and whether it is as it must be."""

    asked: str
    depth: float
    at: tuple[float, float, float] = (0.0, 0.0, 0.0)
    wrong: bool = False

    def __str__(self) -> str:
        x, y, z = self.at
        return f"{'WRONG ' if self.wrong else ''}{self.asked}: {self.depth:.3f} mm at {x:.2f}, {y:.2f}, {z:.2f}"


@dataclass
class Opinion:
    """All answers on one tool."""

    faults: list[str] = field(default_factory=list)
    rest: list[Figure] = field(default_factory=list)
    motion: list[Figure] = field(default_factory=list)
    needed: list[Figure] = field(default_factory=list)

    @property
    def passed(self) -> bool:
        """True when every question was asked and nothing is wrong."""
        return not self.wrong() and bool(self.motion)

    @property
    def worst(self) -> float:
        """The thickest overlap at rest or on the way [mm]."""
        return max((f.depth for f in (*self.rest, *self.motion)), default=0.0)

    def wrong(self) -> list[str]:
        """What is wrong, in words."""
        return [*self.faults, *(str(f) for f in (*self.rest, *self.motion, *self.needed) if f.wrong)]


@dataclass(frozen=True, eq=False)
class Step:
    """One stretch of the opening: what happens, and how far each group moves [mm]."""

    name: str
    moves: dict[str, np.ndarray]

    def of(self, group: str) -> np.ndarray:
        """How far a group moves."""
        return self.moves.get(group, np.zeros(3))


class Tool:
    """Components by the group that they move with, and the steps."""

    def __init__(self, folder: Path) -> None:
        record = json.loads((folder / "manifest.json").read_text(encoding="utf-8"))
        self.placed = read_tool(folder / "tool.step")
        with_whom = {c["name"]: (c["moves_with"], len(c["positions"])) for c in record["components"]}
        self.faults = _not_as_listed(self.placed, with_whom)
        self.groups: dict[str, list[Placed]] = {}
        for body in self.placed:
            group = with_whom.get(body.product.name, ("nothing", 0))[0]
            self.groups.setdefault(group, []).append(body)
        self.steps = [
            Step(s["name"], {g: np.array(move, dtype=float) for g, move in s["moves"]})
            for s in record["claims"]["steps"]
        ]
        self.faults += _unknown(self.steps, self.groups)
        self._shrunk: dict[tuple[Placed, float], Manifold] = {}
        self._meshes: dict[tuple[str, float], Manifold] = {}

    def mesh(self, group: str, fineness: float) -> Manifold:
        """The bodies of a group as one mesh, where they stand in the closed mold."""
        if (group, fineness) not in self._meshes:
            self._meshes[group, fineness] = Manifold.compose([b.mesh(fineness) for b in self.groups[group]])
            self._meshes[group, fineness].num_tri()  # made now, not again at every place that it is moved to
        return self._meshes[group, fineness]

    def thin(self, body: Placed, fineness: float) -> Manifold:
        """A body shrunk, where it stands in the closed mold."""
        if (body, fineness) not in self._shrunk:
            self._shrunk[body, fineness] = shrunk(body.mesh(fineness))
        return self._shrunk[body, fineness]

    def box(self, groups: Sequence[str]) -> np.ndarray:
        """Corners of the box around groups in the closed mold, (2, 3)."""
        boxes = np.array([b.mesh().bounding_box() for g in groups for b in self.groups[g]]).reshape(-1, 2, 3)
        return np.array([boxes[:, 0].min(axis=0), boxes[:, 1].max(axis=0)])


def judge(folder: Path) -> Opinion:
    """Return the opinion on the tool in an output folder."""
    tool = Tool(folder)
    opinion = Opinion(faults=[*tool.faults, *_unsound(tool.placed)])
    if opinion.faults:
        return opinion
    opinion.rest = _at_rest(tool)
    opinion.motion = _on_the_way(tool)
    opinion.needed = _needed(tool)
    if opinion.needed and all(f.depth < LIMIT for f in opinion.needed):
        opinion.faults.append("no side action holds the part: the check sees no undercut, or there is none")
    return opinion


def _not_as_listed(placed: Sequence[Placed], listed: dict[str, tuple[str, int]]) -> list[str]:
    found = [b.product.name for b in placed]
    names = sorted({*found, *listed})
    return [
        f"{name}: {found.count(name)} in tool.step, {listed.get(name, ('', 0))[1]} in the manifest"
        for name in names
        if found.count(name) != listed.get(name, ("", 0))[1]
    ]


def _unknown(steps: Sequence[Step], groups: dict[str, list[Placed]]) -> list[str]:
    moved = {group for step in steps for group in step.moves}
    faults = [f"the steps move {group}, which is nothing" for group in sorted(moved - groups.keys())]
    faults += [f"the tool has no {group}" for group in (CAVITY, CORE, PART) if group not in groups]
    return faults if steps else [*faults, "no step opens the tool"]


def _unsound(placed: Sequence[Placed]) -> list[str]:
    """Components that are not one closed solid of positive volume, all its loose pieces positive too."""
    faults = []
    for product in {b.product.name: b.product for b in placed}.values():
        mesh = product.mesh()
        if product.solids() != 1:
            faults.append(f"{product.name} has {product.solids()} solids")
        elif mesh.status() != Error.NoError or not mesh.num_tri():
            faults.append(f"{product.name} is not closed: {mesh.status()}")
        elif not mesh.volume() > 0.0:
            faults.append(f"{product.name} has a volume of {mesh.volume():g} mm3")
    return faults


def _asked(
    question: str,
    ask: Callable[[float], tuple[float, np.ndarray]],
    confirm: Callable[[np.ndarray], bool],
) -> Figure:
    """Ask how thick an overlap is. SHRINK is given back.

    A doubtful one is asked for once more with finer meshes, and if it is still there, the surfaces themselves are asked
    (`confirm`) at points of it; without a single one that says so it is one of meshes and not counted, but told.
    """
    depth, points = ask(1.0)
    if LIMIT <= depth + SHRINK < DOUBTFUL:
        depth, points = ask(FINER)
    depth = depth + SHRINK if depth > 0.0 else 0.0
    x, y, z = (float(v) for v in points[0])
    if LIMIT <= depth < DOUBTFUL and not confirm(points):
        return Figure(f"{question} (meshes overlap by {depth:.3f} mm, surfaces do not)", 0.0, (x, y, z))
    return Figure(question, depth, (x, y, z), depth >= LIMIT)


def _at_rest(tool: Tool) -> list[Figure]:
    figures = []
    still = np.zeros(3)
    for one, other in combinations(tool.placed, 2):
        a, b = (np.asarray(body.mesh().bounding_box()).reshape(2, 3) for body in (one, other))
        if (a[0] > b[1]).any() or (b[0] > a[1]).any():
            continue
        figure = _asked(
            f"{one.name} in {other.name} at rest",
            lambda fine, one=one, other=other: thickest(one.mesh(fine) ^ tool.thin(other, fine)),
            lambda points, one=one, other=other: exact.overlap(points, [one], still, still, [other]),
        )
        figures.append(figure)
    return figures


def _on_the_way(tool: Tool) -> list[Figure]:
    """Every pair of groups in every step in which one moves past the other, to where cavity half and part are free."""
    figures = []
    stands = {group: np.zeros(3) for group in tool.groups}
    for step in [*tool.steps, *_freeing(tool)]:
        for one, other in combinations(sorted(tool.groups), 2):
            way = step.of(one) - step.of(other)
            if np.linalg.norm(way) > 0.0:
                figures.append(_passing(tool, one, other, stands[one] - stands[other], way, step.name))
        stands = {group: at + step.of(group) for group, at in stands.items()}
    return figures


def _passing(tool: Tool, one: str, other: str, start: np.ndarray, way: np.ndarray, step: str) -> Figure:
    """One group past another, which stands; the one with fewer triangles is swept."""
    if tool.mesh(other, 1.0).num_tri() < tool.mesh(one, 1.0).num_tri():
        one, other, start, way = other, one, -start, -way

    def ask(fine: float) -> tuple[float, np.ndarray]:
        mover = tool.mesh(one, fine).translate(tuple(start))
        return sweep_overlap(mover, way, [tool.thin(b, fine) for b in tool.groups[other]])

    def confirm(points: np.ndarray) -> bool:
        return exact.overlap(points, tool.groups[one], start, way, tool.groups[other])

    return _asked(f"{one} past {other}, {step}", ask, confirm)


def _freeing(tool: Tool) -> list[Step]:
    """Two more steps: the cavity half is carried far up with all that rides in it, then the part clear of the rest.

    What moved just as the cavity half did in the last step that moved it rides in it.
    """
    last = next((s for s in reversed(tool.steps) if np.any(s.of(CAVITY))), None)
    riders = [g for g in tool.groups if last is not None and g != PART and np.allclose(last.of(g), last.of(CAVITY))]
    riders = riders or [CAVITY]
    stands = {g: sum((s.of(g) for s in tool.steps), np.zeros(3)) for g in tool.groups}
    rest = [g for g in tool.groups if g not in (*riders, PART)]
    low, high = tool.box([PART]) + stands[PART]
    clear = max(0.0, max((tool.box([g]) + stands[g])[1, 2] for g in rest) - low[2]) + 1.0
    bottom = min((tool.box([g]) + stands[g])[0, 2] for g in riders)
    top = max(high[2] + clear, *((tool.box([g]) + stands[g])[1, 2] for g in rest))
    far = max(0.0, top - bottom) + 1.0
    return [
        Step("the cavity half is carried away", {g: lift(far) for g in riders}),
        Step("the part is carried away", {PART: lift(clear)}),
    ]


def _needed(tool: Tool) -> list[Figure]:
    """How deep the part alone runs into each side action that is left in place, when it is pulled straight up."""
    sides = sorted(g for g in tool.groups if g not in (CAVITY, CORE, PART, "ejector", "nothing"))
    height = float(np.ptp(tool.box(list(tool.groups))[:, 2]))
    figures = []
    for side in sides:
        depth, points = sweep_overlap(
            tool.mesh(PART, 1.0), lift(height), [tool.thin(b, 1.0) for b in tool.groups[side]]
        )
        x, y, z = (float(v) for v in points[0])
        figures.append(Figure(f"the part pulled straight past {side}", depth + SHRINK if depth else 0.0, (x, y, z)))
    return figures
