"""Half turns about both sides of the billet and about its diagonals, and the outlines that go with them."""

from dataclasses import replace

import numpy as np
import pytest
from kit.conoids import conoid, hypar, make
from kit.sample import sample_conditions, sample_job

from cutblock.geometry.deviation import face_deviation
from cutblock.pairing.match import pair_sweeps
from cutblock.pairing.shapes import TURNS

EXACT = sample_conditions(kerf_mm=0.0)
SIDE = 1000.0


def pair(made, **changes):
    panels, sweeps = zip(*made, strict=True)
    return pair_sweeps(sample_job(**changes), panels, sweeps, EXACT)[0]


def couples(sweeps):
    return [sweep.serves for sweep in sweeps]


def lopsided(name, turn=None, mirrored=False, length=SIDE, width=SIDE):
    """A panel without any symmetry, ruled along x or y, or what its upper half shows after one of the turns."""
    plan = np.eye(2) if turn is None else TURNS[turn][:2, :2]
    sign = 1.0 if turn is None else -1.0
    own = (width, length) if turn in {2, 3} else (length, width)

    def there(x, y):
        x, y = x - length / 2.0, y - width / 2.0
        x, y = plan[0, 0] * x + plan[0, 1] * y, plan[1, 0] * x + plan[1, 1] * y
        return (-x if mirrored else x) / own[0], y / own[1]

    def height(x, y):
        s, t = there(x, y)
        return sign * (40.0 * s + 25.0 * t + 90.0 * s * t)

    def slope(x, y, dx, dy):
        return (height(x + dx, y + dy) - height(x - dx, y - dy)) / 2e-3

    return make(
        name,
        height,
        lambda x, y: slope(x, y, 1e-3, 0.0),
        lambda x, y: slope(x, y, 0.0, 1e-3),
        length=length,
        width=width,
    )


@pytest.mark.parametrize("turn", range(4))
def test_a_square_panel_shares_a_cut_with_its_complement_in_each_of_the_four_turns(turn):
    a, b = lopsided("A"), lopsided("B", turn)

    sweeps = pair([a, b])

    assert couples(sweeps) == [("A", "B")]
    upper = sweeps[0].serving[1]
    assert upper.max_mm < 1e-6
    np.testing.assert_allclose(upper.rotation, TURNS[turn], atol=1e-12)
    in_billet = (b[0].samples_mm - upper.shift_mm) @ upper.rotation
    off = face_deviation(a[1].near, a[1].far, SIDE, in_billet, -b[0].normals @ upper.rotation)
    assert np.abs(off).max() < 1e-6
    assert in_billet[:, :2].min() == pytest.approx(0.0, abs=1e-9)
    assert in_billet[:, :2].max() == pytest.approx(SIDE, abs=1e-9)


@pytest.mark.parametrize("turn", range(4))
def test_the_mirror_image_of_a_complement_is_left_alone_in_each_of_the_four_turns(turn):
    assert couples(pair([lopsided("A"), lopsided("B", turn, mirrored=True)])) == [("A",), ("B",)]


@pytest.mark.parametrize("turn", [2, 3])
def test_a_panel_half_as_wide_needs_the_other_one_to_lie_across(turn):
    a = lopsided("A", length=1200.0, width=600.0)

    across = pair([a, lopsided("B", turn, length=600.0, width=1200.0)])
    along = pair([a, lopsided("B", turn, length=1200.0, width=600.0)])

    assert couples(across) == [("A", "B")]
    assert couples(along) == [("A",), ("B",)]


def test_a_square_panel_takes_quarter_turns_only_where_they_fit():
    """Of nine square panels and the complements of eight of them, by turns about all four axes."""
    made = [lopsided("A0")]
    for k in range(1, 9):
        a = conoid(f"A{k}", 30.0 + 5.0 * k)
        made += [a, conoid(f"B{k}", 30.0 + 5.0 * k, is_turned=True)]

    sweeps = pair(made)

    assert couples(sweeps) == [("A0",), *((f"A{k}", f"B{k}") for k in range(1, 9))]


@pytest.mark.parametrize("turn", range(4))
def test_a_skew_panel_pairs_with_the_mirrored_outline_alone(turn):
    ring = np.array([[0.0, 0.0], [850.0, 0.0], [SIDE, SIDE], [150.0, SIDE]])
    middle = np.array([SIDE, SIDE]) / 2.0
    mirrored = (ring - middle) @ TURNS[turn][:2, :2] + middle

    def cut_to(made, outline):
        panel, sweep = made
        return replace(panel, outline=(outline,), is_rectangle=False), sweep

    a, b = lopsided("A"), lopsided("B", turn)

    assert couples(pair([cut_to(a, ring), cut_to(b, mirrored)])) == [("A", "B")]
    assert couples(pair([cut_to(a, ring), cut_to(b, ring)])) == [("A",), ("B",)]


def test_a_trapezoid_pairs_with_itself_turned_about_its_axis_alone():
    trapezoid = np.array([[0.0, 0.0], [SIDE, 100.0], [SIDE, 900.0], [0.0, SIDE]])

    def cut_to(made):
        panel, sweep = made
        return replace(panel, outline=(trapezoid,), is_rectangle=False), sweep

    assert couples(pair([cut_to(lopsided("A")), cut_to(lopsided("B", 0))])) == [("A", "B")]
    assert couples(pair([cut_to(lopsided("A")), cut_to(lopsided("B", 1))])) == [("A",), ("B",)]


def test_on_the_bench_a_billet_two_mm_larger_will_do_and_on_the_bed_it_will_not():
    a, (panel, sweep) = lopsided("A"), lopsided("B", 0)
    on = np.array([1.0, 0.0, 0.0])
    lower = replace(a[1].serving[0], shift_mm=a[1].serving[0].shift_mm - on)
    rails = {"near": a[1].near + on[:2], "far": a[1].far + on[:2]}
    larger = replace(a[1], length_mm=SIDE + 2.0, serving=(lower,), **rails)

    assert couples(pair([(a[0], larger), (panel, sweep)], margin_mm=30.0)) == [("A", "B")]
    assert couples(pair([(a[0], larger), (panel, sweep)])) == [("A",), ("B",)]
    # A billet too small for the other panel's margin is not cut for both.
    assert [s.id for s in pair([(panel, sweep), (a[0], larger)], margin_mm=30.0)] == ["SM-A"]


@pytest.mark.parametrize("corners", [(200.0, 80.0, 220.0, 100.0), (210.0, 90.0, 210.0, 90.0)])
def test_a_hypar_whose_opposite_corners_add_up_to_the_height_is_its_own_complement(corners):
    """z00 + z01 = z10 + z11 = H: turned over about x, the upper half shows the lower one's face (closed form)."""
    z00, z10, z11, z01 = corners
    assert z00 + z01 == z10 + z11 == 300.0

    sweeps = pair([hypar(f"P{k}", corners) for k in range(6)])

    assert couples(sweeps) == [("P0", "P1"), ("P2", "P3"), ("P4", "P5")]
    assert max(sweep.serving[1].max_mm for sweep in sweeps) < 1e-6


def test_a_hypar_whose_corners_do_not_add_up_is_not():
    assert len(pair([hypar(f"P{k}", (200.0, 80.0, 240.0, 100.0)) for k in range(2)])) == 2
