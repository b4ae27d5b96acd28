"""The commands of README.md do what it says, in its order, in a folder like a fresh clone."""

from __future__ import annotations

import re
import shlex
import shutil
from pathlib import Path

import numpy as np
import pytest
from helpers.command import moldgen
from helpers.png import pixels
from helpers.source import CHECKOUT

from tests.docs.demo_pictures import KEPT, kept_picture, source_of
from tests.docs.test_readme_tables import README, chapter, rows

pytestmark = pytest.mark.slow

COMMAND = re.compile(r"(?:^|&& )\.venv/bin/moldgen (.+)$", re.MULTILINE)

STALE = 2.0
"""Mean difference of shades, 0 to 255, from which a kept picture shows another part or tool."""


@pytest.fixture(scope="module")
def clone(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with the specs, in which the demo of the first command was built."""
    folder = tmp_path_factory.mktemp("clone")
    shutil.copytree(CHECKOUT / "specs", folder / "specs")
    (command,) = COMMAND.findall(chapter("Set up"))
    done = moldgen(*shlex.split(command), folder=folder, timeout=300)
    assert done.returncode == 0, done.stdout + done.stderr
    return folder


def test_a_part_of_your_own(clone: Path) -> None:
    copy = re.search(r"`cp (\S+) (\S+)`", README)
    assert copy is not None
    shutil.copy(clone / copy[1], clone / copy[2])
    commands = COMMAND.findall(chapter("A part of your own, in ten minutes"))
    assert [c.split()[0] for c in commands] == ["new", "check", "build", "prove"]
    for command in commands:
        done = moldgen(*shlex.split(command), folder=clone, timeout=300)
        assert done.returncode == 0, command + "\n" + done.stdout + done.stderr


def test_the_output_folder_holds_what_its_table_names(clone: Path) -> None:
    (built,) = (clone / "out").glob("rain-funnel")
    named = {row[0].strip("`") for row in rows("What a build writes")}
    assert named == {path.name + "/" * path.is_dir() for path in built.iterdir()}


def test_the_kept_pictures_are_those_of_a_build(clone: Path) -> None:
    for name in KEPT:
        source = source_of(name, clone / "out" / "rain-funnel")
        assert source is not None
        built = kept_picture(source).astype(int)
        kept = pixels(clone / "specs" / "rain-funnel" / name).astype(int)
        assert np.abs(built - kept).mean() < STALE, "run tests/docs/demo_pictures.py"
