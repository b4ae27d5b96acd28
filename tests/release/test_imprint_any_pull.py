"""Whatever the pull, a prepared body has faces that look one way only, and is the same body."""

import itertools

import numpy as np
import pytest
from helpers.curved import BODIES, PULLS, pulled_along
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.BRepBuilderAPI import BRepBuilderAPI_Copy
from OCP.BRepMesh import BRepMesh_IncrementalMesh
from OCP.BRepTools import BRepTools
from OCP.GCPnts import GCPnts_AbscissaPoint
from OCP.TopLoc import TopLoc_Location

from moldgen.flow.prepare import ready
from moldgen.kernel.body import Body
from moldgen.kernel.measure import is_valid, volume_adaptive
from moldgen.kernel.meshsolid import mesh_solid
from moldgen.kernel.slope import Slope
from moldgen.kernel.topology import faces_of
from moldgen.release.kinds import Kind, face_kinds

CASES = list(itertools.product(BODIES, range(len(PULLS))))
QUICK = [("egg", 1), ("elbow", 2), ("winding pipe", 1), ("twisted bar", 3)]

SETTLED = 0.005
"""Share by which two estimates of a length may differ and be one."""

ENOUGH = 2000
"""Facets of one face at least."""

ON_SILHOUETTE = 1e-3
"""|n.z| in the middle of an edge below which the edge is a silhouette; none of the bodies has another such edge."""


def facet_length(solid, straddling):
    """The length of n.z = 0 over facets: on each of them n.z is taken as linear between its corners.

    The facets that it crosses are quartered in the surface's parameters until the length settles: no root, no curve
    and no outline of ours takes part.
    """
    copy = BRepBuilderAPI_Copy(solid).Shape()
    BRepTools.Clean_s(copy)
    BRepMesh_IncrementalMesh(copy, 0.01, False, 0.1, False)
    faces = faces_of(copy)
    total = 0.0
    for face in (faces[i] for i in straddling):
        slope, mesh = Slope(face), BRep_Tool.Triangulation_s(face, TopLoc_Location())
        uv = np.array([mesh.UVNode(i).Coord() for i in range(1, mesh.NbNodes() + 1)])
        corners = uv[np.array([mesh.Triangle(i).Get() for i in range(1, mesh.NbTriangles() + 1)]) - 1]
        while len(corners) < ENOUGH:  # a ruled face has few facets, and a fold of the line between them goes unseen
            corners = _quartered(corners)
        found = _crossed(slope, corners)
        for _ in range(6):
            corners = _quartered(corners[found > 0.0])
            found, last = _crossed(slope, corners), found.sum()
            if abs(found.sum() - last) < SETTLED * last:
                break
        else:
            raise AssertionError("the estimate does not settle")
        total += float(found.sum())
    return total


def _quartered(corners):
    a, b, c = (corners[:, k] for k in range(3))
    ab, bc, ca = 0.5 * (a + b), 0.5 * (b + c), 0.5 * (c + a)
    return np.concatenate([np.stack(t, axis=1) for t in ((a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca))])


def _crossed(slope, corners):
    """The length of the level line in each facet, (t,)."""
    places, back = np.unique(corners.reshape(-1, 2), axis=0, return_inverse=True)
    level = np.array([slope(u, v) for u, v in places])[back].reshape(-1, 3)
    lengths = np.zeros(len(corners))
    for k in np.flatnonzero((level > 0.0).any(axis=1) & (level <= 0.0).any(axis=1)):
        points, ends = [slope.point(*p) for p in corners[k]], []
        for i, j in ((0, 1), (1, 2), (2, 0)):
            s, t = level[k, i], level[k, j]
            if (s > 0.0) != (t > 0.0):
                ends.append(points[i] + s / (s - t) * (points[j] - points[i]))
        lengths[k] = np.linalg.norm(ends[0] - ends[1])
    return lengths


def middle_slopes(body, edge, faces):
    """|n.z| of both faces at three places of an edge."""
    found = []
    for face in (body.faces[f] for f in faces):
        curve, slope = BRep_Tool.CurveOnSurface_s(edge, face, 0.0, 0.0), Slope(face)
        low, high = BRep_Tool.Range_s(edge)
        found += [abs(slope(*curve.Value(low + t * (high - low)).Coord())) for t in (0.3, 0.5, 0.7)]
    return np.array(found)


def silhouette_length(body):
    """The length of all edges between two faces that are both parallel to the pull along it.

    Their kinds are not asked: a face cut off narrower than the noise limit counts as vertical.
    """
    return sum(
        GCPnts_AbscissaPoint.Length_s(BRepAdaptor_Curve(edge))
        for edge, faces in zip(body.edges, body.edge_faces, strict=True)
        if middle_slopes(body, edge, faces).max() < ON_SILHOUETTE
    )


KNOWN = {
    ("lofted bar", 4): "a second branch about 1 mm long, across a corner of a ruled face between the nodes of its mesh",
    ("double cone", 0): "the edges are 7 % longer than the estimate; not explained yet",
}
"""Cases whose length disagrees, with what is known; they must go on failing until someone settles them."""


def check(name, pull):
    before = Body(pulled_along(BODIES[name](), PULLS[pull]))
    straddling = face_kinds(before).numbers(Kind.STRADDLING)
    after, notes = ready(before)
    assert len(face_kinds(after).numbers(Kind.STRADDLING)) == 0
    assert notes.findings == ()
    assert is_valid(after.solid)
    mesh_solid(after.mesh)
    assert volume_adaptive(after.solid, 1e-8) == pytest.approx(volume_adaptive(before.solid, 1e-8), rel=1e-6)
    expected = facet_length(before.solid, straddling)
    assert (expected > 0.0) == (len(straddling) > 0)
    assert silhouette_length(after) == pytest.approx(expected, rel=0.02, abs=0.05)


@pytest.mark.parametrize(("name", "pull"), QUICK)
def test_every_face_looks_one_way(name, pull):
    check(name, pull)


@pytest.mark.slow
@pytest.mark.parametrize(
    ("name", "pull"),
    [
        pytest.param(*c, marks=pytest.mark.xfail(strict=True, reason=KNOWN[c])) if c in KNOWN else c
        for c in CASES
        if c not in QUICK
    ],
)
def test_every_face_of_every_body_looks_one_way(name, pull):
    check(name, pull)
