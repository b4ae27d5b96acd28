"""`moldgen prove`: reopen what was exported, without the spec, and prove it again."""

from __future__ import annotations

from pathlib import Path

from moldgen.errors import ExitCode
from moldgen.finding import Finding, Severity
from moldgen.flow.as_listed import changed_since_built
from moldgen.flow.job import JobResult, verdict_code
from moldgen.flow.reread import TOOL_FILE, read_bodies, read_listing
from moldgen.flow.tell import Tell
from moldgen.model.proof import Proof
from moldgen.proof.run import prove_tool


def prove_folder(folder: Path, tell: Tell) -> JobResult:
    """Return the proofs of the tool in an output folder.

    Raises
    ------
    SpecError : the folder is no output of a build
    PartError : its STEP file is missing, damaged, or holds something else than the manifest says
    """
    listing = read_listing(folder)
    with tell.stage("read the tool") as stage:
        bodies = read_bodies(folder / TOOL_FILE, listing.entries)
        stage.detail = f"{len(bodies)} solids"
    with tell.stage("prove the tool") as stage:
        proofs = prove_tool(bodies, listing.claims)
        stage.detail = f"{sum(p.passed for p in proofs)} of {len(proofs)} passed"
    changed = changed_since_built(folder, listing, bodies)
    code = verdict_code(changed, proofs)
    verdict = "proved" if verdict_code((), proofs) is ExitCode.OK else "NOT proved"
    but = ", but the folder is not as it was built" if changed else ""
    return JobResult(
        code,
        f"{listing.title}: {verdict} from {TOOL_FILE} alone{but}",
        proofs=proofs,
        findings=(*proof_findings(proofs), *changed),
        first_pass=True,
    )


def proof_findings(proofs: tuple[Proof, ...]) -> tuple[Finding, ...]:
    """Return a failure for each proof that did not pass."""
    return tuple(
        Finding(
            code="proof.failed" if p.figure is not None else "proof.not_run",
            severity=Severity.FAILURE,
            message=f"{p.name}: {p.verdict}",
            where=p.detail,
            value=p.figure,
            limit=p.limit,
            unit=p.unit,
            remedy="do not cut steel from this tool",
        )
        for p in proofs
        if not p.passed
    )
