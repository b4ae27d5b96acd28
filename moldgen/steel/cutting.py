"""Take everything out of a half at once; when that fails, piece by piece, so that the culprit has a name."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from moldgen.errors import KernelError
from moldgen.kernel.boolean import copied
from moldgen.kernel.cells import lost_volume, take_out
from moldgen.kernel.measure import is_valid, volume

TURNS = (0.0, 37.0, 101.0)
"""deg: where the seams of round tools look when a bore is tried again: a seam along an edge is what fails most."""

LOST = 0.2
"""Share of the smallest plug by which volumes may disagree: a lost intersection costs all of a plug, the default
integration errs by a tenth of this on real parts (measured)."""

ROUGH = 0.15
"""Relative difference between the volume of a plug and what rays on the mesh expect; theirs errs by up to 5 %."""


@dataclass(frozen=True)
class Wanted:
    """One thing to take out of a half.

    make : returns its tool with the seam turned [deg]
    expected_mm3 : volume that it should take out, from the mesh; None when nobody knows
    """

    name: str
    make: Callable[[float], Any]
    expected_mm3: float | None = None


@dataclass(frozen=True)
class Cut:
    """A half with everything taken out, and what each of the wanted took, in their order."""

    half: Any
    plugs: tuple[Any, ...]
    refused: tuple[str, ...] = ()


def cut_half(half: Any, wanted: Sequence[Wanted], name: str) -> Cut:
    """Return a half ("core" or "cavity") without what is wanted from it.

    Raises
    ------
    KernelError : the kernel cannot take one of them out; the message names it
    """
    if not wanted:
        return Cut(half, ())
    try:
        return _at_once(half, wanted, 0.0, name)
    except KernelError as error:
        refused = [f"all at once: {error.what}"]
    plugs = []
    for one in wanted:
        done = _one(half, one, name, refused)
        half = copied(done.half)
        plugs.append(done.plugs[0])
    return Cut(half, tuple(plugs), tuple(refused))


def _one(half: Any, wanted: Wanted, name: str, refused: list[str]) -> Cut:
    why = []
    for turn in TURNS:
        try:
            return _at_once(half, [wanted], turn, name)
        except KernelError as error:
            why.append(error.what)
            refused.append(f"{wanted.name}, seam at {turn:g} deg: {error.what}")
    raise KernelError(
        f"cannot take it out of the {name}: {'; '.join(dict.fromkeys(why))}",
        where=wanted.name,
        remedy="move it a little, or change its size",
    )


def _at_once(half: Any, wanted: Sequence[Wanted], turn: float, name: str) -> Cut:
    cells = take_out(half, [w.make(turn) for w in wanted], f"bore the {name}")
    plugs = []
    for one, found in zip(wanted, cells.plugs, strict=True):
        if len(found) != 1:
            raise KernelError(f"{one.name} takes {len(found)} pieces out of the {name}, expected one")
        _judge(one, found[0])
        plugs.append(found[0])
    if len(cells.rest) != 1:
        raise KernelError(f"{len(cells.rest)} pieces of the {name} are left, expected one")
    if not is_valid(cells.rest[0]):
        raise KernelError(f"the {name} is no longer a valid solid")
    _balance(half, cells.rest[0], plugs, name)
    return Cut(cells.rest[0], tuple(plugs))


def _judge(wanted: Wanted, plug: Any) -> None:
    if not is_valid(plug):
        raise KernelError(f"what {wanted.name} takes out is no valid solid")
    if wanted.expected_mm3 is None:
        return
    found = volume(plug)
    if abs(found - wanted.expected_mm3) > ROUGH * wanted.expected_mm3:
        raise KernelError(
            f"{wanted.name} takes out {found:.2f} mm^3, by rays it should be {wanted.expected_mm3:.2f} mm^3"
        )


def _balance(before: Any, after: Any, plugs: Sequence[Any], name: str) -> None:
    """What is left and what was taken out must make the half again."""
    missing, limit = lost_volume(before, after, plugs), LOST * min(volume(p) for p in plugs)
    if missing > limit:
        raise KernelError(f"{missing:.3f} mm^3 of the {name} are lost or doubled, limit {limit:.3f} mm^3")
