"""The review says what was found, in part coordinates."""

import pytest

from moldgen.canon import to_json
from moldgen.finding import Severity
from moldgen.kernel.body import Body
from moldgen.model.part import MoldFrame
from moldgen.release.contact import vertical_contact
from moldgen.release.kinds import face_kinds
from moldgen.release.review import review_release
from moldgen.release.trapped import trapped_volume

from .shapes import box, cut

FRAME = MoldFrame((1.0, 1.0, 1.0), (0.0, 0.0, 0.0), ((0.0, 1.0, 0.0), (0.0, 0.0, 1.0), (1.0, 0.0, 0.0)))
"""The pull is +x of the part."""


def review(solid, required=1.0, frame=None):
    body = Body(solid)
    kinds = face_kinds(body)
    trapped = trapped_volume(body, kinds)
    return review_release(body, kinds, trapped, required, contact=vertical_contact(body, kinds), frame=frame)


def test_counts_and_areas_add_up_to_the_surface():
    found, _ = review(box((0, 0, 0), (10, 20, 30)))
    surface = 2 * (200 + 300 + 600)
    assert {k.kind: k.count for k in found.faces} == {"upper": 1, "lower": 1, "vertical": 4, "straddling": 0}
    assert sum(k.area_mm2 for k in found.faces) == pytest.approx(surface)
    assert sum(k.area_mm2 for k in found.halves) == pytest.approx(surface)
    assert found.releases


def test_draft_findings_come_with_the_summary():
    found, notes = review(box((0, 0, 0), (10, 20, 30)))
    assert found.draft.faces_below == 4
    assert found.draft.area_below_mm2 == pytest.approx(2 * (300 + 600))
    assert [f.code for f in notes.findings] == ["draft.too_small"] * 4


def test_undercut_is_a_failure_named_by_place_area_and_depth():
    found, notes = review(cut(box((0, 0, 0), (30, 20, 10)), box((-1, -1, 4), (31, 2.5, 7))), required=0.0, frame=FRAME)
    assert not found.releases
    (place,) = found.trapped
    (finding,) = notes.findings
    assert finding.code == "release.trapped"
    assert finding.severity is Severity.FAILURE
    assert "2.5 mm deep" in finding.message
    mold = FRAME.to_mold(finding.at)
    assert mold[2] in (pytest.approx(4.0), pytest.approx(7.0))
    assert place.at == finding.at
    assert f"{finding.at[0]:.2f}, {finding.at[1]:.2f}, {finding.at[2]:.2f}" in finding.where


def test_review_has_a_canonical_form_that_repeats():
    solid = cut(box((0, 0, 0), (30, 20, 10)), box((-1, -1, 4), (31, 2.5, 7)))
    assert to_json(review(solid)[0]) == to_json(review(solid)[0])
