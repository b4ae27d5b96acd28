"""A run with the same inputs as the last one of the same output does nothing, and says so: the kernel stays unloaded.

What came of a build is remembered under a hash of all that it depends on, together with the SHA-256 of every file that
it wrote. A build is unchanged when that is known and the output folder still holds just these files.
"""

from __future__ import annotations

import pickle
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path

from moldgen.canon import EXACT, sha256_file, sha256_json
from moldgen.flow.job import JobResult, Options, Table
from moldgen.flow.versions import Versioned
from moldgen.memory import Memory
from moldgen.spec.load import LoadedSpec

UNCHANGED = "nothing has changed: the output stays as it is"


@dataclass(frozen=True)
class _Outcome:
    """What came of a build, and the SHA-256 of each file of its output."""

    result: JobResult
    files: dict[str, str]


def build_key(loaded: LoadedSpec, options: Options) -> str:
    """Return the SHA-256 of all inputs of a build, "" where nobody knows them (the user's own function)."""
    if loaded.spec.part.function is not None:
        return ""
    return sha256_json(
        {
            "spec": str(loaded.path),  # findings name the file as the user did
            "spec_sha256": loaded.sha256,
            "part_sha256": "" if loaded.part_file is None else sha256_file(loaded.part_file),
            "accepted": loaded.accepted,
            "pictures": options.pictures,
        },
        EXACT,
    )


def unchanged(key: str, folder: Path, memory: Memory) -> JobResult | None:
    """Return what came of the build of `key` if the folder still holds its output, whole; None if it must run."""
    data = Versioned(memory).recall(key) if key else None
    if data is None:
        return None
    outcome: _Outcome = pickle.loads(data)  # noqa: S301  the store holds only our own
    if any(sha256_file(folder / path) != digest for path, digest in outcome.files.items()):
        return None  # what the user put beside them is no reason: doing nothing leaves it where it is
    result = outcome.result
    return replace(result, headline=f"{result.headline}; {UNCHANGED}")


def remember(key: str, folder: Path, result: JobResult, memory: Memory) -> None:
    """Remember what came of the build of `key` that wrote `folder`."""
    if key:
        files = sorted(path for path in folder.rglob("*") if path.is_file())
        hashes = {path.relative_to(folder).as_posix(): sha256_file(path) for path in files}
        outcome = _Outcome(replace(result, output=None, timings_s=()), hashes)
        Versioned(memory).keep(key, pickle.dumps(outcome))


def stage_table(reasons: Mapping[str, str]) -> Table:
    """Return the table of ``--explain``: why each stage ran, or did not."""
    return Table("stages", ("stage", "why"), tuple(reasons.items()))
