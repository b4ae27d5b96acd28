"""Issue 4, item 5: a worker that is started ahead does the job as a fresh one does, or a fresh one does it."""

from __future__ import annotations

import os
import resource
import signal
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import psutil
import pytest
from helpers.command import environment

from moldgen.errors import KernelError
from moldgen.flow.child import ADDRESS_SPACE_FACTOR, ADDRESS_SPACE_SPARE_BYTES
from moldgen.flow.job import Job, JobKind, JobResult, Limits
from moldgen.flow.tell import Message
from moldgen.flow.worker import Standby, run_in_worker, standby

LONG = Limits(60.0)

JOBS = """
import os, resource, tempfile
from pathlib import Path
from moldgen.errors import ExitCode
from moldgen.flow.job import JobResult

with Path("loaded").open("a") as loaded:
    loaded.write(f"{os.getpid()}\\n")

def told(job, tell):
    limit = resource.getrlimit(resource.RLIMIT_AS)[0]
    return JobResult(ExitCode.OK, f"{os.getpid()} {limit} {tempfile.gettempdir()} {os.environ['PYTHONHASHSEED']}")
"""

CHANGES_THE_PROGRAM = """
from moldgen.flow import child
def changed(): return "another program"
changed.cache_clear = lambda: None
if child.program_sha256.__name__ != "changed": child.program_sha256 = changed
"""


@pytest.fixture(autouse=True)
def _here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Work in an empty folder, with jobs that say who did them."""
    for name in ("work", "temporary", "code"):
        (tmp_path / name).mkdir()
    (tmp_path / "code" / "jobs_ahead.py").write_text(JOBS, encoding="utf-8")
    (tmp_path / "code" / "changes_the_program.py").write_text(CHANGES_THE_PROGRAM, encoding="utf-8")
    monkeypatch.syspath_prepend(str(tmp_path / "code"))
    monkeypatch.chdir(tmp_path / "work")
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path / "temporary"))


def work(ready: Standby | None, entry: str = "jobs_ahead:told", limits: Limits = LONG) -> JobResult:
    heard: list[Message] = []
    return run_in_worker(Job(JobKind.BUILD, Path("lid.yaml")), limits, heard.append, entry=entry, ready=ready)


def loaded() -> list[int]:
    """The processes that loaded the jobs, in order."""
    text = Path("loaded").read_text(encoding="utf-8") if Path("loaded").exists() else ""
    return [int(line) for line in text.splitlines()]


def soon(what: Callable[[], object]) -> None:
    end = time.monotonic() + 30.0
    while not what():
        assert time.monotonic() < end, "it did not come to that"
        time.sleep(0.02)


def gone(pid: int) -> bool:
    return not psutil.pid_exists(pid) or psutil.Process(pid).status() == psutil.STATUS_ZOMBIE


def nothing_left() -> bool:
    return not any(Path(tempfile.gettempdir()).iterdir())


def test_what_was_loaded_ahead_does_the_job_once_as_a_fresh_worker_does() -> None:
    with standby(("jobs_ahead",)) as ready:
        soon(loaded)
        (ahead,) = loaded()
        pid, limit, place, seed = work(ready, limits=Limits(60.0, 2**31)).headline.split()
        assert int(pid) == ahead
        assert loaded() == [ahead]
        assert int(limit) == ADDRESS_SPACE_FACTOR * 2**31 + ADDRESS_SPACE_SPARE_BYTES
        assert Path(place).parent == Path(tempfile.gettempdir())
        assert gone(ahead)
        fresh, same_limit, _, same_seed = work(ready, limits=Limits(60.0, 2**31)).headline.split()
        assert int(fresh) != ahead
        assert (same_limit, same_seed) == (limit, seed)
    assert nothing_left()


def test_an_order_that_comes_before_all_is_loaded_waits_for_it() -> None:
    with standby(("jobs_ahead",)) as ready:
        assert int(work(ready).headline.split()[0]) == loaded()[0]
    assert nothing_left()


def test_a_worker_that_is_not_wanted_goes_at_the_end() -> None:
    with standby(("jobs_ahead",)):
        soon(loaded)
        assert not gone(loaded()[0])
    assert gone(loaded()[0])
    assert nothing_left()


def test_before_its_order_it_is_not_limited() -> None:
    with standby(("jobs_ahead",)):
        soon(loaded)
        assert psutil.Process(loaded()[0]).rlimit(psutil.RLIMIT_AS) == resource.getrlimit(resource.RLIMIT_AS)


def test_where_it_has_died_a_fresh_one_is_started() -> None:
    with standby(("jobs_ahead",)) as ready:
        soon(loaded)
        (ahead,) = loaded()
        os.kill(ahead, signal.SIGKILL)
        soon(lambda: gone(ahead))
        assert int(work(ready).headline.split()[0]) != ahead
    assert nothing_left()


def test_what_cannot_be_loaded_ahead_stops_nothing() -> None:
    with standby(("there_is_no_such_module", "jobs_ahead")) as ready:
        assert work(ready).headline
        assert len(loaded()) == 1


def test_a_program_that_changes_meanwhile_is_loaded_anew() -> None:
    """What was loaded must never be kept under the name of what stands in the files now."""
    with standby(("jobs_ahead", "changes_the_program")) as ready:
        soon(loaded)
        pid = int(work(ready).headline.split()[0])
        assert loaded() == [pid, pid]  # the same process, begun anew
    with standby(("jobs_ahead",)) as ready:
        assert work(ready).headline
        assert len(loaded()) == 3


def test_a_crash_there_is_told_with_its_evidence() -> None:
    with standby(("helpers.bad_jobs",)) as ready:
        with pytest.raises(KernelError, match=r"crashed the geometry kernel \(SIGSEGV\)") as caught:
            work(ready, "helpers.bad_jobs:crashes")
        assert (Path(caught.value.evidence) / "log.txt").read_text(encoding="utf-8")
    assert nothing_left()


def test_its_time_counts_from_the_order_and_ends_at_the_limit() -> None:
    with standby(("jobs_ahead", "helpers.bad_jobs")) as ready:
        soon(loaded)
        time.sleep(1.1)
        start = time.monotonic()
        with pytest.raises(KernelError, match="time limit of 1 s"):
            work(ready, "helpers.bad_jobs:hangs", Limits(1.0))
        assert time.monotonic() - start > 0.9
        assert gone(loaded()[0])


def test_it_ends_with_its_parent() -> None:
    code = (
        "from moldgen.flow.worker import standby; import sys\n"
        "with standby(('jobs_ahead',)): print(flush=True); sys.stdin.read()\n"
    )
    settings = environment()
    settings["PYTHONPATH"] = os.pathsep.join([*sys.path, settings["PYTHONPATH"]])
    words = [sys.executable, "-c", code]
    with subprocess.Popen(words, env=settings, stdin=subprocess.PIPE, stdout=subprocess.PIPE) as parent:
        soon(loaded)
        parent.kill()
    soon(lambda: gone(loaded()[0]))


def test_the_parent_stays_light() -> None:
    code = (
        "import sys; from moldgen.flow.worker import standby\n"
        "with standby(): pass\n"
        "heavy = {'OCP', 'cadquery', 'numpy', 'manifold3d', 'pydantic', 'moldgen.flow.jobs'} & set(sys.modules)\n"
        "sys.exit(str(heavy) if heavy else 0)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], env=environment(), capture_output=True, text=True, check=False)
    assert (done.returncode, done.stderr) == (0, "")
