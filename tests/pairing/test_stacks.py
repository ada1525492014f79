from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.sample import sample_plan

from cutblock.geometry.apart import least_distance
from cutblock.geometry.rails import sheet_range
from cutblock.pairing.stacks import COVER_MM, StackRule, group_stacks

LENGTH, WIDTH, WALL, KERF, SHELL = 1200.0, 1000.0, 60.0, 1.5, 50.0
PLAN = sample_plan()


def sweep(height_of, name="SM-S-A01", length=LENGTH, width=WIDTH, **changes):
    """A panel's own sweep over a height function of plan points about the billet's middle, ruled across."""
    x = np.linspace(-15.0, length + 15.0, 41)
    near, far = (np.stack([x, height_of(x - length / 2.0, side * width / 2.0)], axis=1) for side in (-1.0, 1.0))
    low, high = sheet_range(near, far, width, length)
    height = float(np.ceil(high - low + 2.0 * WALL + KERF))
    lift = [0.0, height / 2.0 - (low + high) / 2.0]
    values = {"id": name, "length_mm": length, "width_mm": width, "height_mm": height, "kerf_mm": (KERF, KERF)}
    return replace(PLAN.sweeps[0], **(values | {"near": near + lift, "far": far + lift, "serving": ()} | changes))


def saddle(strength=1.0):
    return lambda x, y: strength * 1e-4 * x * y


def wave(strength=1.0, phase=0.0):
    return lambda x, y: strength * 60.0 * np.sin(x / 250.0 + phase) + 0.0 * y


def rule(**changes):
    values = {
        "shell_mm": SHELL,
        "kerf_mm": KERF,
        "is_even": False,
        "rooms_mm": ((2470.0, 1220.0, 970.0),),
        "machine": PLAN.machine,
    }
    return StackRule(**(values | changes))


def foam_of(sweeps):
    return np.array([one.length_mm * one.width_mm * one.height_mm for one in sweeps])


def alone(n):
    return [(number,) for number in range(n)]


def stacks_of(sweeps, units=None, is_free=None, foam=None, **changes):
    n = len(sweeps)
    return group_stacks(
        sweeps,
        alone(n) if units is None else units,
        foam_of(sweeps) if foam is None else foam,
        np.ones(n, dtype=bool) if is_free is None else is_free,
        rule(**changes),
    )


@pytest.mark.parametrize("k", [2, 5, 10])
def test_equal_shells_are_as_high_as_the_worked_case(k):
    """H = s + k t / cos + (k + 1) kerf (packing practice) with the kerf along the normal too, and a cover either end.

    A saddle c x y of half sides a, b rises 2 c a b over its middle's plane and is c hypot(a, b) steep at its corners.
    """
    relief, slope = 2e-4 * (LENGTH / 2.0) * (WIDTH / 2.0), 1e-4 * np.hypot(LENGTH / 2.0, WIDTH / 2.0)
    over_cos = np.sqrt(1.0 + slope**2)
    room = ((2470.0, 1220.0, 1000.0),)

    ((even,), _) = stacks_of([sweep(saddle())] * k, is_even=True, rooms_mm=room)
    ((backed,), _) = stacks_of([sweep(saddle())] * k, rooms_mm=room)

    exact = relief + k * (SHELL + KERF) * over_cos + KERF + 2.0 * COVER_MM
    plain = relief + k * SHELL * over_cos + (k + 1) * KERF + 2.0 * COVER_MM
    assert even.size_mm[2] == np.ceil(exact - 1e-3)
    assert 0.0 <= exact - plain <= k * KERF * (over_cos - 1.0) + 1e-9
    below = SHELL + (k - 1) * (SHELL + KERF) * over_cos + KERF
    assert backed.size_mm[2] == np.ceil(relief + below + COVER_MM - 1e-3)


@settings(max_examples=10)
@given(seed=st.integers(0, 10_000))
def test_the_order_of_the_panels_changes_no_total(seed):
    rng = np.random.default_rng(seed)
    sweeps = [sweep(wave(1.0 + 0.05 * rng.normal(), 0.1 * rng.normal())) for _ in range(8)]
    shuffled = [sweeps[place] for place in rng.permutation(8)]

    first, again = (stacks_of(some)[0] for some in (sweeps, shuffled))

    if len(first) == len(again) == 1 and len(first[0].members) == len(again[0].members) == 8:
        assert first[0].size_mm == again[0].size_mm
    else:
        pytest.fail(f"eight like waves made {[len(nest.members) for nest in (*first, *again)]}")


@settings(max_examples=10)
@given(seed=st.integers(0, 10_000), is_even=st.booleans())
def test_every_shell_is_thick_enough_and_the_wire_stays_in_the_billet(seed, is_even):
    rng = np.random.default_rng(seed)
    sweeps = [
        sweep(wave(1.0 + 0.2 * rng.normal(), 0.2 * rng.normal()), length=LENGTH + rng.integers(0, 8)) for _ in range(4)
    ]

    nests, _ = stacks_of(sweeps, is_even=is_even)

    assert nests
    for nest in nests:
        length, width, height = nest.size_mm
        low, _ = sheet_range(*nest.rails[0], width, length)
        _, high = sheet_range(*nest.rails[-1], width, length)
        assert high + KERF / 2.0 + COVER_MM <= height + 1e-6
        assert low - KERF / 2.0 >= (COVER_MM + SHELL if is_even else SHELL) - 1e-6
        for below, above in zip(nest.rails[:-1], nest.rails[1:], strict=True):
            assert least_distance(below, above, length, width) - KERF >= SHELL - 1e-6


def test_a_stack_is_only_made_where_it_takes_less_foam():
    sweeps = [sweep(saddle()) for _ in range(6)]
    foam = foam_of(sweeps)
    ((nest,), _) = stacks_of(sweeps)
    assert nest.volume_mm3 < foam.sum()

    taken, nearest = stacks_of(sweeps, foam=np.full(6, nest.volume_mm3 / 6.0))

    assert taken == ()
    assert nearest.fits
    assert nearest.stacked_mm3 >= nearest.now_mm3


def test_panels_that_share_a_cut_are_stacked_both_or_neither():
    sweeps = [sweep(wave()) for _ in range(3)] + [sweep(saddle(), length=700.0)]
    foam = foam_of(sweeps)
    units = [(0,), (1,), (2, 3)]  # the third shares its cut with a panel like no other

    nests, _ = stacks_of(sweeps, units=units, foam=foam)

    assert [sorted(nest.members) for nest in nests] == [[0, 1]]


def test_stacks_dissolve_where_the_sweep_must_be_cut_anyway():
    sweeps = [sweep(wave()), sweep(wave()), sweep(saddle(), length=700.0), sweep(saddle(), length=500.0)]

    nests, nearest = stacks_of(sweeps, units=[(0, 2), (1, 3)])

    assert nests == ()
    assert nearest.members == (0, 1)
    assert nearest.stacked_mm3 < nearest.now_mm3


def test_no_stack_holds_more_than_ten():
    nests, _ = stacks_of([sweep(saddle(0.2)) for _ in range(23)])

    assert sorted(len(nest.members) for nest in nests) == [3, 10, 10]
    assert sorted(member for nest in nests for member in nest.members) == list(range(23))


def test_a_stack_keeps_under_the_blocks_and_the_lift():
    sweeps = [sweep(saddle(0.2)) for _ in range(10)]
    ((whole,), _) = stacks_of(sweeps)
    low = ((2470.0, 1220.0, whole.size_mm[2] / 2.0),)
    tool = replace(PLAN.machine, lift_mm=PLAN.machine.table_height_mm + whole.size_mm[2] / 2.0 + 20.0)

    for limited in (stacks_of(sweeps, rooms_mm=low)[0], stacks_of(sweeps, machine=tool)[0]):
        assert len(limited) >= 2
        assert all(nest.size_mm[2] <= whole.size_mm[2] / 2.0 for nest in limited)
    nests, nearest = stacks_of(sweeps, rooms_mm=((2470.0, 1220.0, 90.0),))
    assert nests == ()
    assert not nearest.fits


def test_steep_sheets_need_room_for_the_towers_too():
    flat, steep = [sweep(saddle(0.1)) for _ in range(10)], [sweep(saddle(2.5)) for _ in range(10)]
    tool = replace(PLAN.machine, lift_mm=1100.0)

    highest = [max(nest.size_mm[2] for nest in stacks_of(some, machine=tool)[0]) for some in (flat, steep)]

    relief = 2.0 * 2.5e-4 * 600.0 * 500.0
    reach = relief * (PLAN.machine.span_mm / WIDTH - 1.0) / 2.0  # a ruling rises so much more to a tower
    assert highest[1] <= 1100.0 - PLAN.machine.table_height_mm - reach + COVER_MM + KERF / 2.0 + 1.0
    assert highest[0] > 500.0


def test_a_sheet_that_leans_needs_room_at_its_higher_tower():
    lean, tool = 0.35, replace(PLAN.machine, lift_mm=1100.0)
    nests, _ = stacks_of([sweep(lambda x, y: lean * y + 0.0 * x)] * 10, machine=tool)

    rise = lean * (tool.span_mm - WIDTH) / 2.0  # midway between the towers
    assert nests
    assert max(nest.size_mm[2] for nest in nests) <= 1100.0 - tool.table_height_mm - rise + COVER_MM + KERF / 2.0


def test_a_billet_rounded_up_to_whole_mm_must_fit_too():
    sweeps = [sweep(saddle(0.2)) for _ in range(6)]
    ((whole,), _) = stacks_of(sweeps)

    nests, _ = stacks_of(sweeps, rooms_mm=((2470.0, 1220.0, whole.size_mm[2] - 0.001),))

    assert nests
    assert all(nest.size_mm[2] < whole.size_mm[2] for nest in nests)


def test_footprints_that_differ_by_more_than_two_per_cent_do_not_nest():
    assert len(stacks_of([sweep(wave()), sweep(wave(), length=LENGTH * 1.019)])[0]) == 1
    nests, nearest = stacks_of([sweep(wave()), sweep(wave(), length=LENGTH * 1.021)])
    assert (nests, nearest) == ((), None)


def test_wires_of_a_billet_lie_along_the_same_axis():
    nests, nearest = stacks_of([sweep(wave()), sweep(wave(), wire_along="x")])
    assert (nests, nearest) == ((), None)


def test_a_sheet_is_turned_half_round_where_that_nests():
    slope = wave(1.0, 0.8)
    sweeps = [sweep(slope), sweep(lambda x, y: slope(-x, -y)), sweep(slope)]

    ((nest,), _) = stacks_of(sweeps)

    assert dict(zip(nest.members, nest.is_turned, strict=True)) == {0: False, 1: True, 2: False}
    ((straight,), _) = stacks_of([sweep(slope)] * 3)
    assert nest.size_mm == straight.size_mm


def test_a_sheet_is_never_mirrored():
    slope = lambda x, y: 1e-4 * x * y + 30.0 * np.sin(x / 200.0)  # noqa: E731 - one line of geometry
    mirrored = [sweep(slope), sweep(lambda x, y: slope(x, -y))]

    nests, nearest = stacks_of(mirrored)
    ((like,), _) = stacks_of([sweep(slope)] * 2)

    assert nearest is None or nearest.stacked_mm3 > 1.05 * like.volume_mm3
    assert all(nest.volume_mm3 > 1.05 * like.volume_mm3 for nest in nests)


def test_what_may_not_be_stacked_stays_out():
    ((nest,), _) = stacks_of([sweep(wave())] * 4, is_free=np.array([True, False, True, True]))
    assert sorted(nest.members) == [0, 2, 3]
