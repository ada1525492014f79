"""The litres of kerf in the account against the speeds: what is melted does not depend on how it is counted."""

import numpy as np
import pytest

from cutblock.flow.folder import read_plan

_PARTS, _POINTS = 16, 64  # between two rulings, along the wire


def melted_mm3(sweep, volumes, timing, conditions):
    """Return V = w0 A + G x the integral of L dt, with L the length of wire in foam.

    Source: each piece of wire dl at normal speed v melts w0 + G / v across, and sweeps dA = v dl dt of the cut face.
    """
    sub = ((np.arange(_PARTS) + 0.5) / _PARTS)[None, :, None]
    near, far = (rail[:-1, None] + sub * np.diff(rail, axis=0)[:, None] for rail in (sweep.near, sweep.far))
    run = far - near
    lengths = np.sqrt(sweep.width_mm**2 + (run**2).sum(axis=-1))
    along = (np.arange(_POINTS) + 0.5) / _POINTS
    x = near[..., 0, None] + along * run[..., 0, None]
    in_foam = ((x >= 0.0) & (x <= sweep.length_mm)).mean(axis=-1)
    integral = float(((lengths * in_foam).mean(axis=1) * timing.step_seconds).sum())
    return conditions.least_kerf_mm * volumes.face_mm2 + conditions.kerf_rate_mm2_s * integral


@pytest.mark.parametrize("name", ["tide-wall", "weir-baffles"])
def test_kerf_by_the_tube_formula_is_kerf_by_the_speeds(scenario_folder, name):
    """The tube takes the kerf as a straight line between the ends of the wire; the speeds bend it by up to 3 %."""
    plan = read_plan(scenario_folder(name))

    for sweep, volumes, timing in zip(plan.sweeps, plan.volumes, plan.timings, strict=True):
        by_speed = melted_mm3(sweep, volumes, timing, plan.conditions)
        assert volumes.kerf_mm3 == pytest.approx(by_speed, rel=0.03), sweep.id


def test_the_kerf_of_a_whole_scenario_agrees_within_two_per_cent(scenario_folder):
    plan = read_plan(scenario_folder("tower-jacket"))

    by_speed = sum(
        melted_mm3(sweep, volumes, timing, plan.conditions)
        for sweep, volumes, timing in zip(plan.sweeps, plan.volumes, plan.timings, strict=True)
    )
    assert sum(volumes.kerf_mm3 for volumes in plan.volumes) == pytest.approx(by_speed, rel=0.02)


def test_a_schedule_at_half_the_speed_would_not_agree(scenario_folder):
    plan = read_plan(scenario_folder("weir-baffles"))
    sweep, volumes, timing = plan.sweeps[0], plan.volumes[0], plan.timings[0]
    slow = type(timing)(
        **{name: getattr(timing, name) for name in timing.__slots__ if name != "step_seconds"},
        step_seconds=2.0 * timing.step_seconds,
    )

    by_speed = melted_mm3(sweep, volumes, slow, plan.conditions)

    assert abs(volumes.kerf_mm3 - by_speed) > 0.5 * volumes.kerf_mm3
