"""The spec's wishes for side actions, brought into the mold, and the plan that comes of them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from moldgen.finding import Decision, Notes
from moldgen.flow.prepare import Prepared
from moldgen.flow.review import Reviewed
from moldgen.flow.words import direction_text, point_text
from moldgen.model.part import MoldFrame, Vector
from moldgen.model.side_action import Front, SideGiven, SideKind, SideOptions, SidePlan
from moldgen.release.side_plan import plan_side_actions
from moldgen.spec.side_actions import SideAction
from moldgen.steel.forming import side_names


def plan_sides(reviewed: Reviewed, prepared: Prepared, *, inclined: bool = True) -> tuple[SidePlan, Notes]:
    """Return the fronts that release the part, or what none releases."""
    spec, frame = reviewed.loaded.spec, reviewed.frame
    options = SideOptions(
        given=tuple(_given(entry, frame) for entry in spec.side_actions.given),
        ejection_stroke=spec.ejection.stroke,
        lifters=spec.side_actions.lifters,
        add=spec.side_actions.add,
        inclined=inclined,
    )
    plan = plan_side_actions(prepared.body, prepared.kinds, prepared.trapped, options)
    return plan, Notes(decisions=_decisions(plan.fronts, prepared, frame))


def _given(entry: SideAction, frame: MoldFrame) -> SideGiven:
    return SideGiven(
        kind=SideKind(entry.kind),
        direction=turned(frame, entry.direction),
        point=frame.to_mold(entry.at),
        width=entry.width,
        height=entry.height,
    )


def turned(frame: MoldFrame, direction: Vector) -> Vector:
    """Return a unit vector of the part as it points in the mold."""
    x, y, z = (float(v) for v in np.asarray(frame.rotation) @ np.asarray(direction))
    return (x, y, z)


def turned_back(frame: MoldFrame, direction: Vector) -> Vector:
    """Return a unit vector of the mold as it points in the part's coordinates."""
    x, y, z = (float(v) + 0.0 for v in np.round(np.asarray(frame.rotation).T @ np.asarray(direction), 12))
    return (x, y, z)


def _decisions(fronts: Sequence[Front], prepared: Prepared, frame: MoldFrame) -> tuple[Decision, ...]:
    decisions = []
    for name, front in zip(side_names(fronts), fronts, strict=True):
        way = direction_text(turned_back(frame, front.release))
        places = "; ".join(point_text(frame.to_part(prepared.trapped.pieces[p].at)) for p in front.pieces[:4] if p >= 0)
        more = f" and {len(front.pieces) - 4} more" if len(front.pieces) > 4 else ""
        decisions.append(
            Decision(
                topic="side action",
                choice=f"{name} along {way}, {front.travel:.2f} mm to clear",
                why=f"forms {len(front.pieces)} undercut{'s' if len(front.pieces) > 1 else ''} at {places}{more}",
                rung=front.rung,
            )
        )
    return tuple(decisions)
