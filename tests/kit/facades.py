"""Descriptors of made-up facades, and their partners found by trying all of them."""

import numpy as np

from cutblock.pairing.shapes import N_GRID, Shapes

SQUARE = np.array([[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]]) * [600.0, 500.0]


def smooth_surfaces(rng, n):
    steps = (np.arange(N_GRID) + 0.5) / N_GRID * 2.0 - 1.0
    x, y = np.meshgrid(steps, steps, indexing="ij")
    terms = np.stack([x, y, x * y, x**2, y**2, x**2 * y, np.sin(3 * x), np.cos(2 * y + 0.5)])
    grids = np.tensordot(rng.normal(0.0, 2.0, (n, len(terms))), terms, axes=1)
    return grids - grids.mean(axis=(1, 2), keepdims=True)


def shapes_of(wanted, cut):
    n = len(wanted)
    return Shapes(np.tile([1200.0, 1000.0], (n, 1)), (SQUARE,) * n, np.zeros(n, dtype=np.int64), wanted, cut)


def facade(rng, n):
    """Half of the surfaces are complements of the other half, a little off; every third one is mirrored instead."""
    base = smooth_surfaces(rng, n // 2)
    others = []
    for k, grid in enumerate(base):
        turned = -grid[:, ::-1] if k % 2 else -grid[::-1, :]
        others.append(grid[::-1, :] if k % 3 == 0 else turned)
    others = np.array(others) + rng.uniform(-0.3, 0.3, (len(others), 1, 1)) * base.std(axis=(1, 2), keepdims=True)
    wanted = np.concatenate([base, others - others.mean(axis=(1, 2), keepdims=True)])
    return shapes_of(wanted, wanted.copy())


def by_brute_force(shapes, tolerance):
    found = set()
    for turn in (0, 1):
        turned = -shapes.cut[:, :, ::-1] if turn == 0 else -shapes.cut[:, ::-1, :]
        for lower in range(len(turned)):
            off = turned[lower] - shapes.wanted
            misfits = (off.max(axis=(1, 2)) - off.min(axis=(1, 2))) / 2.0
            found |= {(lower, int(upper), turn) for upper in np.flatnonzero(misfits <= tolerance)}
    return found
