"""The pins as components: what a bore took out of the core becomes the tip, and equal pins share one definition."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from moldgen.errors import KernelError
from moldgen.finding import Finding, Notes, Severity
from moldgen.kernel.measure import volume
from moldgen.kernel.pins import alike, carried, flat_top, is_turned, pin_on_plug
from moldgen.kernel.turned import stepped_solid
from moldgen.model.part import Vector
from moldgen.model.tool import Component, Motion, Role
from moldgen.steel.bored import Materials
from moldgen.steel.bores import PinBore

SAME = 1e-6
"""mm (and relative, of volumes): sizes of pins closer than this are the same."""

_SHAPED = "tip cut to the surface of the core, must not turn"

MOTIONS = {Role.CORE_PIN: Motion.CORE_HALF, Role.EJECTOR_PIN: Motion.EJECTOR}


@dataclass(frozen=True)
class _Kind:
    """Pins that are the same: the first of them, and all.

    top : height of a level tip; turned : the tip is round about the axis
    """

    bore: PinBore
    plug: Any
    top: float | None
    turned: bool
    members: list[PinBore]


def pin_components(
    bores: Sequence[PinBore], plugs: Sequence[Any], materials: Materials
) -> tuple[tuple[Component, ...], Notes]:
    """Return the pins, each definition in its own frame: axis along z, lower end at z = 0, turned as it stands.

    Raises
    ------
    KernelError : a pin cannot be built on its tip; the message names it
    """
    kinds: list[_Kind] = []
    for one, plug in zip(bores, plugs, strict=True):
        top = flat_top(plug, one.below.fit_low)
        known = next((k for k in kinds if _same(k, one, plug, top)), None)
        if known is None:
            turned = top is not None or is_turned(plug, (one.x, one.y), one.below.fit_low)
            kinds.append(_Kind(one, plug, top, turned, [one]))
        else:
            known.members.append(one)
    components = tuple(_component(k, _name(k, kinds), materials) for k in kinds)
    return components, Notes(tuple(_findings(kinds)))


def _name(kind: _Kind, kinds: Sequence[_Kind]) -> str:
    """Return the name of the first pin of a kind; where all pins of a role are the same, the name without its number.

    Places of one definition are numbered when they are written: ejector pin 1, ejector pin 2.
    """
    alone = sum(k.bore.role is kind.bore.role for k in kinds) == 1
    return kind.bore.role.value.replace("_", " ") if alone and len(kind.members) > 1 else kind.bore.name


def _same(kind: _Kind, one: PinBore, plug: Any, top: float | None) -> bool:
    other, ours, theirs = kind.bore, one.below, kind.bore.below
    sizes = (
        (one.diameter, other.diameter),
        (ours.head, theirs.head),
        (ours.shank, theirs.shank),
        (ours.shank_top - ours.foot if ours.shank else 0.0, theirs.shank_top - theirs.foot if theirs.shank else 0.0),
        (ours.shoulder - ours.foot, theirs.shoulder - theirs.foot),
        (ours.fit_low - ours.foot, theirs.fit_low - theirs.foot),
    )
    if one.role is not other.role or (top is None) != (kind.top is None):
        return False
    if top is not None and kind.top is not None:
        sizes = (*sizes[:-1], (top - ours.foot, kind.top - theirs.foot))
    if any(abs(a - b) > SAME for a, b in sizes):
        return False
    if top is not None:
        return True
    size = volume(kind.plug)
    if abs(volume(plug) - size) >= SAME * size:
        return False
    turned = kind.turned and is_turned(plug, (one.x, one.y), ours.fit_low)
    return alike(plug, _origin(one), kind.plug, _origin(other), turned=turned)


def _component(kind: _Kind, name: str, materials: Materials) -> Component:
    one = kind.bore
    material = materials.core_pin if one.role is Role.CORE_PIN else materials.ejector_pin
    note = "tip level" if kind.top is not None else "tip turned" if kind.turned else _SHAPED
    if one.below.shank > 0.0:
        above = one.below.shank_top - one.below.foot
        note += (
            f"; shouldered: tip {one.diameter:g} mm, shank {one.below.shank:g} mm up to {above:.2f} mm from the foot"
        )
    if len(kind.members) > 1:
        note += f"; {len(kind.members)} alike: {', '.join(m.name for m in kind.members)}"
    positions = tuple(_origin(m) for m in kind.members)
    return Component(name, one.role, _solid(kind), material, MOTIONS[one.role], positions, note)


def _solid(kind: _Kind) -> Any:
    one, below = kind.bore, kind.bore.below
    if kind.top is not None:
        collars = [(d / 2, low - below.foot, high - below.foot) for d, high, low in reversed(below.collars)]
        tip = (one.diameter / 2, collars[-1][2] if collars else 0.0, kind.top - below.foot)
        return stepped_solid((0.0, 0.0), [*collars, tip])
    x, y, z = _origin(one)
    try:
        pin = pin_on_plug(kind.plug, (x, y), below)
    except KernelError as error:
        raise KernelError(
            error.what, where=one.name, remedy="move the pin a little", evidence=error.evidence
        ) from error
    return carried(pin, (-x, -y, -z))


def _origin(one: PinBore) -> Vector:
    return (one.x, one.y, one.below.foot)


def _findings(kinds: Sequence[_Kind]) -> list[Finding]:
    names = [m.name for k in kinds if not k.turned for m in k.members]
    if not names:
        return []
    return [
        Finding(
            "pin.shaped_tip",
            Severity.NOTE,
            f"the tip follows the surface of the core and must not turn: {', '.join(names)}",
            where=names[0],
            remedy="secure the head against turning (flat on the head, or a key), or move the pin to a level place",
        )
    ]
