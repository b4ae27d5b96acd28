"""The front half of every run: from the spec to the part against its pull, before any steel."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from moldgen.canon import sha256_file
from moldgen.catalog import Resin, resin
from moldgen.errors import PartError
from moldgen.finding import Decision, Notes
from moldgen.flow.carry_pull import frame_as_accepted, pulls_as_accepted
from moldgen.flow.part_source import read_part
from moldgen.flow.prepare import Prepared, prepare
from moldgen.flow.pulls import find_pulls
from moldgen.flow.stages import Made, Stages
from moldgen.flow.tell import Tell
from moldgen.flow.words import direction_text, point_text
from moldgen.kernel.body import Body
from moldgen.kernel.extent import reach
from moldgen.kernel.measure import bounding_box, volume_adaptive
from moldgen.kernel.place import to_mold
from moldgen.model.accepted import Accepted
from moldgen.model.part import Box, MoldFrame, Part, Pull
from moldgen.proof.bodies import SAME_VOLUME
from moldgen.release.contact import vertical_contact
from moldgen.release.frame import mold_frame
from moldgen.release.pull import PullCandidate
from moldgen.release.review import ReleaseReview, TrappedPlace, review_release
from moldgen.release.trapped import Grip, Trapped
from moldgen.rules.draft import draft_required
from moldgen.spec.declared import key_values, narrowed
from moldgen.spec.load import LoadedSpec

READ_KEYS = ("part", "name")
PULL_KEYS = ("pull",)
"""The keys of the spec that reading the part and choosing the pull depend on."""

MOST_NAMED = 8
"""Trapped places that an error message names one by one; the manifest has them all."""


@dataclass(frozen=True)
class Reviewed:
    """What is known about the part before steel is built. Findings speak in part coordinates.

    candidates : the pulls that were tried, best first; empty when the pull was given
    made : the stage that prepared the part
    accepted : the layout to be kept where the part allows it, None for none
    """

    loaded: LoadedSpec
    resin: Resin
    part: Part
    pull: Pull
    frame: MoldFrame
    prepared: Prepared
    release: ReleaseReview
    notes: Notes
    candidates: tuple[PullCandidate, ...]
    made: Made[tuple[Prepared, Part, Notes]]
    accepted: Accepted | None = None


@dataclass(frozen=True)
class Source:
    """The part as read, and the pulls worth trying, best first (one if it is given)."""

    made: Made[tuple[Part, Notes]]
    pulls: tuple[Pull, ...]
    tried: tuple[PullCandidate, ...]
    notes: Notes

    @property
    def part(self) -> Part:
        """The part as read."""
        return self.made.value[0]


def open_part(loaded: LoadedSpec, stages: Stages) -> Source:
    """Read the part and find its pulls; that of an accepted layout is the first of an automatic choice.

    Raises
    ------
    PartError, SpecError, KernelError : the part cannot be read
    """
    part = stages.make(
        "read the part",
        {
            **key_values(loaded.spec, READ_KEYS),
            "part file": "" if loaded.part_file is None else sha256_file(loaded.part_file),
        },
        lambda: _read(narrowed(loaded, READ_KEYS), stages.tell),
        lasting=loaded.spec.part.function is None,  # nobody knows what a function reads
    )
    pulls = stages.make(
        "choose the pull",
        {**key_values(loaded.spec, PULL_KEYS), "part": part},
        lambda: _chosen(narrowed(loaded, PULL_KEYS), part.value[0], stages.tell),
    )
    found, tried = pulls.value
    if loaded.spec.pull.direction is None:
        found = pulls_as_accepted(found, loaded.accepted)
    return Source(part, found, tried, Notes(findings=loaded.findings) + part.value[1])


def _read(loaded: LoadedSpec, tell: Tell) -> tuple[Part, Notes]:
    with tell.stage("read the part") as stage:
        part, notes = read_part(loaded)
        stage.detail = f"{part.face_count} faces, {part.volume_mm3 / 1000:.2f} cm3"
    return part, notes


def _chosen(loaded: LoadedSpec, part: Part, tell: Tell) -> tuple[tuple[Pull, ...], tuple[PullCandidate, ...]]:
    with tell.stage("choose the pull") as stage:
        pulls, candidates = find_pulls(loaded, part)
        stage.detail = direction_text(pulls[0].direction) + _outlook(candidates)
    return pulls, candidates


def review(loaded: LoadedSpec, stages: Stages) -> Reviewed:
    """Read the part, choose the pull, and see how every face releases.

    Raises
    ------
    PartError, SpecError, KernelError : the part cannot be read or prepared
    """
    return review_along(loaded, open_part(loaded, stages), 0, stages)


def review_along(
    loaded: LoadedSpec, source: Source, number: int, stages: Stages, refused: tuple[str, ...] = ()
) -> Reviewed:
    """See how every face releases along one of the pulls; `refused` is what became of better ones.

    Raises
    ------
    PartError, SpecError, KernelError : the part cannot be prepared
    """
    spec, pull, candidates = loaded.spec, source.pulls[number], source.tried
    data = resin(spec.resin)
    notes = source.notes + Notes(decisions=(_pull_decision(source, number, refused),))
    box = (
        stages.make("measure the part", {"part": source.made}, lambda: _exact_box(source.part)).value
        if (spec.shrink.fixed_point == "centre")
        else _NO_BOX
    )
    frame, more = mold_frame(pull.direction, spec.shrink, spec.resin, box)
    notes += more
    if spec.shrink.fixed_point == "centre":
        frame, more = frame_as_accepted(frame, loaded.accepted)
        notes += more
    found: list[Trapped] = []
    made = stages.make(
        "prepare the part",
        {"part": source.made, "frame of the mold": frame},
        lambda: _prepared(narrowed(loaded, ()), source.part, frame, found, stages.tell),
    )
    prepared, part, more = made.value
    prepared = prepared.with_trapped(found[0]) if found else prepared
    notes += more
    section = spec.draft
    least = data.draft_minimum.low if section.minimum is None else section.minimum
    asked = (least, section.texture_depth, section.texture_slope)
    release, more = stages.make(
        "review the draft",
        {"prepared part": made, "frame of the mold": frame, "draft asked": asked},
        lambda: _released(prepared, asked, frame, stages.tell),
    ).value
    return Reviewed(loaded, data, part, pull, frame, prepared, release, notes + more, candidates, made, loaded.accepted)


def _prepared(
    loaded: LoadedSpec, part: Part, frame: MoldFrame, found: list[Trapped], tell: Tell
) -> tuple[Prepared, Part, Notes]:
    """Return the part in the mold, and what is known of it since. What is trapped in it goes to `found`."""
    with tell.stage("prepare the part") as stage:
        scale = float(np.prod(frame.factors))
        try:
            prepared, notes = prepare(to_mold(part.solid, frame), part.volume_mm3 * scale, frame)
        except PartError as error:
            error.where = f"{loaded.locate('part')}: {error.where}".removesuffix(": ")
            raise
        part = replace(
            part, bounding_box_mm=part_box(prepared.body, frame), volume_mm3=_sure_volume(part, prepared, scale)
        )
        found.append(prepared.trapped)
        stage.detail = f"{len(prepared.body.faces)} faces, {len(prepared.trapped.undercuts)} undercuts"
    return prepared, part, notes


def _released(
    prepared: Prepared, asked: tuple[float, float, float], frame: MoldFrame, tell: Tell
) -> tuple[ReleaseReview, Notes]:
    """Return how every face releases; `asked`: least draft [deg], depth of the texture [mm], draft for it [deg]."""
    with tell.stage("review the draft") as stage:
        notes = Notes(
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
        stage.detail = f"{release.draft.faces_below} faces below {release.draft.required_deg:.2g} deg"
    return release, notes + more


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
