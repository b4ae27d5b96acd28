"""Curved bodies without trapped places part into two proved halves, whatever the pull."""

import pytest
from helpers.curved import BODIES, PULLS, pulled_along
from helpers.molding import mold, unproved

from moldgen.kernel.body import Body
from moldgen.release.imprint import imprint_silhouettes
from moldgen.release.kinds import face_kinds
from moldgen.release.trapped import trapped_volume

NOT_THERE = {"the ejectors move through their stroke"}
"""The halves alone have no ejectors, and a proof that has nothing to look at does not pass."""

CASES = [("egg", 1), ("ball", 0), ("ring", 3), ("rounded block", 1), ("winding pipe", 1), ("lofted bar", 3)]


@pytest.mark.slow
@pytest.mark.parametrize(("name", "pull"), CASES)
def test_halves_are_proved(name, pull):
    solid = pulled_along(BODIES[name](), PULLS[pull])
    body = Body(solid)
    body, _ = imprint_silhouettes(body, face_kinds(body))
    assert trapped_volume(body, face_kinds(body)).undercuts == ()
    made = mold(solid)
    assert set(unproved(made.bodies, made.claims)) == NOT_THERE
