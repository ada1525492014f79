from dataclasses import replace

import numpy as np
import pytest
from kit.sample import (
    HEIGHT,
    LENGTH,
    WIDTH,
    sample_block,
    sample_panel,
    sample_pieces,
    sample_sweep,
)
from scipy.spatial.transform import Rotation

from cutblock.geometry.solids import mesh_volume
from cutblock.halves.bodies import billet_bodies, half_bodies, kerf_bodies
from cutblock.halves.meshes import half_meshes
from cutblock.halves.places import lift_mm, placed, poses_in_blocks, poses_in_form, serving_of
from cutblock.records.words import Duty, Half, Layup

PANELS = sample_panel(), sample_panel("S2-A01", 2)


def wanted(x, y):
    return 150.0 + 60.0 * (2.0 * x / LENGTH - 1.0) * (2.0 * y / WIDTH - 1.0)


def test_the_faces_of_both_moulds_of_a_shared_cut_lie_on_the_form_where_its_panels_are():
    turn, origin = Rotation.from_euler("xyz", [20.0, -35.0, 110.0], degrees=True).as_matrix(), np.array([9e4, -50.0, 7])
    panels = (PANELS[0], replace(PANELS[1], axes=turn, origin_mm=origin))
    sweep = sample_sweep(kerf_mm=(0.0, 0.0))
    pieces = sample_pieces(sweep)

    poses = poses_in_form(panels, (sweep,), pieces, 30.0)

    lower, upper, _ = half_meshes(sweep)
    for mesh, piece, panel, is_upper in ((lower, pieces[0], panels[0], False), (upper, pieces[1], panels[1], True)):
        n = len(mesh.vertices) // 2
        face = slice(n, None) if is_upper else slice(0, n)
        x, y, z = ((poses[piece.id].moved(mesh).vertices[face] - panel.origin_mm) @ panel.axes.T).T
        np.testing.assert_allclose(z, wanted(x, y), atol=0.011)
        back = slice(0, n) if is_upper else slice(n, None)
        below = ((poses[piece.id].moved(mesh).vertices[back] - panel.origin_mm) @ panel.axes.T)[:, 2]
        np.testing.assert_allclose(below, 0.0, atol=1e-9)
        assert mesh_volume(poses[piece.id].moved(mesh)) == pytest.approx(mesh_volume(mesh), rel=1e-9)


@pytest.mark.parametrize(
    ("duty", "lift"),
    [(Duty.COUNTER_MOULD, 30.0), (Duty.CRADLE, 0.0), (Duty.FILLER, 0.0), (Duty.SURPLUS, 0.0)],
)
def test_a_half_that_is_no_mould_lies_over_its_partner_as_cut_and_a_counter_mould_lifted_to_close_it(duty, lift):
    sweep = sample_sweep(panels=("S1-A01",))
    pieces = sample_pieces(sweep, duty)

    poses = poses_in_form(PANELS, (sweep,), pieces, 30.0)

    np.testing.assert_array_equal(poses[pieces[0].id].shift_mm, np.zeros(3))
    np.testing.assert_array_equal(poses[pieces[1].id].shift_mm, [0.0, 0.0, lift])
    np.testing.assert_array_equal(poses[sweep.id].shift_mm, np.zeros(3))
    np.testing.assert_array_equal(poses[pieces[1].id].rotation, np.eye(3))


def test_a_counter_mould_with_a_sweep_of_its_own_lies_where_that_puts_it():
    sweep = sample_sweep(panels=("S1-A01",))
    own = replace(sweep.serving[0], half=Half.UPPER, shift_mm=np.array([0.0, 0.0, 33.0]))
    alone = replace(sweep, serving=(own,))
    _, upper = sample_pieces(alone, Duty.COUNTER_MOULD)

    assert lift_mm(upper, alone, 30.0) == 0.0
    assert serving_of(alone, Half.UPPER) is own
    assert serving_of(alone, Half.LOWER) is own
    np.testing.assert_array_equal(poses_in_form(PANELS, (alone,), (upper,), 30.0)[upper.id].shift_mm, [0, 0, 33.0])


@pytest.mark.parametrize("is_turned", [False, True])
def test_halves_in_their_block_fill_the_billet_that_lies_there(is_turned):
    sweep = sample_sweep(kerf_mm=(2.0, 2.0))
    block = sample_block()
    size = (WIDTH, LENGTH, HEIGHT) if is_turned else (LENGTH, WIDTH, HEIGHT)
    billet = replace(block.billets[0], size_mm=size, turned=is_turned)
    blocks = block, replace(block, id="SM-B02", billets=(billet,))
    pieces = sample_pieces(sweep)
    poses = poses_in_blocks(blocks, pieces)
    bodies = [
        *half_bodies(Layup.BENCH, PANELS, (sweep,), pieces),
        *kerf_bodies((sweep,)),
    ]

    meshes = [body.mesh for body in placed(bodies, poses)]

    box = next(body.mesh for body in billet_bodies(blocks) if body.name == "SM-B02_SM-S1-A01")
    points = np.concatenate([mesh.vertices for mesh in meshes])
    np.testing.assert_allclose(points.min(axis=0), box.vertices.min(axis=0), atol=1e-9)
    np.testing.assert_allclose(points.max(axis=0), box.vertices.max(axis=0), atol=1e-9)
    assert sum(map(mesh_volume, meshes)) == pytest.approx(mesh_volume(box), rel=1e-9)
    # Billet x lies along the block's x, or turned along its y; there the near corner stands at the high end of x.
    start = poses[pieces[0].id].moved(bodies[0].mesh).vertices
    source = bodies[0].mesh.vertices
    along = 1 if is_turned else 0
    np.testing.assert_allclose(start[:, along] - start[:, along].min(), source[:, 0], atol=1e-9)
    across = start[:, 0].max() - start[:, 0] if is_turned else start[:, 1] - start[:, 1].min()
    np.testing.assert_allclose(across, source[:, 1], atol=1e-9)


def test_a_half_whose_billet_is_in_no_block_is_passed_over():
    sweep = sample_sweep()
    pieces = sample_pieces(sweep)
    bodies = half_bodies(Layup.BENCH, PANELS, (sweep,), pieces)

    assert list(placed(bodies, poses_in_blocks((), pieces))) == []
