"""How much of an edge gate's mouth the part closes, by rays: the wall may be low, short, curved or leaning there."""

from __future__ import annotations

from typing import Final

import numpy as np

from moldgen.layout.view import PartView

ACROSS, UP = 9, 8
"""Rays across the mouth (odd) and up it, when the room for a gate is measured."""

FINE: Final = 12
"""Rays each way when the gate that was chosen is checked."""

START: Final = 0.5
"""mm: how far before the parting line a ray starts."""

ENTRY: Final = 0.4
"""mm: the part's side may lie this far before or behind the parting line within the mouth."""

STRAIGHT: Final = 0.2
"""mm: the part's side may bend this much over the width of the mouth."""

STEP: Final = 0.4
"""mm: a step of the part's side within the mouth that its melt cannot bridge."""

FAR: Final = 4.0
"""mm: a surface farther from the mouth is not the wall that the gate feeds."""


def room_for_gates(
    view: PartView, places: np.ndarray, inward: np.ndarray, wanted: np.ndarray, level: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Return the largest mouth that opens wholly into the part at each place, and whether the cavity holds it.

    Parameters
    ----------
    places : (k, 3) on the parting line [mm]; inward : (k, 2) unit vectors in plan
    wanted : (k, 2) width and depth asked for [mm]; level : (k, ACROSS) whether the parting line is level over the width

    Returns
    -------
    room : (k, 2) width and depth [mm], at most what is wanted, 0 where there is none
    above : (k,) bool, False where the gate must lie in the core half
    """
    over = _largest(_closed(view, places, inward, wanted, 1.0) & level[:, :, None])
    above = np.ones(len(places), dtype=bool)
    short = np.flatnonzero(over.prod(axis=1) < 1.0 - 1e-9)
    if len(short):
        under = _largest(_closed(view, places[short], inward[short], wanted[short], -1.0) & level[short][:, :, None])
        deeper = under.prod(axis=1) > over[short].prod(axis=1) + 1e-9
        over[short[deeper]] = under[deeper]
        above[short[deeper]] = False
    return over * wanted, above


def _closed(view: PartView, places: np.ndarray, inward: np.ndarray, wanted: np.ndarray, sign: float) -> np.ndarray:
    """Return which rays of each mouth meet the wall that the gate feeds, (k, ACROSS, UP) bool."""
    across = (np.arange(ACROSS) + 0.5) / ACROSS - 0.5
    up = (np.arange(UP) + 0.5) / UP
    behind = _behind(view, places, inward, (across, up), wanted * np.array([1.0, sign]), START)
    behind = np.where(np.isfinite(behind), behind, 10.0 * ENTRY)
    middle = behind[:, ACROSS // 2, None]
    return np.asarray((np.abs(middle) < ENTRY) & (np.abs(behind - middle) < STRAIGHT))


def _behind(
    view: PartView,
    places: np.ndarray,
    inward: np.ndarray,
    shares: tuple[np.ndarray, np.ndarray],
    size: np.ndarray,
    start: float,
) -> np.ndarray:
    """Return how far behind the parting line rays at shares of the mouth's width and depth meet the part, (k, a, u)."""
    way = np.column_stack([inward, np.zeros(len(inward))])
    side = np.column_stack([inward[:, 1], -inward[:, 0], np.zeros(len(inward))])
    origins = np.repeat((places - start * way)[:, None, None], len(shares[0]), axis=1)
    origins = origins + (shares[0] * size[:, :1])[:, :, None, None] * side[:, None, None]
    origins = np.repeat(origins, len(shares[1]), axis=2)
    origins[..., 2] += (shares[1] * size[:, 1:])[:, None]
    rays = np.broadcast_to(way[:, None, None], origins.shape).reshape(-1, 3)
    distance, _ = view.probe.first(origins.reshape(-1, 3), rays)
    return np.asarray(distance.reshape(origins.shape[:3]) - start)


def _largest(closed: np.ndarray) -> np.ndarray:
    """Return the largest part of each mouth, centered and from the parting plane up, as shares (k, 2) of its size."""
    middle = ACROSS // 2
    best, area = np.zeros((len(closed), 2)), np.zeros(len(closed))
    for half in range(middle + 1):
        column = np.asarray(closed[:, middle - half : middle + half + 1].all(axis=1))
        deep = np.where(column.all(axis=1), UP, column.argmin(axis=1))
        share = np.column_stack([np.full(len(closed), (2 * half + 1) / ACROSS), deep / UP])
        better = share.prod(axis=1) > area + 1e-12
        best[better], area[better] = share[better], share[better].prod(axis=1)
    return best


def open_share(view: PartView, places: np.ndarray, inward: np.ndarray, size: np.ndarray, start: float) -> np.ndarray:
    """Return the share of each mouth that opens into the wall that its gate feeds, (k,).

    Parameters
    ----------
    size : (k, 2) width and depth of the mouth [mm], the depth negative for a gate in the core half
    start : where the rays set out, before the parting line: in the runner [mm]
    """
    shares = 0.98 * np.linspace(-0.5, 0.5, FINE), np.linspace(0.01, 0.99, FINE)
    behind = _behind(view, places, inward, shares, size, start).reshape(len(places), -1)
    return np.array([_group(row) for row in behind])


def _group(behind: np.ndarray) -> float:
    """Return the share of rays that meet the wall nearest to the mouth, without a step to what lies behind it."""
    found = np.sort(behind[np.isfinite(behind) & (np.abs(behind) < FAR)])
    if len(found) == 0:
        return 0.0
    groups = np.split(found, np.flatnonzero(np.diff(found) > STEP) + 1)
    return len(min(groups, key=lambda g: float(np.abs(g).min()))) / len(behind)
