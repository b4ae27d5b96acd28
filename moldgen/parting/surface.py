"""The parting surface around the part, and the shut-offs that close its holes: a ladder each."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum
from typing import Any

import numpy as np

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.build import backward, plane_face, plane_through, wire_of
from moldgen.kernel.curtain import hang_curtain
from moldgen.kernel.measure import is_valid
from moldgen.kernel.patches import filled_patch, flat_patches, host_patch, loop_points, signed_area
from moldgen.kernel.runoff import run_off
from moldgen.kernel.slope import sine_range
from moldgen.kernel.topology import directed_points
from moldgen.kernel.walls import Rim, rectangle_rim

Face = Any
Loop = Sequence[Any]


LEAST_SHUT_OFF = float(np.sin(np.radians(5.0)))
"""Sine of 5 deg: steel that closes on steel at less gap or gall (trade pages ask for 3 to 7 deg; common practice)."""


class Rung(StrEnum):
    """How a loop was closed, from what a toolmaker likes best to what always works."""

    PLANE = "plane"
    RUN_OFF = "carried level out to the sides of the block"
    LEVEL_AND_CURTAINS = "level plane with vertical curtains"
    HOST = "the neighbouring wall carried across the hole"
    FILLED = "filled surface"


@dataclass(frozen=True)
class ClosedLoop:
    """One loop of the parting line and how it was closed.

    edges : number of edges; off_plane : edges with a vertical face beside them
    at : a point of the loop [mm]; span : extent of the loop in x, y, z [mm]
    refused : the better rungs that failed, with the reason
    """

    rung: Rung
    edges: int
    off_plane: int
    at: tuple[float, float, float]
    span: tuple[float, float, float]
    refused: tuple[str, ...] = ()


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


def make_sheet(
    body: Body, loops: Sequence[Loop], outer: int, level: float, corners: tuple[np.ndarray, np.ndarray]
) -> Sheet:
    """Return the parting surface and all shut-offs of a part whose parting line is `loops`.

    Raises
    ------
    KernelError : a loop cannot be closed by any rung
    """
    faces, rim, closed_outer = _close_outside(loops[outer], level, corners)
    inner = [i for i in range(len(loops)) if i != outer]
    shut_offs: list[ClosedLoop] = []
    flat: set[int] = set()
    for patch in flat_patches([loops[i] for i in inner]):
        faces.append(patch.face)
        flat |= {inner[k] for k in patch.loops}
        shut_offs += [_closed(Rung.PLANE, loops[inner[k]], 0) for k in patch.loops]
    for number in inner:
        if number not in flat:
            made, closed = _close_hole(body, loops[number])
            faces += made
            shut_offs.append(closed)
    return Sheet(tuple(faces), rim, closed_outer, tuple(shut_offs))


def _close_outside(
    loop: Loop, level: float, corners: tuple[np.ndarray, np.ndarray]
) -> tuple[list[Face], Rim, ClosedLoop]:
    """Return the surface from the outer loop to the sides of the block: plane, run-off, plane with curtains."""
    curtain = hang_curtain(loop, level)
    refused: list[str] = []
    if curtain.faces:
        try:
            ran = run_off(_counter_clockwise(loop), *corners)
        except KernelError as error:
            refused.append(f"{Rung.RUN_OFF}: {error.what}")
        else:
            return list(ran.faces), ran.rim, _closed(Rung.RUN_OFF, loop, ran.upright)
    rim = rectangle_rim(corners[0], corners[1], level)
    around = plane_face(plane_through((0, 0, level), (0, 0, 1)), wire_of(rim.edges), [wire_of(curtain.foot).Reversed()])
    bad = [f for f in (around, *curtain.faces) if not is_valid(f)]
    if bad:
        raise KernelError(f"{len(bad)} faces of the parting surface at height {level:.3f} are invalid")
    rung = Rung.LEVEL_AND_CURTAINS if curtain.faces else Rung.PLANE
    return [around, *curtain.faces], rim, _closed(rung, loop, curtain.off_plane, refused)


def _counter_clockwise(loop: Loop) -> list[Any]:
    if signed_area(loop_points(loop, 8)[:, :2]) > 0:
        return list(loop)
    return [backward(e) for e in reversed(loop)]


def _close_hole(body: Body, loop: Loop) -> tuple[list[Face], ClosedLoop]:
    """Close a hole whose rim is not flat: the neighbour's surface where it leans enough for steel on steel, level with
    curtains, the neighbour's surface as steep as it is, a filling.
    """
    refused = []
    host = host_patch(body, loop)
    if host is not None and _leans(host):
        return [host], _closed(Rung.HOST, loop, 0)
    for level in _levels_of(loop):
        try:
            curtain = hang_curtain(loop, level)
            lid = plane_face(plane_through((0, 0, level), (0, 0, 1)), wire_of(curtain.foot))
        except KernelError as error:
            refused.append(f"level {level:.3f}: {error.what}")
            continue
        if is_valid(lid) and all(is_valid(f) for f in curtain.faces):
            return [lid, *curtain.faces], _closed(Rung.LEVEL_AND_CURTAINS, loop, curtain.off_plane, refused)
        refused.append(f"level {level:.3f}: a face is invalid")
    if host is not None:
        return [host], _closed(Rung.HOST, loop, 0, refused)
    refused.append("no neighbour holds the whole rim")
    return [filled_patch(loop)], _closed(Rung.FILLED, loop, 0, refused)


def _leans(patch: Face) -> bool:
    """True when a shut-off on this face is nowhere steeper than the least shut-off angle, and looks one way along z."""
    sines = sine_range(patch)
    return sines is not None and sines[0] * sines[1] > 0 and min(map(abs, sines)) >= LEAST_SHUT_OFF


def _levels_of(loop: Loop) -> list[float]:
    """Return heights at which to close a hole: where most of its rim is level, then its lowest and highest point."""
    run: dict[float, float] = {}
    exact: dict[float, float] = {}
    every = []
    for edge in loop:
        points = directed_points(edge, 5)
        every.append(points[:, 2])
        if np.ptp(points[:, 2]) < 1e-5:
            height = round(float(points[2, 2]), 4)
            exact.setdefault(height, float(points[2, 2]))
            run[height] = run.get(height, 0.0) + float(np.linalg.norm(np.diff(points[:, :2], axis=0), axis=1).sum())
    heights = np.concatenate(every)
    level = sorted(run, key=lambda z: (-run[z], z))
    return [*(exact[z] for z in level), float(heights.min()), float(heights.max())]


def _closed(rung: Rung, loop: Loop, off_plane: int, refused: Sequence[str] = ()) -> ClosedLoop:
    points = loop_points(loop, 4)
    span = np.ptp(points, axis=0)
    at = tuple(float(v) for v in points[0])
    return ClosedLoop(rung, len(loop), off_plane, at, tuple(float(v) for v in span), tuple(refused))  # type: ignore[arg-type]
