"""Small parts as specs, with the figures that a pocket calculator gives for them."""

from __future__ import annotations

from pathlib import Path

CUP = """\
resin: ABS
part:
  recipe:
    features:
      - {feature: block, name: cup, size: [40, 30, 16], radius: 4, draft: 2}
      - {feature: shell, name: hollow, thickness: 2, open: bottom of cup}
      - feature: boss
        name: post
        on: {plane: xy, offset: 14.2, flip: true}
        at: [8, 4]
        diameter: 8
        height: 12
        draft: 1
        hole: {diameter: 4, depth: 11, draft: 1}
"""
"""A cup that opens downward, 40 x 30 mm and 16 mm high, wall 2 mm, its ceiling at z = 14. A post hangs from the
ceiling at x = 8, y = 4, with a blind hole of 4 mm from below."""

PLAIN_CUP = CUP[: CUP.index("      - feature: boss")]
"""The cup without the post: nothing round enough for a core pin."""

NOTCHED = """\
resin: ABS
pull: +z
part:
  recipe:
    features:
      - {feature: block, name: body, size: [30, 24, 16]}
      - feature: block
        name: notch
        mode: cut
        on: {plane: xy, offset: 6}
        at: [13.5, 2]
        size: [3.2, 10, 4]
"""
"""A block 30 x 24 x 16 mm with a notch in its right side: x from 11.9 to 15, y from -3 to 7, z from 6 to 10."""


def spec(folder: Path, *texts: str, name: str = "part") -> Path:
    """Write the texts as one spec."""
    path = folder / f"{name}.yaml"
    path.write_text("".join(texts), encoding="utf-8")
    return path
