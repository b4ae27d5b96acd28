"""Solids from faces that already share their edges: neither sewing nor booleans.

Real exports carry edge tolerances up to 2e-2 mm, which a tight sewing cannot honour and a boolean may heal wrongly.
Faces that share edges need neither: only their orientation has to agree, which a walk over the edges settles.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass

from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeSolid
from OCP.BRepLib import BRepLib
from OCP.TopAbs import TopAbs_EDGE, TopAbs_FORWARD
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Shape, TopoDS_Shell
from OCP.TopTools import TopTools_IndexedMapOfShape

from moldgen.kernel.measure import area, is_valid, volume
from moldgen.kernel.topology import walk

FLAT_SHELL = 1e-4
"""mm: a closed component with less volume per area than this is two copies of one sheet, not a body."""


@dataclass(frozen=True)
class ShellResult:
    """A solid made of faces, and what speaks against it.

    `free` edges have one face, `crowded` counts edges with more than two, `components` counts separate shells,
    `contradictions` counts edges whose two faces cannot be oriented alike (a one-sided surface).
    """

    solid: TopoDS_Shape
    faces: tuple[TopoDS_Face, ...]
    free: tuple[TopoDS_Edge, ...]
    crowded: int
    components: int
    contradictions: int

    @property
    def closed(self) -> bool:
        """True when the faces bound exactly one body."""
        return not self.free and not self.crowded and self.components == 1 and not self.contradictions

    @property
    def gap(self) -> str:
        """Why the faces do not bound one body, in words; empty when they do."""
        if self.closed:
            return ""
        return (
            f"{len(self.free)} free edges, {self.crowded} crowded edges, {self.components} shells, "
            f"{self.contradictions} contradictions"
        )

    @property
    def complaint(self) -> str:
        """What speaks against the solid, in words; empty when nothing does. Asks the kernel about every face."""
        return self.gap or ("" if is_valid(self.solid) else "the kernel calls the solid invalid")


def solid_from_faces(faces: Sequence[TopoDS_Face], *, drop_flat: bool = False) -> ShellResult:
    """Return the solid that faces with common edges bound, its normals pointing outward.

    With `drop_flat`, components that enclose nothing (two copies of one sheet) are left out.
    """
    uses = _edge_uses(faces)
    neighbours, free, crowded = _neighbours(uses, len(faces))
    flipped, component, contradictions = _orient(neighbours)
    count = max(component, default=-1) + 1
    kept = list(range(len(faces)))
    if drop_flat and count > 1:
        flat = {c for c in range(count) if _is_flat([_turned(faces[i], flipped[i]) for i in kept if component[i] == c])}
        if len(flat) < count:
            kept = [i for i in kept if component[i] not in flat]
            count -= len(flat)
    shell = _shell([_turned(faces[i], flipped[i]) for i in kept])
    solid = BRepBuilderAPI_MakeSolid(shell).Solid()
    BRepLib.OrientClosedSolid_s(solid)
    return ShellResult(solid, tuple(faces[i] for i in kept), tuple(free), crowded, count, contradictions)


def shells_from_faces(faces: Sequence[TopoDS_Face]) -> list[ShellResult]:
    """Return one solid for each connected group of faces, in order of their first face."""
    neighbours, _, _ = _neighbours(_edge_uses(faces), len(faces))
    _, component, _ = _orient(neighbours)
    count = max(component, default=-1) + 1
    return [solid_from_faces([f for f, c in zip(faces, component, strict=True) if c == k]) for k in range(count)]


def _edge_uses(faces: Sequence[TopoDS_Face]) -> list[tuple[TopoDS_Edge, list[tuple[int, bool]]]]:
    """Return each edge with the (face number, forward) of its every use."""
    index = TopTools_IndexedMapOfShape()
    uses: list[tuple[TopoDS_Edge, list[tuple[int, bool]]]] = []
    for number, face in enumerate(faces):
        for occurrence in walk(face, TopAbs_EDGE):
            place = index.Add(occurrence)
            if place > len(uses):
                uses.append((TopoDS.Edge_s(occurrence), []))
            uses[place - 1][1].append((number, occurrence.Orientation() == TopAbs_FORWARD))
    return uses


def _neighbours(
    uses: list[tuple[TopoDS_Edge, list[tuple[int, bool]]]], count: int
) -> tuple[list[list[tuple[int, bool]]], list[TopoDS_Edge], int]:
    """Return for each face its (neighbour, must turn) pairs, the free edges and the number of crowded ones."""
    neighbours: list[list[tuple[int, bool]]] = [[] for _ in range(count)]
    free, crowded = [], 0
    for edge, used in uses:
        if BRep_Tool.Degenerated_s(edge):
            continue
        if len(used) == 1:
            free.append(edge)
        elif len(used) > 2:
            crowded += 1
        elif used[0][0] != used[1][0]:
            (a, forward_a), (b, forward_b) = used
            neighbours[a].append((b, forward_a == forward_b))
            neighbours[b].append((a, forward_a == forward_b))
    return neighbours, free, crowded


def _orient(neighbours: list[list[tuple[int, bool]]]) -> tuple[list[bool], list[int], int]:
    """Walk breadth-first over the faces; return who turns, the component of each face, and the contradictions."""
    flipped = [False] * len(neighbours)
    component = [-1] * len(neighbours)
    contradictions = count = 0
    for seed in range(len(neighbours)):
        if component[seed] >= 0:
            continue
        component[seed] = count
        queue = deque([seed])
        while queue:
            at = queue.popleft()
            for other, turns in neighbours[at]:
                want = flipped[at] ^ turns
                if component[other] < 0:
                    component[other], flipped[other] = count, want
                    queue.append(other)
                elif flipped[other] != want:
                    contradictions += 1
        count += 1
    return flipped, component, contradictions


def _turned(face: TopoDS_Face, flip: bool) -> TopoDS_Face:
    return TopoDS.Face_s(face.Reversed()) if flip else face


def _shell(faces: list[TopoDS_Face]) -> TopoDS_Shell:
    builder, shell = BRep_Builder(), TopoDS_Shell()
    builder.MakeShell(shell)
    for face in faces:
        builder.Add(shell, face)
    shell.Closed(True)
    return shell


def _is_flat(faces: list[TopoDS_Face]) -> bool:
    shell = _shell(faces)
    return abs(volume(shell)) < FLAT_SHELL * max(area(shell), 1e-9)
