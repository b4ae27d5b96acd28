"""From forming steel and layout to side actions: bodies taken out of the halves, joined to their fronts and bored."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import partial
from typing import Any

import numpy as np

from moldgen.errors import KernelError
from moldgen.finding import Notes
from moldgen.kernel.boolean import common, copied, cut, fuse
from moldgen.kernel.cells import lost_volume, take_out
from moldgen.kernel.measure import centroid, is_valid, volume, volume_adaptive
from moldgen.kernel.merge import merged_faces
from moldgen.kernel.rehearse import made_apart
from moldgen.kernel.topology import solids_of
from moldgen.model.halves import Halves, SideSteel
from moldgen.model.side_action import across
from moldgen.model.slide import LifterLayout, SideCorePinLayout, SideLayout, SlideBody, SlideLayout
from moldgen.model.tool import Component, Hole, Motion, Role
from moldgen.steel.bored import Removed
from moldgen.steel.cutting import Wanted, cut_half
from moldgen.steel.slide_bores import SURE, SideWork, bore_slide
from moldgen.steel.slide_solids import Corners, before_start, body_solid, core_pin_seat, pin_solid

SAME_VOLUME = 1e-5
"""Relative difference between a body and the steel that it is made of from which the kernel is not believed: the
default integration errs by less on plane bodies, and a body that met the part would lose much more."""

CRUMB = 1e-3
"""mm^3: pieces of less volume are noise of the boolean."""

CUT_SECONDS = 20
"""Processor time for one boolean."""

PIN_STEEL = "1.2344"
"""Material of angled pins, hardened (common practice)."""


@dataclass(frozen=True)
class SideCut:
    """The halves with room for the side actions, and everything that goes in there.

    removed : what is bored out of halves and slides: cavity, core, slides, lifters, part and this fill the block
    """

    halves: Halves
    components: tuple[Component, ...]
    holes: tuple[Hole, ...]
    removed: tuple[Removed, ...]
    notes: Notes


def cut_side_actions(halves: Halves, layout: SideLayout, material: str, pin_material: str = PIN_STEEL) -> SideCut:
    """Return halves and components of the side actions; the pins' bores and the feed come after this.

    halves : with the forming steel in `sides`; material : steel of slides and lifters

    Raises
    ------
    KernelError : the kernel cannot cut or join something, or volumes do not balance; the message names it
    """
    steels = {side.name: side for side in halves.sides}
    corners = (np.asarray(halves.low, float), np.asarray(halves.high, float))
    work = SideWork(halves.cavity, halves.core, corners, material, [], [], [])
    for slide in layout.slides:
        fronts = [steels[name] for name in slide.serves]
        solid = _whole_slide(work, slide, fronts)
        note = f"{slide.drive}, travel {slide.travel:.2f} mm"
        work.components.append(Component(slide.name, Role.SLIDE, solid, material, slide.name, note=note))
    for slide in layout.slides:
        for pin in slide.pins:
            pin_note = f"{pin.diameter:g} mm at {pin.angle:g} deg, head cut flush with the top of the block"
            work.components.append(
                Component(pin.name, Role.ANGLED_PIN, pin_solid(pin, corners), pin_material, Motion.CAVITY_HALF,
                          note=pin_note)
            )  # fmt: skip
    for lifter in layout.lifters:
        work.components.append(_lifter(lifter, steels[lifter.name], material))
        work.holes.append(_lifter_hole(lifter, steels[lifter.name], corners))
    made = replace(halves, cavity=work.cavity, core=work.core)
    return SideCut(made, tuple(work.components), tuple(work.holes), tuple(work.removed), Notes())


def _whole_slide(work: SideWork, slide: SlideLayout, fronts: Sequence[SideSteel]) -> Any:
    """Return a slide with its bores; its room is taken out of the halves."""
    if slide.body is None:
        return _one([s for front in fronts for s in solids_of(front.solid)], slide.name)
    body = body_solid(slide, work.corners)
    room = before_start(slide, work.corners)
    own: dict[str, list[Any]] = {pin.front: [] for pin in slide.core_pins}
    inner: list[Any] = []
    outer: list[Any] = []
    for front in fronts:
        for solid in solids_of(front.solid):
            own.get(front.name, inner).extend(_thick(common(copied(solid), room)))
            outer += _thick(cut(copied(solid), [room]))
    beyond = [s for solid in outer for s in _thick(cut(copied(solid), [body]))]
    from_cavity = _pocket(work.cavity, body, f"room for {slide.name} in the cavity")
    from_core = _pocket(work.core, body, f"room for {slide.name} in the core")
    plugs = [*from_cavity.plugs, *from_core.plugs]
    _check_filled(slide, body, plugs, outer, beyond)
    work.cavity, work.core = from_cavity.rest, from_core.rest
    for piece in beyond:  # a front that runs on past its body gives back what the halves need
        _give_back(work, slide.body, piece, slide.name)
    whole = _joined([*inner, body], f"join {slide.name}")
    whole = bore_slide(work, slide, slide.body, merged_faces(whole))
    for pin in slide.core_pins:
        whole = _core_pin(work, slide, pin, own[pin.front], whole)
    return whole


def _core_pin(work: SideWork, slide: SlideLayout, pin: SideCorePinLayout, front: list[Any], whole: Any) -> Any:
    """Return the slide with the seat of a side core pin, which becomes a component: its front and the seat's plug."""
    seat = cut_half(whole, [Wanted(pin.name, partial(core_pin_seat, slide, pin))], slide.name)
    solid = _joined([*front, seat.plugs[0]], f"join {pin.name}")
    note = f"shank {pin.diameter:g} mm, {pin.depth:g} mm deep in {slide.name}, held by a dowel (to be bought)"
    work.components.append(Component(pin.name, Role.SIDE_CORE_PIN, solid, work.material, slide.name, note=note))
    work.removed.append(Removed(slide.name, pin.name, volume_adaptive(solid, SURE)))
    return copied(seat.half)


@dataclass(frozen=True)
class _Pocket:
    rest: Any
    plugs: tuple[Any, ...]


def _pocket(half: Any, body: Any, name: str) -> _Pocket:
    made_apart(lambda: take_out(half, [body], name).rest, CUT_SECONDS)  # a rehearsal: it could hang
    cells = take_out(half, [body], name)
    if len(cells.rest) != 1 or not is_valid(cells.rest[0]):
        raise KernelError(f"{name} leaves {len(cells.rest)} pieces, expected one sound solid")
    plugs = tuple(_thick(list(cells.plugs[0])))
    missing = lost_volume(half, cells.rest[0], list(cells.plugs[0]))
    if missing > SAME_VOLUME * volume(body) + CRUMB:
        raise KernelError(f"{name}: {missing:.3f} mm^3 are lost or doubled")
    return _Pocket(copied(cells.rest[0]), plugs)


def _check_filled(
    slide: SlideLayout, body: Any, plugs: Sequence[Any], outer: Sequence[Any], beyond: Sequence[Any]
) -> None:
    """The body must be made of nothing but steel of the halves and of its fronts: else it meets the part."""
    whole = volume(body)
    steel = sum(volume(s) for s in plugs) + sum(volume(s) for s in outer) - sum(volume(s) for s in beyond)
    if abs(whole - steel) > SAME_VOLUME * whole + CRUMB:
        raise KernelError(
            f"its body has {whole:.3f} mm^3 but takes {steel:.3f} mm^3 of steel: it meets the part or another slide",
            where=slide.name,
            remedy="give the side action another direction, or a lifter",
        )


def _give_back(work: SideWork, body: SlideBody, piece: Any, name: str) -> None:
    if centroid(piece)[2] >= body.level:
        work.cavity = _joined([work.cavity, piece], f"close the cavity behind {name}")
    else:
        work.core = _joined([work.core, piece], f"close the core behind {name}")


def _lifter(lifter: LifterLayout, steel: SideSteel, material: str) -> Component:
    solid = _one(solids_of(steel.solid), lifter.name)
    note = f"leans {lifter.angle:.2f} deg; its foot slides on the ejector plate and is added to the end shown"
    return Component(lifter.name, Role.LIFTER, solid, material, lifter.name, note=note)


def _lifter_hole(lifter: LifterLayout, steel: SideSteel, corners: Corners) -> Hole:
    """Return the opening of a lifter in the bottom of the core, as the circle round its outline."""
    frame = across(steel.front.axis)
    points = np.vstack(list(steel.front.outline))
    middle = 0.5 * (points.min(axis=0) + points.max(axis=0))
    radius = float(np.linalg.norm(points - middle, axis=1).max())
    way = (float(corners[0][2]) - float((middle @ frame[:2])[2])) / float(frame[2][2])
    x, y, z = (float(v) for v in middle @ frame[:2] + way * frame[2])
    purpose = f"{lifter.name}, guide of its outline (circle round it), axis leans {lifter.angle:.2f} deg from the pull"
    return Hole("core", purpose, x, y, z, z + lifter.guided * math.cos(math.radians(lifter.angle)), 2 * radius, "H7")


def _joined(solids: Sequence[Any], name: str) -> Any:
    """Return solids that touch or overlap as one, nothing of them lost."""
    found = made_apart(lambda: fuse([copied(s) for s in solids]), CUT_SECONDS)
    if len(found) != 1 or not is_valid(found[0]):
        raise KernelError(f"{name}: {len(found)} pieces came out, expected one sound solid")
    before, after = sum(volume(s) for s in solids), volume(found[0])
    if abs(before - after) > SAME_VOLUME * before + CRUMB:
        raise KernelError(f"{name}: {after:.3f} mm^3 came out of {before:.3f} mm^3")
    return found[0]


def _thick(solids: Sequence[Any]) -> list[Any]:
    return [s for s in solids if volume(s) > CRUMB]


def _one(solids: Sequence[Any], name: str) -> Any:
    if len(solids) != 1:
        raise KernelError(f"{name} is in {len(solids)} pieces, expected one", remedy="give the side actions by hand")
    return solids[0]
