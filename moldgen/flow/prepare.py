"""The part in the mold, ready to be parted: faces split where they turn over, one closed mesh, trapped space known."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

from moldgen.errors import KernelError, PartError
from moldgen.finding import Decision, Notes
from moldgen.kernel.body import Body
from moldgen.kernel.crossing import crossings
from moldgen.kernel.meshsolid import mesh_solid
from moldgen.kernel.prepare import preparations
from moldgen.model.part import MoldFrame
from moldgen.release.imprint import imprint_silhouettes
from moldgen.release.kinds import FaceKinds, face_kinds
from moldgen.release.place import part_point
from moldgen.release.trapped import Trapped, trapped_volume


@dataclass(frozen=True)
class Prepared:
    """The part in mold coordinates (pull +z), every face looking one way."""

    body: Body
    kinds: FaceKinds

    @cached_property
    def trapped(self) -> Trapped:
        """What is trapped between its faces: mesh solids, which no store can hold, found again from the mesh."""
        return trapped_volume(self.body, self.kinds)

    def with_trapped(self, trapped: Trapped) -> Prepared:
        """Return the same part where it is known already what is trapped."""
        known = Prepared(self.body, self.kinds)
        known.__dict__["trapped"] = trapped
        return known

    def __getstate__(self) -> dict[str, Any]:
        """Return what `moldgen.kernel.frozen` keeps."""
        return {"body": self.body, "kinds": self.kinds}


def prepare(solid: Any, volume_mm3: float | None = None, frame: MoldFrame | None = None) -> tuple[Prepared, Notes]:
    """Return the part ready to be parted, by the first rung of the preparation ladder that copes with all of it.

    solid : the part in mold coordinates; volume_mm3 : its volume, if known
    frame : the way back to part coordinates, for findings

    Raises
    ------
    PartError : no rung copes; each with its reason. Or two faces of the part pass through each other
    """
    refused: list[str] = []
    for candidate in preparations(solid, volume_mm3):
        refused = [*candidate.refused, *refused[len(candidate.refused) :]]
        try:
            prepared, notes = prepared_body(Body(candidate.solid), frame)
        except KernelError as error:
            refused.append(f"{candidate.rung}: {error.told}")
            continue
        _refuse_crossings(prepared.body, frame)
        choice = f"{len(prepared.body.faces)} faces"
        why = "every face meshes, the mesh is closed and the solid stays valid when split"
        return prepared, notes + Notes(
            decisions=(Decision("preparation", choice, why, candidate.rung, tuple(refused)),)
        )
    raise PartError(
        "the part cannot be prepared for parting: " + "; ".join(refused),
        remedy="repair the part in the CAD system that wrote it, and export it again",
    )


def prepared_body(body: Body, frame: MoldFrame | None = None) -> tuple[Prepared, Notes]:
    """Return a body with every face looking one way, and what is trapped between its faces.

    Raises
    ------
    KernelError : its mesh is not closed
    """
    body, notes = ready(body, frame)
    kinds = face_kinds(body)
    prepared = Prepared(body, kinds)
    _ = prepared.trapped  # what cannot be swept is no part to go on with
    return prepared, notes


def ready(body: Body, frame: MoldFrame | None = None) -> tuple[Body, Notes]:
    """Return the body with its straddling faces split at their silhouettes, its mesh checked to be closed."""
    mesh_solid(body.mesh)
    return imprint_silhouettes(body, face_kinds(body), frame)


def _refuse_crossings(body: Body, frame: MoldFrame | None) -> None:
    found = crossings(body.mesh)
    if found:
        x, y, z = part_point(found[0].at, frame)
        raise PartError(
            f"faces of the part pass through each other, {found[0].depth_mm:.3f} mm deep",
            where=f"at {x:.3f}, {y:.3f}, {z:.3f}",
            remedy="repair the part in the CAD system that wrote it",
        )
