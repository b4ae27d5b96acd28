"""Judge tools a second time, by `tests/second_opinion`, and print where it and moldgen differ.

    python -m tests.sweep.second_opinion FOLDER ...             output folders of `moldgen build`
    python -m tests.sweep.second_opinion --demos                builds and judges all of specs/
    python -m tests.sweep.second_opinion --parts [NAME ...]     builds and judges the real parts (see real_parts.py)

Each tool is judged in a process of its own. A tool that moldgen refuses has no steel to judge and is listed only. The
exit code is 1 if any tool is called proved by one and not by the other, or could not be judged.
"""

from __future__ import annotations

import argparse
import json
import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from pathlib import Path

from tests.sweep.real_parts import TIME_LIMIT_S, build, real_parts

CHECKOUT = Path(__file__).resolve().parents[2]
JUDGE_LIMIT_S = 900
_JUDGE = """
import json, sys
from pathlib import Path
from tests.second_opinion.judge import judge
found = judge(Path(sys.argv[1]))
needed = [f.depth for f in found.needed]
print(json.dumps({"passed": found.passed, "worst": found.worst, "wrong": found.wrong(), "needed": needed}))
"""


def ours(folder: Path) -> str:
    """What moldgen says of the tool in an output folder."""
    proofs = json.loads((folder / "manifest.json").read_text(encoding="utf-8"))["proofs"]
    return "proved" if proofs and all(p["passed"] for p in proofs) else "NOT proved"


def row(name: str, folder: Path) -> bool:
    """Judge one tool, print its row, and return whether both agree."""
    start = time.monotonic()
    command = [sys.executable, "-c", _JUDGE, str(folder)]
    try:
        done = subprocess.run(command, cwd=CHECKOUT, capture_output=True, text=True, timeout=JUDGE_LIMIT_S, check=False)
        said = json.loads(done.stdout)
    except subprocess.TimeoutExpired:
        said = {"passed": None, "wrong": [f"no answer within {JUDGE_LIMIT_S} s"]}
    except ValueError:
        said = {"passed": None, "wrong": [f"no answer: {done.stderr.strip()[-300:]}"]}
    agree = said["passed"] is not None and said["passed"] == (ours(folder) == "proved")
    second = {True: "proved", False: "WRONG", None: "NO ANSWER"}[said["passed"]]
    sides = f"side actions hold {min(said['needed']):.2f} mm" if said.get("needed") else ""
    _print(
        name, ours(folder), second, f"{said.get('worst', float('nan')):.3f}", f"{time.monotonic() - start:.0f}", sides
    )
    for line in said["wrong"]:
        print(f"    {line}", flush=True)
    return agree


def _print(name: str, *cells: str) -> None:
    print(f"{name:20} {cells[0]:14} {cells[1]:10} {cells[2]:>8} {cells[3]:>5}  {' '.join(cells[4:])}", flush=True)


def demos(work: Path) -> Iterator[tuple[str, Path | None, str]]:
    """Build each demo: its name, its folder if there is one, and what moldgen says otherwise."""
    for spec in sorted(CHECKOUT.glob("specs/*/spec.yaml")):
        name = spec.parent.name
        command = [sys.executable, "-m", "moldgen", "build", str(spec), "--quiet", "--no-pictures"]
        command += ["--output", str(work / name), "--time-limit", str(2 * TIME_LIMIT_S)]
        subprocess.run(command, cwd=CHECKOUT, capture_output=True, text=True, check=False)
        yield (name, work / name, "") if (work / name / "tool.step").is_file() else (name, None, "no tool")


def parts(names: list[str], undercuts: str, work: Path) -> Iterator[tuple[str, Path | None, str]]:
    """Build each real part along its best axis: its name, its folder if there is one, and what moldgen says."""
    root = Path(os.environ.get("MOLDGEN_PARTS") or CHECKOUT.parent / "shared" / "parts")
    for part in real_parts(root):
        if names and part.name not in names:
            continue
        outcome = build(part, undercuts, "axis", work)
        folder = work / "out" / part.name
        yield part.name, folder if (folder / "tool.step").is_file() else None, f"{outcome.verdict}: {outcome.detail}"


def main(arguments: list[str]) -> int:
    """Print the table; the exit code is 1 on any disagreement."""
    parser = argparse.ArgumentParser(description="Judge tools a second time.")
    parser.add_argument("names", nargs="*", help="output folders, or names of parts with --parts")
    parser.add_argument("--demos", action="store_true")
    parser.add_argument("--parts", action="store_true")
    parser.add_argument("--undercuts", default="release")
    parser.add_argument("--keep", type=Path, help="leave the builds here")
    options = parser.parse_args(arguments)
    os.environ["PYTHONPATH"] = os.pathsep.join([str(CHECKOUT), os.environ.get("PYTHONPATH", "")])
    _print("part", "moldgen", "second", "mm", "s")
    agreed = []
    with tempfile.TemporaryDirectory() as aside:
        work = options.keep or Path(aside)
        work.mkdir(parents=True, exist_ok=True)
        tools: Iterator[tuple[str, Path | None, str]]
        if options.demos:
            tools = demos(work)
        elif options.parts:
            tools = parts(options.names, options.undercuts, work)
        else:
            tools = ((Path(name).name, Path(name), "") for name in options.names)
        for name, folder, said in tools:
            if folder is None:
                _print(name, said.partition(":")[0], "-", "-", "-", said.partition(":")[2].strip()[:120])
            else:
                agreed.append(row(name, folder))
    print(f"{sum(agreed)} of {len(agreed)} tools: both say the same")
    return 0 if agreed and all(agreed) else 1


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
