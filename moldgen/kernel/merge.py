"""Neighbouring faces of one surface made one again."""

from __future__ import annotations

from OCP.ShapeUpgrade import ShapeUpgrade_UnifySameDomain
from OCP.TopoDS import TopoDS_Shape

from moldgen.kernel.boolean import copied
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.topology import solids_of

SAME_VOLUME = 1e-6
"""Relative change of volume from which a merge is not trusted."""


def merged_faces(solid: TopoDS_Shape) -> TopoDS_Shape:
    """Return the solid with neighbouring faces of one surface merged, or as it is where that would spoil it.

    The merger works on a copy: it damages its input, too, when it fails.
    """
    merger = ShapeUpgrade_UnifySameDomain(copied(solid), True, True, False)
    merger.Build()
    found = solids_of(merger.Shape())
    if len(found) != 1 or not is_valid(found[0]):
        return solid
    before = volume(solid)
    return found[0] if abs(volume(found[0]) - before) < SAME_VOLUME * abs(before) else solid
