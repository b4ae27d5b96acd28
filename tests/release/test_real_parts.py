"""A few parts from real CAD systems: what synthetic solids do not have."""

import pytest

from moldgen.kernel.body import Body
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.place import to_mold
from moldgen.kernel.step_read import read_step
from moldgen.model.part import MoldFrame
from moldgen.release.frame import rotation_to_z
from moldgen.release.imprint import imprint_silhouettes
from moldgen.release.kinds import Kind, face_kinds
from moldgen.release.pull import search_pull
from moldgen.release.trapped import trapped_volume

pytestmark = pytest.mark.slow

PARTS = {"handheld_top": "z", "controller_base": "z", "slide_button": "y", "standoff_plate": "x", "thick_grip": "x"}
"""Part, and the axis along which its outside measure of undercut is least."""

RELEASE = ("handheld_top", "slide_button", "card_lid")
"""Parts that two halves mold."""


@pytest.fixture(scope="module")
def stood(real_parts):
    """Return a function that reads a part and stands it on an axis."""
    solids = {}

    def stand(name, axis):
        if name not in solids:
            solids[name] = read_step(real_parts / f"{name}.step", find_crossings=False).solid
        direction = tuple(float(c == axis) for c in "xyz")
        frame = MoldFrame((1.0, 1.0, 1.0), (0.0, 0.0, 0.0), rotation_to_z(direction))
        return Body(to_mold(solids[name], frame))

    return stand


@pytest.mark.parametrize("name", PARTS)
def test_imprint_leaves_no_straddling_face_and_no_other_volume(stood, name):
    before = stood(name, PARTS[name])
    after, notes = imprint_silhouettes(before, face_kinds(before))
    assert len(face_kinds(after).numbers(Kind.STRADDLING)) == 0
    assert notes.findings == ()
    assert is_valid(after.solid)
    assert volume(after.solid) == pytest.approx(volume(before.solid), rel=5e-4)


@pytest.mark.parametrize("name", RELEASE)
def test_parts_made_by_two_halves_trap_nothing(stood, name):
    body = stood(name, "z" if name == "handheld_top" else "y")
    body, _ = imprint_silhouettes(body, face_kinds(body))
    assert trapped_volume(body, face_kinds(body)).undercuts == ()


def test_a_clip_that_needs_a_slide_is_found_trapped(stood):
    body = stood("latch_body", "z")
    body, _ = imprint_silhouettes(body, face_kinds(body))
    found = trapped_volume(body, face_kinds(body)).undercuts
    # three bores of diameter 4 across the pull, through walls of 2 mm
    assert [round(p.height_mm, 2) for p in found] == [4.0, 4.0, 4.0]
    assert [round(p.depth_mm, 2) for p in found] == [1.0, 1.0, 1.0]


@pytest.mark.parametrize("name", ["handheld_top", "controller_base"])
def test_pull_search_agrees_with_the_outside_measure(real_parts, name):
    solid = read_step(real_parts / f"{name}.step", find_crossings=False).solid
    direction = search_pull(Body(solid))[0].direction
    assert abs(direction["xyz".index(PARTS[name])]) == pytest.approx(1.0, abs=1e-9)
