"""The tool as a scene for the pictures: meshes, the edges worth drawing, and where everything goes when it opens."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.mesh import SurfaceMesh
from moldgen.model.halves import Halves
from moldgen.model.motion import Step, total_displacement
from moldgen.model.part import Vector
from moldgen.model.side_action import SideKind
from moldgen.model.tool import Component, Motion, Role, Tool
from moldgen.output.formed_by import formed_by
from moldgen.output.picture_geometry import sharp_edges
from moldgen.output.scene import Scene, SceneBody

LEVEL = 1e-6
"""mm: heights closer than this are one."""


@dataclass(frozen=True)
class _Look:
    """How one body is drawn: its mesh, what each triangle belongs to, and the edges."""

    mesh: SurfaceMesh
    face_id: np.ndarray
    edges: tuple[np.ndarray, ...]

    @classmethod
    def of(cls, mesh: SurfaceMesh) -> _Look:
        """Return the look of a mesh as it is."""
        return cls(mesh, mesh.face, feature_segments(mesh))


def tool_scene(tool: Tool, halves: Halves, title: tuple[str, str, str], gate: Vector | None, stroke: float) -> Scene:
    """Return the scene of a tool in mold coordinates [mm].

    title : name, resin and pull, in words; gate : where the melt enters; stroke : travel of the ejectors
    """
    depth = float(halves.high[2] - halves.low[2])
    part_height = float(np.ptp(halves.body.mesh.vertices[:, 2]))
    lift: dict[str, float] = {
        Motion.CAVITY_HALF: max(1.1 * depth, 2.5 * part_height + stroke),
        Motion.CORE_HALF: 0.0,
        Motion.EJECTOR: stroke,
        Motion.PART: stroke,
    }
    shares = half_way(tool.steps)
    part, sides = _part_look(tool, halves)
    bodies: list[SceneBody] = []
    for component in tool.components:
        look = part if component.role is Role.PART else _Look.of(Body(component.solid).mesh)
        group = component.motion
        bodies += _bodies(component, look, open_place(tool.steps, group, lift), _partly(tool.steps, shares, group))
    name, resin, pull = title
    return Scene(name, resin, pull, tuple(bodies), halves.parting_line, gate, sides)


def feature_segments(mesh: SurfaceMesh) -> tuple[np.ndarray, ...]:
    """Return the mesh edges between different faces that meet at an angle, each a segment (2, 3)."""
    return sharp_edges(mesh.vertices, mesh.triangles, mesh.face)


def half_way(steps: Sequence[Step]) -> tuple[float, ...]:
    """Return how much of each step is done, 0 to 1, in the middle of the way of the side actions.

    Where angled pins move slides: half way up the opening in which they do. Else where cylinders draw slides: half of
    each of their ways, the mold closed. Else half of the ejection that moves lifters. All 0 without side actions.
    """
    slides = [k for k, step in enumerate(steps) if _aside(step, SideKind.SLIDE)]
    rises = np.array([step.displacement(Motion.CAVITY_HALF)[2] for step in steps])
    pinned = [k for k in slides if rises[k] > 0.0]
    if pinned:
        tops = np.cumsum(rises)
        middle = (tops[pinned[0]] - rises[pinned[0]] + tops[pinned[-1]]) / 2.0
        done = [1.0 if k < pinned[0] else 0.0 for k in range(len(steps))]
        for k in range(pinned[0], pinned[-1] + 1):
            done[k] = float(np.clip((middle - tops[k] + rises[k]) / rises[k], 0.0, 1.0)) if rises[k] > 0.0 else 0.0
        return tuple(done)
    if slides:
        return tuple(0.5 if k in slides else 0.0 for k in range(len(steps)))
    lifted = [k for k, step in enumerate(steps) if _aside(step, SideKind.LIFTER)]
    if not lifted:
        return (0.0,) * len(steps)
    return tuple(1.0 if k < lifted[0] else 0.5 if k in lifted else 0.0 for k in range(len(steps)))


def open_place(steps: Sequence[Step], group: str, lift: Mapping[str, float]) -> Vector:
    """Return where a group is drawn in the open mold: a side action where the steps leave it, on the half it rides on.

    lift : height at which each `Motion` is drawn; the cavity half's is less than its real opening, to save paper
    """
    if group in lift:
        return (0.0, 0.0, lift[group])
    x, y, z = total_displacement(steps, group)
    opening = total_displacement(steps, Motion.CAVITY_HALF)[2]
    return (x, y, lift[Motion.CAVITY_HALF] if opening > 0.0 and abs(z - opening) < LEVEL else z)


def _aside(step: Step, kind: SideKind) -> bool:
    """Return whether a side action of a kind moves square to the pull in a step."""
    return any(group.startswith(kind) and (abs(way[0]) > 0.0 or abs(way[1]) > 0.0) for group, way in step.moves)


def _partly(steps: Sequence[Step], shares: Sequence[float], group: str) -> Vector:
    ways = np.array([step.displacement(group) for step in steps]).reshape(-1, 3)
    x, y, z = (float(v) + 0.0 for v in np.asarray(shares) @ ways)
    return (x, y, z)


def _part_look(tool: Tool, halves: Halves) -> tuple[_Look, dict[int, int]]:
    """Return the part as it is molded, its triangles numbered by face and by what forms them, and the latter."""
    if not halves.sides:
        sides = {f: 1 if side else -1 for f, side in enumerate(halves.cavity_side.tolist())}
        return _Look.of(halves.body.mesh), sides
    whole = Body(tool.only(Role.PART).solid).mesh
    mesh, by = formed_by(whole, halves)
    # one face may be formed by several: each share of it becomes a face of the picture
    keys, number = np.unique(mesh.face * 8 + by + 1, return_inverse=True)
    by_number = {k: int(key) % 8 - 1 for k, key in enumerate(keys.tolist())}
    return _Look(mesh, number.reshape(-1), feature_segments(whole)), by_number


def _bodies(component: Component, look: _Look, offset: Vector, half: Vector) -> list[SceneBody]:
    edges = look.edges
    found = []
    for number, at in enumerate(component.positions, start=1):
        shift = np.asarray(at)
        found.append(
            SceneBody(
                name=f"{component.name} {number}" if len(component.positions) > 1 else component.name,
                role=component.role.value,
                vertices=look.mesh.vertices + shift,
                triangles=look.mesh.triangles,
                feature_edges=tuple(e + shift for e in edges) if shift.any() else edges,
                face_id=look.face_id,
                offset_open=offset,
                offset_half=half,
            )
        )
    return found
