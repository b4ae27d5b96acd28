"""Issue 2, "Behaviour": Ctrl-C stops within two seconds and leaves no half-written output; nothing outlives moldgen.

The bound tested is five seconds: machines of a test farm are busy.
"""

from __future__ import annotations

import json
import signal
import subprocess
import time
from pathlib import Path

import psutil
import pytest
from helpers.command import environment, moldgen_command

EARLIER = b'{"moldgen": "earlier"}'


def started(folder: Path, *options: str) -> subprocess.Popen[str]:
    """Start a build over an earlier output, and wait until its worker hangs in the middle of writing the next one."""
    (folder / "lid.yaml").touch()
    (folder / "out" / "lid").mkdir(parents=True)
    (folder / "out" / "lid" / "manifest.json").write_bytes(EARLIER)
    process = subprocess.Popen(
        moldgen_command("build", "lid.yaml", *options, job="hangs"),
        cwd=folder,
        env=environment(),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
    wait_until((folder / "hanging").exists)
    assert len(list((folder / "out").iterdir())) == 2  # the earlier output, and the one in the making
    return process


def wait_until(true, seconds: float = 30.0) -> None:
    end = time.monotonic() + seconds
    while not true():
        assert time.monotonic() < end, "waited in vain"
        time.sleep(0.02)


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM, signal.SIGHUP])
def test_a_signal_stops_the_run_and_leaves_the_earlier_output(number: signal.Signals, tmp_path: Path) -> None:
    process = started(tmp_path)
    workers = psutil.Process(process.pid).children(recursive=True)
    assert workers
    start = time.monotonic()
    process.send_signal(number)
    _, stderr = process.communicate(timeout=30)
    assert time.monotonic() - start < 5.0
    assert process.returncode == 130
    assert "moldgen: stopped by Ctrl-C or by a signal; the earlier output is untouched" in stderr
    assert "Traceback" not in stderr
    assert not any(worker.is_running() and worker.status() != psutil.STATUS_ZOMBIE for worker in workers)
    assert [p.name for p in (tmp_path / "out").iterdir()] == ["lid"]
    assert [p.name for p in (tmp_path / "out" / "lid").iterdir()] == ["manifest.json"]
    assert (tmp_path / "out" / "lid" / "manifest.json").read_bytes() == EARLIER


def test_stopped_as_json(tmp_path: Path) -> None:
    process = started(tmp_path, "--json")
    process.send_signal(signal.SIGINT)
    stdout, _ = process.communicate(timeout=30)
    assert json.loads(stdout)["exit_code"] == 130


def test_a_worker_dies_with_a_parent_that_is_killed_and_the_next_run_clears_up(tmp_path: Path) -> None:
    process = started(tmp_path)
    workers = psutil.Process(process.pid).children(recursive=True)
    process.kill()
    process.communicate(timeout=30)
    psutil.wait_procs(workers, timeout=10)
    assert not any(worker.is_running() and worker.status() != psutil.STATUS_ZOMBIE for worker in workers)
    assert (tmp_path / "out" / "lid" / "manifest.json").read_bytes() == EARLIER
    command = moldgen_command("build", "lid.yaml", job="good")
    subprocess.run(command, cwd=tmp_path, env=environment(), capture_output=True, timeout=60, check=False)
    assert [p.name for p in (tmp_path / "out").iterdir()] == ["lid"]
