"""Splitting straddling faces at their silhouette, so that every face belongs to one half of the mold."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from moldgen.errors import KernelError
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.kernel.body import Body
from moldgen.kernel.face_split import split_at_level
from moldgen.kernel.meshsolid import mesh_solid
from moldgen.kernel.silhouette import silhouette_edges
from moldgen.kernel.split import split_faces
from moldgen.model.part import MoldFrame
from moldgen.release.kinds import FaceKinds, Kind, face_kinds
from moldgen.release.place import face_place

SAME_VOLUME: Final = 1e-4
"""Relative change of the mesh's volume from which a split by hand is not believed (our choice): new faces are meshed
anew, which changed the volume by up to 1e-5 on test bodies and 5e-5 on real parts (measured)."""

SPLITTER, ALONE, BY_HAND = "all faces together", "each face alone", "wires rebuilt by hand"


def imprint_silhouettes(body: Body, kinds: FaceKinds, frame: MoldFrame | None = None) -> tuple[Body, Notes]:
    """Return the body with its straddling faces split where they turn over (body itself when there are none).

    The kernel's splitter first; what it leaves is split by rebuilding wires. A face that neither copes with stays as
    it is and is reported, with the overhang that it leaves on the wrong side; with a `frame`, at its place in part
    coordinates.

    Raises
    ------
    KernelError : there are curves, but not one face can be split
    """
    straddling = kinds.numbers(Kind.STRADDLING)
    if len(straddling) == 0:
        return body, Notes()
    tools, failed = _curves(body, straddling)
    touched = sorted(tools)
    split, rungs = body, []
    if touched:
        try:
            split, failed_split, by_one = _split(body, touched, tools)
            failed.update(failed_split)
            rungs.append(ALONE if by_one else SPLITTER)
        except KernelError as error:
            failed[touched[0]] = error.what
    after = kinds if split is body else face_kinds(split)
    if len(after.numbers(Kind.STRADDLING)):
        by_splitter = split
        split, after, reasons = _by_hand(split, after)
        failed.update(enumerate(reasons, start=len(body.faces)))
        rungs += [BY_HAND] if split is not by_splitter else []
    if touched and not rungs:
        raise KernelError(
            f"none of {len(straddling)} straddling faces could be split at its silhouette",
            remedy="turn the pull a little, or repair the faces in the CAD system that wrote the part",
        )
    findings = _residual(split, after, frame, "; ".join(sorted(set(failed.values()))))
    count = len(straddling) - len(after.numbers(Kind.STRADDLING))
    choice = f"{max(count, 0)} faces split, {len(split.faces) - len(body.faces)} more faces than before"
    why = f"{len(straddling)} faces look both up and down along the pull"
    return split, Notes(findings, (Decision("silhouettes", choice, why, ", then ".join(rungs)),))


def _by_hand(body: Body, kinds: FaceKinds) -> tuple[Body, FaceKinds, list[str]]:
    """Split straddling faces by rebuilding wires: all at once, else one after the other; and what that failed on."""
    try:
        return (*_better(body, kinds, kinds.numbers(Kind.STRADDLING)), [])
    except KernelError as error:
        reasons = [error.what]
    given_up: list[Any] = []
    for _ in range(4 * len(kinds.numbers(Kind.STRADDLING))):  # neighbours of a split face come up again
        tried = {body.face_index.FindIndex(f) - 1 for f in given_up}
        left = [n for n in kinds.numbers(Kind.STRADDLING).tolist() if n not in tried]
        if not left:
            break
        try:
            body, kinds = _better(body, kinds, np.array(left[:1]))
        except KernelError as error:
            reasons.append(error.what)
            given_up.append(body.faces[left[0]])
    return body, kinds, reasons


def _better(body: Body, kinds: FaceKinds, numbers: np.ndarray) -> tuple[Body, FaceKinds]:
    """Return the body with these faces split by hand, if it is the same body with less of it looking the wrong way.

    Raises
    ------
    KernelError : it is not
    """
    split = split_at_level(body, numbers.tolist())
    after = face_kinds(split)
    mesh_solid(split.mesh)
    if abs(split.mesh.volume() - body.mesh.volume()) > SAME_VOLUME * abs(body.mesh.volume()):
        raise KernelError("a face split by hand encloses another volume than before")
    if _wrong_way(after) >= _wrong_way(kinds):
        raise KernelError("a face split by hand still looks both ways")
    return split, after


def _wrong_way(kinds: FaceKinds) -> float:
    return float(kinds.overhang[kinds.numbers(Kind.STRADDLING)].min(axis=1).sum())


def _curves(body: Body, straddling: np.ndarray) -> tuple[dict[int, list[Any]], dict[int, str]]:
    tools: dict[int, list[Any]] = {}
    failed: dict[int, str] = {}
    for number in straddling.tolist():
        try:
            edges = silhouette_edges(body.faces[number])
        except KernelError as error:
            failed[number] = error.what
            continue
        if edges:
            tools[number] = edges
    return tools, failed


def _split(body: Body, touched: list[int], tools: dict[int, list[Any]]) -> tuple[Body, dict[int, str], bool]:
    """Split all faces at once; where the kernel refuses that, one after the other, and leave out those that fail."""
    try:
        return split_faces(body, touched, [e for f in touched for e in tools[f]]), {}, False
    except KernelError:
        if len(touched) == 1:
            raise
    failed: dict[int, str] = {}
    places = {f: body.faces[f] for f in touched}
    for number, face in places.items():
        at = body.face_index.FindIndex(face) - 1
        if at < 0:  # an earlier split replaced this face with an equal one
            failed[number] = "the face was replaced while a neighbour was split"
            continue
        try:
            body = split_faces(body, [at], tools[number])
        except KernelError as error:
            failed[number] = error.what
    if len(failed) == len(touched):
        raise KernelError(next(iter(failed.values())))
    return body, failed, True


def _residual(body: Body, kinds: FaceKinds, frame: MoldFrame | None, why: str) -> tuple[Finding, ...]:
    findings = []
    for number in kinds.numbers(Kind.STRADDLING):
        at, where = face_place(body, int(number), frame)
        findings.append(
            Finding(
                "release.straddling",
                Severity.WARNING,
                "a face looks both up and down along the pull and could not be split where it turns over"
                + (f" ({why})" if why else ""),
                where=where,
                at=at,
                value=float(kinds.overhang[number].min()),
                limit=0.0,
                unit="mm",
                remedy="split the face in the CAD system along the line where it is parallel to the pull",
            )
        )
    return tuple(findings)
