"""The front half of every run: from the spec to the part against its pull, before any steel."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import suppress
from dataclasses import dataclass, replace

import numpy as np

from moldgen.catalog import Resin, resin
from moldgen.errors import KernelError, PartError
from moldgen.finding import Decision, Notes
from moldgen.flow.part_source import read_part
from moldgen.flow.prepare import Prepared, prepare
from moldgen.flow.tell import Tell
from moldgen.flow.words import direction_text, point_text
from moldgen.kernel.body import Body
from moldgen.kernel.extent import reach
from moldgen.kernel.measure import bounding_box, volume_adaptive
from moldgen.kernel.place import to_mold
from moldgen.kernel.prepare import preparations
from moldgen.model.part import Box, MoldFrame, Part, Pull, Vector
from moldgen.proof.bodies import SAME_VOLUME
from moldgen.release.contact import vertical_contact
from moldgen.release.frame import mold_frame
from moldgen.release.pull import PullCandidate, search_pull
from moldgen.release.review import ReleaseReview, TrappedPlace, review_release
from moldgen.release.trapped import Grip
from moldgen.rules.draft import draft_required
from moldgen.spec.load import LoadedSpec
from moldgen.spec.pull import FaceNormal

ALIKE = 0.966
"""Cosine (15 deg) from which a pull is tried after those that differ more from what was tried already."""

MOST_NAMED = 8
"""Trapped places that an error message names one by one; the manifest has them all."""


@dataclass(frozen=True)
class Reviewed:
    """What is known about the part before steel is built. Findings speak in part coordinates.

    candidates : the pulls that were tried, best first; empty when the pull was given
    """

    loaded: LoadedSpec
    resin: Resin
    part: Part
    pull: Pull
    frame: MoldFrame
    prepared: Prepared
    release: ReleaseReview
    notes: Notes
    candidates: tuple[PullCandidate, ...] = ()


@dataclass(frozen=True)
class Source:
    """The part as read, and the pulls worth trying, best first (one if it is given)."""

    part: Part
    pulls: tuple[Pull, ...]
    tried: tuple[PullCandidate, ...]
    notes: Notes


def open_part(loaded: LoadedSpec, tell: Tell) -> Source:
    """Read the part and find its pulls.

    Raises
    ------
    PartError, SpecError, KernelError : the part cannot be read
    """
    notes = Notes(findings=loaded.findings)
    with tell.stage("read the part") as stage:
        part, more = read_part(loaded)
        notes += more
        stage.detail = f"{part.face_count} faces, {part.volume_mm3 / 1000:.2f} cm3"
    with tell.stage("choose the pull") as stage:
        pulls, candidates = _pulls(loaded, part)
        stage.detail = direction_text(pulls[0].direction) + _outlook(candidates)
    return Source(part, pulls, candidates, notes)


def review(loaded: LoadedSpec, tell: Tell) -> Reviewed:
    """Read the part, choose the pull, and see how every face releases.

    Raises
    ------
    PartError, SpecError, KernelError : the part cannot be read or prepared
    """
    return review_along(loaded, open_part(loaded, tell), 0, tell)


def review_along(
    loaded: LoadedSpec, source: Source, number: int, tell: Tell, refused: tuple[str, ...] = ()
) -> Reviewed:
    """See how every face releases along one of the pulls; `refused` is what became of better ones.

    Raises
    ------
    PartError, SpecError, KernelError : the part cannot be prepared
    """
    spec, part, pull, candidates = loaded.spec, source.part, source.pulls[number], source.tried
    data = resin(spec.resin)
    notes = source.notes + Notes(decisions=(_pull_decision(source, number, refused),))
    with tell.stage("prepare the part") as stage:
        box = _exact_box(part) if spec.shrink.fixed_point == "centre" else _NO_BOX
        frame, more = mold_frame(pull.direction, spec.shrink, spec.resin, box)
        notes += more
        scale = float(np.prod(frame.factors))
        try:
            prepared, more = prepare(to_mold(part.solid, frame), part.volume_mm3 * scale, frame)
        except PartError as error:
            error.where = f"{loaded.locate('part')}: {error.where}".removesuffix(": ")
            raise
        notes += more
        part = replace(
            part, bounding_box_mm=part_box(prepared.body, frame), volume_mm3=_sure_volume(part, prepared, scale)
        )
        stage.detail = f"{len(prepared.body.faces)} faces, {len(prepared.trapped.undercuts)} undercuts"
    with tell.stage("review the draft") as stage:
        section = spec.draft
        least = data.draft_minimum.low if section.minimum is None else section.minimum
        asked = (least, section.texture_depth, section.texture_slope)
        notes += Notes(
            draft_required.outside(*asked), quantities=(draft_required.line("draft asked of every wall", *asked),)
        )
        release, more = review_release(
            prepared.body,
            prepared.kinds,
            prepared.trapped,
            draft_required(*asked),
            contact=vertical_contact(prepared.body, prepared.kinds),
            frame=frame,
        )
        notes += more
        stage.detail = f"{release.draft.faces_below} faces below {release.draft.required_deg:.2g} deg"
    return Reviewed(loaded, data, part, pull, frame, prepared, release, notes, candidates)


def _sure_volume(part: Part, prepared: Prepared, scale: float) -> float:
    """Return the part's volume [mm^3]: the kernel's default integration was 4e-3 off on trimmed spline walls."""
    checked = prepared.body.mesh.volume() / scale
    if abs(part.volume_mm3 - checked) < SAME_VOLUME * checked:
        return part.volume_mm3
    return volume_adaptive(part.solid, 1e-7)


_NO_BOX: Box = ((0.0, 0.0, 0.0), (0.0, 0.0, 0.0))
"""Stands for the box where nothing depends on it: finding the exact one takes the kernel up to a second."""


def _exact_box(part: Part) -> Box:
    low, high = bounding_box(part.solid)
    return tuple(low.tolist()), tuple(high.tolist())


def part_box(body: Body, frame: MoldFrame) -> Box:
    """Return the box of the part in its own coordinates [mm], from its body in the mold."""
    low, high = [], []
    origin = np.asarray(frame.to_part((0.0, 0.0, 0.0)))
    columns = np.array([frame.to_part(tuple(e)) for e in np.eye(3)]) - origin
    for axis in range(3):
        high.append(float(origin[axis] + reach(body, columns[:, axis])))
        low.append(float(origin[axis] - reach(body, -columns[:, axis])))
    return tuple(low), tuple(high)  # type: ignore[return-value]


def refuse_undercuts(reviewed: Reviewed) -> None:
    """Pass if a straight pull releases the part.

    Raises
    ------
    PartError : it does not; the trapped places are named with position, area and depth
    """
    if any(t.grip is Grip.UNDERCUT for t in reviewed.release.trapped):
        raise undercut_error(
            reviewed,
            "give another pull (moldgen check lists the best), change these faces so that they taper along the pull, "
            "open a slot under them, let side actions form them with parting.undercuts: release, or accept them filled "
            "with parting.undercuts: fill",
        )


def undercut_error(reviewed: Reviewed, remedy: str, also: str = "") -> PartError:
    """Return the refusal that names the trapped places; `also` is what else stands in the way."""
    pieces = reviewed.release.trapped
    lines = [_named(p) for p in pieces[:MOST_NAMED]]
    if len(pieces) > MOST_NAMED:
        lines.append(f"and {len(pieces) - MOST_NAMED} more")
    if also:
        lines.append(also)
    undercuts = sum(p.grip is Grip.UNDERCUT for p in pieces)
    noun, count = ("undercut", undercuts) if undercuts else ("rub", len(pieces))
    return PartError(
        f"{count} {noun}{'s hold' if count > 1 else ' holds'} the part against a straight pull along "
        f"{direction_text(reviewed.pull.direction)}:\n    " + "\n    ".join(lines),
        where=reviewed.loaded.locate("pull"),
        remedy=remedy,
    )


def _named(piece: TrappedPlace) -> str:
    return (
        f"face at {point_text(piece.at)}: {piece.area_mm2:.2f} mm^2 of {len(piece.faces)} faces, "
        f"{piece.depth_mm:.2f} mm deep, {piece.height_mm:.2f} mm high, {piece.volume_mm3:.3f} mm^3"
    )


def _pulls(loaded: LoadedSpec, part: Part) -> tuple[tuple[Pull, ...], tuple[PullCandidate, ...]]:
    section = loaded.spec.pull
    given = section.direction
    if isinstance(given, FaceNormal):
        direction = _normal_at(loaded, part, given.point)
        why = f"normal of the flat face nearest to {point_text(given.point)}, given in the spec"
        return (Pull(direction, why),), ()
    if given is not None:
        return (Pull(given, "given in the spec"),), ()
    found = search_pull(_meshed(part), axes_only=section.search == "axes")
    return tuple(_worth_trying(found)), found


def _worth_trying(found: tuple[PullCandidate, ...]) -> Iterator[Pull]:
    """Yield the pulls in the order in which they are tried.

    The best line comes both ways, since which half is the core decides where lifters and pins can be; then the others,
    those close to one that was tried already last.
    """
    best = found[0]
    yield Pull(best.direction, best.why)
    x, y, z = (0.0 - c for c in best.direction)
    yield Pull((x, y, z), f"the best line the other way round: {best.why}")
    tried, close = [best], []
    for one in found[1:]:
        alike = any(abs(float(np.dot(one.direction, t.direction))) > ALIKE for t in tried)
        if alike:
            close.append(one)
            continue
        tried.append(one)
        yield Pull(one.direction, one.why)
    yield from (Pull(c.direction, c.why) for c in close)


def _pull_decision(source: Source, number: int, refused: tuple[str, ...]) -> Decision:
    pull, tried = source.pulls[number], source.tried
    lines = [abs(float(np.dot(c.direction, pull.direction))) > 1.0 - 1e-9 for c in tried]
    others = [
        f"{direction_text(c.direction)} ({c.source}): {c.why}" for c, own in zip(tried, lines, strict=True) if not own
    ]
    rung = next((c.source for c, own in zip(tried, lines, strict=True) if own), "")
    return Decision("pull", direction_text(pull.direction), pull.how_chosen, rung, (*refused, *others[:4]))


def _outlook(candidates: tuple[PullCandidate, ...]) -> str:
    if not candidates:
        return ", given"
    best = candidates[0]
    sides = f"{best.side_actions or 'no'} side action{'' if best.side_actions == 1 else 's'} by estimate"
    return f", best of {len(candidates)} distinct pulls, {sides}"


def _meshed(part: Part) -> Body:
    """Return the first form of the part, as read or cut up as in the preparation, that can be meshed.

    Raises
    ------
    KernelError : none can; what the mesher said of the part as read
    """
    body = Body(part.solid)
    try:
        _ = body.mesh
    except KernelError as error:
        for other in preparations(part.solid, part.volume_mm3):
            with suppress(KernelError):
                body = Body(other.solid)
                _ = body.mesh
                return body
        raise error from None
    return body


def _normal_at(loaded: LoadedSpec, part: Part, point: Vector) -> Vector:
    body = Body(part.solid)
    number, _ = body.nearest_face(np.asarray(point))
    if body.surface_kind(number) != "plane":
        raise PartError(
            f"the face nearest to {point_text(point)} is no plane but a {body.surface_kind(number)}",
            where=loaded.locate("pull"),
            remedy="give a point on a flat face, or a direction",
        )
    normal = body.mesh.normals[body.mesh.face == number][0]
    x, y, z = (float(v) + 0.0 for v in normal / np.linalg.norm(normal))
    return (x, y, z)
