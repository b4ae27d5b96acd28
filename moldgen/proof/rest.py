"""The closed tool: every solid sound, no two in the same place, and nothing of the block missing."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

from moldgen.errors import KernelError
from moldgen.kernel.measure import balance, is_valid
from moldgen.kernel.meshsolid import overlap_depth
from moldgen.model.proof import Proof, Verdict
from moldgen.model.tool import Role
from moldgen.proof.bodies import ProofBody
from moldgen.tolerances import BALANCE, OPEN_OVERLAP

IN_BLOCK = (Role.PART, Role.CAVITY, Role.CORE)
"""What fills the block before anything is bored."""


def prove_sound(bodies: Sequence[ProofBody]) -> Proof:
    """Every solid is valid for the kernel and its mesh closes."""
    bad = []
    for body in bodies:
        if not is_valid(body.solid):
            bad.append(f"{body.name}: the kernel calls it invalid")
            continue
        try:
            body.mesh  # noqa: B018  meshing is the test
        except KernelError as error:
            bad.append(f"{body.name}: {error.what}")
    verdict = Verdict.FAILED if bad else Verdict.PASSED
    return Proof("every component is a sound solid", verdict, float(len(bad)), 0.0, "faults", "; ".join(bad))


def prove_balance(bodies: Sequence[ProofBody], block_mm3: float, bored_mm3: float) -> Proof:
    """Cavity, core, part and what was bored out of the halves add up to the block.

    block_mm3 : volume of the closed block; bored_mm3 : volume removed from the halves for pins and feed
    """
    solids = [b.solid for b in bodies if b.role in IN_BLOCK]
    missing = balance(solids, block_mm3 - bored_mm3, BALANCE)
    verdict = Verdict.PASSED if missing < BALANCE else Verdict.FAILED
    detail = f"{len(solids)} solids and {bored_mm3:.3f} mm^3 of bores in a block of {block_mm3:.3f} mm^3"
    return Proof("the halves and the part fill the block", verdict, missing, BALANCE, "of the block", detail)


def prove_rest(bodies: Sequence[ProofBody]) -> Proof:
    """No two components of the closed tool share a piece thicker than meshes can feign."""
    worst, pair = 0.0, ""
    for one, other in combinations(bodies, 2):
        if one.may_meet(other):
            overlap = overlap_depth(one.mesh, other.thin)
            if overlap > worst:
                worst, pair = overlap, f"{one.name} and {other.name}"
    verdict = Verdict.PASSED if worst < OPEN_OVERLAP else Verdict.FAILED
    return Proof("nothing overlaps in the closed tool", verdict, worst, OPEN_OVERLAP, "mm", pair)
