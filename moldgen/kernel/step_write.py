"""Write the tool and its components as STEP: names, colours, shared definitions, and the same bytes every time.

Curves on surfaces (pcurves) are left out: every reader derives them from the curves in space. Without them the files
are 2.6 times smaller and written twice as fast, and all of 48 real parts came back valid with their volume (measured).
"""

from __future__ import annotations

import io
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from types import MappingProxyType
from typing import Any, Final

from OCP.APIHeaderSection import APIHeaderSection_MakeHeader
from OCP.gp import gp_Trsf, gp_Vec
from OCP.Interface import Interface_Static
from OCP.Message import Message_ProgressRange
from OCP.STEPCAFControl import STEPCAFControl_Writer
from OCP.STEPControl import STEPControl_AsIs
from OCP.StepRepr import StepRepr_NextAssemblyUsageOccurrence
from OCP.TCollection import TCollection_ExtendedString, TCollection_HAsciiString
from OCP.TDataStd import TDataStd_Name
from OCP.TDF import TDF_Label
from OCP.TDocStd import TDocStd_Document
from OCP.TopLoc import TopLoc_Location
from OCP.XCAFDoc import XCAFDoc_DocumentTool

from moldgen import __version__
from moldgen.errors import KernelError, StageError
from moldgen.kernel.guard import operation
from moldgen.kernel.quiet import quiet
from moldgen.kernel.step_cut import StepAssembly
from moldgen.kernel.step_style import Rgb, Style, add_styles
from moldgen.kernel.topology import only_solid
from moldgen.model.tool import Component

SCHEMAS: Final = MappingProxyType({"ap242": 5, "ap214": 4})
"""The schemas offered, with the kernel's number of each."""

TIME_STAMP: Final = "1970-01-01T00:00:00"
"""The header must hold a time; a fixed one keeps the bytes the same on every run."""

GREY: Final[Rgb] = (200, 200, 200)
LONGEST_NAME: Final = 60
"""The kernel breaks longer text over lines, and readers stumble over a code that is broken in the middle."""

_OTHER: Final = re.compile("[\x80-\uffff]+|[\U00010000-\U0010ffff]+")
_NOISE: Final = re.compile(rb"(?<=[(,])-?\d\.\d*E-(?:1[3-9]|[2-9]\d|\d{3})(?=[,)])")


@dataclass(frozen=True)
class Looks:
    """Colour of each role (missing: grey), and how much light passes it (0 opaque, 1 invisible; missing: 0)."""

    colours: Mapping[str, Rgb]
    transparency: Mapping[str, float] = field(default_factory=dict)


class StepExport:
    """One tool, ready to be written as an assembly and component by component."""

    def __init__(
        self, components: Sequence[Component], looks: Looks, schema: str = "ap242", name: str = "tool"
    ) -> None:
        """Collect the components in one kernel document.

        Raises
        ------
        StageError : two components share a name, or the schema is unknown
        KernelError : a component is not one solid
        """
        if schema not in SCHEMAS:
            raise StageError(f"unknown STEP schema {schema!r}, not one of {', '.join(SCHEMAS)}")
        names = [c.name for c in components]
        if len(set(names)) != len(names):
            raise StageError(f"components share a name: {', '.join(sorted(n for n in names if names.count(n) > 1))}")
        self._schema, self._names = schema, names
        self._styles = [
            Style(looks.colours.get(c.role.value, GREY), looks.transparency.get(c.role.value, 0.0)) for c in components
        ]
        with operation("collect the components for STEP"):
            self._document = TDocStd_Document(TCollection_ExtendedString("moldgen"))
            self._shapes = XCAFDoc_DocumentTool.ShapeTool_s(self._document.Main())
            self._root = self._shapes.NewShape()
            _set_name(self._root, name)
            for component in components:
                self._add(component)
            self._shapes.UpdateAssemblies()

    def _add(self, component: Component) -> None:
        label = self._shapes.AddShape(only_solid(component.solid), False)
        _set_name(label, component.name)
        for number, position in enumerate(component.positions, start=1):
            move = gp_Trsf()
            move.SetTranslation(gp_Vec(*position))
            instance = self._shapes.AddComponent(self._root, label, TopLoc_Location(move))
            _set_name(instance, component.name if len(component.positions) == 1 else f"{component.name} {number}")

    def write_assembly(self, path: Path) -> None:
        """Write all components at all their positions.

        Raises
        ------
        KernelError : the kernel cannot translate them
        OSError : the file cannot be written
        """
        path.write_bytes(self._assembly.whole(step_text(path.name)))

    def write_component(self, name: str, path: Path) -> None:
        """Write the definition of one component, where it was built (its positions are not applied).

        Raises
        ------
        KernelError : the kernel cannot translate it
        OSError : the file cannot be written
        """
        path.write_bytes(self._assembly.product(self._names.index(name), step_text(path.name)))

    @cached_property
    def _assembly(self) -> StepAssembly:
        """The tool as STEP text, translated once: component files are cut out of it."""
        with quiet(), operation("write STEP", components=len(self._names)):
            writer = self._writer()
            if not writer.Transfer(self._root, STEPControl_AsIs, None, Message_ProgressRange()):
                raise KernelError("the kernel cannot translate the tool to STEP")
            model = writer.ChangeWriter().Model(False)
            _set_header(model)
            _number_instances(model)
            stream = io.BytesIO()
            writer.WriteStream(stream)
        return StepAssembly(add_styles(without_noise(stream.getvalue()), self._styles))

    def _writer(self) -> STEPCAFControl_Writer:
        STEPCAFControl_Writer()  # the settings below exist only once a writer was made
        Interface_Static.SetIVal_s("write.step.schema", SCHEMAS[self._schema])
        Interface_Static.SetCVal_s("write.step.unit", "MM")
        Interface_Static.SetIVal_s("write.surfacecurve.mode", 0)
        writer = STEPCAFControl_Writer()
        writer.SetNameMode(True)
        for set_mode in (
            writer.SetColorMode,
            writer.SetDimTolMode,
            writer.SetLayerMode,
            writer.SetPropsMode,
            writer.SetMaterialMode,
        ):
            set_mode(False)
        return writer


def without_noise(data: bytes) -> bytes:
    """Return STEP text in which numbers under 1e-13 are 0.

    Where vertices of a boolean coincide the kernel takes one of them, and which one depends on addresses in memory: the
    same feed had a coordinate of 2e-31 mm in half of the runs and 0 in the others.
    """
    return _NOISE.sub(b"0.", data)


def write_assembly(
    components: Sequence[Component], path: Path, looks: Looks, schema: str = "ap242", name: str = "tool"
) -> None:
    """Write components as one STEP assembly; see `StepExport`, which saves work when they are also written singly."""
    StepExport(components, looks, schema, name).write_assembly(path)


def write_component(component: Component, path: Path, looks: Looks, schema: str = "ap242") -> None:
    """Write the definition of one component as a STEP file of its own; see `StepExport`."""
    StepExport([component], looks, schema).write_component(component.name, path)


def step_text(text: str) -> str:
    """Return a name as it may stand in a STEP file: one short line, no backslash, other alphabets coded in ASCII.

    [published: ISO 10303-21, encoding of characters outside the basic alphabet]
    """
    line = " ".join("".join(c if c.isprintable() else " " for c in text.replace("\\", "/")).split())
    for length in range(len(line), 0, -1):
        coded = _OTHER.sub(_coded, line[:length].rstrip())
        if len(coded) <= LONGEST_NAME:
            return coded
    return ""


def _coded(run: re.Match[str]) -> str:
    characters = run.group()
    if ord(characters[0]) > 0xFFFF:
        return "\\X4\\" + "".join(f"{ord(c):08X}" for c in characters) + "\\X0\\"
    return "\\X2\\" + "".join(f"{ord(c):04X}" for c in characters) + "\\X0\\"


def _set_name(label: TDF_Label, name: str) -> None:
    TDataStd_Name.Set_s(label, TCollection_ExtendedString(step_text(name), True))


def _number_instances(model: Any) -> None:
    """Count the instances anew from 1: the kernel counts on through the life of the process."""
    count = 0
    for i in range(1, model.NbEntities() + 1):
        entity = model.Value(i)
        if isinstance(entity, StepRepr_NextAssemblyUsageOccurrence):
            count += 1
            entity.SetId(TCollection_HAsciiString(str(count)))


def _set_header(model: Any) -> None:
    header = APIHeaderSection_MakeHeader(model)
    us = TCollection_HAsciiString(f"moldgen {__version__}")
    nobody = TCollection_HAsciiString("")
    header.SetTimeStamp(TCollection_HAsciiString(TIME_STAMP))
    header.SetAuthorValue(1, nobody)
    header.SetOrganizationValue(1, nobody)
    header.SetAuthorisation(nobody)
    header.SetOriginatingSystem(us)
    header.SetDescriptionValue(1, TCollection_HAsciiString("injection mold layout"))
