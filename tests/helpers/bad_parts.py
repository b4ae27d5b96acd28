"""STEP files that are no parts: made by the kernel's plain writer, as other programs would make them."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

from OCP.BRep import BRep_Builder
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeEdge, BRepBuilderAPI_MakePolygon, BRepBuilderAPI_RightCorner
from OCP.BRepOffsetAPI import BRepOffsetAPI_MakePipeShell
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox
from OCP.gp import gp_Pnt
from OCP.STEPControl import STEPControl_AsIs, STEPControl_Writer
from OCP.TopoDS import TopoDS_Shell

from moldgen.kernel.quiet import quiet
from moldgen.kernel.topology import compound_of, faces_of


def write_step(shape: Any, path: Path) -> Path:
    """Write one shape."""
    with quiet():
        writer = STEPControl_Writer()
        writer.Transfer(shape, STEPControl_AsIs)
        writer.Write(str(path))
    return path


def block(x: float, y: float, z: float, at: tuple[float, float, float] = (0.0, 0.0, 0.0)) -> Any:
    """A block with its lower corner at `at` [mm]."""
    return BRepPrimAPI_MakeBox(gp_Pnt(*at), x, y, z).Solid()


def open_shell() -> Any:
    """A block 20 x 20 x 20 mm without its lid."""
    builder, shell = BRep_Builder(), TopoDS_Shell()
    builder.MakeShell(shell)
    for face in faces_of(block(20, 20, 20))[:5]:
        builder.Add(shell, face)
    return shell


def wire_only() -> Any:
    """One edge, no face at all."""
    return BRepBuilderAPI_MakeEdge(gp_Pnt(0, 0, 0), gp_Pnt(10, 0, 0)).Edge()


def self_crossing() -> Any:
    """A square bar along a path that crosses itself at 20, 0, 0: for the kernel, a valid solid."""
    path = BRepBuilderAPI_MakePolygon()
    for x, y in ((0, 0), (40, 0), (40, 20), (20, 20), (20, -20)):
        path.Add(gp_Pnt(x, y, 0))
    section = BRepBuilderAPI_MakePolygon(gp_Pnt(0, -2, -2), gp_Pnt(0, 2, -2), gp_Pnt(0, 2, 2), gp_Pnt(0, -2, 2), True)
    sweep = BRepOffsetAPI_MakePipeShell(path.Wire())
    sweep.SetTransitionMode(BRepBuilderAPI_RightCorner)
    sweep.Add(section.Wire())
    sweep.Build()
    sweep.MakeSolid()
    return sweep.Shape()


def _text(text: bytes) -> Callable[[Path], object]:
    return lambda path: path.write_bytes(text)


def _shape(make: Callable[[], Any]) -> Callable[[Path], object]:
    return lambda path: write_step(make(), path)


def _cut_short(path: Path) -> None:
    whole = write_step(block(10, 20, 30), path).read_bytes()
    path.write_bytes(whole[: len(whole) // 2])


def two_blocks() -> Any:
    """Two separate blocks of 6000 and 1000 mm^3."""
    return compound_of([block(10, 20, 30), block(10, 10, 10, at=(50, 0, 0))])


BAD_PARTS: dict[str, tuple[Callable[[Path], object], tuple[str, ...]]] = {
    "missing file": (lambda path: None, ("no such file", "check the path")),
    "empty file": (_text(b""), ("the file is empty", "export the part again")),
    "not STEP": (_text(b"solid lid\nfacet normal 0 0 1\n"), ("not a STEP file", "STL mesh")),
    "truncated": (_cut_short, ("cut short", "END-ISO-10303-21", "export the file again")),
    "no solid": (_shape(wire_only), ("neither solids nor surfaces", "as a solid")),
    "open shell": (_shape(open_shell), ("open", "20.0")),
    "two solids": (_shape(two_blocks), ("2 solids", "6000 mm^3", "1000 mm^3", "solid: 1")),
    "crosses itself": (_shape(self_crossing), ("pass through each other", "mm deep", "at 2", "repair")),
    "0.1 mm": (_shape(lambda: block(0.1, 0.08, 0.05)), ("too small: 0.1 mm", "at least 0.5 mm", "unit")),
    "3 m": (_shape(lambda: block(3000, 200, 100)), ("too large: 3000 mm", "at most 2500 mm", "unit")),
}
"""What is wrong -> (how to write the file, words that the message must hold)."""
