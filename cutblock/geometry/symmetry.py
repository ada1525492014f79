"""Motions of a surface onto itself upside down: a shift along one direction together with a flip across it.

Where the second fundamental form (L, M, N) of a surface obeys L' = -L, N' = -N and M' = M under (u, v) -> (u + s,
2 v0 - v), a piece of it turned over about u is the complement of the piece s further on, mirrored about v0 (glide
antisymmetry). With s = 0 the line v = v0 is a two-fold axis of the surface. On z = c u v every such motion is one.
"""

from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats

N_SAMPLES = 72  # of a side that motions are looked for at
_LEAST_OVERLAP = 0.4  # of the face that must meet itself
_N_REFINED = 40  # halvings of a step
_APART = 0.04  # of a side: motions nearer to each other are one


class Glide(NamedTuple):
    """One motion: along u by `shift`, flipped about v = `axis` (both in samples of the grid)."""

    likeness: float  # 1: the surface upside down; 0: nothing of it
    shift: float
    axis: float
    overlap: float  # share of the face that meets itself


def find_glides(form: Floats, least_likeness: float, most: int = 3) -> list[Glide]:
    """Return the glides along the first axis, those that bring most of the face onto itself first.

    The likeness is the correlation of the form with the moved one, all shifts at once by fast Fourier transforms, over
    what of the face meets itself.

    Args:
        form: (3, n_u, n_v) L, M and N on a regular grid.
        least_likeness: What counts as one.
        most: How many.
    """
    from scipy.signal import fftconvolve

    n_u, n_v = form.shape[1:]
    signs = np.array([-1.0, 1.0, -1.0])
    # Correlation along u, convolution along v: entry (i, j) is the shift i - (n_u - 1) and the doubled axis j.
    weights = np.array([1.0, 2.0, 1.0])
    product = sum(
        weight * sign * fftconvolve(part[::-1], part) for weight, sign, part in zip(weights, signs, form, strict=True)
    )
    energy = np.tensordot(weights, form**2, axes=1)
    ones = np.ones((n_u, n_v))
    # What the moved and the unmoved face hold where they meet.
    there, here = fftconvolve(energy[::-1], ones), fftconvolve(ones[::-1], energy)
    overlap = fftconvolve(ones, ones) / (n_u * n_v)
    likeness = product / np.maximum(0.5 * (there + here), 1e-9 * energy.sum())
    likeness[overlap < _LEAST_OVERLAP] = -1.0
    half = likeness[n_u - 1 :]
    peaks = _peaks(half, least_likeness - 0.1)
    glides = [_refined(form, Glide(0.0, float(i), j / 2.0, 0.0)) for i, j in peaks[: 4 * most]]
    good = sorted((glide for glide in glides if glide.likeness >= least_likeness), key=lambda glide: -glide.overlap)
    chosen: list[Glide] = []
    for glide in good:
        if all(
            abs(glide.shift - other.shift) > _APART * n_u or abs(glide.axis - other.axis) > _APART * n_v
            for other in chosen
        ):
            chosen.append(glide)
    return chosen[:most]


def _peaks(values: Floats, least: float) -> list[tuple[int, int]]:
    """Return where values are largest among their neighbours and over a limit, the largest first."""
    from scipy.ndimage import maximum_filter

    is_peak = (values == maximum_filter(values, size=5, mode="nearest")) & (values >= least)
    places = np.argwhere(is_peak)
    order = np.lexsort((places[:, 1], places[:, 0], -values[is_peak].round(6)))
    return [(int(i), int(j)) for i, j in places[order]]


def _refined(form: Floats, start: Glide) -> Glide:
    """Return the glide near one that is most like, between the samples."""
    best = _measured(form, start.shift, start.axis)
    step = 0.5
    for _ in range(_N_REFINED):
        beside = [
            _measured(form, best.shift + step * i, best.axis + step * j) for i, j in ((1, 0), (-1, 0), (0, 1), (0, -1))
        ]
        better = max(beside, key=lambda glide: glide.likeness)
        if better.likeness > best.likeness + 1e-12:
            best = better
        else:
            step /= 2.0
        if step < 1e-3:
            break
    return best


def _measured(form: Floats, shift: float, axis: float) -> Glide:
    """Return one glide with its likeness, the form interpolated between its samples."""
    from scipy.ndimage import map_coordinates

    n_u, n_v = form.shape[1:]
    u, v = np.meshgrid(np.arange(n_u) + shift, 2.0 * axis - np.arange(n_v), indexing="ij")
    is_on = (u >= 0.0) & (u <= n_u - 1.0) & (v >= 0.0) & (v <= n_v - 1.0)
    if not is_on.any():
        return Glide(-1.0, shift, axis, 0.0)
    there = np.stack([map_coordinates(part, [u[is_on], v[is_on]], order=3, mode="nearest") for part in form])
    here = form[:, is_on]
    weights = np.array([-1.0, 2.0, -1.0])
    product = float((weights @ (there * here)).sum())
    energy = float((np.abs(weights) @ (there**2 + here**2)).sum()) / 2.0
    return Glide(product / energy if energy > 0.0 else -1.0, shift, axis, float(is_on.mean()))


def is_evenly_twisted(form: Floats, least_likeness: float) -> bool:
    """Return whether a surface is z = c u v all over, but for tilts: twisted alike everywhere and else straight.

    Args:
        form: (3, n_u, n_v) L, M and N on a regular grid.
        least_likeness: Share of the form's energy that an even twist makes up.
    """
    energy = float((form[0] ** 2 + 2.0 * form[1] ** 2 + form[2] ** 2).mean())
    return energy > 0.0 and 2.0 * float(form[1].mean()) ** 2 >= least_likeness * energy


def is_translation_surface(form: Floats, least_likeness: float) -> bool:
    """Return whether a surface is a curve along u moved along a curve along v: it has hardly any twist.

    Args:
        form: (3, n_u, n_v) L, M and N on a regular grid.
        least_likeness: Share of the form's energy that bending makes up.
    """
    energy = float((form[0] ** 2 + 2.0 * form[1] ** 2 + form[2] ** 2).mean())
    return 2.0 * float((form[1] ** 2).mean()) <= (1.0 - least_likeness) * energy
