"""What becomes of each component: unchanged, moved, to be cut, to be welded, new or gone, with the pieces of steel."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from moldgen.errors import KernelError
from moldgen.finding import Finding, Severity
from moldgen.kernel.body import Body
from moldgen.kernel.measure import bounding_box
from moldgen.kernel.piece_measure import depth_from, point_inside
from moldgen.kernel.place import moved, turned
from moldgen.kernel.solid_difference import DifferentPiece, SolidDifference, fine_body, solid_difference
from moldgen.model.part import UPRIGHT, Box, Vector, vector
from moldgen.model.revision import ComponentChange, Fate, SteelPiece, Work
from moldgen.model.tool import Role
from moldgen.revision.causes import Causes
from moldgen.revision.components import BLOCKS, SMALL_PARTS, Match, matched
from moldgen.revision.placing import Placing
from moldgen.revision.shared_block import shared_upright, turned_by_deg
from moldgen.revision.tool_record import ToolRecord

STANDS_STILL = 1e-3
"""mm: a component that stands this near to its old place did not move (our choice)."""

MUST_GROW = "the block must grow"
"""How the note of a block begins for which the old one is too small."""

OFF_SIDE = 0.05
"""mm of steel inside an outer side of a block that are left out where the sides of both blocks differ (our choice)."""


@dataclass(frozen=True, eq=False)
class ComparedComponent:
    """One component; where steel is cut or welded, with its solids: as it is to be, and one body a piece."""

    change: ComponentChange
    steel: Body | None = None
    pieces: tuple[Body, ...] = ()


def compare_steel(
    old: ToolRecord, new: ToolRecord, placing: Placing, causes: Causes
) -> tuple[list[ComparedComponent], tuple[Finding, ...]]:
    """Return what becomes of every steel component, and what could not be compared.

    Raises
    ------
    PartError : a STEP file is damaged
    """
    found: list[ComparedComponent] = []
    findings: list[Finding] = []
    for match in matched(old, new, placing):
        if not placing.upright and match.old is not None and match.new is not None:
            found.append(_whole(match, Fate.NEW, "the tools open along different axes: nothing fits"))
            continue
        try:
            found.append(_compared(match, (old, new), placing, causes))
        except KernelError as error:
            findings.append(_not_compared(match, error))
            found.append(_whole(match, Fate.NOT_COMPARED, error.what))
    return found, tuple(findings)


def _compared(
    match: Match, tools: tuple[ToolRecord, ToolRecord], placing: Placing, causes: Causes
) -> ComparedComponent:
    if match.old is None or match.new is None:
        return _whole(match, Fate.GONE if match.new is None else Fate.NEW)
    shift = match.shift or (0.0, 0.0, 0.0)
    still = max(map(abs, shift)) <= STANDS_STILL
    if placing.rotation == UPRIGHT and match.old.digest == match.new.digest:
        return _whole(match, Fate.UNCHANGED if still else Fate.MOVED, "" if still else _moved_by(shift))
    now = match.now[0]
    standing = moved(match.new.solid, now.at) if any(now.at) else match.new.solid
    before = placing.solid(moved(match.old.solid, match.old.positions[match.was[0].number - 1]))
    if match.new.role in SMALL_PARTS and not still:
        before = moved(before, shift)  # a pin is compared where it goes, not where it stood
    steel, was = fine_body(standing), fine_body(before)
    clip, outside = _clip(match, tools, placing)
    made = solid_difference(was, steel, clip)
    if not made.none and still and match.new.role not in BLOCKS:
        elsewhere = _moved_whole(was, steel)
        if elsewhere is not None:
            return _whole(match, Fate.MOVED, _moved_by(elsewhere), elsewhere)
    if made.none and outside.startswith(MUST_GROW):
        return _whole(match, Fate.NEW, outside)  # its form stays, and yet the old block is too small for it
    if made.none:
        fate, note = (Fate.UNCHANGED, outside) if still else (Fate.MOVED, _moved_by(shift))
        return _whole(match, fate, note)
    return _with_pieces(_Made(match, made, was, steel, still), causes, outside)


@dataclass(frozen=True, eq=False)
class _Made:
    """A component whose solids differ: the old one where it is compared, and the new one."""

    match: Match
    made: SolidDifference
    was: Body
    steel: Body
    still: bool


def _with_pieces(made: _Made, causes: Causes, outside: str) -> ComparedComponent:
    """Return a component with all pieces of all its copies, cut before weld, the largest first."""
    match = made.match
    fate = Fate.WELD if made.made.weld else Fate.CUT
    note = outside or ("" if made.still else _moved_by(match.shift or (0.0, 0.0, 0.0)))
    if outside.startswith(MUST_GROW):
        fate = Fate.NEW
    if match.new is not None and match.new.role in SMALL_PARTS and fate is Fate.WELD:
        longer = made.steel.box[1][2] - made.steel.box[0][2] - (made.was.box[1][2] - made.was.box[0][2])
        other = f"{abs(longer):.3f} mm {'longer' if longer > 0 else 'shorter'}" if abs(longer) > STANDS_STILL else ""
        words = ", ".join(w for w in (other or "of another form", "" if made.still else note) if w)
        text = f"{words}: take another one, it is not worth welding"
        return _whole(match, Fate.NEW, text)
    pieces: list[SteelPiece] = []
    bodies: list[Body] = []
    for work, found in ((Work.CUT, made.made.cut), (Work.WELD, made.made.weld)):
        for number, piece in enumerate(found):
            for piece_told, body in _copies(made, work, piece, number * len(match.now), causes):
                pieces.append(piece_told)
                bodies.append(body)
    return ComparedComponent(_change(match, fate, tuple(pieces), note), made.steel, tuple(bodies))


def _copies(
    made: _Made, work: Work, piece: DifferentPiece, before: int, causes: Causes
) -> Iterator[tuple[SteelPiece, Body]]:
    """Yield one piece for each copy of the component; `before` pieces of this work have been told of already."""
    now = made.match.now
    body = fine_body(piece.solid)
    depth, inside = depth_from(body, made.was), point_inside(body)
    for number, copy in enumerate(now, start=before + 1):
        by = _difference(copy.at, now[0].at)
        # a copy with geometry of its own: STEP would hold shared geometry once only
        here = body if not any(by) else fine_body(turned(piece.solid, UPRIGHT, by))
        low, high = bounding_box(here.solid)
        at, box = vector(inside + by), (vector(low), vector(high))
        name = copy.name if len(copy.part.positions) > 1 else copy.part.name
        told = SteelPiece(
            component=name,
            work=work,
            number=number,
            volume_mm3=piece.volume_mm3,
            depth_mm=depth,
            at=at,
            at_part=causes.frame.to_part(at),
            box=box,
            exact=piece.exact,
            file=f"step/{work.value}_{name.replace(' ', '_')}_{number}.step",
            cause=causes.of(box),
        )
        yield told, here


def _moved_whole(was: Body, steel: Body) -> Vector | None:
    """Return how far a component built in place moved, if it is the same solid at another place; else None."""
    (old_low, old_high), (low, high) = was.box, steel.box
    by = low - old_low
    if np.abs((high - low) - (old_high - old_low)).max() > 1e-4 or np.abs(by).max() <= STANDS_STILL:
        return None
    there = fine_body(moved(was.solid, vector(by)))
    return vector(by) if solid_difference(there, steel).none else None


def _clip(
    match: Match, tools: tuple[ToolRecord, ToolRecord], placing: Placing
) -> tuple[tuple[np.ndarray, np.ndarray] | None, str]:
    """Return the box that both blocks share, open where their sides are in one plane, and what to say of them."""
    if match.new is None or match.new.role not in BLOCKS:
        return None, ""
    if not placing.square:
        return _clip_turned(match.new.role, tools, placing)
    (old_low, old_high), (low, high) = (np.array(b) for b in (placing.box(tools[0].block), tools[1].block))
    (clip_low, clip_high), apart = _inside_both(match.new.role, placing.box(tools[0].block), tools[1].block)
    if not apart.any():
        return None, ""
    grown = (high - low) - (old_high - old_low)
    if (np.where(apart, grown, 0.0) > STANDS_STILL).any():
        was, now = (" x ".join(f"{v:g}" for v in np.round(b - a, 3)) for a, b in ((old_low, old_high), (low, high)))
        note = f"{MUST_GROW} from {was} to {now} mm, unless the spec keeps its size (blocks)"
    elif (grown < -STANDS_STILL).any():
        note = "a smaller block would do: the old one can stay"
    else:
        middle = 0.5 * (low + high - old_low - old_high)
        note = f"the form stands off the block's middle by {middle[0]:.3f}, {middle[1]:.3f} mm: the block can stay"
    return (clip_low, clip_high), note


def _inside_both(role: Role, old: Box, new: Box) -> tuple[tuple[np.ndarray, np.ndarray], np.ndarray]:
    """Return the box just inside the sides of both blocks, and along which axes it bounds, (3,) bool.

    A side in one plane does not bound, and none where the halves meet: there each half has its own steel.
    """
    (old_low, old_high), (low, high) = (np.array(b) for b in (old, new))
    outer_low, outer_high = np.array([True, True, role is Role.CORE]), np.array([True, True, role is Role.CAVITY])
    apart_low, apart_high = (np.abs(low - old_low) > 1e-6) & outer_low, (np.abs(high - old_high) > 1e-6) & outer_high
    clip_low = np.where(apart_low, np.maximum(low, old_low) + OFF_SIDE, -np.inf)
    clip_high = np.where(apart_high, np.minimum(high, old_high) - OFF_SIDE, np.inf)
    return (clip_low, clip_high), apart_low | apart_high


def _clip_turned(
    role: Role, tools: tuple[ToolRecord, ToolRecord], placing: Placing
) -> tuple[tuple[np.ndarray, np.ndarray] | None, str]:
    """Return an upright box that both blocks share although one is turned to the other, and what to say of that."""
    by = f"the blocks stand turned to each other by {turned_by_deg(placing):.1f} deg"
    (part,) = (c for c in tools[1].components if c.role is Role.PART)
    low, high = bounding_box(part.solid)
    old, new = tools[0].block, tools[1].block
    found = shared_upright(old, new, placing, (vector(low), vector(high)))
    if found is None:
        return None, f"{by}: compared with their outsides"
    (bottom, top), _ = _inside_both(role, placing.box(old), new)
    box = np.array([*(found[0] + OFF_SIDE), bottom[2]]), np.array([*(found[1] - OFF_SIDE), top[2]])
    return box, f"{by}: compared inside the box that both share"


def _whole(match: Match, fate: Fate, note: str = "", shift: Vector | None = None) -> ComparedComponent:
    """Return a component without pieces."""
    return ComparedComponent(_change(match, fate, (), note, shift))


def _change(
    match: Match, fate: Fate, pieces: tuple[SteelPiece, ...], note: str, shift: Vector | None = None
) -> ComponentChange:
    part = match.new or match.old
    if part is None:
        raise LookupError("a match of nothing")
    was = match.old.material if match.old is not None else ""
    if match.old is not None and match.new is not None and was != part.material:
        note = "; ".join(n for n in (note, f"steel {part.material} instead of {was}") if n)
    return ComponentChange(
        old=match.names[0],
        new=match.names[1],
        role=part.role.value,
        fate=fate,
        pieces=pieces,
        shift=shift or match.shift,
        count_old=len(match.was),
        count_new=len(match.now),
        material=part.material,
        was_material=was,
        note=note,
    )


def _not_compared(match: Match, error: KernelError) -> Finding:
    name = (match.new or match.old).name  # type: ignore[union-attr]
    return Finding(
        code="compare.not_compared",
        severity=Severity.WARNING,
        message=f"{name} could not be compared: {error.what}",
        where=name,
        remedy="lay the two STEP files over each other in a CAD system",
    )


def _moved_by(shift: Sequence[float]) -> str:
    return "moved by " + ", ".join(f"{v + 0.0:.3f}" for v in np.round(shift, 3)) + " mm"


def _difference(a: Vector, b: Vector) -> Vector:
    return (a[0] - b[0], a[1] - b[1], a[2] - b[2])
