"""The tool as a scene for the pictures: meshes, the edges worth drawing, and where everything goes when it opens."""

from __future__ import annotations

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.mesh import SurfaceMesh
from moldgen.model.halves import Halves
from moldgen.model.motion import total_displacement
from moldgen.model.part import Vector
from moldgen.model.tool import Component, Motion, Role, Tool
from moldgen.output.scene import Scene, SceneBody

SHARP = np.cos(np.radians(20.0))
"""Edges between faces whose facets turn by less are smooth, and not drawn."""


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
    bodies = [b for c in tool.components for b in _bodies(c, halves, _offset(tool, c.motion, lift))]
    sides = {f: 1 if side else -1 for f, side in enumerate(halves.cavity_side.tolist())}
    name, resin, pull = title
    return Scene(name, resin, pull, tuple(bodies), halves.parting_line, gate, sides)


def feature_segments(mesh: SurfaceMesh) -> tuple[np.ndarray, ...]:
    """Return the mesh edges between different faces that meet at an angle, each a segment (2, 3)."""
    corners = mesh.corners
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    normal /= np.maximum(np.linalg.norm(normal, axis=1), 1e-300)[:, None]
    t = mesh.triangles
    ends = np.sort(np.vstack([t[:, [0, 1]], t[:, [1, 2]], t[:, [2, 0]]]), axis=1)
    owner = np.tile(np.arange(len(t)), 3)
    order = np.lexsort((ends[:, 1], ends[:, 0]))
    ends, owner = ends[order], owner[order]
    pair = np.flatnonzero((np.diff(ends, axis=0) == 0).all(axis=1))
    a, b = owner[pair], owner[pair + 1]
    sharp = (mesh.face[a] != mesh.face[b]) & ((normal[a] * normal[b]).sum(axis=1) < SHARP)
    return tuple(mesh.vertices[ends[pair[sharp]]])


def _offset(tool: Tool, group: str, lift: dict[str, float]) -> Vector:
    """Return where a group stands in the open mold: a side action where the steps of the opening leave it."""
    return (0.0, 0.0, lift[group]) if group in lift else total_displacement(tool.steps, group)


def _bodies(component: Component, halves: Halves, offset: Vector) -> list[SceneBody]:
    mesh = halves.body.mesh if component.role is Role.PART else Body(component.solid).mesh
    edges = feature_segments(mesh)
    found = []
    for number, at in enumerate(component.positions, start=1):
        shift = np.asarray(at)
        found.append(
            SceneBody(
                name=f"{component.name} {number}" if len(component.positions) > 1 else component.name,
                role=component.role.value,
                vertices=mesh.vertices + shift,
                triangles=mesh.triangles,
                feature_edges=tuple(e + shift for e in edges) if shift.any() else edges,
                face_id=mesh.face,
                offset_open=offset,
            )
        )
    return found
