"""The box classes of Martello, Pisinger and Vigo, Operations Research 48 (2000), made by their published generator.

Uniform whole numbers from the 48-bit linear congruential generator of POSIX lrand48.
"""

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
