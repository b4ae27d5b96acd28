"""What the layout decides about slides and lifters; the steel is cut from these. Mold frame, mm.

A level slide is described in the frame `across(axis)` of its axis: u across the travel, z along the pull, s along the
travel. Its body is a T lying on the core half, with its ledges at the bottom, that ends in the side of the block; over
the parting plane its rear is cut off by the locking face, which the cavity half backs.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

import numpy as np

from moldgen.model.part import Vector
from moldgen.model.side_action import across


class Drive(StrEnum):
    """What moves a slide, and when."""

    ANGLED_PIN = "angled pin"
    CYLINDER = "cylinder, before the mold opens"


@dataclass(frozen=True)
class AngledPinLayout:
    """One angled pin, held in the cavity half; its head lies flush with the top of the block.

    top : where its axis leaves the block; along : unit vector down its axis; angle : from the pull [deg]
    diameter, bore : of the pin and of the bore in the slide; head_diameter, head_depth : the latter down the axis from
        `top` to the lower face of the head; tip : length of the tapered lead; length : from `top` to the end of the tip
    working : length that moves the slide, from its top; catalog_length : of the blank before its head is cut flush, 0
        when no blank is long enough
    """

    name: str
    top: Vector
    along: Vector
    angle: float
    diameter: float
    bore: float
    head_diameter: float
    head_depth: float
    tip: float
    length: float
    working: float
    catalog_length: float

    def at(self, height: float) -> tuple[float, float]:
        """Return x, y of the axis at a height [mm]."""
        way = (height - self.top[2]) / self.along[2]
        return self.top[0] + way * self.along[0], self.top[1] + way * self.along[1]

    @property
    def tip_z(self) -> float:
        """Lowest height of the tip's middle while the mold is closed [mm]."""
        return self.top[2] + self.length * self.along[2]


@dataclass(frozen=True)
class SlideBody:
    """The body of a level slide [mm].

    start, side : where it begins along the axis, and where the nearest corner of it meets the side of the block
    left, right : along u, without ledges; bottom, top, level : heights, of the parting plane last
    ledge_width, ledge_height : of the guide ledges at its bottom
    foot : steel of the cavity half behind the locking face at the parting plane; locking_deg : of the face, from the
        pull; both 0 when nothing backs the slide
    """

    start: float
    side: float
    left: float
    right: float
    bottom: float
    top: float
    level: float
    ledge_width: float
    ledge_height: float
    foot: float
    locking_deg: float

    @property
    def length(self) -> float:
        """Length in the guide, closed."""
        return self.side - self.start

    @property
    def height(self) -> float:
        """Whole height."""
        return self.top - self.bottom

    @property
    def width(self) -> float:
        """Width without ledges."""
        return self.right - self.left

    @property
    def locking_top(self) -> float:
        """Where the locking face ends at the top, along the axis."""
        return self.side - self.foot - (self.top - self.level) * float(np.tan(np.radians(self.locking_deg)))

    @property
    def volume_mm3(self) -> float:
        """Volume of the whole body when it ends square in the side of the block, bores not taken out."""
        full = (self.width * self.height + 2 * self.ledge_width * self.ledge_height) * self.length
        if self.locking_deg <= 0.0:
            return full
        rise = self.top - self.level
        mean = 0.5 * (self.foot + (self.side - self.locking_top))
        return full - self.width * rise * mean


@dataclass(frozen=True)
class SideCorePinLayout:
    """A long round front as a pin of its own, let into the slide from its front end and held there by a dowel.

    front : name of its forming steel; u, z : of its axis, in the frame across the travel; diameter : of the shank in
    the slide; depth : of its bore there; slenderness : length before the slide over the diameter of the front
    """

    name: str
    front: str
    u: float
    z: float
    diameter: float
    depth: float
    slenderness: float


@dataclass(frozen=True)
class SlideLayout:
    """One slide.

    name : of the first front that it carries, "slide 1"; serves : names of all of them
    axis : unit vector of its travel; drive : what moves it; carried : the half that it stays on, a `Motion`
    body : None for a front that runs to the side of the block in a guided bore of its own outline
    travel : way out [mm]; delay : opening before it moves; opening : opening during which it moves (0, 0: by cylinder)
    """

    name: str
    serves: tuple[str, ...]
    axis: Vector
    drive: Drive
    carried: str
    body: SlideBody | None
    travel: float
    delay: float
    opening: float
    pins: tuple[AngledPinLayout, ...] = ()
    core_pins: tuple[SideCorePinLayout, ...] = ()

    def footprint(self) -> np.ndarray:
        """Return the corners of body and ledges in plan, counterclockwise, (4, 2) [mm]; (0, 2) without a body."""
        if self.body is None:
            return np.zeros((0, 2))
        body, frame = self.body, across(self.axis)
        left, right = body.left - body.ledge_width, body.right + body.ledge_width
        corners = [(left, body.start), (left, body.side), (right, body.side), (right, body.start)]
        plan = np.array([u * frame[0][:2] + s * frame[2][:2] for u, s in corners])
        first, second = plan[1] - plan[0], plan[2] - plan[1]
        return plan if first[0] * second[1] > first[1] * second[0] else plan[::-1]


@dataclass(frozen=True)
class LifterLayout:
    """One lifter: a shaft of its front's outline, down through the core at an angle.

    axis : unit vector down the shaft; release : unit vector sideways; angle : of the shaft, from the pull [deg]
    stroke : of the ejectors; travel : sideways over the stroke; needed : by the undercut, with clearance
    guided : length of the shaft in the core block; thickness : least width of the outline
    """

    name: str
    axis: Vector
    release: Vector
    angle: float
    stroke: float
    travel: float
    needed: float
    guided: float
    thickness: float

    def displacement(self, stroke: float) -> Vector:
        """Return how far the lifter moves when the ejectors move by `stroke` [mm]."""
        x, y, z = (float(-v * stroke / -self.axis[2]) for v in self.axis)
        return (x + 0.0, y + 0.0, z)


@dataclass(frozen=True)
class SideLayout:
    """All side actions of a tool."""

    slides: tuple[SlideLayout, ...] = ()
    lifters: tuple[LifterLayout, ...] = ()
