"""The spec's wishes for pins and gate, brought into the mold, and the layout that comes of them."""

from __future__ import annotations

import numpy as np

from moldgen.finding import Notes
from moldgen.flow.carry import compare_sides, kept_layout
from moldgen.flow.review import Reviewed
from moldgen.layout.ejection import GivenPin
from moldgen.layout.plan import Wishes, plan_layout
from moldgen.layout.view import PartView
from moldgen.model.halves import Halves
from moldgen.model.layout import Layout
from moldgen.model.slide import SideLayout


def lay_out(reviewed: Reviewed, halves: Halves, sides: SideLayout | None = None) -> tuple[Layout, Notes]:
    """Return the layout of one cavity; it keeps out of the way of the side actions `sides`.

    An accepted layout stays where the changed part and the spec allow it.

    Raises
    ------
    SpecError : something that the spec fixes cannot be
    """
    spec, frame = reviewed.loaded.spec, reviewed.frame
    pins = spec.ejection.pins
    kept, notes = kept_layout(reviewed)
    wishes = Wishes(
        core_pins=spec.core_pins,
        ejection=spec.ejection,
        gate=spec.gate,
        core_pins_at=tuple(frame.to_mold(p) for p in spec.core_pins.at),
        pins=None if pins is None else tuple(GivenPin(frame.to_mold(p.at), p.diameter) for p in pins),
        gate_at=None if spec.gate.at is None else frame.to_mold(spec.gate.at),
        no_pins=_marked(reviewed, halves, "no_pins"),
        no_gate=_marked(reviewed, halves, "no_gate"),
        kept=kept,
    )
    layout, more = plan_layout(PartView(halves, frame, sides), reviewed.resin, wishes)
    return layout, notes + more + compare_sides(reviewed, halves)


def marked_points(reviewed: Reviewed, key: str) -> tuple[np.ndarray, ...]:
    """Return the points [mm, mold frame] of the marks that forbid something (`no_gate`, `no_pins`, ...)."""
    marks = reviewed.loaded.spec.marks
    return tuple(np.asarray(reviewed.frame.to_mold(m.face)) for m in marks if getattr(m, key))


def _marked(reviewed: Reviewed, halves: Halves, key: str) -> frozenset[int]:
    return frozenset(halves.body.nearest_face(point)[0] for point in marked_points(reviewed, key))
