"""Solids of a slide outside the part: body, bores, angled pin. Mold frame, mm."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from moldgen.errors import KernelError
from moldgen.kernel.boolean import common, cut
from moldgen.kernel.inclined import inclined_solid
from moldgen.kernel.side_prism import outline_prism
from moldgen.kernel.turned import turned_solid
from moldgen.model.side_action import across
from moldgen.model.slide import AngledPinLayout, SideCorePinLayout, SlideBody, SlideLayout
from moldgen.rules.side_practice import UNDER_TIP

OUT = 1.0
"""mm: how far a tool runs out of what it cuts."""

SQUARE = 1e-12
"""1 - cosine up to which an axis is square to a side of the block, so that the body ends on it."""

LEAD = 30.0
"""deg: half angle of the tapered tip of an angled pin; more than the pin leans, so that it lets go of a slide that has
stopped (geometry; a round tip does the same)."""

ROD_DIAMETER, ROD_DEPTH = 10.2, 25.0
"""mm: hole for the rod of a cylinder, thread M12 (common practice: depth two diameters)."""

Corners = tuple[np.ndarray, np.ndarray]


def body_solid(slide: SlideLayout, corners: Corners) -> Any:
    """Return the whole body of a level slide inside the block, without bores.

    Raises
    ------
    KernelError : it is not one solid
    """
    body = _body(slide)
    frame = across(slide.axis)
    square = bool(np.max(np.abs(frame[2])) > 1.0 - SQUARE)
    far = body.side if square else _far(frame[2], corners) + OUT
    solid = outline_prism([_profile(body)], frame, body.start, far)[0]
    if not square:
        solid = _only(common(solid, block_solid(corners)), slide.name)
    if body.locking_deg > 0.0:
        solid = _only(cut(solid, [_heel(body, frame, far)]), slide.name)
    return solid


def _profile(body: SlideBody) -> np.ndarray:
    """Return the section across the travel: a T upside down, counterclockwise."""
    wide, knee = body.ledge_width, body.bottom + body.ledge_height
    return np.array(
        [
            (body.left - wide, body.bottom), (body.right + wide, body.bottom), (body.right + wide, knee),
            (body.right, knee), (body.right, body.top), (body.left, body.top), (body.left, knee),
            (body.left - wide, knee),
        ]
    )  # fmt: skip


def _heel(body: SlideBody, frame: np.ndarray, far: float) -> Any:
    """Return what the locking face cuts off the body's rear: everything outside it, over the parting plane."""
    lean = math.tan(math.radians(body.locking_deg))
    foot, over = body.side - body.foot, body.top + OUT
    corners = [
        (foot, body.level),
        (far + OUT, body.level),
        (far + OUT, over),
        (foot - (over - body.level) * lean, over),
    ]
    sideways = np.vstack([frame[2], frame[1], -frame[0]])
    wide = body.ledge_width + OUT
    return outline_prism([np.array(corners)], sideways, -body.right - wide, -body.left + wide)[0]


def before_start(slide: SlideLayout, corners: Corners) -> Any:
    """Return the half space before the body, as a box that holds all of the block there."""
    body, frame = _body(slide), across(slide.axis)
    low, high = corners
    reach = float(np.linalg.norm(high - low)) + OUT
    middle = frame @ (0.5 * (low + high))
    u, z = float(middle[0]), float(middle[1])
    window = np.array([(u - reach, z - reach), (u + reach, z - reach), (u + reach, z + reach), (u - reach, z + reach)])
    return outline_prism([window], frame, min(float(middle[2]), body.start) - reach, body.start)[0]


def block_solid(corners: Corners) -> Any:
    """Return the closed block as one box."""
    low, high = corners
    rectangle = np.array([[low[0], low[1]], [high[0], low[1]], [high[0], high[1]], [low[0], high[1]]])
    return outline_prism([rectangle], np.eye(3), float(low[2]), float(high[2]))[0]


def pin_tool(pin: AngledPinLayout, seam: float) -> Any:
    """Return an angled pin with its head running out of the block."""
    radius, head = pin.diameter / 2, pin.head_diameter / 2
    shank_end = pin.length - pin.tip
    over = head * math.tan(math.radians(pin.angle)) + OUT
    nose = radius - pin.tip * math.tan(math.radians(LEAD))
    outline = [(head, -over), (head, pin.head_depth), (radius, pin.head_depth), (radius, shank_end), (nose, pin.length)]
    return inclined_solid(pin.top, pin.along, outline, seam)


def pin_solid(pin: AngledPinLayout, corners: Corners) -> Any:
    """Return an angled pin, its head cut flush with the top of the block."""
    return _only(common(pin_tool(pin, 0.0), block_solid(corners)), pin.name)


def bore_tool(pin: AngledPinLayout, body: SlideBody, seam: float) -> Any:
    """Return the bore of an angled pin right through a slide."""
    radius, lean = pin.bore / 2, math.tan(math.radians(pin.angle))
    x, y = pin.at(body.top)
    over = radius * lean + OUT
    way = body.height / math.cos(math.radians(pin.angle)) + over
    return inclined_solid((x, y, body.top), pin.along, [(radius, -over), (radius, way)], seam)


def core_bore(pin: AngledPinLayout, body: SlideBody) -> tuple[float, float, float, float, float] | None:
    """Return x, y, diameter and the heights of the upright bore in the core that lets the tip stand and rise.

    The pin rises straight up with the cavity half, so its way below the slide is as wide as it leans there. None: the
    pin ends in the slide.
    """
    deepest = pin.tip_z - pin.diameter / 2 * math.sin(math.radians(pin.angle))
    if deepest >= body.bottom - OUT / 2:
        return None
    slope = math.radians(pin.angle)
    (x0, y0), (x1, y1) = pin.at(body.bottom), pin.at(pin.tip_z)
    wide = pin.bore / math.cos(slope) + math.hypot(x1 - x0, y1 - y0)
    return 0.5 * (x0 + x1), 0.5 * (y0 + y1), math.ceil(2 * wide) / 2, deepest - UNDER_TIP.default, body.bottom


def core_bore_tool(place: tuple[float, float, float, float, float], seam: float) -> Any:
    """Return the tool of the upright bore; it ends above the floor of the slide's guide, in the open."""
    x, y, diameter, low, high = place
    return turned_solid((x, y), [(diameter / 2, low), (diameter / 2, high + OUT)], seam)


def core_pin_seat(slide: SlideLayout, pin: SideCorePinLayout, seam: float) -> Any:
    """Return the shank of a side core pin in its slide, from the slide's front end."""
    body, frame = _body(slide), across(slide.axis)
    x, y, z = (float(v) for v in pin.u * frame[0] + pin.z * frame[1] + body.start * frame[2])
    along = (float(frame[2][0]), float(frame[2][1]), float(frame[2][2]))
    return inclined_solid((x, y, z), along, [(pin.diameter / 2, 0.0), (pin.diameter / 2, pin.depth)], seam)


def rod_tool(slide: SlideLayout, corners: Corners, seam: float) -> Any:
    """Return the hole for a cylinder's rod in the rear of a slide."""
    body, frame = _body(slide), across(slide.axis)
    far = _far(frame[2], corners) + OUT
    middle = 0.5 * (body.left + body.right) * frame[0] + 0.5 * (body.bottom + body.top) * frame[1] + far * frame[2]
    x, y, z = (float(v) for v in middle)
    depth = far - (body.side - ROD_DEPTH)
    along = (-float(frame[2][0]), -float(frame[2][1]), -float(frame[2][2]))
    return inclined_solid((x, y, z), along, [(ROD_DIAMETER / 2, 0.0), (ROD_DIAMETER / 2, depth)], seam)


def _far(axis: np.ndarray, corners: Corners) -> float:
    block = np.array([[corners[k][i] for i, k in enumerate(bits)] for bits in np.ndindex(2, 2, 2)])
    return float((block @ axis).max())


def _only(solids: list[Any], name: str) -> Any:
    if len(solids) != 1:
        raise KernelError(f"{name} came out as {len(solids)} solids, expected one")
    return solids[0]


def _body(slide: SlideLayout) -> SlideBody:
    if slide.body is None:
        raise KernelError(f"{slide.name} has no body of its own")
    return slide.body
