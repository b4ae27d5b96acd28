"""Write an assembly again after something in it was changed: for planted faults."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
from OCP.gp import gp_Trsf
from OCP.IFSelect import IFSelect_RetDone
from OCP.STEPCAFControl import STEPCAFControl_Writer
from OCP.TCollection import TCollection_ExtendedString
from OCP.TDataStd import TDataStd_Name
from OCP.TDF import TDF_Label
from OCP.TDocStd import TDocStd_Document
from OCP.TopLoc import TopLoc_Location
from OCP.XCAFDoc import XCAFDoc_DocumentTool

from .reading import Placed


def write_tool(path: Path, placed: Sequence[Placed]) -> None:
    """Write components where they stand, each product once, with the names of both."""
    document = TDocStd_Document(TCollection_ExtendedString("BinXCAF"))
    shapes = XCAFDoc_DocumentTool.ShapeTool_s(document.Main())
    tool = shapes.NewShape()
    _call(tool, "tool")
    labels: dict[str, TDF_Label] = {}
    for body in placed:
        name = body.product.name
        if name not in labels:
            labels[name] = shapes.AddShape(body.product.shape, False)
            _call(labels[name], name)
        _call(shapes.AddComponent(tool, labels[name], TopLoc_Location(_placement(body.at))), body.name)
    shapes.UpdateAssemblies()
    writer = STEPCAFControl_Writer()
    assert writer.Transfer(document)
    assert writer.Write(str(path)) == IFSelect_RetDone


def _call(label: TDF_Label, name: str) -> None:
    TDataStd_Name.Set_s(label, TCollection_ExtendedString(name))


def _placement(at: np.ndarray) -> gp_Trsf:
    turn = gp_Trsf()
    turn.SetValues(*(float(v) for v in at.ravel()))
    return turn
