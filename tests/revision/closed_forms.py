"""Volumes that a pocket calculator knows: tapered blocks, cones, and what is left of one that moved."""

from __future__ import annotations

import math

import numpy as np


def tan(degrees: float) -> float:
    """Return the tangent of an angle [deg]: how far a wall leans over 1 mm of height."""
    return math.tan(math.radians(degrees))


def slab(length: float, width: float, draft: float, start: float, end: float) -> float:
    """Return the volume [mm^3] of a tapered block between two heights over its foot [mm].

    The block is `length` x `width` at its foot and every wall leans in by `draft` [deg], so at height z its section is
    (l - 2 z t)(w - 2 z t) with t = tan(draft); the integral of that is l w z - t (l + w) z^2 + 4/3 t^2 z^3.
    """
    t = tan(draft)

    def below(z: float) -> float:
        return length * width * z - t * (length + width) * z**2 + 4.0 / 3.0 * t**2 * z**3

    return below(end) - below(start)


def block(length: float, width: float, height: float, draft: float) -> float:
    """Return the volume [mm^3] of a whole tapered block."""
    return slab(length, width, draft, 0.0, height)


def bar(diameter: float, length: float) -> float:
    """Return the volume [mm^3] of a round bar."""
    return math.pi / 4 * diameter**2 * length


def frustum(one: float, other: float, height: float) -> float:
    """Return the volume [mm^3] of a truncated cone between two radii."""
    return math.pi / 3 * height * (one**2 + one * other + other**2)


def lens_area(radius: np.ndarray | float, shift: float) -> np.ndarray:
    """Return the area [mm^2] that two equal circles share whose centers are `shift` apart: two circular segments.

    2 r^2 acos(s / 2r) - s/2 sqrt(4 r^2 - s^2); nothing where s > 2r.
    """
    r = np.maximum(np.asarray(radius, dtype=float), shift / 2)
    return np.asarray(2 * r**2 * np.arccos(shift / (2 * r)) - shift / 2 * np.sqrt(4 * r**2 - shift**2))


def crescent(one: float, other: float, height: float, shift: float) -> float:
    """Return the volume [mm^3] of a truncated cone outside of the same cone moved sideways by `shift`.

    The integral over the height of pi r^2 less the lens. The integrand is smooth, so Gauss's rule with 30 points leaves
    no error that can be seen.
    """
    nodes, weights = np.polynomial.legendre.leggauss(30)
    radius = one + (other - one) * (nodes + 1) / 2
    return float(np.sum(weights * (np.pi * radius**2 - lens_area(radius, shift))) * height / 2)


def rounded_off(radius: float, fillet: float) -> float:
    """Return the volume [mm^3] that a fillet takes off the end of an upright cylinder of this radius.

    Pappus: a square of side f at the rim less a quarter of a disc, each times the way of its center of area. The center
    of the quarter lies 4 f / (3 pi) outside of the middle of the fillet's arc, which stands at r - f.
    """
    square = fillet**2 * (radius - fillet / 2)
    quarter = math.pi / 4 * fillet**2 * (radius - fillet + 4 * fillet / (3 * math.pi))
    return 2 * math.pi * (square - quarter)


def beveled_off(length: float, width: float, height: float, draft: float, bevel: float) -> float:
    """Return the volume [mm^3] that a chamfer takes off the four upper edges of a tapered block.

    It is measured along both faces: `bevel` inward on the top, and as far down along the wall, so bevel cos(draft) in
    height. What stays there is a pyramid's stump; its sides shrink straight from those of the wall to those of the top:
    h/3 (A + B + (a d + b c)/2) with the sections A = a b below and B = c d above.
    """
    deep = bevel * math.cos(math.radians(draft))
    a, b = (size - 2 * (height - deep) * tan(draft) for size in (length, width))
    c, d = (size - 2 * height * tan(draft) - 2 * bevel for size in (length, width))
    stump = deep / 3 * (a * b + c * d + (a * d + b * c) / 2)
    return slab(length, width, draft, height - deep, height) - stump
