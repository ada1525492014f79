"""Volumes and solids against closed forms and independent solid modellers."""

from dataclasses import replace

import manifold3d
import numpy as np
import pytest
import trimesh
from kit.sample import sample_conditions, sample_job, sample_panel, sample_pieces, sample_sweep

from cutblock.geometry import split_billet, volume_below
from cutblock.geometry.solids import mesh_volume
from cutblock.geometry.volume import kerf_volume, sheet_area, volume_below_within
from cutblock.halves.footprints import find_footprints
from cutblock.halves.measure import measure_halves
from cutblock.halves.meshes import half_meshes

LITRE = 1e6
HYPAR = np.array([[0.0, 310.0], [1200.0, 190.0]]), np.array([[0.0, 190.0], [1200.0, 310.0]])
STEEP_HYPAR = np.array([[0.0, 370.0], [1200.0, 130.0]]), np.array([[0.0, 130.0], [1200.0, 370.0]])


def manifold(mesh):
    return manifold3d.Manifold(manifold3d.Mesh64(mesh.vertices, mesh.triangles.astype(np.uint64)))


def assert_both_judges_accept(mesh, volume_mm3, rel):
    judged = trimesh.Trimesh(mesh.vertices, mesh.triangles)
    assert judged.is_watertight
    assert judged.is_winding_consistent
    assert judged.volume == pytest.approx(volume_mm3, rel=rel)
    solid = manifold(mesh)
    assert solid.status() == manifold3d.Error.NoError
    assert solid.volume() == pytest.approx(volume_mm3, rel=rel)


def test_a_hypar_holds_the_mean_height_by_every_route():
    """The mean of a bilinear patch is the mean of its corners: 250 mm over 1.2 m2; trimesh and manifold3d as judges."""
    lower, upper = split_billet(*HYPAR, (1200.0, 1000.0, 500.0))

    assert volume_below(*HYPAR, 1000.0) == pytest.approx(300.0 * LITRE, rel=1e-14)
    assert_both_judges_accept(lower, 300.0 * LITRE, 1e-12)
    assert_both_judges_accept(upper, 300.0 * LITRE, 1e-12)


def test_a_conoid_holds_half_its_sine_arch():
    """Elementary integral: the straight edge at 100 mm, the other on a sine arch of 150 mm; 1.2 (100 + 150 / pi) L."""
    s = np.linspace(0.0, 1.0, 2001)
    near = np.column_stack([1200.0 * s, np.full_like(s, 100.0)])
    far = np.column_stack([1200.0 * s, 100.0 + 150.0 * np.sin(np.pi * s)])

    volume = volume_below(near, far, 1000.0)

    assert volume / LITRE == pytest.approx(1.2 * (100.0 + 150.0 / np.pi), rel=1e-6)
    assert volume / LITRE == pytest.approx(177.29576773, abs=5e-9)


def test_a_hyperboloid_cap_cut_along_its_rulings_holds_the_integral_of_its_height():
    """Hyperboloid of revolution x2 + z2 = R2 (1 + y2 / c2); its straight rulings x cos t + z sin t = R, y / c = tan.

    Reference: tensor Gauss integration of z - 2800 over the panel, 60 x 60 points.
    """
    radius, c, floor = 3000.0, 9000.0, 2800.0
    turns = np.linspace(-0.45, 0.45, 4001)  # of the waist point of each ruling; x rises with the turn
    waist = np.column_stack([radius * np.sin(turns), radius * np.cos(turns)])
    along = radius / c * np.column_stack([np.cos(turns), -np.sin(turns)])
    near = waist - 500.0 * along + [600.0, -floor]
    far = waist + 500.0 * along + [600.0, -floor]
    nodes, weights = np.polynomial.legendre.leggauss(60)
    x, y = np.meshgrid(600.0 * nodes, 500.0 * nodes, indexing="ij")
    heights = np.sqrt(radius**2 * (1.0 + (y / c) ** 2) - x**2) - floor
    reference = weights @ heights @ weights * 600.0 * 500.0

    volume = volume_below_within(near, far, 1200.0, 1000.0)

    assert reference / LITRE == pytest.approx(217.717453068, abs=1e-8)
    assert volume == pytest.approx(reference, rel=1e-7)


def test_the_area_and_kerf_of_a_steep_hypar():
    """z = c x y with corners +-120 mm: area as an integral of sqrt(1 + c2 (x2 + y2)) (Gauss); kerf by Weyl's tube law.

    The curvature term 2/3 r3 (integral of K) is left out of the 1.950882 L: 6e-8 L.
    """
    c = 480.0 / 1.2e6
    nodes, weights = np.polynomial.legendre.leggauss(40)
    x, y = np.meshgrid(600.0 * nodes, 500.0 * nodes, indexing="ij")
    reference = weights @ np.sqrt(1.0 + c**2 * (x**2 + y**2)) @ weights * 600.0 * 500.0

    area = sheet_area(*STEEP_HYPAR, 1200.0, 1000.0)

    assert area == pytest.approx(reference, rel=1e-12)
    assert area / 1e6 == pytest.approx(1.219301552054, abs=1e-12)
    kerf = kerf_volume(*STEEP_HYPAR, 1200.0, 1000.0, (1.6, 1.6))
    assert kerf / LITRE == pytest.approx(1.950882, abs=5e-7)


def test_two_triangles_for_a_hypar_miss_a_twelfth_of_its_twist_and_the_fan_misses_nothing():
    """Four corners bound a tetrahedron of L W dd / 6; one diagonal is off by half of it, 48 L for +-120 mm corners."""
    near, far = STEEP_HYPAR
    corners = np.array([[0, 0, 370], [1200, 0, 130], [1200, 1000, 370], [0, 1000, 130]], dtype=float)
    by_diagonal = sum(600_000.0 * corners[list(rows), 2].mean() for rows in ((0, 1, 2), (0, 2, 3)))

    lower, _ = split_billet(near, far, (1200.0, 1000.0, 500.0), n_across=1, facet_mm=1e6)

    assert (by_diagonal - 300.0 * LITRE) / LITRE == pytest.approx(48.0, rel=1e-12)
    assert mesh_volume(lower) == pytest.approx(300.0 * LITRE, rel=1e-13)


def test_the_published_hypar_block_is_used_to_99_758_per_cent():
    """Hypar block 1.2 x 0.6 x 0.5 m, corners 150, 350, 200, 300 mm; lower half 180 L as the mean of the corners.

    Area 0.72663 m2, kerf at 1.2 mm 0.872 L, halves 179.564 L: computed by midpoint quadrature, no source.
    """
    near = np.array([[0.0, 150.0], [1200.0, 350.0]])
    far = np.array([[0.0, 200.0], [1200.0, 300.0]])

    assert volume_below(near, far, 600.0) / LITRE == pytest.approx(180.0, rel=1e-13)
    assert sheet_area(near, far, 1200.0, 600.0) / 1e6 == pytest.approx(0.72663, abs=5e-6)
    kerf = kerf_volume(near, far, 1200.0, 600.0, (1.2, 1.2)) / LITRE
    assert kerf == pytest.approx(0.872, abs=5e-4)
    assert 180.0 - kerf / 2.0 == pytest.approx(179.564, abs=5e-4)
    assert 100.0 * (360.0 - kerf) / 360.0 == pytest.approx(99.758, abs=1e-3)


def test_halves_with_their_kerf_are_sound_solids_that_fill_the_billet():
    """Both halves and the kerf body judged by trimesh and manifold3d; kerf by Weyl's tube law."""
    sweep = sample_sweep(kerf_mm=(1.0, 1.8))
    billet = sweep.length_mm * sweep.width_mm * sweep.height_mm
    kerf = kerf_volume(sweep.near, sweep.far, sweep.length_mm, sweep.width_mm, sweep.kerf_mm)

    lower, upper, melted = half_meshes(sweep)

    below = volume_below_within(sweep.near, sweep.far, sweep.length_mm, sweep.width_mm)
    assert_both_judges_accept(lower, below - kerf / 2.0, 1e-6)
    assert_both_judges_accept(upper, billet - below - kerf / 2.0, 1e-6)
    assert_both_judges_accept(melted, kerf, 1e-5)
    assert sum(map(mesh_volume, (lower, upper, melted))) == pytest.approx(billet, rel=1e-9)


@pytest.mark.parametrize(
    "rings",
    [
        (np.array([[0.0, 0.0], [1200.0, 0.0], [1200.0, 500.0], [0.0, 1000.0]]),),
        (np.array([[0, 0], [1200, 0], [1200, 500], [600, 500], [600, 1000], [0, 1000]], dtype=float),),
        (
            np.array([[30.0, 10.0], [1190.0, 40.0], [1150.0, 980.0], [20.0, 990.0]]),
            np.array([[300.0, 200.0], [350.0, 700.0], [800.0, 600.0]]),
        ),
    ],
    ids=["trapezium", "L", "hole"],
)
@pytest.mark.parametrize("skew", [0.0, 15.0])
def test_trimmed_halves_with_their_kerf_are_sound_solids_with_the_litres_of_the_closed_form(rings, skew):
    """Halves of a panel on the bed judged by trimesh and manifold3d against Green's theorem over the outline."""
    panels = tuple(sample_panel(name, is_rectangle=False, outline=rings) for name in ("S1-A01", "S2-A01"))
    sweep = sample_sweep(kerf_mm=(1.0, 1.8))
    aside = np.array([skew, 0.0])
    sweep = replace(sweep, near=sweep.near - aside, far=sweep.far + aside)
    pieces = sample_pieces(sweep)
    (volumes,), pieces = measure_halves(sample_job(), panels, (sweep,), pieces, sample_conditions())
    (footprints,) = find_footprints(sample_job().layup, panels, (sweep,), pieces)

    lower, upper, melted = half_meshes(sweep, footprints)

    assert volumes.trimmed_mm3 > 1e7
    assert_both_judges_accept(lower, volumes.lower_mm3, 1e-6)
    assert_both_judges_accept(upper, volumes.upper_mm3, 1e-6)
    assert_both_judges_accept(melted, volumes.kerf_mm3, 2e-5)
    for solid, piece in zip((lower, upper), pieces, strict=True):
        judged = trimesh.Trimesh(solid.vertices, solid.triangles)
        np.testing.assert_allclose(judged.center_mass, piece.centre_mm, atol=1e-3)


def test_a_split_over_a_pentagon_is_what_a_solid_modeller_cuts():
    """manifold3d, which splits the pentagon's prism with a closed cutter, against our own clipping in plan."""
    x = np.linspace(-150.0, 1350.0, 121)
    near = np.column_stack([x - 40.0, 250.0 + 60.0 * np.sin(x / 300.0)])
    far = np.column_stack([x + 50.0, 250.0 + 80.0 * np.cos(x / 260.0)])
    pentagon = np.array([[100.0, 0.0], [1200.0, 50.0], [1200.0, 500.0], [700.0, 1000.0], [0.0, 800.0]])
    cutter = split_billet(near, far, (1200.0, 1000.0, 500.0))[0]
    prism = manifold3d.Manifold.extrude(manifold3d.CrossSection([pentagon.tolist()]), 600.0).translate([0, 0, -50])

    lower, upper = split_billet(near, far, (1200.0, 1000.0, 500.0), pentagon)

    cut = (manifold(cutter) ^ prism).volume()
    assert_both_judges_accept(lower, cut, 1e-9)
    assert mesh_volume(lower) + mesh_volume(upper) == pytest.approx(prism.volume() * 500.0 / 600.0, rel=1e-9)
