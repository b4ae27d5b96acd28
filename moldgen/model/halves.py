"""The two halves of the mold around one part, before anything is bored into them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from moldgen.model.part import Solid


@dataclass(frozen=True)
class Halves:
    """Cavity and core around the part, in the mold frame: pull along +z [mm].

    body : `moldgen.kernel.body.Body` of the part in the mold, shrink included, with every split of the parting line
    cavity_side : (f,) bool, True where the cavity half forms the face, False where the core half does
    level : height of the parting plane
    low, high : (3,) corners of the closed block
    parting_line : closed polylines (k, 3), the outer one first
    """

    cavity: Solid
    core: Solid
    body: Any
    cavity_side: np.ndarray
    level: float
    low: np.ndarray
    high: np.ndarray
    parting_line: tuple[np.ndarray, ...]
