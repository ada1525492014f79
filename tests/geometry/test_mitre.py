import manifold3d
import numpy as np
import pytest
import trimesh
from hypothesis import given
from hypothesis import strategies as st

from cutblock.base.errors import GeometryError
from cutblock.geometry.mitre import _loops, cut_solid, cut_to_sides, side_corners
from cutblock.geometry.plan_clip import boundary_edges
from cutblock.geometry.solids import Mesh, mesh_volume, split_billet

SIZE = (1200.0, 1000.0, 500.0)
RECTANGLE = np.array([[150.0, 100.0], [1050.0, 100.0], [1050.0, 850.0], [150.0, 850.0]])


def slab(thickness, size=SIZE):
    """The lower half of a billet cut flat."""
    rail = np.array([[0.0, thickness], [size[0], thickness]])
    return split_billet(rail, rail, size, n_across=4)[0]


def wavy(seed):
    rng = np.random.default_rng(seed)
    x = np.linspace(0.0, SIZE[0], 31)
    phases = rng.uniform(0.0, 6.0, 2)
    near = np.column_stack([x, 240.0 + 60.0 * np.sin(x / 150.0 + phases[0])])
    far = np.column_stack([x, 260.0 + 70.0 * np.sin(x / 190.0 + phases[1])])
    return split_billet(near, far, SIZE, n_across=8, facet_mm=0.5)


def leaning(ring, z, degrees):
    """Planes through the edges of a counter-clockwise ring at a height, each leaning inwards below it by an angle."""
    corners = np.column_stack([ring, np.broadcast_to(z, len(ring))])
    chords = np.roll(corners, -1, axis=0) - corners
    level = np.column_stack([-chords[:, 1], chords[:, 0], np.zeros(len(ring))])
    level /= np.linalg.norm(level, axis=1, keepdims=True)
    # The steepest direction across the chord, upwards.
    up = np.cross(chords, level)
    up *= np.sign(up[:, 2:]) / np.linalg.norm(up, axis=1, keepdims=True)
    angles = np.radians(degrees)[:, None]
    normals = np.cos(angles) * level + np.sin(angles) * up
    return np.column_stack([normals, np.einsum("ij,ij->i", normals, corners)]), corners


def modelled(mesh):
    return manifold3d.Manifold(manifold3d.Mesh64(mesh.vertices, mesh.triangles.astype(np.uint64)))


def area(mesh):
    a, b, c = np.moveaxis(mesh.vertices[mesh.triangles], 1, 0)
    return np.linalg.norm(np.cross(b - a, c - a), axis=1).sum() / 2.0


def is_sound(mesh):
    """Closed and consistently wound for trimesh, a manifold for manifold3d, and no vertex to spare."""
    solid = trimesh.Trimesh(mesh.vertices, mesh.triangles, process=False)
    return (
        solid.is_watertight
        and solid.is_winding_consistent
        and modelled(mesh).status() == manifold3d.Error.NoError
        and len(np.unique(mesh.triangles)) == len(mesh.vertices)
    )


@given(degrees=st.lists(st.floats(-45.0, 45.0), min_size=4, max_size=4), thickness=st.floats(20.0, 140.0))
def test_a_flat_panel_with_leaning_sides_is_the_prismatoid_of_its_rectangles(degrees, thickness):
    """Prismatoid: h (A + 4 M + B) / 6 with the areas of both ends and of the middle, exact where sides are planes."""
    size = (2000.0, 2000.0, 500.0)
    ring = RECTANGLE + 300.0
    planes, corners = leaning(ring, thickness, np.array(degrees))

    cut = cut_to_sides(slab(thickness, size), planes, corners)

    south, east, north, west = np.tan(np.radians(degrees))

    def level(depth):
        return (900.0 - depth * (east + west)) * (750.0 - depth * (south + north))

    wanted = thickness * (level(0.0) + 4.0 * level(thickness / 2.0) + level(thickness)) / 6.0
    assert mesh_volume(cut) == pytest.approx(wanted, rel=1e-12)
    assert is_sound(cut)


@given(degrees=st.tuples(st.floats(-30.0, 30.0), st.floats(-30.0, 30.0)))
def test_a_hypar_with_two_leaning_sides_loses_the_wedges_under_its_edges(degrees):
    """Beside a straight edge of heights a to b over w, a plane that leans by t takes tan t w (a2 + a b + b2) / 6."""
    lower, _ = split_billet(*[np.array([[0.0, a], [1200.0, b]]) for a, b in ((310.0, 190.0), (190.0, 310.0))], SIZE)
    inner = np.array([[200.0, 0.0], [1000.0, 0.0], [1000.0, 1000.0], [200.0, 1000.0]])
    low, high = 290.0, 210.0  # of the edge at x = 200, y = 0 and 1000; the edge at x = 1000 runs the other way
    corners = np.column_stack([inner, [low, high, low, high]])
    planes, lost = [], 0.0
    for tangent, sign, start, rise in (
        (np.tan(np.radians(degrees[0])), 1.0, corners[0], high - low),
        (np.tan(np.radians(degrees[1])), -1.0, corners[1], low - high),
    ):
        normal = np.array([sign, -tangent * rise / 1000.0, tangent])
        normal /= np.linalg.norm(normal)
        planes.append((normal, float(normal @ start)))
        lost += tangent * 1000.0 * (low**2 + low * high + high**2) / 6.0

    cut = lower
    for normal, distance in planes:
        cut = cut_solid(cut, normal, distance)

    # Between the upright planes x = 200 and 1000 the hypar is 250 mm high in the mean.
    assert mesh_volume(cut) == pytest.approx(250.0 * 800.0 * 1000.0 - lost, rel=1e-9)
    assert is_sound(cut)


@given(
    seed=st.integers(0, 2**32 - 1),
    turns=st.lists(st.floats(-np.pi, np.pi), min_size=2, max_size=2),
    place=st.floats(-350.0, 350.0),
)
def test_any_plane_leaves_a_sound_solid_of_the_modellers_volume(seed, turns, place):
    """Cross-sections of wavy halves fall into several parts; manifold3d's trim_by_plane is the judge."""
    for half in wavy(seed):
        around, climb = turns[0], turns[1] / 2.0
        normal = np.array([np.cos(around) * np.cos(climb), np.sin(around) * np.cos(climb), np.sin(climb)])
        distance = float(normal @ [600.0, 500.0, 250.0]) + place

        cut = cut_solid(half, normal, distance)

        trimmed = modelled(half).trim_by_plane(tuple(normal), distance)
        wanted = trimmed.volume()
        assert len(boundary_edges(cut.triangles)) == 0
        found = mesh_volume(cut) if len(cut.triangles) else 0.0
        assert found == pytest.approx(wanted, rel=1e-9, abs=1e-3)
        assert found < 1.0 or is_sound(cut)
        # No facet of the section lies over another.
        assert found < 1.0 or area(cut) == pytest.approx(trimmed.surface_area(), rel=1e-6)


@given(seed=st.integers(0, 2**32 - 1), degrees=st.lists(st.floats(-35.0, 35.0), min_size=4, max_size=4))
def test_own_cuts_are_the_modellers_on_a_wavy_half(seed, degrees):
    for half in wavy(seed):
        planes, corners = leaning(RECTANGLE, [240.0, 270.0, 250.0, 230.0], np.array(degrees))

        own = cut_to_sides(half, planes, corners)

        trimmed = modelled(half)
        for *normal, distance in planes.tolist():
            trimmed = trimmed.trim_by_plane(normal, distance)
        assert mesh_volume(own) == pytest.approx(trimmed.volume(), rel=1e-9)
        assert is_sound(own)


@pytest.mark.parametrize("is_turned_over", [False, True])
@pytest.mark.parametrize("degrees", [20.0, -15.0])
def test_an_l_shape_with_leaning_sides_shrinks_by_its_girth_and_its_corners(degrees, is_turned_over):
    """Moved inwards by d, a shape of right angles loses girth d, gains d2 a corner and loses d2 a re-entrant one."""
    ring = np.array([[200, 200], [1000, 200], [1000, 500], [600, 500], [600, 800], [200, 800]], dtype=float)
    thickness = 120.0
    planes, corners = leaning(ring, thickness, np.full(6, degrees))
    if is_turned_over:
        planes, corners = planes[::-1], np.roll(corners[::-1], 1, axis=0)

    cut = cut_to_sides(slab(thickness), planes, corners)

    t = np.tan(np.radians(degrees))
    plan_area, girth = 800.0 * 300.0 + 400.0 * 300.0, 2.0 * (800.0 + 600.0)
    wanted = plan_area * thickness - girth * t * thickness**2 / 2.0 + 4.0 * t**2 * thickness**3 / 3.0
    assert mesh_volume(cut) == pytest.approx(wanted, rel=1e-9)
    assert is_sound(cut)


def test_a_plane_that_passes_a_solid_by_changes_nothing_and_one_before_it_leaves_nothing():
    half = slab(100.0)
    up = np.array([0.0, 0.0, 1.0])

    assert cut_solid(half, up, -5.0) is half
    for flush in (cut_solid(half, up, 0.0), cut_solid(half, -up, -100.0)):
        assert mesh_volume(flush) == pytest.approx(mesh_volume(half), rel=1e-12)
        assert is_sound(flush)
    assert len(cut_solid(half, up, 100.0).triangles) == 0
    assert len(cut_solid(half, up, 200.0).triangles) == 0


def test_sides_that_leave_nothing_or_meet_inside_the_foam_are_refused():
    planes, corners = leaning(RECTANGLE + 5000.0, 100.0, np.zeros(4))
    with pytest.raises(GeometryError, match="leave nothing"):
        cut_to_sides(slab(100.0), planes, corners)
    narrow = np.array([[200, 200], [1000, 200], [1000, 500], [240, 500], [240, 800], [200, 800]], dtype=float)
    planes, corners = leaning(narrow, 100.0, np.full(6, 30.0))
    with pytest.raises(GeometryError, match="meet before they have passed"):
        cut_to_sides(slab(100.0), planes, corners)


def test_the_corners_of_the_sides_move_with_the_height_and_parallel_sides_keep_theirs():
    ring = np.array([[0.0, 0.0], [400.0, 0.0], [900.0, 0.0], [900.0, 700.0], [0.0, 700.0]])
    planes, corners = leaning(ring, 100.0, np.full(5, 45.0))

    np.testing.assert_allclose(side_corners(planes, corners, 100.0), ring, atol=1e-9)
    inset = [[100.0, 100.0], [400.0, 100.0], [800.0, 100.0], [800.0, 600.0], [100.0, 600.0]]
    np.testing.assert_allclose(side_corners(planes, corners, 0.0), inset, atol=1e-9)


def test_rings_that_touch_in_a_vertex_are_taken_apart():
    """Two triangles that share vertex 2, walked backwards."""
    edges = np.array([[0, 1], [1, 2], [2, 0], [2, 3], [3, 4], [4, 2]])

    loops = [set(loop.tolist()) for loop in _loops(edges)]

    assert sorted(map(sorted, loops)) == [[0, 1, 2], [2, 3, 4]]
    assert all(len(loop) == 3 for loop in _loops(edges))


def test_a_mesh_without_a_section_gets_no_cap():
    empty = Mesh(np.zeros((0, 3)), np.zeros((0, 3), dtype=np.int64))

    assert len(cut_solid(empty, np.array([1.0, 0.0, 0.0]), 0.0).triangles) == 0
