"""A solid as another system will read it: written as STEP and read back at once."""

from __future__ import annotations

import tempfile
from pathlib import Path

from OCP.IFSelect import IFSelect_RetDone
from OCP.STEPControl import STEPControl_AsIs, STEPControl_Reader, STEPControl_Writer
from OCP.TopoDS import TopoDS_Shape

from moldgen.errors import KernelError
from moldgen.kernel.guard import operation
from moldgen.kernel.quiet import quiet
from moldgen.kernel.topology import only_solid


def read_back(solid: TopoDS_Shape) -> TopoDS_Shape:
    """Return a solid as it comes back from a STEP file: curves on surfaces are made anew there, and some break.

    Raises
    ------
    KernelError : it cannot be written, or comes back as something else than one solid
    """
    with operation("write a solid as STEP and read it back", operands=[solid]), tempfile.TemporaryDirectory() as folder:
        path = str(Path(folder) / "solid.step")
        with quiet():
            writer = STEPControl_Writer()
            writer.Transfer(solid, STEPControl_AsIs)
            written = writer.Write(path)
            reader = STEPControl_Reader()
            if written != IFSelect_RetDone or reader.ReadFile(path) != IFSelect_RetDone:
                raise KernelError("a solid cannot be written as STEP and read back")
            reader.TransferRoots()
        return only_solid(reader.OneShape())
