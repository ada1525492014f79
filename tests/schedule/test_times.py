import time

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st
from kit.sample import sample_conditions, sample_machine, sample_sweep

from cutblock.base.errors import Cancelled
from cutblock.schedule import stages
from cutblock.schedule.passes import sweep_steps
from cutblock.schedule.times import step_times, time_sweeps

CONDITIONS = sample_conditions()
MACHINE = sample_machine()


def flat_sweep(n=63, z_near=150.0, z_far=150.0, **changes):
    x = np.linspace(-20.0, 1220.0, n)
    near = np.stack([x, np.full(n, z_near)], axis=1)
    far = np.stack([x, np.full(n, z_far)], axis=1)
    return sample_sweep(**({"near": near, "far": far} | changes))


def fan_sweep(slow_mm=400.0, fast_mm=1240.0, n=63):
    """A level wire that turns about a vertical axis beyond the near face: the near end goes slower."""
    ahead = np.linspace(0.0, 1.0, n)
    near = np.stack([-20.0 + slow_mm * ahead, np.full(n, 150.0)], axis=1)
    far = np.stack([-20.0 + fast_mm * ahead, np.full(n, 150.0)], axis=1)
    return sample_sweep(near=near, far=far, length_mm=slow_mm - 40.0)


def zigzag_sweep(slope, n=63):
    """A wire whose far end climbs and falls at a slope while the near end goes level."""
    x = np.linspace(-20.0, 1220.0, n)
    far = np.stack([x, 150.0 + 10.0 * slope * np.resize([1.0, -1.0], n)], axis=1)
    return sample_sweep(near=np.stack([x, np.full(n, 150.0)], axis=1), far=far)


def random_sweep(seed, n=40):
    rng = np.random.default_rng(seed)
    x = np.linspace(-20.0, 1220.0, n)

    def rail():
        z = 150.0 + sum(
            rng.uniform(0, 40) * np.sin(x * 2 * np.pi / rng.uniform(500, 3000) + rng.uniform(0, 6)) for _ in "ab"
        )
        return np.stack([x + rng.uniform(0.0, 15.0) * np.sin(np.pi * (x + 20) / 1240) ** 2, z], axis=1)

    return sample_sweep(near=rail(), far=rail())


def normal_speed(sweep, timing, share):
    """Wire-normal speed of the point at `share` of the width in each step, by a cross product."""
    near, far = (np.insert(rail, 1, y, axis=1) for rail, y in ((sweep.near, 0.0), (sweep.far, sweep.width_mm)))
    wire = far - near
    wire = wire[1:] + wire[:-1]
    way = np.diff((1 - share) * near + share * far, axis=0)
    across = np.linalg.norm(np.cross(way, wire), axis=1) / np.linalg.norm(wire, axis=1)
    return across / timing.step_seconds


def test_a_level_cut_takes_its_length_over_the_planned_speed():
    _, (timing,), findings = time_sweeps([flat_sweep()], CONDITIONS, MACHINE)
    # Up to speed at 200 mm/s2 and through the foam; the last 20 mm, in air, up to 40 mm/s and down to rest.
    cutting = 1220.0 / 2.6458 + 2.6458 / 400.0
    air = (20.0 - (2 * 40.0**2 - 2.6458**2) / 400.0) / 40.0 + (2 * 40.0 - 2.6458) / 200.0
    assert timing.seconds == pytest.approx(cutting + air, rel=1e-4)
    np.testing.assert_allclose(timing.step_seconds[1:-1], 20.0 / 2.6458, rtol=1e-12)
    assert timing.step_seconds[-1] == pytest.approx(air, rel=0.03)
    assert timing.seconds == pytest.approx(timing.step_seconds.sum(), rel=1e-12)
    assert timing.end_speed_ratio == pytest.approx(1.0)
    assert timing.twist_deg_per_m == pytest.approx(0.0, abs=1e-9)
    assert findings == ()


def test_a_level_cut_leaves_the_planned_kerf_at_both_faces():
    (sweep,), _, _ = time_sweeps([flat_sweep()], CONDITIONS, MACHINE)
    assert sweep.kerf_mm == pytest.approx((CONDITIONS.kerf_mm, CONDITIONS.kerf_mm), rel=1e-4)


@given(seed=st.integers(0, 2**32 - 1), planned=st.floats(1.6, 3.638))
def test_no_speed_limit_is_passed_and_midwire_keeps_the_plan_where_it_can(seed, planned):
    conditions = sample_conditions(planned_mm_s=planned)
    sweep = random_sweep(seed)
    _, (timing,), _ = time_sweeps([sweep], conditions, MACHINE)
    speeds = np.array([normal_speed(sweep, timing, share)[:-1] for share in (0.0, 0.25, 0.5, 0.75, 1.0)])
    assert speeds.max() <= conditions.high_mm_s * (1.0 + 1e-9)
    assert speeds[2].max() <= planned * (1.0 + 1e-9)
    is_free = speeds.max(axis=0)[1:-1] < conditions.high_mm_s * (1.0 - 1e-3)
    np.testing.assert_allclose(speeds[2, 1:-1][is_free], planned, rtol=1e-3)


def driven(steps, seconds):
    """Speeds of the axes in every step and their changes over half of both steps, from rest to rest, of one sweep."""
    speeds = steps.axes / seconds[:, None]
    rests = np.zeros((1, speeds.shape[1]))
    gaps = 0.5 * (np.append(seconds, 0.0) + np.append(0.0, seconds))
    return np.abs(speeds), np.abs(np.diff(np.concatenate([rests, speeds, rests]), axis=0)) / gaps[:, None]


@given(
    seed=st.integers(0, 2**32 - 1),
    n=st.integers(3, 200),
    speed=st.floats(0.5, 60.0),
    acceleration=st.floats(0.02, 300.0),
)
@example(seed=299885, n=125, speed=5.0, acceleration=1.0)  # the first step itself is where the limit binds
def test_towers_keep_to_their_speed_and_acceleration(seed, n, speed, acceleration):
    machine = sample_machine(speed_mm_s=speed, acceleration_mm_s2=acceleration)
    steps = sweep_steps([random_sweep(seed, n)], machine)
    speeds, changes = driven(steps, step_times(steps, CONDITIONS, machine))
    assert speeds.max() <= speed * (1.0 + 1e-9)
    assert changes.max() <= acceleration * (1.0 + 1e-6)


def test_a_rail_too_rough_for_its_towers_is_driven_slowly():
    x = np.linspace(-20.0, 1220.0, 400)
    rough = np.stack([x, 150.0 + 3.0 * np.resize([1.0, -1.0], 400)], axis=1)
    machine = sample_machine(acceleration_mm_s2=0.01)
    steps = sweep_steps([sample_sweep(near=rough, far=rough)], machine)
    speeds, changes = driven(steps, step_times(steps, CONDITIONS, machine))
    assert changes.max() <= 0.01 * (1.0 + 1e-6)
    # Twice the speed across at each ruling, over the time of a step: v^2 = a h / 2 with 6 mm of h across.
    assert np.median(speeds[:, 1]) == pytest.approx(np.sqrt(0.01 * 6.0 / 2.0), rel=0.02)


@pytest.mark.parametrize(("n", "speed", "acceleration"), [(300, 60.0, 200.0), (300, 2.0, 0.5), (150, 60.0, 5.0)])
def test_twenty_times_finer_nodes_find_no_time_shorter_by_a_five_hundredth(monkeypatch, n, speed, acceleration):
    machine = sample_machine(speed_mm_s=speed, acceleration_mm_s2=acceleration)
    steps = sweep_steps([random_sweep(seed, n) for seed in range(10)], machine)
    coarse = np.add.reduceat(step_times(steps, CONDITIONS, machine), steps.firsts[:-1])
    kinds = [np.append(kind, 1.0) for kind in stages._KINDS]
    finer = tuple(np.unique(kind[:-1] + np.arange(20)[:, None] / 20.0 * np.diff(kind)) for kind in kinds)
    monkeypatch.setattr(stages, "_KINDS", finer)
    fine = np.add.reduceat(step_times(steps, CONDITIONS, machine), steps.firsts[:-1])
    np.testing.assert_allclose(coarse, fine, rtol=2e-3)
    # Both are no faster than the limits of speed alone, and hardly slower where the towers are strong.
    assert (coarse >= fine * (1.0 - 1e-9)).all()


def test_no_sweep_can_be_cut_faster_than_its_limits_and_strong_towers_reach_them():
    steps = sweep_steps([random_sweep(seed, 300) for seed in range(10)], MACHINE)
    seconds = step_times(steps, CONDITIONS, MACHINE)
    bounds = np.maximum(steps.middle / CONDITIONS.planned_mm_s, steps.moves.largest / CONDITIONS.high_mm_s)
    last = [int(np.flatnonzero(steps.is_in_foam & (steps.sweeps == index))[-1]) for index in range(10)]
    is_cut = np.arange(len(seconds)) <= np.array(last)[steps.sweeps]
    assert (seconds[is_cut] >= bounds[is_cut] * (1.0 - 1e-9)).all()
    assert seconds[is_cut].sum() == pytest.approx(bounds[is_cut].sum(), rel=1e-4)


def test_the_wire_leaves_the_foam_at_cutting_speed_and_the_air_behind_it_fast():
    sweep = flat_sweep(n=249)  # 5 mm a step
    _, (timing,), _ = time_sweeps([sweep], CONDITIONS, MACHINE)
    speeds = 5.0 / timing.step_seconds
    np.testing.assert_allclose(speeds[1:244], 2.6458, rtol=1e-12)
    # The last step over the billet ends at 1200 mm, the pass at 1220 mm.
    assert (speeds[244:] > 15.0).all()
    assert speeds.max() <= 40.0


def test_a_kink_is_eased_where_it_is_and_the_rest_keeps_its_speed():
    x = np.linspace(-20.0, 1220.0, 63)
    roof = np.stack([x, 150.0 - 0.1 * np.abs(x - 600.0)], axis=1)
    machine = sample_machine(acceleration_mm_s2=0.05)
    _, (timing,), _ = time_sweeps([sample_sweep(near=roof, far=roof)], CONDITIONS, machine)
    usual = 20.0 * np.hypot(1.0, 0.1) / 2.6458
    np.testing.assert_allclose(timing.step_seconds[[5, 20, 40, 55]], usual, rtol=1e-9)
    assert timing.step_seconds.max() > 1.05 * usual


def test_tower_planes_lie_beyond_the_billet():
    steps = sweep_steps([fan_sweep()], MACHINE)
    slope = (1240.0 - 400.0) / 1000.0
    near, far = 400.0 - 200.0 * slope, 400.0 + 2400.0 * slope
    # With the far face in the far tower's plane the wire reaches 1600 mm before the billet.
    np.testing.assert_allclose(
        steps.axes.sum(axis=0), [near, 0.0, far, 0.0, 400.0 - 1600.0 * slope, 0.0, 1240.0, 0.0], atol=1e-9
    )


def test_a_slow_axis_stretches_the_time():
    _, (usual,), _ = time_sweeps([flat_sweep()], CONDITIONS, MACHINE)
    _, (slow,), _ = time_sweeps([flat_sweep()], CONDITIONS, sample_machine(speed_mm_s=1.0))
    assert usual.seconds < slow.seconds
    assert slow.seconds == pytest.approx(1240.0, rel=1e-3)


def test_a_fast_end_runs_at_the_contact_limit_and_the_slow_one_melts_too_much():
    sweep = zigzag_sweep(slope=3.0)
    (timed,), (timing,), findings = time_sweeps([sweep], CONDITIONS, MACHINE)
    # The first and the last step hold the ramps from and to rest.
    far = normal_speed(sweep, timing, 1.0)[1:-1]
    np.testing.assert_allclose(far, 3.638, rtol=1e-6)
    assert timing.end_speed_ratio == pytest.approx(np.sqrt(10.0), rel=0.01)
    assert timed.kerf_mm[0] > CONDITIONS.widest_kerf_mm > timed.kerf_mm[1]
    found = {finding.code: finding for finding in findings}
    assert set(found) == {"uneven-ends", "over-melt"}
    assert {finding.severity for finding in findings} == {"warning"}
    assert {finding.subject for finding in findings} == {sweep.id}
    assert "from ruling 2 to 62 (10 to 1190 mm of the travel) at the near face down to" in found["over-melt"].text


def test_ends_too_uneven_are_an_error():
    _, (timing,), findings = time_sweeps([zigzag_sweep(slope=4.5)], CONDITIONS, MACHINE)
    assert timing.end_speed_ratio > 4.0
    finding = next(finding for finding in findings if finding.code == "uneven-ends")
    assert finding.severity == "error"
    assert " at ruling " in finding.text
    assert " mm of the travel" in finding.text


def test_a_pivot_inside_the_wire_is_found_though_both_ends_run():
    x = np.linspace(-20.0, 1220.0, 63)
    zigzag = 10.0 * np.resize([1.0, -1.0], 63)
    sweep = sample_sweep(near=np.stack([x, 150.0 + 4.0 * zigzag], axis=1), far=np.stack([x, 150.0 - zigzag], axis=1))
    _, (timing,), findings = time_sweeps([sweep], sample_conditions(planned_mm_s=3.0), MACHINE)
    assert normal_speed(sweep, timing, 1.0).min() > CONDITIONS.low_mm_s * 0.5
    text = next(finding for finding in findings if finding.code == "over-melt").text
    # The heights of the two ends change by 80 up and 20 down: mid-way they cancel at 0.8 of the width.
    place = float(text.split(" travel) at ")[1].split(" mm")[0])
    assert place == pytest.approx(800.0, abs=30.0)


def test_an_end_that_has_left_the_foam_is_not_held_to_its_limits():
    sweep = fan_sweep()
    _, (timing,), _ = time_sweeps([sweep], CONDITIONS, MACHINE)
    assert normal_speed(sweep, timing, 1.0).max() > 1.01 * CONDITIONS.high_mm_s
    np.testing.assert_allclose(normal_speed(sweep, timing, 0.0)[20:50].max(), 400.0 / 820.0 * 2.6458, rtol=0.02)


def test_kerf_times_way_is_rate_times_time_at_each_face():
    sweep = random_sweep(5)
    (timed,), (timing,), _ = time_sweeps([sweep], CONDITIONS, MACHINE)
    for share, kerf_mm in zip((0.0, 1.0), timed.kerf_mm, strict=True):
        rail = sweep.near if share == 0.0 else sweep.far
        inside = (np.minimum(rail[1:, 0], 1200.0) - np.maximum(rail[:-1, 0], 0.0)).clip(0) / np.diff(rail[:, 0])
        way = (normal_speed(sweep, timing, share) * timing.step_seconds * inside).sum()
        spent = (timing.step_seconds * inside).sum()
        assert (kerf_mm - CONDITIONS.least_kerf_mm) * way == pytest.approx(CONDITIONS.kerf_rate_mm2_s * spent, rel=1e-9)


def test_twist_is_the_turn_of_the_wire_over_its_way():
    _, (timing,), _ = time_sweeps([sample_sweep()], CONDITIONS, MACHINE)
    # The middle rulings turn by 2 x 60 mm x 2 / 1200 mm of slope over 1000 mm of wire a mm of travel.
    assert timing.twist_deg_per_m == pytest.approx(np.degrees(0.2 / 1.0), rel=2e-3)


def test_finer_rulings_change_the_time_with_the_square_of_their_step():
    def seconds(n):
        x = np.linspace(-20.0, 1220.0, n)
        near = np.stack([x, 150.0 + 40.0 * np.sin(x / 150.0)], axis=1)
        far = np.stack([x, 150.0 + 40.0 * np.cos(x / 190.0)], axis=1)
        steps = sweep_steps([sample_sweep(near=near, far=far)], MACHINE)
        return (steps.middle / CONDITIONS.planned_mm_s).sum()

    fine = seconds(4001)
    errors = np.array([abs(seconds(n) - fine) for n in (51, 101, 201)])
    assert (np.log2(errors[:-1] / errors[1:]) > 1.8).all()


def test_sweeps_of_different_counts_are_timed_as_if_alone():
    sweeps = [flat_sweep(5), random_sweep(1, 17), fan_sweep(), random_sweep(2, 90)]
    together = time_sweeps(sweeps, CONDITIONS, MACHINE)
    for index, sweep in enumerate(sweeps):
        alone = time_sweeps([sweep], CONDITIONS, MACHINE)
        assert alone[0][0].kerf_mm == pytest.approx(together[0][index].kerf_mm, rel=1e-12)
        np.testing.assert_allclose(alone[1][0].step_seconds, together[1][index].step_seconds, rtol=1e-12)
    assert [finding.code for finding in together[2]] == [
        finding.code for sweep in sweeps for finding in time_sweeps([sweep], CONDITIONS, MACHINE)[2]
    ]
    assert time_sweeps([], CONDITIONS, MACHINE) == ((), (), ())


def test_a_thousand_sweeps_take_less_than_three_seconds():
    sweep = random_sweep(3, 150)
    start = time.process_time()
    time_sweeps([sweep] * 1000, CONDITIONS, MACHINE)
    assert time.process_time() - start < 3.0


def test_a_cancel_is_noticed():
    def cancel(fraction, text):
        raise Cancelled

    with pytest.raises(Cancelled):
        time_sweeps([flat_sweep()], CONDITIONS, MACHINE, cancel)
