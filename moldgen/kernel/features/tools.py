"""The steps a feature leaves behind: solids to add, cut or intersect, which patterns and mirrors can repeat."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from OCP.TopoDS import TopoDS_Shape

from moldgen.kernel.features.frame import Frame

Values = Mapping[str, Any]


@dataclass(frozen=True)
class Step:
    """One solid and what to do with it: add, cut, intersect, or new (start a body)."""

    mode: str
    body: str
    solid: TopoDS_Shape


@dataclass(frozen=True)
class Bench:
    """What a feature may look at while it makes its solids: the body it works on (None: not yet there)."""

    name: str
    body: TopoDS_Shape | None
    frame: Callable[[Mapping[str, Any]], Frame]


Maker = Callable[[Values, Bench], list[Step]]
