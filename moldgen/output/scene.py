"""What the pictures show, as plain arrays: no kernel shape gets this far, and a scene can travel as a file."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

Points = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]
Vector = tuple[float, float, float]

BY_SLIDE, BY_LIFTER = 2, 3
"""What forms a face of the part, beside the halves, which are +1 and -1."""

WELD_MM = 1e-6
"""Vertices closer than this are one point: the kernel meshes the two faces of an edge on the same points."""


@dataclass(frozen=True)
class SceneBody:
    """One component where it stands in the closed mold (pull along +z).

    Parameters
    ----------
    name : the component's name
    role : the component's role in the words of `moldgen.model.tool.Role`, such as ``cavity``
    vertices : (n, 3) float [mm]; may repeat along face borders
    triangles : (m, 3) indices into `vertices`, closed and turned outward
    feature_edges : polylines (k, 3) float [mm], the edges to be drawn
    face_id : (m,) the face each triangle belongs to
    offset_open : how far the body stands from its closed place when the mold is open [mm]
    offset_half : the same in the middle of the way of the slides, or of the lifters where there are no slides [mm]
    """

    name: str
    role: str
    vertices: Points
    triangles: Indices
    feature_edges: tuple[Points, ...]
    face_id: Indices
    offset_open: Vector = (0.0, 0.0, 0.0)
    offset_half: Vector = (0.0, 0.0, 0.0)

    @cached_property
    def welded(self) -> tuple[Points, Indices]:
        """The distinct points (k, 3) of `vertices`, and for each vertex the index of its point (n,)."""
        grid = np.round(self.vertices / WELD_MM).astype(np.int64)
        order = np.lexsort(grid.T)
        new = np.ones(len(order), dtype=bool)
        new[1:] = (grid[order[1:]] != grid[order[:-1]]).any(axis=1)
        index = np.empty(len(order), dtype=np.int64)
        index[order] = np.cumsum(new) - 1
        return self.vertices[order[new]], index


@dataclass(frozen=True)
class Scene:
    """The tool and its part, mold coordinates [mm], and the words of the title line.

    `face_sides` says for each `face_id` of the part what forms it: +1 cavity, -1 core, `BY_SLIDE`, `BY_LIFTER`, 0 or
    absent nothing yet.
    """

    name: str
    resin: str
    pull: str
    bodies: tuple[SceneBody, ...]
    parting_lines: tuple[Points, ...] = ()
    gate: Vector | None = None
    face_sides: Mapping[int, int] = field(default_factory=dict)

    @property
    def side_actions(self) -> tuple[SceneBody, ...]:
        """The slides, then the lifters."""
        return self.of_role("slide") + self.of_role("lifter")

    def of_role(self, role: str) -> tuple[SceneBody, ...]:
        """Return the bodies of one role, in order."""
        return tuple(body for body in self.bodies if body.role == role)


def write_scene(scene: Scene, path: Path) -> None:
    """Write `scene` to `path` (.npz): arrays as they are, words as JSON; nothing that could run code when read."""
    arrays: dict[str, Any] = {}
    head: dict[str, Any] = {
        "name": scene.name,
        "resin": scene.resin,
        "pull": scene.pull,
        "gate": scene.gate,
        "bodies": [
            {
                "name": b.name,
                "role": b.role,
                "offset_open": list(b.offset_open),
                "offset_half": list(b.offset_half),
            }
            for b in scene.bodies
        ],
    }
    for i, body in enumerate(scene.bodies):
        arrays[f"vertices_{i}"] = np.asarray(body.vertices, dtype=np.float64).reshape(-1, 3)
        arrays[f"triangles_{i}"] = np.asarray(body.triangles, dtype=np.int64).reshape(-1, 3)
        arrays[f"face_id_{i}"] = np.asarray(body.face_id, dtype=np.int64).reshape(-1)
        arrays[f"edges_{i}"], arrays[f"edge_ends_{i}"] = _joined(body.feature_edges)
    arrays["parting"], arrays["parting_ends"] = _joined(scene.parting_lines)
    sides = sorted((int(face), int(side)) for face, side in scene.face_sides.items())
    arrays["sides"] = np.array(sides, dtype=np.int64).reshape(-1, 2)
    arrays["head"] = np.frombuffer(json.dumps(head, default=float).encode(), dtype=np.uint8)
    with path.open("wb") as file:
        np.savez(file, **arrays)


def read_scene(path: Path) -> Scene:
    """Return the scene that `write_scene` wrote to `path`.

    Raises
    ------
    OSError, ValueError, KeyError : `path` is not such a file
    """
    with np.load(path, allow_pickle=False) as arrays:
        head = json.loads(arrays["head"].tobytes())
        bodies = tuple(
            SceneBody(
                name=words["name"],
                role=words["role"],
                vertices=arrays[f"vertices_{i}"],
                triangles=arrays[f"triangles_{i}"],
                feature_edges=_parted(arrays[f"edges_{i}"], arrays[f"edge_ends_{i}"]),
                face_id=arrays[f"face_id_{i}"],
                offset_open=tuple(words["offset_open"]),
                offset_half=tuple(words["offset_half"]),
            )
            for i, words in enumerate(head["bodies"])
        )
        return Scene(
            name=head["name"],
            resin=head["resin"],
            pull=head["pull"],
            bodies=bodies,
            parting_lines=_parted(arrays["parting"], arrays["parting_ends"]),
            gate=None if head["gate"] is None else tuple(head["gate"]),
            face_sides={int(face): int(side) for face, side in arrays["sides"]},
        )


def _joined(lines: Sequence[Points]) -> tuple[Points, Indices]:
    """Return the points of all polylines in one array, and where each polyline ends in it."""
    arrays = [np.asarray(line, dtype=np.float64).reshape(-1, 3) for line in lines]
    ends = np.cumsum([len(a) for a in arrays], dtype=np.int64)
    return (np.concatenate(arrays) if arrays else np.zeros((0, 3))), ends


def _parted(points: Points, ends: Indices) -> tuple[Points, ...]:
    return tuple(np.split(points, ends[:-1])) if len(ends) else ()
