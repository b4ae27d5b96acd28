"""Issue 2, "Behaviour": kernel work in a worker process with a time limit and a memory limit.

A crash or a hang there is exit code 4 with the operation's name and the operands kept in a file; the earlier output
stays untouched.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import psutil
import pytest

from moldgen.errors import ExitCode, KernelError, MoldgenError, PartError, SpecError, StageError
from moldgen.flow.job import Job, JobKind, JobResult, Limits
from moldgen.flow.tell import Message, OutputPlanned, StageFinished, StageStarted
from moldgen.flow.worker import run_in_worker

LONG = Limits(60.0)
EARLIER = b'{"moldgen": "earlier"}'


@pytest.fixture(autouse=True)
def _here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Work in an empty folder with an earlier output out/lid; the worker's own folder is made here too."""
    (tmp_path / "work" / "out" / "lid").mkdir(parents=True)
    (tmp_path / "work" / "out" / "lid" / "manifest.json").write_bytes(EARLIER)
    (tmp_path / "temporary").mkdir()
    monkeypatch.chdir(tmp_path / "work")
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path / "temporary"))


def work(name: str, limits: Limits = LONG) -> tuple[JobResult, list[Message]]:
    heard: list[Message] = []
    job = Job(JobKind.BUILD, Path("lid.yaml"))
    return run_in_worker(job, limits, heard.append, entry=f"helpers.bad_jobs:{name}"), heard


def failure(kind: type[MoldgenError], name: str, limits: Limits = LONG) -> MoldgenError:
    with pytest.raises(kind) as caught:
        work(name, limits)
    return caught.value


def only_earlier_output(*kept: str) -> bool:
    """True if out/ holds the earlier output, byte for byte, and `kept`, and no worker's folder is left."""
    names = sorted(path.name for path in Path("out").iterdir())
    whole = Path("out/lid/manifest.json").read_bytes() == EARLIER and len(list(Path("out/lid").iterdir())) == 1
    return whole and names == sorted(["lid", *kept]) and not any(Path(tempfile.gettempdir()).iterdir())


def test_a_result_comes_back_with_the_messages_and_times_of_its_stages() -> None:
    result, heard = work("good")
    assert result.exit_code is ExitCode.CHECK_FAILED
    assert OutputPlanned(Path("out/lid")) in heard
    assert StageStarted("split the faces") in heard
    ended = [m for m in heard if isinstance(m, StageFinished)]
    assert ended[-1].detail == "12 faces"
    assert [name for name, _ in result.timings_s] == ["load the stages", "split the faces"]
    assert Path("out/lid/manifest.json").read_bytes() == b'{"moldgen": "0"}'
    assert sorted(p.name for p in Path("out").iterdir()) == ["lid"]


def test_the_parent_loads_no_kernel() -> None:
    code = (
        "import sys; from pathlib import Path; from moldgen.flow.job import *; from moldgen.flow.run import run\n"
        "run(Job(JobKind.BUILD, Path('cup.yaml')), Limits(60.0), quiet=True, entry='helpers.bad_jobs:good')\n"
        "heavy = {'OCP', 'cadquery', 'numpy', 'manifold3d', 'trimesh', 'pydantic', 'vtkmodules'} & set(sys.modules)\n"
        "sys.exit(str(heavy) if heavy else 0)\n"
    )
    paths = {"PYTHONPATH": os.pathsep.join(sys.path)}
    done = subprocess.run(
        [sys.executable, "-c", code], env=os.environ | paths, capture_output=True, text=True, check=False
    )
    assert (done.returncode, done.stderr) == (0, "")


def test_an_error_of_the_job_comes_back_as_it_was_and_keeps_nothing() -> None:
    error = failure(PartError, "part_error")
    assert (error.what, error.where) == ("two solids, and none is chosen", "lid.step")
    assert error.remedy == "name one with part: {solid: 1}"
    assert error.evidence == ""
    assert only_earlier_output()


def test_a_crash_names_the_operation_and_keeps_its_operands() -> None:
    error = failure(KernelError, "crashes")
    assert error.exit_code == 4
    assert "'cut the part from the block' crashed the geometry kernel (SIGSEGV)" in error.what
    assert error.where == "stage 'make the steel'"
    assert error.evidence == "out/lid.failure"
    kept = sorted(p.relative_to(error.evidence).as_posix() for p in Path(error.evidence).rglob("*") if p.is_file())
    assert kept == [
        "0001-cut-the-part-from-the-block/operand1.brep",
        "0001-cut-the-part-from-the-block/operation.txt",
        "failure.txt",
        "log.txt",
    ]
    assert "Segmentation fault" in Path("out/lid.failure/log.txt").read_text(encoding="utf-8")
    assert only_earlier_output("lid.failure")


def test_an_abort_is_a_crash() -> None:
    assert "SIGABRT" in failure(KernelError, "aborts").what
    assert only_earlier_output("lid.failure")


def test_a_hang_ends_at_the_time_limit_though_it_lets_no_signal_through() -> None:
    start = time.monotonic()
    error = failure(KernelError, "hangs", Limits(time_s=2.0))
    assert time.monotonic() - start < 2.0 + 5.0
    assert "'split the faces' did not end within the time limit of 2 s" in error.what
    assert "--time-limit" in error.remedy
    assert only_earlier_output("lid.failure")


def test_memory_taken_bit_by_bit_ends_at_the_limit() -> None:
    error = failure(KernelError, "hogs", Limits(60.0, memory_bytes=2**28))
    assert "'mesh the part' took 0." in error.what
    assert "the limit is 0.25 GiB" in error.what
    assert "--memory-limit" in error.remedy
    assert only_earlier_output("lid.failure")


def test_one_huge_request_is_out_of_memory_not_a_bug() -> None:
    error = failure(KernelError, "asks_too_much")
    assert "out of memory, at a limit of 8 GiB" in error.what
    assert error.where == "stage 'mesh the part'"


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("bug", "unexpected ZeroDivisionError: by zero, by mistake"),
        ("leaves", "unexpected SystemExit: 0"),
        ("unpicklable", "unexpected "),
    ],
)
def test_what_no_stage_may_raise_is_our_bug_with_a_kept_traceback(name: str, words: str) -> None:
    error = failure(StageError, name)
    assert error.exit_code == 5
    assert words in error.what
    assert "Traceback" in Path("out/lid.failure/traceback.txt").read_text(encoding="utf-8")
    assert "Traceback" not in str(error)


def test_a_worker_that_goes_without_a_word_is_our_bug() -> None:
    assert "exit status 7" in failure(StageError, "vanishes").what
    assert only_earlier_output("lid.failure")


def test_a_missing_system_library_gives_the_line_that_installs_it() -> None:
    error = failure(KernelError, "no_library")
    assert "libGL.so.1" in error.what
    assert "apt-get install -y libgl1" in error.remedy


def test_a_missing_python_package_is_named() -> None:
    assert "'a_kernel_that_is_not_there'" in failure(KernelError, "no_package").what


def test_the_children_of_the_worker_end_with_it() -> None:
    failure(KernelError, "has_children", Limits(time_s=3.0))
    pids = [int(line) for line in Path("pids").read_text(encoding="utf-8").split()]
    assert len(pids) == 2
    assert not any(psutil.pid_exists(pid) and psutil.Process(pid).status() != psutil.STATUS_ZOMBIE for pid in pids)


def test_evidence_goes_when_the_next_run_ends_well_and_the_user_s_own_folder_stays() -> None:
    failure(StageError, "bug")
    assert Path("out/lid.failure").is_dir()
    work("good")
    assert not Path("out/lid.failure").exists()
    Path("out/lid.failure").mkdir()
    Path("out/lid.failure/mine.txt").write_text("mine", encoding="utf-8")
    error = failure(StageError, "bug")
    assert Path("out/lid.failure/mine.txt").read_text(encoding="utf-8") == "mine"
    assert Path(error.evidence, "traceback.txt").is_file()


def test_a_temporary_folder_that_cannot_be_written_is_told(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(tempfile, "tempdir", "/dev/null")
    assert "TMPDIR" in failure(SpecError, "good").remedy


@pytest.mark.parametrize("limits", [(0.0, 1), (float("nan"), 1), (float("inf"), 1), (1.0, 0)])
def test_limits_that_limit_nothing_are_refused(limits: tuple[float, int]) -> None:
    with pytest.raises(ValueError, match="above zero"):
        Limits(*limits)
