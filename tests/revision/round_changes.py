"""Changes of what is round: the vent, which the cavity half forms, and the post, which the core forms."""

from __future__ import annotations

from moldgen.model.revision import PartChangeKind as Kind
from tests.revision.closed_forms import crescent, frustum, rounded_off, tan
from tests.revision.part_changes import (
    CEILING,
    HEIGHT,
    K3,
    POST,
    POST_AT,
    POST_END,
    VENT,
    VENT_AT,
    Change,
    Steel,
    Told,
    Version,
    changed,
    in_vent,
    on_post,
    post,
    vent,
)

ROOF = HEIGHT - CEILING
HANGS = CEILING - POST_END
"""mm: length of the vent, and of the post below the ceiling."""

STRAIGHT_POST = changed(post=post(draft=0.0))
NO_VENT, NO_POST = changed(vent=None), changed(post=None)


def vent_mm3(diameter: float) -> float:
    """Return the volume of a vent: a cone through the roof."""
    return frustum(in_vent(diameter, 0.0), in_vent(diameter, ROOF), ROOF)


def post_mm3(diameter: float) -> float:
    """Return the volume of a post below the ceiling."""
    return frustum(on_post(diameter, 0.0), on_post(diameter, HANGS), HANGS)


VENT_CRESCENT = K3 * crescent(in_vent(VENT, 0.0), in_vent(VENT, ROOF), ROOF, 2.0)
POST_CRESCENT = K3 * crescent(on_post(POST, 0.0), on_post(POST, HANGS), HANGS, 2.0)

ROUND_CHANGES = (
    # The stud that forms the vent gets thicker: steel is missing all round.
    Change(
        "hole wider",
        Version(),
        Version(changed(vent=vent(diameter=4.6))),
        {"cavity": Steel(weld=K3 * (vent_mm3(4.6) - vent_mm3(VENT)))},
        told=(Told("hole", (Kind.RESIZED,), by=0.6, at=(*VENT_AT, 8.0)),),
    ),
    # ... and thinner: a ring goes.
    Change(
        "hole narrower",
        Version(),
        Version(changed(vent=vent(diameter=3.4))),
        {"cavity": Steel(cut=K3 * (vent_mm3(VENT) - vent_mm3(3.4)))},
        told=(Told("hole", (Kind.RESIZED,), by=-0.6, at=(*VENT_AT, 8.0)),),
    ),
    # Two circles 2 mm apart at every height: the stud loses one crescent and gains the other.
    Change(
        "hole moved",
        Version(),
        Version(changed(vent=vent(at=(6.0, 2.0)))),
        {"cavity": Steel(cut=VENT_CRESCENT, weld=VENT_CRESCENT)},
        told=(Told("hole", (Kind.MOVED,), shift=(0.0, 2.0, 0.0), at=(6.0, 2.0, 8.0)),),
    ),
    # A stud of its own down to the core: a cone through the roof.
    Change(
        "hole added",
        Version(),
        Version(changed(drain=vent(at=(0.0, 5.0), diameter=3.0))),
        {"cavity": Steel(weld=K3 * vent_mm3(3.0))},
        told=(Told("hole", (Kind.ADDED,), at=(0.0, 5.0, 8.0)),),
    ),
    Change(
        "hole closed",
        Version(),
        Version(NO_VENT),
        {"cavity": Steel(cut=K3 * vent_mm3(VENT))},
        told=(Told("hole", (Kind.GONE,), at=(*VENT_AT, 8.0)),),
    ),
    # The pocket in the core for the post: the same crescents, from the free end to the ceiling.
    Change(
        "boss moved by 2 mm",
        Version(),
        Version(changed(post=post(at=(-6.0, 2.0)))),
        {"core": Steel(cut=POST_CRESCENT, weld=POST_CRESCENT)},
        told=(Told("boss", (Kind.MOVED,), shift=(0.0, 2.0, 0.0), at=(-6.0, 2.0, 5.0)),),
    ),
    # 1 mm longer with the same flank: so it is thinner at its new end by what 1 deg leans over 1 mm, and the pocket
    # gets deeper by a cone between the two ends.
    Change(
        "boss taller",
        Version(),
        Version(changed(post=post(diameter=POST - 2 * tan(1.0), end=2.0))),
        {"core": Steel(cut=K3 * frustum(POST / 2 - tan(1.0), POST / 2, 1.0))},
        told=(Told("boss", (Kind.MOVED,), shift=(0.0, 0.0, -1.0), at=(*POST_AT, 2.0)),),
    ),
    Change(
        "boss wider",
        Version(),
        Version(changed(post=post(diameter=4.6))),
        {"core": Steel(cut=K3 * (post_mm3(4.6) - post_mm3(POST)))},
        told=(Told("boss", (Kind.RESIZED,), by=0.6, at=(*POST_AT, 5.0)),),
    ),
    # The pocket is filled up.
    Change(
        "boss gone",
        Version(),
        Version(NO_POST),
        {"core": Steel(weld=K3 * post_mm3(POST))},
        told=(Told("boss", (Kind.GONE,), at=(*POST_AT, 5.0)),),
    ),
    # A straight post gets 2 deg, its free end stays: a cone less a cylinder.
    Change(
        "draft added",
        Version(STRAIGHT_POST),
        Version(changed(post=post(draft=2.0))),
        {"core": Steel(cut=K3 * (frustum(2.0, on_post(POST, HANGS, 2.0), HANGS) - frustum(2.0, 2.0, HANGS)))},
        told=(Told("boss", (Kind.DRAFT,), by=2.0, at=(*POST_AT, 5.0)),),
    ),
    # Its free end is rounded: the corner of the pocket is filled.
    Change(
        "fillet added",
        Version(STRAIGHT_POST),
        Version(changed(STRAIGHT_POST, soft={"feature": "fillet", "edges": "bottom of post", "radius": 0.5})),
        {"core": Steel(weld=K3 * rounded_off(POST / 2, 0.5))},
        told=(Told("rounding", (Kind.ADDED,), at=(*POST_AT, POST_END + 0.2)),),
    ),
)
