"""The search: each trapped space gets the front that a toolmaker would like best, or is shared between several."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.mesh_prism import box_of
from moldgen.kernel.meshsolid import MeshSolid, thick_pieces, union
from moldgen.model.side_action import SideOptions
from moldgen.release.side_choice import Candidates, as_vector, candidates, sample, shares
from moldgen.release.side_front import Found, part_fronts, whole_front
from moldgen.release.side_lifter import Lifted, Lifting, collide
from moldgen.release.side_space import SideSpace, View
from moldgen.release.side_split import apart, middles_of, split_fronts, splits
from moldgen.release.trapped import TrapPiece
from moldgen.rules.pushing import ejection_stroke_pye

CLEAR_SHARE, SOME_SHARE = 0.97, 0.15
"""Share of rays that must be free before a direction is asked for a front for all, or for some, of a space."""

MOST_REST_LIFTERS = 2
"""Bound on the remains of one piece for which lifters are tried: each takes as long as several splits."""

ALIKE = 0.04
"""Ways whose shares of free rays differ by less count as alike, and the axes are tried first."""

OPENING_COST = 0.25
"""What one more direction costs, in part diagonals of steel reaching over the part: our choice."""

MOST_TRIED, MOST_LIFTERS, MOST_PARTIAL, DEEPEST, MOST_SPLITS = 8, 2, 4, 2, 12
"""Bounds of the search: directions tried for all of a space, for a lifter, for some of a space, how often a space is
split again, and how many splits are followed in all for one piece."""


PUSHED_ON = 10.0
"""How far [mm] the ejectors push on when the part is clear of the core, if the spec gives no stroke: the most that is
common practice (5 to 10 mm), since lifters then reach farther. Layout makes the stroke that lifters were made for."""


@dataclass
class Space:
    """A trapped space to be released, of one trapped piece or what is left of it (mold frame)."""

    piece: int
    solid: MeshSolid
    depth: int = 0
    tried: list[str] = field(default_factory=list)

    @cached_property
    def points(self) -> np.ndarray:
        """Points inside it, (k, 3) [mm]."""
        return sample(self.solid)


@dataclass(frozen=True)
class Placed:
    """A front, the numbers of the pieces that it was found for, and the space that it lets out (mold frame)."""

    found: Found | Lifted
    pieces: tuple[int, ...]
    covered: MeshSolid
    given: int = -1


class Search:
    """Finds fronts for spaces of one part, remembers what it knows of each direction."""

    def __init__(self, body: Body, part: MeshSolid, pieces: list[TrapPiece], options: SideOptions) -> None:
        self.options = options
        self.shared = SideSpace.of(body, part)
        self.directions: Candidates = candidates(body, pieces)
        self.diagonal, self.middles = body.diagonal, middles_of(body, pieces)
        self.tracer = self.shared.tracer
        self._views: dict[tuple[float, ...], View] = {}
        self._splits = self._rest_lifters = 0
        self._lifters: list[Lifted] = []
        self._slides: list[MeshSolid] = []
        height = float(body.box[1][2] - body.box[0][2])
        stroke = options.ejection_stroke or float(math.ceil(ejection_stroke_pye(height, PUSHED_ON)))
        self.lifting = Lifting(self.shared, stroke, self.tracer)
        self.used: list[np.ndarray] = []

    def view(self, direction: np.ndarray) -> View:
        """Return the part seen along a direction, made once."""
        key = tuple(np.round(direction, 9))
        if key not in self._views:
            self._views[key] = View(self.shared, as_vector(direction))
        return self._views[key]

    def free(self, space: Space, directions: np.ndarray) -> np.ndarray:
        """Return the share of a space that each direction lets out, by rays, (k,)."""
        return shares(self.tracer, space.points, directions)

    def place(self, spaces: list[Space]) -> tuple[list[Placed], list[Space]]:
        """Return fronts for the spaces, and the spaces that none was found for."""
        level = self.directions.level
        free = [self.free(s, level) for s in spaces]
        popular = np.array([max(1, sum(f[k] >= CLEAR_SHARE for f in free)) for k in range(len(level))])
        # those with the least choice first: the directions that they force are then in use for the others
        order = sorted(range(len(spaces)), key=lambda i: (int((free[i] >= CLEAR_SHARE).sum()), i))
        placed: list[Placed] = []
        left: list[Space] = []
        for i in order:
            ways = self._ranked(spaces[i], level, free[i], popular)
            found = self._whole(spaces[i], ways)
            if found is None:
                left.append(spaces[i])
            else:
                placed.append(of_space(found, spaces[i]))
        still: list[Space] = []
        for space in left:
            several = self._otherwise(space)
            if several is None:
                still.append(space)
            else:
                placed += several
                for front in several:
                    self.note(front)
        return placed, still

    def _otherwise(self, space: Space) -> list[Placed] | None:
        """Return what lets a space out that no slide square to the pull lets out whole: the next rungs, best first."""
        lifted = self._lifted(space) if self.options.lifters else None
        if lifted is not None:
            return [lifted]
        several = self._split(space)
        if several is None:
            self._splits = self._rest_lifters = 0
            several = self._shared_out(space)
        if several is None and self.options.inclined:
            free = self.free(space, self.directions.inclined)
            found = self._whole(space, self._ranked(space, self.directions.inclined, free, np.ones(len(free))))
            several = [of_space(found, space)] if found is not None else None
        return several

    def _split(self, space: Space) -> list[Placed] | None:
        """Return two slides that leave opposite ways and part along a plane through a space, or None."""
        for split in splits(space.points, self.middles, self.directions.level, self.tracer.blocked):
            ahead, behind = self.view(split.way), self.view(0.0 - split.way)
            for trial in (split, apart(ahead, split)):
                made, between = ([], []) if trial is None else split_fronts(ahead, behind, space.solid, trial)
                rest = self._all_whole(space, between) if made else None
                if rest is not None:
                    return [*(Placed(front, (space.piece,), half) for front, half in made), *rest]
            space.tried.append(f"split slides along {_words(split.way)} and back: no outline that can leave")
        return None

    def _lifted(self, space: Space) -> Placed | None:
        """Return a lifter for a space that meets no steel placed before it, or None."""
        ways = []
        for k, way in enumerate(self.directions.level):
            need = self.lifting.need(space.points, way)
            if need is not None:
                ways.append((round(need, 4), k))
        if not ways:
            space.tried.append("lifter: no level way within the stroke frees it")
        for need, k in sorted(ways)[:MOST_LIFTERS]:
            made = self.lifting.lifter(space.solid, self.directions.level[k], need)
            if isinstance(made, str):
                space.tried.append(f"lifter along {_words(self.directions.level[k])}: {made}")
            elif self.meets(made):
                space.tried.append(
                    f"lifter along {_words(self.directions.level[k])}: in the way of another side action"
                )
            else:
                return Placed(made, (space.piece,), space.solid)
        return None

    def meets(self, made: Lifted) -> bool:
        """Return whether a lifter meets steel that was placed before it."""
        if any(collide(made, other) for other in self._lifters):
            return True
        return any(thick_pieces(made.steel ^ body) for body in self._slides)

    def note(self, placed: Placed) -> None:
        """Remember a front: its direction is in use, its steel in the way of lifters."""
        if isinstance(placed.found, Lifted):
            self._lifters.append(placed.found)
            return
        self._slides.append(placed.found.steel())
        way = np.asarray(placed.found.view.direction)
        if all(float(way @ u) < 0.99999 for u in self.used):
            self.used.append(way)

    def _ranked(self, space: Space, ways: np.ndarray, free: np.ndarray, popular: np.ndarray) -> list[np.ndarray]:
        """Return the directions that seem to let all of a space out, cheapest first."""
        costs = []
        vertices = np.vstack(box_of(space.solid))
        for k in np.flatnonzero(free >= CLEAR_SHARE):
            way = ways[k]
            corners = np.array(
                [[vertices[i][0], vertices[j][1], vertices[m][2]] for i in (0, 1) for j in (0, 1) for m in (0, 1)]
            )
            reach = self.view(way).high - float((corners @ way).mean())
            in_use = any(float(way @ u) > 0.99999 for u in self.used)
            opening = 0.0 if in_use else OPENING_COST * self.diagonal / float(popular[k])
            costs.append((round(opening + 2.0 * reach, 4), int(k)))
        return [ways[k] for _, k in sorted(costs)]

    def _whole(self, space: Space, ways: list[np.ndarray]) -> Found | None:
        for way in ways[:MOST_TRIED]:
            found = whole_front(self.view(way), space.solid)
            if found is not None:
                self.note(of_space(found, space))
                return found
            space.tried.append(f"slide along {_words(way)}: no outline that can leave")
        return None

    def _shared_out(self, space: Space) -> list[Placed] | None:
        """Return fronts that together let a space out, or None."""
        level = self.directions.level
        free = self.free(space, level)
        in_use = np.array([any(float(way @ u) > 0.99999 for u in self.used) for way in level])
        order = sorted(
            (int(k) for k in np.flatnonzero(free >= SOME_SHARE)),
            key=lambda k: (-round((float(free[k]) + 0.1 * float(in_use[k])) / ALIKE), k),
        )
        for k in order[:MOST_PARTIAL]:
            self._splits += 1
            for found in part_fronts(self.view(level[k]), space.solid):
                self._splits += 1
                if self._splits > MOST_SPLITS:
                    return None
                rest = self._rest(space, found)
                if rest is not None:
                    return [of_space(found, space), *rest]
        return None

    def _rest(self, space: Space, found: Found) -> list[Placed] | None:
        """Return fronts for what a front leaves uncovered, or None if some of it stays trapped."""
        covered = float(space.solid.volume()) - sum(float(r.volume()) for r in found.rest)
        if covered < 0.05 * float(space.solid.volume()):
            return None
        placed: list[Placed] = []
        for solid in found.rest:
            part = Space(space.piece, solid, space.depth + 1)
            level = self.directions.level
            free = self.free(part, level)
            ways = self._ranked(part, level, free, np.ones(len(level)))
            whole = self._whole_quietly(part, ways)
            if whole is not None:
                placed.append(of_space(whole, part))
                continue
            several = self._split(part)
            if several is None and part.depth < DEEPEST:
                several = self._shared_out(part)
            if several is None and self.options.lifters and self._rest_lifters < MOST_REST_LIFTERS:
                self._rest_lifters += 1
                lifted = self._lifted(part)
                several = [lifted] if lifted is not None else None
            if several is None:
                return None
            placed += several
        return placed

    def _all_whole(self, space: Space, solids: list[MeshSolid]) -> list[Placed] | None:
        """Return a slide for each of some remains of a space, or None if one of them has none."""
        placed: list[Placed] = []
        for solid in solids:
            part = Space(space.piece, solid, space.depth + 1)
            level = self.directions.level
            ways = self._ranked(part, level, self.free(part, level), np.ones(len(level)))
            found = self._whole_quietly(part, ways)
            if found is None:
                return None
            placed.append(of_space(found, part))
        return placed

    def _whole_quietly(self, space: Space, ways: list[np.ndarray]) -> Found | None:
        for way in ways[: MOST_TRIED // 2]:
            found = whole_front(self.view(way), space.solid)
            if found is not None:
                return found
        return None


def of_space(found: Found | Lifted, space: Space, given: int = -1) -> Placed:
    """Return a front as that of a space; `given` is the number of its entry in the spec, -1 for none."""
    rest = union(list(found.rest)) if isinstance(found, Found) and found.rest else None
    return Placed(found, (space.piece,), space.solid if rest is None else space.solid - rest, given)


def _words(way: np.ndarray) -> str:
    x, y, z = (round(float(c), 3) + 0.0 for c in way)
    return f"{x:g}, {y:g}, {z:g}"
