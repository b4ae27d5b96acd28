"""Every demo of specs/ through the command line: issue 2, "Demos", and the contract of design, section 2."""

from __future__ import annotations

import json
import math
import re
import shutil
from collections import Counter
from pathlib import Path

import numpy as np
import pytest
from helpers.command import TESTS, moldgen
from helpers.outputs import PROOFS, Seen, gmsh_solids, manifest, products, snapshot, table, unproved
from helpers.round_holes import leaning_walls, round_walls

from moldgen.output.palette import ROLES

DEMOS = sorted(path.parent.name for path in TESTS.parent.glob("specs/*/spec.yaml"))

SIDE_ROLES = {"slide", "lifter", "side_core_pin", "angled_pin", "locking_block", "guide"}


def pictures(record: dict) -> set[str]:
    """The pictures that a tool of this manifest must have."""
    sides = any(c["role"] in SIDE_ROLES for c in record["components"])
    names = ("part", "closed", "open", "section", *(("half_open", "section_side") if sides else ()))
    return {f"pictures/{name}.png" for name in names}


def proofs(record: dict) -> list[str]:
    """The proofs that a tool of this manifest must have."""
    return PROOFS + ["the side actions move"] * any(c["role"] in SIDE_ROLES for c in record["components"])


pytestmark = [pytest.mark.slow, pytest.mark.parametrize("name", DEMOS)]


def test_it_builds_and_every_proof_holds(demo, name: str) -> None:
    done, folder = demo(name).done, demo(name).folder
    assert done.returncode == 0, done.stdout + done.stderr
    assert unproved(manifest(folder)) == []
    assert re.search(rf"^{name}: \d+ components, proved$", done.stdout, re.MULTILINE)
    assert "not for manufacture before qualified people" in " ".join(done.stdout.split())


def test_the_folder_and_the_manifest_keep_the_contract(demo, name: str) -> None:
    folder = demo(name).folder
    record, files = manifest(folder), snapshot(folder)
    parts = {f"step/{c['name'].replace(' ', '_')}.step" for c in record["components"]}
    expected = {"tool.step", "manifest.json", "parts_list.csv", "holes.csv", *parts, *pictures(record)}
    assert {path for path, data in files.items() if data is not None} == expected
    assert all(files[path].startswith(b"\x89PNG\r\n\x1a\n") and len(files[path]) > 10_000 for path in pictures(record))
    assert record["spec"]["path"] == "spec.yaml"
    assert record["part"].keys() >= {"name", "source_sha256", "volume_mm3", "area_mm2", "bounding_box_mm", "faces"}
    assert record["part"]["name"] == name
    assert record["shrink"].keys() >= {"x", "y", "z", "rule"}
    assert record["pull"].keys() >= {"direction", "how_chosen"}
    assert isinstance(record["timings_s"], dict)
    keys = {"name", "role", "file", "material", "volume_mm3", "position"}
    assert all(c.keys() >= keys and c["material"] and c["volume_mm3"] > 0 for c in record["components"])
    roles = Counter(c["role"] for c in record["components"])
    assert roles.keys() <= {"part", "cavity", "core", "core_pin", "ejector_pin", "sprue"} | SIDE_ROLES
    assert [roles[role] for role in ("part", "cavity", "core", "sprue")] == [1, 1, 1, 1]
    assert roles["ejector_pin"] >= 1
    assert [p["name"] for p in record["proofs"]] == proofs(record)
    assert all(p.keys() >= {"name", "passed", "figure", "limit", "unit"} for p in record["proofs"])
    fields = {"code", "severity", "message", "where", "value", "limit", "remedy"}
    assert all(f.keys() >= fields for f in record["findings"])
    assert all(f["severity"] != "failure" and f["remedy"] for f in record["findings"])
    assert all(q["source"] and q["provenance"] and q["unit"] for q in record["quantities"])


def test_gmsh_reads_the_volumes_the_places_and_the_colours_of_the_manifest(demo, name: str) -> None:
    folder = demo(name).folder
    record, tool = manifest(folder), gmsh_solids(folder / "tool.step")
    listed = [(c, place) for c in record["components"] for place in c["positions"]]
    assert [solid.name for solid in tool] == [c["name"] for c, _ in listed]
    # gmsh integrates as the kernel does by default: up to 0.9 % off on these two, whose faces have spline edges
    near = 1e-2 if name in ("mast-clip", "rain-funnel") else 1e-6
    alone: dict[str, Seen] = {}
    for component in record["components"]:
        (alone[component["name"]],) = gmsh_solids(folder / component["file"])
    for solid, (component, place) in zip(tool, listed, strict=True):
        assert solid.volume == pytest.approx(component["volume_mm3"], rel=near)
        assert alone[solid.name].volume == pytest.approx(component["volume_mm3"], rel=near)
        moved = np.subtract(solid.centre, alone[solid.name].centre)
        assert moved == pytest.approx(place, abs=1e-5), f"{solid.name} stands elsewhere"
        assert solid.colour == alone[solid.name].colour == pytest.approx(ROLES[component["role"]].colour, abs=1)
    volumes = {c["role"]: c["volume_mm3"] for c in record["components"]}
    factors = math.prod(record["shrink"][axis] for axis in "xyz")
    drawn = record["part"]["volume_mm3"] * factors
    assert volumes["part"] == pytest.approx(drawn, rel=2e-4 if near > 1e-6 else 1e-6)


def test_identical_components_share_one_definition(demo, name: str) -> None:
    folder = demo(name).folder
    record, step = manifest(folder), (folder / "tool.step").read_text(encoding="ascii")
    assert sorted(products(step)) == sorted(["tool", *(c["name"] for c in record["components"])])
    assert len(re.findall(r"= (?:MANIFOLD_SOLID_BREP|BREP_WITH_VOIDS)\(", step)) == len(record["components"])
    placed = len(re.findall(r"= NEXT_ASSEMBLY_USAGE_OCCURRENCE\(", step))
    assert placed == sum(len(c["positions"]) for c in record["components"])
    assert "AP242_MANAGED_MODEL_BASED_3D_ENGINEERING" in step
    assert ".MILLI.,.METRE." in step
    pins = [c for c in record["components"] if c["role"] in ("ejector_pin", "core_pin")]
    level = [(c["role"], round(c["volume_mm3"], 6)) for c in pins if not c["note"].startswith("tip cut")]
    assert len(set(level)) == len(level), "two definitions of one size"


def test_the_parts_list_lists_what_the_manifest_lists(demo, name: str) -> None:
    folder = demo(name).folder
    rows, components = table(folder / "parts_list.csv"), manifest(folder)["components"]
    assert [row["item"] for row in rows] == [str(i) for i in range(1, len(components) + 1)]
    for row, component in zip(rows, components, strict=True):
        assert {key: row[key] for key in ("name", "role", "material", "moves_with", "file", "note")} == {
            key: component[key] for key in ("name", "role", "material", "moves_with", "file", "note")
        }
        assert row["quantity"] == str(len(component["positions"]))


def test_every_hole_of_the_table_is_in_the_steel(demo, name: str) -> None:
    folder = demo(name).folder
    record, rows = manifest(folder), table(folder / "holes.csv")
    walls = {
        c["name"]: round_walls(folder / c["file"]) for c in record["components"] if c["role"] in ("cavity", "core")
    }
    assert rows
    for row in [row for row in rows if " leans " not in row["purpose"]]:
        x, y, low, high, diameter = (float(row[k]) for k in ("x_mm", "y_mm", "z_from_mm", "z_to_mm", "diameter_mm"))
        assert float(row["depth_mm"]) == pytest.approx(high - low, abs=2e-4)
        about = [w for w in walls[row["component"]] if math.dist((w.x, w.y), (x, y)) < 1e-3]
        # a tapered hole has its diameter at its wide end; a hole may end in a surface that leans or is stepped
        tapered = row["fit"].startswith("tapered")
        found = [w for w in about if w.has_diameter(diameter, low) or (tapered and w.has_diameter(diameter, high))]
        assert found, f"{row}: no round wall of this diameter on this axis, only {about}"
        at_part = 0.3 if row["fit"] == "H7" or row["purpose"] == "gate" else 0.01
        assert min(w.low for w in found) == pytest.approx(low, abs=at_part), row
        assert max(w.high for w in found) == pytest.approx(high, abs=at_part), row
    pins = [c for c in record["components"] if c["role"] in ("ejector_pin", "core_pin")]
    places = [place[:2] for c in pins for place in c["positions"]]
    for x, y in places:
        assert any(math.dist((x, y), (float(r["x_mm"]), float(r["y_mm"]))) < 1e-3 for r in rows), "a pin without a bore"


def test_every_leaning_hole_of_the_table_is_in_the_steel(demo, name: str) -> None:
    folder = demo(name).folder
    record = manifest(folder)
    files = {c["name"]: c["file"] for c in record["components"]}
    rows = [row for row in table(folder / "holes.csv") if " leans " in row["purpose"]]
    pins = [c for c in record["components"] if c["role"] in ("angled_pin", "lifter")]
    assert bool(rows) == bool(pins)
    for row in rows:
        if "of its outline" in row["purpose"]:
            continue  # the guide of a lifter is no round hole: the table gives the circle round it
        lean = float(re.search(r"leans ([\d.]+) deg", row["purpose"])[1])  # type: ignore[index]
        x, y, top, diameter = (float(row[k]) for k in ("x_mm", "y_mm", "z_to_mm", "diameter_mm"))
        found = [
            w
            for w in leaning_walls(folder / files[row["component"]])
            if abs(w.diameter - diameter) < 2e-4
            and abs(w.lean_deg - lean) < 0.01
            and math.dist(w.place(top), (x, y)) < 1e-3
        ]
        assert found, f"{row}: no such wall"


def test_the_folder_alone_proves_itself_again_in_a_fresh_process(demo, name: str, tmp_path: Path) -> None:
    shutil.copytree(demo(name).folder, tmp_path / "sent on")
    shutil.rmtree(tmp_path / "sent on" / "pictures")
    done = moldgen("prove", "sent on", "--json", "--quiet", folder=tmp_path, timeout=180)
    result = json.loads(done.stdout)
    assert (done.returncode, result["findings"]) == (0, [])
    assert [(p["name"], p["passed"]) for p in result["proofs"]] == [
        (proof, True) for proof in proofs(manifest(demo(name).folder))
    ]
