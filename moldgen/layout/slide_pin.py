"""The angled pin of a slide: how steep, how thick, how long, how many."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.catalog import Pin, Resin, ejector_pin_series
from moldgen.kernel.body import Body
from moldgen.kernel.polygon import signed_area
from moldgen.model.side_action import Front
from moldgen.rules.ejection import ejection_force_sleeve_menges
from moldgen.rules.side_action import angled_pin_delay_pye, angled_pin_length_pye, angled_pin_opening_pye
from moldgen.rules.side_practice import PIN_CLEARANCE, PIN_OPENING, PIN_STRESS, PIN_TIP, PIN_WALL, SLIDE_FRICTION
from moldgen.rules.slide import angled_pin_bending_stress, angled_pin_side_force, slide_drag

ANGLES: Final = (15.0, 18.0, 20.0, 22.0, 25.0)
"""deg: angles that are tried, flattest first (common practice: 10 to 25, best 15 to 20)."""

THINNEST: Final = 10.0
"""mm: thinner pins are not used as angled pins (our choice)."""

WIDE: Final = 100.0
"""mm: a wider slide gets two angled pins, or it jams (common practice, from memory)."""

STEEL_DENSITY: Final = 7.85e-3
"""g/mm^3."""


OUT_EARLY: Final = 1.0
"""mm: taken off the pin: of the 2 mm that a slide travels beyond need, the last 0.4 are not driven (our choice)."""


@dataclass(frozen=True)
class PinChoice:
    """Angled pins for one slide [mm, N, MPa].

    count : 1 or 2; spread : distance between two of them; blank : row of the series that they are ground from
    working : length that moves the slide; delay, opening : of the mold, before and while the slide moves
    sticking : force that holds the front in the part; drag, side_force : on all pins, on each; stress : in each
    """

    count: int
    spread: float
    blank: Pin
    angle: float
    clearance: float
    working: float
    delay: float
    opening: float
    sticking: float
    mass: float
    drag: float
    side_force: float
    stress: float

    @property
    def diameter(self) -> float:
        """Diameter of the shank."""
        return self.blank.diameter

    @property
    def bore(self) -> float:
        """Diameter of the bore in the slide."""
        return self.diameter + 2 * self.clearance

    @property
    def hole_half(self) -> float:
        """Half the length of the bore in a level plane, along the travel."""
        return self.bore / 2 / math.cos(math.radians(self.angle))

    @property
    def width_needed(self) -> float:
        """Width of the slide that holds the bores."""
        return self.spread + self.bore + 2 * PIN_WALL.default

    @property
    def reach(self) -> float:
        """Length down the axis from the top of the slide to the end of the tip.

        A little shorter than what just moves the slide home: the pin must be out of it when it stops, since from there
        on the pin rises without it.
        """
        return self.working + self.diameter / 2 * math.tan(math.radians(self.angle)) + PIN_TIP.default - OUT_EARLY


def choose_angle(travel: float) -> float:
    """Return the flattest angle at which the mold need not open far before the slide is out [deg].

    >>> choose_angle(12.0), choose_angle(16.0), choose_angle(80.0)
    (15.0, 18.0, 25.0)
    """
    fits = (a for a in ANGLES if angled_pin_opening_pye(travel, a) <= PIN_OPENING.default)
    return next(fits, ANGLES[-1])


def too_far_for_pin(travel: float) -> bool:
    """Return whether even the steepest angled pin would want the mold to open too far.

    >>> too_far_for_pin(37.0), too_far_for_pin(38.0)
    (False, True)
    """
    return angled_pin_opening_pye(travel, ANGLES[-1]) > PIN_OPENING.high


def choose_pin(
    fronts: Sequence[Front], travel: float, size: tuple[float, float, float], resin: Resin, part: Body
) -> PinChoice:
    """Return the thinnest pins of the series that bend within the limit, or the thickest there are.

    size : width, height and length of the slide's body [mm]
    """
    angle, clearance = choose_angle(travel), PIN_CLEARANCE.default
    working = angled_pin_length_pye(travel, clearance, angle)
    sticking = sum(front_sticking(f, resin, part) for f in fronts)
    mass = STEEL_DENSITY * float(np.prod(size))
    drag = slide_drag(sticking, mass, SLIDE_FRICTION.default)
    count = 2 if size[0] > WIDE else 1
    force = angled_pin_side_force(drag, angle, SLIDE_FRICTION.default) / count
    series = [pin for pin in ejector_pin_series() if pin.diameter >= THINNEST]
    strong = (p for p in series if angled_pin_bending_stress(force, working, p.diameter) <= PIN_STRESS.default)
    blank = next(strong, series[-1])
    return PinChoice(
        count=count,
        spread=size[0] / 2 if count == 2 else 0.0,
        blank=blank,
        angle=angle,
        clearance=clearance,
        working=working,
        delay=angled_pin_delay_pye(clearance, angle),
        opening=angled_pin_opening_pye(travel, angle),
        sticking=sticking,
        mass=mass,
        drag=drag,
        side_force=force,
        stress=angled_pin_bending_stress(force, working, blank.diameter),
    )


def front_sticking(front: Front, resin: Resin, part: Body) -> float:
    """Return the force that holds a front in the part [N]: each of its cores as if a closed wall had shrunk onto it.

    Upper bound: a window is gripped on its rim only, by the mean wall of the part over the depth of the undercut.
    """
    cores = sum(signed_area(p) > 0.0 for p in front.outline)
    wall = 2.0 * part.mesh.volume() / max(float(part.mesh.areas().sum()), 1e-9)
    strain = min(resin.shrink_along.low, resin.shrink_across.low) / 100.0
    depth = max(front.travel, 0.1)
    one = ejection_force_sleeve_menges(resin.friction.mean, resin.ejection_modulus.mean, strain, wall, depth)
    return max(cores, 1) * one
