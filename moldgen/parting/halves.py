"""Cavity and core of a part that leaves by a straight pull: levels are tried until one is proved."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from moldgen.errors import KernelError, MoldgenError, PartError
from moldgen.kernel.body import Body
from moldgen.kernel.guard import operation
from moldgen.kernel.loops import boundary_loops
from moldgen.kernel.meshsolid import MeshSolid
from moldgen.kernel.patches import loop_points
from moldgen.kernel.shells import solid_from_faces
from moldgen.kernel.walls import block_outside
from moldgen.parting.accept import HalvesCheck, check_halves
from moldgen.parting.level import LevelSearch, find_levels
from moldgen.parting.refine import split_at_level, split_for_line
from moldgen.parting.sides import Sides, assign_sides
from moldgen.parting.surface import Outside, Rung, Sheet, close_holes, closings, joined, outer_loop, with_angles
from moldgen.release.contact import vertical_contact
from moldgen.release.kinds import FaceKinds, face_kinds
from moldgen.rules.practice import SHUT_OFF_ANGLE
from moldgen.tolerances import ON_PLANE

MOST_CHECKED = 6
"""Levels whose halves were made but not proved, after which the search ends."""

DEEP_LEVELS = 3
"""Levels that are tried again with every vertical face split."""


@dataclass(frozen=True)
class Parted:
    """The two halves of a part and how they came about, in the mold frame [mm].

    body : the part with every split that the parting line needed
    sides : which half forms each of its faces
    level : height of the parting plane; of the outer loop itself where that is flat
    asked : the level that the user fixed
    loops : closed loops of directed edges; `outer` is the number of the outer one
    """

    body: Body
    kinds: FaceKinds
    sides: Sides
    loops: list[list[Any]]
    outer: int
    level: float
    sheet: Sheet
    cavity: Any
    core: Any
    check: HalvesCheck
    deep: bool
    refused: tuple[str, ...]
    asked: float | None = None


@dataclass(frozen=True)
class _Task:
    """What every trial starts from."""

    body: Body
    kinds: FaceKinds
    contact: np.ndarray
    search: LevelSearch
    corners: tuple[np.ndarray, np.ndarray]
    avoid: tuple[np.ndarray, ...]


@dataclass(frozen=True)
class _Trial:
    level: float
    deep: bool


def part_halves(
    body: Body,
    kinds: FaceKinds,
    part: MeshSolid,
    corners: tuple[np.ndarray, np.ndarray],
    *,
    level: float | None = None,
    avoid: tuple[np.ndarray, ...] = (),
) -> Parted:
    """Return cavity and core inside the block `corners` of a part whose faces all look up, down or along the pull.

    level : height of the parting plane [mm] if the user fixed it, else the best of those found is used
    avoid : points [mm] on faces along which the parting line should not run

    Raises
    ------
    PartError : no level gives two proved halves; the message lists each with its reason
    """
    contact = vertical_contact(body, kinds)
    task = _Task(body, kinds, contact, find_levels(body, kinds, part), corners, avoid)
    levels = (level,) if level is not None else _by_cost(task)
    refused: list[str] = []
    unproved: list[Parted] = []
    trials = [_Trial(z, deep=False) for z in levels] + [_Trial(z, deep=True) for z in levels[:DEEP_LEVELS]]
    for trial in trials:
        try:
            with operation(f"part the mold at height {trial.level:.3f}", operands=(body.solid,)):
                parted = _part_at(task, trial)
        except MoldgenError as error:
            refused.append(f"level {trial.level:.3f}{' (every wall split)' if trial.deep else ''}: {error.what}")
            continue
        if parted.check.proved:
            return replace(parted, refused=tuple(refused), asked=level)
        refused.append(f"level {trial.level:.3f}: {parted.check.complaint}")
        unproved.append(parted)
        if len(unproved) >= MOST_CHECKED:
            break
    if unproved:
        return replace(min(unproved, key=lambda p: p.check.worst), refused=tuple(refused), asked=level)
    raise PartError(
        "no parting level gives two halves: " + "; ".join(refused),
        remedy="give parting.height, or another pull",
    )


def _by_cost(task: _Task) -> tuple[float, ...]:
    costly = _costly(task.body, task.avoid)
    costs = {z: assign_sides(task.body, task.kinds, task.contact, z, costly).cost for z in task.search.levels}
    return tuple(sorted(costs, key=lambda z: (costs[z], z)))


def _costly(body: Body, avoid: tuple[np.ndarray, ...]) -> frozenset[int]:
    return frozenset(body.nearest_face(point)[0] for point in avoid)


def _part_at(task: _Task, trial: _Trial) -> Parted:
    level = trial.level
    split = split_at_level(task.body, task.kinds, task.contact, task.search, level, all_faces=trial.deep)
    state = _assigned(split, level, task.avoid, (task.kinds, task.contact) if split is task.body else None)
    level = _own_level(state, level)
    ready = split_for_line(split, state.loops, state.outer, level)
    if ready is not split:
        state = _assigned(ready, level, task.avoid, None)
    if state.alike and not trial.deep:
        raise KernelError(f"{len(state.alike) + 1} loops run as the outer one does")
    return _halves(state, level, trial, task.corners)


def _own_level(state: _Assigned, level: float) -> float:
    """Return the height of the outer loop if that is flat, else `level`.

    A leaning wall can be parted only at its widest, whatever level is tried.
    """
    heights = loop_points(state.loops[state.outer], 8)[:, 2]
    return float(heights.mean()) if np.ptp(heights) < ON_PLANE and abs(heights.mean() - level) > ON_PLANE else level


@dataclass(frozen=True)
class _Assigned:
    body: Body
    kinds: FaceKinds
    sides: Sides
    loops: list[list[Any]]
    outer: int
    alike: tuple[int, ...]


def _assigned(
    body: Body, level: float, avoid: tuple[np.ndarray, ...], known: tuple[FaceKinds, np.ndarray] | None
) -> _Assigned:
    kinds, contact = known or (kinds_ := face_kinds(body), vertical_contact(body, kinds_))
    sides = assign_sides(body, kinds, contact, level, _costly(body, avoid))
    loops = boundary_loops(body, sides.cavity)
    if not loops:
        raise KernelError("all faces are on one side")
    outer, alike = outer_loop(loops)
    return _Assigned(body, kinds, sides, loops, outer, alike)


def _halves(state: _Assigned, level: float, trial: _Trial, corners: tuple[np.ndarray, np.ndarray]) -> Parted:
    """Return the halves with the first surface around the part that is proved, else with the one that misses least."""
    shut_offs = close_holes(state.body, state.loops, state.outer)
    proved: list[Parted] = []
    unproved: list[Parted] = []
    for outside in _until_made(closings(state.loops[state.outer], level, corners), proved):
        sheet = joined(outside, shut_offs)
        cavity, core = (_half(state, sheet, corners, cavity=side) for side in (True, False))
        check = check_halves(cavity, core, state.body, float(np.prod(corners[1] - corners[0])))
        if check.proved:
            sheet = with_angles(sheet)
        found = (state.body, state.kinds, state.sides, state.loops, state.outer, level, sheet, cavity, core, check)
        (proved if check.proved else unproved).append(Parted(*found, trial.deep, ()))
        if check.proved and _steepness(proved[-1]) >= SHUT_OFF_ANGLE.default:
            break
    if proved:
        return max(proved, key=_steepness)
    return min(unproved, key=lambda p: p.check.worst)


def _until_made(surfaces: Iterator[Outside], proved: list[Parted]) -> Iterator[Outside]:
    """Yield surfaces; once one is proved, only those that could lean more against the pull, and none that fails."""
    while True:
        try:
            outside = next(surfaces)
        except StopIteration:
            return
        except KernelError:
            if proved:
                return
            raise
        if proved and outside.loop.rung is Rung.LEVEL_AND_CURTAINS:
            return
        yield outside


def _steepness(parted: Parted) -> float:
    """Return the least angle [deg] of the surface around the part against the pull, in whole degrees: less is noise."""
    angle = parted.sheet.outer.angle
    return 0.0 if angle is None else float(np.floor(angle.deg + 0.5))


def _half(state: _Assigned, sheet: Sheet, corners: tuple[np.ndarray, np.ndarray], *, cavity: bool) -> Any:
    own = [f for f, side in zip(state.body.faces, state.sides.cavity, strict=True) if side == cavity]
    lid = float(corners[1 if cavity else 0][2])
    result = solid_from_faces([*own, *sheet.faces, *block_outside(sheet.rim, lid)], drop_flat=True)
    if result.gap:  # that every face is valid was checked when it was made
        raise KernelError(f"the {'cavity' if cavity else 'core'} does not close: {result.gap}")
    return result.solid
