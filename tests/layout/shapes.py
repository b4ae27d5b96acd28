"""Parts made for the layout's tests, and the halves round them as far as the layout looks at them."""

from __future__ import annotations

import cadquery as cq
import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.topology import only_solid
from moldgen.layout.view import PartView
from moldgen.model.halves import Halves
from moldgen.parting.sides import assign_sides
from moldgen.release.contact import vertical_contact
from moldgen.release.kinds import face_kinds

ROUND, WALL, DEPTH = 20.0, 2.0, 40.0


def view_of(shape, level=0.0, pad=40.0, cavity=None):
    """Return the view of a part; `cavity` (body -> bool a face) overrules which half forms each face."""
    body = Body(only_solid(shape.val().wrapped))
    kinds = face_kinds(body)
    side = assign_sides(body, kinds, vertical_contact(body, kinds), level).cavity if cavity is None else cavity(body)
    low, high = body.box
    square = np.array(
        [[low[0], low[1], level], [high[0], low[1], level], [high[0], high[1], level], [low[0], high[1], level]]
    )
    return PartView(Halves(None, None, body, side, level, low - pad, high + pad, (square,)))


def faces_at(view, test):
    """Return the numbers of the faces whose place (x, y, z) passes a test."""
    return frozenset(n for n, place in enumerate(view.body.face_places) if test(*place))


def plate(length, width, thickness):
    return cq.Workplane().rect(length, width).extrude(thickness)


def cup(radius=ROUND, wall=WALL, depth=DEPTH, at=(0.0, 0.0), draft=0.0):
    """A cup whose mouth looks down: it stands on its core, its floor is as thick as its wall."""
    inner = cq.Workplane().circle(radius).extrude(depth, taper=draft)
    outer = cq.Workplane().circle(radius + wall).extrude(depth, taper=draft)
    top = radius + wall - depth * np.tan(np.radians(draft))
    floor = cq.Workplane("XY", origin=(0, 0, depth)).circle(top).extrude(wall)
    return outer.union(floor).cut(inner).translate((*at, 0.0))


def box(length=60.0, width=40.0, wall=WALL, depth=DEPTH):
    return plate(length + 2 * wall, width + 2 * wall, depth + wall).cut(plate(length, width, depth))


def channel(length=60.0, width=44.0, wall=WALL, depth=DEPTH):
    """Two walls and the floor that joins them: open at both ends."""
    return plate(length + 2 * wall, width, depth + wall).cut(plate(length, width + 2.0, depth))


def lid(holes=((15.0, 8.0), (-15.0, 8.0)), bore=3.2):
    """A shallow box with bosses that have blind holes from below."""
    body = box(56.0, 36.0, 2.0, 10.0)
    posts = cq.Workplane().pushPoints(holes).circle(3.0).extrude(10.0)
    return body.union(posts).cut(cq.Workplane().pushPoints(holes).circle(bore / 2).extrude(9.0))
