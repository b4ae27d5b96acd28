"""The tool as the proofs see it: solids read back, each meshed finely, with how it moves."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import cached_property, partial
from typing import Any

import numpy as np

from moldgen.errors import KernelError
from moldgen.kernel.beside import Beside
from moldgen.kernel.body import Body
from moldgen.kernel.kept_mesh import (
    bare,
    content_sha256,
    fine_mesh,
    mesh_from_bytes,
    mesh_to_bytes,
    place_of,
    placed_mesh,
)
from moldgen.kernel.measure import Answers, kernel_answers, volume_adaptive
from moldgen.kernel.mesh import SurfaceMesh
from moldgen.kernel.meshsolid import MeshSolid, eroded, mesh_solid
from moldgen.kernel.place import moved
from moldgen.memory import Forgetful, Memory
from moldgen.model.tool import Role
from moldgen.proof.recall import Subject, answered, mesh_key, question
from moldgen.tolerances import PROOF_ANGLE, PROOF_DEFLECTION

SAME_VOLUME = 1e-4
"""Relative difference between two ways to a volume above which a third, slow one decides."""


@dataclass(frozen=True, eq=False)
class ProofBody:
    """One component where it stands in the closed mold, pull along +z [mm]; `motion` is the group it moves with.

    asked : returns the kernel's answers about the solid, where they are being found already (see `asked_beside`)
    subject : what the solid is, where answers about it are remembered
    """

    name: str
    role: Role
    motion: str
    solid: Any
    asked: Callable[[], Answers] | None = None
    subject: Subject | None = None

    @cached_property
    def answers(self) -> Answers:
        """What the kernel says of the solid, to be asked before it is meshed: it would judge the mesh as well."""
        return kernel_answers([self.solid])[0] if self.asked is None else self.asked()

    @cached_property
    def body(self) -> Body:
        """Faces and a mesh fine enough to prove with: the mesh of the bare solid, whether it is remembered or made."""
        body = Body(self.solid, PROOF_DEFLECTION, PROOF_ANGLE)
        body.take_mesh(placed_mesh(self._bare_mesh(), self.solid))
        return body

    def _bare_mesh(self) -> SurfaceMesh:
        memory, key = (Forgetful(), "") if self.subject is None else (self.subject.memory, mesh_key(self.subject))
        kept = memory.recall(key)
        if kept is not None:
            return mesh_from_bytes(kept)
        mesh = fine_mesh(bare(self.solid), PROOF_DEFLECTION, PROOF_ANGLE)
        memory.keep(key, mesh_to_bytes(mesh))
        return mesh

    @cached_property
    def mesh(self) -> MeshSolid:
        """The mesh as a solid. Raises KernelError when it does not close."""
        return mesh_solid(self.body.mesh)

    @cached_property
    def volume_mm3(self) -> float:
        """Volume of the solid [mm^3].

        The kernel's default integration was up to 9e-3 off on trimmed spline faces; where it disagrees with the mesh,
        the adaptive one decides, as it does where there is no mesh to check it by (a proof has then failed).
        """
        quick = self.answers.volume_mm3
        try:
            checked = self.body.mesh.volume()
        except KernelError:
            return volume_adaptive(self.solid, 1e-7)
        if abs(quick - checked) < SAME_VOLUME * abs(checked):
            return quick
        slow = question("volume by adaptive integration", [self.subject], (), 1)
        return answered(slow, lambda: (volume_adaptive(self.solid, 1e-7),))[0]

    @cached_property
    def thin(self) -> MeshSolid:
        """The mesh as a solid, eroded: for overlaps. Raises KernelError when it does not close."""
        solid = eroded(self.body.mesh)
        if solid is None:
            raise KernelError(f"the mesh of {self.name} is not closed")
        return solid

    def may_meet(self, other: ProofBody, slack: float = 0.0) -> bool:
        """False when the boxes of two bodies are more than `slack` [mm] apart."""
        low, high = self.body.box
        other_low, other_high = other.body.box
        return bool((low <= other_high + slack).all() and (other_low <= high + slack).all())


def asked_beside(bodies: Sequence[ProofBody], memory: Memory | None = None) -> list[ProofBody]:
    """Return the same bodies, about which a process beside this one asks the kernel while this one meshes them.

    memory : where answers about them are remembered; what it knows is not asked. It must be of the versions that run.
        To be given before anything is meshed: a mesh that faces have is part of what they are
    """
    if memory is not None and not isinstance(memory, Forgetful):
        bodies = [replace(b, subject=Subject(memory, content_sha256(b.solid), place_of(b.solid))) for b in bodies]
    questions = [question("valid, and its volume", [body.subject], (), 2) for body in bodies]
    known = [None if asked is None else asked.recalled() for asked in questions]
    missing = [number for number, answer in enumerate(known) if answer is None]
    solids = [bodies[number].solid for number in missing]
    told: Callable[[], list[Answers]] = Beside(lambda: kernel_answers(solids)).result if missing else list

    def answer(number: int) -> Answers:
        valid, volume_mm3 = known[number] or answered(questions[number], lambda: told()[missing.index(number)])
        return Answers(bool(valid), volume_mm3)

    return [replace(body, asked=partial(answer, number)) for number, body in enumerate(bodies)]


def placed_bodies(
    components: list[tuple[str, Role, str, Any, tuple[tuple[float, float, float], ...]]],
) -> list[ProofBody]:
    """Return one body for each position of each component (name, role, group, solid, positions)."""
    bodies = []
    for name, role, motion, solid, positions in components:
        for number, at in enumerate(positions, start=1):
            here = solid if not np.any(at) else moved(solid, at)
            bodies.append(ProofBody(f"{name} {number}" if len(positions) > 1 else name, role, motion, here))
    return bodies
