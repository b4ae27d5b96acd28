"""Views of parts with side actions whose fronts are made by hand: boxes of space with known distances."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from moldgen.kernel.topology import only_solid
from moldgen.layout.view import PartView
from moldgen.model.halves import SideSteel
from moldgen.model.side_action import Front, SideKind, across

from .shapes import view_of

X, Y, MINUS_X, MINUS_Y = (1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (-1.0, 0.0, 0.0), (0.0, -1.0, 0.0)
DOWN = (0.0, 0.0, -1.0)


def rectangle(left, right, low, high):
    """The outline between two u and two heights, counterclockwise."""
    return np.array([(left, low), (right, low), (right, high), (left, high)], float)


def slide(axis, left, right, low, high, near, clear, name="slide 1"):
    """A level slide; left and right in the frame across its axis."""
    outline = rectangle(left, right, low, high)
    front = Front(SideKind.SLIDE, axis, axis, (outline,), near, clear + 1.0, clear, clear - near, (0,), "by hand")
    return SideSteel(name, front, None)


def lifter(axis, release, outline, near, travel, name="lifter 1"):
    """A lifter whose shaft goes down from `near`; its outline in the frame across its axis."""
    front = Front(SideKind.LIFTER, axis, release, (outline,), near, near + 1.0, near + 1.0, travel, (0,), "by hand")
    return SideSteel(name, front, None)


def with_sides(filled, *sides, real=None, layout=None):
    """The view of a filled part with side actions; `real` : the part as molded, if it differs."""
    halves = view_of(filled).halves
    part = None if real is None else only_solid(real.val().wrapped)
    return PartView(replace(halves, sides=sides, part=part), None, layout)


def on_plan(axis, u, s):
    """The place in plan of coordinates in the frame across a level axis, (2,)."""
    frame = across(axis)
    return u * frame[0][:2] + s * frame[2][:2]
