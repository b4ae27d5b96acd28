"""Pull and fixed point of an accepted layout: what is settled before the part stands in the mold."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from moldgen.finding import Decision, Notes
from moldgen.model.accepted import SNAP, Accepted
from moldgen.model.layout import Chooser
from moldgen.model.part import MoldFrame, Pull

SAME_WAY = 1e-9
"""1 - cosine up to which two directions are the same."""

KEPT = Chooser.KEPT.value


def pulls_as_accepted(pulls: tuple[Pull, ...], accepted: Accepted | None) -> tuple[Pull, ...]:
    """Return the pulls of an automatic choice with the accepted one first: steel that is cut opens as it does.

    Where it is among them it is taken as it was found, to the last digit.
    """
    if accepted is None:
        return pulls
    own = next((p for p in pulls if float(np.dot(p.direction, accepted.pull)) >= 1.0 - SAME_WAY), None)
    if own is None:
        return (Pull(accepted.pull, KEPT), *pulls)
    if own is pulls[0]:
        return pulls
    return (Pull(own.direction, f"{KEPT}; {own.how_chosen}"), *(p for p in pulls if p is not own))


def frame_as_accepted(frame: MoldFrame, accepted: Accepted | None) -> tuple[MoldFrame, Notes]:
    """Return the frame with the fixed point of the accepted layout, so that what stays of the part stays in the mold.

    frame : with the middle of the part's box as fixed point
    """
    if accepted is None:
        return frame, Notes()
    off = max(abs(a - b) for a, b in zip(frame.fixed_point, accepted.fixed_point, strict=True))
    if off <= SNAP:
        return frame, Notes()
    place = ", ".join(f"{v:g}" for v in accepted.fixed_point)
    why = f"{KEPT}, though the middle of the part moved by {off:.3f} mm"
    return replace(frame, fixed_point=accepted.fixed_point), Notes(decisions=(Decision("fixed point", place, why),))
