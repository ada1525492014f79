"""Turned halves held against each other by a solid modeller."""

from dataclasses import replace

import numpy as np
import pytest
from kit.conoids import hypar
from kit.sample import sample_conditions, sample_job

from cutblock.halves.meshes import half_meshes
from cutblock.pairing.match import pair_sweeps
from cutblock.pairing.shapes import TURNS

manifold3d = pytest.importorskip("manifold3d", reason="manifold3d is not installed")

H = 300.0
SIDE = 1000.0


def solid(mesh, turn=None, middle=None):
    vertices = mesh.vertices if turn is None else (mesh.vertices - middle) @ turn + middle
    return manifold3d.Manifold(
        manifold3d.Mesh64(np.ascontiguousarray(vertices), np.ascontiguousarray(mesh.triangles.astype(np.uint64)))
    )


def apart_litres(first, second):
    """The volume of the symmetric difference."""
    return (first.volume() + second.volume() - 2.0 * (first ^ second).volume()) * 1e-6


def halves(corners, size=(1200.0, 1000.0)):
    _, sweep = hypar("A", corners, size)
    # As thin a wire as the meshes take: the kerf is not what is looked at.
    sweep = replace(sweep, near=sweep.near[::31], far=sweep.far[::31], kerf_mm=(1e-3, 1e-3), height_mm=H)
    lower, upper, _ = half_meshes(sweep)
    return solid(lower), upper, np.array([*size, H]) / 2.0


def test_the_upper_half_of_a_self_complementary_hypar_turned_over_is_its_lower_half():
    """z00 + z01 = z10 + z11 = H (derived: C_x of a bilinear sheet swaps the corners along y and takes them from H)."""
    lower, upper, middle = halves((200.0, 80.0, 220.0, 100.0))

    assert lower.volume() * 1e-6 == pytest.approx(180.0, abs=0.01)
    assert apart_litres(lower, solid(upper, TURNS[0], middle)) < 0.02
    # No other turn does, nor does a hypar whose corners add up to something else.
    for turn in (TURNS[1], np.diag([1.0, 1.0, 1.0])):
        assert apart_litres(lower, solid(upper, turn, middle)) > 5.0
    lower, upper, middle = halves((200.0, 80.0, 240.0, 100.0))
    assert apart_litres(lower, solid(upper, TURNS[0], middle)) > 2.0


@pytest.mark.parametrize("turn", [2, 3])
def test_a_square_hypar_level_along_a_diagonal_is_its_own_complement_about_it(turn):
    """About x = y the corners on it stay: z00 = z11 = H/2, and z10 + z01 = H."""
    corners = (150.0, 80.0, 150.0, 220.0) if turn == 2 else (80.0, 150.0, 220.0, 150.0)
    lower, upper, middle = halves(corners, (SIDE, SIDE))

    assert apart_litres(lower, solid(upper, TURNS[turn], middle)) < 0.02
    assert apart_litres(lower, solid(upper, TURNS[5 - turn], middle)) > 2.0
    made = [hypar(f"P{k}", corners, (SIDE, SIDE)) for k in range(2)]
    sweeps, _, _ = pair_sweeps(sample_job(), *zip(*made, strict=True), sample_conditions(kerf_mm=0.0))
    assert [sweep.serves for sweep in sweeps] == [("P0", "P1")]


def test_the_mirror_image_of_a_complement_fits_in_none_of_the_turns():
    z00, z10, z11, z01 = corners = (210.0, 60.0, 205.0, 130.0)
    _, upper, middle = halves(corners)
    complement, _, _ = halves((H - z01, H - z11, H - z10, H - z00))
    mirrored, _, _ = halves((H - z11, H - z01, H - z00, H - z10))

    assert apart_litres(complement, solid(upper, TURNS[0], middle)) < 0.02
    assert min(apart_litres(mirrored, solid(upper, turn, middle)) for turn in TURNS[:2]) > 2.0
