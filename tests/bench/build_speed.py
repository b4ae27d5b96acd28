"""How long a whole build takes against the bare minimum, kernel import left out on both sides.

    python -m tests.bench.build_speed [--runs 3] [--demos] [--pictures] [NAME ...]

The bare minimum reads the part's STEP file, scales it, cuts it from a block by one boolean and writes the block as
STEP. The build does everything that `moldgen build` does, proofs included, from the same STEP file; pictures only if
asked for. Every run is a process of its own, forked when all modules are loaded: as in use, nothing is warm but the
imports. Of several runs the shortest counts, by clock time and by processor time (all processes of a run) apart.

Printed are seconds and their ratio for each real part of the index (those of MOLDGEN_PARTS, or ``../shared/parts``),
pulled along its best axis, that comes out proved, and the median of the ratios. The figure of issue 3 is that by clock
time on two idle cores; on a loaded machine a build that uses both cores gains nothing from the second.
"""

from __future__ import annotations

import argparse
import contextlib
import json
import os
import statistics
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from functools import partial
from pathlib import Path
from typing import Any, NamedTuple

from OCP.Bnd import Bnd_Box
from OCP.BRepBndLib import BRepBndLib
from OCP.BRepBuilderAPI import BRepBuilderAPI_Transform
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox
from OCP.gp import gp_Pnt, gp_Trsf
from OCP.IFSelect import IFSelect_RetDone
from OCP.STEPControl import STEPControl_AsIs, STEPControl_Reader, STEPControl_Writer
from ruamel.yaml import YAML

from moldgen.errors import MoldgenError
from moldgen.flow.build import build_tool
from moldgen.flow.job import Options
from moldgen.flow.part_source import read_part
from moldgen.flow.stages import Stages
from moldgen.flow.tell import silent
from moldgen.kernel.boolean import cut
from moldgen.kernel.quiet import quiet
from moldgen.kernel.topology import solids_of
from moldgen.memory import Forgetful
from moldgen.spec.load import load_spec
from tests.sweep.real_parts import real_parts

CHECKOUT = Path(__file__).resolve().parents[2]


def bare_minimum(part: Path, target: Path) -> None:
    """Read, scale, one cut, write: what no program can leave out."""
    with quiet():
        reader = STEPControl_Reader()
        assert reader.ReadFile(str(part)) == IFSelect_RetDone
        reader.TransferRoots()
        solid = solids_of(reader.OneShape())[0]
        scale = gp_Trsf()
        scale.SetScale(gp_Pnt(0, 0, 0), 1.0055)
        solid = BRepBuilderAPI_Transform(solid, scale, True).Shape()
        low, high = _loose_box(solid)
        block = BRepPrimAPI_MakeBox(gp_Pnt(*(v - 20 for v in low)), gp_Pnt(*(v + 20 for v in high))).Shape()
        (rest,) = cut(block, [solid])[:1]
        writer = STEPControl_Writer()
        writer.Transfer(rest, STEPControl_AsIs)
        assert writer.Write(str(target)) == IFSelect_RetDone


def _loose_box(solid: Any) -> tuple[tuple[float, ...], tuple[float, ...]]:
    box = Bnd_Box()
    BRepBndLib.Add_s(solid, box)
    return box.CornerMin().Coord(), box.CornerMax().Coord()


class Run(NamedTuple):
    """Clock time and processor time of one run [s], and what the work returned; None when it raised."""

    wall_s: float
    cpu_s: float
    told: Any


def run_apart(work: Callable[[], object]) -> Run:
    """Run some work, which returns plain data, in a process of its own."""
    reading, writing = os.pipe()
    start = time.perf_counter()
    child = os.fork()
    if child == 0:
        try:
            with contextlib.suppress(MoldgenError), os.fdopen(writing, "w") as out:
                out.write(json.dumps(work()))
        finally:
            os._exit(0)
    os.close(writing)
    with os.fdopen(reading) as pipe:
        told = pipe.read()
    _, _, used = os.wait4(child, 0)
    wall = time.perf_counter() - start
    return Run(wall, used.ru_utime + used.ru_stime, json.loads(told) if told else None)


def whole_build(spec: Path, work: Path, *, pictures: bool) -> dict[str, Any]:
    """Build a tool; return whether it is proved, and the seconds of its stages."""
    tell = silent()
    with tempfile.TemporaryDirectory(dir=work) as out:
        result = build_tool(load_spec(spec), Path(out), Options(pictures=pictures), Stages(Forgetful(), tell))
    stages: dict[str, float] = {}
    for stage, seconds in tell.timings_s:
        stages[stage] = stages.get(stage, 0.0) + seconds
    return {"proved": all(p.passed for p in result.proofs), "stages": stages}


def cases(work: Path, names: list[str], *, demos: bool) -> Iterator[tuple[str, Path, Path]]:
    """Yield (name, part STEP, spec) of the real parts asked for (none: all), and of the demos."""
    for folder in sorted((CHECKOUT / "specs").iterdir()):
        if (folder / "spec.yaml").is_file() and (folder.name in names or (demos and not names)):
            yield (folder.name, *_demo(folder / "spec.yaml", work))
    parts = Path(os.environ.get("MOLDGEN_PARTS") or CHECKOUT.parent / "shared" / "parts")
    for part in real_parts(parts) if (parts / "index.tsv").is_file() else []:
        if not names or part.name in names:
            spec = work / f"{part.name}.yaml"
            spec.write_text(
                f"name: {part.name}\npart: {{file: {json.dumps(str(part.path))}}}\nresin: ABS\npull: '+{part.axis}'\n",
                encoding="utf-8",
            )
            yield part.name, part.path, spec


def _demo(spec: Path, work: Path) -> tuple[Path, Path]:
    """Write a demo's part as STEP, and a copy of its spec that reads it: building the recipe is no part of the race."""
    loaded = load_spec(spec)
    part, _ = read_part(loaded)
    target = work / f"{part.name}.step"
    with quiet():
        writer = STEPControl_Writer()
        writer.Transfer(part.solid, STEPControl_AsIs)
        writer.Write(str(target))
    yaml = YAML()
    data = yaml.load(spec.read_text(encoding="utf-8"))
    data["part"] = {"file": target.name}
    copy = work / f"{part.name}.yaml"
    with copy.open("w", encoding="utf-8") as file:
        yaml.dump(data, file)
    return target, copy


def main(arguments: list[str]) -> int:
    """Print the table."""
    parser = argparse.ArgumentParser(description="Time whole builds against the bare minimum.")
    parser.add_argument("names", nargs="*")
    parser.add_argument("--runs", type=int, default=3)
    parser.add_argument("--demos", action="store_true", help="the demos as well")
    parser.add_argument("--pictures", action="store_true")
    options = parser.parse_args(arguments)
    ratios: list[tuple[float, float]] = []
    with tempfile.TemporaryDirectory() as folder:
        work = Path(folder)
        for name, part, spec in cases(work, options.names, demos=options.demos):
            built = [run_apart(partial(whole_build, spec, work, pictures=options.pictures))]
            if not (built[0].told and built[0].told["proved"]):
                print(f"{name:18} not proved", flush=True)
                continue
            built += [
                run_apart(partial(whole_build, spec, work, pictures=options.pictures)) for _ in range(options.runs - 1)
            ]
            bare = [run_apart(partial(bare_minimum, part, work / "bare.step")) for _ in range(options.runs + 2)]
            ratios.append(_ratios(name, bare, built))
    if ratios:
        wall, cpu = (statistics.median(r) for r in zip(*ratios, strict=True))
        print(f"median ratio over {len(ratios)} proved parts: {wall:.1f} by clock time, {cpu:.1f} by processor time")
    return 0


def _ratios(name: str, bare: list[Run], built: list[Run]) -> tuple[float, float]:
    """Print one line; return the ratios by clock time and by processor time."""
    (bare_s, bare_cpu), (built_s, built_cpu) = (
        (min(r.wall_s for r in runs), min(r.cpu_s for r in runs)) for runs in (bare, built)
    )
    stages = min(built, key=lambda r: r.wall_s).told["stages"]
    slow = ", ".join(f"{stage} {s:.2f}" for stage, s in sorted(stages.items(), key=lambda s: -s[1])[:4])
    print(
        f"{name:18} bare {bare_s:6.2f} s (cpu {bare_cpu:5.2f})  build {built_s:6.2f} s (cpu {built_cpu:5.2f})  "
        f"ratio {built_s / bare_s:5.1f} (cpu {built_cpu / bare_cpu:5.1f})   {slow}",
        flush=True,
    )
    return built_s / bare_s, built_cpu / bare_cpu


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
