"""How long a build takes when little has changed since the last one, against the full build into an empty cache.

    python -m tests.bench.rebuild_speed [--runs 3] [--no-pictures] [NAME ...]

NAME is a demo, or a part of MOLDGEN_PARTS or ``../shared/parts``; without any, all demos. For each the spec is built
into an empty cache, then as it is, and with each of these changes alone: a comment, one ejector pin moved by 0.2 mm,
the gate a tenth wider, another resin with the same and with another shrink, one feature of the part moved by 2 mm.
Before every run cache and output are put back to what the full build left. Of several runs the shortest counts.

Each is timed twice: "command" is `moldgen build` as a user starts it, from the start of its process to its end, the
import of the kernel included; "standby" is the same build by a worker that was started ahead and has loaded the kernel,
as `moldgen watch` keeps one. Printed are seconds and their ratio to the full build of the same kind, by clock and in
brackets by processor time (all processes of a run): on a loaded machine only the latter says something. The figures of
issue 4: an unchanged spec under 1.5 s; a pin, a gate or a resin at most a quarter of the full build.
"""

from __future__ import annotations

import argparse
import contextlib
import os
import resource
import shutil
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import psutil

from moldgen.errors import MoldgenError
from moldgen.flow.job import Job, JobKind, Limits, Options
from moldgen.flow.worker import run_in_worker, standby
from tests.bench.build_speed import Run
from tests.helpers.outputs import manifest
from tests.helpers.rebuilds import DEMOS, SPECS, real_spec, small_changes

CHECKOUT = Path(__file__).resolve().parents[2]

AS_IT_IS = "nothing"
FULL = "full build"

LIMIT_S = 600.0

QUIET = 4
"""A worker that used no time for so many quarters of a second has loaded all."""

Way = Callable[[Path, bool], Run]
"""Builds spec.yaml of a folder into its out/, with its cache/; whether with pictures."""


@dataclass(frozen=True)
class Ratio:
    """One change: seconds of the clock, and its share of the full build by clock and by processor time."""

    change: str
    wall_s: float
    wall: float
    cpu: float


def by_command(folder: Path, pictures: bool) -> Run:
    """Run `moldgen build` as a user does."""
    words = [sys.executable, "-m", "moldgen", "build", "spec.yaml", "--output", "out", "--quiet"]
    settings = os.environ | {"MOLDGEN_CACHE": str(folder / "cache"), "PYTHONPATH": str(CHECKOUT)}
    start = time.perf_counter()
    process = subprocess.Popen(
        words if pictures else [*words, "--no-pictures"],
        cwd=folder,
        env=settings,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )
    _, status, used = os.wait4(process.pid, 0)
    wall = time.perf_counter() - start
    process.returncode = os.waitstatus_to_exitcode(status)
    return Run(wall, used.ru_utime + used.ru_stime, True if process.returncode in (0, 1) else None)


def standing_by(folder: Path, pictures: bool) -> Run:
    """Build in a worker that was started ahead and has loaded the kernel, as `moldgen watch` does."""
    os.environ["MOLDGEN_CACHE"] = str(folder / "cache")
    job = Job(JobKind.BUILD, folder / "spec.yaml", folder / "out", Options(pictures=pictures))
    before, told = _children_cpu_s(), None
    with standby() as ready:
        loading = _settled_cpu_s()
        start = time.perf_counter()
        with contextlib.suppress(MoldgenError):
            told = run_in_worker(job, Limits(time_s=LIMIT_S), lambda _: None, ready=ready).exit_code in (0, 1) or None
        wall = time.perf_counter() - start
    return Run(wall, _children_cpu_s() - before - loading, told)


def _children_cpu_s() -> float:
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    return used.ru_utime + used.ru_stime


def _settled_cpu_s() -> float:
    """Wait until the worker has loaded all, and return the processor time that it took."""
    (worker,) = psutil.Process().children()
    used, quiet = 0.0, 0
    while quiet < QUIET:
        time.sleep(0.25)
        now = sum(worker.cpu_times()[:2])
        used, quiet = now, quiet + 1 if now - used < 0.005 and now > 1.0 else 0
    return used


def fastest(runs: int, base: Path, text: str, way: Way, pictures: bool) -> Run | None:
    """Return the shortest of several runs of one spec from where `base` stands; None where no tool came of it."""
    found: list[Run] = []
    for _ in range(runs):
        with tempfile.TemporaryDirectory(dir=base.parent) as work:
            here = Path(work) / "here"
            shutil.copytree(base, here)
            (here / "spec.yaml").write_text(text, encoding="utf-8")
            found.append(way(here, pictures))
    told = [run for run in found if run.told]
    return Run(min(r.wall_s for r in told), min(r.cpu_s for r in told), told=True) if told else None


def race(name: str, spec: Path, work: Path, runs: int, pictures: bool) -> dict[str, list[Ratio]]:
    """Time one part both ways and print its lines; return the ratios of both ways."""
    text, result = spec.read_text(encoding="utf-8"), {}
    for kind, way in (("command", by_command), ("standby", standing_by)):
        base = work / kind
        base.mkdir()
        (base / "spec.yaml").write_text(text, encoding="utf-8")
        full = fastest(runs, base, text, way, pictures)
        if full is None or way(base, pictures).told is None:
            print(f"{name}: no tool", flush=True)
            return {}
        print(f"{name}, {kind}: {FULL} {full.wall_s:.2f} s (cpu {full.cpu_s:.2f})", flush=True)
        result[kind] = []
        changes = small_changes(base / "spec.yaml", manifest(base / "out"))
        for change, changed in {AS_IT_IS: text, **changes}.items():
            if kind == "standby" and change == AS_IT_IS:
                continue  # it needs no kernel: the command is all there is
            run = fastest(runs, base, changed, way, pictures)
            if run is None:
                print(f"    {change:26s} no tool", flush=True)
                continue
            ratio = Ratio(change, run.wall_s, run.wall_s / full.wall_s, run.cpu_s / full.cpu_s)
            result[kind].append(ratio)
            print(f"    {change:26s} {ratio.wall_s:6.2f} s   {ratio.wall:5.2f} (cpu {ratio.cpu:4.2f})", flush=True)
        shutil.rmtree(base)
    return result


def told_spec(name: str, work: Path) -> Path:
    """Return the spec of a demo or of a real part."""
    if name in DEMOS:
        return SPECS / name / "spec.yaml"
    return real_spec(name, Path(os.environ.get("MOLDGEN_PARTS") or CHECKOUT.parent / "shared" / "parts"), work)


def main(arguments: list[str]) -> int:
    """Print the lines of each part, then the medians."""
    parser = argparse.ArgumentParser(description="Time builds where little has changed against full builds.")
    parser.add_argument("names", nargs="*")
    parser.add_argument("--runs", type=int, default=3)
    parser.add_argument("--no-pictures", action="store_true")
    options = parser.parse_args(arguments)
    found: dict[str, list[Ratio]] = {}
    for name in options.names or DEMOS:
        with tempfile.TemporaryDirectory() as work:
            here = Path(work)
            raced = race(name, told_spec(name, here), here, options.runs, not options.no_pictures)
            for kind, ratios in raced.items():
                found.setdefault(kind, []).extend(ratios)
    for kind, ratios in found.items():
        print(f"\n{kind}: median and most of the ratios, by clock and by processor time")
        for change in dict.fromkeys(r.change for r in ratios):
            walls, cpus = zip(*((r.wall, r.cpu) for r in ratios if r.change == change), strict=True)
            print(
                f"    {change:26s} {statistics.median(walls):5.2f}, {max(walls):5.2f}   "
                f"cpu {statistics.median(cpus):5.2f}, {max(cpus):5.2f}"
            )
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
