"""Bores that angled pins and cylinders need in slides and halves, with their rows in the table of holes."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from typing import Any

from moldgen.kernel.boolean import copied
from moldgen.kernel.measure import volume_adaptive
from moldgen.model.slide import AngledPinLayout, SlideBody, SlideLayout
from moldgen.model.tool import Component, Hole
from moldgen.steel.bored import Removed
from moldgen.steel.cutting import Wanted, cut_half
from moldgen.steel.slide_solids import Corners, bore_tool, core_bore, core_bore_tool, pin_tool, rod_tool

SURE = 1e-7
"""Relative error of the volumes of what is bored out."""


@dataclass
class SideWork:
    """The halves while slides are cut out of them, and what has come out so far.

    corners : of the block; material : steel of slides and lifters
    """

    cavity: Any
    core: Any
    corners: Corners
    material: str
    components: list[Component]
    holes: list[Hole]
    removed: list[Removed]


def bore_slide(work: SideWork, slide: SlideLayout, body: SlideBody, solid: Any) -> Any:
    """Return a slide with its bores; those for its pins in the halves are taken out of `work`.

    Raises
    ------
    KernelError : a bore fails; the message names it
    """
    for pin in slide.pins:
        work.cavity = _taken(work, work.cavity, "cavity", pin.name, partial(pin_tool, pin))
        solid = _taken(work, solid, slide.name, pin.name, partial(bore_tool, pin, body))
        place = core_bore(pin, body)
        if place is not None:
            work.core = _taken(work, work.core, "core", pin.name, partial(core_bore_tool, place))
        work.holes += _pin_holes(pin, body, slide.name, place)
    if slide.pins:
        return solid
    return _taken(work, solid, slide.name, f"rod of {slide.name}", partial(rod_tool, slide, work.corners))


def _taken(work: SideWork, solid: Any, owner: str, name: str, make: Callable[[float], Any]) -> Any:
    """Return a solid without one bore, whose volume is noted."""
    done = cut_half(solid, [Wanted(name, make)], owner)
    work.removed.append(Removed(owner, name, volume_adaptive(done.plugs[0], SURE)))
    return copied(done.half)


def _pin_holes(
    pin: AngledPinLayout, body: SlideBody, slide: str, place: tuple[float, float, float, float, float] | None
) -> list[Hole]:
    """Return rows for the bores of one pin; of those that lean, x and y are where the axis meets the upper height."""
    x, y, z = pin.top
    in_x, in_y = pin.at(body.top)
    lean = f"leans {pin.angle:g} deg from the pull, outward going down; x, y at its upper end"
    found = [
        Hole("cavity", f"{pin.name}, head seat, {lean}", x, y, z - pin.head_depth, z, pin.head_diameter),
        Hole("cavity", f"{pin.name}, fit, {lean}", x, y, body.top, z, pin.diameter, "H7"),
        Hole(slide, f"{pin.name}, clearance bore, {lean}", in_x, in_y, body.bottom, body.top, pin.bore),
    ]
    if place is not None:
        across_x, across_y, diameter, low, high = place
        found.append(Hole("core", f"{pin.name}, upright bore for its tip", across_x, across_y, low, high, diameter))
    return found
