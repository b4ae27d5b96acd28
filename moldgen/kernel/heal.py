"""Repair of what was read: closed, valid, outward, without hidden voids, and every change told with its volume."""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeSolid
from OCP.BRepCheck import BRepCheck_Analyzer, BRepCheck_NoError
from OCP.BRepClass3d import BRepClass3d
from OCP.BRepLib import BRepLib
from OCP.ShapeAnalysis import ShapeAnalysis_ShapeTolerance
from OCP.ShapeFix import ShapeFix_Shape
from OCP.TopAbs import TopAbs_EDGE, TopAbs_FACE, TopAbs_SHELL, TopAbs_VERTEX, TopAbs_WIRE
from OCP.TopExp import TopExp
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Shape, TopoDS_Solid

from moldgen.errors import PartError
from moldgen.kernel.guard import operation
from moldgen.kernel.heal_doubles import without_doubles
from moldgen.kernel.heal_splines import recognized
from moldgen.kernel.heal_tolerance import tightened
from moldgen.kernel.heal_touch import refuse_touching_itself, without_slits
from moldgen.kernel.measure import bounding_box, is_valid, volume
from moldgen.kernel.sew import close, open_edges
from moldgen.kernel.topology import compound_of, edge_points, edges_of, explore, faces_of, solids_of, vertex_point, walk
from moldgen.model.part import HealNote
from moldgen.tolerances import HEAL_VOLUME, MAX_EDGE_TOLERANCE, SHORT_EDGE

_REPAIR: Final = "repair the part in the CAD and export it again"

_EDGE_SAMPLES: Final = 5

_MOST_NAMED: Final = 5


class Healed(NamedTuple):
    """A sound solid, its volume (positive), and what was changed or is remarkable."""

    solid: TopoDS_Solid
    volume_mm3: float
    notes: tuple[HealNote, ...]


def heal(shape: TopoDS_Shape) -> Healed:
    """Return one closed, valid, outward solid made of `shape`.

    Parameters
    ----------
    shape : a solid, or the faces of a surface model

    Raises
    ------
    PartError : the faces enclose no volume, stay invalid, enclose hidden voids or several bodies, or repair would
        change the volume by more than `HEAL_VOLUME`; each with its place
    KernelError : the kernel threw
    """
    state = _closed(shape)
    before = abs(state.volume_mm3)
    for step in (_outward, _without_slits, _made_valid, _without_voids):
        state = step(state)
    solid, after, notes = state
    if not after > 0.0:
        raise PartError(f"the solid has no volume: {after:g} mm^3", where=_place(solid), remedy=_REPAIR)
    if abs(after - before) > HEAL_VOLUME * before:
        raise PartError(
            f"repair would change the volume from {before:.6g} to {after:.6g} mm^3, "
            f"by more than the {HEAL_VOLUME:.0e} of it that is allowed",
            where=_place(solid),
            remedy=_REPAIR,
        )
    refuse_touching_itself(solid)
    solid, after, plain = recognized(solid, after)
    return Healed(solid, after, (*notes, *plain, *_remarks(solid)))


def _measured(solid: TopoDS_Solid) -> float:
    with operation("measure the volume", operands=(solid,)):
        return volume(solid)


def _closed(shape: TopoDS_Shape) -> Healed:
    solids = solids_of(shape)
    faces = faces_of(shape)
    given = sum(1 for _ in walk(shape, TopAbs_FACE))
    if len(solids) == 1 and given == len(faces) and not open_edges(solids[0]):
        solid = TopoDS.Solid_s(solids[0])
        return Healed(solid, _measured(solid), ())
    with operation("look for faces given twice", operands=(shape,)):
        single = without_doubles(faces)
    solid, gap = close(compound_of(single))
    notes = [HealNote(f"open shell closed by sewing, gaps up to {gap:g} mm", len(faces_of(solid)), 0.0)]
    if given > len(single):
        notes.insert(0, HealNote("faces given twice, each kept once", given - len(single), 0.0))
    return Healed(solid, _measured(solid), tuple(notes))


def _outward(state: Healed) -> Healed:
    """Turn a solid whose faces look inward: the kernel gives it a negative volume."""
    if state.volume_mm3 >= 0.0:
        return state
    with operation("turn an inside-out solid", operands=(state.solid,)):
        maker = BRepBuilderAPI_MakeSolid()
        for shell in explore(state.solid, TopAbs_SHELL):
            maker.Add(TopoDS.Shell_s(shell))
        turned = maker.Solid()
        BRepLib.OrientClosedSolid_s(turned)
        if volume(turned) < 0.0:
            turned = TopoDS.Solid_s(state.solid.Reversed())
    now = _measured(turned)
    note = HealNote("inside-out solid turned", 1, now + state.volume_mm3)
    return Healed(turned, now, (*state.notes, note))


def _without_slits(state: Healed) -> Healed:
    solid, notes = without_slits(state.solid, state.volume_mm3)
    return Healed(solid, _measured(solid), (*state.notes, *notes)) if notes else state


def _made_valid(state: Healed) -> Healed:
    solid = state.solid
    with operation("check the solid", operands=(solid,)):
        if is_valid(solid):
            return state
        faults = _faults(solid)
    with operation("repair an invalid solid", operands=(solid,)):
        fixer = ShapeFix_Shape(solid)
        fixer.Perform()
        found = solids_of(fixer.Shape())
        sound = len(found) == 1 and is_valid(found[0]) and not open_edges(found[0])
        left = _faults(found[0]) if len(found) == 1 else faults
    if not sound:
        named = "; ".join(left[:5]) + (f" and {len(left) - 5} more" if len(left) > 5 else "")
        raise PartError(
            f"the solid is not valid and could not be repaired: {named}", where=_place(solid), remedy=_REPAIR
        )
    fixed = TopoDS.Solid_s(found[0])
    now = _measured(fixed)
    what = "invalid topology repaired: " + "; ".join(faults[:5])
    return Healed(fixed, now, (*state.notes, HealNote(what, len(faults), now - state.volume_mm3)))


def _faults(solid: TopoDS_Shape) -> list[str]:
    """Name what the kernel finds wrong, with its place."""
    analyzer = BRepCheck_Analyzer(solid)
    found: set[str] = set()
    for kind in (TopAbs_FACE, TopAbs_WIRE, TopAbs_EDGE, TopAbs_VERTEX, TopAbs_SHELL):
        for sub in explore(solid, kind):
            if analyzer.IsValid(sub):
                continue
            status = analyzer.Result(sub).Status().First()
            if status != BRepCheck_NoError:
                found.add(f"{status.name.removeprefix('BRepCheck_')} at {_place(sub)}")
    return sorted(found) or ["a fault the kernel does not name"]


def _without_voids(state: Healed) -> Healed:
    """Fill voids that no tool can reach if they are negligible; refuse larger ones, and separate bodies."""
    solid, whole = state.solid, state.volume_mm3
    shells = explore(solid, TopAbs_SHELL)
    if len(shells) == 1:
        return state
    with operation("look for hollow spaces", operands=(solid,)):
        outer = BRepClass3d.OuterShell_s(solid)
        others = [(volume(s), s) for s in shells if not s.IsSame(outer)]
        separate = [s for v, s in others if v > 0.0 or not _within(s, outer)]
    if separate:
        raise PartError(
            f"the solid consists of {1 + len(separate)} bodies that are not joined",
            where=_place(separate[0]),
            remedy="export them as solids of their own and choose one",
        )
    hollow = -sum(v for v, _ in others)
    if hollow > HEAL_VOLUME * whole:
        spaces = "; ".join(f"{-v:.6g} mm^3 at {_place(s)}" for v, s in others[:_MOST_NAMED])
        more = f" and {len(others) - _MOST_NAMED} more" if len(others) > _MOST_NAMED else ""
        raise PartError(
            f"the part is hollow: closed hollow spaces inside it: {len(others)}, of {hollow:.6g} mm^3 in all, more "
            f"than the {HEAL_VOLUME * whole:.3g} mm^3 that may be filled without asking ({spaces}{more}). No core "
            "reaches a closed space: it cannot be molded in one piece",
            where="; ".join(_place(s) for _, s in others[:_MOST_NAMED]),
            remedy="fill the space in the CAD, open it to one side for a core, or split the part and join the halves",
        )
    with operation("fill hollow spaces", operands=(solid,)):
        filled = BRepBuilderAPI_MakeSolid(outer).Solid()
        BRepLib.OrientClosedSolid_s(filled)
    note = HealNote("closed hollow spaces filled", len(others), hollow)
    return Healed(filled, _measured(filled), (*state.notes, note))


def _within(inner: TopoDS_Shape, outer: TopoDS_Shape) -> bool:
    """True when the vertices of a shell lie in the box of another: a reader may turn a second body inside out."""
    points = np.array([vertex_point(TopoDS.Vertex_s(v)) for v in explore(inner, TopAbs_VERTEX)])
    low, high = bounding_box(outer)
    return bool(np.all(points >= low) and np.all(points <= high))


def _remarks(solid: TopoDS_Solid) -> tuple[HealNote, ...]:
    """Tell what was left as it is but may trouble later steps."""
    notes = []
    short = [e for e in edges_of(solid) if not BRep_Tool.Degenerated_s(e) and _length(e) < SHORT_EDGE]
    if short:
        notes.append(HealNote(f"edges shorter than {SHORT_EDGE:g} mm, left as they are", len(short), 0.0))
    tiny = sum(_is_tiny(f) for f in faces_of(solid)) if short else 0
    if tiny:
        notes.append(HealNote(f"faces smaller than {SHORT_EDGE:g} mm, left as they are", tiny, 0.0))
    stated = ShapeAnalysis_ShapeTolerance().Tolerance(solid, 1)
    if stated <= MAX_EDGE_TOLERANCE:
        return tuple(notes)
    with operation("hold stated tolerances against true gaps", operands=(solid,)):
        tight, loose = tightened(solid)
    if tight:
        what = f"tolerances stated as up to {stated:.3g} mm, tightened to the true gaps"
        notes.append(HealNote(what, tight, 0.0))
    if loose:
        worst = ShapeAnalysis_ShapeTolerance().Tolerance(solid, 1)
        what = f"faces, edges or vertices looser than {MAX_EDGE_TOLERANCE:g} mm, up to {worst:.3g} mm"
        notes.append(HealNote(what, loose, 0.0))
    return tuple(notes)


def _length(edge: TopoDS_Edge) -> float:
    """Return the length of the edge's chord polygon [mm]: looked at closely only where its ends meet."""
    first, last = TopExp.FirstVertex_s(edge), TopExp.LastVertex_s(edge)
    if first.IsNull() or last.IsNull():
        return float("inf")
    chord = float(np.linalg.norm(vertex_point(first) - vertex_point(last)))
    if chord >= SHORT_EDGE:
        return chord
    return float(np.linalg.norm(np.diff(edge_points(edge, _EDGE_SAMPLES), axis=0), axis=1).sum())


def _is_tiny(face: TopoDS_Face) -> bool:
    return all(BRep_Tool.Degenerated_s(e) or _length(e) < SHORT_EDGE for e in edges_of(face))


def _place(shape: TopoDS_Shape) -> str:
    """Name a shape by the middle of its vertices."""
    points = [vertex_point(TopoDS.Vertex_s(v)) for v in explore(shape, TopAbs_VERTEX)]
    if not points:
        return ""
    x, y, z = np.mean(points, axis=0)
    return f"{x:.3f}, {y:.3f}, {z:.3f}"
