"""Which dimensions will be tuned after the first shots, and on which steel to leave something for that: advice."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.catalog import Resin
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.layout.steel_former import Ends, FormedPart
from moldgen.layout.steel_marked import NEAR, Meant, meant_face, meant_feature
from moldgen.layout.steel_round import RoundFeature, holes_in_bosses, round_features, standing_pins
from moldgen.layout.steel_snap import SnapLip, snap_lips
from moldgen.layout.view import PartView
from moldgen.model.layout import Layout
from moldgen.model.part import MoldFrame, vector
from moldgen.model.steel_safe import Fit, SteelSafe
from moldgen.rules.steel_safe import DIRECTION, OTHER_ALLOWANCE, PRESS_ALLOWANCE, SNAP_ALLOWANCE, shrink_doubt
from moldgen.spec.steel_safe import SteelSafe as SteelSafeSection
from moldgen.spec.steel_safe import TunedPlace

MOST_LISTED: Final = 12
"""So many dimensions that moldgen finds by itself are listed; those asked for are listed always (our choice)."""

LARGEST_SHARE: Final = 0.5
"""Share of a dimension that may be left on it in all: beyond it the feature is hardly there (our choice)."""

AUTO_SHARE: Final = 0.25
"""The same for what moldgen chooses (our choice)."""

SAME: Final = 0.02
"""mm: dimensions that differ by less are listed as one."""

_PRACTICE: Final = {Fit.PRESS: PRESS_ALLOWANCE, Fit.SNAP: SNAP_ALLOWANCE, Fit.MARKED: OTHER_ALLOWANCE}
_FITS: Final = {"press": Fit.PRESS, "snap": Fit.SNAP, "other": Fit.MARKED}


@dataclass(frozen=True)
class _Dimension:
    """One dimension before anything is decided about it.

    place : where it is told [mm, mold]; formers : the components at its two ends; faces : on how many steel is left
    larger : whether the steel-safe dimension of the part is the larger one; words : {a} allowance, {t} twice, {by}
    """

    fit: Fit
    feature: str
    name: str
    ends: Ends
    place: np.ndarray
    formers: tuple[str, ...]
    faces: int
    larger: bool
    words: str
    why: str


def steel_safe_advice(
    view: PartView, layout: Layout, section: SteelSafeSection, resin: Resin, frame: MoldFrame
) -> tuple[tuple[SteelSafe, ...], Notes]:
    """Return the dimensions to be tuned, those that the spec names first, then snap fits and press fits that are found.

    Parameters
    ----------
    view : the part between its halves, with the layout of its side actions; layout : its core pins are named
    section : `steel_safe` of the spec; its points are in part coordinates
    frame : from the part to the mold

    The steel is not changed: the files of the tool have every dimension as it ends.
    """
    part = FormedPart(view, layout)
    rounds = round_features(part.body)
    lips = snap_lips(part, view.halves) if section.find == "auto" or section.places else []
    given, notes = _given(part, rounds, lips, section, frame)
    found = _found(part, rounds, lips) if section.find == "auto" else []
    asked = [_advice(d, section, resin, frame, number) for d, number in given]
    own = [_advice(d, section, resin, frame) for d in found]
    own = [one for one in own if not any(_same_place(one, other) for other in asked)]
    folded = _folded(own)
    listed = tuple(_worded(one) for one in (*asked, *folded[:MOST_LISTED]))
    return listed, notes + _told(listed, folded[MOST_LISTED:], section)


# --- what there is ---------------------------------------------------------------------------------------------------
def _found(part: FormedPart, rounds: list[RoundFeature], lips: list[SnapLip]) -> list[_Dimension]:
    snaps = [d for lip in lips for d in _lip_dimensions(part, lip, "a side action or a shut-off forms its catch face")]
    holes = [_round_dimension(part, f, Fit.PRESS, "deep round hole in a round boss") for f in holes_in_bosses(rounds)]
    pins = [_round_dimension(part, f, Fit.PRESS, "free-standing round pin") for f in standing_pins(rounds)]
    return [*snaps, *holes, *pins]


def _given(
    part: FormedPart,
    rounds: list[RoundFeature],
    lips: list[SnapLip],
    section: SteelSafeSection,
    frame: MoldFrame,
) -> tuple[list[tuple[_Dimension, int]], Notes]:
    """Return the dimensions that the spec names, with the numbers of its entries; a finding for each without one."""
    found: list[tuple[_Dimension, int]] = []
    findings = []
    for number, place in enumerate(section.places):
        point = np.asarray(frame.to_mold(place.at))
        if place.face:
            meant = meant_face(part, rounds, point)
        else:
            meant = meant_feature(part, rounds, lips, point, snap=place.fit == "snap")
        own = list(_meant_dimensions(part, meant, _FITS[place.fit], f"named in steel_safe.places[{number}]"))
        found += [(d, number) for d in own]
        if not own:
            findings.append(_nothing(place, number, meant))
    return found, Notes(tuple(findings))


def _nothing(place: TunedPlace, number: int, meant: Meant) -> Finding:
    far = meant.off > NEAR
    if place.face and far:
        what, remedy = f"the nearest face is {meant.off:.2f} mm from this point", "give a point on the face"
    elif place.face:
        what, remedy = "no wall can be measured behind this face", "give a point in the middle of the face"
    else:
        what = "this point lies in no hole, slot, pin, wall or lip that could be a fit"
        remedy = "give a point in the middle of the feature, or one on a face of it with face: true"
    return Finding(
        "steel_safe.no_face" if place.face else "steel_safe.no_feature",
        Severity.WARNING,
        f"steel_safe.places[{number}]: {what}",
        where=f"steel_safe.places[{number}]",
        at=place.at,
        value=round(meant.off, 3),
        limit=NEAR if place.face else None,
        unit="mm",
        remedy=remedy,
    )


# --- the dimensions of a feature -------------------------------------------------------------------------------------
def _meant_dimensions(part: FormedPart, meant: Meant, fit: Fit, why: str) -> Iterator[_Dimension]:
    if meant.round is not None:
        yield _round_dimension(part, meant.round, fit, why)
    elif meant.lip is not None:
        yield from _lip_dimensions(part, meant.lip, why)
    elif meant.slot is not None:
        yield _width(part, meant.slot, fit, why, larger=True)
    elif meant.wall is not None:
        yield _width(part, meant.wall, fit, why, larger=False)
    elif meant.face is not None:
        ends = meant.face
        words = "leave {a} mm of steel on {by} at this face: the wall behind it starts {a} mm thinner"
        formers = (part.former(ends.one, ends.one_normal),)
        yield _Dimension(fit, "face", "wall behind it", ends, ends.one, formers, 1, larger=False, words=words, why=why)


def _width(part: FormedPart, ends: Ends, fit: Fit, why: str, *, larger: bool) -> _Dimension:
    """Return the width of a slot, or of a wall, with steel on both sides of it."""
    both = (part.former(ends.one, ends.one_normal), part.former(ends.other, ends.other_normal))
    feature, name = ("slot", "width") if larger else ("wall", "thickness")
    words = "leave {a} mm of steel on both sides, on {by}: the "
    words += "slot starts {t} mm wider, and closes" if larger else "wall starts {t} mm thinner, and grows"
    words += " as steel is cut away"
    formers = tuple(dict.fromkeys(both))
    return _Dimension(fit, feature, name, ends, ends.middle, formers, 2, larger, words, why)


def _round_dimension(part: FormedPart, feature: RoundFeature, fit: Fit, why: str) -> _Dimension:
    former = part.former(*part.face_place(feature.faces[0]))
    ends = feature.ends()
    if feature.hollow:
        words = "leave {a} mm of steel on {by} all round: the hole starts {t} mm larger, and gets smaller as steel is "
        words += "ground away"
        return _Dimension(fit, "round hole", "diameter", ends, ends.middle, (former,), 2, True, words, why)
    words = "leave {a} mm of steel in {by} all round: the pin starts {t} mm thinner, and grows as its bore is opened"
    return _Dimension(fit, "round pin", "diameter", ends, ends.middle, (former,), 2, False, words, why)


def _lip_dimensions(part: FormedPart, lip: SnapLip, why: str) -> Iterator[_Dimension]:
    tip = part.former(*part.face_place(lip.tip))
    catch = part.former(lip.catch, lip.up)
    words = "leave {a} mm of steel on {by} before the tip: the lip starts {a} mm shorter, and reaches further as steel "
    words += "is cut away"
    yield _Dimension(Fit.SNAP, "snap lip", "reach", lip.reach, lip.catch, (tip,), 1, False, words, why)
    words = "leave {a} mm of steel on {by} at the catch face: the lip starts {a} mm thinner, with play, and gets "
    words += "tighter as steel is cut away"
    yield _Dimension(Fit.SNAP, "snap lip", "thickness", lip.thickness, lip.catch, (catch,), 1, False, words, why)


# --- the advice ------------------------------------------------------------------------------------------------------
def _advice(
    dimension: _Dimension,
    section: SteelSafeSection,
    resin: Resin,
    frame: MoldFrame,
    number: int = -1,
) -> SteelSafe:
    """Return the advice for a dimension. number : of its entry in `steel_safe.places`, -1 if moldgen found it."""
    one, other = (frame.to_part(vector(p)) for p in (dimension.ends.one, dimension.ends.other))
    nominal = float(np.linalg.norm(np.subtract(one, other)))
    allowance, source = _allowance(dimension, nominal, section, resin, number)
    change = allowance * dimension.faces * (1.0 if dimension.larger else -1.0)
    last = dimension.ends.length
    words = dimension.words.replace("{a}", f"{allowance:.2f}").replace("{t}", f"{2 * allowance:.2f}")
    return SteelSafe(
        fit=dimension.fit,
        feature=dimension.feature,
        dimension=dimension.name,
        places=(vector(round(v, 3) for v in frame.to_part(vector(dimension.place))),),
        formed_by=dimension.formers,
        nominal_mm=round(nominal, 4),
        allowance_mm=allowance,
        faces=dimension.faces,
        steel_first_mm=round(last + change, 4),
        steel_last_mm=round(last, 4),
        steel_safe=words,
        source=source,
        why=dimension.why,
        given=number,
    )


def _allowance(
    dimension: _Dimension, nominal: float, section: SteelSafeSection, resin: Resin, number: int
) -> tuple[float, str]:
    """Return the steel to leave on each face [mm], and where the figure comes from."""
    own = section.places[number].allowance if number >= 0 else None
    if own is not None:
        return own, f"given in steel_safe.places[{number}].allowance"
    if section.allowance is not None:
        return section.allowance, "given in steel_safe.allowance"
    practice = _PRACTICE[dimension.fit]
    least = min(resin.shrink_along.low, resin.shrink_across.low)
    most = max(resin.shrink_along.high, resin.shrink_across.high)
    doubt = shrink_doubt(nominal, most - least) / dimension.faces
    value, source = practice.default, f"{practice.title}: {practice.source}"
    if doubt > value:
        value, source = doubt, f"half the range of shrink of {resin.name}, {least:g} to {most:g} %, on this dimension"
    if value * dimension.faces > AUTO_SHARE * nominal:
        value = AUTO_SHARE * nominal / dimension.faces
        source = f"a quarter of the dimension: our choice, since {practice.default:g} mm would be much of it"
    return round(value, 2) or round(value, 4), source


def _same_place(one: SteelSafe, other: SteelSafe) -> bool:
    """Return whether two entries are about the same dimension of the same feature."""
    near = float(np.linalg.norm(np.subtract(one.places[0], other.places[0]))) < SAME
    return near and (one.feature, one.dimension) == (other.feature, other.dimension)


def _folded(found: list[SteelSafe]) -> list[SteelSafe]:
    """Return the entries with equal ones made one, snap fits first, then what there is most of."""
    kept: list[SteelSafe] = []
    for one in found:
        at = next((i for i, k in enumerate(kept) if _key(k) == _key(one)), None)
        if at is None:
            kept.append(one)
            continue
        formers = tuple(dict.fromkeys((*kept[at].formed_by, *one.formed_by)))
        kept[at] = replace(kept[at], places=kept[at].places + one.places, formed_by=formers)
    order = [Fit.SNAP, Fit.PRESS, Fit.MARKED]
    return sorted(kept, key=lambda s: (order.index(s.fit), -len(s.places), s.places[0]))


def _worded(one: SteelSafe) -> SteelSafe:
    """Return an entry with the names of its components in its words."""
    *before, last = one.formed_by
    names = f"{', '.join(before)} and {last}" if before else last
    return replace(one, steel_safe=one.steel_safe.replace("{by}", names))


def _key(one: SteelSafe) -> tuple[object, ...]:
    kind = tuple(re.sub(r" \d+$", "", name) for name in one.formed_by[:1])
    return one.feature, one.dimension, round(one.nominal_mm / SAME), one.allowance_mm, one.source, kind


def _told(listed: tuple[SteelSafe, ...], dropped: list[SteelSafe], section: SteelSafeSection) -> Notes:
    findings = []
    for one in listed:
        share = one.allowance_mm * one.faces / max(one.nominal_mm, 1e-9)
        if share > LARGEST_SHARE:
            own = "steel_safe" if section.allowance is None else "steel_safe.allowance"
            findings.append(
                Finding(
                    "steel_safe.large_allowance",
                    Severity.WARNING,
                    f"{one.feature}, {one.dimension}: {one.allowance_mm * one.faces:.2f} mm of steel in all would be "
                    f"left on {one.nominal_mm:.2f} mm",
                    where=own if one.given < 0 else f"steel_safe.places[{one.given}].allowance",
                    at=one.places[0],
                    value=round(share, 3),
                    limit=LARGEST_SHARE,
                    unit="1",
                    remedy="give a smaller allowance",
                )
            )
    if not listed and section.find == "none":
        return Notes(tuple(findings))
    count = f"{len(listed)} dimension{'' if len(listed) == 1 else 's'} to be tuned"
    choice = f"{count}; advice only: the steel itself is cut to size"
    more = tuple(f"{d.feature}, {d.dimension} {d.nominal_mm:.2f} mm" for d in dropped)
    why = DIRECTION if listed else "no snap fit, press fit or marked place was found"
    lines = [_PRACTICE[f] for f in dict.fromkeys(one.fit for one in listed)]
    quantities = tuple(line.line("the steel-safe advice, not the steel") for line in lines)
    return Notes(tuple(findings), (Decision("steel-safe", choice, why, "", more),), quantities)
