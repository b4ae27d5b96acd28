"""Whether an output folder still holds what its manifest says was built: the same files, volumes and places."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from pathlib import Path

from moldgen.canon import sha256_bytes
from moldgen.errors import KernelError
from moldgen.finding import Finding, Severity
from moldgen.flow.reread import Entry, Listing
from moldgen.kernel.place import standing_at
from moldgen.proof.bodies import ProofBody

SAME_PLACE = 1e-6
"""mm: the manifest's own digits."""

SAME_VOLUME = 1e-4
"""Relative: the default integration depends a little on how the reader parametrises the edges of spline faces."""


def changed_since_built(folder: Path, listing: Listing, bodies: Sequence[ProofBody]) -> tuple[Finding, ...]:
    """Return a failure for each file and each component of a folder that is not as the manifest lists it.

    bodies : the components of the assembly, in the order of the listing
    """
    files = [_file(folder, path, digest) for path, digest in sorted(listing.files.items())]
    return (*(finding for finding in files if finding is not None), *_components(listing.entries, bodies))


def _file(folder: Path, path: str, digest: str) -> Finding | None:
    try:
        if sha256_bytes((folder / path).read_bytes()) == digest:
            return None
        what = "this is not the file that was built: it was edited, damaged or exchanged"
    except OSError as error:
        what = f"the file cannot be read: {error.strerror}"
    return Finding(
        "prove.changed_file",
        Severity.FAILURE,
        what,
        where=path,
        remedy="build the tool again, or fetch the folder again from where it was built",
    )


def _components(entries: Sequence[Entry], bodies: Sequence[ProofBody]) -> Iterator[Finding]:
    places = [(entry, place) for entry in entries for place in entry.positions]
    for (entry, place), body in zip(places, bodies, strict=True):
        off = math.dist(place, standing_at(body.solid))
        if not off <= SAME_PLACE:
            yield _differs(body, f"stands {off:.6g} mm from where the manifest puts it", off, SAME_PLACE, "mm")
        try:
            found = body.volume_mm3
        except KernelError:
            continue  # the proof that every component is sound tells it
        part = abs(found - entry.volume_mm3) / max(abs(found), 1e-9)
        if not part <= SAME_VOLUME:
            what = f"holds {found:.6f} mm^3, the manifest says {entry.volume_mm3:.6f} mm^3"
            yield _differs(body, what, part, SAME_VOLUME, "of its volume")


def _differs(body: ProofBody, what: str, value: float, limit: float, unit: str) -> Finding:
    return Finding(
        "prove.not_as_listed",
        Severity.FAILURE,
        f"{body.name} {what}",
        where=body.name,
        value=value if math.isfinite(value) else None,
        limit=limit,
        unit=unit,
        remedy="build the tool again: manifest and STEP file belong together",
    )
