"""The closed tool: every solid sound, no two in the same place, and nothing of the block missing."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import combinations

from moldgen.errors import KernelError
from moldgen.kernel.measure import balance, joint_volume
from moldgen.kernel.topology import solids_of
from moldgen.model.proof import Proof, Verdict
from moldgen.model.tool import Role
from moldgen.proof.bodies import ProofBody
from moldgen.proof.overlap import NUMBERS, Depth, deepest
from moldgen.proof.recall import Question, answered, question
from moldgen.tolerances import BALANCE, OPEN_OVERLAP

IN_BLOCK = (Role.PART, Role.CAVITY, Role.CORE, Role.SLIDE, Role.LIFTER)
"""What fills the block before anything is bored."""


SOUND = "every component is a sound solid"
FILLED = "the halves and the part fill the block"
APART = "nothing overlaps in the closed tool"


def prove_sound(bodies: Sequence[ProofBody]) -> Proof:
    """Every component is one solid, valid for the kernel, whose mesh closes and looks outward."""
    for body in bodies:
        if body.asked is None:
            body.answers  # noqa: B018  asked before it is meshed
    meshes = [_mesh_fault(body) for body in bodies]  # first: meanwhile the kernel is asked, see `asked_beside`
    bad = [f"{b.name}: {f}" for b, of_mesh in zip(bodies, meshes, strict=True) if (f := _fault(b) or of_mesh)]
    if not bodies:
        bad.append("there is no component")
    verdict = Verdict.FAILED if bad else Verdict.PASSED
    return Proof(SOUND, verdict, float(len(bad)), 0.0, "faults", "; ".join(bad))


def _fault(body: ProofBody) -> str:
    count = len(solids_of(body.solid))
    if count != 1:
        return f"{count} solids instead of one"
    return "" if body.answers.valid else "the kernel calls it invalid"


def _mesh_fault(body: ProofBody) -> str:
    if len(solids_of(body.solid)) != 1:
        return ""  # there may be nothing to mesh
    try:
        inside = answered(question("volume of the mesh", [body.subject], (), 1), lambda: (float(body.mesh.volume()),))
        # overlaps with a solid turned inside out would come out empty, and pass
        return "" if inside[0] > 0.0 else "it is inside out"
    except KernelError as error:
        return error.what


def filling_volume(bodies: Sequence[ProofBody]) -> float:
    """Return the joint volume [mm^3] of what fills the block, by the kernel's default integration."""
    return joint_volume([b.solid for b in bodies if b.role in IN_BLOCK])


def balance_question(bodies: Sequence[ProofBody], block_mm3: float, bored_mm3: float) -> Question | None:
    """Return what `prove_balance` asks, None where bodies are not known by their content."""
    filling = [b.subject for b in bodies if b.role in IN_BLOCK]
    return question("part of the block that is missing", filling, (block_mm3, bored_mm3, BALANCE), 1)


def prove_balance(
    bodies: Sequence[ProofBody], block_mm3: float, bored_mm3: float, quick: Callable[[], float] | None = None
) -> Proof:
    """Cavity, core, part and what was bored out of the halves add up to the block.

    block_mm3 : volume of the closed block; bored_mm3 : volume removed from the halves for pins and feed
    quick : returns the `filling_volume` of the bodies where that is being found elsewhere
    """
    filling = [b for b in bodies if b.role in IN_BLOCK]
    solids = [b.solid for b in filling]

    def find() -> tuple[float]:
        expected = block_mm3 - bored_mm3
        return (balance(solids, expected, BALANCE, lambda: sum(_mesh_volume(b) for b in filling), quick),)

    (missing,) = answered(balance_question(bodies, block_mm3, bored_mm3), find)
    verdict = Verdict.PASSED if missing < BALANCE else Verdict.FAILED
    detail = f"{len(solids)} solids and {bored_mm3:.3f} mm^3 of bores in a block of {block_mm3:.3f} mm^3"
    return Proof(FILLED, verdict, missing, BALANCE, "of the block", detail)


def _mesh_volume(body: ProofBody) -> float:
    """Return the volume from the mesh that is there anyway, bulge included: right to 1e-7 of a block (measured)."""
    try:
        return body.body.mesh.volume()
    except KernelError:
        return float("inf")


def prove_rest(bodies: Sequence[ProofBody]) -> Proof:
    """No two components of the closed tool share a piece thicker than meshes can feign."""
    worst, pair = 0.0, ""
    for one, other in combinations(bodies, 2):
        if one.may_meet(other):
            found = _overlap(one, other)
            if found.depth_mm > worst:
                worst, pair = found.depth_mm, f"{one.name} and {other.name} {found.told}"
    verdict = Verdict.PASSED if worst < OPEN_OVERLAP else Verdict.FAILED
    return Proof(APART, verdict, worst, OPEN_OVERLAP, "mm", pair)


def _overlap(one: ProofBody, other: ProofBody) -> Depth:
    asked = question("overlap at rest", [one.subject, other.subject], (), NUMBERS)
    return Depth.of(answered(asked, lambda: deepest(one.mesh, one.body.mesh, other).numbers))
