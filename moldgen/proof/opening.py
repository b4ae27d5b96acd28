"""The tool opens: the space that each moving body passes through holds nothing of what stands still.

The space is swept as a whole, from the faces that look along the way, so nothing can be jumped over between samples.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from moldgen.kernel.meshsolid import MeshSolid
from moldgen.model.proof import Proof, Verdict
from moldgen.model.tool import Motion
from moldgen.proof.bodies import ProofBody
from moldgen.proof.overlap import deepest
from moldgen.release.kinds import face_kinds
from moldgen.release.sweep import sweep_faces
from moldgen.tolerances import OPEN_OVERLAP

CAVITY_OPENS = "the cavity half opens"
PART_LEAVES = "the part leaves the core"
EJECTORS_MOVE = "the ejectors move through their stroke"


def prove_cavity_half(bodies: Sequence[ProofBody]) -> Proof:
    """The cavity half leaves part and core half along the pull without touching them."""
    return _prove_way(CAVITY_OPENS, _moving(bodies, Motion.CAVITY_HALF), _others(bodies, Motion.CAVITY_HALF), None)


def prove_core_half(bodies: Sequence[ProofBody]) -> Proof:
    """The part leaves the core half along the pull: the way of the core half, seen from the part, is free."""
    movers = _moving(bodies, Motion.CORE_HALF)
    return _prove_way(PART_LEAVES, movers, _moving(bodies, Motion.PART), None, up=False)


def prove_ejection(bodies: Sequence[ProofBody], stroke: float) -> Proof:
    """The ejectors push the part through their whole stroke [mm] without touching the core half.

    That they do not run into the part is the proof at rest: both move together.
    """
    if not stroke > 0.0:
        return not_run(EJECTORS_MOVE, f"a stroke of {stroke:g} mm ejects nothing")
    return _prove_way(EJECTORS_MOVE, _moving(bodies, Motion.EJECTOR), _moving(bodies, Motion.CORE_HALF), stroke)


def not_run(name: str, why: str) -> Proof:
    """Return what a question about an overlap reads that could not be asked."""
    return Proof(name, Verdict.NOT_RUN, None, OPEN_OVERLAP, "mm", why)


def _prove_way(
    name: str, movers: Sequence[ProofBody], standing: Sequence[ProofBody], way: float | None, *, up: bool = True
) -> Proof:
    if not movers or not standing:
        return not_run(name, f"the tool has nothing that {'stands still' if movers else 'moves'} in this step")
    worst, pair = 0.0, ""
    for mover in movers:
        swept = _way_of(mover, way, up=up)
        low, high = _box(swept)
        for other in standing:
            other_low, other_high = other.body.box
            if (other_low > high).any() or (low > other_high).any():
                continue
            found = deepest(swept, mover.body.mesh, other)
            if found.depth_mm > worst:
                worst, pair = found.depth_mm, f"{mover.name} against {other.name} {found.told}"
    verdict = Verdict.PASSED if worst < OPEN_OVERLAP else Verdict.FAILED
    return Proof(name, verdict, worst, OPEN_OVERLAP, "mm", pair)


def _way_of(mover: ProofBody, way: float | None, *, up: bool) -> MeshSolid:
    mover.mesh  # noqa: B018  raises for an open mesh: a missing face would sweep nothing, and hide what it meets
    return sweep_faces(mover.body, face_kinds(mover.body), up, way)


def _box(solid: MeshSolid) -> tuple[np.ndarray, np.ndarray]:
    bounds = np.asarray(solid.bounding_box())
    return bounds[:3], bounds[3:]


def _moving(bodies: Sequence[ProofBody], motion: str) -> list[ProofBody]:
    return [b for b in bodies if b.motion == motion]


def _others(bodies: Sequence[ProofBody], motion: str) -> list[ProofBody]:
    return [b for b in bodies if b.motion != motion]
