"""What to tell about the parting: the line, the surface, each shut-off, and which rung of which ladder made it."""

from __future__ import annotations

from collections import Counter

import numpy as np

from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.kernel.patches import loop_points
from moldgen.model.halves import SteelContact
from moldgen.model.part import MoldFrame
from moldgen.parting.halves import Parted
from moldgen.parting.surface import ClosedLoop, Rung
from moldgen.rules.practice import SHUT_OFF_ANGLE

_WHY = {
    Rung.PLANE: "the parting line is flat and level there",
    Rung.LAND: "the parting line rises and falls; steel seals on a level band around the part and is flat beyond",
    Rung.RUN_OFF: "the parting line rises and falls, but never doubles back along a side of the block",
    Rung.LEVEL_AND_CURTAINS: "no surface without vertical steps holds this line",
    Rung.LID: "the rim rises and falls, and there is room for steel that leans against the pull",
    Rung.HOST: "the whole rim lies in the boundary of one wall",
    Rung.FILLED: "the rim lies on no plane, no level and no single wall",
}


SAME_LEVEL = 1e-3
"""mm: a parting plane this close to the height asked for lies there."""


POINTS_OF_AN_EDGE = 48
"""Of the parting line, for pictures: a rim may be one edge all round."""


def parting_line(parted: Parted) -> tuple[np.ndarray, ...]:
    """Return the parting line as closed polylines (k, 3) in the mold frame [mm], the outer one first."""
    order = [parted.outer, *(i for i in range(len(parted.loops)) if i != parted.outer)]
    lines = []
    for number in order:
        points = loop_points(parted.loops[number], POINTS_OF_AN_EDGE)
        lines.append(np.vstack([points, points[:1]]))
    return tuple(lines)


def steel_contacts(parted: Parted, frame: MoldFrame) -> tuple[SteelContact, ...]:
    """Return how steeply the halves close on each other, the surface around the part first.

    Those of halves that were not proved have no angle, and are left out.
    """
    sheet = parted.sheet
    named = [("parting surface", sheet.outer), *((f"shut-off {i}", s) for i, s in enumerate(sheet.shut_offs, start=1))]
    return tuple(
        SteelContact(
            name, loop.rung.value, frame.to_part(loop.angle.at), loop.angle.deg, loop.angle.upright_mm2, loop.land_mm
        )
        for name, loop in named
        if loop.angle is not None
    )


def told(parted: Parted, frame: MoldFrame) -> Notes:
    """Return the decisions and findings about the parting, places in part coordinates."""
    line = _decision("parting line", f"{len(parted.loops)} loops, level {parted.level:.3f} mm (mold)", parted)
    outer = parted.sheet.outer
    surface = Decision("parting surface", _shape(outer), _why(outer), outer.rung.value, outer.refused)
    shut = Counter(s.rung for s in parted.sheet.shut_offs)
    shut_offs = tuple(
        Decision("shut-off", f"{count} of {len(parted.sheet.shut_offs)} holes", _WHY[rung], rung.value)
        for rung, count in sorted(shut.items(), key=lambda item: list(Rung).index(item[0]))
    )
    steep = [("parting surface", outer), *(("shut-off", s) for s in parted.sheet.shut_offs)]
    upright = tuple(_upright(name, loop, frame) for name, loop in steep if loop.off_plane)
    leaning = tuple(f for name, loop in steep if not loop.off_plane for f in _steep(name, loop, frame))
    findings = (*upright, *leaning, *_no_land(outer, frame))
    return Notes((*_moved(parted, frame), *findings, *_torn(parted, frame)), (line, surface, *shut_offs))


def _decision(topic: str, choice: str, parted: Parted) -> Decision:
    why = "shortest line between the faces of both halves near the level (minimum cut over the faces)"
    rung = "every vertical face split" if parted.deep else "vertical faces on the outline split at the level"
    return Decision(topic, choice, why, rung, parted.refused)


def _shape(loop: ClosedLoop) -> str:
    if loop.rung is Rung.PLANE:
        return "flat"
    if loop.rung is Rung.LAND:
        return f"level land {loop.land_mm:g} mm wide, then a wall to the flat plane{_leaning(loop)}"
    if loop.rung is Rung.RUN_OFF:
        return f"stepped or curved{_leaning(loop)}"
    return "flat with vertical steps at the part"


def _leaning(loop: ClosedLoop) -> str:
    return "" if loop.angle is None else f", nowhere less than {loop.angle.deg:.1f} deg to the pull"


def _why(loop: ClosedLoop) -> str:
    if loop.rung is Rung.RUN_OFF and loop.refused:
        return f"{_WHY[loop.rung]}; a level land of constant width is not possible (see refused)"
    return _WHY[loop.rung]


def _steep(name: str, loop: ClosedLoop, frame: MoldFrame) -> tuple[Finding, ...]:
    """Tell of steel that closes on steel at less than the shut-off angle."""
    if loop.angle is None or loop.angle.deg >= SHUT_OFF_ANGLE.default:
        return ()
    at = frame.to_part(loop.angle.at)
    return (
        Finding(
            code="parting.steep",
            severity=Severity.WARNING if loop.angle.deg < SHUT_OFF_ANGLE.low else Severity.CAUTION,
            message=f"the {name} stands {loop.angle.deg:.1f} deg from the pull at its steepest place: steel that wipes "
            "on steel so steeply will gape or gall",
            where=f"{name} at {at[0]:.2f}, {at[1]:.2f}, {at[2]:.2f}",
            at=at,
            value=loop.angle.deg,
            limit=SHUT_OFF_ANGLE.default,
            unit="deg",
            remedy=f"let the part's edge or wall there lean {SHUT_OFF_ANGLE.default:g} deg or more "
            f"({SHUT_OFF_ANGLE.source})",
        ),
    )


def _no_land(loop: ClosedLoop, frame: MoldFrame) -> tuple[Finding, ...]:
    """Tell why the line has no level land of constant width around it, although it rises and falls."""
    if loop.rung in (Rung.PLANE, Rung.LAND):
        return ()
    why = [r.removeprefix(f"{Rung.LAND}: ") for r in loop.refused if r.startswith(Rung.LAND)]
    at = frame.to_part(loop.at)
    return (
        Finding(
            code="parting.no_land",
            severity=Severity.CAUTION,
            message=f"no level land of constant width around the part: {why[-1] if why else 'it was not tried'}",
            where=f"parting line at {at[0]:.2f}, {at[1]:.2f}, {at[2]:.2f}",
            at=at,
            remedy="widen inside corners and slots of the rim, or give larger blocks (blocks.wall)",
        ),
    )


def _moved(parted: Parted, frame: MoldFrame) -> tuple[Finding, ...]:
    """Tell that the parting plane is not where the user asked for it: the walls lean, and are widest elsewhere."""
    if parted.asked is None or abs(parted.level - parted.asked) < SAME_LEVEL:
        return ()
    at = frame.to_part(parted.sheet.outer.at)
    return (
        Finding(
            code="parting.level_moved",
            severity=Severity.CAUTION,
            message="the parting plane cannot lie at the height given: the walls lean, and the part is widest "
            "elsewhere",
            where=f"parting plane through {at[0]:.2f}, {at[1]:.2f}, {at[2]:.2f}",
            at=at,
            value=parted.level,
            limit=parted.asked,
            unit="mm (mold)",
            remedy="leave parting.height out, or change the draft of the outer walls",
        ),
    )


def _upright(name: str, loop: ClosedLoop, frame: MoldFrame) -> Finding:
    at = frame.to_part(loop.at)
    return Finding(
        code="parting.no_draft",
        severity=Severity.WARNING,
        message=f"the {name} has {loop.off_plane} vertical steps, up to {loop.span[2]:.2f} mm high: steel slides on "
        "steel without draft there and will gall",
        where=f"{name} at {at[0]:.2f}, {at[1]:.2f}, {at[2]:.2f}",
        at=at,
        value=0.0,
        limit=3.0,
        unit="deg",
        remedy="lean these walls of the part by 3 deg or more (trade pages ask for 3 to 7 deg), or let the toolmaker "
        "blend the step",
    )


def _torn(parted: Parted, frame: MoldFrame) -> tuple[Finding, ...]:
    findings = []
    for face in parted.sides.torn:
        x, y, z = (float(v) for v in parted.body.face_places[face])
        at = frame.to_part((x, y, z))
        findings.append(
            Finding(
                code="parting.torn_face",
                severity=Severity.CAUTION,
                message="a wall along the pull has material above it and below it; the half that reaches more of it "
                "forms it whole",
                where=f"{parted.body.surface_kind(face)} face at {at[0]:.2f}, {at[1]:.2f}, {at[2]:.2f}",
                at=at,
                remedy="look at this place in section.png",
            )
        )
    return tuple(findings)
