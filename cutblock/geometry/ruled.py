"""Differential geometry of a ruled sheet P(s, v) = A(s) + v d(s), d = B - A, v in [0, 1].

Formulas as in Gray, Modern Differential Geometry of Curves and Surfaces, chapter on ruled surfaces, and do Carmo,
Differential Geometry of Curves and Surfaces, section 3-5, for rulings of any length: primes are rates by s.
"""

import numpy as np

from cutblock.base.arrays import Bools, Floats
from cutblock.geometry.sheet import locate


def normal_speed(tangents: Floats, rulings: Floats, rates: Floats, v: Floats | float) -> Floats:
    """Return J = |(A' + v d') x d| / |d|, how far the wire point moves square to the wire for each unit of s.

    Args:
        tangents: A', (n, 3).
        rulings: d, (n, 3), none of zero length.
        rates: d', (n, 3).
        v: Place on the ruling as a fraction, one or (n,).

    Returns:
        (n,) mm per unit of s.
    """
    moves = tangents + np.asarray(v)[..., None] * rates
    speeds: Floats = _length(np.cross(moves, rulings)) / _length(rulings)
    return speeds


def gaussian_curvature(tangents: Floats, rulings: Floats, rates: Floats, v: Floats | float) -> Floats:
    """Return K = -det(A', d, d')^2 / |(A' + v d') x d|^4, (n,) in 1/mm2, never over 0; arguments as `normal_speed`.

    Points where the sheet folds (J = 0) give minus infinity, or nan on a developable ruling.
    """
    moves = tangents + np.asarray(v)[..., None] * rates
    with np.errstate(divide="ignore", invalid="ignore"):
        curvature: Floats = -(_triple(tangents, rulings, rates) ** 2) / _length(np.cross(moves, rulings)) ** 4
    return curvature


def striction_place(tangents: Floats, rulings: Floats, rates: Floats) -> Floats:
    """Return where on each ruling the next one comes closest, v = -(A' x d).(d' x d) / |d' x d|^2.

    Args:
        tangents: A', (n, 3).
        rulings: d, (n, 3).
        rates: d', (n, 3).

    Returns:
        (n,) fractions of the ruling; nan where neighbouring rulings are parallel.
    """
    turns = np.cross(rates, rulings)
    with np.errstate(divide="ignore", invalid="ignore"):
        place: Floats = -_dot(np.cross(tangents, rulings), turns) / _dot(turns, turns)
    return place


def distribution_parameter(tangents: Floats, rulings: Floats, rates: Floats) -> Floats:
    """Return lambda = det(A', d, d') |d|^2 / |d x d'|^2, mm.

    K = -lambda^2 / (lambda^2 + u^2)^2 at the distance u from the striction point (Lamarle), and the tangent plane has
    turned there by atan(u / lambda) (Chasles). It is 0 on a developable ruling that turns, and infinite or nan where
    neighbouring rulings are parallel. Arguments as `striction_place`.
    """
    turns = np.cross(rulings, rates)
    with np.errstate(divide="ignore", invalid="ignore"):
        parameter: Floats = _triple(tangents, rulings, rates) * _dot(rulings, rulings) / _dot(turns, turns)
    return parameter


def tangent_turn(parameters: Floats, distances: Floats) -> Floats:
    """Return the angle in radians the tangent plane turns from the striction point to `distances` (Chasles)."""
    turn: Floats = np.arctan2(distances, parameters)
    return turn


def wire_turn(rulings: Floats, rates: Floats) -> Floats:
    """Return how fast the wire turns, |d x d'| / |d|^2, (n,) in radians per unit of s."""
    turn: Floats = _length(np.cross(rulings, rates)) / _dot(rulings, rulings)
    return turn


def twist_angles(near: Floats, far: Floats, width_mm: float) -> Floats:
    """Return the angle between each ruling and the next.

    Args:
        near: (n, 2) x and z at y = 0, mm.
        far: (n, 2) likewise at y = `width_mm`.
        width_mm: Distance of the rails, over 0.

    Returns:
        (n - 1,) radians in [0, pi].
    """
    rulings = _rulings(near, far, width_mm)
    # atan2(|a x b|, a.b) keeps full precision at small angles, where arccos loses half the digits.
    sines = _length(np.cross(rulings[:-1], rulings[1:]))
    angles: Floats = np.arctan2(sines, _dot(rulings[:-1], rulings[1:]))
    return angles


def end_speeds(near: Floats, far: Floats, width_mm: float) -> tuple[Floats, Floats]:
    """Return how far the near and the far wire end move square to the wire on each segment, (n - 1,) mm each.

    The wire is taken as it lies half way through the segment. Arguments as `twist_angles`.
    """
    middle = _rulings((near[1:] + near[:-1]) / 2.0, (far[1:] + far[:-1]) / 2.0, width_mm)
    tangents = _lifted(np.diff(near, axis=0))
    rates = _lifted(np.diff(far, axis=0)) - tangents
    return normal_speed(tangents, middle, rates, 0.0), normal_speed(tangents, middle, rates, 1.0)


def end_speed_ratios(near: Floats, far: Floats, width_mm: float) -> Floats:
    """Return the faster wire end's speed by the slower one's on each segment, (n - 1,), at least 1."""
    first, second = end_speeds(near, far, width_mm)
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio: Floats = np.maximum(first, second) / np.minimum(first, second)
    return ratio


def end_slowness(near: Floats, far: Floats, width_mm: float, length_mm: float) -> tuple[float, float]:
    """Return by how much each wire end crosses a billet slower than mid-wire, on the mean over its way in the billet.

    Args:
        near: As in `twist_angles`, x rising.
        far: Likewise.
        width_mm: Distance of the rails.
        length_mm: The billet lies between x = 0 and there.

    Returns:
        Way of mid-wire by the way of the near end, and of the far end, square to the wire; 1 where they are alike.
    """
    middle = _rulings((near[1:] + near[:-1]) / 2.0, (far[1:] + far[:-1]) / 2.0, width_mm)
    tangents = _lifted(np.diff(near, axis=0))
    rates = _lifted(np.diff(far, axis=0)) - tangents
    at_middle = normal_speed(tangents, middle, rates, 0.5)
    slowness = []
    for rail, place in ((near, 0.0), (far, 1.0)):
        x = np.clip(rail[:, 0], 0.0, length_mm)
        shares = np.diff(x) / np.diff(rail[:, 0])
        way = float(shares @ normal_speed(tangents, middle, rates, place))
        slowness.append(float(shares @ at_middle) / way if way > 0.0 else 1.0)
    return slowness[0], slowness[1]


def fold_places(near: Floats, far: Floats) -> Floats:
    """Return where along the wire each step of the sweep folds in plan, v* = dx_near / (dx_near - dx_far).

    Args:
        near: (n, 2) x and z at the near rail.
        far: (n, 2) likewise at the far one.

    Returns:
        (n - 1,) fractions of the ruling; the step folds in the billet where it lies in [0, 1], beside it elsewhere,
        nowhere (infinite) where both ends advance alike.
    """
    step_near, step_far = np.diff(near[:, 0]), np.diff(far[:, 0])
    with np.errstate(divide="ignore", invalid="ignore"):
        places: Floats = np.where(step_near == step_far, np.inf, step_near / (step_near - step_far))
    return places


def folds(near: Floats, far: Floats, length_mm: float) -> Bools:
    """Return which steps fold at a place in plan with 0 <= x <= length, (n - 1,); arguments as `fold_places`."""
    places = fold_places(near, far)
    is_across = (places >= 0.0) & (places <= 1.0) | (np.diff(near[:, 0]) <= 0.0) & (np.diff(far[:, 0]) <= 0.0)
    at = np.where(is_across & np.isfinite(places), places, 0.5)
    x = near[:-1, 0] + at * (far[:-1, 0] - near[:-1, 0])
    result: Bools = is_across & (x >= 0.0) & (x <= length_mm)
    return result


def sheet_normals(near: Floats, far: Floats, width_mm: float, x: Floats, y: Floats) -> tuple[Floats, Floats]:
    """Return the height of the sheet above plan points of any one shape, and its unit upward normals (..., 3)."""
    index, fraction = locate(near, far, width_mm, x, y)
    across = (np.asarray(y) / width_mm)[..., None]
    step_near, step_far = np.diff(near, axis=0), np.diff(far, axis=0)
    moves = (1.0 - across) * step_near[index] + across * step_far[index]
    near_end = near[index] + fraction[..., None] * step_near[index]
    far_end = far[index] + fraction[..., None] * step_far[index]
    along = far_end - near_end
    points = near_end + across * along
    # The cross product of (moves_x, 0, moves_z) and (along_x, width, along_z), turned upwards.
    normals = np.stack(
        [
            -moves[..., 1] * width_mm,
            moves[..., 1] * along[..., 0] - moves[..., 0] * along[..., 1],
            moves[..., 0] * width_mm,
        ],
        axis=-1,
    )
    normals /= _length(normals)[..., None]
    return points[..., 1], normals


def _rulings(near: Floats, far: Floats, width_mm: float) -> Floats:
    step = far - near
    return np.stack([step[:, 0], np.full(len(step), width_mm), step[:, 1]], axis=1)


def _lifted(steps: Floats) -> Floats:
    return np.stack([steps[:, 0], np.zeros(len(steps)), steps[:, 1]], axis=1)


def _dot(a: Floats, b: Floats) -> Floats:
    result: Floats = np.einsum("...i,...i->...", a, b)
    return result


def _length(vectors: Floats) -> Floats:
    result: Floats = np.sqrt(_dot(vectors, vectors))
    return result


def _triple(a: Floats, b: Floats, c: Floats) -> Floats:
    return _dot(a, np.cross(b, c))
