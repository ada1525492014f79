import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.base.errors import GeometryError
from cutblock.geometry import split_billet, volume_below
from cutblock.geometry.fan import fan_connectivity, fan_vertices, trim_rails
from cutblock.geometry.plan_clip import boundary_edges, clip
from cutblock.geometry.solids import Mesh, halves_over, joined, mesh_centre, mesh_volume
from cutblock.geometry.volume import volume_below_within

SIZE = (1200.0, 1000.0, 500.0)
BILLET = 1200.0 * 1000.0 * 500.0
HYPAR = np.array([[0.0, 310.0], [1200.0, 190.0]]), np.array([[0.0, 190.0], [1200.0, 310.0]])


def wavy_rails(seed, run_out=0.0, n=31):
    rng = np.random.default_rng(seed)
    phases = rng.uniform(0.0, 6.0, 2)
    skew = rng.uniform(-0.8, 0.8) * run_out
    x = np.linspace(-run_out, SIZE[0] + run_out, n)
    near = np.column_stack([x - skew, 240 + 60 * np.sin(x / 250 + phases[0])])
    far = np.column_stack([x + skew, 260 + 70 * np.sin(x / 310 + phases[1])])
    return near, far


def is_closed(mesh):
    edges = np.concatenate([mesh.triangles[:, [0, 1]], mesh.triangles[:, [1, 2]], mesh.triangles[:, [2, 0]]])
    keys = edges @ [len(mesh.vertices), 1]
    return len(boundary_edges(mesh.triangles)) == 0 and len(np.unique(keys)) == len(keys)


@given(seed=st.integers(0, 2**32 - 1), n_across=st.integers(1, 9))
def test_square_ended_halves_have_exactly_the_volume_of_the_closed_form(seed, n_across):
    near, far = wavy_rails(seed)

    lower, upper = split_billet(near, far, SIZE, n_across=n_across, facet_mm=5.0)

    assert mesh_volume(lower) == pytest.approx(volume_below(near, far, SIZE[1]), rel=1e-12)
    assert mesh_volume(lower) + mesh_volume(upper) == pytest.approx(BILLET, rel=1e-13)


@given(seed=st.integers(0, 2**32 - 1))
def test_halves_of_a_skewed_sheet_that_runs_out_are_closed_and_add_up(seed):
    near, far = wavy_rails(seed, run_out=120.0)

    lower, upper = split_billet(near, far, SIZE, n_across=8)

    assert is_closed(lower)
    assert is_closed(upper)
    assert mesh_volume(lower) == pytest.approx(volume_below_within(near, far, 1200.0, 1000.0), rel=1e-6)
    assert mesh_volume(lower) + mesh_volume(upper) == pytest.approx(BILLET, rel=1e-12)
    assert lower.vertices[:, :2].min(axis=0) == pytest.approx([0.0, 0.0], abs=1e-9)
    assert lower.vertices[:, :2].max(axis=0) == pytest.approx(SIZE[:2], abs=1e-9)


@given(
    seed=st.integers(0, 2**32 - 1),
    angles=st.lists(st.integers(0, 359), min_size=3, max_size=9, unique=True),
    is_clockwise=st.booleans(),
)
def test_halves_over_any_convex_outline_are_closed_and_hold_what_lies_under_it(seed, angles, is_clockwise):
    near, far = wavy_rails(seed, run_out=120.0)
    turns = np.radians(sorted(angles, reverse=is_clockwise))
    outline = np.column_stack([600.0 + 500.0 * np.cos(turns), 500.0 + 400.0 * np.sin(turns)])

    lower, upper = split_billet(near, far, SIZE, outline, n_across=12)

    below = volume_below_within(near, far, 1200.0, 1000.0, [outline])
    flat = np.array([[-9.0, 1.0], [1209.0, 1.0]])
    prism = 500.0 * volume_below_within(flat, flat, 1200.0, 1000.0, [outline])
    assert is_closed(lower)
    assert is_closed(upper)
    assert abs(mesh_volume(lower) - below) <= 0.01 * prism / 500.0  # the facet tolerance over the footprint
    assert mesh_volume(lower) + mesh_volume(upper) == pytest.approx(prism, rel=1e-8)


def test_an_outline_flush_with_the_billet_changes_nothing():
    near, far = wavy_rails(3, run_out=120.0)
    flush = np.array([[0.0, 0.0], [600.0, 0.0], [1200.0, 0.0], [1200.0, 1000.0], [0.0, 1000.0]])

    lower, _ = split_billet(near, far, SIZE, flush)

    assert is_closed(lower)
    assert mesh_volume(lower) == pytest.approx(mesh_volume(split_billet(near, far, SIZE)[0]), rel=1e-12)


def test_an_l_shaped_outline_holds_the_sum_of_its_two_rectangles():
    near, far = wavy_rails(4, run_out=120.0)
    shape = np.array([[0, 0], [1200, 0], [1200, 500], [600, 500], [600, 1000], [0, 1000]], dtype=float)
    parts = [
        np.array([[0, 0], [1200, 0], [1200, 500], [0, 500]], dtype=float),
        np.array([[0, 500], [600, 500], [600, 1000], [0, 1000]], dtype=float),
    ]

    halves = split_billet(near, far, SIZE, shape)

    for half in range(2):
        apart = sum(mesh_volume(split_billet(near, far, SIZE, part)[half]) for part in parts)
        assert mesh_volume(halves[half]) == pytest.approx(apart, rel=1e-7)
        assert is_closed(halves[half])


def test_a_hole_goes_through_both_halves():
    near, far = wavy_rails(5, run_out=120.0)
    outer = np.array([[0, 0], [1200, 0], [1200, 1000], [0, 1000]], dtype=float)
    hole = np.array([[300, 300], [300, 700], [700, 700], [700, 300]], dtype=float)

    halves = split_billet(near, far, SIZE, [outer, hole])

    plugs = split_billet(near, far, SIZE, hole)
    wholes = split_billet(near, far, SIZE)
    for half, plug, whole in zip(halves, plugs, wholes, strict=True):
        assert is_closed(half)
        assert mesh_volume(half) == pytest.approx(mesh_volume(whole) - mesh_volume(plug), rel=1e-7)


@pytest.mark.parametrize("outline", [None, np.array([[0, 0], [1000, 0], [200, 200], [0, 900]], dtype=float)])
def test_a_sheet_that_leaves_the_billet_is_refused(outline):
    near, far = HYPAR
    up = np.array([0.0, 280.0])

    with pytest.raises(GeometryError, match="leaves the billet"):
        split_billet(near - up, far - up, SIZE, outline)
    with pytest.raises(GeometryError, match="leaves the billet"):
        split_billet(near + up, far + up, SIZE, outline)


@pytest.mark.parametrize(
    "outline",
    [
        np.array([[2000, 0], [2100, 0], [2100, 100]], dtype=float),
        np.array([[2000, 0], [2100, 0], [2020, 20], [2000, 100]], dtype=float),
    ],
)
def test_an_outline_beside_the_billet_is_refused(outline):
    with pytest.raises(GeometryError, match="encloses nothing"):
        split_billet(*HYPAR, SIZE, outline)


def test_crossing_rails_are_refused():
    near = np.array([[0.0, 250.0], [700.0, 250.0], [600.0, 250.0], [1200.0, 250.0]])
    far = np.array([[0.0, 250.0], [400.0, 250.0], [800.0, 250.0], [1200.0, 250.0]])

    with pytest.raises(GeometryError, match="cross"):
        split_billet(near, far, SIZE)
    with pytest.raises(GeometryError, match="shape"):
        split_billet(*HYPAR, (1200.0, 1000.0))


@given(
    n=st.integers(3, 30),
    cuts=st.lists(st.tuples(st.floats(0, 6.28), st.floats(-0.4, 0.4)), max_size=4),
    hole=st.sets(st.integers(0, 400), max_size=40),
)
def test_the_edges_on_the_boundary_are_those_of_one_triangle_only(n, cuts, hole):
    triangles = fan_connectivity(n, n).triangles
    grid = np.stack(np.meshgrid(*[np.linspace(-1, 1, n)] * 2, indexing="ij"), axis=-1)
    vertices = fan_vertices(grid)
    for angle, distance in cuts:
        vertices, triangles = clip(vertices, triangles, np.array([np.cos(angle), np.sin(angle)]), distance)
    triangles = np.delete(triangles, [row for row in hole if row < len(triangles)], axis=0)

    found = {tuple(edge) for edge in boundary_edges(triangles).tolist()}

    edges = {tuple(edge) for row in triangles.tolist() for edge in zip(row, row[1:] + row[:1], strict=True)}
    assert found == {(start, end) for start, end in edges if (end, start) not in edges}


def test_rails_that_run_out_without_skew_are_ended_on_the_billet_and_stay_exact():
    near, far = wavy_rails(6, n=31)
    x = np.linspace(-113.0, 1290.0, 31)
    near, far = np.column_stack([x, near[:, 1]]), np.column_stack([x, far[:, 1]])

    lower, upper = split_billet(near, far, SIZE, facet_mm=5.0)

    assert is_closed(lower)
    assert mesh_volume(lower) == pytest.approx(volume_below_within(near, far, 1200.0, 1000.0), rel=1e-12)
    assert mesh_volume(lower) + mesh_volume(upper) == pytest.approx(BILLET, rel=1e-13)


@given(seed=st.integers(0, 2**32 - 1), offset=st.floats(-30.0, 30.0))
def test_a_face_off_the_sheet_is_the_same_over_convex_parts_and_over_their_union(seed, offset):
    near, far = wavy_rails(seed, run_out=120.0)
    shape = np.array([[0, 0], [1200, 0], [1200, 500], [600, 500], [600, 1000], [0, 1000]], dtype=float)
    parts = [
        np.array([[0, 0], [1200, 0], [1200, 500], [0, 500]], dtype=float),
        np.array([[0, 500], [600, 500], [600, 1000], [0, 1000]], dtype=float),
    ]

    below, above, face = halves_over(near, far, SIZE, [shape], (offset, -offset), facet_mm=0.1)

    apart = [halves_over(near, far, SIZE, [part], (offset, -offset), facet_mm=0.1) for part in parts]
    assert mesh_volume(below) == pytest.approx(sum(mesh_volume(half[0]) for half in apart), rel=1e-6)
    assert mesh_volume(above) == pytest.approx(sum(mesh_volume(half[1]) for half in apart), rel=1e-6)
    assert plan_area(face) == pytest.approx(900_000.0, rel=1e-9)
    assert plan_area(joined([half[2] for half in apart])) == pytest.approx(900_000.0, rel=1e-9)


def plan_area(mesh):
    a, b, c = np.moveaxis(mesh.vertices[mesh.triangles][..., :2], 1, 0)
    return ((b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0]).sum() / 2.0


def test_the_centre_of_a_wedge_is_that_of_a_prism_on_a_trapezium():
    """Centre of a trapezium a, b, base L: L (a + 2 b) / 3 (a + b) along it, (a2 + a b + b2) / 3 (a + b) above it."""
    rail = np.array([[0.0, 100.0], [1200.0, 400.0]])

    lower, _ = split_billet(rail, rail, SIZE)

    expected = [1200.0 * 900.0 / 1500.0, 500.0, (100.0**2 + 100.0 * 400.0 + 400.0**2) / 1500.0]
    np.testing.assert_allclose(mesh_centre(lower), expected, rtol=1e-12)
    aside = Mesh(lower.vertices + 1e6, lower.triangles)
    np.testing.assert_allclose(mesh_centre(aside), np.array(expected) + 1e6, rtol=1e-12)


def test_rails_trimmed_at_a_ruling_all_but_in_the_end_plane_still_run_forward():
    near = np.array([[-20.0, 250.0], [-1e-7, 250.0], [600.0, 250.0], [1220.0, 250.0]])
    far = np.array([[-20.0, 250.0], [1.5e-6, 250.0], [600.0, 250.0], [1220.0, 250.0]])

    trimmed = trim_rails(near, far, 1200.0)

    assert all((np.diff(rail[:, 0]) > 0.0).all() for rail in trimmed)
    assert trimmed[0][-1, 0] == trimmed[1][-1, 0] == 1200.0


@pytest.mark.parametrize("outline", [[], "abc", [[0.0, 0.0], [1.0]]])
def test_an_outline_that_is_no_ring_is_refused(outline):
    rail = [[0.0, 100.0], [600.0, 120.0]]
    with pytest.raises(GeometryError, match="outline"):
        split_billet(rail, rail, (600.0, 400.0, 300.0), outline)


@pytest.mark.parametrize(
    ("outline", "words"),
    [
        ([[0, 0], [1200, 1000], [1200, 0], [0, 1000]], "crosses itself"),
        ([[0, 0], [1e-9, 0], [0, 1e-9]], "encloses nothing"),
        ([[[0, 0], [1200, 0], [1200, 1000]], [[0, 900], [50, 900], [50, 950]]], "crosses itself"),
    ],
)
def test_an_outline_that_is_no_region_is_refused(outline, words):
    rail = np.array([[0.0, 200.0], [1200.0, 260.0]])
    with pytest.raises(GeometryError, match=words):
        split_billet(rail, rail, (1200, 1000, 500), outline)
