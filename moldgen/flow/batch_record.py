"""What a batch has done, in its own folder: by it a second run knows which parts it need not do again."""

from __future__ import annotations

import json
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import moldgen
from moldgen.canon import sha256_file, sha256_json, to_json
from moldgen.errors import ExitCode, SpecError
from moldgen.flow.batch_row import Row
from moldgen.flow.folder import MANIFEST, replace_file
from moldgen.flow.job import Job, Limits
from moldgen.flow.versions import program_sha256

RECORD = "batch.json"
RECORD_KEY = "moldgen batch"
SUMMARY = "summary.csv"

LASTING = (ExitCode.OK, ExitCode.CHECK_FAILED, ExitCode.PART)
"""Ends that depend on the inputs alone. A kernel that ran out of a limit is tried again when the limit is another; a
wrong spec and a bug are always tried again: they cost little, and the cause may lie in the machine (a full disk)."""


@dataclass(frozen=True)
class Did:
    """What a run leaves of one part.

    key : see `job_key`
    files : SHA-256 by path of what the job read
    manifest : SHA-256 of the output's manifest, "" if nothing was written
    limits : of the worker, [s, bytes]
    row : its row in the summary
    """

    key: str
    files: dict[str, str]
    manifest: str
    limits: tuple[float, int]
    row: Row


class Record:
    """The parts that a batch folder has done, by name; each change is on the disk, whole, before the call returns."""

    def __init__(self, folder: Path) -> None:
        """Read the record of a batch folder, or begin one.

        Raises
        ------
        SpecError : the folder cannot be written, or holds something that no batch made
        """
        self.folder = folder
        self._did: dict[str, Any] = _read(folder)
        folder_is_new = not folder.is_dir()
        try:
            folder.mkdir(parents=True, exist_ok=True)
        except OSError as error:
            what = f"the output cannot be written: {error.strerror}"
            raise SpecError(what, where=str(folder), remedy="choose another place with --output") from error
        if folder_is_new or not self._did:
            self._write()

    def done(self, name: str, key: str, limits: Limits) -> Row | None:
        """Return the row of a part that is done with the same inputs and whose output is as it was left, else None."""
        did = self._entry(name)
        if did is None or did.key != key or any(sha256_file(Path(p)) != digest for p, digest in did.files.items()):
            return None
        if did.row.exit_code == ExitCode.KERNEL:
            return did.row if did.limits == (limits.time_s, limits.memory_bytes) else None
        if did.row.exit_code not in LASTING:
            return None
        return did.row if did.manifest in ("", sha256_file(self.folder / name / MANIFEST)) else None

    def keep(self, name: str, did: Did) -> None:
        """Note what was done of a part, instead of what an earlier run did."""
        self._did[name] = asdict(did)
        self._write()

    def forget(self, name: str) -> None:
        """Forget a part: it is about to be done again, or what it depends on is not known."""
        if self._did.pop(name, None) is not None:
            self._write()

    def _entry(self, name: str) -> Did | None:
        try:
            raw = self._did[name]
            time_s, memory = raw["limits"]
            row, files = Row(**raw["row"]), {str(p): str(digest) for p, digest in raw["files"].items()}
            return Did(raw["key"], files, raw["manifest"], (time_s, memory), row)
        except (KeyError, TypeError, ValueError, AttributeError):  # absent, or of another version
            return None

    def _write(self) -> None:
        replace_file(self.folder / RECORD, to_json({RECORD_KEY: {k: self._did[k] for k in sorted(self._did)}}))


def is_batch(folder: Path) -> bool:
    """True if a batch made this folder."""
    return isinstance(_parts(folder), dict)


def job_key(job: Job) -> str:
    """Return the SHA-256 over all that decides what comes of a job, but for the files that only the job knows.

    That is: its source by name and content, the command with its options, and moldgen by version and content (between
    two releases a checkout has one version and many states).
    """
    return sha256_json(
        {
            "command": job.kind,
            "source": job.source,
            "source_sha256": sha256_file(job.source),
            "options": job.options,
            "moldgen": moldgen.__version__,
            "program_sha256": program_sha256(),
        }
    )


def _read(folder: Path) -> dict[str, Any]:
    """Return the entries of a batch folder, none for a new or an empty one."""
    elsewhere = "choose another folder with --output"
    if folder.exists() and not folder.is_dir():
        raise SpecError("the output folder is a file", where=str(folder), remedy=elsewhere)
    if not folder.is_dir() or not any(folder.iterdir()):
        return {}
    parts = _parts(folder)
    if not isinstance(parts, dict):
        what = f"the folder is not empty and has no {RECORD} of moldgen batch: it is left alone"
        raise SpecError(what, where=str(folder), remedy=f"{elsewhere}, or empty this one")
    return parts


def _parts(folder: Path) -> Any:
    try:
        record = json.loads((folder / RECORD).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None
    return record.get(RECORD_KEY) if isinstance(record, dict) else None
