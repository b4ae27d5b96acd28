"""The exact difference of two nearly equal solids, as connected pieces: what to remove, and what to add.

Nine tenths of their faces coincide, and the kernel's booleans of such solids are slow and fragile. So meshes say where
they differ (`difference_mesh.py`), both are cut down to a box around each such place, and the kernel subtracts there.
What it makes is held against the mesh and against the volumes of the two solids; else a next rung follows, down to the
facets of a finer mesh.
"""

from __future__ import annotations

import resource
import time
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from functools import partial

import numpy as np
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox
from OCP.gp import gp_Pnt
from OCP.TopoDS import TopoDS_Shape

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.boolean import common, copied, cut
from moldgen.kernel.difference_mesh import (
    DIFFERENCE_NOISE,
    FINE,
    FINE_ANGLE,
    Corners,
    MeshDifference,
    corners_of,
    mesh_difference,
)
from moldgen.kernel.facets import facet_solid
from moldgen.kernel.measure import area, bounding_box, is_valid, volume, volume_adaptive
from moldgen.kernel.meshsolid import MeshSolid
from moldgen.kernel.rehearse import made_apart
from moldgen.kernel.topology import compound_of, parts_of, solids_of
from moldgen.tolerances import SMALL_VOLUME

MARGIN = 0.5173
"""mm round a place that differs. Our choice: an odd figure, so that no side of the box lies in a face of the solid."""

SECONDS = 20
"""Processor time of one rung at one place [s]; the slowest good one took 6 s (measured, a whole cavity scaled)."""

UNSURE = 0.024
"""mm: where the kernel cannot subtract, less is not told. Twice the noise of the meshes, about what a good milling
machine keeps to over a cavity block (common practice): parting walls of one line differed by 0.013 mm and would each
have taken minutes."""

TRIED = 60.0
"""Processor time [s] of refused rungs in one pair of solids after which only facets are tried (our choice)."""

FUZZY = (0.0, 1e-5, 1e-4)
"""mm: the rungs of the kernel; coordinates that differ by less are taken as one [our choice]."""

SAME_BALANCE = 1e-6
"""Volumes of solids agree when they differ by less than this share of the steel in the box [our choice]."""

FINER = 0.0025
"""Sag [mm] of the mesh whose facets stand for a piece that the kernel cannot make."""


@dataclass(frozen=True, eq=False)
class DifferentPiece:
    """One connected piece of the difference, a kernel solid [mm, mm^3]; see `SteelPiece` for `exact`."""

    solid: TopoDS_Shape
    volume_mm3: float
    exact: bool


@dataclass(frozen=True, eq=False)
class SolidDifference:
    """What must go from the old solid (`cut`) and what it lacks (`weld`), each largest first.

    refused : each rung of the ladder that did not stand, with its reason
    """

    cut: tuple[DifferentPiece, ...] = ()
    weld: tuple[DifferentPiece, ...] = ()
    refused: tuple[str, ...] = ()

    @property
    def none(self) -> bool:
        """True when the solids are equal but for noise."""
        return not self.cut and not self.weld


@dataclass(frozen=True, eq=False)
class _Place:
    """A box in which the solids differ, grown by a margin, and what the mesh says of it."""

    box: Corners
    cut: list[MeshSolid]
    weld: list[MeshSolid]


def solid_difference(old: Body, new: Body, clip: Corners | None = None) -> SolidDifference:
    """Return the pieces by which two solids differ, inside the box `clip` [mm] if one is given.

    Parameters
    ----------
    old, new : in one frame, meshed with `FINE` (see `fine_body`)
    clip : lower and upper corner, infinite where it does not bound

    Raises
    ------
    KernelError : a mesh does not close, or no rung gave pieces
    """
    found = mesh_difference(old, new, clip)
    if found.none:
        return SolidDifference()
    tries = _Tries(old, new, _spent())
    cuts: list[DifferentPiece] = []
    welds: list[DifferentPiece] = []
    for place in _places(found, clip):
        for made in _at(place, tries):
            cuts += made[0]
            welds += made[1]
    return SolidDifference(_in_order(cuts), _in_order(welds), tuple(tries.refused))


def fine_body(solid: TopoDS_Shape) -> Body:
    """Return a solid meshed as `solid_difference` wants it."""
    return Body(solid, FINE, FINE_ANGLE)


def sure_volume(solid: TopoDS_Shape) -> float:
    """Return the volume [mm^3], by the default integration where a finer one agrees, else adaptively."""
    quick, checked = volume(solid), volume_adaptive(solid, 1e-7)
    return quick if abs(quick - checked) <= 1e-7 * abs(checked) else checked


def _places(found: MeshDifference, clip: Corners | None) -> list[_Place]:
    """Return disjoint boxes that hold all pieces of the mesh, each with its own."""
    boxes = [(corners_of(p), p, k) for k, pieces in enumerate((found.cut, found.weld)) for p in pieces]
    groups = [((low - MARGIN, high + MARGIN), [(p, k)]) for (low, high), p, k in boxes]
    merged = True
    while merged:
        merged = False
        kept: list[tuple[Corners, list[tuple[MeshSolid, int]]]] = []
        for box, members in groups:
            for n, (other, others) in enumerate(kept):
                if (box[0] <= other[1]).all() and (other[0] <= box[1]).all():
                    both = (np.minimum(box[0], other[0]), np.maximum(box[1], other[1]))
                    kept[n] = (both, [*others, *members])
                    merged = True
                    break
            else:
                kept.append((box, members))
        groups = kept
    places = []
    for box, members in groups:
        within = box if clip is None else (np.maximum(box[0], clip[0]), np.minimum(box[1], clip[1]))
        places.append(_Place(within, [p for p, k in members if k == 0], [p for p, k in members if k == 1]))
    return places


Made = tuple[list[DifferentPiece], list[DifferentPiece]]


def _spent() -> float:
    """Return the processor time of this process and its children until now [s]."""
    children = resource.getrusage(resource.RUSAGE_CHILDREN)
    return time.process_time() + children.ru_utime + children.ru_stime


@dataclass(eq=False)
class _Tries:
    """Two solids and what was tried with them. begun : processor time then [s]; finer : their finer meshes, if made."""

    old: Body
    new: Body
    begun: float
    refused: list[str] = field(default_factory=list)
    finer: list[Body] = field(default_factory=list)


def _at(place: _Place, tries: _Tries) -> Iterator[Made]:
    """Yield the pieces at one place.

    Where the kernel refuses, the place is looked at again without what is hardly more than noise: films along walls
    join what lies far apart, and it is with them that the kernel has its trouble.
    """
    made = _made(tries, place, (0.0,))
    if made is not None:
        yield made
        return
    for sure in _places(mesh_difference(tries.old, tries.new, place.box, UNSURE), place.box):
        same = all(np.allclose(a, b) for a, b in zip(sure.box, place.box, strict=True))
        yield _made(tries, sure, FUZZY[1:] if same else FUZZY) or _of_facets(tries, sure.box)


def _made(tries: _Tries, place: _Place, fuzzy: Sequence[float]) -> Made | None:
    """Return the pieces at one place by the first rung that stands; None when none does, or time is up."""
    for size in fuzzy:
        if tries.refused and _spent() - tries.begun > TRIED:
            return None
        try:
            work = partial(_in_box, tries.old.solid, tries.new.solid, place.box, size)
            return _checked(made_apart(work, SECONDS), place)
        except KernelError as error:
            low, high = place.box
            middle = ", ".join(f"{v:.2f}" for v in 0.5 * (low + high))
            rung = f"cut in a box, coordinates to {size:g} mm" if size else "cut in a box"
            tries.refused.append(f"{rung} about {middle}: {error.what}")
    return None


def _in_box(old: TopoDS_Shape, new: TopoDS_Shape, box: Corners, fuzzy: float) -> list[TopoDS_Shape]:
    """Return four compounds: what to cut, what to weld, and the two solids inside the box."""
    block = BRepPrimAPI_MakeBox(gp_Pnt(*map(float, box[0])), gp_Pnt(*map(float, box[1]))).Shape()
    here = [_inside(solid, block, box) for solid in (old, new)]
    pairs = ((here[0], here[1]), (here[1], here[0]))
    left = [cut(compound_of(a), [compound_of(b)], fuzzy) if a and b else a for a, b in pairs]
    return [compound_of(solids) for solids in (*left, *here)]


def _inside(solid: TopoDS_Shape, block: TopoDS_Shape, box: Corners) -> list[TopoDS_Shape]:
    low, high = bounding_box(solid)
    if (low > box[0]).all() and (high < box[1]).all():
        return [copied(solid)]
    return common(copied(solid), block)


def _checked(compounds: Sequence[TopoDS_Shape], place: _Place) -> Made:
    """Return the pieces that matter if they agree with the mesh and with the solids they are the difference of.

    Raises
    ------
    KernelError : they do not
    """
    cut_solids, weld_solids, old_here, new_here = ([*map(_proper, parts_of(c))] for c in compounds)
    made: list[list[DifferentPiece]] = []
    for solids, mesh in ((cut_solids, place.cut), (weld_solids, place.weld)):
        pieces = [_piece(s) for s in solids if _matters(s)]
        total, expected = sum(p.volume_mm3 for p in pieces), sum(float(m.volume()) for m in mesh)
        slack = FINE * sum(float(m.surface_area()) for m in mesh) + DIFFERENCE_NOISE * sum(map(area, solids), 0.0) * 0.5
        if abs(total - expected) > slack + SMALL_VOLUME:
            raise KernelError(f"{total:.6g} mm^3 where the mesh has {expected:.6g} mm^3")
        made.append(pieces)
    steel = _total(old_here)
    balance = _total(weld_solids) - _total(cut_solids) - (_total(new_here) - steel)
    if abs(balance) > SAME_BALANCE * max(steel, 1.0):
        raise KernelError(f"the volumes are {balance:.3g} mm^3 off the difference of the solids")
    return made[0], made[1]


def _proper(solid: TopoDS_Shape) -> TopoDS_Shape:
    found = solids_of(solid)
    if len(found) != 1:
        raise KernelError("a piece is no solid")
    return found[0]


def _total(solids: Sequence[TopoDS_Shape]) -> float:
    """Return the volume of solids, adaptively: the default integration of real parts was 2 mm^3 off where this was not.

    It takes no longer here: 0.3 s for 300 faces (measured).
    """
    return volume_adaptive(compound_of(solids), 1e-8) if solids else 0.0


def _matters(solid: TopoDS_Shape) -> bool:
    """True when a piece is thicker than noise (2 V / A)."""
    size = volume(solid)
    return size > SMALL_VOLUME and 2.0 * size / max(area(solid), 1e-12) > DIFFERENCE_NOISE / 2.0


def _piece(solid: TopoDS_Shape) -> DifferentPiece:
    if not is_valid(solid):
        raise KernelError("the kernel calls a piece invalid")
    return DifferentPiece(solid, sure_volume(solid), exact=True)


def _of_facets(tries: _Tries, box: Corners) -> Made:
    """Return the pieces of a finer mesh at one place as solids with plane facets: the last rung."""
    tries.finer = tries.finer or [Body(copied(b.solid), FINER, FINE_ANGLE) for b in (tries.old, tries.new)]
    found = mesh_difference(tries.finer[0], tries.finer[1], box, UNSURE)
    cuts, welds = (
        [DifferentPiece(facet_solid(p), float(p.volume()), exact=False) for p in pieces]
        for pieces in (found.cut, found.weld)
    )
    return cuts, welds


def _in_order(pieces: Sequence[DifferentPiece]) -> tuple[DifferentPiece, ...]:
    def rank(piece: DifferentPiece) -> tuple[float, ...]:
        low, _ = bounding_box(piece.solid)
        return (-round(piece.volume_mm3, 6), *(float(v) for v in np.round(low, 4)))

    return tuple(sorted(pieces, key=rank))
