from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.sample import (
    TURN_ABOUT_X,
    WIDTH,
    sample_conditions,
    sample_job,
    sample_panel,
    sample_pieces,
    sample_sweep,
)

from cutblock.base.errors import GeometryError
from cutblock.geometry import split_billet
from cutblock.geometry.solids import mesh_centre, mesh_volume
from cutblock.halves.measure import measure_halves
from cutblock.halves.meshes import half_meshes
from cutblock.records.words import Duty, Half, Layup

BILLET = 1200.0 * 1000.0 * 300.0
TRAPEZOID = np.array([[0.0, 0.0], [1200.0, 0.0], [1200.0, 500.0], [0.0, 1000.0]])


def measure(sweep, panels, job=None, duty=Duty.MOULD):
    pieces = sample_pieces(sweep, duty)
    volumes, weighed = measure_halves(job or sample_job(), panels, (sweep,), pieces, sample_conditions())
    return volumes[0], weighed


@given(at_near=st.floats(0.2, 8.0), at_far=st.floats(0.2, 8.0), lift=st.floats(-60.0, 60.0))
def test_halves_and_kerf_are_the_billet(at_near, at_far, lift):
    sweep = sample_sweep(kerf_mm=(at_near, at_far))
    up = np.array([0.0, lift])
    sweep = replace(sweep, near=sweep.near + up, far=sweep.far + up)

    volumes, _ = measure(sweep, (sample_panel(), sample_panel("S2-A01")))

    assert volumes.lower_mm3 + volumes.upper_mm3 + volumes.kerf_mm3 == pytest.approx(BILLET, rel=1e-12)
    assert volumes.trimmed_mm3 == 0.0
    assert volumes.kerf_mm3 == pytest.approx((at_near + at_far) / 2.0 * volumes.face_mm2, rel=1e-12)
    assert volumes.lower_mm3 + volumes.kerf_mm3 / 2.0 == pytest.approx(1.2e6 * (150.0 + lift), rel=1e-12)


def test_pieces_weigh_their_volume_of_foam():
    volumes, (lower, upper) = measure(sample_sweep(), (sample_panel(), sample_panel("S2-A01")))

    assert lower.volume_mm3 == volumes.lower_mm3
    assert upper.volume_mm3 == volumes.upper_mm3
    assert lower.mass_kg == pytest.approx(volumes.lower_mm3 * 20e-9, rel=1e-14)
    assert (lower.half, upper.half) == (Half.LOWER, Half.UPPER)


@given(at_near=st.floats(0.2, 8.0), at_far=st.floats(0.2, 8.0), skew=st.floats(-18.0, 18.0))
def test_the_centres_of_both_halves_and_the_kerf_balance_in_the_middle_of_the_billet(at_near, at_far, skew):
    sweep = sample_sweep(kerf_mm=(at_near, at_far))
    aside = np.array([skew, 0.0])
    sweep = replace(sweep, near=sweep.near - aside, far=sweep.far + aside)

    volumes, (lower, upper) = measure(sweep, (sample_panel(), sample_panel("S2-A01")))

    solids = half_meshes(sweep)
    for piece, centre, solid in zip(
        (lower, upper), (volumes.lower_centre_mm, volumes.upper_centre_mm), solids, strict=False
    ):
        assert piece.centre_mm == centre
        np.testing.assert_allclose(centre, mesh_centre(solid), atol=1e-3)
    melted = volumes.kerf_mm3 * mesh_centre(solids[2])
    balance = volumes.lower_mm3 * np.array(lower.centre_mm) + volumes.upper_mm3 * np.array(upper.centre_mm) + melted
    np.testing.assert_allclose(balance / BILLET, [600.0, 500.0, 150.0], atol=1e-4)


def test_a_half_of_which_nothing_is_left_has_no_centre():
    sweep = sample_sweep(panels=("S1-A01",))
    away = replace(sweep.serving[0], shift_mm=np.array([5000.0, 0.0, 0.0]))
    panel = sample_panel(is_rectangle=False, outline=(TRAPEZOID,))

    volumes, (lower, _) = measure(replace(sweep, serving=(away,)), (panel,), duty=Duty.SURPLUS)

    assert volumes.lower_mm3 == 0.0
    assert lower.centre_mm is None


def test_on_the_bed_both_halves_are_trimmed_to_the_outlines_of_their_panels():
    sweep = sample_sweep(kerf_mm=(0.0, 0.0))
    first = sample_panel(is_rectangle=False, outline=(TRAPEZOID,))
    second = sample_panel("S2-A01", is_rectangle=False, outline=(TRAPEZOID,))
    in_billet = TRAPEZOID * [1.0, -1.0] + [0.0, WIDTH]  # turned over about x

    volumes, _ = measure(sweep, (first, second))

    size = (1200.0, 1000.0, 300.0)
    assert volumes.lower_mm3 == pytest.approx(
        mesh_volume(split_billet(sweep.near, sweep.far, size, TRAPEZOID)[0]), rel=1e-7
    )
    assert volumes.upper_mm3 == pytest.approx(
        mesh_volume(split_billet(sweep.near, sweep.far, size, in_billet)[1]), rel=1e-7
    )
    parts = volumes.lower_mm3 + volumes.upper_mm3 + volumes.kerf_mm3 + volumes.trimmed_mm3
    assert parts == pytest.approx(BILLET, rel=1e-12)


@pytest.mark.parametrize(
    ("duty", "is_trimmed"),
    [(Duty.COUNTER_MOULD, True), (Duty.CRADLE, True), (Duty.FILLER, False), (Duty.SURPLUS, False)],
)
def test_a_half_that_supports_the_panel_follows_its_outline_and_no_other_does(duty, is_trimmed):
    sweep = sample_sweep(panels=("S1-A01",))
    panel = sample_panel(is_rectangle=False, outline=(TRAPEZOID,))

    volumes, _ = measure(sweep, (panel,), duty=duty)

    whole = BILLET / 2.0 - volumes.kerf_mm3 / 2.0
    assert (volumes.upper_mm3 < 0.8 * whole) == is_trimmed
    assert volumes.lower_mm3 < 0.8 * whole


def test_kerf_of_a_trimmed_sweep_is_melted_over_the_whole_billet():
    panel = sample_panel(is_rectangle=False, outline=(TRAPEZOID,))
    rectangle, _ = measure(sample_sweep(panels=("S1-A01",)), (sample_panel(),), duty=Duty.COUNTER_MOULD)

    trimmed, _ = measure(sample_sweep(panels=("S1-A01",)), (panel,), duty=Duty.COUNTER_MOULD)

    assert trimmed.kerf_mm3 == rectangle.kerf_mm3
    assert trimmed.face_mm2 == rectangle.face_mm2


def test_a_strip_is_trimmed_to_the_part_of_the_outline_it_covers():
    sweep = sample_sweep(panels=("S1-A01",), width_mm=400.0, kerf_mm=(0.0, 0.0))
    lower = replace(sweep.serving[0], shift_mm=np.array([0.0, 600.0, 0.0]), strip=2, n_strips=2)
    panel = sample_panel(is_rectangle=False, outline=(TRAPEZOID,))

    volumes, _ = measure(replace(sweep, serving=(lower,)), (panel,), duty=Duty.COUNTER_MOULD)

    flat = sample_sweep(width_mm=400.0)
    triangle = np.array([[0.0, 0.0], [960.0, 0.0], [0.0, 400.0]])
    expected = mesh_volume(split_billet(flat.near, flat.far, (1200.0, 400.0, 300.0), triangle)[0])
    assert volumes.lower_mm3 == pytest.approx(expected, rel=1e-6)


def test_a_bench_billet_keeps_the_foam_round_its_panel():
    panel = sample_panel(is_rectangle=False, outline=(TRAPEZOID,))

    volumes, _ = measure(sample_sweep(panels=("S1-A01",)), (panel,), sample_job(layup=Layup.BENCH), Duty.CRADLE)

    assert volumes.trimmed_mm3 == 0.0


def test_a_turned_strip_finds_its_outline_by_its_serving():
    sweep = sample_sweep(kerf_mm=(0.0, 0.0))
    upper = replace(sweep.serving[1], rotation=TURN_ABOUT_X, shift_mm=np.array([0.0, 900.0, 300.0]))
    panels = sample_panel(), sample_panel("S2-A01", is_rectangle=False, outline=(TRAPEZOID,))

    volumes, _ = measure(replace(sweep, serving=(sweep.serving[0], upper)), panels)

    in_billet = TRAPEZOID * [1.0, -1.0] + [0.0, 900.0]
    size = (1200.0, 1000.0, 300.0)
    assert volumes.upper_mm3 == pytest.approx(
        mesh_volume(split_billet(sweep.near, sweep.far, size, in_billet)[1]), rel=1e-7
    )


def test_a_sweep_that_does_not_cover_its_billet_is_refused_by_name():
    sweep = sample_sweep(length_mm=1300.0)

    with pytest.raises(GeometryError, match="sweep SM-S1-A01: the near rail runs"):
        measure(sweep, (sample_panel(), sample_panel("S2-A01")))
