"""From two halves and a layout to the tool: pins, bores and feed, every one of them checked when it is cut."""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial
from typing import Any

from moldgen.errors import KernelError, PartError
from moldgen.finding import Decision, Notes
from moldgen.kernel.channel import joined
from moldgen.kernel.measure import volume_adaptive
from moldgen.kernel.pins import faces_below
from moldgen.kernel.turned import stepped_solid
from moldgen.model.halves import Halves
from moldgen.model.layout import GateLayout, Layout
from moldgen.model.tool import Component, Hole, Motion, Role, Tool
from moldgen.steel.bored import Bored, Materials, Removed
from moldgen.steel.bores import OVERRUN, PinBore, pin_bores
from moldgen.steel.cutting import Cut, Wanted, cut_half
from moldgen.steel.fed_cavity import SURE, FedCavityBeside, of_feed
from moldgen.steel.ground import Ground
from moldgen.steel.pins import pin_components
from moldgen.steel.side_actions import SideCut


def make_tool(
    halves: Halves, layout: Layout, materials: Materials, sides: SideCut | None = None
) -> tuple[Tool, Bored, Notes]:
    """Return the tool: part, cavity, core, core pins, ejector pins and the solidified feed.

    Everything is taken out of each half in one calculation, and what comes out becomes the pins' tips and the feed: the
    components fit each other exactly, without play; fits are told in the table of holes.

    sides : the side actions, if any, already taken out of the halves

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
    making = FedCavityBeside(halves, layout.gate, ground, apart=bool(bores))
    try:
        core = _bored_core(halves, layout.gate, ground, bores, making)
        _check_lower(bores, core.plugs[: len(bores)])
        pins, notes = pin_components(bores, core.plugs[: len(bores)], materials)
        names = [*(b.name for b in bores), "sprue"]  # the last one only if the core takes part of it
        removed = [Removed("core", name, volume_adaptive(p, SURE)) for name, p in zip(names, core.plugs, strict=False)]
        fed = making.result()
    finally:
        making.stop()
    cavity, feed = fed.cut, fed.feed
    sprue = _solidified(core.plugs[len(bores) :], cavity.plugs)
    components = (
        Component("part", Role.PART, halves.real_part, materials.part, Motion.PART),
        Component("cavity", Role.CAVITY, cavity.half, materials.cavity, Motion.CAVITY_HALF),
        Component("core", Role.CORE, core.half, materials.core, Motion.CORE_HALF),
        *(sides.components if sides else ()),
        *pins,
        Component("sprue", Role.SPRUE, sprue, materials.part, feed.motion, note=feed.note),
    )
    removed += [Removed("cavity", "sprue", mm3) for mm3 in fed.plugs_mm3]
    removed += sides.removed if sides else ()
    tool = Tool(components, (*_pin_holes(bores), *feed.holes, *(sides.holes if sides else ())))
    return tool, Bored(tuple(removed)), notes + feed.notes + _refusals(core, cavity)


def _bored_core(
    halves: Halves, gate: GateLayout, ground: Ground, bores: Sequence[PinBore], making: FedCavityBeside
) -> Cut:
    wanted = [Wanted(b.name, partial(_bore_tool, halves, b), b.lower_mm3 + b.expected_upper_mm3) for b in bores]
    if making.in_core:
        wanted.append(of_feed(halves, gate, ground, "in_core", making.result().feed))
    return cut_half(halves.core, wanted, "core")


def _bore_tool(halves: Halves, bore: PinBore, seam: float) -> Any:
    """Return the solid of a bore, from under the block to over it: the core ends it in its own surface."""
    steps = [(s.diameter / 2, s.low, s.high) for s in bore.steps]
    steps[0] = (steps[0][0], steps[0][1] - OVERRUN, steps[0][2])
    steps[-1] = (steps[-1][0], steps[-1][1], float(halves.high[2]) + OVERRUN)
    return stepped_solid((bore.x, bore.y), steps, seam)


def _check_lower(bores: Sequence[PinBore], plugs: Sequence[Any]) -> None:
    """Below its fit a bore must be whole: with more faces than its steps have, it opens into the mold's surface."""
    for bore, plug in zip(bores, plugs, strict=True):
        try:
            found = faces_below(plug, bore.below.fit_low)
        except KernelError as error:
            raise _opened(bore, error.what) from error
        if found != 2 * len(bore.steps) - 1:  # the bottom, then a wall and a shoulder for each wider step
            raise _opened(bore, "its bore below the fit opens into the surface of the core")


def _opened(bore: PinBore, what: str) -> PartError:
    where = f"{bore.name} at x {bore.x:.2f}, y {bore.y:.2f} in the mold"
    return PartError(what, where=where, remedy="move the pin away from the wall beside it")


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
