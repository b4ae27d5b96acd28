"""Colours as STEP text: the kernel's own writer puts them in the order of memory addresses, different on every run."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from moldgen.errors import KernelError

Rgb = tuple[int, int, int]
"""Red, green, blue, 0 to 255 (sRGB)."""

_END: Final = b"ENDSEC;\nEND-ISO-10303-21;"
_SOLID: Final = re.compile(rb"^#(\d+) = (?:MANIFOLD_SOLID_BREP|BREP_WITH_VOIDS)\(", re.MULTILINE)
_GROUP: Final = re.compile(rb"^#\d+ = ADVANCED_BREP_SHAPE_REPRESENTATION\((.*?)\);", re.MULTILINE | re.DOTALL)
_REFERENCE: Final = re.compile(rb"#(\d+)")
_NUMBER: Final = re.compile(rb"^#(\d+) =", re.MULTILINE)


@dataclass(frozen=True)
class Style:
    """What a solid looks like; `transparency` is the share of light that passes, 0 to 1."""

    colour: Rgb
    transparency: float


def add_styles(data: bytes, styles: Sequence[Style]) -> bytes:
    """Return the bytes of a STEP file with one style for each of its solids, in the order of the file.

    [published: ISO 10303-46, visual presentation: surface style usage]

    Raises
    ------
    KernelError : the file does not hold as many solids as there are styles
    """
    solids = _solids(data)
    if len(solids) != len(styles):
        raise KernelError(f"the STEP file would hold {len(solids)} solids instead of {len(styles)}")
    head, end, tail = data.rpartition(_END)
    number = int(_NUMBER.findall(head)[-1]) + 1
    lines = []
    for style, (solid, context) in zip(styles, solids, strict=True):
        chain = _chain(style, solid, context, number)
        lines += [f"#{n} = {text};\n" for n, text in enumerate(chain, start=number)]
        number += len(chain)
    return head + "".join(lines).encode("ascii") + end + tail


def _solids(data: bytes) -> list[tuple[int, int]]:
    """Return the entity numbers of each solid and of the context it stands in."""
    solids = {int(n) for n in _SOLID.findall(data)}
    found = []
    for group in _GROUP.findall(data):
        numbers = [int(n) for n in _REFERENCE.findall(group.rpartition(b"'")[2])]  # behind the name
        found += [(n, numbers[-1]) for n in numbers[:-1] if n in solids]
    return found


def _chain(style: Style, solid: int, context: int, n: int) -> list[str]:
    """Return the entities of one style; the first of them is number `n`."""
    red, green, blue = (f"{c / 255.0:.6f}" for c in style.colour)
    see_through = style.transparency > 0.0
    sides = f"#{n + 4},#{n + 9}" if see_through else f"#{n + 4}"
    rendering = [
        f"SURFACE_STYLE_RENDERING_WITH_PROPERTIES(.NORMAL_SHADING.,#{n + 8},(#{n + 10}))",
        f"SURFACE_STYLE_TRANSPARENT({style.transparency:.6f})",
    ]
    return [
        f"MECHANICAL_DESIGN_GEOMETRIC_PRESENTATION_REPRESENTATION('',(#{n + 1}),#{context})",
        f"STYLED_ITEM('color',(#{n + 2}),#{solid})",
        f"PRESENTATION_STYLE_ASSIGNMENT((#{n + 7}))",
        f"SURFACE_SIDE_STYLE('',({sides}))",
        f"SURFACE_STYLE_FILL_AREA(#{n + 5})",
        f"FILL_AREA_STYLE('',(#{n + 6}))",
        f"FILL_AREA_STYLE_COLOUR('',#{n + 8})",
        f"SURFACE_STYLE_USAGE(.BOTH.,#{n + 3})",
        f"COLOUR_RGB('',{red},{green},{blue})",
        *(rendering if see_through else []),
    ]
