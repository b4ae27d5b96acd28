"""The bore of each pin: how deep its fit reaches, where it widens, and the pin that belongs into it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from moldgen.catalog import bore
from moldgen.errors import PartError
from moldgen.kernel.pins import Below, level_circles
from moldgen.model.halves import Halves
from moldgen.model.layout import CorePinLayout, EjectorPinLayout, Layout
from moldgen.model.tool import Role
from moldgen.steel.ground import Ground

OVERRUN = 1.0
"""mm: a tool runs past the block by this."""

GROUND_TO_CORE = 0.02
"""mm: a shank this close to a round of the core takes the radius of that round: else a film of steel would remain."""

BESIDE = 0.05
"""mm: steel looked at beside the wider bore behind the fit."""

BEHIND = 0.5
"""mm: least steel between the bore behind the fit and a surface of the core beside it."""


@dataclass(frozen=True)
class Step:
    """One diameter of a bore, from and to a height [mm]."""

    purpose: str
    diameter: float
    low: float
    high: float
    fit: str = ""


@dataclass(frozen=True)
class PinBore:
    """One pin in the core: its bore and its lower end, mold frame [mm].

    steps : of the bore from the bottom of the core block upward; the last one is the fit and ends in the core's surface
    below : the pin below the fit
    mean_top : mean height of the core's surface in the fit, measured on the mesh of the part
    surface : lowest and highest of it
    """

    name: str
    role: Role
    x: float
    y: float
    diameter: float
    steps: tuple[Step, ...]
    below: Below
    mean_top: float
    surface: tuple[float, float]

    @property
    def lower_mm3(self) -> float:
        """Volume of the bore below its fit, by the formula for cylinders [mm^3]."""
        return sum(math.pi / 4 * s.diameter**2 * (s.high - s.low) for s in self.steps[:-1])

    @property
    def expected_upper_mm3(self) -> float:
        """Volume of the fit up to the core's surface, measured on the mesh [mm^3]."""
        return math.pi / 4 * self.diameter**2 * (self.mean_top - self.below.fit_low)


def pin_bores(halves: Halves, layout: Layout, ground: Ground) -> tuple[PinBore, ...]:
    """Return the bores of all pins, core pins first.

    Raises
    ------
    PartError : a bore leaves the block or meets another one
    """
    bottom = float(halves.low[2])
    circles = level_circles(halves.core) if layout.core_pins else np.zeros((0, 4))
    bores = [
        *(_core_pin(ground, bottom, pin, circles) for pin in layout.core_pins),
        *(_ejector_pin(ground, bottom, pin) for pin in layout.ejector_pins),
    ]
    _check_room(halves, bores)
    return tuple(bores)


def _ejector_pin(ground: Ground, bottom: float, pin: EjectorPinLayout) -> PinBore:
    heights = ground.under_circle(pin.x, pin.y, pin.diameter / 2, pin.tip_z)
    beside = ground.under_ring(pin.x, pin.y, pin.clearance_diameter / 2 + BESIDE)
    fit_low = _fit_low(heights, beside, pin.fit_length, bottom)
    sits = bore("ejector pin")
    steps = _steps(bottom, fit_low, (pin.diameter, pin.clearance_diameter), float(heights.max()), sits.fit)
    below = Below(fit_low, pin.seat_z + pin.head_height, pin.seat_z, pin.head_diameter)
    if pin.shank_diameter > 0.0:
        # where the fit reaches deeper than laid out the shoulder goes down with it: it must never run into the fit
        deeper = max(pin.tip_z - pin.tip_drop - pin.fit_length - fit_low, 0.0)
        top = max(pin.shoulder_z - deeper, below.shoulder)
        below = replace(below, shank=pin.shank_diameter, shank_top=top)
    return _bore_of(pin, Role.EJECTOR_PIN, (pin.x, pin.y, pin.diameter), steps, below, heights)


def _core_pin(ground: Ground, bottom: float, pin: CorePinLayout, circles: np.ndarray) -> PinBore:
    x, y, diameter = _ground_to(pin, circles)
    heights = ground.under_circle(x, y, diameter / 2, pin.top_z)
    beside = ground.under_ring(x, y, pin.clearance_diameter / 2 + BESIDE)
    head = pin.head_diameter if pin.head_height > 0.0 else 0.0
    shoulder = bottom + pin.head_height if head else bottom
    ring = ground.under_ring(x, y, diameter / 2 + BESIDE)
    fit_low = _fit_low(np.r_[pin.base_z, ring], beside, pin.fit_length, shoulder)
    sits = bore("core pin")
    top = min(pin.base_z, float(heights.max()))  # the tip above stands in the open, there is no bore round it
    steps = _steps(shoulder, fit_low, (diameter, pin.clearance_diameter), top, sits.fit)
    if head:
        seat = Step("head seat", round(head + sits.counterbore.low, 3), bottom, shoulder)
        steps = (seat, *steps)
    return _bore_of(pin, Role.CORE_PIN, (x, y, diameter), steps, Below(fit_low, shoulder, bottom, head), heights)


def _bore_of(
    pin: EjectorPinLayout | CorePinLayout,
    role: Role,
    shank: tuple[float, float, float],
    steps: tuple[Step, ...],
    below: Below,
    heights: np.ndarray,
) -> PinBore:
    x, y, diameter = shank
    surface = (float(heights.min()), float(heights.max()))
    if surface[0] <= below.fit_low:
        raise PartError(
            f"its fit would end {below.fit_low - surface[0]:.2f} mm above the core's surface",
            where=pin.name,
            remedy="a higher core block (blocks.core_height), or move the pin",
        )
    return PinBore(pin.name, role, x, y, diameter, steps, below, float(heights.mean()), surface)


def _fit_low(surface: np.ndarray, beside: np.ndarray, length: float, bottom: float) -> float:
    """Return where the fit ends: its length below the lowest surface, and below what would open the wider bore."""
    low = float(surface.min()) - length
    if len(beside):
        low = min(low, float(beside.min()) - BEHIND)
    return low if low > bottom + BEHIND else bottom


def _steps(bottom: float, fit_low: float, diameters: tuple[float, float], top: float, fit: str) -> tuple[Step, ...]:
    diameter, clearance = diameters
    fitted = Step("fit", diameter, fit_low, top, fit.partition("/")[0])
    if fit_low <= bottom:
        return (fitted,)
    return (Step("clearance bore", clearance, bottom, fit_low), fitted)


def _ground_to(pin: CorePinLayout, circles: np.ndarray) -> tuple[float, float, float]:
    """Return axis and diameter of a core pin: those of the core's own round where the shank is ground to it."""
    near = np.hypot(circles[:, 0] - pin.x, circles[:, 1] - pin.y) < GROUND_TO_CORE
    near &= np.abs(circles[:, 2] - pin.diameter / 2) < GROUND_TO_CORE
    if not near.any():
        return pin.x, pin.y, pin.diameter
    found = circles[near]
    x, y, radius, _ = found[np.argmax(found[:, 2])]
    return float(x), float(y), float(2 * radius)


def _check_room(halves: Halves, bores: Sequence[PinBore]) -> None:
    for number, one in enumerate(bores):
        widest = max(s.diameter for s in one.steps) / 2
        inside = min(one.x - halves.low[0], halves.high[0] - one.x, one.y - halves.low[1], halves.high[1] - one.y)
        if inside <= widest:
            raise PartError(
                f"its bore of {2 * widest:.2f} mm leaves the block: its axis is {inside:.2f} mm from the side",
                where=f"{one.name} at x {one.x:.2f}, y {one.y:.2f}",
                remedy="move the pin, or give a larger block",
            )
        for other in bores[:number]:
            steel = _steel_between(one, other)
            if steel <= 0.0:
                raise PartError(
                    f"the bores of {other.name} and {one.name} meet: {-steel:.2f} mm too close",
                    where=f"x {one.x:.2f}, y {one.y:.2f}",
                    remedy="move one of the pins, or use thinner ones",
                )


def _steel_between(one: PinBore, other: PinBore) -> float:
    gap = math.hypot(one.x - other.x, one.y - other.y)
    together = [
        gap - (a.diameter + b.diameter) / 2
        for a in one.steps
        for b in other.steps
        if min(a.high, b.high) > max(a.low, b.low)
    ]
    return min(together, default=gap)
