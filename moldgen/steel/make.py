"""From two halves and a layout to the tool: pins, bores and feed, every one of them checked when it is cut."""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial
from typing import Any

from moldgen.errors import KernelError, PartError
from moldgen.finding import Decision, Notes
from moldgen.kernel.channel import joined
from moldgen.kernel.measure import volume
from moldgen.kernel.pins import upper_volume
from moldgen.kernel.turned import stepped_solid
from moldgen.model.halves import Halves
from moldgen.model.layout import Layout
from moldgen.model.tool import Component, Hole, Motion, Role, Tool
from moldgen.steel.bored import Bored, Materials, Removed
from moldgen.steel.bores import OVERRUN, PinBore, pin_bores
from moldgen.steel.cutting import Cut, Wanted, cut_half
from moldgen.steel.feed import Feed, make_feed
from moldgen.steel.ground import Ground
from moldgen.steel.pins import pin_components

SURE = 1e-6
"""Relative difference by which a bore below its fit may miss the volume of its cylinders."""


def make_tool(halves: Halves, layout: Layout, materials: Materials) -> tuple[Tool, Bored, Notes]:
    """Return the tool: part, cavity, core, core pins, ejector pins and the solidified feed.

    Everything is taken out of each half in one calculation, and what comes out becomes the pins' tips and the feed: the
    components fit each other exactly, without play; fits are told in the table of holes.

    Returns
    -------
    tool : part, cavity and core first; a pin's definition stands on z = 0 and its positions put it into the mold
    bored : what was taken out of each half, for the balance of volumes

    Raises
    ------
    PartError : the layout does not fit the block or the part
    KernelError : the kernel cannot cut something; the message names it
    """
    ground = Ground(halves)
    bores = pin_bores(halves, layout, ground)
    feed = make_feed(halves, layout.gate, ground)
    core = cut_half(halves.core, _of_core(halves, bores, feed), "core")
    cavity = cut_half(halves.cavity, [Wanted("sprue", lambda _: feed.in_cavity)], "cavity")
    _check_lower(bores, core.plugs)
    pins, notes = pin_components(bores, core.plugs, materials)
    sprue = _solidified(core.plugs[len(bores) :], cavity.plugs)
    components = (
        Component("part", Role.PART, halves.body.solid, materials.part, Motion.PART),
        Component("cavity", Role.CAVITY, cavity.half, materials.cavity, Motion.CAVITY_HALF),
        Component("core", Role.CORE, core.half, materials.core, Motion.CORE_HALF),
        *pins,
        Component("sprue", Role.SPRUE, sprue, materials.part, feed.motion, note=feed.note),
    )
    removed = [Removed("core", b.name, volume(p)) for b, p in zip(bores, core.plugs, strict=False)]
    removed += [Removed("core", "sprue", volume(p)) for p in core.plugs[len(bores) :]]
    removed += [Removed("cavity", "sprue", volume(p)) for p in cavity.plugs]
    tool = Tool(components, (*_pin_holes(bores), *feed.holes))
    return tool, Bored(tuple(removed)), notes + feed.notes + _refusals(core, cavity)


def _of_core(halves: Halves, bores: Sequence[PinBore], feed: Feed) -> list[Wanted]:
    wanted = [Wanted(b.name, partial(_bore_tool, halves, b), b.lower_mm3 + b.expected_upper_mm3) for b in bores]
    if feed.in_core is not None:
        wanted.append(Wanted("sprue", lambda _: feed.in_core))
    return wanted


def _bore_tool(halves: Halves, bore: PinBore, seam: float) -> Any:
    """Return the solid of a bore, from under the block to over it: the core ends it in its own surface."""
    steps = [(s.diameter / 2, s.low, s.high) for s in bore.steps]
    steps[0] = (steps[0][0], steps[0][1] - OVERRUN, steps[0][2])
    steps[-1] = (steps[-1][0], steps[-1][1], float(halves.high[2]) + OVERRUN)
    return stepped_solid((bore.x, bore.y), steps, seam)


def _check_lower(bores: Sequence[PinBore], plugs: Sequence[Any]) -> None:
    """Below its fit a bore must be whole: steel missing there means that it opens into the mold's surface."""
    for bore, plug in zip(bores, plugs, strict=False):
        try:
            lower = volume(plug) - upper_volume(plug, bore.below.fit_low)
        except KernelError as error:
            raise PartError(
                error.what,
                where=f"{bore.name} at x {bore.x:.2f}, y {bore.y:.2f} in the mold",
                remedy="move the pin away from the wall beside it",
            ) from error
        if abs(lower - bore.lower_mm3) > SURE * max(bore.lower_mm3, 1.0):
            raise PartError(
                f"its bore below the fit opens into the core's surface: {lower:.3f} mm^3 of steel instead of "
                f"{bore.lower_mm3:.3f} mm^3",
                where=f"{bore.name} at x {bore.x:.2f}, y {bore.y:.2f} in the mold",
                remedy="move the pin away from the wall beside it",
            )


def _solidified(from_core: Sequence[Any], from_cavity: Sequence[Any]) -> Any:
    """Return the feed as one solid, of what it took out of the cavity half and, with a gate in it, of the core half."""
    if not from_core:
        return from_cavity[0]
    return joined([*from_cavity, *from_core], "join the feed of both halves")


def _pin_holes(bores: Sequence[PinBore]) -> tuple[Hole, ...]:
    return tuple(
        Hole("core", f"{b.name}, {s.purpose}", b.x, b.y, s.low, s.high, s.diameter, s.fit)
        for b in bores
        for s in reversed(b.steps)
    )


def _refusals(*cuts: Cut) -> Notes:
    """Tell when a half had to be bored piece by piece."""
    return Notes(
        decisions=tuple(
            Decision("boring", "piece by piece", "the kernel failed on all at once", "one by one", cut.refused)
            for cut in cuts
            if cut.refused
        )
    )
