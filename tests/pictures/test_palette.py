"""The palette stays apart for readers with red-green colour blindness.

Simulation: Machado, Oliveira and Fernandes, A physiologically-based model for simulation of color vision deficiency,
IEEE TVCG 15(6), 2009, matrices at severity 1.0. Distance: CIE 1976 L*a*b*, D65.
"""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest

from moldgen.output import palette

SIGHT = {
    "normal": np.eye(3),
    "protanopia": np.array(
        [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.098216], [-0.003882, -0.048116, 1.051998]]
    ),
    "deuteranopia": np.array(
        [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]]
    ),
}


def lab(colour: palette.Rgb, sight: str) -> np.ndarray:
    s = np.array(colour) / 255.0
    linear = np.where(s <= 0.04045, s / 12.92, ((s + 0.055) / 1.055) ** 2.4)
    seen = np.clip(SIGHT[sight] @ linear, 0.0, 1.0)
    to_xyz = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])
    t = to_xyz @ seen / np.array([0.9505, 1.0, 1.089])
    f = np.where(t > (6 / 29) ** 3, np.cbrt(t), t / (3 * (6 / 29) ** 2) + 4 / 29)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


@pytest.mark.parametrize("sight", SIGHT)
def test_areas_stay_apart(sight: str) -> None:
    inks = [*palette.ROLES.values(), palette.OTHER]
    for a, b in combinations(inks, 2):
        # 2.3 is a just noticeable difference of two patches side by side; several times that reads across a legend.
        assert np.linalg.norm(lab(a.colour, sight) - lab(b.colour, sight)) > 17.0, (a.label, b.label)


@pytest.mark.parametrize("sight", SIGHT)
def test_marks_are_darker_than_every_area(sight: str) -> None:
    for mark in (palette.PARTING_LINE, palette.GATE, palette.PULL):
        for area in (palette.ROLES["cavity"], palette.ROLES["core"], palette.OTHER):
            assert lab(area.colour, sight)[0] - lab(mark.colour, sight)[0] > 15.0, (mark.label, area.label)


@pytest.mark.parametrize("sight", SIGHT)
def test_cut_weld_and_steel_stay_far_apart(sight: str) -> None:
    for a, b in combinations((palette.CUT, palette.WELD, palette.STEEL), 2):
        assert np.linalg.norm(lab(a.colour, sight) - lab(b.colour, sight)) > 50.0, (a.label, b.label)


def test_one_colour_has_one_meaning() -> None:
    marks = [palette.PARTING_LINE, palette.GATE, palette.PULL, palette.STEEL, palette.CUT, palette.WELD]
    inks = [*palette.ROLES.values(), palette.OTHER, *marks]
    assert len({ink.colour for ink in inks}) == len(inks)
