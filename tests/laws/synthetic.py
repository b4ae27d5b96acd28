"""Thirty parts made from a few dimensions: what a molder is sent, and what cannot be molded straight."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

from helpers import solids

Part = Callable[[], Any]


def tub(length: float, width: float, depth: float, wall: float) -> Any:
    """A tub that opens downwards."""
    inner = solids.box((wall, wall, -1.0), (length - wall, width - wall, depth - wall))
    return solids.cut(solids.box((0, 0, 0), (length, width, depth)), inner)


def ribbed(length: float, width: float, ribs: int) -> Any:
    """A tub with ribs across its inside."""
    pitch = length / (ribs + 1)
    walls = [solids.box((k * pitch - 0.6, 1.0, 2.0), (k * pitch + 0.6, width - 1.0, 11.0)) for k in range(1, ribs + 1)]
    return solids.fuse(tub(length, width, 12.0, 2.0), *walls)


def lid(length: float, width: float, bosses: int) -> Any:
    """A plate with a rim below and bosses."""
    plate = tub(length, width, 5.0, 1.6)
    posts = [solids.cone(2.2, 2.0, 6.0, at=(8.0 + 11.0 * k, 0.4 * width, 4.2)) for k in range(bosses)]
    return solids.fuse(plate, *posts)


def bracket(arm: float, height: float, radius: float) -> Any:
    """An angle with a hole in each leg: no straight pull leaves both holes."""
    angle = solids.fuse(solids.box((0, 0, 0), (arm, 18, 3)), solids.box((0, 0, 0), (3, 18, height)))
    flat = solids.cylinder(radius, 9, at=(0.6 * arm, 8, -3))
    return solids.cut(angle, flat, solids.cylinder(radius, 9, at=(-3, 10, 0.6 * height), along=(1, 0, 0)))


def funnel(mouth: float, spout: float, height: float) -> Any:
    """A funnel, its mouth down."""
    outer = solids.fuse(solids.cone(mouth, spout, height), solids.cylinder(spout, height + 12))
    wall = 1.5
    inner = solids.fuse(
        solids.cone(mouth - wall, spout - wall, height, at=(0, 0, -0.01)),
        solids.cylinder(spout - wall, height + 30, at=(0, 0, -5)),
    )
    return solids.cut(outer, inner)


def knob(radius: float, height: float, flutes: int) -> Any:
    """A knob with flutes and a blind bore from below."""
    body = solids.cut(solids.cone(radius, 0.93 * radius, height), solids.cone(3.2, 3.0, 0.6 * height, at=(0, 0, -0.01)))
    for k in range(flutes):
        turn = 2.0 * math.pi * (k + 0.5) / flutes
        at = (1.08 * radius * math.cos(turn), 1.08 * radius * math.sin(turn), -1.0)
        body = solids.cut(body, solids.cylinder(0.2 * radius, height + 2, at=at))
    return body


def windowed(windows: int, sill: float) -> Any:
    """A tub with windows in its sides."""
    shell = tub(44, 30, 18, 2)
    holes = [
        solids.box((40, 10, sill), (48, 18, sill + 5)),
        solids.box((14, 26, sill), (24, 34, sill + 5)),
        solids.box((-4, 9, sill), (4, 20, sill + 5)),
    ]
    return solids.cut(shell, *holes[:windows])


def grooved(radius: float, depth: float) -> Any:
    """A sleeve with a groove around it."""
    sleeve = solids.cut(solids.cylinder(radius, 20), solids.cylinder(radius - 5, 30, at=(0, 0, -5)))
    ring = solids.cut(solids.cylinder(radius + 5, 4, at=(0, 0, 8)), solids.cylinder(radius - depth, 4, at=(0, 0, 8)))
    return solids.cut(sleeve, ring)


def hooked(overhang: float) -> Any:
    """A plate with a hook that reaches over it."""
    plate = solids.fuse(solids.box((0, 0, 0), (40, 24, 3)), solids.box((18, 8, 0), (21, 16, 14)))
    return solids.fuse(plate, solids.box((18, 8, 11), (21 + overhang, 16, 14)))


def domed(peak: float) -> Any:
    """A bar whose top is a free curve, with a tapered hole."""
    bar = solids.under_curve([8, 12, peak, 13, 16, 9], 50, 24)
    return solids.cut(bar, solids.cone(4, 3, 30, at=(24, 12, -1)))


PARTS: dict[str, Part] = {
    "tub, flat": lambda: tub(60, 40, 8, 2),
    "tub, deep": lambda: tub(30, 26, 28, 1.5),
    "tub, thick": lambda: tub(45, 20, 15, 4),
    "ribs 1": lambda: ribbed(40, 30, 1),
    "ribs 2": lambda: ribbed(50, 24, 2),
    "ribs 4": lambda: ribbed(70, 30, 4),
    "lid 1": lambda: lid(34, 26, 1),
    "lid 2": lambda: lid(40, 30, 2),
    "lid 3": lambda: lid(50, 22, 3),
    "bracket, small": lambda: bracket(26, 16, 2),
    "bracket, long": lambda: bracket(48, 20, 3),
    "bracket, tall": lambda: bracket(24, 40, 3.5),
    "funnel, wide": lambda: funnel(24, 5, 16),
    "funnel, steep": lambda: funnel(14, 6, 26),
    "funnel, small": lambda: funnel(10, 4, 9),
    "knob 3": lambda: knob(12, 14, 3),
    "knob 5": lambda: knob(16, 12, 5),
    "knob 6": lambda: knob(9, 18, 6),
    "window 1": lambda: windowed(1, 6),
    "window 2": lambda: windowed(2, 7),
    "window 3": lambda: windowed(3, 5),
    "groove, shallow": lambda: grooved(14, 1),
    "groove, deep": lambda: grooved(16, 2.5),
    "groove, large": lambda: grooved(25, 2),
    "hook, short": lambda: hooked(1.5),
    "hook, medium": lambda: hooked(4),
    "hook, long": lambda: hooked(9),
    "dome, low": lambda: domed(15),
    "dome, high": lambda: domed(21),
    "dome, hollow": lambda: domed(9),
}
"""Each part by name, drawn with the pull that suits it along +z."""

STRAIGHT = tuple(n for n in PARTS if n.split()[0].rstrip(",") in ("tub", "ribs", "lid", "funnel", "knob", "dome"))
"""Those that two halves mold along +z."""
