"""The wire over the time of one sweep, for a picture of it as it is cut."""

from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Sweep, SweepTiming


class WireTrack(NamedTuple):
    """Where the wire is at each ruling of a sweep, in the billet frame, and what it melts there."""

    seconds: Floats  # (n,) from the first ruling
    near: Floats  # (n, 2) x and z at y = 0, mm
    far: Floats  # (n, 2) x and z at y = width, mm
    near_speed_mm_s: Floats  # (n,) of the wire square to itself, at the near face
    far_speed_mm_s: Floats
    near_kerf_mm: Floats  # (n,) least kerf + kerf rate / speed
    far_kerf_mm: Floats


def track_wire(sweep: Sweep, timing: SweepTiming, conditions: Conditions) -> WireTrack:
    """Return the wire's track through one sweep.

    The speed at a ruling is that of the way between its neighbours (at an end, of the one step there), less the part
    along the wire, which cuts nothing. The kerf follows from the speed as `least_kerf_mm + kerf_rate_mm2_s / speed` and
    is infinite where an end of the wire stands still.

    Raises:
        GeometryError: The times are not one fewer than the rulings, or not above 0.
    """
    steps = timing.step_seconds
    if len(steps) != len(sweep.near) - 1 or not (steps > 0.0).all():
        raise GeometryError(
            f"has {len(sweep.near)} rulings and {len(steps)} times, which must be one fewer and above 0",
            sweep.id,
            "Work out the speeds anew.",
        )
    seconds = np.concatenate([[0.0], np.cumsum(steps)])
    near, far = _in_space(sweep.near, 0.0), _in_space(sweep.far, sweep.width_mm)
    along = far - near
    along /= np.linalg.norm(along, axis=1, keepdims=True)
    speeds = [_square_speeds(rail, along, seconds) for rail in (near, far)]
    with np.errstate(divide="ignore"):
        kerfs = [conditions.least_kerf_mm + conditions.kerf_rate_mm2_s / speed for speed in speeds]
    return WireTrack(seconds, sweep.near, sweep.far, speeds[0], speeds[1], kerfs[0], kerfs[1])


class WireMoment(NamedTuple):
    """The wire at one time of its track."""

    near: tuple[float, float]  # x and z at y = 0, mm
    far: tuple[float, float]  # x and z at y = width, mm
    near_speed_mm_s: float
    far_speed_mm_s: float
    near_kerf_mm: float
    far_kerf_mm: float


def wire_at(track: WireTrack, seconds: float) -> WireMoment:
    """Return the wire at a time; before the first ruling it is there, after the last ruling there.

    Between two rulings the ends run straight, as the machine runs them; speeds and the inverse of the kerf, which is 0
    where an end stands still, go evenly from one to the next.
    """

    def at(values: Floats) -> float:
        return float(np.interp(seconds, track.seconds, values))

    kerfs = [at(1.0 / kerf_mm) for kerf_mm in (track.near_kerf_mm, track.far_kerf_mm)]
    near_kerf_mm, far_kerf_mm = (1.0 / inverse if inverse > 0.0 else float("inf") for inverse in kerfs)
    return WireMoment(
        near=(at(track.near[:, 0]), at(track.near[:, 1])),
        far=(at(track.far[:, 0]), at(track.far[:, 1])),
        near_speed_mm_s=at(track.near_speed_mm_s),
        far_speed_mm_s=at(track.far_speed_mm_s),
        near_kerf_mm=near_kerf_mm,
        far_kerf_mm=far_kerf_mm,
    )


def _in_space(rail: Floats, y_mm: float) -> Floats:
    return np.column_stack([rail[:, 0], np.full(len(rail), y_mm), rail[:, 1]])


def _square_speeds(rail: Floats, along: Floats, seconds: Floats) -> Floats:
    """Return the speed of one end of the wire square to the wire, (n,), mm/s."""
    before = np.concatenate([[0], np.arange(len(rail) - 1)])
    behind = np.concatenate([np.arange(1, len(rail)), [len(rail) - 1]])
    velocity = (rail[behind] - rail[before]) / (seconds[behind] - seconds[before])[:, None]
    square = velocity - np.einsum("ij,ij->i", velocity, along)[:, None] * along
    speeds: Floats = np.linalg.norm(square, axis=1)
    return speeds
