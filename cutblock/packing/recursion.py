"""The inner loop that finds the best guillotine layout of a box, after Gilmore and Gomory, in three dimensions.

It runs as it stands on lists of Python numbers, and compiled by numba on arrays, as the loops of `kernels` do.

A choice is what is best done with a box: 0 nothing, 1 + 2 g + t a billet of type g (turned or not), -1 to -3 what is
done with the next smaller box on an axis, and FIRST_CUT x (axis + 1) + c a cut at the c-th place of an axis.
"""

from typing import NamedTuple

from cutblock.packing.sequences import Integers, Reals

FIRST_CUT = 1 << 20


class Raster(NamedTuple):
    """The places for cuts on each axis, from the least up, and what a cut there leaves.

    `down[i * n + c]` is the place a box of the size of place i is left with when it is cut at place c (-1: nothing),
    and `n_cuts[i]` how many cuts are worth trying, those not past the middle.
    """

    n: Integers  # (3,) places on each axis
    down_x: Integers
    down_y: Integers
    down_z: Integers
    n_cuts_x: Integers
    n_cuts_y: Integers
    n_cuts_z: Integers


def best_cut(value: Reals, first: int, step: int, n_cuts: int, down: Integers, row: int, least: float) -> int:
    """Return the cut across one axis whose two parts are worth most, and more than `least`; -1 if there is none.

    The box cut down to place c is number `first + c * step`.
    """
    best, found = least, -1
    for c in range(n_cuts):
        rest = down[row + c]
        if rest >= 0:
            worth = value[first + c * step] + value[first + rest * step]
            if worth > best:
                best, found = worth, c
    return found


def recur(
    first: int,
    last: int,
    raster: Raster,
    starts: Integers,
    gains: Reals,
    codes: Integers,
    value: Reals,
    choice: Integers,
) -> None:
    """Work out the best layout of some of the boxes of all places; those before them are worked out already.

    Args:
        first: Number of the first box; 0 begins anew.
        last: Number to stop before.
        raster: The places for cuts.
        starts: For each type, and turned, the number of the least box it fits, (ix * ny + iy) * nz + iz; -1 for none.
        gains: What each of them is worth.
        codes: The choice that each is.
        value: Written: the worth of the best layout of each box.
        choice: Written: what is done with it first.
    """
    if first == 0:
        for box in range(len(value)):
            value[box] = 0.0
            choice[box] = 0
        for item in range(len(starts)):
            box = starts[item]
            if box >= 0 and gains[item] > value[box]:
                value[box] = gains[item]
                choice[box] = codes[item]
    for box in range(first, last):
        decide(box, raster, value, choice)


def decide(box: int, raster: Raster, value: Reals, choice: Integers) -> None:
    """Find what is best done with one box, when that is known for all smaller ones."""
    n_x, n_y, n_z = raster.n[0], raster.n[1], raster.n[2]
    iz = box % n_z
    iy = box // n_z % n_y
    ix = box // (n_z * n_y)
    for axis in range(3):
        if axis == 0:
            place, step = ix, n_y * n_z
            cut = best_cut(value, box - ix * step, step, raster.n_cuts_x[ix], raster.down_x, ix * n_x, value[box])
            rest = raster.down_x[ix * n_x + cut] if cut >= 0 else 0
        elif axis == 1:
            place, step = iy, n_z
            cut = best_cut(value, box - iy * step, step, raster.n_cuts_y[iy], raster.down_y, iy * n_y, value[box])
            rest = raster.down_y[iy * n_y + cut] if cut >= 0 else 0
        else:
            place, step = iz, 1
            cut = best_cut(value, box - iz, step, raster.n_cuts_z[iz], raster.down_z, iz * n_z, value[box])
            rest = raster.down_z[iz * n_z + cut] if cut >= 0 else 0
        if cut >= 0:
            first = box - place * step
            value[box] = value[first + cut * step] + value[first + rest * step]
            choice[box] = (axis + 1) * FIRST_CUT + cut
        if place > 0 and value[box - step] > value[box]:
            value[box] = value[box - step]
            choice[box] = -1 - axis
