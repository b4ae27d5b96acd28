"""All proofs of one tool, in order."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from moldgen.errors import KernelError
from moldgen.model.proof import Proof, Verdict
from moldgen.proof.bodies import ProofBody
from moldgen.proof.opening import prove_cavity_half, prove_core_half, prove_ejection
from moldgen.proof.rest import prove_balance, prove_rest, prove_sound


@dataclass(frozen=True)
class Claims:
    """What the tool claims about itself besides its solids: volumes [mm^3] and the ejectors' stroke [mm]."""

    block_mm3: float
    bored_mm3: float
    stroke_mm: float


def prove_tool(bodies: Sequence[ProofBody], claims: Claims) -> tuple[Proof, ...]:
    """Return every proof; one that could not run says why and does not count as passed."""
    sound = prove_sound(bodies)
    proofs = [sound, prove_balance(bodies, claims.block_mm3, claims.bored_mm3)]
    later: list[tuple[str, Callable[[], Proof]]] = [
        ("nothing overlaps in the closed tool", lambda: prove_rest(bodies)),
        ("the cavity half opens", lambda: prove_cavity_half(bodies)),
        ("the part leaves the core", lambda: prove_core_half(bodies)),
        ("the ejectors move through their stroke", lambda: prove_ejection(bodies, claims.stroke_mm)),
    ]
    for name, run in later:
        try:
            proofs.append(run())
        except KernelError as error:
            proofs.append(Proof(name, Verdict.NOT_RUN, None, 0.0, "mm", error.what))
    return tuple(proofs)
