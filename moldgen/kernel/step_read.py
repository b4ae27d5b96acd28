"""Read one solid from a STEP file, in millimetres, healed, or say precisely why not."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import Final

import numpy as np
from OCP.Bnd import Bnd_Box
from OCP.BRep import BRep_Tool
from OCP.BRepBndLib import BRepBndLib
from OCP.BRepBuilderAPI import BRepBuilderAPI_Transform
from OCP.IFSelect import IFSelect_RetDone
from OCP.Interface import Interface_Static
from OCP.Message import Message_ProgressRange
from OCP.STEPCAFControl import STEPCAFControl_Reader
from OCP.TCollection import TCollection_ExtendedString
from OCP.TColStd import TColStd_SequenceOfAsciiString
from OCP.TDataStd import TDataStd_Name
from OCP.TDF import TDF_Label, TDF_LabelSequence
from OCP.TDocStd import TDocStd_Document
from OCP.TopAbs import TopAbs_FACE, TopAbs_SOLID
from OCP.TopExp import TopExp_Explorer
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS_Shape, TopoDS_Solid
from OCP.XCAFDoc import XCAFDoc_DocumentTool, XCAFDoc_ShapeTool

from moldgen.errors import PartError
from moldgen.kernel.crossing import crossings
from moldgen.kernel.guard import operation
from moldgen.kernel.heal import heal
from moldgen.kernel.heal_touch import joined
from moldgen.kernel.measure import bounding_box, volume
from moldgen.kernel.mesh import surface_mesh, tessellate
from moldgen.kernel.quiet import quiet
from moldgen.kernel.step_text import check_step_text
from moldgen.kernel.topology import compound_of, faces_of, vertex_point, vertices_of, walk
from moldgen.model.part import HealNote

SMALLEST_PART: Final = 0.5
LARGEST_PART: Final = 2500.0
"""Limits of the longest side of a part [mm]: beyond them the tolerances of this project lose their meaning, and the
file's unit is wrong more often than not (common practice: injection-molded parts lie well inside)."""

_MOST_LISTED: Final = 20
_NAMELESS: Final = ("Open CASCADE STEP translator", "NONE", "SOLID", "COMPOUND")
"""Names that programs write where they have none."""


@dataclass(frozen=True)
class ListedSolid:
    """One solid of the file: its number counts from 1 in the order of the file."""

    number: int
    name: str
    volume_mm3: float


@dataclass(frozen=True)
class ReadResult:
    """The chosen solid [mm] and where it came from.

    `schema` is AP203, AP214, AP242 or the schema's own name; `unit` is the length unit of the file.
    """

    solid: TopoDS_Solid
    volume_mm3: float
    name: str
    sha256: str
    solids: tuple[ListedSolid, ...]
    schema: str
    unit: str
    healed: tuple[HealNote, ...]


@dataclass(frozen=True)
class _Content:
    """Located solids with their names, faces that belong to no solid, and what the kernel says about the file.

    `products` counts the places of products that hold the solids.
    """

    solids: tuple[tuple[str, TopoDS_Shape], ...]
    products: int
    loose: tuple[TopoDS_Shape, ...]
    unit: str
    missing: int


def read_step(path: Path, choose: int | str | None = None, *, find_crossings: bool = True) -> ReadResult:
    """Read one solid of a STEP file (AP203, AP214, AP242; any length unit), in mm, assembly positions applied.

    Parameters
    ----------
    path : the file
    choose : number (from 1) or name of the solid; may be left out if the file has only one
    find_crossings : refuse a solid whose faces pass through each other; costs one mesh, which the solid keeps.
        `refuse_crossings` does the same later, on a mesh that is there anyway

    Raises
    ------
    PartError : see `check_step_text` and `heal`; also no solid, no or no such choice, too small, too large, crossing
    KernelError : the kernel threw
    """
    path = Path(path)
    text = check_step_text(path)
    try:
        with quiet():
            content = _transfer(path)
            content, joints, apart = _joined(content) if choose is None else (content, (), "")
            name, shape, listed = _pick(content, choose, apart)
            healed = heal(_bake(shape))
            check_size(healed.solid, f"check the length unit of the file (it says {content.unit or 'nothing'})")
            if find_crossings:
                refuse_crossings(healed.solid)
    except PartError as error:
        error.where = f"{path}: {error.where}" if error.where else str(path)
        raise
    notes = (*joints, *healed.notes)
    if content.missing:
        notes = (HealNote("references to entities that the file does not contain", content.missing, 0.0), *notes)
    if content.solids and content.loose:
        x, y, z = bounding_box(compound_of(content.loose))[0]
        what = f"loose surfaces beside the solid, left out: faces, the lowest corner at {x:.3f}, {y:.3f}, {z:.3f}"
        notes = (HealNote(what, len(content.loose), 0.0), *notes)
    listed = listed or (ListedSolid(1, name, healed.volume_mm3),)
    return ReadResult(
        healed.solid, healed.volume_mm3, name or path.stem, text.sha256, listed, text.schema, content.unit, notes
    )


def read_assembly(path: Path) -> tuple[tuple[str, TopoDS_Shape], ...]:
    """Return (product name, solid at its place [mm]) of every solid of a STEP file, in the file's order, unhealed.

    Raises
    ------
    PartError : the file is not sound STEP text, see `check_step_text`
    KernelError : the kernel threw
    """
    check_step_text(Path(path))
    with quiet():
        return _transfer(Path(path)).solids


def refuse_crossings(solid: TopoDS_Solid) -> None:
    """Pass if no two faces of the solid pass through each other by more than the mesh can tell.

    Raises
    ------
    PartError : they do; it names the place and the depth
    """
    with operation("look for faces that cross", operands=(solid,)):
        tessellate(solid)
        meshed = [f for f in faces_of(solid) if BRep_Tool.Triangulation_s(f, TopLoc_Location()) is not None]
        found = crossings(surface_mesh(meshed)) if meshed else ()
    if found:
        x, y, z = found[0].at
        raise PartError(
            f"the solid passes through itself at {len(found)} pairs of faces, by up to {found[0].depth_mm:.3g} mm",
            where=f"{x:.3f}, {y:.3f}, {z:.3f}",
            remedy="unite or separate the crossing features in the CAD",
        )


def check_size(solid: TopoDS_Solid, remedy: str) -> None:
    """Pass if the longest side of a part lies between `SMALLEST_PART` and `LARGEST_PART`.

    Raises
    ------
    PartError : it does not; `remedy` says what to do
    """
    with operation("measure the part", operands=(solid,)):
        longest = _longest_side(solid)
    if longest < SMALLEST_PART:
        raise PartError(
            f"the part is too small: {longest:.4g} mm on its longest side, at least {SMALLEST_PART:g} mm", remedy=remedy
        )
    if longest > LARGEST_PART:
        raise PartError(
            f"the part is too large: {longest:.6g} mm on its longest side, at most {LARGEST_PART:g} mm", remedy=remedy
        )


def _transfer(path: Path) -> _Content:
    """Let the kernel read the file and collect its solids."""
    document = TDocStd_Document(TCollection_ExtendedString("moldgen"))
    with operation("read the STEP file", where=str(path)):
        Interface_Static.SetCVal_s("xstep.cascade.unit", "MM")
        reader = STEPCAFControl_Reader()
        for set_mode in (reader.SetColorMode, reader.SetLayerMode, reader.SetPropsMode, reader.SetGDTMode):
            set_mode(False)
        if reader.ReadFile(str(path)) != IFSelect_RetDone:
            raise PartError("the kernel cannot read the file: its data section is damaged", remedy="export it again")
        missing = _missing_references(reader)
        reader.Transfer(document, Message_ProgressRange())
        tool = XCAFDoc_DocumentTool.ShapeTool_s(document.Main())
        roots = TDF_LabelSequence()
        tool.GetFreeShapes(roots)
        found: list[tuple[str, TopoDS_Shape]] = []
        loose: list[TopoDS_Shape] = []
        products = sum(
            _collect(reader, roots.Value(i), TopLoc_Location(), found, loose) for i in range(1, roots.Length() + 1)
        )
        return _Content(tuple(found), products, tuple(loose), _unit(reader), missing)


def _collect(
    reader: STEPCAFControl_Reader,
    label: TDF_Label,
    place: TopLoc_Location,
    found: list[tuple[str, TopoDS_Shape]],
    loose: list[TopoDS_Shape],
) -> int:
    """Walk the product tree: every occurrence of a product with geometry gives its solids, moved to their place.

    Returns how many occurrences hold solids.
    """
    if XCAFDoc_ShapeTool.IsAssembly_s(label):
        count, children = 0, TDF_LabelSequence()
        XCAFDoc_ShapeTool.GetComponents_s(label, children, False)
        for i in range(1, children.Length() + 1):
            product = TDF_Label()
            if XCAFDoc_ShapeTool.GetReferredShape_s(children.Value(i), product):
                there = place.Multiplied(XCAFDoc_ShapeTool.GetLocation_s(children.Value(i)))
                count += _collect(reader, product, there, found, loose)
        return count
    shape = XCAFDoc_ShapeTool.GetShape_s(label)
    solids = list(walk(shape, TopAbs_SOLID))
    for solid in solids:
        name = _name(label)
        if len(solids) > 1 or not name:
            name = _entity_name(reader, solid) or name
        found.append((name, solid.Moved(place)))
    sheets = TopExp_Explorer(shape, TopAbs_FACE, TopAbs_SOLID)  # faces that are not part of a solid
    while sheets.More():
        loose.append(sheets.Current().Moved(place))
        sheets.Next()
    return int(bool(solids))


def _name(label: TDF_Label) -> str:
    attribute = TDataStd_Name()
    if not label.FindAttribute(TDataStd_Name.GetID_s(), attribute):
        return ""
    name = attribute.Get().ToExtString().strip()
    return "" if name.startswith(_NAMELESS) else name


def _entity_name(reader: STEPCAFControl_Reader, solid: TopoDS_Shape) -> str:
    """Return the name that the file gives to the solid itself, for products that hold several."""
    entity = reader.Reader().WS().TransferReader().EntityFromShapeResult(solid, 1)
    text = entity.Name() if entity is not None and hasattr(entity, "Name") else None
    name = text.ToCString().strip() if text is not None else ""
    return "" if name.startswith(_NAMELESS) else name


def _unit(reader: STEPCAFControl_Reader) -> str:
    lengths, angles, solid_angles = (TColStd_SequenceOfAsciiString() for _ in range(3))
    reader.Reader().FileUnits(lengths, angles, solid_angles)
    names = sorted({lengths.Value(i).ToCString() for i in range(1, lengths.Size() + 1)})
    return " and ".join(n.lower() for n in names)


def _missing_references(reader: STEPCAFControl_Reader) -> int:
    checks = reader.Reader().WS().ModelCheckList(False)
    count = 0
    checks.Start()
    while checks.More():
        check = checks.Value()
        count += sum("nresolved reference" in check.CFail(i) for i in range(1, check.NbFails() + 1))
        checks.Next()
    return count


def _joined(content: _Content) -> tuple[_Content, tuple[HealNote, ...], str]:
    """Join the solids of one product where faces do it; else say why not. Solids of several products stay apart."""
    if len(content.solids) < 2 or content.products > 1:
        return content, (), ""
    whole, apart = joined([shape for _, shape in content.solids])
    if whole is None:
        return content, (), apart
    note = HealNote("bodies of one product that touch face to face joined", len(content.solids), 0.0)
    return replace(content, solids=((content.solids[0][0], whole),)), (note,), ""


def _pick(
    content: _Content, choose: int | str | None, apart: str = ""
) -> tuple[str, TopoDS_Shape, tuple[ListedSolid, ...]]:
    """Return name and shape of the chosen solid, and the list of all solids (empty if there is only one)."""
    if not content.solids:
        if not content.loose:
            raise PartError("the file holds neither solids nor surfaces", remedy="export the part as a solid")
        if choose is not None:
            raise PartError(f"solid {choose!r} was asked for, but the file holds only surfaces", remedy="leave it out")
        return "", compound_of(content.loose), ()
    if len(content.solids) == 1 and choose in (None, 1, content.solids[0][0]):
        return *content.solids[0], ()
    with operation("measure the solids of the file"):
        listed = tuple(
            ListedSolid(number, name, volume(shape)) for number, (name, shape) in enumerate(content.solids, start=1)
        )
    hits = _hits(listed, choose)
    if len(hits) != 1:
        if choose is None:
            what = f"the file holds {len(listed)} solids{', and ' * bool(apart)}{apart}"
        else:
            what = f"{len(hits)} solids are called {choose!r}" if hits else f"no solid {choose!r} in the file"
        raise PartError(f"{what}: {_list(listed)}", remedy="choose one by number or name, such as solid: 1")
    return *content.solids[hits[0] - 1], listed


def _hits(listed: tuple[ListedSolid, ...], choose: int | str | None) -> list[int]:
    """Return the numbers that a choice means: a number, a name, or the name in other letter case."""
    if choose is None or isinstance(choose, int):
        return [s.number for s in listed if choose in (None, s.number)]
    exact = [s.number for s in listed if s.name == choose]
    return exact or [s.number for s in listed if s.name.lower() == choose.lower()]


def _list(listed: tuple[ListedSolid, ...]) -> str:
    lines = [f"{s.number} {s.name or '(no name)'} ({s.volume_mm3:.6g} mm^3)" for s in listed[:_MOST_LISTED]]
    more = [f"and {len(listed) - _MOST_LISTED} more"] if len(listed) > _MOST_LISTED else []
    return ", ".join(lines + more)


def _bake(shape: TopoDS_Shape) -> TopoDS_Shape:
    """Return the shape with its position worked into the geometry: later steps need not care about locations."""
    location = shape.Location()
    if location.IsIdentity():
        return shape
    bare = shape.Located(TopLoc_Location())
    with operation("move the solid to its place in the assembly", operands=(shape,)):
        return BRepBuilderAPI_Transform(bare, location.Transformation(), True).Shape()


def _longest_side(solid: TopoDS_Solid) -> float:
    """Return the longest side, tight only near the limits: the tight box takes up to a second."""
    loose = Bnd_Box()
    BRepBndLib.Add_s(solid, loose, False)
    upper_bound = max(np.subtract(loose.CornerMax().Coord(), loose.CornerMin().Coord()))
    corners = [vertex_point(v) for v in vertices_of(solid)]
    lower_bound = np.ptp(corners, axis=0).max() if corners else 0.0
    if lower_bound >= SMALLEST_PART and upper_bound <= LARGEST_PART:
        return float(lower_bound)
    lower, upper = bounding_box(solid)
    return float(np.max(upper - lower))
