"""Volumes and areas of the ruled sheet between two rails: exact for polyline rails, over any footprint.

Between neighbouring rulings the sheet is bilinear. Volumes over a footprint are integrated round its edges (Green's
theorem: the integral of f over a region is that of F dy round it, F being the integral of f along x). F is a sum over
the strips from ruling to ruling; each strip's part is split where the edge passes under its two rulings, so that every
piece is smooth and Gauss points integrate it to rounding.
"""

from collections.abc import Callable, Iterator, Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, floats, one_number
from cutblock.base.errors import GeometryError
from cutblock.base.tolerances import PLAN_MM

_EDGE_POINTS = 16  # Gauss points on each of the three smooth pieces of an edge
_RULING_POINTS = 8  # Gauss points from ruling to ruling
_FINE_RULING_POINTS = 4  # likewise where the rulings lie close together
_FINE_RULINGS = 24

# Takes, for each of the n - 1 strips, m places across the wire in [0, 1] and m values of x, (n - 1, m) each; returns
# one or more integrals over the strip along x, from its first ruling to there, (..., n - 1, m).
Integral = Callable[[Floats, Floats], Floats]


def check_rails(near: Floats, far: Floats, width_mm: float) -> tuple[Floats, Floats]:
    """Return both rails as arrays of finite floats.

    Args:
        near: (n, 2) x and z of the rail at y = 0.
        far: (n, 2) likewise at y = `width_mm`.
        width_mm: Distance of the rails, over 0.

    Raises:
        GeometryError: The shapes are wrong, fewer than two rulings, no width, or a rail that does not run forward
            (neighbouring rulings would cross over the billet).
    """
    near = floats(near, (None, 2), "near")
    far = floats(far, (None, 2), "far")
    if len(near) != len(far):
        raise GeometryError(
            f"the near rail has {len(near)} rows and the far rail {len(far)}",
            "rails",
            "Row i of both must be the two ends of ruling i.",
        )
    if len(near) < 2:
        raise GeometryError(f"a sweep needs at least 2 rulings, not {len(near)}", "rails")
    if not (np.isfinite(one_number(width_mm, "width")) and width_mm > 0.0):
        raise GeometryError(f"the width is {one_number(width_mm, 'width'):g} mm; it must be over 0", "rails")
    for name, rail in (("near", near), ("far", far)):
        steps = np.diff(rail[:, 0])
        if (steps <= 0.0).any():
            row = int(np.argmax(steps <= 0.0))
            raise GeometryError(
                f"the {name} rail runs back at ruling {row + 2}, "
                f"from x = {rail[row, 0]:.3f} mm to {rail[row + 1, 0]:.3f} mm, so neighbouring rulings cross",
                "rails",
                "Let x rise from each row to the next on both rails.",
            )
    return near, far


def volume_below(near: Floats, far: Floats, width_mm: float) -> float:
    """Return the volume between z = 0 and the sheet, from the first ruling to the last.

    Exact for polyline rails. The whole of a billet lies between square ends where both rails begin at x = 0 and end
    at its length; for rails that run out past the billet see `volume_below_within`.

    With bars for the means and D for the steps from ruling to ruling,
    V = W [(sum zA DxA + sum zB DxB) / 3 + (sum zA DxB + sum zB DxA) / 6].

    Args:
        near: (n, 2) x and z of the rail at y = 0, mm, x rising.
        far: (n, 2) likewise at y = `width_mm`; row i is the other end of ruling i.
        width_mm: Distance of the rails.

    Returns:
        Volume in mm3.

    Raises:
        GeometryError: See `check_rails`.

    Example:
        >>> round(volume_below([[0, 310], [1200, 190]], [[0, 190], [1200, 310]], 1000.0) / 1e6, 6)
        300.0
    """
    near, far = check_rails(near, far, width_mm)
    near_steps, far_steps = np.diff(near[:, 0]), np.diff(far[:, 0])
    near_means, far_means = (near[1:, 1] + near[:-1, 1]) / 2.0, (far[1:, 1] + far[:-1, 1]) / 2.0
    same = near_means @ near_steps + far_means @ far_steps
    mixed = near_means @ far_steps + far_means @ near_steps
    return float(width_mm * (same / 3.0 + mixed / 6.0))


def volume_below_within(
    near: Floats, far: Floats, length_mm: float, width_mm: float, outline: Sequence[Floats] | None = None
) -> float:
    """Return the volume between z = 0 and the sheet over a billet, or over an outline inside it.

    The rails may run out past the billet, one further than the other; what lies over it is exact to rounding.

    Args:
        near: (n, 2) x and z of the rail at y = 0, mm, x rising strictly, from x <= 0 to x >= `length_mm`.
        far: (n, 2) likewise at y = `width_mm`.
        length_mm: The billet's length: its plan is [0, length] x [0, width].
        width_mm: The billet's width.
        outline: Rings (k, 2) in the billet's plan, not closed: the outer one, then holes. None: the whole plan.

    Returns:
        Volume in mm3.

    Raises:
        GeometryError: See `check_rails`, or the sheet does not cover the billet.
    """
    near, far = check_rails(near, far, width_mm)

    def below(across: Floats, x: Floats) -> Floats:
        begins, steps = strips_at(near, far, across)
        fractions = np.clip((x - begins[..., 0]) / steps[..., 0], 0.0, 1.0)
        integral: Floats = fractions * steps[..., 0] * (begins[..., 1] + fractions * steps[..., 1] / 2.0)
        return integral

    return float(integrate_over(near, far, length_mm, width_mm, outline, below))


def sheet_area(
    near: Floats, far: Floats, length_mm: float, width_mm: float, outline: Sequence[Floats] | None = None
) -> float:
    """Return the area of the sheet over a billet, or over an outline inside it, in mm2.

    Args:
        near: As in `volume_below_within`.
        far: As there.
        length_mm: As there.
        width_mm: As there.
        outline: As there.

    Raises:
        GeometryError: See `volume_below_within`.
    """
    return kerf_volume(near, far, length_mm, width_mm, (1.0, 1.0), outline)


def kerf_volume(
    near: Floats,
    far: Floats,
    length_mm: float,
    width_mm: float,
    kerf_mm: tuple[float, float],
    outline: Sequence[Floats] | None = None,
) -> float:
    """Return the volume melted by a wire whose kerf runs linearly from one rail to the other.

    The volume of a tube of half-width r about a surface is 2 r A + 2/3 r^3 (integral of K) (Weyl, "On the volume of
    tubes", American Journal of Mathematics 61, 1939); the curvature term, a millionth of the first for a wire, is
    left out.

    Args:
        near: As in `volume_below_within`.
        far: As there.
        length_mm: As there.
        width_mm: As there.
        kerf_mm: Kerf at the near and at the far rail.
        outline: As there.

    Returns:
        Volume in mm3.

    Raises:
        GeometryError: See `volume_below_within`.
    """
    near, far = check_rails(near, far, width_mm)

    def melted(across: Floats, x: Floats) -> Floats:
        begins, steps = strips_at(near, far, across)
        fractions = np.clip((x - begins[..., 0]) / steps[..., 0], 0.0, 1.0)
        areas = sum(
            (element.areas for element in area_elements(near, far, width_mm, steps, fractions)),
            start=np.zeros_like(fractions),
        )
        integral: Floats = (kerf_mm[0] + across * (kerf_mm[1] - kerf_mm[0])) * areas
        return integral

    return float(integrate_over(near, far, length_mm, width_mm, outline, melted))


class AreaElement(NamedTuple):
    """One Gauss point of every strip from ruling to ruling, at places across the wire."""

    at: Floats  # fraction of the way from the first ruling to the second
    areas: Floats  # of the sheet it stands for, by unit of y
    steepness: Floats  # area of the sheet by that of its plan


def area_elements(
    near: Floats, far: Floats, width_mm: float, steps: Floats, fractions: Floats
) -> Iterator[AreaElement]:
    """Yield the Gauss points of the sheet's area from each strip's first ruling to a fraction of the way to its second.

    The element of area is |P_s x d| with P_s = (run, 0, climb) the step from ruling to ruling and d = (skew, W, rise)
    the ruling's vector, which runs linearly from ruling to ruling; by unit of y it is that over W.

    Args:
        near: (n, 2) x and z of the rail at y = 0.
        far: (n, 2) likewise at y = `width_mm`.
        width_mm: Distance of the rails.
        steps: (n - 1, m, 2) in x and z, see `strips_at`.
        fractions: (n - 1, m) in [0, 1].
    """
    nodes, weights = gauss_points(_RULING_POINTS if len(near) <= _FINE_RULINGS else _FINE_RULING_POINTS)
    skews, rises = (far - near).T[..., None]
    run, climb = steps[..., 0], steps[..., 1]
    for node, weight in zip(nodes, weights, strict=True):  # a handful
        at = fractions * node
        skew, rise = skews[:-1] + at * np.diff(skews, axis=0), rises[:-1] + at * np.diff(rises, axis=0)
        element = np.sqrt(run**2 + climb**2 + ((climb * skew - run * rise) / width_mm) ** 2)
        yield AreaElement(at, weight * fractions * element, element / run)


def integrate_over(
    near: Floats,
    far: Floats,
    length_mm: float,
    width_mm: float,
    outline: Sequence[Floats] | None,
    integral: Integral,
) -> Floats:
    """Return the integrals (...) over a footprint of what `integral` has integrated along x.

    Args:
        near: As in `volume_below_within`.
        far: As there.
        length_mm: As there.
        width_mm: As there.
        outline: As there.
        integral: The integrals along x.

    Raises:
        GeometryError: The sheet does not cover the billet.
    """
    check_cover(near, far, length_mm)
    if outline is None:
        outline = (np.array([[0.0, 0.0], [length_mm, 0.0], [length_mm, width_mm], [0.0, width_mm]]),)
    total: Floats = np.zeros(())
    for index, ring in enumerate(outline):
        corners = floats(ring, (None, 2), "outline")
        turned = np.roll(corners, -1, axis=0)
        around = float(np.sum(corners[:, 0] * turned[:, 1] - corners[:, 1] * turned[:, 0]))
        sign = float(np.sign(around)) * (1.0 if index == 0 else -1.0)
        for start, end in zip(corners, turned, strict=True):  # a handful of edges
            if start[1] != end[1]:
                total = total + sign * _along_edge(near, far, width_mm, start, end, integral)
    return total


def _along_edge(near: Floats, far: Floats, width_mm: float, start: Floats, end: Floats, integral: Integral) -> Floats:
    """Return the integrals (...) of F dy along one edge of the footprint."""
    skews = (far - near)[:, 0] / width_mm
    before, behind = (point[0] - near[:, 0] - skews * point[1] for point in (start, end))
    is_crossed = before * behind < 0.0
    crossings = np.where(is_crossed, before / np.where(is_crossed, before - behind, 1.0), 0.0)
    ends = np.zeros(len(near) - 1), np.ones(len(near) - 1)
    breaks = np.sort(np.stack([ends[0], crossings[:-1], crossings[1:], ends[1]], axis=1), axis=1)
    nodes, weights = gauss_points(_EDGE_POINTS)
    lengths = np.diff(breaks, axis=1)[..., None]
    along = (breaks[:, :-1, None] + lengths * nodes).reshape(len(breaks), -1)
    x, y = start[0] + along * (end[0] - start[0]), start[1] + along * (end[1] - start[1])
    parts = (lengths * weights).reshape(len(breaks), -1) * integral(y / width_mm, x)
    total: Floats = parts.sum(axis=(-2, -1)) * (end[1] - start[1])
    return total


def strips_at(near: Floats, far: Floats, across: Floats) -> tuple[Floats, Floats]:
    """Return x and z of each strip's first ruling at places across (n - 1, m), and the steps to its second one."""
    begins = near[:-1, None] + across[..., None] * (far - near)[:-1, None]
    ends = near[1:, None] + across[..., None] * (far - near)[1:, None]
    return begins, ends - begins


def check_cover(near: Floats, far: Floats, length_mm: float) -> None:
    """Check that the sheet covers the whole length of a billet.

    Args:
        near: (n, 2) x and z of one rail, x rising.
        far: (n, 2) of the other.
        length_mm: The billet's length.

    Raises:
        GeometryError: A rail begins behind x = 0 or ends before `length_mm`.
    """
    for name, rail in (("near", near), ("far", far)):
        if rail[0, 0] > PLAN_MM or rail[-1, 0] < length_mm - PLAN_MM:
            raise GeometryError(
                f"the {name} rail runs from x = {rail[0, 0]:.3f} mm to {rail[-1, 0]:.3f} mm "
                f"and does not cover the billet from 0 to {length_mm:.3f} mm",
                "rails",
                "Let both rails begin before the billet and end behind it.",
            )


def gauss_points(n_points: int) -> tuple[Floats, Floats]:
    """Return Gauss-Legendre nodes and weights on [0, 1]."""
    nodes, weights = np.polynomial.legendre.leggauss(n_points)
    return (nodes + 1.0) / 2.0, weights / 2.0
