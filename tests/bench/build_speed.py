"""How long a whole build takes against the bare minimum, in one process, kernel import left out on both sides.

    python -m tests.bench.build_speed [--runs 3] [--pictures] [NAME ...]

The bare minimum reads the part's STEP file, scales it, cuts it from a block by one boolean and writes the block as
STEP. The build does everything that `moldgen build` does, proofs included, from the same STEP file; pictures only if
asked for.
Printed are seconds and their ratio, for each demo and ten real parts (those of MOLDGEN_PARTS, or ``../shared/parts``).
"""

from __future__ import annotations

import argparse
import json
import os
import statistics
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

from OCP.Bnd import Bnd_Box
from OCP.BRepBndLib import BRepBndLib
from OCP.BRepBuilderAPI import BRepBuilderAPI_Transform
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox
from OCP.gp import gp_Pnt, gp_Trsf
from OCP.IFSelect import IFSelect_RetDone
from OCP.STEPControl import STEPControl_AsIs, STEPControl_Reader, STEPControl_Writer
from ruamel.yaml import YAML

from moldgen.flow.build import build_tool
from moldgen.flow.job import Options
from moldgen.flow.part_source import read_part
from moldgen.flow.tell import silent
from moldgen.kernel.boolean import cut
from moldgen.kernel.quiet import quiet
from moldgen.kernel.topology import solids_of
from moldgen.spec.load import load_spec

CHECKOUT = Path(__file__).resolve().parents[2]

REAL = {  # name: pull; parts of all sizes that two halves release
    "card_lid": "+y",
    "connector_bezel": "+z",
    "goalpost_topper": "+x",
    "handheld_top": "+z",
    "key_tub": "+y",
    "latch_tongue": "+z",
    "ring_bracket": "+x",
    "base_frame": "+z",
    "controller_base": "+z",
    "split_tub": "+z",
}


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


def best_of(runs: int, work: Callable[[], object]) -> float:
    """Return the shortest of several runs [s]."""
    times = []
    for _ in range(runs):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


def cases(work: Path, names: list[str]) -> list[tuple[str, Path, Path]]:
    """Return (name, part STEP, spec) of every demo and real part asked for."""
    found = []
    for folder in sorted((CHECKOUT / "specs").iterdir()):
        if (folder / "spec.yaml").is_file() and (not names or folder.name in names):
            found.append((folder.name, *_demo(folder / "spec.yaml", work)))
    parts = Path(os.environ.get("MOLDGEN_PARTS") or CHECKOUT.parent / "shared" / "parts")
    for name, pull in REAL.items():
        part = parts / f"{name}.step"
        if part.is_file() and (not names or name in names):
            spec = work / f"{name}.yaml"
            spec.write_text(
                f"name: {name}\npart: {{file: {json.dumps(str(part))}}}\nresin: ABS\npull: '{pull}'\n"
                "parting: {undercuts: fill}\n",
                encoding="utf-8",
            )
            found.append((name, part, spec))
    return found


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
    parser.add_argument("--pictures", action="store_true")
    options = parser.parse_args(arguments)
    ratios = []
    with tempfile.TemporaryDirectory() as folder:
        work = Path(folder)
        for name, part, spec in cases(work, options.names):
            bare = best_of(options.runs, lambda part=part: bare_minimum(part, work / "bare.step"))
            stages: dict[str, float] = {}

            def whole(spec: Path = spec, stages: dict[str, float] = stages) -> None:
                tell = silent()
                with tempfile.TemporaryDirectory(dir=work) as out:
                    build_tool(load_spec(spec), Path(out), Options(pictures=options.pictures), tell)
                stages.update(tell.timings_s)

            built = best_of(options.runs, whole)
            ratios.append(built / bare)
            slow = sorted(stages.items(), key=lambda s: -s[1])[:4]
            detail = ", ".join(f"{stage} {seconds:.2f}" for stage, seconds in slow)
            print(
                f"{name:18} bare {bare:6.2f} s  build {built:6.2f} s  ratio {built / bare:5.1f}   {detail}", flush=True
            )
    if ratios:
        print(f"median ratio {statistics.median(ratios):.1f} over {len(ratios)} parts")
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
