"""Boxes to pack: the classes of Martello, Pisinger and Vigo, Operations Research 48 (2000), and jobs made here.

The classes are uniform whole numbers from the 48-bit linear congruential generator of POSIX lrand48.
"""

import numpy as np

_SIDES = {1: 100, 2: 100, 3: 100, 4: 100, 5: 100, 6: 10, 7: 40, 8: 100}
_LARGEST = {6: 10, 7: 35, 8: 100}


class _Dice:
    def __init__(self, seed):
        self.state = (seed << 16) | 0x330E

    def between(self, low, high):
        self.state = (0x5DEECE66D * self.state + 0xB) % (1 << 48)
        return low + (self.state >> 17) % (high - low + 1)


def box_class(number, n, version):
    """Return the bin's side and n boxes (width, height, depth) of a class, version 1 to 10."""
    side, dice = _SIDES[number], _Dice(version + n)
    if number >= 6:
        return side, [[dice.between(1, _LARGEST[number]) for _ in range(3)] for _ in range(n)]
    small, large, half = (1, side // 2), (2 * side // 3, side), (side // 2, side)
    types = {1: (small, large, large), 2: (large, small, large), 3: (large, large, small)}
    types |= {4: (half, half, half), 5: (small, small, small)}
    boxes = []
    for _ in range(n):
        drawn = dice.between(1, 10)
        ranges = types[drawn if drawn <= 5 else number]
        boxes.append([dice.between(*pair) for pair in ranges])
    return side, boxes


def cut_up_blocks(n_blocks, cells_a_block, seed):
    """Return blocks of 1000 x 800 x 600 cut up by guillotine cuts without waste, some parts then turned."""
    generator = np.random.default_rng(seed)
    boxes = []
    for _ in range(n_blocks):
        parts = [(1000, 800, 600)]
        while len(parts) < cells_a_block:
            volumes = np.array([float(x * y * z) for x, y, z in parts])
            box = list(parts.pop(int(generator.choice(len(parts), p=volumes / volumes.sum()))))
            axis = int(generator.integers(3))
            size = int(box[axis] * generator.uniform(0.2, 0.8))
            parts += [(*box[:axis], part, *box[axis + 1 :]) for part in (size, box[axis] - size)]
        boxes += parts
    return [(y, x, z) if generator.random() < 0.5 else (x, y, z) for x, y, z in boxes]


def made_up_job(n, seed=1):
    """Return billets as a job of panels about 780 mm wide would give them, for blocks of 4000 x 1200 x 1000 mm."""
    generator = np.random.default_rng(seed)
    width = generator.normal(780.0, 150.0, n)
    depth = width * generator.uniform(0.8, 1.5, n)
    height = 60.0 + generator.gamma(2.0, 60.0, n)
    return np.clip(np.column_stack([width, depth, height]), 50.0, [1170.0, 3900.0, 900.0])
