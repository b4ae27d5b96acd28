"""Build a tool for every real part and print what came of it: the table in DEVELOPERS.md.

    python -m tests.sweep.real_parts [--undercuts release|...] [--pull auto|axis] [--jobs 2] [--csv FILE] [NAME ...]

The parts are those of the folder in MOLDGEN_PARTS, or ``../shared/parts`` beside the checkout; their best axis comes
from the index that lies there. Each part is built through the command line, in its own process, as a user would.
"""

from __future__ import annotations

import argparse
import csv
import json
import os
import re
import subprocess
import sys
import tempfile
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from pathlib import Path
from typing import Any

TIME_LIMIT_S = 300
KILL_AFTER_S = TIME_LIMIT_S + 30


@dataclass(frozen=True)
class RealPart:
    """One row of the index: rough class and the axis along which the least surface is out of reach."""

    name: str
    rough_class: str
    faces: int
    axis: str
    path: Path


@dataclass(frozen=True)
class Outcome:
    """What one build said."""

    part: RealPart
    code: int
    verdict: str
    rungs: str
    seconds: float
    detail: str


def real_parts(folder: Path) -> list[RealPart]:
    """Return the parts of the index, in its order."""
    rows = []
    with (folder / "index.tsv").open(encoding="utf-8") as file:
        for row in csv.DictReader(file, delimiter="\t"):
            shares = re.search(r"X ([\d.]+) Y ([\d.]+) Z ([\d.]+)", row["undercut_pct_along_best_axis"])
            assert shares is not None
            least = min(range(3), key=lambda i: float(shares[i + 1]))
            name = row["file"].removesuffix(".step")
            rows.append(RealPart(name, row["rough_class"][:1], int(row["faces"]), "xyz"[least], folder / row["file"]))
    return rows


def build(part: RealPart, undercuts: str, pull: str, work: Path) -> Outcome:
    """Build one part in a process of its own and read what it says."""
    spec = work / f"{part.name}.yaml"
    spec.write_text(
        f"name: {part.name}\npart: {{file: {json.dumps(str(part.path))}}}\nresin: ABS\n"
        f'pull: "{"auto" if pull == "auto" else "+" + part.axis}"\nparting: {{undercuts: {undercuts}}}\n',
        encoding="utf-8",
    )
    command = [sys.executable, "-m", "moldgen", "build", str(spec), "--json", "--quiet", "--no-pictures"]
    command += ["--time-limit", str(TIME_LIMIT_S), "--output", str(work / "out" / part.name)]
    try:
        done = subprocess.run(command, capture_output=True, text=True, timeout=KILL_AFTER_S, check=False)
    except subprocess.TimeoutExpired:
        return Outcome(part, -1, "HUNG", "", KILL_AFTER_S, "did not end within its own limit")
    if "Traceback" in done.stderr:
        return Outcome(part, done.returncode, "TRACEBACK", "", 0.0, done.stderr[-300:])
    try:
        said = json.loads(done.stdout)
    except ValueError:
        return Outcome(part, done.returncode, "NO JSON", "", 0.0, (done.stdout + done.stderr)[-300:])
    return _read(part, done.returncode, said)


def _read(part: RealPart, code: int, said: dict[str, Any]) -> Outcome:
    if "errors" in said:
        first = said["errors"][0]
        verdict = {2: "spec refused", 3: "refused", 4: "kernel failed", 5: "BUG"}.get(code, "?")
        return Outcome(part, code, verdict, "", 0.0, f"{first['where']}: {first['what']}".replace("\n", " "))
    topics = ("preparation", "parting surface", "shut-off", "undercut filled", "side action")
    rungs = "; ".join(f"{d['rung'] or d['choice']}" for d in said["decisions"] if d["topic"] in topics)
    filled = [f for f in said["findings"] if f["code"] == "release.filled"]
    failed = [p for p in said["proofs"] if not p["passed"]]
    if failed:
        detail = "; ".join(f"{p['name']}: {p['figure']} ({p['detail']})" for p in failed)
        verdict = "NOT proved"
    else:
        verdict = f"proved, {filled[0]['value']:.2f} mm3 filled" if filled else "proved"
        detail = ", ".join(f"{p['figure']:.1e}" for p in said["proofs"] if p["figure"] is not None)
    seconds = sum(t["seconds"] for t in said["timings_s"] if not t["stage"].startswith("load the "))
    return Outcome(part, code, verdict, rungs, seconds, detail)


def main(arguments: list[str]) -> int:
    """Print the table; the exit code is 1 if anything crashed, hung or left a traceback."""
    parser = argparse.ArgumentParser(description="Build a tool for every real part.")
    parser.add_argument("names", nargs="*", help="parts to build (default: all)")
    parser.add_argument("--undercuts", choices=("release", "release_or_fill", "fill", "refuse"), default="release")
    parser.add_argument("--pull", choices=("auto", "axis"), default="auto", help="axis: the best one of the index")
    parser.add_argument("--jobs", type=int, default=2)
    parser.add_argument("--csv", type=Path, help="also write the table here")
    options = parser.parse_args(arguments)
    folder = Path(os.environ.get("MOLDGEN_PARTS") or Path(__file__).resolve().parents[3] / "shared" / "parts")
    if not (folder / "index.tsv").is_file():
        print("no real parts here: set MOLDGEN_PARTS to their folder")
        return 1
    parts = [p for p in real_parts(folder) if not options.names or p.name in options.names]
    with tempfile.TemporaryDirectory() as work, ThreadPoolExecutor(options.jobs) as pool:
        outcomes = []
        for o in pool.map(lambda p: build(p, options.undercuts, options.pull, Path(work)), parts):
            outcomes.append(o)
            print(
                f"{o.part.name:20} {o.part.rough_class} {o.part.faces:4} {o.verdict:28} {o.seconds:6.1f} s  "
                f"{o.rungs[:90]:90}  {o.detail[:160]}",
                flush=True,
            )
    if options.csv:
        _write(outcomes, options.csv)
    _summary(outcomes)
    bad = [o for o in outcomes if o.code in (-1, 5) or o.verdict in ("TRACEBACK", "NO JSON", "HUNG")]
    return 1 if bad else 0


def _write(outcomes: list[Outcome], path: Path) -> None:
    with path.open("w", newline="", encoding="utf-8") as file:
        writer = csv.writer(file)
        writer.writerow(("part", "class", "faces", "axis", "exit_code", "verdict", "rungs", "seconds", "detail"))
        for o in outcomes:
            p = o.part
            writer.writerow(
                (p.name, p.rough_class, p.faces, p.axis, o.code, o.verdict, o.rungs, f"{o.seconds:.2f}", o.detail)
            )


def _summary(outcomes: list[Outcome]) -> None:
    for letter in sorted({o.part.rough_class for o in outcomes}):
        mine = [o for o in outcomes if o.part.rough_class == letter]
        proved = sum(o.verdict.startswith("proved") for o in mine)
        refused = sum(o.verdict == "refused" for o in mine)
        other = len(mine) - proved - refused
        print(f"class {letter}: {proved} proved, {refused} refused, {other} other, of {len(mine)}")


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
