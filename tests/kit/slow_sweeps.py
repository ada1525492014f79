"""Sweeps one part of whose wire goes slowly."""

import numpy as np
from kit.sample import sample_sweep


def rails(x, near_z, far_z):
    return {
        "near": np.stack([x, np.broadcast_to(near_z, x.shape)], axis=1),
        "far": np.stack([x, np.broadcast_to(far_z, x.shape)], axis=1),
    }


def zigzag_sweep(near_slope=0.0, far_slope=3.0, n_rulings=63):
    """A wire whose ends climb and fall at slopes of their own, step after step."""
    x = np.linspace(-20.0, 1220.0, n_rulings)
    teeth = 0.5 * np.diff(x)[0] * np.resize([1.0, -1.0], n_rulings)
    return sample_sweep(**rails(x, 150.0 + near_slope * teeth, 150.0 + far_slope * teeth))


def steep_middle_sweep(slope=3.0):
    """Level, but for its far rail, which falls and climbs between 400 and 800 mm; a ruling every 20 mm."""
    x = np.linspace(-20.0, 1220.0, 63)
    return sample_sweep(**rails(x, 700.0, 700.0 - slope * np.interp(x, [400.0, 600.0, 800.0], [0.0, 200.0, 0.0])))


def hypar_sweep(rise_mm=900.0):
    """A hypar: the near rail level, the far one straight up over 300 mm of travel."""
    x = np.linspace(-20.0, 320.0, 69)
    return sample_sweep(**rails(x, 500.0, 500.0 + rise_mm / 300.0 * x), length_mm=300.0, height_mm=2000.0)


def strip_of(sweep, start, end):
    """Return the part of a sweep between two fractions of its width, as a sweep of its own."""
    cut = [(1.0 - share) * sweep.near + share * sweep.far for share in (start, end)]
    return sample_sweep(near=cut[0], far=cut[1], width_mm=sweep.width_mm * (end - start), length_mm=sweep.length_mm)
