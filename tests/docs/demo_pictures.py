"""Make the pictures of README.md again: build every demo, and keep two pictures at half their size beside its spec.

.venv/bin/python tests/docs/demo_pictures.py [NAME...]
"""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path

CHECKOUT = Path(__file__).resolve().parents[2]
sys.path[:0] = [str(CHECKOUT), str(CHECKOUT / "tests")]  # run from anywhere, installed or not

import numpy as np  # noqa: E402
from helpers.command import moldgen  # noqa: E402
from helpers.png import halved, pixels  # noqa: E402

from moldgen.output.picture_canvas import encode_png  # noqa: E402

KEPT = {"part.png": ("part.png",), "tool.png": ("half_open.png", "closed.png")}
"""File beside the spec, and the picture of the build that it comes from: the first that there is."""

SHADES = 4
"""Steps between the shades that are kept: the eye does not see it, and the file gets smaller by a quarter."""


def source_of(name: str, built: Path) -> Path | None:
    """Return the picture of a build that a kept one comes from, None if it has none."""
    return next((p for p in (built / "pictures" / source for source in KEPT[name]) if p.is_file()), None)


def kept_picture(path: Path) -> np.ndarray:
    """Return a picture of a build as it is kept: half its size, in fewer shades."""
    shades = (halved(pixels(path)).astype(np.uint16) + SHADES // 2) // SHADES * SHADES
    return np.minimum(shades, 255).astype(np.uint8)


def main(names: list[str]) -> int:
    """Remake the pictures of the named demos, or of all; return 1 if one of them did not build."""
    specs = sorted(CHECKOUT.glob("specs/*/spec.yaml"))
    failed = False
    for spec in [s for s in specs if not names or s.parent.name in names]:
        with tempfile.TemporaryDirectory() as folder:
            done = moldgen("build", "--quiet", spec, folder=Path(folder), timeout=600)
            sys.stdout.write(done.stdout.partition("\n\ncomponents")[0] + done.stderr + "\n")
            failed |= done.returncode != 0
            for name in KEPT:
                picture = source_of(name, Path(folder) / "out" / spec.parent.name)
                if picture is not None:
                    (spec.parent / name).write_bytes(encode_png(kept_picture(picture)))
    return int(failed)


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
