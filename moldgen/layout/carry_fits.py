"""The bores of kept pins: where the fit of an accepted pin ends is where its bore widens, and that is cut already."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Final

from moldgen.finding import Decision, Finding, Notes, Point, Severity
from moldgen.layout.kept import REMEDY, KeptItem
from moldgen.model.accepted import SNAP
from moldgen.rules.pins import guided_fit_length

SHORTEST_KEPT: Final = 8.0
"""mm: a fit that is cut may be this short, a new one has 10 mm at least (our choice: in four fifths of its guide a pin
tilts by a quarter more, and for less than that nobody welds a ring into a bore)."""

SAME_HOLE: Final = 0.02
"""mm: a pin or round core stands where it stood within this (our choice: what the sag of a mesh may make out)."""

LEAST_RATIO, MOST_RATIO, MOST_LEAST = 2.0, 3.0, 12.0
"""Ends of the range of a fit: 2 to 3 diameters, the least of it up to 12 mm (common practice, as the rule says)."""


@dataclass(frozen=True)
class Fit:
    """The fit of a pin [mm]. usual : of a new hole; limit : what the accepted bore would break, None if it is kept.

    asked : length that the accepted bore would leave
    """

    length: float
    usual: float
    asked: float = 0.0
    limit: float | None = None


def shortest_kept(diameter: float) -> float:
    """Return the shortest fit that a pin of an accepted layout may have [mm]."""
    return max(LEAST_RATIO * diameter, SHORTEST_KEPT)


def keep_fit(diameter: float, usual: float, surface: float, lowest: float, end: float | None) -> Fit:
    """Return the fit of a pin whose bore may be cut already.

    Parameters
    ----------
    diameter, usual : of the pin, and the fit that a new hole would get [mm]
    surface, lowest : lowest height of the core's surface over the bore, and the lowest at which a fit may end [mm]
    end : height at which the accepted fit ends [mm], None for a new hole

    The surface is looked at as the layout does, so where only its slope changes the end moves by what that makes out.
    """
    asked = usual if end is None else surface - max(end, lowest)
    if abs(asked - usual) <= SNAP:
        return Fit(usual, usual)
    short, most = shortest_kept(diameter), guided_fit_length(diameter, MOST_RATIO, MOST_LEAST)
    if short - SNAP <= asked <= most + SNAP:
        return Fit(asked, usual)
    return Fit(usual, usual, asked, short if asked < short else most)


def end_of(item: KeptItem, diameter: float, off: float) -> float | None:
    """Return the height at which the fit of an accepted pin ends, if it is still in the same hole.

    off : how far the pin is from where it was [mm]
    """
    same = off <= SAME_HOLE and max(map(abs, item.shift)) == 0.0 and abs(diameter - item.diameter) <= SNAP
    return item.fit_end if same else None


def hole_of(x: float, y: float, cut: Iterable[KeptItem]) -> KeptItem | None:
    """Return the accepted pin whose hole is at a place [mm], None if there is none."""
    return next((item for item in cut if math.hypot(item.at[0] - x, item.at[1] - y) <= SAME_HOLE), None)


def fits_told(pins: Sequence[tuple[str, Point, Fit]]) -> Notes:
    """Return which bores stay though a new one would be another, and a finding for each that is made anew."""
    stay = [f"{name}: {fit.length:.2f} mm" for name, _, fit in pins if abs(fit.length - fit.usual) > SNAP]
    notes = Notes(tuple(_made_anew(name, at, fit) for name, at, fit in pins if fit.limit is not None))
    if stay:
        why = "a bore that is cut stays where it widens, as long as its fit is neither too short nor too long"
        notes += Notes(decisions=(Decision("fits kept", "; ".join(stay), why),))
    return notes


def _made_anew(name: str, at: Point, fit: Fit) -> Finding:
    limit = 0.0 if fit.limit is None else fit.limit
    short = fit.asked < limit
    bound = "at least" if short else "at most"
    work = "steel is missing round it" if short else "it is drilled deeper"
    return Finding(
        "accepted.fit_made_anew",
        Severity.CAUTION,
        f"the bore of {name} widens at another height than accepted, {work}: left as it is, the fit would be "
        f"{fit.asked:.2f} mm long, it must be {bound} {limit:g} mm",
        where="fit_end",
        at=at,
        value=round(fit.asked, 3),
        limit=round(limit, 3),
        unit="mm",
        remedy=REMEDY,
    )
