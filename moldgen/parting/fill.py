"""The part with its trapped spaces filled: what a straight-pull tool can mold when the user accepts that.

A ladder for each trapped piece, best first: take out the faces that are mostly trapped and close their rims; or carry
the faces that look one way along the pull and cut the part from the prism. Each rung's volume is held against the mesh.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from moldgen.errors import KernelError, PartError
from moldgen.finding import Decision, Notes
from moldgen.kernel.body import Body
from moldgen.kernel.boolean import common, copied, cut, fuse, inside_box, prism
from moldgen.kernel.loops import boundary_loops
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.meshsolid import piece_mesh
from moldgen.kernel.patches import flat_patches
from moldgen.kernel.rehearse import LIMIT_S, made_apart
from moldgen.kernel.shells import shells_from_faces, solid_from_faces
from moldgen.kernel.topology import compound_of, only_solid
from moldgen.model.part import MoldFrame
from moldgen.release.kinds import FaceKinds, Kind
from moldgen.release.place import part_point
from moldgen.release.trapped import TrapPiece

MOSTLY = 0.5
"""A face with more of its area on the trapped piece goes with it."""

PARTLY = 0.03
"""A leaning face with more than this, but less than most, of its area on the piece speaks against whole faces."""

FUSED_VOLUME = 1e-4
"""Relative error of the filled volume that is accepted: a fuse once returned a valid solid without the part."""


@dataclass(frozen=True)
class _Plug:
    solids: tuple[Any, ...]
    rung: str


ACCEPTED = "the spec accepts filled undercuts (parting.undercuts: fill)"
"""Why a place is molded full."""


def fill_trapped(
    body: Body,
    kinds: FaceKinds,
    pieces: Sequence[TrapPiece],
    frame: MoldFrame | None = None,
    why: str = ACCEPTED,
    *,
    seconds: int = LIMIT_S,
) -> tuple[Body, Notes]:
    """Return the body with trapped pieces (rubs included, if given) filled.

    frame : the way back to part coordinates, for what is told; why : the reason that is told
    seconds : processor time that a rung may take for one piece

    Raises
    ------
    PartError : a piece cannot be filled; its place and what each rung said are named
    """
    gone: set[int] = set()
    patches: list[Any] = []
    plugs: list[_Plug] = []
    decisions = []
    for piece in pieces:
        whole = _whole_faces(body, kinds, piece, gone)
        if isinstance(whole, str):
            plug, refused = _prism_plug(body, kinds, piece, frame, seconds)
            plugs.append(plug)
            decisions.append(_decision(piece, frame, plug.rung, why, (f"whole faces: {whole}", *refused)))
        else:
            faces, rims = whole
            gone |= faces
            patches += rims
            decisions.append(_decision(piece, frame, "whole faces taken out", why, ()))
    filled = _patched(body, gone, patches) if gone else body.solid
    if plugs:
        filled = _fused(filled, [s for p in plugs for s in p.solids])
    return body.like(copied(filled)), Notes(decisions=tuple(decisions))


def _whole_faces(body: Body, kinds: FaceKinds, piece: TrapPiece, gone: set[int]) -> tuple[set[int], list[Any]] | str:
    """Return the faces to take out and the plane faces over their rims, or why that does not work."""
    share = {f: a / max(float(body.face_areas[f]), 1e-12) for f, a in piece.faces}
    faces = {f for f, s in share.items() if s > MOSTLY}
    partly = [
        f
        for f, s in share.items()
        if (PARTLY < s <= MOSTLY or (f in faces and s < 0.9)) and kinds.kind[f] != Kind.VERTICAL
    ]
    if partly or not faces or faces & gone:
        return f"{len(partly)} faces are trapped only in part" if partly else "no face of its own"
    loops = boundary_loops(body, np.isin(np.arange(len(body.faces)), sorted(faces)))
    flat = flat_patches(loops)
    if sum(len(p.loops) for p in flat) < len(loops):
        return "a rim is not flat"
    rims = [p.face for p in flat]
    shells = shells_from_faces([*(body.faces[f] for f in sorted(faces)), *rims])
    if any(s.complaint for s in shells):
        return "the faces and their rims do not close"
    plug = sum(abs(volume(s.solid)) for s in shells)
    if abs(plug - piece.volume_mm3) > 0.25 * piece.volume_mm3 + 0.02:
        return f"the plug has {plug:.3f} mm^3, the trapped piece {piece.volume_mm3:.3f}"
    return faces, rims


def _patched(body: Body, gone: set[int], patches: Sequence[Any]) -> Any:
    kept = [f for i, f in enumerate(body.faces) if i not in gone]
    result = solid_from_faces([*kept, *patches], drop_flat=True)
    if result.complaint:
        raise PartError(f"the part without its trapped faces does not close: {result.complaint}")
    return result.solid


def _prism_plug(
    body: Body, kinds: FaceKinds, piece: TrapPiece, frame: MoldFrame | None, seconds: int
) -> tuple[_Plug, tuple[str, ...]]:
    mesh = piece_mesh(piece.solid)
    low, high = mesh.vertices.min(axis=0), mesh.vertices.max(axis=0)
    height = float(high[2] - low[2])
    down = _looking(body, kinds, piece, upper=False)
    up = _looking(body, kinds, piece, upper=True)
    part = copied(body.solid)
    rungs: list[tuple[str, Callable[[], list[Any]]]] = []
    if down:
        rungs.append(("prism below the faces that look down", lambda: cut(_joined(down, -height), [part])))
    if up:
        rungs.append(("prism above the faces that look up", lambda: cut(_joined(up, height), [part])))
    if down and up:
        between = 1.1 * height + 0.1
        rungs.append(
            ("between both prisms", lambda: cut_all(common(_joined(down, -between), _joined(up, between)), part))
        )
    refused = []
    for name, make in rungs:
        try:
            solids = [s for s in made_apart(make, seconds) if abs(volume(s)) > 1e-7 and inside_box(s, low, high)]
        except KernelError as error:
            refused.append(f"{name}: {error.what}")
            continue
        got = sum(volume(s) for s in solids)
        allowed = 0.04 * piece.volume_mm3 + 0.005 * piece.area_mm2
        if solids and abs(got - piece.volume_mm3) < allowed and all(is_valid(s) for s in solids):
            return _Plug(tuple(solids), name), tuple(refused)
        refused.append(f"{name}: {len(solids)} solids of {got:.4f} mm^3 instead of {piece.volume_mm3:.4f}")
    x, y, z = part_point(piece.at, frame)
    raise PartError(
        "an undercut cannot be filled: " + "; ".join(refused),
        where=f"face at {x:.3f}, {y:.3f}, {z:.3f}",
        remedy="fill it in the part, or give another pull",
    )


def cut_all(solids: Sequence[Any], tool: Any) -> list[Any]:
    """Return what is left of several solids when one tool is cut from each."""
    return [piece for solid in solids for piece in cut(solid, [tool])]


def _looking(body: Body, kinds: FaceKinds, piece: TrapPiece, *, upper: bool) -> list[Any]:
    wanted = (Kind.UPPER if upper else Kind.LOWER, Kind.STRADDLING)
    column = 0 if upper else 1
    return [
        body.faces[f]
        for f, a in piece.faces
        if a > 1e-3 and kinds.kind[f] in wanted and kinds.overhang[f, column] > 0.005
    ]


def _joined(faces: Sequence[Any], height: float) -> Any:
    prisms = fuse([prism(f, height) for f in faces])
    return only_solid(prisms[0]) if len(prisms) == 1 else compound_of(prisms)


def _fused(solid: Any, plugs: Sequence[Any]) -> Any:
    expected = volume(solid) + sum(volume(p) for p in plugs)
    try:
        result = made_apart(lambda: fuse([copied(solid), *plugs]))
    except KernelError as error:
        raise PartError(
            f"joining the part with {len(plugs)} fillings: {error.what}",
            remedy="fill these undercuts in the part, or give another pull",
        ) from error
    if len(result) != 1:
        raise PartError(f"the part and its fillings make {len(result)} solids")
    if not is_valid(result[0]) or abs(volume(result[0]) - expected) > FUSED_VOLUME * expected:
        raise PartError("the part with its fillings is not a sound solid of the expected volume")
    return result[0]


def _decision(piece: TrapPiece, frame: MoldFrame | None, rung: str, why: str, refused: tuple[str, ...]) -> Decision:
    x, y, z = part_point(piece.at, frame)
    return Decision(
        topic="undercut filled",
        choice=f"{piece.volume_mm3:.3f} mm^3 at {x:.2f}, {y:.2f}, {z:.2f} filled in the molded part",
        why=why,
        rung=rung,
        refused=refused,
    )
