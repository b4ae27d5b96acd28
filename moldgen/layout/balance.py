"""How pins that move together share a force: statics of the rigid ejector plate."""

from __future__ import annotations

import numpy as np


def shares(places: np.ndarray, areas: np.ndarray, force: float, centre: np.ndarray) -> np.ndarray:
    """Return the force on each pin, (n,) [N].

    The forces add up to `force` at `centre` (2,) and spread as evenly over the pin faces as that allows (least sum of
    force^2 / area). Pins only push: one that would have to pull carries nothing. Where no pushing forces have that
    resultant, the nearest is taken.

    Parameters
    ----------
    places : (n, 2) [mm]
    areas : (n,) of the pin faces [mm^2]
    """
    count = len(places)
    if count == 0 or force <= 0.0:
        return np.zeros(count)
    active = np.ones(count, dtype=bool)
    result = np.zeros(count)
    for _ in range(count):
        x = places[active] - centre
        scale = max(float(np.abs(x).max()), 1.0)
        demand = np.vstack([np.ones(active.sum()), x.T / scale])
        root = np.sqrt(areas[active])
        spread = root * np.linalg.lstsq(demand * root, np.array([force, 0.0, 0.0]), rcond=1e-9)[0]
        result[:] = 0.0
        result[active] = spread
        if (spread >= -1e-9 * force).all():
            break
        active[np.flatnonzero(active)[spread < 0.0]] = False
    result = np.maximum(result, 0.0)
    total = result.sum()
    return np.asarray(result * (force / total) if total > 0.0 else force * areas / areas.sum())


def resultant(places: np.ndarray, forces: np.ndarray) -> np.ndarray:
    """Return where the sum of parallel forces acts, (2,) [mm]."""
    return np.asarray((places * forces[:, None]).sum(axis=0) / max(float(forces.sum()), 1e-30))
