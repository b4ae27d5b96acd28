"""`moldgen accept`: the layout of a proved tool written beside its spec, for the next builds to keep."""

from __future__ import annotations

import json
import re
from dataclasses import replace
from pathlib import Path
from typing import Any

from moldgen.canon import sha256_file
from moldgen.errors import ExitCode, SpecError
from moldgen.finding import Finding, Severity
from moldgen.flow.folder import MANIFEST, MANIFEST_KEY, replace_file
from moldgen.flow.job import JobResult, Options
from moldgen.flow.tell import Tell
from moldgen.flow.words import BUILD_AGAIN
from moldgen.model.accepted import Accepted
from moldgen.spec.accepted import accepted_file
from moldgen.spec.accepted_text import accepted_text
from moldgen.spec.load import LoadedSpec

_OURS = re.compile(r"^accepted\s*:", re.MULTILINE)
"""What a file must hold to be an accepted layout, if a broken one."""


def accept_layout(loaded: LoadedSpec, folder: Path, tell: Tell) -> JobResult:
    """Write the layout of the tool in `folder` beside its spec, over an earlier one.

    Raises
    ------
    SpecError : the folder holds no proved tool of this spec, or the part is another one by now, or what stands in the
        way is no accepted layout
    """
    path = accepted_file(loaded.path)
    _check_ours(path)
    with tell.stage("read the tool") as stage:
        record = read_record(folder)
        _check_tool(record, folder, loaded)
        stage.detail = f"{len(record['proofs'])} proofs passed"
    with tell.stage("load the kernel"):
        from moldgen.flow.accept_part import accepted_of  # noqa: PLC0415  only once the folder is good

    accepted = accepted_of(record, loaded, folder, tell)
    replace_file(path, accepted_text(accepted))
    return JobResult(ExitCode.OK, f"{loaded.spec.name}: layout accepted: {_counted(accepted)}", output=path)


def with_layout_accepted(result: JobResult, loaded: LoadedSpec, options: Options, tell: Tell) -> JobResult:
    """Return the result of a build with its layout accepted, if that was asked for and the tool is proved.

    Raises
    ------
    SpecError : as `accept_layout`
    """
    if not options.accept or result.output is None:
        return result
    failed = ", ".join(p.name for p in result.proofs if not p.passed)
    if failed or not result.proofs:
        finding = Finding(
            "accept.not_proved",
            Severity.WARNING,
            f"the layout was not accepted: only a proved tool can be; not passed: {failed or 'there are no proofs'}",
            remedy="see the findings, and change part or spec",
        )
        return replace(result, findings=(*result.findings, finding))
    accepted = accept_layout(loaded, result.output, tell)
    return replace(result, headline=f"{result.headline}; layout accepted in {accepted.output}")


def _counted(accepted: Accepted) -> str:
    def count(number: int, noun: str) -> str:
        return f"{number} {noun}{'' if number == 1 else 's'}"

    parts = [
        count(len(accepted.ejector_pins), "ejector pin"),
        count(len(accepted.core_pins), "core pin"),
        f"{accepted.gate.kind.value} gate",
    ]
    if accepted.side_actions:
        parts.append(count(len(accepted.side_actions), "side action"))
    return ", ".join(parts)


def _check_ours(path: Path) -> None:
    """Refuse to write over something that is no accepted layout."""
    try:
        text = path.read_bytes().decode("utf-8", errors="replace")
    except FileNotFoundError:
        return
    except OSError as error:
        what = f"the accepted layout cannot be written: {error.strerror}"
        raise SpecError(what, where=str(path), remedy="move what stands there") from error
    if not _OURS.search(text):
        what = "this file is no accepted layout of moldgen: it is left alone"
        raise SpecError(what, where=str(path), remedy="move it, or delete it")


def read_record(folder: Path) -> dict[str, Any]:
    """Return the manifest of an output folder.

    Raises
    ------
    SpecError : there is none, or it is none of ours, or it describes no tool
    """
    path = folder / MANIFEST
    try:
        record: Any = json.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        what = f"there is no tool to accept: {error.strerror}"
        raise SpecError(
            what, where=str(path), remedy="build the tool first, or name its folder with --output"
        ) from error
    except ValueError as error:
        raise SpecError(f"{MANIFEST} is damaged: {error}", where=str(path), remedy=BUILD_AGAIN) from error
    if not isinstance(record, dict) or MANIFEST_KEY not in record or "layout" not in record:
        raise SpecError("the manifest describes no tool", where=str(path), remedy="build the tool first")
    return record


def _check_tool(record: dict[str, Any], folder: Path, loaded: LoadedSpec) -> None:
    """Refuse a tool of another spec, one that is not proved, and one whose files are not those that were built."""
    where = str(folder / MANIFEST)
    try:
        name, spec = record["part"]["name"], record["spec"]["path"]
        open_proofs = [p["name"] for p in record["proofs"] if p["passed"] is not True]
        proved = bool(record["proofs"]) and not open_proofs
        changed = [file for file, digest in sorted(record["files"].items()) if sha256_file(folder / file) != digest]
    except (KeyError, TypeError, AttributeError) as error:
        raise SpecError(f"{MANIFEST} is damaged: {error!r}", where=where, remedy=BUILD_AGAIN) from error
    if (spec, name) != (loaded.path.name, loaded.spec.name):
        what = f"this is the tool of {spec} ({name}), not of {loaded.path.name} ({loaded.spec.name})"
        raise SpecError(what, where=where, remedy="name the output folder of this spec with --output")
    if not proved:
        failed = ", ".join(open_proofs) or "there are none"
        what = f"only a proved tool can be accepted; not passed: {failed}"
        raise SpecError(what, where=where, remedy="see the findings of the build, and change part or spec")
    if changed:
        what = f"{len(changed)} files are not those that were built, the first is {changed[0]}"
        raise SpecError(what, where=where, remedy=BUILD_AGAIN)
