"""How fast each point of a straight wire moves across itself, and what unequal ends do to the kerf.

Velocity along a straight wire is linear in the fraction s of the way from one end to the other. So is what is left of
it when the part along the wire is taken away, and the square of that is a convex parabola in s: its largest value over
an interval lies at an end of it, its smallest may lie inside.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Floats


class NormalSpeeds(NamedTuple):
    """Wire-normal speeds over an interval of the wire, (n,) each, in the unit of the velocities."""

    at_start: Floats
    at_end: Floats
    least: Floats  # the true minimum, at an end or inside
    least_at: Floats  # fraction of the wire where that is

    @property
    def largest(self) -> Floats:
        """The true maximum, which lies at an end."""
        result: Floats = np.maximum(self.at_start, self.at_end)
        return result


def normal_part(velocities: Floats, directions: Floats) -> Floats:
    """Return velocities less their part along the wire.

    Args:
        velocities: (n, 3).
        directions: (n, 3), of any length but 0.
    """
    along = np.einsum("ij,ij->i", velocities, directions) / np.einsum("ij,ij->i", directions, directions)
    result: Floats = velocities - along[:, None] * directions
    return result


def normal_speeds(
    near_velocities: Floats, far_velocities: Floats, directions: Floats, start: ArrayLike = 0.0, end: ArrayLike = 1.0
) -> NormalSpeeds:
    """Return the wire-normal speeds at both ends of an interval of the wire and their true minimum inside it.

    Args:
        near_velocities: (n, 3) of the wire's near end, s = 0.
        far_velocities: (n, 3) of its far end, s = 1.
        directions: (n, 3) along the wire, of any length but 0.
        start: Fraction s where the interval begins, (n,) or one for all.
        end: Where it ends, not before `start`.
    """
    near = normal_part(near_velocities, directions)
    change = normal_part(far_velocities, directions) - near
    starts, ends = np.broadcast_to(start, len(near)), np.broadcast_to(end, len(near))

    def speed(fractions: Floats) -> Floats:
        moved: Floats = np.linalg.norm(near + fractions[:, None] * change, axis=1)
        return moved

    curvature = np.einsum("ij,ij->i", change, change)
    lean = np.einsum("ij,ij->i", near, change)
    vertex = np.divide(-lean, curvature, out=np.array(starts, dtype=np.float64), where=curvature > 0.0)
    least_at = np.clip(vertex, starts, ends)
    return NormalSpeeds(at_start=speed(starts), at_end=speed(ends), least=speed(least_at), least_at=least_at)


def taper_kerf(fraction: ArrayLike, least_kerf: ArrayLike, slow_excess: ArrayLike, ratio: ArrayLike) -> Floats:
    """Return the kerf along a wire whose ends move the same way at unequal speeds: w0 + excess / (1 + s (R - 1)).

    Args:
        fraction: s, from one end, mostly the slow one, to the other.
        least_kerf: w0.
        slow_excess: Kerf beyond w0 at the first end.
        ratio: R, speed of the second end over that of the first, over 0.
    """
    result: Floats = np.asarray(least_kerf) + np.asarray(slow_excess) / (
        1.0 + np.asarray(fraction) * (np.asarray(ratio) - 1.0)
    )
    return result


def kerf_along(ends: tuple[float, float], least_kerf: float, fractions: Floats) -> Floats:
    """Return the kerf along a wire whose ends move the same way, given the kerf at both: see `taper_kerf`.

    Args:
        ends: At the near and the far end, both over the least kerf.
        least_kerf: w0, at boundless speed.
        fractions: Of the way from the near to the far end.
    """
    near, far = (max(end - least_kerf, 1e-9) for end in ends)
    return taper_kerf(fractions, least_kerf, near, near / far)


def kerf_gain(excess: float, slowness: tuple[float, float], fractions: Floats) -> Floats:
    """Return what the kerf along a wire is over the one at mid-wire, where its ends are slower than that or faster.

    Args:
        excess: Kerf at mid-wire beyond w0; none where it is not over 0.
        slowness: Speed of mid-wire over that of the near and of the far end, over 0.
        fractions: Of the way from the near to the far end.
    """
    excess = max(excess, 0.0)
    return taper_kerf(fractions, -excess, excess * slowness[0], slowness[0] / slowness[1])


def taper_mean(ratio: ArrayLike) -> Floats:
    """Return the mean of the excess kerf along such a wire over that at the slow end: ln R / (R - 1)."""
    beyond = np.asarray(ratio, dtype=np.float64) - 1.0
    result: Floats = np.divide(np.log1p(beyond), beyond, out=np.ones_like(beyond), where=beyond > 0.0)[()]
    return result


def taper_chord_gap(ratio: ArrayLike) -> Floats:
    """Return how far the kerf along such a wire hangs below the straight line between its ends at most.

    As a part of the excess kerf at the slow end: (1 - 1 / sqrt R)^2, at s = 1 / (1 + sqrt R). Half of it is the error
    that stays in a face whose offset is right at both ends.
    """
    result: Floats = (1.0 - 1.0 / np.sqrt(np.asarray(ratio, dtype=np.float64))) ** 2
    return result


def largest_ratio(face_error: ArrayLike, slow_excess: ArrayLike) -> Floats:
    """Return the largest end-speed ratio at which a face offset right at both ends stays within an error.

    Args:
        face_error: Allowed error of the face, 0 or more.
        slow_excess: Kerf beyond w0 at the slow end, above 0, in the same unit.

    Returns:
        Ratios from 1; infinite where any ratio will do.
    """
    root = np.sqrt(2.0 * np.asarray(face_error, dtype=np.float64) / np.asarray(slow_excess))
    result: Floats = np.divide(1.0, (1.0 - root) ** 2, out=np.full_like(root, np.inf), where=root < 1.0)[()]
    return result
