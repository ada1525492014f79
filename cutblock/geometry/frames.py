"""Rigid frames: the best-fit plane, turning, and the way in and out of a frame.

A frame is an origin (3,) and a right-handed (3, 3) array whose rows are its unit axes: p_frame = (p - origin) @ axes.T.
"""

import numpy as np

from cutblock.base.arrays import Floats


def to_frame(points: Floats, origin: Floats, axes: Floats) -> Floats:
    """Return (..., 3) points of the form in the frame."""
    inside: Floats = (points - origin) @ axes.T
    return inside


def from_frame(points: Floats, origin: Floats, axes: Floats) -> Floats:
    """Return (..., 3) points of the frame in the form."""
    outside: Floats = origin + points @ axes
    return outside


def unit(vector: Floats) -> Floats:
    """Return a (3,) vector scaled to length 1; a zero vector stays."""
    length = float(np.sqrt((vector * vector).sum()))
    scaled: Floats = vector / length if length > 0.0 else vector
    return scaled


def rotation_about(axis: Floats, angle_rad: float) -> Floats:
    """Return the (3, 3) matrix R of a turn about a (3,) axis (Rodrigues); p turns to `p @ R.T`."""
    x, y, z = unit(np.asarray(axis, dtype=np.float64))
    cross = np.array([[0.0, -z, y], [z, 0.0, -x], [-y, x, 0.0]])
    matrix: Floats = np.eye(3) + np.sin(angle_rad) * cross + (1.0 - np.cos(angle_rad)) * (cross @ cross)
    return matrix


def frame_axes(up: Floats, along: Floats) -> Floats:
    """Return the axes whose z is `up` and whose x is `along` laid into the plane.

    An axis that is a coordinate axis to rounding becomes exactly that. Where `along` is parallel to `up` some other
    direction stands in, always the same.
    """
    z = _snapped(unit(up))
    x = along - (along @ z) * z
    if float(np.abs(x).max()) <= 1e-9 * float(np.abs(along).max(initial=1e-300)):
        fallback = np.eye(3)[int(np.argmin(np.abs(z)))]
        x = fallback - (fallback @ z) * z
    x = _snapped(unit(x))
    return np.stack([x, np.cross(z, x) + 0.0, z])


def _snapped(axis: Floats) -> Floats:
    nearest = np.round(axis) + 0.0  # no negative zeros
    return nearest if float(np.abs(axis - nearest).max()) < 1e-12 else axis


def best_fit_frame(points: Floats, weights: Floats, up: Floats, along: Floats) -> tuple[Floats, Floats]:
    """Return the frame of the plane that lies closest to weighted points.

    The normal is found by turning it until the least-squares plane of the heights along it has no slope; that plane
    is the one of least squared distance. For the points of a panel each turn gains two digits or more.

    Args:
        points: (m, 3).
        weights: (m,) not negative.
        up: (3,) a rough normal; the frame's z keeps to its side.
        along: (3,) the direction its x follows.

    Returns:
        The weighted centre and the axes.
    """
    share = weights / weights.sum()
    centre: Floats = (share[:, None] * points).sum(axis=0)
    offsets = points - centre
    spread = np.einsum("m,mi,mj->ij", share, offsets, offsets)
    normal = unit(up)
    for _ in range(60):
        x, y, z = frame_axes(normal, along)
        xx, xy, yy = x @ spread @ x, x @ spread @ y, y @ spread @ y
        xz, yz = x @ spread @ z, y @ spread @ z
        determinant = xx * yy - xy * xy
        if determinant <= 0.0:
            break
        slope_x = (yy * xz - xy * yz) / determinant
        slope_y = (xx * yz - xy * xz) / determinant
        normal = unit(z - slope_x * x - slope_y * y)
        if max(abs(slope_x), abs(slope_y)) < 1e-15:
            break
    return centre, frame_axes(normal, along)


def smallest_rectangle_turn(points: Floats) -> tuple[float, float, float]:
    """Return the turn of the smallest rectangle round plan points, and how much smaller it is.

    One side of the smallest rectangle lies along an edge of the convex hull (Freeman and Shapira, CACM 18, 1975).

    Args:
        points: (m, 2), not all in line.

    Returns:
        The turn in rad, in [-pi/4, pi/4], that brings the plan's axes along it; its area; the area without a turn.
    """
    from scipy.spatial import ConvexHull

    hull = points[ConvexHull(points).vertices]
    edges = np.roll(hull, -1, axis=0) - hull
    edges = edges[np.hypot(edges[:, 0], edges[:, 1]) > 1e-6]
    angles = np.arctan2(edges[:, 1], edges[:, 0])
    quarter = np.pi / 2.0
    angles = np.concatenate([[0.0], angles - quarter * np.round(angles / quarter)])
    cosines, sines = np.cos(angles), np.sin(angles)
    x = np.outer(cosines, hull[:, 0]) + np.outer(sines, hull[:, 1])
    y = np.outer(cosines, hull[:, 1]) - np.outer(sines, hull[:, 0])
    areas = np.ptp(x, axis=1) * np.ptp(y, axis=1)
    # Of equally small rectangles the least turned one, whatever the order of the hull.
    small = areas <= areas.min() * (1.0 + 1e-9)
    best = int(np.argmin(np.where(small, np.abs(angles), np.inf)))
    return float(angles[best]), float(areas[best]), float(areas[0])
