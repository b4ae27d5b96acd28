"""Which pulls are worth trying, and in which order."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import suppress

import numpy as np

from moldgen.errors import KernelError, PartError
from moldgen.flow.words import point_text
from moldgen.kernel.body import Body
from moldgen.kernel.prepare import preparations
from moldgen.model.part import Part, Pull, Vector
from moldgen.release.pull import PullCandidate, search_pull
from moldgen.spec.load import LoadedSpec
from moldgen.spec.pull import FaceNormal

ALIKE = 0.966
"""Cosine (15 deg) from which a pull is tried after those that differ more from what was tried already."""


def find_pulls(loaded: LoadedSpec, part: Part) -> tuple[tuple[Pull, ...], tuple[PullCandidate, ...]]:
    """Return the pulls in the order in which they are tried, and all that were looked at (none if it is given).

    Raises
    ------
    PartError : the face that the spec names is no plane; KernelError : the part cannot be meshed
    """
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
