"""The forming steel of side actions: fronts taken out of the halves, the part taken out of the fronts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import partial
from typing import Any

import numpy as np

from moldgen.errors import KernelError, PartError
from moldgen.finding import Notes
from moldgen.kernel.body import Body
from moldgen.kernel.boolean import common, copied, cut
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.mesh_prism import grown, outline_mesh, polygons, region
from moldgen.kernel.meshsolid import MeshSolid, mesh_solid, piece_mesh, thick_pieces
from moldgen.kernel.rehearse import made_apart
from moldgen.kernel.side_prism import outline_prism
from moldgen.kernel.step_trip import read_back
from moldgen.kernel.topology import compound_of
from moldgen.model.halves import Halves, SideSteel
from moldgen.model.side_action import Front, SideKind, across
from moldgen.release.kinds import face_kinds
from moldgen.release.sweep import sweep_faces
from moldgen.steel.adopt import Piece, adopt
from moldgen.tolerances import PROOF_ANGLE, PROOF_DEFLECTION

OUT = 1.0
"""mm: how far a front's tool runs out of the block, so that no two planes coincide there."""

SAME_VOLUME = 2e-3
"""Relative difference between a slide and the mesh of front minus part from which the kernel is not believed."""

SLACK = 0.02
"""mm^3: differences of volume below this are those of meshes on small slides."""

ALONG_AXIS = 1e-12
"""1 - cosine up to which an axis is square to a side of the block, so that the front ends on it."""

AT_SIDE = 1e-3
"""mm: a piece this close to the side of the block reaches it."""

CUT_SECONDS = 20
"""Processor time for all fronts of one half; the slowest of use on real parts took 6 s (measured)."""


@dataclass(frozen=True)
class _Tool:
    """One front as the kernel's solid inside the block and as a mesh."""

    name: str
    front: Front
    solids: tuple[Any, ...]
    mesh: MeshSolid


def form_side_steel(halves: Halves, part: Body, fronts: Sequence[Front]) -> tuple[Halves, Notes]:
    """Return the halves without the fronts, and the fronts' steel, cut to the real part.

    halves : of the part with its undercuts filled; part : the real part, mold frame
    fronts : in opening order; what two fronts share belongs to the one that opens first

    Raises
    ------
    KernelError : the kernel cannot cut a slide; the message names it
    PartError : a piece of steel is cut off from every body that could carry it
    """
    corners = (np.asarray(halves.low, float), np.asarray(halves.high, float))
    tools = [_tool(name, front, corners) for name, front in zip(side_names(fronts), fronts, strict=True)]
    mold_part = mesh_solid(part.mesh)
    pieces: list[Piece] = []
    for number, tool in enumerate(tools):
        before = [t for t in tools[:number] if _meet(t, tool)]
        for solid in _steel_of(tool, part, mold_part, before):
            fixed = _reaches_out(solid, tool.front, corners)
            pieces.append(Piece(tool.name, solid, fixed))
    for name, half in (("cavity", halves.cavity), ("core", halves.core)):
        left = _without(half, tools, name)
        largest = max(left, key=volume)
        pieces += [Piece(name, solid, solid is largest) for solid in left]
    bodies, notes = adopt(pieces, {t.name: t.front for t in tools}, part)
    sides = []
    cavity = mesh_solid(Body(bodies["cavity"][0]).mesh)
    for tool in tools:
        own = bodies.get(tool.name, [])
        if not own:
            raise PartError(f"nothing of {tool.name} reaches the outside of the block")
        solid = own[0] if len(own) == 1 else compound_of(own)
        sides.append(SideSteel(tool.name, tool.front, solid, _over_cavity(tool, cavity, corners)))
    made = replace(
        halves, cavity=bodies["cavity"][0], core=bodies["core"][0], sides=tuple(sides), part=copied(part.solid)
    )
    return made, notes


def ways_in_turn(fronts: Sequence[Front], corners: tuple[np.ndarray, np.ndarray]) -> dict[int, float]:
    """Return the fronts that share steel with one that moves another way, by place, and how far each must move [mm].

    They move one after the other, in the order given: the earlier must leave all of the way of the later.
    """
    meshes = [_within(front, corners) for front in fronts]
    ways: dict[int, float] = {}
    for j, later in enumerate(fronts):
        for i, earlier in enumerate(fronts[:j]):
            if SideKind.LIFTER in (earlier.kind, later.kind) or earlier.axis == later.axis:
                continue
            both = meshes[i] ^ meshes[j]
            if both.volume() <= SLACK:
                continue
            shared = piece_mesh(both).vertices @ np.asarray(earlier.axis)
            ways[i] = max(ways.get(i, earlier.travel), float(shared.max()) - earlier.near)
            ways.setdefault(j, later.travel)
    return ways


def side_names(fronts: Sequence[Front]) -> list[str]:
    """Return "slide 1", "slide 2", "lifter 1", ... for fronts in order."""
    count: dict[SideKind, int] = {}
    names = []
    for front in fronts:
        count[front.kind] = count.get(front.kind, 0) + 1
        names.append(f"{front.kind} {count[front.kind]}")
    return names


def _tool(name: str, front: Front, corners: tuple[np.ndarray, np.ndarray]) -> _Tool:
    frame, far = across(front.axis), _reach(front, corners)
    square = bool(np.max(np.abs(frame[2])) > 1.0 - ALONG_AXIS)
    prisms = outline_prism(front.outline, frame, front.near, far if square else far + OUT)
    inside = prisms if square else [s for prism in prisms for s in _trimmed(prism, corners)]
    if not inside:
        raise KernelError(f"{name} lies outside the block")
    return _Tool(name, front, tuple(inside), _within(front, corners))


def _reach(front: Front, corners: tuple[np.ndarray, np.ndarray]) -> float:
    """Return how far the block reaches along the axis of a front [mm]."""
    block = np.array([[corners[k][i] for i, k in enumerate(bits)] for bits in np.ndindex(2, 2, 2)])
    return float((block @ np.asarray(front.axis)).max())


def _outline_of(corners: tuple[np.ndarray, np.ndarray]) -> np.ndarray:
    """Return the block in plan, (4, 2) [mm]."""
    low, high = corners
    return np.array([[low[0], low[1]], [high[0], low[1]], [high[0], high[1]], [low[0], high[1]]])


def _trimmed(prism: Any, corners: tuple[np.ndarray, np.ndarray]) -> list[Any]:
    block = outline_prism([_outline_of(corners)], np.eye(3), float(corners[0][2]), float(corners[1][2]))[0]
    return common(prism, block)


def _within(front: Front, corners: tuple[np.ndarray, np.ndarray]) -> MeshSolid:
    """Return a front inside the block as a mesh, without asking the kernel: it is judged by this."""
    block = outline_mesh([_outline_of(corners)], np.eye(3), float(corners[0][2]), float(corners[1][2]))
    return outline_mesh(front.outline, across(front.axis), front.near, _reach(front, corners) + OUT) ^ block


def _meet(one: _Tool, other: _Tool) -> bool:
    return bool((one.mesh ^ other.mesh).volume() > SLACK)


def _steel_of(tool: _Tool, part: Body, mold_part: MeshSolid, before: Sequence[_Tool]) -> list[Any]:
    """Return the pieces of a front without the part and without the fronts that open before it."""
    others = [s for t in before for s in t.solids]
    wanted = tool.mesh - mold_part
    for t in before:
        wanted = wanted - t.mesh
    expected = float(wanted.volume())
    tools = [copied(part.solid), *others]
    try:
        found = made_apart(lambda: [s for solid in tool.solids for s in cut(copied(solid), tools)], CUT_SECONDS)
    except KernelError as error:
        raise KernelError(f"cutting the part from {tool.name}: {error.what}") from error
    got = sum(volume(s) for s in found)
    if abs(got - expected) > SAME_VOLUME * expected + SLACK:
        raise KernelError(f"{tool.name} has {got:.3f} mm^3, by the mesh it should be {expected:.3f} mm^3")
    bad = [s for s in found if not is_valid(s)]
    if bad:
        raise KernelError(f"{len(bad)} pieces of {tool.name} are no valid solids")
    for solid in found:  # where steel runs out to nothing, the mesh of what is read back does not close
        mesh_solid(Body(read_back(solid), PROOF_DEFLECTION, PROOF_ANGLE).mesh)
    return [s for s in found if volume(s) > 0.0]


def narrowed(front: Front, by: float) -> Front:
    """Return a front with its outline drawn in on all sides [mm]; the head of a lifter reaches farther up instead."""
    outline = polygons(grown(region(front.outline), -by))
    near = front.near - by if front.kind is SideKind.LIFTER else front.near
    return replace(front, outline=outline, near=near, rung=f"{front.rung}, {by:g} mm narrower")


def _without(half: Any, tools: Sequence[_Tool], name: str) -> list[Any]:
    """Return the pieces of a half without all fronts: at once, or one front after the other."""
    solids = [s for t in tools for s in t.solids]
    mesh = mesh_solid(Body(half).mesh)
    for tool in tools:
        mesh = mesh - tool.mesh
    expected = float(mesh.volume())
    complaints = []
    for way, groups in (("at once", [solids]), ("one by one", [[s] for s in solids])):
        try:
            found = made_apart(partial(_cut_in_turn, half, groups), CUT_SECONDS)
        except KernelError as error:
            complaints.append(f"{way}: {error.what}")
            continue
        got = sum(volume(s) for s in found)
        if not found or abs(got - expected) > SAME_VOLUME * expected:
            complaints.append(f"{way}: {got:.1f} mm^3 instead of {expected:.1f}")
        elif not all(is_valid(s) for s in found):
            complaints.append(f"{way}: not a valid solid")
        else:
            return found
    raise KernelError(f"taking the side actions out of the {name}: {'; '.join(complaints)}")


def _cut_in_turn(half: Any, groups: Sequence[Sequence[Any]]) -> list[Any]:
    left = [copied(half)]
    for group in groups:
        left = [copied(s) for solid in left for s in cut(solid, group)]
    return left


def _over_cavity(tool: _Tool, cavity: MeshSolid, corners: tuple[np.ndarray, np.ndarray]) -> bool:
    """Return whether steel of the cavity half lies under a front, in the way when that half lifts."""
    height = float(corners[1][2] - corners[0][2])
    for solid in tool.solids:
        body = Body(solid)
        below = sweep_faces(body, face_kinds(body), up=False, way=height)
        if thick_pieces(below ^ cavity):
            return True
    return False


def _reaches_out(solid: Any, front: Front, corners: tuple[np.ndarray, np.ndarray]) -> bool:
    low, high = Body(solid).box
    if front.kind is SideKind.LIFTER:
        return bool(low[2] < corners[0][2] + AT_SIDE)
    return bool((low < corners[0] + AT_SIDE).any() or (high > corners[1] - AT_SIDE).any())
