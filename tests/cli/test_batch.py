"""Issue 3, point 9: many parts, both cores, resumable, one summary, the worst exit code; a broken part stops nothing.

The jobs here are stand-ins without geometry; `tests/e2e/test_batch.py` runs real ones.
"""

from __future__ import annotations

import csv
import io
import json
import re
import signal
import subprocess
import sys
import time
from pathlib import Path

import psutil
import pytest
from helpers.command import environment, moldgen, moldgen_command, on_terminal
from helpers.outputs import table

from moldgen.errors import ExitCode
from moldgen.flow.batch_inputs import batch_inputs
from moldgen.flow.batch_row import worst


def specs(folder: Path, *names: str) -> list[str]:
    """Write specs that the stand-ins do not read, each with a content of its own."""
    for name in names:
        path = folder / f"{name}.yaml"
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(f"# {name}\n", encoding="utf-8")
    return [f"{name}.yaml" for name in names]


def batch(folder: Path, *words: str, **variables: str) -> subprocess.CompletedProcess[str]:
    return moldgen("batch", *words, folder=folder, job="by_name", **variables)


def rows(folder: Path) -> dict[str, dict[str, str]]:
    return {row["name"]: row for row in table(folder / "out" / "batch" / "summary.csv")}


def runs(folder: Path) -> list[str]:
    """The parts that workers have begun since the last look."""
    path = folder / "runs"
    begun = path.read_text(encoding="utf-8").split() if path.exists() else []
    path.unlink(missing_ok=True)
    return sorted(begun)


# --- a broken part stops nothing -------------------------------------------------------------------------------------
def test_every_kind_of_broken_part_has_its_row_and_stops_no_other(tmp_path: Path) -> None:
    names = ["aborts", "bug", "good", "hangs", "part_error", "vanishes", "well"]
    done = batch(tmp_path, *specs(tmp_path, *names), "no.yaml", "--time-limit", "4")
    assert done.returncode == 5
    assert "Traceback" not in done.stdout + done.stderr
    found = {name: (row["result"], int(row["exit_code"])) for name, row in rows(tmp_path).items()}
    assert found == {
        "aborts": ("kernel failed", 4),
        "bug": ("bug", 5),
        "good": ("not proved", 1),
        "hangs": ("kernel failed", 4),
        "no": ("bug", 5),  # the stand-in looks for a job called "no"
        "part_error": ("refused", 3),
        "vanishes": ("bug", 5),
        "well": ("proved", 0),
    }
    assert "'split the faces' did not end within the time limit of 4 s" in rows(tmp_path)["hangs"]["reason"]
    assert rows(tmp_path)["part_error"]["reason"] == "lid.step: two solids, and none is chosen"
    assert rows(tmp_path)["good"]["reason"] == "failure: a wall has too little draft [draft.too_small]"


def test_the_row_of_a_proved_part_counts_what_its_manifest_lists(tmp_path: Path) -> None:
    batch(tmp_path, *specs(tmp_path, "well"))
    assert rows(tmp_path)["well"] == {
        "name": "well",
        "source": "well.yaml",
        "result": "proved",
        "exit_code": "0",
        "components": "10",
        "proofs_passed": "2",
        "proofs_total": "2",
        "side_actions": "2",
        "rungs": "parting surface: plane",
        "reason": "",
    }


@pytest.mark.parametrize(
    ("names", "code"),
    [(["well"], 0), (["well", "good"], 1), (["part_error", "good"], 3), (["aborts", "part_error", "well"], 4)],
)
def test_the_exit_code_is_the_worst(names: list[str], code: int, tmp_path: Path) -> None:
    assert batch(tmp_path, *specs(tmp_path, *names)).returncode == code


def test_the_order_of_exit_codes() -> None:
    assert [worst([0, code, 0]) for code in range(6)] == [ExitCode(code) for code in range(6)]
    assert worst([1, 5, 4, 2]) is ExitCode.BUG


def test_the_summary_has_the_same_bytes_whatever_ends_first(tmp_path: Path) -> None:
    words = specs(tmp_path, "slowly", "good", "well", "part_error", "well-2")
    batch(tmp_path, *words, "--jobs", "1", "--output", "one")
    batch(tmp_path, *words, "--jobs", "2", "--output", "two")
    assert (tmp_path / "one" / "summary.csv").read_bytes() == (tmp_path / "two" / "summary.csv").read_bytes()
    assert [row["name"] for row in table(tmp_path / "two" / "summary.csv")] == [w.removesuffix(".yaml") for w in words]


# --- resuming --------------------------------------------------------------------------------------------------------
def test_what_is_done_is_not_done_again(tmp_path: Path) -> None:
    words = specs(tmp_path, "well", "good", "part_error")
    first = batch(tmp_path, *words)
    assert runs(tmp_path) == ["good", "part_error", "well"]
    output, summary = tmp_path / "out" / "batch" / "well" / "manifest.json", (tmp_path / "out/batch/summary.csv")
    before, text = output.stat(), summary.read_bytes()
    again = batch(tmp_path, *words)
    assert runs(tmp_path) == []
    assert (output.stat().st_ino, output.stat().st_mtime_ns) == (before.st_ino, before.st_mtime_ns)
    assert summary.read_bytes() == text
    assert again.returncode == first.returncode == 3
    assert "3 done by an earlier run" in again.stdout
    batch(tmp_path, *words, "--again")
    assert runs(tmp_path) == ["good", "part_error", "well"]
    assert output.stat().st_ino != before.st_ino


def _edit(folder: Path) -> list[str]:
    (folder / "well.yaml").write_text("# other\n", encoding="utf-8")
    return []


def _damage(folder: Path) -> list[str]:
    (folder / "out" / "batch" / "well" / "manifest.json").write_text('{"moldgen": "x"}', encoding="utf-8")
    return []


def _remove(folder: Path) -> list[str]:
    (folder / "out" / "batch" / "well" / "manifest.json").unlink()
    (folder / "out" / "batch" / "well").rmdir()
    return []


@pytest.mark.parametrize("change", [_edit, _damage, _remove])
def test_a_part_is_done_again_when_its_spec_or_its_output_is_another(change, tmp_path: Path) -> None:
    words = specs(tmp_path, "well", "well-2")
    batch(tmp_path, *words)
    runs(tmp_path)
    change(tmp_path)
    batch(tmp_path, *words)
    assert runs(tmp_path) == ["well"]


def test_other_options_do_all_again_and_other_limits_only_what_hit_them(tmp_path: Path) -> None:
    words = specs(tmp_path, "well", "hangs")
    batch(tmp_path, *words, "--time-limit", "2")
    runs(tmp_path)
    batch(tmp_path, *words, "--time-limit", "2")
    assert runs(tmp_path) == []
    batch(tmp_path, *words, "--time-limit", "3")
    assert runs(tmp_path) == ["hangs"]
    batch(tmp_path, *words, "--time-limit", "3", "--no-pictures")
    assert runs(tmp_path) == ["hangs", "well"]


def test_a_bug_is_tried_again(tmp_path: Path) -> None:
    words = specs(tmp_path, "bug", "well")
    for begun in (["bug", "well"], ["bug"]):
        batch(tmp_path, *words)
        assert runs(tmp_path) == begun


def test_another_moldgen_does_all_again(tmp_path: Path) -> None:
    words = specs(tmp_path, "well")
    batch(tmp_path, *words)
    record = tmp_path / "out" / "batch" / "batch.json"
    key = json.loads(record.read_text(encoding="utf-8"))["moldgen batch"]["well"]["key"]
    assert re.fullmatch("[0-9a-f]{64}", key)
    runs(tmp_path)
    record.write_text(record.read_text(encoding="utf-8").replace(key, "0" * 64), encoding="utf-8")
    batch(tmp_path, *words)
    assert runs(tmp_path) == ["well"]


# --- stopping --------------------------------------------------------------------------------------------------------
def stopped(folder: Path, number: signal.Signals, *options: str) -> tuple[int, str, str, float]:
    """Start a batch, wait until one part is finished and another hangs, and send a signal."""
    words = specs(folder, "well", "hangs", "well-2")
    command = moldgen_command("batch", *words, "--jobs", "1", *options, job="by_name")
    with subprocess.Popen(
        command, cwd=folder, env=environment(), stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    ) as process:
        end = time.monotonic() + 30
        while not (folder / "hanging").exists():
            assert time.monotonic() < end, "waited in vain"
            time.sleep(0.02)
        workers = psutil.Process(process.pid).children(recursive=True)
        assert workers
        start = time.monotonic()
        process.send_signal(number)
        stdout, stderr = process.communicate(timeout=30)
        seconds = time.monotonic() - start
    psutil.wait_procs(workers, timeout=10)
    assert not any(w.is_running() and w.status() != psutil.STATUS_ZOMBIE for w in workers)
    return process.returncode, stdout, stderr, seconds


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_a_signal_stops_the_batch_and_what_was_finished_stays_done(number: signal.Signals, tmp_path: Path) -> None:
    code, stdout, stderr, seconds = stopped(tmp_path, number)
    assert (code, stdout) == (130, "")
    assert seconds < 5.0  # two seconds are asked for; machines of a test farm are busy
    assert "1 finished parts are kept" in stderr
    assert "Traceback" not in stderr
    assert sorted(p.name for p in (tmp_path / "out" / "batch").iterdir()) == ["batch.json", "well"]
    assert runs(tmp_path) == ["hangs", "well"]
    batch(tmp_path, "well.yaml", "hangs.yaml", "well-2.yaml", "--time-limit", "2")
    assert runs(tmp_path) == ["hangs", "well-2"]


def test_stopped_as_json_is_one_line_more(tmp_path: Path) -> None:
    _, stdout, _, _ = stopped(tmp_path, signal.SIGINT, "--json")
    assert [json.loads(line)["exit_code"] for line in stdout.splitlines()] == [0, 130]


def test_a_batch_that_is_killed_loses_only_what_was_under_way(tmp_path: Path) -> None:
    stopped(tmp_path, signal.SIGKILL)
    runs(tmp_path)
    batch(tmp_path, "well.yaml", "well-2.yaml", "hangs.yaml", "--time-limit", "2")
    assert runs(tmp_path) == ["hangs", "well-2"]
    kept = sorted(p.name for p in (tmp_path / "out" / "batch").iterdir())
    assert kept == ["batch.json", "hangs.failure", "summary.csv", "well", "well-2"]


# --- inputs and names ------------------------------------------------------------------------------------------------
def test_parts_of_one_name_get_folders_of_their_own(tmp_path: Path) -> None:
    specs(tmp_path, "a/lid", "b/Lid", "c/spec", "starter", "c/summary.csv")
    words = [tmp_path / w for w in ("b/Lid.yaml", "a/lid.yaml", "c", "starter.yaml", "a")]
    found = [(i.name, i.source.relative_to(tmp_path).as_posix()) for i in batch_inputs(words, tmp_path / "out")]
    assert found == [
        ("Lid", "b/Lid.yaml"),
        ("lid-2", "a/lid.yaml"),
        ("c", "c/spec.yaml"),
        ("summary.csv-2", "c/summary.csv.yaml"),
        ("starter-2", "starter.yaml"),
    ]


def test_a_folder_stands_for_the_specs_and_step_files_below_it(tmp_path: Path) -> None:
    specs(tmp_path, "b", "deep/er/a", ".hidden/x", "made/y", "old/starter/z", "lid.failure/w")
    for name in ("b.step", "c.STP", "deep/d.step", "notes.txt", "e.stl"):
        (tmp_path / name).touch()
    (tmp_path / "made" / "manifest.json").write_text('{"moldgen": "0"}', encoding="utf-8")
    (tmp_path / "old" / "batch.json").write_text('{"moldgen batch": {}}', encoding="utf-8")
    found = [i.source.relative_to(tmp_path).as_posix() for i in batch_inputs([tmp_path], tmp_path / "out")]
    assert found == ["b.yaml", "c.STP", "deep/d.step", "deep/er/a.yaml"]


@pytest.mark.parametrize(
    ("words", "says"),
    [
        ([], "Missing argument 'SPEC_OR_STEP...'"),
        (["empty"], "there are no specs (*.yaml)"),
        (["well.yaml", "--jobs", "0"], "--jobs"),
        (["well.yaml", "--resin", "ABZ"], "ABZ"),
        (["well.yaml", "--time-limit", "nan"], "finite"),
        (["well.yaml", "--output", "mine"], "has no batch.json of moldgen batch: it is left alone"),
        (["well.yaml", "--output", "well.yaml"], "the output folder is a file"),
        (["well.yaml", "--output", "/dev/null/x"], "cannot be written"),
    ],
)
def test_a_wrong_command_line_is_2_and_does_nothing(words: list[str], says: str, tmp_path: Path) -> None:
    specs(tmp_path, "well", "mine/own")
    (tmp_path / "empty").mkdir()
    done = batch(tmp_path, *words)
    assert done.returncode == 2
    assert says in done.stderr
    assert "try: " in done.stderr
    assert sorted(p.relative_to(tmp_path).as_posix() for p in tmp_path.rglob("*")) == [
        "empty",
        "mine",
        "mine/own.yaml",
        "well.yaml",
    ]


# --- what is shown ---------------------------------------------------------------------------------------------------
def test_plain_progress_and_summary_off_a_terminal(tmp_path: Path) -> None:
    done = batch(tmp_path, *specs(tmp_path, "well", "good"))
    assert re.search(r"^ +\d+\.\d s  2 of 2  (well: proved|good: not proved) \(\d+\.\d s\)$", done.stderr, re.MULTILINE)
    assert re.search(r"^  well  +proved +0 +10 +2/2 +2 +\d+\.\d$", done.stdout, re.MULTILINE)
    assert "2 parts: 1 proved, 1 not proved\nwritten: out/batch/summary.csv\n" in done.stdout
    assert "not for manufacture" in done.stdout
    assert not re.search(r"[\x00-\x09\x0b-\x1f]", done.stdout + done.stderr)
    assert batch(tmp_path, "well.yaml", "--quiet").stderr == ""


def test_json_is_one_object_a_part(tmp_path: Path) -> None:
    words = specs(tmp_path, "well", "part_error")
    said = [json.loads(line) for line in batch(tmp_path, *words, "--json").stdout.splitlines()]
    assert {o["name"]: (o["exit_code"], o["output"]) for o in said} == {
        "well": (0, "out/batch/well"),
        "part_error": (3, None),
    }
    assert all(o["seconds"] > 0 for o in said)
    again = batch(tmp_path, *words, "--json", "--quiet").stdout.splitlines()
    assert [json.loads(line)["seconds"] for line in again] == [None, None]


@pytest.mark.parametrize("columns", [80, 120, 180])
def test_on_a_terminal_no_line_is_wider_than_it(columns: int, tmp_path: Path) -> None:
    command = moldgen_command("batch", *specs(tmp_path, "well", "good", "part_error"), job="by_name")
    code, seen = on_terminal(command, tmp_path, COLUMNS=str(columns), NO_COLOR="1")
    assert code == 3
    text = seen.decode("utf-8").replace("\r", "")
    assert "of 3 parts" in text
    assert "\x1b[" in text
    shown = re.sub(r"\x1b\[[0-9;?]*[A-Za-z]", "", text[text.rindex("part ") :])
    assert max(map(len, shown.splitlines())) <= columns
    for word in ("well", "proved", "part_error", "refused", "two solids", "written: out/batch/summary.csv"):
        assert word in shown
    assert re.search(r"^ ?well +proved +0 +10 +2/2 +2 +\d+\.\d", shown, re.MULTILINE)
    assert ("gravest finding" in shown) == (columns >= 120)
    assert ("parting surface: plane" in shown) == (columns == 180)


def test_the_parent_loads_no_kernel(tmp_path: Path) -> None:
    specs(tmp_path, "well")
    code = (
        "import sys; from pathlib import Path; from moldgen.flow.batch import *; from moldgen.flow.job import Limits\n"
        "from moldgen.flow.batch_inputs import batch_inputs\n"
        "folder = Path('out'); parts = Batch(batch_inputs([Path('well.yaml')], folder), folder)\n"
        "run_batch(parts, Limits(60.0), 2, lambda event: None, entry='helpers.bad_jobs:by_name')\n"
        "heavy = {'OCP', 'cadquery', 'manifold3d', 'trimesh', 'embreex', 'vtkmodules'} & set(sys.modules)\n"
        "sys.exit(str(heavy) if heavy else 0)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], cwd=tmp_path, env=environment(), capture_output=True, text=True, check=False
    )
    assert (done.returncode, done.stderr) == (0, "")
    assert (tmp_path / "out" / "summary.csv").read_text(encoding="utf-8").count("\n") == 2


def test_the_csv_reads_back_with_commas_and_quotes(tmp_path: Path) -> None:
    specs(tmp_path, "part_error-a, b")
    batch(tmp_path, "part_error-a, b.yaml")
    (row,) = csv.DictReader(io.StringIO((tmp_path / "out/batch/summary.csv").read_bytes().decode("utf-8"), newline=""))
    assert (row["name"], row["exit_code"]) == ("part_error-a, b", "3")
