"""Jobs for the worker process that end in every way a job can end. Each is a `run_job`: (job, tell) -> JobResult."""

from __future__ import annotations

import ctypes
import json
import os
import re
import subprocess
import sys
import time
from contextlib import contextmanager
from pathlib import Path

from moldgen.canon import sha256_file
from moldgen.errors import ExitCode, KernelError, PartError
from moldgen.finding import Decision, Finding, Severity
from moldgen.flow.folder import fresh_folder
from moldgen.flow.job import Job, JobResult, Table
from moldgen.flow.tell import Tell
from moldgen.kernel.guard import operation
from moldgen.model.proof import Proof, Verdict


def good(job: Job, tell: Tell) -> JobResult:
    output = job.output or Path("out") / job.source.stem
    with fresh_folder(output, inputs=(job.source,), tell=tell) as folder:
        with tell.stage("split the faces") as stage:
            stage.detail = "12 faces"
        (folder / "manifest.json").write_text(json.dumps({"moldgen": "0"}), encoding="utf-8")
    return JobResult(
        ExitCode.CHECK_FAILED,
        "Tool of lid: 1 of 2 proofs passed",
        output=output,
        tables=(Table("components", ("name", "volume [mm^3]"), (("core", 12.5), ("cavity", 1234567.0))),),
        proofs=(
            Proof("volume balance", Verdict.PASSED, 1e-9, 1e-6, ""),
            Proof("opening", Verdict.NOT_RUN, None, 0.03, "mm", "no motion given"),
        ),
        findings=(
            Finding("part.healed", Severity.NOTE, "one seam was closed"),
            Finding(
                "draft.too_small", Severity.FAILURE, "a wall has too little draft", at=(1, 2, 3), value=0.2, limit=1
            ),
        ),
        decisions=(Decision("pull", "+z", "least trapped area"),),
        first_pass=True,
    )


def by_name(job: Job, tell: Tell) -> JobResult:
    """The job of this file that the source is called after, as in hangs.yaml or good-2.yaml; each run is counted."""
    with Path("runs").open("a", encoding="utf-8") as runs:
        runs.write(f"{job.source.stem}\n")
    tell.inputs({str(job.source): sha256_file(job.source)})
    result: JobResult = globals()[job.source.stem.partition("-")[0]](job, tell)
    return result


def well(job: Job, tell: Tell) -> JobResult:
    """All proofs passed, ten components, three of them alike, and two side actions of two bodies each."""
    with fresh_folder(job.output or Path("out"), tell=tell) as folder:
        groups = ["part", "cavity half", "core half", "slide 1", "slide 1", "lifter 1", "lifter 1"]
        components = [{"moves_with": g, "positions": [[0, 0, 0]]} for g in groups]
        components.append({"moves_with": "ejector", "positions": [[0, 0, 0]] * 3})
        (folder / "manifest.json").write_text(json.dumps({"moldgen": "0", "components": components}), encoding="utf-8")
    proof = Proof("volume balance", Verdict.PASSED, 1e-9, 1e-6, "")
    rung = Decision("parting surface", "flat", "it is", "plane")
    return JobResult(ExitCode.OK, "well", output=job.output, proofs=(proof, proof), decisions=(rung,), first_pass=True)


def slowly(job: Job, tell: Tell) -> JobResult:
    time.sleep(1.0)
    return well(job, tell)


def says_hello(job: Job, tell: Tell) -> JobResult:
    """Library and kernel chatter on stdout must not reach the user's stdout."""
    print("chatter from Python")  # noqa: T201
    os.write(1, b"chatter from C\n")
    return good(job, tell)


def part_error(job: Job, tell: Tell) -> JobResult:
    raise PartError("two solids, and none is chosen", where="lid.step", remedy="name one with part: {solid: 1}")


def bug(job: Job, tell: Tell) -> JobResult:
    with tell.stage("split the faces"):
        raise ZeroDivisionError("by zero, by mistake")


def leaves(job: Job, tell: Tell) -> JobResult:
    sys.exit(0)


def vanishes(job: Job, tell: Tell) -> JobResult:
    os._exit(7)


def unpicklable(job: Job, tell: Tell) -> JobResult:
    return JobResult(ExitCode.OK, "well", tables=(Table("t", ("c",), ((lambda: 1,),)),))  # type: ignore[arg-type]


def no_library(job: Job, tell: Tell) -> JobResult:
    raise ImportError("libGL.so.1: cannot open shared object file: No such file or directory")


def no_package(job: Job, tell: Tell) -> JobResult:
    import a_kernel_that_is_not_there  # noqa: F401, PLC0415


def crashes(job: Job, tell: Tell) -> JobResult:
    """Dies as the kernel does: by a segmentation fault in native code, in a named operation with operands."""
    from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox  # noqa: PLC0415

    with half_written(job, tell), tell.stage("make the steel"):
        block = BRepPrimAPI_MakeBox(1.0, 2.0, 3.0).Shape()
        with operation("cut the part from the block", operands=(block,), risky=True):
            ctypes.string_at(0)


def aborts(job: Job, tell: Tell) -> JobResult:
    with half_written(job, tell):
        os.abort()


def hangs(job: Job, tell: Tell) -> JobResult:
    """Hangs without letting Python's own threads or signal handlers run, as a kernel call does."""
    with half_written(job, tell), tell.stage("make the steel"), operation("split the faces"):
        Path("hanging").touch()
        re.match(r"(a+)+$", "a" * 64 + "b")


def hogs(job: Job, tell: Tell) -> JobResult:
    """Takes memory bit by bit, and touches it."""
    kept = []
    with half_written(job, tell), operation("mesh the part"):
        while True:
            kept.append(b"x" * 2**24)
            time.sleep(0.01)


def asks_too_much(job: Job, tell: Tell) -> JobResult:
    with tell.stage("mesh the part"):
        bytearray(2**46)


def has_children(job: Job, tell: Tell) -> JobResult:
    """Hangs while two children run, one of them in a session of its own."""
    for own_session in (False, True):
        process = subprocess.Popen(
            [sys.executable, "-c", "import time; time.sleep(600)"], start_new_session=own_session
        )
        with Path("pids").open("a", encoding="utf-8") as pids:
            pids.write(f"{process.pid}\n")
    return hangs(job, tell)


def kernel_error(job: Job, tell: Tell) -> JobResult:
    raise KernelError("fillet 'rim' failed: the edge is too short", where="recipe 'rim'", remedy="a smaller radius")


@contextmanager
def half_written(job: Job, tell: Tell):
    """A fresh folder for the job's output in which a first file is already there."""
    with fresh_folder(job.output or Path("out") / job.source.stem, tell=tell) as folder:
        (folder / "tool.step").write_text("half", encoding="utf-8")
        yield
