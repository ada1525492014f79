"""Whole facades that are known to pair up."""

from dataclasses import replace

import numpy as np
from kit.sample import sample_conditions, sample_job, sample_panel, sample_sweep

from cutblock.geometry import fit_ruled
from cutblock.pairing.match import pair_sweeps

LENGTH, WIDTH = 1200.0, 1000.0
CONDITIONS = sample_conditions(kerf_mm=0.0)


def bed_panel(name, height, x0, y0):
    """The panel of z = height(x, y) with its lower corner at (x0, y0), vertical axes, and the sweep fitted to it."""
    x, y = np.meshgrid(np.linspace(0.0, LENGTH, 25), np.linspace(0.0, WIDTH, 21), indexing="ij")
    z = height(x0 + x, y0 + y)
    slopes = [
        (height(x0 + x + dx, y0 + y + dy) - height(x0 + x - dx, y0 + y - dy)) / 2e-2
        for dx, dy in ((1e-2, 0), (0, 1e-2))
    ]
    normals = np.stack([-slopes[0], -slopes[1], np.ones_like(z)], axis=-1)
    normals /= np.linalg.norm(normals, axis=-1, keepdims=True)
    panel = sample_panel(
        name,
        heights_mm=z,
        samples_mm=np.stack([x, y, z], axis=-1).reshape(-1, 3),
        normals=normals.reshape(-1, 3),
        areas_mm2=np.full(z.size, LENGTH * WIDTH / z.size),
    )
    fit = fit_ruled(lambda x, y: height(x0 + x, y0 + y), LENGTH, WIDTH, 1.0)
    middle = round(500.0 - (z.max() + z.min()) / 2.0, 6)
    up = np.array([0.0, middle])
    sweep = sample_sweep(f"SM-{name}", (name,), near=fit.near + up, far=fit.far + up, height_mm=1000.0)
    lower = replace(sweep.serving[0], shift_mm=np.array([0.0, 0.0, -middle]))
    return panel, replace(sweep, serving=(lower,))


def pair_all(made):
    panels, sweeps = zip(*made, strict=True)
    return pair_sweeps(sample_job(), panels, sweeps, CONDITIONS)


def renamed(made, name):
    panel, sweep = made
    return replace(panel, id=name), replace(sweep, id=f"SM-{name}", serving=(replace(sweep.serving[0], panel=name),))


def test_a_hypar_facade_symmetric_about_its_rulings_pairs_all_its_panels():
    corners = [(LENGTH * column - 4800.0, WIDTH * row - 5000.0) for row in range(10) for column in range(8)]

    sweeps, _, _ = pair_all(
        [bed_panel(f"P{k}", lambda x, y: 3e-5 * x * y, *corner) for k, corner in enumerate(corners)]
    )

    assert sum(len(sweep.serving) for sweep in sweeps) == 80
    assert all(len(sweep.serving) == 2 for sweep in sweeps)


def test_a_translation_surface_of_sines_with_joints_in_step_pairs_all_its_panels():
    def height(x, y):
        return 60.0 * np.sin(2 * np.pi * x / 4800.0) + 12.0 * np.sin(2 * np.pi * y / 6000.0)

    period = [bed_panel("P", height, LENGTH * column, WIDTH * row - 3000.0) for row in range(6) for column in range(4)]

    sweeps, _, _ = pair_all([renamed(made, f"P{k}-{turn}") for turn in range(4) for k, made in enumerate(period)])

    assert sum(len(sweep.serving) for sweep in sweeps) == 96
    assert all(len(sweep.serving) == 2 for sweep in sweeps)
    assert max(sweep.serving[1].max_mm for sweep in sweeps) <= 2.0


def test_a_dome_pairs_none_of_its_panels():
    def height(x, y):
        return -(x**2) / 2.4e4 - y**2 / 4e5

    corners = [(-1200.0, -1000.0), (0.0, -1000.0), (-1200.0, 0.0), (0.0, 0.0)]

    sweeps, _, _ = pair_all([bed_panel(f"P{k}", height, *corner) for k, corner in enumerate(corners)])

    assert all(len(sweep.serving) == 1 for sweep in sweeps)
