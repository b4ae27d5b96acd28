"""Side actions for a part: fronts that together release its trapped pieces, or why a piece has none."""

from __future__ import annotations

from moldgen.kernel.body import Body
from moldgen.model.side_action import SideOptions, SidePlan, Unreleased
from moldgen.release.kinds import FaceKinds
from moldgen.release.side_order import merged, ordered
from moldgen.release.side_search import Search, Space
from moldgen.release.trapped import Grip, Trapped


def plan_side_actions(body: Body, kinds: FaceKinds, trapped: Trapped, options: SideOptions | None = None) -> SidePlan:
    """Return fronts that release every undercut, in opening order, and the pieces that are left with their reasons.

    body : the prepared part in the mold frame, pull +z; kinds : its faces against the pull. Rubs are served where a
    front covers them anyway

    Raises
    ------
    ValueError : the kinds are those of another body
    """
    if len(kinds.kind) != len(body.faces):
        raise ValueError(f"{len(kinds.kind)} kinds for {len(body.faces)} faces")
    undercuts = [(i, p) for i, p in enumerate(trapped.pieces) if p.grip is Grip.UNDERCUT]
    if not undercuts:
        return SidePlan()
    search = Search(body, trapped.part, [p for _, p in undercuts], options or SideOptions())
    placed, left = search.place([Space(i, p.solid) for i, p in undercuts])
    placed = ordered(merged(placed), search.shared)
    fronts = tuple(p.found.front(p.pieces) for p in placed)
    return SidePlan(fronts, tuple(Unreleased(s.piece, "no direction", "", tuple(s.tried)) for s in left))
