"""Choose among many possible pins few that push close to what sticks, in the symmetry of the part."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from scipy.spatial import cKDTree
from scipy.spatial.distance import cdist

ALIKE: Final = 0.8
"""Share of the places whose mirror image must be as good for a part to count as symmetric."""

ROOM_ALIKE: Final = 0.35
"""mm: difference of room between a place and its image."""

PIN_COST: Final = 0.008
"""A pin is worth placing when it brings the distance to what sticks (root of the mean square) down by this share of
the part's diagonal."""

BALANCE: Final = 0.5
"""Weight of the distance between the middle of the pins and the centre of sticking, against the mean distance."""

ROUNDS: Final = 4
"""Passes of improving a choice one unit at a time."""


@dataclass(frozen=True)
class Load:
    """What is to be pushed: places (n, 2) [mm] with weights (n,), their centre (2,), and the part's diagonal [mm]."""

    places: np.ndarray
    weights: np.ndarray
    centre: np.ndarray
    diagonal: float


@dataclass(frozen=True)
class Counts:
    """How many pins there must be, and how many there may be."""

    least: int
    most: int


def gather(
    places: np.ndarray, weights: np.ndarray, diagonal: float, middle: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Return places (n, 2) and weights joined cell by cell of a grid about `middle`, so that few are left."""
    if len(places) == 0:
        return places, weights
    cell = max(diagonal / 20.0, 0.5)
    _, number = np.unique(np.round((places - middle) / cell).astype(int), axis=0, return_inverse=True)
    number = number.ravel()
    total = np.bincount(number, weights)
    x, y = (np.bincount(number, weights * places[:, k]) / np.maximum(total, 1e-30) for k in (0, 1))
    return np.column_stack([x, y]), total


def mirrors(places: np.ndarray, room: np.ndarray, middle: np.ndarray) -> list[np.ndarray]:
    """Return the mirrorings about the middle, as factors (2,) on x and y, under which the room is the same."""
    tree = cKDTree(places)
    good = room > 0.0
    found = [np.array([1.0, 1.0])]
    if not good.any():
        return found
    for factors in (np.array([-1.0, 1.0]), np.array([1.0, -1.0]), np.array([-1.0, -1.0])):
        gap, image = tree.query(middle + factors * (places[good] - middle))
        same = (gap < ROOM_ALIKE) & (np.abs(room[image] - room[good]) < ROOM_ALIKE)
        if same.mean() >= ALIKE:
            found.append(factors)
    return found


def units(places: np.ndarray, group: list[np.ndarray], middle: np.ndarray, apart: float) -> np.ndarray:
    """Return sets of places that go into one another under the mirrorings, each at least `apart` [mm] from the rest.

    (u, g) int, one row a set; a place that is its own image stands in its row more than once.
    """
    if len(places) == 0:
        return np.zeros((0, len(group)), dtype=int)
    tree = cKDTree(places)
    images = [tree.query(middle + factors * (places - middle)) for factors in group]
    whole = np.all([gap < ROOM_ALIKE for gap, _ in images], axis=0)
    rows = np.unique(np.sort(np.column_stack([number for _, number in images]), axis=1)[whole], axis=0)
    keep = np.ones(len(rows), dtype=bool)
    for i in range(len(group)):
        for j in range(i):
            gap = np.linalg.norm(places[rows[:, i]] - places[rows[:, j]], axis=1)
            keep &= (rows[:, i] == rows[:, j]) | (gap >= apart)
    return np.asarray(rows[keep])


class Choice:
    """Units chosen so far, over places (k, 2) [mm], pins `apart` from each other; `fixed` (g, 2) are there already."""

    def __init__(self, places: np.ndarray, sets: np.ndarray, load: Load, apart: float, fixed: np.ndarray) -> None:
        self._places, self._sets, self._load, self._fixed = places, sets, load, fixed
        first = np.column_stack([np.ones(len(sets), bool), np.diff(sets, axis=1) != 0])
        self._sizes = first.sum(axis=1)
        gap = cdist(places, load.places)
        self._reach = np.min([gap[column] for column in sets.T], axis=0)
        self._middles = (places[sets] * first[:, :, None]).sum(axis=1)
        # distances are compared as "less than": a place exactly `apart` away is free
        self._tree, self._within = cKDTree(places) if len(places) else None, float(np.nextafter(apart, 0.0))
        self._beside_fixed = self._beside(fixed)
        self._beside_unit: dict[int, np.ndarray] = {}
        self.chosen: list[int] = []

    def result(self) -> np.ndarray:
        """Return the chosen places, (n, 2) [mm]."""
        return np.asarray(self._places[np.unique(self._sets[self.chosen])])

    def search(self, counts: Counts) -> float:
        """Choose by greed, from two beginnings, then improve unit by unit; return the cost of the best choice [mm]."""
        results = []
        for by_pin in (False, True):
            self.chosen = []
            while self._grow(counts, by_pin):
                pass
            for _ in range(ROUNDS):
                if not (self._improve(counts) | self._prune(counts) | self._grow(counts, by_pin)):
                    break
            results.append((self.count() < counts.least, self.cost(), by_pin, self.chosen))
        self.chosen = min(results)[3]
        return self.cost()

    def cost(self) -> float:
        """Return the weighted mean distance to what sticks plus the terms for number and balance [mm]."""
        return float(
            self._costs(
                self.chosen, np.zeros((1, len(self._load.places))) + np.inf, np.zeros(1, int), np.zeros((1, 2))
            )[0]
        )

    def count(self) -> int:
        """Return the number of pins, with the fixed ones."""
        return len(self._fixed) + int(self._sizes[self.chosen].sum())

    def _grow(self, counts: Counts, by_pin: bool) -> bool:
        free = self._free(self.chosen, counts)
        if not free.any():
            return False
        costs = np.where(free, self._costs(self.chosen, self._reach, self._sizes, self._middles), np.inf)
        now = self.cost() if self.chosen or len(self._fixed) else 2.0 * self._load.diagonal
        gain = (now - costs) / (self._sizes if by_pin else 1.0)
        best = int(np.argmax(gain))
        if gain[best] <= 1e-9 and self.count() >= counts.least:
            return False
        self.chosen.append(best)
        return True

    def _improve(self, counts: Counts) -> bool:
        better = False
        for position in range(len(self.chosen)):
            rest = self.chosen[:position] + self.chosen[position + 1 :]
            size = len(self._fixed) + int(self._sizes[rest].sum())
            free = self._free(rest, counts) & (size + self._sizes >= counts.least)
            costs = np.where(free, self._costs(rest, self._reach, self._sizes, self._middles), np.inf)
            best = int(np.argmin(costs)) if len(costs) else -1
            if best >= 0 and costs[best] < self.cost() - 1e-6:
                self.chosen[position] = best
                better = True
        return better

    def _prune(self, counts: Counts) -> bool:
        """Leave out a unit that costs more than it brings."""
        for position, unit in enumerate(self.chosen):
            now, kept = self.cost(), self.chosen
            if self.count() - self._sizes[unit] < counts.least or len(kept) < 2:
                continue
            self.chosen = kept[:position] + kept[position + 1 :]
            if self.cost() < now - 1e-6:
                return True
            self.chosen = kept
        return False

    def _free(self, chosen: list[int], counts: Counts) -> np.ndarray:
        """Return which units keep their distance from the chosen ones and do not make too many, (u,) bool."""
        size = len(self._fixed) + int(self._sizes[chosen].sum())
        free = size + self._sizes <= counts.most
        near = self._beside_fixed.copy()
        for unit in chosen:
            if unit not in self._beside_unit:
                self._beside_unit[unit] = self._beside(self._places[np.unique(self._sets[unit])])
            near |= self._beside_unit[unit]
        return np.asarray(free & ~near[self._sets].any(axis=1))

    def _beside(self, taken: np.ndarray) -> np.ndarray:
        """Return which places are too near to one of those taken (t, 2), (k,) bool."""
        near = np.zeros(len(self._places), dtype=bool)
        if self._tree is not None and len(taken):
            near[np.concatenate([np.asarray(n, int) for n in self._tree.query_ball_point(taken, self._within)])] = True
        return near

    def _costs(self, chosen: list[int], reach: np.ndarray, sizes: np.ndarray, middles: np.ndarray) -> np.ndarray:
        """Return the cost of the chosen units together with each of the given ones."""
        load = self._load
        base = np.full(len(load.places), 2.0 * load.diagonal)
        if len(self._fixed):
            base = np.minimum(base, cdist(load.places, self._fixed).min(axis=1))
        if chosen:
            base = np.minimum(base, self._reach[chosen].min(axis=0))
        # by the square: what lies far from every pin counts most
        mean = np.sqrt((np.minimum(base, reach) ** 2 * load.weights).sum(axis=1) / load.weights.sum())
        number = len(self._fixed) + self._sizes[chosen].sum() + sizes
        total = self._fixed.sum(axis=0) + self._middles[chosen].sum(axis=0) + middles
        off = np.linalg.norm(total / np.maximum(number, 1)[:, None] - load.centre, axis=1)
        return np.asarray(mean + PIN_COST * load.diagonal * number + BALANCE * np.where(number > 0, off, 0.0))
