"""Issue 2, "Behaviour" and items 2 and 8, on real builds: starter specs, machines that cannot draw, Ctrl-C, AP214."""

from __future__ import annotations

import re
import signal
import subprocess
import time
from pathlib import Path

import pytest
from helpers.bad_parts import write_step
from helpers.command import TESTS, environment, moldgen, moldgen_command
from helpers.outputs import findings, manifest, snapshot, unproved
from helpers.small_specs import CUP, PLAIN_CUP, spec
from ruamel.yaml import YAML

from moldgen.kernel.features import build_recipe
from moldgen.spec.recipe import Recipe

pytestmark = pytest.mark.slow


def write_cup(path: Path) -> None:
    """Write the plain cup as a STEP file."""
    recipe = Recipe.model_validate(YAML(typ="safe").load(PLAIN_CUP)["part"]["recipe"])
    write_step(build_recipe(recipe.resolve()), path)


def test_a_starter_spec_builds_as_written_and_is_never_written_over(tmp_path: Path) -> None:
    (tmp_path / "from cad").mkdir()
    write_cup(tmp_path / "from cad" / "My cup (v2).step")
    (tmp_path / "mine").mkdir()
    words = ["new", "from cad/My cup (v2).step", "--output", "mine/cup.yaml", "--resin", "pp", "--quiet"]
    done = moldgen(*words, folder=tmp_path)
    assert done.returncode == 0, done.stderr
    assert "moldgen build mine/cup.yaml" in done.stdout
    text = (tmp_path / "mine" / "cup.yaml").read_text(encoding="utf-8")
    assert "40.00 x 30.00 x 16.00 mm" in text
    build = moldgen("build", "mine/cup.yaml", "--no-pictures", "--quiet", folder=tmp_path)
    assert build.returncode == 0, build.stdout + build.stderr
    (folder,) = (tmp_path / "out").iterdir()
    record = manifest(folder)
    assert unproved(record) == []
    assert record["resin"] == "PP"
    assert record["pull"]["direction"] == pytest.approx([0, 0, 1], abs=1e-9), "the hollow side lies on the core"
    again = moldgen(*words, folder=tmp_path)
    assert again.returncode == 2
    assert "exists already" in again.stderr
    assert (tmp_path / "mine" / "cup.yaml").read_text(encoding="utf-8") == text


def test_a_machine_that_cannot_draw_builds_and_says_what_is_missing(tmp_path: Path) -> None:
    # Python runs sitecustomize at every start: in the painter's process, and only there, it hides the real vtk
    hidden = tmp_path / "hidden" / "vtk" / "vtkmodules"
    hidden.mkdir(parents=True)
    (hidden / "__init__.py").write_text(
        "raise ImportError('libEGL.so.1: cannot open shared object file: No such file or directory')\n"
    )
    (tmp_path / "hidden" / "sitecustomize.py").write_text(
        "import sys\nif 'moldgen.output.pictures' in sys.orig_argv:\n"
        "    sys.path.insert(0, __file__.rpartition('/')[0] + '/vtk')\n"
    )
    spec(tmp_path, PLAIN_CUP, "pull: +z\n")
    path = f"{tmp_path / 'hidden'}:{environment()['PYTHONPATH']}"
    done = moldgen("build", "part.yaml", "--quiet", folder=tmp_path, PYTHONPATH=path)
    assert done.returncode == 0, done.stdout + done.stderr
    record = manifest(tmp_path / "out" / "part")
    assert unproved(record) == []
    (finding,) = findings(record, "pictures.missing")
    assert finding["severity"] == "caution"
    assert "part.png" in finding["message"]
    assert "libEGL.so.1 is missing" in finding["message"]
    assert "apt install libegl1" in finding["message"]
    assert not list((tmp_path / "out" / "part").rglob("*.png"))
    assert "pictures.missing" in done.stdout


def test_ctrl_c_in_a_real_build_stops_soon_and_leaves_the_earlier_output(tmp_path: Path) -> None:
    (tmp_path / "out" / "part").mkdir(parents=True)
    (tmp_path / "out" / "part" / "manifest.json").write_text('{"moldgen": "earlier"}')
    spec(tmp_path, CUP, "pull: +z\n")
    (tmp_path / "temporary").mkdir()
    before = snapshot(tmp_path)
    process = subprocess.Popen(
        moldgen_command("build", "part.yaml"),
        cwd=tmp_path,
        env=environment() | {"TMPDIR": str(tmp_path / "temporary")},
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
    assert process.stderr is not None
    for line in process.stderr:
        if "prove the tool ..." in line:  # the files are written, the painter is at work
            break
    assert list((tmp_path / "temporary").iterdir())
    assert len(list((tmp_path / "out").iterdir())) == 2
    start = time.monotonic()
    process.send_signal(signal.SIGINT)
    stdout, stderr = process.communicate(timeout=60)
    assert time.monotonic() - start < 5.0, "two seconds are asked for; a busy machine gets five"
    assert process.returncode == 130
    assert "the earlier output is untouched" in stderr
    assert "Traceback" not in stdout + stderr
    assert snapshot(tmp_path) == before


def test_ap214_on_request_with_the_same_solids(cup, tmp_path: Path) -> None:
    text = CUP + "pull: +z\noutput: {step: ap214, pictures: false, folder: tools}\nname: cup in 214\n"
    spec(tmp_path, text)
    done = moldgen("build", tmp_path / "part.yaml", "--quiet", folder=TESTS)
    assert done.returncode == 0, done.stderr
    folder = tmp_path / "tools" / "cup in 214"
    step = (folder / "tool.step").read_text(encoding="ascii")
    assert re.search(r"FILE_SCHEMA\(\('AUTOMOTIVE_DESIGN", step.replace(" ", ""))
    volumes = [(c["name"], c["volume_mm3"]) for c in manifest(folder)["components"]]
    assert volumes == [(c["name"], c["volume_mm3"]) for c in manifest(cup.folder)["components"]]
    assert not (folder / "pictures").exists()
