"""Issue 4, item 1: proofs that recall say what proofs without a memory say, figure by figure, whatever was changed."""

from __future__ import annotations

import math
import random
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from functools import cache
from typing import Any

import pytest
from helpers import solids
from helpers.molding import changed, mold
from OCP.BRepBuilderAPI import BRepBuilderAPI_Copy

from moldgen.kernel.place import moved
from moldgen.model.motion import Step
from moldgen.model.proof import Proof
from moldgen.model.tool import Motion, Role
from moldgen.proof import bodies as bodies_module
from moldgen.proof import motion, recall, rest
from moldgen.proof import run as run_module
from moldgen.proof.bodies import ProofBody, asked_beside
from moldgen.proof.opening import CAVITY_OPENS, EJECTORS_MOVE, SIDES_MOVE
from moldgen.proof.rest import APART, FILLED, SOUND
from moldgen.proof.run import Claims, prove_tool

STROKE, CEILING, RADIUS = 10.0, 22.0, 2.0
PLACES = ((8.0, 0.0, 0.0), (-8.0, 3.0, 0.0))


@dataclass
class Kept:
    """A memory whose entries can be looked at."""

    held: dict[str, bytes] = field(default_factory=dict)
    hits: int = 0

    def recall(self, key: str) -> bytes | None:
        found = self.held.get(key)
        self.hits += found is not None
        return found

    def keep(self, key: str, data: bytes) -> None:
        self.held[key] = data


def pin(radius: float = RADIUS, bottom: float = -40.0) -> Any:
    return solids.cylinder(radius, CEILING - bottom, at=(0.0, 0.0, bottom))


@cache
def tool() -> tuple[tuple[ProofBody, ...], Claims]:
    """A hood with two equal ejector pins in its core and a slide in its cavity, which opens in two steps."""
    made = mold(solids.cut(solids.cone(30, 26, 25), solids.cone(28, 24, CEILING)))
    low, high = made.corners
    core = solids.cut(made.parted.core, *(moved(pin(bottom=low[2] - 1), at) for at in PLACES))
    slide = solids.box((high[0] - 5, -3, high[2] - 8), (high[0], 3, high[2] - 2))
    bodies = [*changed(changed(made.bodies, Role.CORE, core), Role.CAVITY, solids.cut(made.parted.cavity, slide))]
    bodies += [
        ProofBody(f"ejector pin {n}", Role.EJECTOR_PIN, Motion.EJECTOR, moved(pin(), at))
        for n, at in enumerate(PLACES, 1)
    ]
    bodies.append(ProofBody("slide 1", Role.SLIDE, "slide 1", slide))
    steps = (
        Step("the slide is drawn", (("slide 1", (6.0, 0.0, 0.0)),)),
        Step("the mold opens", ((Motion.CAVITY_HALF, (0.0, 0.0, 90.0)),)),
        Step("the ejectors push", ((Motion.EJECTOR, (0.0, 0.0, STROKE)), (Motion.PART, (0.0, 0.0, STROKE)))),
    )
    bored = len(PLACES) * math.pi * RADIUS**2 * (CEILING - low[2])
    return tuple(bodies), replace(made.claims, bored_mm3=bored, stroke_mm=STROKE, steps=steps)


def read_back(bodies: Sequence[ProofBody], memory: Kept | None) -> list[ProofBody]:
    """The same bodies as a reader would hand them over: no mesh, nothing shared with an earlier run."""
    return asked_beside([replace(b, solid=BRepBuilderAPI_Copy(b.solid, True, False).Shape()) for b in bodies], memory)


def proved(
    bodies: Sequence[ProofBody], claims: Claims, memory: Kept | None = None
) -> tuple[tuple[Proof, ...], list[float]]:
    """The proofs, and the volume of each body."""
    fresh = read_back(bodies, memory)
    return prove_tool(fresh, claims), [b.volume_mm3 for b in fresh]


@cache
def plain() -> tuple[tuple[Proof, ...], list[float]]:
    return proved(*tool())


@cache
def _filled() -> Kept:
    memory = Kept()
    assert proved(*tool(), memory) == plain()
    assert all(p.passed for p in plain()[0]), plain()
    return memory


def filled() -> Kept:
    return Kept(dict(_filled().held))


def never(*_: Any, **__: Any) -> Any:
    raise RuntimeError("this is known already")


def test_what_is_known_is_not_found_again_and_proofs_are_the_same(monkeypatch: pytest.MonkeyPatch) -> None:
    memory = filled()
    for module, name in (
        (bodies_module, "fine_mesh"),
        (bodies_module, "kernel_answers"),
        (bodies_module, "Beside"),
        (bodies_module, "mesh_solid"),
        (bodies_module, "eroded"),
        (rest, "balance"),
        (rest, "deepest"),
        (run_module, "Beside"),
        (motion, "deepest"),
        (motion, "sweep_faces"),
    ):
        monkeypatch.setattr(module, name, never)
    assert proved(*tool(), memory) == plain()
    monkeypatch.undo()
    monkeypatch.setattr(motion, "sweep_faces", never)  # and what was shut off above is what proofs are made with
    assert not all(p.passed for p in proved(*tool(), Kept())[0])


@pytest.mark.parametrize("seed", range(3))
def test_a_memory_that_lost_a_part_changes_nothing(seed: int) -> None:
    memory, chance = filled(), random.Random(seed)
    for key in sorted(memory.held):
        if chance.random() < 0.5:
            del memory.held[key]
        elif chance.random() < 0.1:
            memory.held[key] = memory.held[key] if len(memory.held[key]) > 100 else b"odd"
    assert proved(*tool(), memory) == plain()


def _other(role: Role, change: Callable[[Any], Any]) -> tuple[tuple[ProofBody, ...], Claims]:
    bodies, claims = tool()
    first = next(b for b in bodies if b.role is role)
    return tuple(replace(b, solid=change(b.solid)) if b is first else b for b in bodies), claims


def _claim(**values: Any) -> tuple[tuple[ProofBody, ...], Claims]:
    bodies, claims = tool()
    return bodies, replace(claims, **values)


def _other_way(number: int, group: str, way: tuple[float, float, float]) -> tuple[tuple[ProofBody, ...], Claims]:
    steps = list(tool()[1].steps)
    steps[number] = Step(steps[number].name, ((group, way), *(m for m in steps[number].moves if m[0] != group)))
    return _claim(steps=tuple(steps))


FAULTS: dict[str, tuple[Callable[[], tuple[tuple[ProofBody, ...], Claims]], str]] = {
    "a pin 0.1 mm wider": (lambda: _other(Role.EJECTOR_PIN, lambda _: moved(pin(2.1), PLACES[0])), APART),
    "a pin 0.1 mm aside": (lambda: _other(Role.EJECTOR_PIN, lambda s: moved(s, (0.1, 0, 0))), APART),
    "a pin 0.1 mm up": (lambda: _other(Role.EJECTOR_PIN, lambda s: moved(s, (0, 0, 0.1))), APART),
    "a pin inside out": (lambda: _other(Role.EJECTOR_PIN, lambda s: s.Reversed()), SOUND),
    "an unsound pin": (lambda: _other(Role.EJECTOR_PIN, solids.unsound), SOUND),
    "a nub in the cavity": (
        lambda: _other(Role.CAVITY, lambda s: solids.fuse(s, solids.cylinder(0.5, 0.3, at=(0, 10, 24.9)))),
        APART,
    ),
    "a hole in the core": (
        lambda: _other(Role.CORE, lambda s: solids.cut(s, solids.box((35, -1, -13), (36, 0, -12)))),
        FILLED,
    ),
    "a bore that is not claimed": (lambda: _claim(bored_mm3=tool()[1].bored_mm3 + 1.0), FILLED),
    "a smaller block": (lambda: _claim(block_mm3=tool()[1].block_mm3 - 1.0), FILLED),
    "another stroke": (lambda: _claim(stroke_mm=STROKE + 1.0), EJECTORS_MOVE),
    "a slide that moves inward": (lambda: _other_way(0, "slide 1", (-6.0, 0.0, 0.0)), SIDES_MOVE),
    "a cavity half that opens aside": (lambda: _other_way(1, Motion.CAVITY_HALF, (60.0, 0.0, 90.0)), CAVITY_OPENS),
    "ejectors that move aside": (lambda: _other_way(2, Motion.EJECTOR, (1.0, 0.0, STROKE)), EJECTORS_MOVE),
}


@pytest.mark.parametrize("name", FAULTS)
def test_a_changed_tool_is_never_taken_for_the_one_that_is_remembered(name: str) -> None:
    make, proof = FAULTS[name]
    memory = filled()
    expected = proved(*make())
    found = proved(*make(), memory)
    assert found == expected
    assert not next(p for p in found[0] if p.name == proof).passed, found[0]
    assert memory.hits, "nothing was recalled for what is the same: the test shows nothing"
    again = proved(*make(), memory)  # a failure is remembered as one
    assert again == expected


def test_bodies_that_change_their_names_are_told_by_the_new_ones() -> None:
    bodies, claims = FAULTS["a pin 0.1 mm wider"][0]()
    memory = Kept()
    proved(bodies, claims, memory)
    bodies = tuple(replace(b, name=f"new {b.name}") for b in bodies)
    assert proved(bodies, claims, memory) == proved(bodies, claims)


def test_the_order_of_bodies_enters() -> None:
    bodies, claims = tool()
    assert proved(bodies[::-1], claims, filled()) == proved(bodies[::-1], claims)


def test_a_key_without_the_content_would_be_seen(monkeypatch: pytest.MonkeyPatch) -> None:
    """The fault that all of this guards against, planted: the wrong answer of another pin is given."""
    pins = [b for b in tool()[0] if b.role is Role.EJECTOR_PIN]
    wide = [replace(b, solid=moved(pin(8.5), at)) for b, at in zip(pins, PLACES, strict=True)]
    assert not rest.prove_rest(read_back(wide, Kept())).passed
    monkeypatch.setattr(bodies_module, "content_sha256", lambda _: "always the same")
    memory = Kept()
    assert rest.prove_rest(read_back(pins, memory)).passed
    assert rest.prove_rest(read_back(wide, memory)).passed


def test_meshes_of_another_fineness_are_not_recalled(monkeypatch: pytest.MonkeyPatch) -> None:
    memory = filled()
    coarse = len(read_back(tool()[0], memory)[3].body.mesh.triangles)
    assert memory.hits
    monkeypatch.setattr(recall, "PROOF_DEFLECTION", 0.001)
    monkeypatch.setattr(bodies_module, "PROOF_DEFLECTION", 0.001)
    memory.hits = 0
    assert len(read_back(tool()[0], memory)[3].body.mesh.triangles) > 2 * coarse
    assert memory.hits == 0


def test_what_could_not_be_answered_is_asked_again(monkeypatch: pytest.MonkeyPatch) -> None:
    memory = Kept()
    monkeypatch.setattr(rest, "deepest", never)
    monkeypatch.setattr(motion, "sweep_faces", never)
    assert not next(p for p in proved(*tool(), memory)[0] if p.name == APART).passed
    monkeypatch.undo()
    assert proved(*tool(), memory) == plain()
