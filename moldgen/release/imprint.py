"""Splitting straddling faces at their silhouette, so that every face belongs to one half of the mold."""

from __future__ import annotations

from typing import Any

import numpy as np

from moldgen.errors import KernelError
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.kernel.body import Body
from moldgen.kernel.silhouette import silhouette_edges
from moldgen.kernel.split import split_faces
from moldgen.model.part import MoldFrame
from moldgen.release.kinds import FaceKinds, Kind, face_kinds
from moldgen.release.place import face_place


def imprint_silhouettes(body: Body, kinds: FaceKinds, frame: MoldFrame | None = None) -> tuple[Body, Notes]:
    """Return the body with its straddling faces split where they turn over (body itself when there are none).

    A face whose silhouette cannot be found or imprinted stays as it is and is reported, with the overhang that it
    leaves on the wrong side; with a `frame`, at its place in part coordinates.

    Raises
    ------
    KernelError : the body cannot be split by any of the curves
    """
    straddling = kinds.numbers(Kind.STRADDLING)
    if len(straddling) == 0:
        return body, Notes()
    tools, failed = _curves(body, straddling)
    touched = sorted(tools)
    split, by_one = body, False
    if touched:
        split, failed_split, by_one = _split(body, touched, tools)
        failed.update(failed_split)
    after = kinds if split is body else face_kinds(split)
    findings = _residual(split, after, frame, "; ".join(sorted(set(failed.values()))))
    count = sum(len(tools[f]) for f in touched)
    choice = f"{len(touched)} faces split along {count} curves"
    why = f"{len(straddling)} faces look both up and down along the pull"
    rung = "each face alone" if by_one else "all faces together"
    return split, Notes(findings, (Decision("silhouettes", choice, why, rung),))


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
        raise KernelError(
            f"none of {len(touched)} straddling faces could be split at its silhouette",
            remedy="turn the pull a little, or repair the faces in the CAD system that wrote the part",
        )
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
