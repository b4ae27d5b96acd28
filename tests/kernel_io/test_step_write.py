"""Writing STEP: the same bytes in every process, and the same solids for every reader.

gmsh is the second reader. It is another program but rests on the same geometry kernel, so volumes are also compared
with triangle meshes measured by trimesh and manifold3d, which know nothing of that kernel.
"""

from __future__ import annotations

import math
import os
import re
import subprocess
import sys
from pathlib import Path

import manifold3d
import numpy as np
import pytest
import trimesh
from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut
from OCP.BRepBuilderAPI import BRepBuilderAPI_Transform
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox, BRepPrimAPI_MakeCone, BRepPrimAPI_MakeCylinder, BRepPrimAPI_MakeSphere
from OCP.gp import gp_Ax2, gp_Dir, gp_Pnt, gp_Trsf

import moldgen
from moldgen.errors import KernelError, StageError
from moldgen.kernel.measure import bounding_box, volume
from moldgen.kernel.mesh import surface_mesh, tessellate
from moldgen.kernel.step_read import read_step
from moldgen.kernel.step_write import Looks, StepExport, step_text, without_noise, write_assembly, write_component
from moldgen.kernel.topology import compound_of, faces_of, only_solid
from moldgen.model.tool import Component, Motion, Role

LOOKS = Looks({"part": (238, 136, 102), "cavity": (119, 170, 221)}, {"cavity": 0.5})

PIN_POSITIONS = ((10.0, 0.0, 0.0), (20.0, 5.0, 0.0), (30.0, 0.0, -4.0))


def components() -> list[Component]:
    return [
        Component("part", Role.PART, BRepPrimAPI_MakeCone(6, 3, 12).Solid(), "ABS", Motion.PART),
        Component("cavity", Role.CAVITY, BRepPrimAPI_MakeBox(10, 20, 30).Solid(), "1.2311", Motion.CAVITY_HALF),
        Component(
            "ejector pin 3",
            Role.EJECTOR_PIN,
            BRepPrimAPI_MakeCylinder(1.5, 40).Solid(),
            "1.2344",
            Motion.EJECTOR,
            PIN_POSITIONS,
        ),
    ]


VOLUMES = {"part": math.pi * 12 / 3 * 63, "cavity": 6000.0, "ejector pin 3": math.pi * 1.5**2 * 40}


@pytest.fixture(scope="module")
def files(tmp_path_factory):
    folder = tmp_path_factory.mktemp("export")
    export = StepExport(components(), LOOKS)
    export.write_assembly(folder / "tool.step")
    for component in components():
        export.write_component(component.name, folder / f"{component.name}.step")
    return folder


def test_what_was_written_is_read_back_at_every_position(files):
    found = [read_step(files / "tool.step", number) for number in range(1, 6)]
    assert [r.name for r in found] == ["part", "cavity"] + ["ejector pin 3"] * 3
    for read in found:
        assert read.volume_mm3 == pytest.approx(VOLUMES[read.name], rel=1e-9)
    for read, position in zip(found[2:], PIN_POSITIONS, strict=True):
        low, high = bounding_box(read.solid)
        assert (low + high) / 2 == pytest.approx(np.add(position, (0, 0, 20)), abs=1e-6)


def test_a_component_file_holds_its_definition_alone(files):
    read = read_step(files / "ejector pin 3.step")
    assert read.name == "ejector pin 3"
    assert len(read.solids) == 1
    assert bounding_box(read.solid)[0] == pytest.approx([-1.5, -1.5, 0], abs=1e-6)


def test_identical_components_share_one_definition_and_instances_are_numbered(files):
    text = (files / "tool.step").read_text()
    assert len(re.findall(r"= MANIFOLD_SOLID_BREP\(", text)) == 3
    instances = re.findall(r"NEXT_ASSEMBLY_USAGE_OCCURRENCE\('(\d+)',\s*'([^']*)'", text)
    assert instances == [
        ("1", "part"),
        ("2", "cavity"),
        ("3", "ejector pin 3 1"),
        ("4", "ejector pin 3 2"),
        ("5", "ejector pin 3 3"),
    ]


def test_one_solid_given_twice_is_refused(tmp_path):
    # the kernel makes one definition of it: the caller must say so by positions
    block = BRepPrimAPI_MakeBox(10, 20, 30).Solid()
    twice = [
        Component("part", Role.PART, block, "", Motion.PART),
        Component("cavity", Role.CAVITY, block, "", Motion.CAVITY_HALF, ((50.0, 0.0, 0.0),)),
    ]
    with pytest.raises(KernelError, match="1 solids instead of 2"):
        write_assembly(twice, tmp_path / "tool.step", LOOKS)


def test_faces_shared_between_solids_are_written_for_each(tmp_path):
    # Steel cut by a part keeps the part's faces, the same in memory; in the file each product owns its faces.
    part = BRepPrimAPI_MakeBox(gp_Pnt(5, 5, 5), 5, 5, 5).Solid()
    steel = only_solid(BRepAlgoAPI_Cut(BRepPrimAPI_MakeBox(20, 20, 10).Solid(), part).Shape())
    both = [
        Component("part", Role.PART, part, "ABS", Motion.PART),
        Component("core", Role.CORE, steel, "1.2311", Motion.CORE_HALF),
    ]
    export = StepExport(both, LOOKS)
    export.write_assembly(tmp_path / "tool.step")
    export.write_component("core", tmp_path / "core.step")
    assert len(re.findall(r"= ADVANCED_FACE\(", (tmp_path / "tool.step").read_text())) == 6 + 11
    assert len(re.findall(r"= ADVANCED_FACE\(", (tmp_path / "core.step").read_text())) == 11
    assert read_step(tmp_path / "core.step").volume_mm3 == pytest.approx(4000 - 125)


def test_header_units_and_schema(files, tmp_path):
    text = (files / "tool.step").read_text()
    header = text[: text.index("DATA;")]
    assert "moldgen" in header
    assert "1970-01-01T00:00:00" in header
    assert "AP242" in header
    assert "SI_UNIT(.MILLI.,.METRE.)" in text
    write_component(components()[0], tmp_path / "part.step", LOOKS, "ap214")
    assert "AUTOMOTIVE_DESIGN" in (tmp_path / "part.step").read_text()


def test_colours_and_transparency_by_role(files):
    # 238/255 = 0.933333, 119/255 = 0.466667; a role without a colour is grey (200/255 = 0.784314)
    text = (files / "tool.step").read_text()
    assert re.findall(r"COLOUR_RGB\('',([\d.,]+)\)", text) == [
        "0.933333,0.533333,0.400000",
        "0.466667,0.666667,0.866667",
        "0.784314,0.784314,0.784314",
    ]
    assert re.findall(r"SURFACE_STYLE_TRANSPARENT\(([\d.]+)\)", text) == ["0.500000"]


def test_the_second_reader_finds_the_same_volumes_names_and_colours(files):
    gmsh = pytest.importorskip("gmsh")
    gmsh.initialize(interruptible=False)
    try:
        gmsh.option.setNumber("General.Terminal", 0)
        solids = gmsh.model.occ.importShapes(str(files / "tool.step"))
        gmsh.model.occ.synchronize()
        assert [dim for dim, _ in solids] == [3] * 5
        for dim, tag in solids:
            name = gmsh.model.getEntityName(dim, tag).rpartition("/")[2]
            assert gmsh.model.occ.getMass(dim, tag) == pytest.approx(VOLUMES[name], rel=1e-6)
        assert gmsh.model.getColor(*solids[0])[:3] == (238, 136, 102)
    finally:
        gmsh.finalize()


@pytest.mark.parametrize("name", sorted(VOLUMES))
def test_meshes_measured_without_the_kernel_agree(files, name):
    # Chords of an arc of at most 0.02 rad enclose sin(0.02)/0.02 of its area: within 7e-5.
    solid = read_step(files / f"{name}.step", find_crossings=False).solid
    tessellate(solid, 0.001, 0.02)
    mesh = surface_mesh(faces_of(solid))
    tri = trimesh.Trimesh(mesh.vertices, mesh.triangles, process=False)
    assert tri.is_watertight
    assert tri.volume == pytest.approx(VOLUMES[name], rel=1e-3)
    solid3 = manifold3d.Manifold(manifold3d.Mesh64(mesh.vertices, mesh.triangles.astype(np.uint64)))
    assert solid3.status() == manifold3d.Error.NoError
    assert solid3.volume() == pytest.approx(tri.volume, rel=1e-9)


@pytest.mark.parametrize(
    ("shape", "entity"),
    [
        (BRepPrimAPI_MakeBox(10, 20, 30).Solid(), "PLANE"),
        (BRepPrimAPI_MakeCylinder(5, 20).Solid(), "CYLINDRICAL_SURFACE"),
        (BRepPrimAPI_MakeCone(6, 3, 12).Solid(), "CONICAL_SURFACE"),
        (BRepPrimAPI_MakeSphere(7).Solid(), "SPHERICAL_SURFACE"),
    ],
    ids=["plane", "cylinder", "cone", "sphere"],
)
def test_uniform_scaling_keeps_surfaces_analytic(tmp_path, shape, entity):
    # mold = part / (1 - S), S = 0.5 %: ISO 294-4 shrinkage as one factor for all axes
    grow = gp_Trsf()
    grow.SetScale(gp_Pnt(0, 0, 0), 1 / (1 - 0.005))
    scaled = BRepBuilderAPI_Transform(shape, grow, True).Shape()
    write_component(Component("part", Role.PART, scaled, "", Motion.PART), tmp_path / "part.step", LOOKS)
    text = (tmp_path / "part.step").read_text()
    assert f"= {entity}(" in text
    assert "B_SPLINE_SURFACE" not in text
    assert read_step(tmp_path / "part.step").volume_mm3 == pytest.approx(volume(shape) / 0.995**3, rel=1e-6)


# --- the same bytes -------------------------------------------------------------------------------------------------
SCRIPT = """
import sys
from pathlib import Path
sys.path.insert(0, {tests!r})
from test_step_write import LOOKS, components
from moldgen.kernel.step_write import StepExport, without_noise
for turn in range(2):  # the kernel counts on within a process: the second export must not differ either
    export = StepExport(components(), LOOKS)
    folder = Path({folder!r}) / str(turn)
    folder.mkdir(parents=True)
    export.write_assembly(folder / "tool.step")
    export.write_component("ejector pin 3", folder / "pin.step")
"""


def test_two_processes_and_two_runs_write_the_same_bytes(files, tmp_path):
    expected = (files / "tool.step").read_bytes(), (files / "ejector pin 3.step").read_bytes()
    for seed in ("1", "2"):
        code = SCRIPT.format(tests=str(Path(__file__).parent), folder=str(tmp_path / seed))
        environment = {**os.environ, "PYTHONHASHSEED": seed, "PYTHONPATH": str(Path(moldgen.__file__).parents[1])}
        subprocess.run([sys.executable, "-c", code], check=True, env=environment, cwd=tmp_path)
        for turn in ("0", "1"):
            folder = tmp_path / seed / turn
            assert (folder / "tool.step").read_bytes() == expected[0]
            assert (folder / "pin.step").read_bytes() == expected[1].replace(b"ejector pin 3.step", b"pin.step")


# --- names ----------------------------------------------------------------------------------------------------------
@pytest.mark.parametrize(
    ("name", "back"),
    [
        ('lid\'s "top"', 'lid\'s "top"'),
        ("Büchse 日本 😀", "Büchse 日本 😀"),
        ("a\\b;#12 = (x, y)", "a/b;#12 = (x, y)"),
        ("two\nlines\tand a tab", "two lines and a tab"),
        ("ü" * 200, "ü" * 13),  # 4 signs each and 8 around them: 60
        ("x" * 50 + "日本", "x" * 50),
        ("x" * 200, "x" * 60),
    ],
)
def test_odd_names_survive(tmp_path, name, back):
    write_component(Component(name, Role.PART, components()[0].solid, "", Motion.PART), tmp_path / "a.step", LOOKS)
    assert (tmp_path / "a.step").read_bytes().isascii()
    assert read_step(tmp_path / "a.step").name == back


def test_names_are_coded_as_the_standard_says():
    # ISO 10303-21: \X2\ with four hexadecimal digits a character, \X4\ with eight
    assert step_text("ä") == "\\X2\\00E4\\X0\\"
    assert step_text("\U0001f600") == "\\X4\\0001F600\\X0\\"


# --- refusals -------------------------------------------------------------------------------------------------------
def test_two_components_with_one_name_are_refused():
    pin = components()[2]
    with pytest.raises(StageError, match="ejector pin 3"):
        StepExport([pin, pin], LOOKS)


def test_an_unknown_schema_is_refused():
    with pytest.raises(StageError, match="ap203"):
        StepExport(components(), LOOKS, "ap203")


def test_a_component_of_two_solids_is_refused():
    two = compound_of(
        [
            BRepPrimAPI_MakeBox(1, 1, 1).Solid(),
            BRepPrimAPI_MakeCylinder(gp_Ax2(gp_Pnt(9, 9, 9), gp_Dir(0, 0, 1)), 1, 1).Solid(),
        ]
    )
    with pytest.raises(KernelError, match="one solid"):
        StepExport([Component("core", Role.CORE, two, "", Motion.CORE_HALF)], LOOKS)


def test_a_folder_that_is_not_there_is_an_os_error(tmp_path):
    with pytest.raises(FileNotFoundError):
        StepExport(components(), LOOKS).write_assembly(tmp_path / "none" / "tool.step")


def test_nothing_is_printed(tmp_path, capfd):
    StepExport(components(), LOOKS).write_assembly(tmp_path / "tool.step")
    assert capfd.readouterr() == ("", "")


def test_numbers_that_are_noise_are_written_as_zero() -> None:
    text = b"#1=CARTESIAN_POINT('',(1.972E-31,-8.88E-16,3.));#2=X(LENGTH_MEASURE(1.E-07),'(1.E-20 mm)',2.5E-12);"
    clean = b"#1=CARTESIAN_POINT('',(0.,0.,3.));#2=X(LENGTH_MEASURE(1.E-07),'(1.E-20 mm)',2.5E-12);"
    assert without_noise(text) == clean
