"""Curvatures of a height field and the plan directions in which a straight wire follows it best."""

from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Bools, Floats
from cutblock.geometry.heights import HeightField

FLAT_PER_MM = 1e-6  # a radius of 1 km; what bends less counts as flat


class Bend(NamedTuple):
    """Curvatures at the grid points of a height field, each (n_x, n_y)."""

    gaussian: Floats  # K, mm^-2
    mean: Floats  # H, mm^-1, positive where the surface is hollow upwards
    second: tuple[Floats, Floats, Floats]  # z_xx, z_xy, z_yy, mm^-1
    slopes: tuple[Floats, Floats]  # z_x, z_y

    @property
    def is_domed(self) -> Bools:
        """Where the surface curves the same way in all directions."""
        domed: Bools = self.gaussian > FLAT_PER_MM**2
        return domed

    def principal(self) -> tuple[Floats, Floats]:
        """Return the principal curvatures, the algebraically smaller first."""
        spread = np.sqrt(np.maximum(self.mean**2 - self.gaussian, 0.0))
        return self.mean - spread, self.mean + spread

    def along(self, angle_rad: float) -> Floats:
        """Return the normal curvature along the plan direction at `angle_rad` from x."""
        c, s = np.cos(angle_rad), np.sin(angle_rad)
        xx, xy, yy = self.second
        z_x, z_y = self.slopes
        bend = (c * c * xx + 2.0 * c * s * xy + s * s * yy) / np.sqrt(1.0 + z_x**2 + z_y**2)
        result: Floats = bend / (1.0 + (c * z_x + s * z_y) ** 2)
        return result


def bend_of(field: HeightField) -> Bend:
    """Return the curvatures of a height field at its grid points.

    K = (z_xx z_yy - z_xy^2) / g^2 and H = ((1 + z_y^2) z_xx - 2 z_x z_y z_xy + (1 + z_x^2) z_yy) / (2 g^(3/2)) with
    g = 1 + z_x^2 + z_y^2 (do Carmo, Differential Geometry of Curves and Surfaces, section 3-3, example 5).
    """
    z_x, z_y = field.grid(1, 0), field.grid(0, 1)
    xx, xy, yy = field.grid(2, 0), field.grid(1, 1), field.grid(0, 2)
    g = 1.0 + z_x**2 + z_y**2
    gaussian = (xx * yy - xy**2) / g**2
    mean = ((1.0 + z_y**2) * xx - 2.0 * z_x * z_y * xy + (1.0 + z_x**2) * yy) / (2.0 * g**1.5)
    return Bend(gaussian, mean, (xx, xy, yy), (z_x, z_y))


def straight_directions(bend: Bend, shares: Floats) -> tuple[float, ...]:
    """Return the plan directions, rad in [0, pi), in which the surface bends least, averaged over the field.

    Args:
        bend: From `bend_of`.
        shares: (n_x, n_y) weight of each grid point.
    """
    whole = float(shares.sum())
    xx, xy, yy = (float((shares * part).sum()) / whole for part in bend.second)
    return directions_of_form(xx, xy, yy)


def directions_of_form(xx: float, xy: float, yy: float) -> tuple[float, ...]:
    """Return the directions, rad in [0, pi), in which xx cos^2 + 2 xy cos sin + yy sin^2 is least in size.

    Where the form changes sign these are its two asymptotic directions; else the one of its smaller size, along which
    a wire strays least; none where all are alike.
    """
    half_sum, half_difference = (xx + yy) / 2.0, (xx - yy) / 2.0
    # The form is half_sum + radius cos(2 angle - lead).
    radius = float(np.hypot(half_difference, xy))
    lead = float(np.arctan2(xy, half_difference))
    if radius <= 1e-9 * abs(half_sum) + 1e-6 * FLAT_PER_MM:
        return ()
    if abs(half_sum) < radius:
        spread = float(np.arccos(-half_sum / radius))
        angles = [(lead + spread) / 2.0, (lead - spread) / 2.0]
    else:
        angles = [(lead + np.pi if half_sum > 0.0 else lead) / 2.0]
    return tuple(sorted(float(np.mod(angle, np.pi)) for angle in angles))


def domed_share(bend: Bend, is_on: Bools | None = None) -> float:
    """Return which share of the grid points, 0 to 1, is domed.

    Args:
        bend: From `bend_of`.
        is_on: (n_x, n_y) which points count; None for all.
    """
    domed = bend.is_domed if is_on is None else bend.is_domed[is_on]
    return float(domed.mean()) if domed.size else 0.0


def strips_on_dome(width_mm: float, curvature_per_mm: float, room_mm: float) -> int:
    """Return how many strips across the wire keep a dome within `room_mm`.

    One ruled strip of width w strays kappa w^2 / 16 at best, half the sagitta, each way; so m strips of w / m need
    m = ceil(w sqrt(kappa / (16 room))).
    """
    return max(1, int(np.ceil(width_mm * np.sqrt(abs(curvature_per_mm) / (16.0 * room_mm)) - 1e-9)))
