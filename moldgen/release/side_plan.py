"""Side actions for a part: fronts that together release its trapped pieces, or why a piece has none."""

from __future__ import annotations

from moldgen.kernel.body import Body
from moldgen.model.side_action import SideOptions, SidePlan, Unreleased
from moldgen.release.kinds import FaceKinds
from moldgen.release.side_given import answer
from moldgen.release.side_order import merged, ordered
from moldgen.release.side_refusal import refusal
from moldgen.release.side_search import Placed, Search, Space
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
    options = options or SideOptions()
    search = Search(body, trapped.part, [p for _, p in undercuts], options)
    spaces = [Space(i, p.solid) for i, p in undercuts]
    placed: list[Placed] = []
    left: list[Unreleased] = []
    for number, given in enumerate(options.given):
        said = answer(search, given, number, spaces)
        placed += [said.placed] if said.placed is not None else []
        left += [said.refused] if said.refused is not None else []
        spaces += said.rest
    found, still = search.place(spaces)
    placed, circular = ordered(merged([*placed, *found]), search.shared)
    left += [refusal(search, s, trapped.pieces[s.piece], body) for s in still]
    left += [_circular(piece) for piece in sorted({n for p in circular for n in p.pieces})]
    fronts = tuple(p.found.front(p.pieces, p.given) for p in placed)
    return SidePlan(fronts, tuple(left))


def _circular(piece: int) -> Unreleased:
    why = "its slides cross others so that whichever opens first cuts off the inner end of the next"
    return Unreleased(piece, why, "give the side actions by hand, or move one of the undercuts out of the other's way")
