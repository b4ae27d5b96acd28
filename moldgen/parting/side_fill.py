"""The part with the undercuts that side actions form filled: only the halves are made of it, then the fronts are taken
out of these, so what it looks like inside the fronts does not matter.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from moldgen.errors import KernelError, PartError
from moldgen.kernel.body import Body
from moldgen.kernel.boolean import copied, fuse
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.merge import merged_faces
from moldgen.kernel.mesh_prism import outline_mesh
from moldgen.kernel.meshsolid import MeshSolid, mesh_solid, thick_pieces, thickness
from moldgen.kernel.rehearse import made_apart
from moldgen.kernel.side_prism import SHORTEST, outline_prism
from moldgen.model.part import MoldFrame
from moldgen.model.side_action import Front, across
from moldgen.parting.fill import fill_trapped
from moldgen.release.kinds import FaceKinds
from moldgen.release.trapped import Trapped
from moldgen.tolerances import OPEN_OVERLAP

WHY = "side actions form it; the halves are made of the part without it"

SAME_VOLUME = 2e-3
"""Relative difference of volume between a fused part and its mesh from which the kernel is not believed."""

ROUND_BORES = 0.03
"""Share of what the fronts add by which meshes of round walls may be wrong: sag over radius, twice."""

STUB = 1.0
"""mm: how far a front joined to the part runs on beyond the plastic inside it, where that helps (our choice)."""


@dataclass(frozen=True)
class Filled:
    """The part with its undercuts filled, and how."""

    body: Body
    rung: str


def filled_candidates(
    body: Body, kinds: FaceKinds, trapped: Trapped, fronts: Sequence[Front], frame: MoldFrame | None
) -> Iterator[Filled | str]:
    """Yield filled parts, best first, or why a rung gave none. All of what they gain lies inside the fronts."""
    served = sorted({p for front in fronts for p in front.pieces if p >= 0})
    part = mesh_solid(body.mesh)
    rungs: tuple[tuple[str, Callable[[], Body]], ...] = (
        (
            "trapped spaces filled",
            lambda: fill_trapped(body, kinds, [trapped.pieces[p] for p in served], frame, WHY, seconds=3)[0],
        ),
        ("fronts joined to the part", lambda: _with_fronts(body, part, fronts, 0.0)),
        (f"fronts joined, run on by {STUB:g} mm", lambda: _with_fronts(body, part, fronts, STUB)),
    )
    for rung, make in rungs:
        try:
            filled = make()
            outside = outside_fronts(filled, part, fronts)
        except (PartError, KernelError) as error:
            yield f"{rung}: {error.told}"
            continue
        if outside >= OPEN_OVERLAP:
            yield f"{rung}: {outside:.3f} mm of it lie outside the fronts"
            continue
        # a filled bore leaves a disc in its ring: the parting line may have to cross both, and they are one face
        yield Filled(filled.like(merged_faces(filled.solid)), rung)


def _with_fronts(body: Body, part: MeshSolid, fronts: Sequence[Front], stub: float) -> Body:
    """Return the part with the fronts, each as far as there is plastic inside it, joined to it."""
    solids: list[Any] = []
    expected = part
    for front in fronts:
        end = min(front.clear + stub, front.far)
        if end - front.near < SHORTEST:  # it forms an undercut that lies open beside the part
            continue
        solids += outline_prism(front.outline, across(front.axis), front.near, end)
        expected = expected + outline_mesh(front.outline, across(front.axis), front.near, end)
    wanted = float(expected.volume())
    made = made_apart(lambda: fuse([copied(body.solid), *solids]))
    if len(made) != 1:
        raise PartError(f"the part and the fronts make {len(made)} solids")
    got, gained = volume(made[0]), wanted - float(part.volume())
    # the mesh of a bore is up to 3 % narrower than the bore; a front that was lost shows in what stays trapped
    if not is_valid(made[0]) or abs(got - wanted) > SAME_VOLUME * wanted + ROUND_BORES * gained:
        raise PartError(f"joined they have {got:.2f} mm^3, by the mesh it should be {wanted:.2f} mm^3")
    return body.like(made[0])


def outside_fronts(filled: Body, part: MeshSolid, fronts: Sequence[Front]) -> float:
    """Return the thickness [mm] of the thickest piece that a filled part has more than the part, outside fronts."""
    gained = mesh_solid(filled.mesh) - part
    for front in fronts:
        gained = gained - outline_mesh(front.outline, across(front.axis), front.near, front.far)
    return max((thickness(p) for p in thick_pieces(gained)), default=0.0)
