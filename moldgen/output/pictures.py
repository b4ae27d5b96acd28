"""The `pictures/` folder: part, tool closed, half open, open, sections; drawn in a child process of their own.

Two reasons for the child. On a machine without a display and without EGL or OSMesa the renderer does not refuse, it
crashes, and that must not take the build along. And the pictures need nothing from the proofs, so both can run at once.
The child is therefore probe and painter in one: its first act is an empty window, and it says so when
that came out right.

    python -m moldgen.output.pictures SCENE FOLDER
"""

from __future__ import annotations

import ctypes.util
import os
import re
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING

from moldgen.errors import StageError
from moldgen.output.scene import Scene, read_scene, write_scene

if TYPE_CHECKING:
    from moldgen.output.picture_canvas import Canvas

FILES = ("part.png", "closed.png", "open.png", "section.png")
"""The pictures of a build, in order."""

SIDE_FILES = ("half_open.png", "section_side.png")
"""The pictures more of a tool with side actions, drawn last."""

WINDOW_READY = "window ready"
"""What the child says once an empty window came out right: from here on a failure is ours, not the machine's."""

WRONG_ARGUMENTS, NO_WINDOW = 64, 69

# System libraries that vtk loads, and the Debian and Ubuntu packages that hold them (common practice).
PACKAGES = {
    "libEGL": "libegl1 libgl1-mesa-dri",
    "libOSMesa": "libosmesa6",
    "libGL": "libgl1",
    "libX11": "libx11-6",
    "libXrender": "libxrender1",
    "libXext": "libxext6",
    "libXcursor": "libxcursor1",
    "libSM": "libsm6",
    "libICE": "libice6",
    "libfontconfig": "libfontconfig1",
}


@dataclass(frozen=True)
class PictureResult:
    """The pictures that were written, in order, and what is missing and how to get it (empty: nothing is missing)."""

    files: tuple[Path, ...]
    missing: str


class PictureJob:
    """Pictures on their way: drawn by a child process while the caller does something else."""

    def __init__(self, process: subprocess.Popen[str], names: Sequence[str], folder: Path, workplace: Path) -> None:
        self._process, self._names, self._folder, self._workplace = process, names, folder, workplace

    def finish(self, timeout_s: float = 120.0) -> PictureResult:
        """Wait for the child at most `timeout_s` [s], and tell what came of it. Never raises for the child's sake."""
        late = False
        try:
            said, complaint = self._process.communicate(timeout=timeout_s)
        except subprocess.TimeoutExpired:
            late = True
            self._process.kill()
            said, complaint = self._process.communicate()
        finally:
            self.stop()
        files = tuple(self._folder / name for name in self._names if f"wrote {name}" in said.splitlines())
        if len(files) == len(self._names):
            return PictureResult(files, "")
        if late:
            reason = f"drawing took longer than {timeout_s:g} s and was stopped"
        else:
            reason = _reason(self._process.returncode, WINDOW_READY in said, complaint)
        lacking = ", ".join(name for name in self._names if self._folder / name not in files)
        return PictureResult(files, f"not drawn: {lacking}; {reason}")

    def stop(self) -> None:
        """End the child if it still runs, and remove its scene file."""
        if self._process.poll() is None:
            self._process.kill()
            self._process.communicate()
        shutil.rmtree(self._workplace, ignore_errors=True)
        for name in self._names:
            _aside(self._folder, name).unlink(missing_ok=True)


def file_names(scene: Scene) -> tuple[str, ...]:
    """Return the pictures that a scene gets, in order."""
    return FILES + SIDE_FILES if scene.side_actions else FILES


def start_pictures(scene: Scene, folder: Path, *, command: Sequence[str] | None = None) -> PictureJob:
    """Start drawing `scene` into `folder` (made if absent) and return at once.

    `command` is the painter to run instead of this module's own; the scene file and the folder are appended to it.

    Raises
    ------
    StageError : the scene has no part
    OSError : the folder or the scene file cannot be written
    """
    if not scene.of_role("part"):
        raise StageError("the scene for the pictures has no body with the role 'part'", where=scene.name)
    painter = list(command) if command is not None else [sys.executable, "-m", "moldgen.output.pictures"]
    return start_painter(painter, file_names(scene), folder, lambda file: write_scene(scene, file))


def start_painter(
    painter: Sequence[str], names: Sequence[str], folder: Path, write: Callable[[Path], None]
) -> PictureJob:
    """Start a painter of the pictures `names` in `folder` (made if absent) and return at once.

    `write` writes what is to be drawn to the file that it is given; that file and the folder are appended to `painter`.

    Raises
    ------
    OSError : the folder or the file cannot be written
    """
    folder.mkdir(parents=True, exist_ok=True)
    workplace = Path(tempfile.mkdtemp(prefix="moldgen-pictures-"))
    scene_file = workplace / "scene.npz"
    write(scene_file)
    process = subprocess.Popen(  # noqa: S603  (our own interpreter and module)
        [*painter, str(scene_file), str(folder)],
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        errors="replace",
        env=_environment(),
    )
    return PictureJob(process, names, folder, workplace)


def render_pictures(scene: Scene, folder: Path, *, command: Sequence[str] | None = None) -> PictureResult:
    """Draw `scene` into `folder` and wait; on a machine that cannot draw the result says what is missing."""
    return start_pictures(scene, folder, command=command).finish()


def _aside(folder: Path, name: str) -> Path:
    """Return where a picture is written first, so that a child that dies leaves nothing half-written under its name."""
    return folder / f".{name}.part"


def _environment() -> dict[str, str]:
    """Return the child's environment: no display, so that every machine draws off screen; this package importable."""
    package_root = str(Path(__file__).resolve().parents[2])
    paths = [package_root, *filter(None, [os.environ.get("PYTHONPATH")])]
    kept = {key: value for key, value in os.environ.items() if key not in ("DISPLAY", "WAYLAND_DISPLAY")}
    return kept | {"PYTHONPATH": os.pathsep.join(paths)}


def _reason(code: int, window: bool, complaint: str) -> str:
    """Return why the child failed and what to do, from its exit code and what it wrote to its error stream."""
    library = re.search(r"(lib\w+)\S*\.so\S*: cannot open shared object file", complaint)
    if library:
        package = PACKAGES.get(library[1], "")
        advice = f"on Debian or Ubuntu: sudo apt install {package}" if package else "install the package that holds it"
        return f"system library {library[0].split(':')[0]} is missing; {advice}"
    module = re.search(r"No module named '([\w.]+)'", complaint)
    if module:
        return f"Python module {module[1]} is missing; pip install vtk"
    ending = f"signal {-code}" if code < 0 else f"exit code {code}"
    if not window:
        return f"this machine cannot draw off screen ({ending}): {_renderers()}"
    last = complaint.strip().splitlines()[-1:] or ["no message"]
    return f"the painter ended with {ending}: {last[0]}"


def _renderers() -> str:
    """Return which off-screen renderers the system has, and how to get one."""
    found = [name for name in ("EGL", "OSMesa") if ctypes.util.find_library(name)]
    advice = f"on Debian or Ubuntu: sudo apt install {PACKAGES['libEGL']} (or {PACKAGES['libOSMesa']})"
    if found:
        return f"lib{' and lib'.join(found)} is there but gave no working driver; {advice}"
    return f"it needs libEGL or libOSMesa and has neither; {advice}"


def main(arguments: Sequence[str]) -> int:
    """Draw the scene file `arguments[0]` into the folder `arguments[1]`: the child's part. Return the exit code."""
    if len(arguments) != 2:
        sys.stderr.write("usage: python -m moldgen.output.pictures SCENE FOLDER\n")
        return WRONG_ARGUMENTS
    from moldgen.output.picture_sheets import PICTURES  # noqa: PLC0415  (vtk, and only in the child)

    scene = read_scene(Path(arguments[0]))
    sheets = [(name, partial(PICTURES[name], scene)) for name in file_names(scene)]
    return paint(sheets, Path(arguments[1]))


def paint(sheets: Sequence[tuple[str, Callable[[Canvas], None]]], folder: Path) -> int:
    """Draw `sheets`, each a file name and what draws it, into `folder`: the child's part. Return the exit code."""
    from moldgen.output.picture_canvas import Canvas  # noqa: PLC0415  (vtk, and only in the child)

    canvas = Canvas()
    if not canvas.draws():
        return NO_WINDOW
    sys.stdout.write(WINDOW_READY + "\n")
    sys.stdout.flush()
    for name, draw in sheets:
        aside = _aside(folder, name)
        canvas.clear()
        draw(canvas)
        canvas.save(aside)
        aside.replace(folder / name)
        sys.stdout.write(f"wrote {name}\n")
        sys.stdout.flush()
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
