"""Candidate levels, the half of each face by minimum cut, and splits that the parting line needs."""

import numpy as np
import pytest
from helpers import solids

from moldgen.kernel.body import Body
from moldgen.kernel.edge_split import split_edges
from moldgen.kernel.loops import boundary_loops
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.meshsolid import mesh_solid
from moldgen.kernel.patches import loop_points
from moldgen.parting.level import edges_on_outline, find_levels
from moldgen.parting.refine import closed_places, extreme_places, level_places, split_at_level, split_for_line
from moldgen.parting.sides import assign_sides
from moldgen.release.contact import vertical_contact
from moldgen.release.kinds import Kind, face_kinds

BLOCK = solids.box((0, 0, 0), (40, 30, 10))
HOOD = solids.cut(solids.cone(20, 18, 25), solids.cone(18, 16, 23))
FLANGED = solids.fuse(solids.cylinder(10, 30), solids.cone(18, 17, 4, at=(0, 0, 12)))


def known(solid):
    body = Body(solid)
    kinds = face_kinds(body)
    return body, kinds, vertical_contact(body, kinds), mesh_solid(body.mesh)


def sides(solid, level, costly=frozenset()):
    body, kinds, contact, _ = known(solid)
    return body, assign_sides(body, kinds, contact, level, costly)


def test_a_hood_is_parted_where_it_is_widest():
    body, kinds, _, part = known(HOOD)
    search = find_levels(body, kinds, part)
    assert search.levels == pytest.approx([0.0])
    # the rim of radius 20 lies between the lower rim face and the upper wall: counted twice
    assert search.lengths == pytest.approx([2 * 2 * np.pi * 20], rel=0.03)


def test_a_block_can_be_parted_at_both_ends():
    body, kinds, _, part = known(BLOCK)
    search = find_levels(body, kinds, part)
    assert sorted(search.levels) == pytest.approx([0.0, 10.0])
    assert search.lengths == pytest.approx([140.0, 140.0])


def test_levels_lie_exactly_on_their_edges():
    z = 4.000300007
    body, kinds, _, part = known(solids.shifted(HOOD, 0, 0, z))
    assert find_levels(body, kinds, part).levels == pytest.approx([z], abs=1e-12)


def test_a_part_without_level_edges_is_parted_in_its_middle():
    body, kinds, _, part = known(solids.turned(BLOCK, 20, about=(1, 2, 0)))
    search = find_levels(body, kinds, part)
    assert search.levels == pytest.approx([float(sum(b[2] for b in body.box)) / 2])


def test_only_edges_on_the_shadow_are_on_the_outline():
    body, _, _, part = known(FLANGED)
    on = edges_on_outline(body, part)
    radii = np.hypot(*body.edge_points[:, 0, :2].T)
    assert radii[on] == pytest.approx([18.0])
    assert (on == (radii > 17.5)).all()


@pytest.mark.parametrize("level", [0.0, 10.0])
def test_the_walls_of_a_block_go_to_the_half_that_keeps_the_line_level(level):
    body, result = sides(BLOCK, level)
    walls = np.isclose(body.face_heights[:, 0], 0) & np.isclose(body.face_heights[:, 1], 10)
    assert (result.cavity[walls] == (level == 0.0)).all()
    assert result.cavity[np.argmax(body.face_centres[:, 2])]
    assert not result.cavity[np.argmin(body.face_centres[:, 2])]
    assert result.torn == ()


def test_faces_that_look_along_the_pull_are_never_given_away():
    for level in (-50.0, 0.0, 12.0, 80.0):
        body, result = sides(HOOD, level)
        kinds = face_kinds(body)
        assert result.cavity[kinds.kind == Kind.UPPER].all()
        assert not result.cavity[kinds.kind == Kind.LOWER].any()


def test_a_wall_under_plastic_belongs_to_the_core_and_one_over_it_to_the_cavity():
    body, result = sides(FLANGED, 12.0)
    below = (
        (np.hypot(*body.face_places[:, :2].T) < 11) & (body.face_heights[:, 1] <= 12.01) & (body.face_heights[:, 0] < 1)
    )
    above = body.face_heights[:, 0] > 15.9
    assert not result.cavity[below].any()
    assert result.cavity[above].all()


def test_the_cost_does_not_depend_on_the_size_of_the_part():
    _, small = sides(HOOD, 3.0)
    _, large = sides(solids.grown(HOOD, 7.0), 21.0)
    assert large.cost == pytest.approx(small.cost, rel=1e-3)
    assert (large.cavity == small.cavity).all()


def test_a_line_along_a_costly_face_costs_more_and_is_left():
    body, cheap = sides(BLOCK, 5.0)  # either end is as good
    walls = [f for f in range(6) if np.isclose(body.face_heights[f], (0, 10)).all()]
    near = np.argmin if cheap.cavity[walls[0]] else np.argmax  # walls in the cavity: the line runs round the lower end
    _, dear = sides(BLOCK, 5.0, frozenset({int(near(body.face_centres[:, 2]))}))
    assert (dear.cavity[walls] != cheap.cavity[walls]).all()
    assert dear.cost == cheap.cost


def torn_part():
    """A wall with a ledge over one end of it and another under the other end."""
    return solids.fuse(
        solids.box((0, 0, 0), (40, 5, 20)), solids.box((0, 0, 15), (15, 12, 20)), solids.box((25, 0, 0), (40, 12, 5))
    )


def test_a_wall_with_plastic_above_and_below_is_told():
    body, result = sides(torn_part(), 10.0)
    (torn,) = result.torn
    assert body.face_centres[torn][1] == pytest.approx(5.0)


def test_a_deep_split_takes_a_torn_wall_apart():
    body, kinds, contact, part = known(torn_part())
    search = find_levels(body, kinds, part)
    split = split_at_level(body, kinds, contact, search, 10.0, all_faces=True)
    again = assign_sides(split, face_kinds(split), vertical_contact(split, face_kinds(split)), 10.0)
    assert again.torn == ()
    assert is_valid(split.solid)
    assert volume(split.solid) == pytest.approx(volume(torn_part()), rel=1e-9)


def test_only_walls_on_the_outline_are_split_at_first():
    tray = solids.cut(BLOCK, solids.box((10, 10, 2), (30, 20, 11)))
    body, kinds, contact, part = known(tray)
    search = find_levels(body, kinds, part)
    outside = split_at_level(body, kinds, contact, search, 4.0, all_faces=False)
    everything = split_at_level(body, kinds, contact, search, 4.0, all_faces=True)
    assert len(outside.faces) == len(body.faces) + 4
    assert len(everything.faces) == len(body.faces) + 8
    assert split_at_level(body, kinds, contact, search, 10.0, all_faces=True) is body


def test_closed_edges_are_split_only_where_their_loop_is_not_flat():
    bored = Body(solids.cut(solids.cylinder(10, 40), solids.cylinder(3, 30, at=(0, -15, 20), along=(0, 1, 0))))
    low = np.ptp(bored.face_heights, axis=1) < 7
    rounded = np.array([bored.surface_kind(f) == "cylinder" for f in range(len(bored.faces))])
    loops = boundary_loops(bored, low & rounded)
    split = split_edges(bored, closed_places(bored, loops))
    assert len(split.edges) == len(bored.edges) + 2 * sum(len(loop) == 1 for loop in loops)
    flat = Body(solids.cylinder(5, 3))
    rims = boundary_loops(flat, np.array([flat.surface_kind(f) == "cylinder" for f in range(3)]))
    assert closed_places(flat, rims) == {}


def test_extremes_and_crossings_become_vertices():
    body = Body(solids.turned(solids.cylinder(10, 4), 20, about=(1, 0, 0)))
    (loop,) = boundary_loops(body, np.arange(3) == int(np.argmax(body.face_centres[:, 2])))
    cornered = split_edges(body, extreme_places(body, loop))
    (loop,) = boundary_loops(cornered, np.arange(3) == int(np.argmax(cornered.face_centres[:, 2])))
    assert len(loop) == 4 + 1  # and where the circle began
    level = float(loop_points(loop, 8)[:, 2].mean()) + 1.0
    numbers = [cornered.edge_index.FindIndex(e) - 1 for e in loop]
    cut = split_edges(cornered, level_places(cornered, numbers, level))
    assert len(cut.edges) == len(cornered.edges) + 2
    assert level_places(cut, list(range(len(cut.edges))), 1000.0) == {}
    # both at once, from the whole circle: four corners, two crossings, and where the circle began
    (loop,) = boundary_loops(body, np.arange(3) == int(np.argmax(body.face_centres[:, 2])))
    assert len(split_for_line(body, [loop], 0, level).edges) == len(cut.edges)
    block = Body(solids.box((0, 0, 0), (40, 30, 10)))
    flat = boundary_loops(block, np.arange(6) == int(np.argmax(block.face_centres[:, 2])))
    assert split_for_line(block, flat, 0, 10.0) is block
