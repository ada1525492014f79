"""From fitted B-spline rails to the polyline rails a sweep is made of."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.geometry.fit_refine import basis_at
from cutblock.geometry.sheet import sheet_heights

FEWEST_RULINGS = 33
MOST_RULINGS = 1001
LEAST_STEP_MM = 0.01
TANGENT_SHARE = 0.3  # how much of a stray along a rail shows across it, at slopes of the trade


@dataclass(frozen=True, slots=True, eq=False)
class SheetFit:
    """A ruled sheet in the frame of its billet: cubic B-splines on equal knots over stations from start to end.

    Row 0 of `controls` is the skew x far - x near, rows 1 and 2 the elevations of the near and the far rail; station s
    is the x at mid-wire. Beyond the ends the skew stays and both rails go on straight.
    """

    controls: Floats  # (3, c)
    start_mm: float
    end_mm: float
    max_mm: float  # normal deviation on the fit's own nodes
    rms_mm: float

    @property
    def skew_mm(self) -> float:
        """Largest size of the skew among the control values."""
        return float(np.abs(self.controls[0]).max())

    def rails_at(self, stations: Floats) -> tuple[Floats, Floats]:
        """Return near and far rail points (s, 2), x and z, at stations (s,)."""
        length = self.end_mm - self.start_mm
        u = (stations - self.start_mm) / length
        inside = np.clip(u, 0.0, 1.0)
        n_controls = self.controls.shape[1]
        skew, near_z, far_z = self.controls @ basis_at(inside, n_controls).T
        turn, near_rate, far_rate = self.controls @ basis_at(inside, n_controls, 1).T
        # Rates are by u; a rail's own slope dz/dx takes in how fast its end advances.
        beyond = stations - self.start_mm - length * inside
        near_z = near_z + beyond * near_rate / (length - turn / 2.0)
        far_z = far_z + beyond * far_rate / (length + turn / 2.0)
        near = np.stack([stations - skew / 2.0, near_z], axis=1)
        far = np.stack([stations + skew / 2.0, far_z], axis=1)
        return near, far


def polyline_rails(
    fit: SheetFit,
    low_x_mm: float,
    high_x_mm: float,
    sag_mm: float,
    *,
    most_rulings: int = MOST_RULINGS,
    decimals: int | None = 6,
) -> tuple[Floats, Floats]:
    """Return rails (n, 2) whose chords stay within `sag_mm` of the curves.

    Both rails start at or before `low_x_mm` and end at or behind `high_x_mm`.

    Args:
        fit: The curves.
        low_x_mm: No wire end starts behind this.
        high_x_mm: No wire end ends before this.
        sag_mm: Largest distance of a chord from its curve.
        most_rulings: Between the fit's ends, whatever the sag.
        decimals: What coordinates are rounded to, so that the last bits of a computation do not show; None: not at all.
    """
    stations = fit.start_mm + (fit.end_mm - fit.start_mm) * _places(fit, sag_mm, most_rulings)
    spare = 0.0 if decimals is None else 10.0**-decimals
    first = low_x_mm - abs(float(fit.controls[0, 0])) / 2.0 - spare
    last = high_x_mm + abs(float(fit.controls[0, -1])) / 2.0 + spare
    # An end so close to a station that no ruling fits between takes its place.
    if abs(first - stations[0]) < LEAST_STEP_MM:
        stations[0] = min(first, stations[0])
    if abs(last - stations[-1]) < LEAST_STEP_MM:
        stations[-1] = max(last, stations[-1])
    before = [first] if first < stations[0] else []
    behind = [last] if last > stations[-1] else []
    near, far = fit.rails_at(np.concatenate([before, stations, behind]))
    if decimals is None:
        return near, far
    # Adding zero turns minus zero into zero, so that equal rails print alike.
    return np.round(near, decimals) + 0.0, np.round(far, decimals) + 0.0


def _places(fit: SheetFit, sag_mm: float, most_rulings: int) -> Floats:
    """Return places in [0, 1], closer where the rails bend more: a chord of step h strays |curve''| h^2 / 8."""
    u, bends = _bends(fit.controls.shape[1])
    skew, near_z, far_z = np.abs(fit.controls @ bends)
    bend = np.hypot(np.maximum(near_z, far_z), TANGENT_SHARE * skew / 2.0)
    density = np.sqrt(bend / (8.0 * sag_mm))
    # The larger of neighbouring densities, and never far below the mean: steps must not jump.
    density = np.maximum(np.maximum(density[:-1], density[1:]), 0.5 * density.mean())
    steps = np.maximum(density, FEWEST_RULINGS - 1.0) / (len(u) - 1.0)
    counts = np.concatenate([[0.0], np.cumsum(steps)])
    n_steps = max(FEWEST_RULINGS - 1, min(int(np.ceil(counts[-1] - 1e-6)), most_rulings - 1))
    places: Floats = np.interp(np.linspace(0.0, counts[-1], n_steps + 1), counts, u)
    return places


@lru_cache(maxsize=8)
def _bends(n_controls: int) -> tuple[Floats, Floats]:
    """Return equal places in [0, 1] and the second derivatives (n_controls, m) of the B-splines there."""
    u = np.linspace(0.0, 1.0, 257)
    return u, np.ascontiguousarray(basis_at(u, n_controls, 2).T)


def sheet_range(near: Floats, far: Floats, width_mm: float, length_mm: float) -> tuple[float, float]:
    """Return the lowest and the highest point of the sheet over the billet's plan [0, length] x [0, width].

    Heights are linear along each ruling, so they are looked for where rulings end or pass x = 0 and x = length, and
    at the four corners.

    Args:
        near: (n, 2) x and z at y = 0, x rising strictly, from before the billet to behind it.
        far: (n, 2) likewise at y = `width_mm`.
        width_mm: Along the wire.
        length_mm: Along the travel.
    """
    skew = far[:, 0] - near[:, 0]
    with np.errstate(divide="ignore", invalid="ignore"):
        crossings = np.stack([-near[:, 0] / skew, (length_mm - near[:, 0]) / skew])
    is_askew = np.abs(skew) > 1e-9
    first = np.where(is_askew, crossings.min(axis=0), 0.0).clip(0.0, 1.0)
    last = np.where(is_askew, crossings.max(axis=0), 1.0).clip(0.0, 1.0)
    middle = near[:, 0] + 0.5 * (first + last) * skew
    is_over = (first <= last) & (middle >= -1e-9) & (middle <= length_mm + 1e-9)
    rise = far[:, 1] - near[:, 1]
    ends = np.concatenate([(near[:, 1] + first * rise)[is_over], (near[:, 1] + last * rise)[is_over]])
    x, y = np.array([0.0, length_mm, 0.0, length_mm]), np.array([0.0, 0.0, width_mm, width_mm])
    heights = np.concatenate([ends, sheet_heights(near, far, width_mm, x, y)])
    return float(heights.min()), float(heights.max())
