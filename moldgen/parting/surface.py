"""The parting surface around the part, and the shut-offs that close its holes: a ladder each."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from enum import StrEnum
from typing import Any

import numpy as np

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.build import backward, plane_face, plane_through, wire_of
from moldgen.kernel.curtain import Curtain, hang_curtain
from moldgen.kernel.land import level_land, level_lid
from moldgen.kernel.measure import is_valid
from moldgen.kernel.patches import filled_patch, flat_patches, host_patch, loop_points
from moldgen.kernel.polygon import signed_area
from moldgen.kernel.runoff import run_off
from moldgen.kernel.shut_off import LeastAngle, least_angle
from moldgen.kernel.slope import sine_range
from moldgen.kernel.topology import directed_points
from moldgen.kernel.walls import Rim, rectangle_rim
from moldgen.rules.practice import SEALING_LAND, SHUT_OFF_ANGLE, SMALL_SEALING_LAND

Face = Any
Loop = Sequence[Any]


LEAST_SHUT_OFF = float(np.sin(np.radians(SHUT_OFF_ANGLE.default)))
"""Sine of the shut-off angle: steel that closes on steel at less will gape or gall."""

LAND_WIDTHS = (SEALING_LAND.low, SMALL_SEALING_LAND.low)
"""mm: the land that steel seals on, and the least one, that of a small insert."""

LID_WIDTHS = (2.0, 1.0, 0.5)
"""mm: the land inside a hole, where there is less room (our choice)."""

MOSTLY_LEVEL = 0.3
"""Share of a rim that must lie at one height for the lid to lie there; else it lies half way up (our choice)."""

WALL_LEAN = 15.0
"""deg between the pull and the wall from the land to the flat plane: three times the shut-off angle, since there is
room for it (our choice)."""


class Rung(StrEnum):
    """How a loop was closed, from what a toolmaker likes best to what always works."""

    PLANE = "plane"
    LAND = "level land, inclined wall and flat plane beyond"
    RUN_OFF = "carried level out to the sides of the block"
    LEVEL_AND_CURTAINS = "level plane with vertical curtains"
    LID = "level land inward, inclined wall and flat lid"
    HOST = "the neighbouring wall carried across the hole"
    FILLED = "filled surface"


@dataclass(frozen=True)
class ClosedLoop:
    """One loop of the parting line and how it was closed.

    edges : number of edges; off_plane : edges with a vertical face beside them
    at : a point of the loop [mm]; span : extent of the loop in x, y, z [mm]
    refused : the better rungs that failed, with the reason
    faces : of the parting surface that close it
    angle : the least between them and the pull, once it has been measured
    land_mm : width of the level land around it, 0 where there is none of constant width
    """

    rung: Rung
    edges: int
    off_plane: int
    at: tuple[float, float, float]
    span: tuple[float, float, float]
    refused: tuple[str, ...] = ()
    faces: tuple[Face, ...] = ()
    angle: LeastAngle | None = None
    land_mm: float = 0.0


@dataclass(frozen=True)
class ShutOffs:
    """What closes the holes of the part: faces shared by both halves, and the loops that they close."""

    faces: tuple[Face, ...]
    loops: tuple[ClosedLoop, ...]


@dataclass(frozen=True)
class Outside:
    """What closes the outer loop: faces from the part to the sides of the block, and where they end there."""

    faces: tuple[Face, ...]
    rim: Rim
    loop: ClosedLoop


@dataclass(frozen=True)
class Sheet:
    """Everything between cavity and core that is not the part: faces shared by both halves."""

    faces: tuple[Face, ...]
    rim: Rim
    outer: ClosedLoop
    shut_offs: tuple[ClosedLoop, ...]


def outer_loop(loops: Sequence[Loop]) -> tuple[int, tuple[int, ...]]:
    """Return the number of the outer loop, and the numbers of others that run the same way round.

    Seen along the pull exactly one loop may run as the outer one does: a second one means that faces are on the wrong
    side. Slivers under a thousandth of the outer loop's area do not count.
    """
    areas = [signed_area(loop_points(loop, 8)[:, :2]) for loop in loops]
    outer = int(np.argmax(np.abs(areas)))
    alike = [
        i for i, a in enumerate(areas) if i != outer and a * areas[outer] > 0 and abs(a) > 1e-3 * abs(areas[outer])
    ]
    return outer, tuple(alike)


def close_holes(body: Body, loops: Sequence[Loop], outer: int) -> ShutOffs:
    """Return the shut-offs of every loop but the outer one.

    Raises
    ------
    KernelError : a loop cannot be closed by any rung
    """
    inner = [i for i in range(len(loops)) if i != outer]
    faces: list[Face] = []
    closed: list[ClosedLoop] = []
    flat: set[int] = set()
    for patch in flat_patches([loops[i] for i in inner]):
        faces.append(patch.face)
        flat |= {inner[k] for k in patch.loops}
        closed += [_closed(Rung.PLANE, loops[inner[k]], 0, [patch.face]) for k in patch.loops]
    for number in inner:
        if number not in flat:
            hole = _close_hole(body, loops[number])
            faces += hole.faces
            closed.append(hole)
    return ShutOffs(tuple(faces), tuple(closed))


def closings(loop: Loop, level: float, corners: tuple[np.ndarray, np.ndarray]) -> Iterator[Outside]:
    """Yield the surfaces from the outer loop to the sides of the block, from what a toolmaker likes best to what always
    works: plane, level land, run-off, plane with curtains. A surface is made only when it is asked for.

    Raises
    ------
    KernelError : when no more can be made
    """
    rim = rectangle_rim(corners[0], corners[1], level)
    curtain = hang_curtain(loop, level)
    if not curtain.faces:
        yield _with_curtain(loop, level, rim, curtain, ())
        return
    forward_loop = _counter_clockwise(loop)
    refused: list[str] = []
    for width in LAND_WIDTHS:
        if refused and not refused[-1].startswith(f"{Rung.LAND}: a land {LAND_WIDTHS[0]:g} mm"):
            break  # whatever the width
        try:
            land = level_land(forward_loop, level, corners, width, WALL_LEAN)
        except KernelError as error:
            refused.append(f"{Rung.LAND}: {error.what}")
            continue
        closed = _closed(Rung.LAND, loop, land.upright, land.faces, refused)
        yield Outside(land.faces, land.rim, replace(closed, land_mm=width))
        refused.append(
            f"{Rung.LAND}: with it the halves do not fit, or close at less than {SHUT_OFF_ANGLE.default:g} deg"
        )
        break
    try:
        ran = run_off(forward_loop, *corners)
    except KernelError as error:
        refused.append(f"{Rung.RUN_OFF}: {error.what}")
    else:
        yield Outside(ran.faces, ran.rim, _closed(Rung.RUN_OFF, loop, ran.upright, ran.faces, refused))
        refused.append(f"{Rung.RUN_OFF}: with it the halves do not fit")
    yield _with_curtain(loop, level, rim, curtain, refused)


def _with_curtain(loop: Loop, level: float, rim: Rim, curtain: Curtain, refused: Sequence[str]) -> Outside:
    plane = plane_through((0, 0, level), (0, 0, 1))
    around = plane_face(plane, wire_of(rim.edges), [wire_of(curtain.foot).Reversed()])
    bad = [f for f in (around, *curtain.faces) if not is_valid(f)]
    if bad:
        why = f"{len(bad)} faces of the parting surface at height {level:.3f} are invalid"
        raise KernelError("; ".join([*refused, why]))
    faces = (around, *curtain.faces)
    rung = Rung.LEVEL_AND_CURTAINS if curtain.faces else Rung.PLANE
    return Outside(faces, rim, _closed(rung, loop, curtain.off_plane, faces, refused))


def joined(outside: Outside, shut_offs: ShutOffs) -> Sheet:
    """Return all faces between cavity and core."""
    return Sheet((*outside.faces, *shut_offs.faces), outside.rim, outside.loop, shut_offs.loops)


def with_angles(sheet: Sheet) -> Sheet:
    """Return the sheet with the least angle to the pull of every loop; its faces must have been meshed."""
    measured = [replace(c, angle=least_angle(c.faces)) for c in (sheet.outer, *sheet.shut_offs)]
    return replace(sheet, outer=measured[0], shut_offs=tuple(measured[1:]))


def _counter_clockwise(loop: Loop) -> list[Any]:
    if signed_area(loop_points(loop, 8)[:, :2]) > 0:
        return list(loop)
    return [backward(e) for e in reversed(loop)]


def _close_hole(body: Body, loop: Loop) -> ClosedLoop:
    """Close a hole whose rim is not flat: the neighbour's surface where it leans enough for steel on steel, level land
    and lid, level with curtains, the neighbour's surface as steep as it is, a filling.
    """
    refused: list[str] = []
    host = host_patch(body, loop)
    if host is not None and _leans(host):
        return _closed(Rung.HOST, loop, 0, [host])
    lid = _lid(loop, refused)
    if lid is not None:
        return lid
    for level in _level_shares(loop)[0]:
        try:
            curtain = hang_curtain(loop, level)
            flat = plane_face(plane_through((0, 0, level), (0, 0, 1)), wire_of(curtain.foot))
        except KernelError as error:
            refused.append(f"level {level:.3f}: {error.what}")
            continue
        if is_valid(flat) and all(is_valid(f) for f in curtain.faces):
            return _closed(Rung.LEVEL_AND_CURTAINS, loop, curtain.off_plane, [flat, *curtain.faces], refused)
        refused.append(f"level {level:.3f}: a face is invalid")
    if host is not None:
        return _closed(Rung.HOST, loop, 0, [host], refused)
    refused.append("no neighbour holds the whole rim")
    return _closed(Rung.FILLED, loop, 0, [filled_patch(loop)], refused)


def _lid(loop: Loop, refused: list[str]) -> ClosedLoop | None:
    """Return the hole closed by a lid; when none fits, None, and why in `refused`."""
    heights, shares = _level_shares(loop)
    level = heights[0] if shares[0] > MOSTLY_LEVEL else 0.5 * (heights[-2] + heights[-1])
    clockwise = [backward(e) for e in reversed(_counter_clockwise(loop))]
    for width in LID_WIDTHS:
        try:
            faces = level_lid(clockwise, level, width, WALL_LEAN)
        except KernelError as error:
            refused.append(f"{Rung.LID}: {error.what}")
            continue
        angle = least_angle(faces)
        if angle.deg >= SHUT_OFF_ANGLE.low:
            return _closed(Rung.LID, loop, 0, faces)
        # what stands upright in the rim stands upright in any surface; curtains are simpler
        refused.append(f"{Rung.LID}: it would stand {angle.deg:.1f} deg from the pull")
        break
    return None


def _leans(patch: Face) -> bool:
    """True when a shut-off on this face is nowhere steeper than the least shut-off angle, and looks one way along z."""
    sines = sine_range(patch)
    return sines is not None and sines[0] * sines[1] > 0 and min(map(abs, sines)) >= LEAST_SHUT_OFF


def _level_shares(loop: Loop) -> tuple[list[float], list[float]]:
    """Return heights at which to close a hole, where most of its rim is level first, then its lowest and highest point;
    and the share of the rim (seen along the pull) that is level there.
    """
    run: dict[float, float] = {}
    exact: dict[float, float] = {}
    every = []
    total = 0.0
    for edge in loop:
        points = directed_points(edge, 5)
        every.append(points[:, 2])
        length = float(np.linalg.norm(np.diff(points[:, :2], axis=0), axis=1).sum())
        total += length
        if np.ptp(points[:, 2]) < 1e-5:
            height = round(float(points[2, 2]), 4)
            exact.setdefault(height, float(points[2, 2]))
            run[height] = run.get(height, 0.0) + length
    heights = np.concatenate(every)
    level = sorted(run, key=lambda z: (-run[z], z))
    found = [*(exact[z] for z in level), float(heights.min()), float(heights.max())]
    return found, [*(run[z] / max(total, 1e-12) for z in level), 0.0, 0.0]


def _closed(rung: Rung, loop: Loop, off_plane: int, faces: Sequence[Face], refused: Sequence[str] = ()) -> ClosedLoop:
    points = loop_points(loop, 4)
    x, y, z = (float(v) for v in points[0])
    wide, deep, high = (float(v) for v in np.ptp(points, axis=0))
    return ClosedLoop(rung, len(loop), off_plane, (x, y, z), (wide, deep, high), tuple(refused), tuple(faces))
