"""Volume, area, extent and validity of kernel shapes."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import NamedTuple

import numpy as np
from OCP.Bnd import Bnd_Box
from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.BRepBndLib import BRepBndLib
from OCP.BRepCheck import BRepCheck_Analyzer
from OCP.BRepGProp import BRepGProp
from OCP.GeomAbs import GeomAbs_Plane
from OCP.GProp import GProp_GProps
from OCP.TopAbs import TopAbs_FACE, TopAbs_REVERSED
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS, TopoDS_Shape

from moldgen.kernel.topology import compound_of, same_order, walk


def volume(shape: TopoDS_Shape) -> float:
    """Return the volume [mm^3] by the kernel's default integration (up to 3e-3 off on some spline faces)."""
    properties = GProp_GProps()
    BRepGProp.VolumeProperties_s(shape, properties)
    return float(properties.Mass())


def joint_volume(shapes: Sequence[TopoDS_Shape]) -> float:
    """Return the summed volume [mm^3] of solids that share walls, integrated about one common point.

    The default integration errs on spline faces, but by the same amount from both sides of a shared wall when the
    reference point is the same: in the sum of solids that fill a block the errors cancel.
    """
    return volume(compound_of(shapes))


def joint_volume_fine(shapes: Sequence[TopoDS_Shape], relative: float = 1e-9) -> float:
    """Return the same, with the area of plane faces integrated adaptively: for blocks whose walls have spline edges.

    By the divergence theorem a plane face contributes area x distance from the origin / 3; the other faces come in
    pairs that cancel.
    """
    planes, others = 0.0, []
    for face in walk(compound_of(shapes), TopAbs_FACE):
        surface = BRepAdaptor_Surface(TopoDS.Face_s(face))
        if surface.GetType() != GeomAbs_Plane:
            others.append(face)
            continue
        properties = GProp_GProps()
        BRepGProp.SurfaceProperties_s(face, properties, relative)
        position = surface.Plane().Position()
        normal = np.array(position.Direction().Coord()) * (1.0 if position.Direct() else -1.0)
        sign = -1.0 if face.Orientation() == TopAbs_REVERSED else 1.0
        planes += sign * float(normal @ np.array(position.Location().Coord())) * properties.Mass() / 3.0
    return planes + (volume(compound_of(others)) if others else 0.0)


def balance(
    shapes: Sequence[TopoDS_Shape],
    expected: float,
    limit: float,
    known: Callable[[], float] | None = None,
    quick: Callable[[], float] | None = None,
) -> float:
    """Return |sum of volumes - expected| / |expected| of solids that fill a block.

    The ways to the sum are tried from cheap to exact until one is below `limit`; the last one's figure stands. `known`
    is one more way, asked before the adaptive integration, which can take seconds; `quick` returns
    their `joint_volume` where that is being found elsewhere.
    """
    ways: list[Callable[[], float]] = [
        quick or (lambda: joint_volume(shapes)),
        lambda: joint_volume_fine(shapes),
    ]
    ways += [known] if known is not None else []
    ways.append(lambda: volume_adaptive(compound_of(shapes), 1e-7))
    found = float("inf")
    for way in ways:
        found = abs((way() - expected) / expected)
        if found < limit:
            break
    return found


def volume_adaptive(shape: TopoDS_Shape, relative: float = 1e-9) -> float:
    """Return the volume [mm^3] by adaptive Gauss-Kronrod integration: exact on splines, but up to a minute slow."""
    properties = GProp_GProps()
    BRepGProp.VolumePropertiesGK_s(shape, properties, relative, False, True, False, False, False)
    return float(properties.Mass())


def area(shape: TopoDS_Shape) -> float:
    """Return the surface area [mm^2]."""
    properties = GProp_GProps()
    BRepGProp.SurfaceProperties_s(shape, properties)
    return float(properties.Mass())


def centroid(shape: TopoDS_Shape) -> tuple[float, float, float]:
    """Return the centre of volume [mm]."""
    properties = GProp_GProps()
    BRepGProp.VolumeProperties_s(shape, properties)
    x, y, z = properties.CentreOfMass().Coord()
    return float(x), float(y), float(z)


def bounding_box(shape: TopoDS_Shape) -> tuple[np.ndarray, np.ndarray]:
    """Return the tight axis-parallel box, lower and upper corner, (3,), (3,) [mm]."""
    box = Bnd_Box()
    BRepBndLib.AddOptimal_s(shape, box, False, False)
    return np.array(box.CornerMin().Coord()), np.array(box.CornerMax().Coord())


def is_valid(shape: TopoDS_Shape) -> bool:
    """True when the kernel finds nothing wrong. It does not see faces that cross: never the only check."""
    return bool(BRepCheck_Analyzer(shape).IsValid())


class Answers(NamedTuple):
    """What the kernel says of a solid: is it valid, and its volume by default integration [mm^3]."""

    valid: bool
    volume_mm3: float


def kernel_answers(solids: Sequence[TopoDS_Shape]) -> list[Answers]:
    """Return the kernel's answers for each of some solids; copies of one at several places are checked once."""
    bare = [solid.Located(TopLoc_Location()) for solid in solids]
    known = same_order(bare)
    valid = {n: is_valid(known.FindKey(n)) for n in range(1, known.Extent() + 1)}
    return [Answers(valid[known.FindIndex(b)], volume(s)) for s, b in zip(solids, bare, strict=True)]
