"""The pictures of a comparison, drawn in a child process of their own like those of a build.

python -m moldgen.output.compare_pictures PICTURES FOLDER
"""

from __future__ import annotations

import sys
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from moldgen.model.revision import ComponentChange, Work
from moldgen.output.compare_scene import ComparePicture, read_pictures, write_pictures
from moldgen.output.compare_words import picture_key
from moldgen.output.pictures import WRONG_ARGUMENTS, paint, start_painter

MOST_DRAWN = 24
"""So many components get pictures (our choice: about 10 MB of page); the page says when there are more."""

FIRST_S, EACH_S = 60.0, 15.0
"""s: how long drawing may take, at all and for each component (our choice: ten times what a slow machine takes)."""


@dataclass(frozen=True)
class DrawnComponent:
    """The sheets that were drawn of one component, in order; `key` is that of its `ComparePicture`."""

    key: str
    files: tuple[Path, ...]


@dataclass(frozen=True)
class DrawnComparison:
    """The pictures of a comparison, and in words what is missing and why (empty: nothing is missing)."""

    components: tuple[DrawnComponent, ...] = ()
    missing: str = ""

    def of(self, change: ComponentChange) -> tuple[Path, ...]:
        """Return the sheets of a component, none if it has none."""
        return tuple(f for drawn in self.components if drawn.key == picture_key(change) for f in drawn.files)


def draw_comparison(
    pictures: Sequence[ComparePicture], folder: Path, *, command: Sequence[str] | None = None
) -> DrawnComparison:
    """Draw `pictures` into `folder` (made if absent) and wait; never raises for the painter's sake.

    Files are named by the place of the component and by the sheet: ``component_1_sheet_1.png``. Those with steel to
    weld come first, and no more than `MOST_DRAWN` components are drawn. `command` is the painter to run instead of this
    module's own.

    Raises
    ------
    OSError : the folder cannot be written
    """
    drawn = sorted(pictures, key=lambda p: all(piece.role != Work.WELD for piece in p.pieces))[:MOST_DRAWN]
    if not drawn:
        return DrawnComparison()
    names = {k: [_file_name(k, sheet) for sheet in range(len(p.sheets))] for k, p in enumerate(drawn)}
    painter = list(command) if command is not None else [sys.executable, "-m", "moldgen.output.compare_pictures"]
    every = [name for sheets in names.values() for name in sheets]
    job = start_painter(painter, every, folder, lambda file: write_pictures(drawn, file))
    result = job.finish(FIRST_S + EACH_S * len(drawn))
    missing = [result.missing] if result.missing else []
    if len(pictures) > MOST_DRAWN:
        missing.append(f"only {MOST_DRAWN} of {len(pictures)} components with work on them are drawn")
    components = tuple(
        DrawnComponent(picture.key, tuple(folder / n for n in names[k] if folder / n in result.files))
        for k, picture in enumerate(drawn)
    )
    return DrawnComparison(components, "; ".join(missing))


def _file_name(component: int, sheet: int) -> str:
    return f"component_{component + 1}_sheet_{sheet + 1}.png"


def main(arguments: Sequence[str]) -> int:
    """Draw the pictures in the file `arguments[0]` into the folder `arguments[1]`: the child's part."""
    if len(arguments) != 2:
        return WRONG_ARGUMENTS
    from moldgen.output.compare_sheets import sheets_of  # noqa: PLC0415  (vtk, and only in the child)

    sheets = [
        (_file_name(k, sheet), draw)
        for k, picture in enumerate(read_pictures(Path(arguments[0])))
        for sheet, draw in enumerate(sheets_of(picture))
    ]
    return paint(sheets, Path(arguments[1]))


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
