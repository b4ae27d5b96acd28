"""Side actions: steel that leaves the part along a line of its own. Mold frame, mm."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from enum import StrEnum

import numpy as np

from moldgen.model.part import Vector


class SideKind(StrEnum):
    """What carries the steel."""

    SLIDE = "slide"
    LIFTER = "lifter"


@dataclass(frozen=True)
class Front:
    """The forming end of a side action: a straight prism of steel, from which the part is cut.

    kind : a slide leaves before the part is ejected; a lifter moves with the ejectors
    axis : unit vector along which the prism is straight. Of a slide: the way it leaves. Of a lifter: down into the core
    release : unit vector of its motion relative to the part; of a slide the axis, of a lifter square to the pull
    outline : polygons (k, 2) [mm] in the plane across `axis` (see `across`): outer ones counterclockwise, holes
        clockwise
    near, far : where the prism starts and ends, as coordinates along `axis` [mm]; far lies clear of the part
    clear : coordinate along `axis` beyond which the prism holds no plastic, at most `far` [mm]
    travel : motion along `release` until nothing of it has plastic before it [mm], without clearance
    pieces : numbers of the trapped pieces that it serves
    rung : how it was found, in words
    given : the number of its entry in the spec's `side_actions`, -1 if moldgen placed it
    stroke : of a lifter the ejection stroke that it was made for [mm]: another one ends somewhere else; 0 of a slide
    """

    kind: SideKind
    axis: Vector
    release: Vector
    outline: tuple[np.ndarray, ...]
    near: float
    far: float
    clear: float
    travel: float
    pieces: tuple[int, ...]
    rung: str
    given: int = -1
    stroke: float = 0.0


@dataclass(frozen=True)
class SideGiven:
    """What a user fixes of one side action. Checked, not trusted.

    direction : unit vector along which it releases
    point : a point that names the undercut: the trapped piece nearest to it [mm]
    width, height : size of the outline about the point, square to the direction (height along the pull for a slide)
        [mm]; None leaves it to moldgen
    """

    kind: SideKind
    direction: Vector
    point: Vector
    width: float | None = None
    height: float | None = None


@dataclass(frozen=True)
class SideOptions:
    """What the search may use.

    given : entries of the spec's `side_actions`, in its order
    ejection_stroke : how far the ejectors push [mm]; None: what frees a part as deep on the core as it is high
    lifters, inclined : whether lifters and slides that are not square to the pull may be used
    add : whether more than the given ones may be planned
    """

    given: tuple[SideGiven, ...] = ()
    ejection_stroke: float | None = None
    lifters: bool = True
    inclined: bool = True
    add: bool = True


@dataclass(frozen=True)
class Unreleased:
    """A trapped piece that no side action was found for.

    piece : its number among the trapped pieces
    why : the reason in the trade's words ("closed undercut", "thread", "a collapsing core would be needed", ...)
    remedy : the smallest change of the part that would help
    tried : what was tried, and how each failed
    at, way, change_at : the place [mm], the direction and the place of the change [mm] for which "{at}", "{way}" and
        "{change_at}" stand in the texts, None where no text has one. In the mold frame: the reader's are others
    """

    piece: int
    why: str
    remedy: str
    tried: tuple[str, ...] = ()
    at: Vector | None = None
    way: Vector | None = None
    change_at: Vector | None = None

    def told(self, point_words: Callable[[Vector], str], way_words: Callable[[Vector], str]) -> tuple[str, str]:
        """Return reason and remedy with places and directions in the words that two functions find for them."""
        values = (
            ("{at}", self.at, point_words),
            ("{way}", self.way, way_words),
            ("{change_at}", self.change_at, point_words),
        )
        why, remedy = self.why, self.remedy
        for key, value, words in values:
            if value is not None:
                why, remedy = why.replace(key, words(value)), remedy.replace(key, words(value))
        return why, remedy


@dataclass(frozen=True)
class SidePlan:
    """Fronts that together release every trapped piece, in opening order, or what is left without one."""

    fronts: tuple[Front, ...] = ()
    left: tuple[Unreleased, ...] = ()


def across(axis: Vector) -> np.ndarray:
    """Return the rows x, y, z of a right-handed frame whose z runs along a unit vector, (3, 3).

    For a horizontal axis x is horizontal and y points along the pull. A point p has the coordinates `across(axis) @ p`.

    >>> across((1.0, 0.0, 0.0)).round(6).tolist()
    [[0.0, 1.0, 0.0], [0.0, 0.0, 1.0], [1.0, 0.0, 0.0]]
    """
    z = np.asarray(axis, dtype=float)
    up = np.array([0.0, 0.0, 1.0]) if abs(z[2]) < 0.999 else np.array([0.0, 1.0, 0.0])
    x = np.cross(up, z)
    x /= np.linalg.norm(x)
    return np.vstack([x, np.cross(z, x), z]) + 0.0
