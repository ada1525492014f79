"""Measure the packing on the box classes of Martello, Pisinger and Vigo (2000); run by hand.

    python tests/benchmarks/bench_packing.py [SECONDS [VERSIONS]]

Prints for each class and size the sums over the versions of bound, first plan and searched plan, and at the end the
times of first plan and bound for made-up jobs.
"""

import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from kit.boxes import box_class

from cutblock.packing import pack


def show(line):
    sys.stdout.write(line + "\n")
    sys.stdout.flush()


def classes(seconds, versions):
    total = np.zeros(3, dtype=int)
    for number in (1, 4, 5, 6, 7, 8):
        for n in (50, 100, 150, 200):
            row = np.zeros(3, dtype=int)
            for version in range(1, versions + 1):
                side, boxes = box_class(number, n, version)
                stock = [(side, side, side, None, None)]
                first = pack(boxes, stock, 0.0, may_turn=False, moves=0)
                found = pack(boxes, stock, 0.0, may_turn=False, seconds=seconds)
                row += (found.lower_bound, first.n_blocks, found.n_blocks)
            total += row
            show(f"class {number}  n {n:3d}  bound {row[0]:4d}  first {row[1]:4d}  searched {row[2]:4d}")
    show(f"in all  bound {total[0]}  first {total[1]}  searched {total[2]} (+{100 * (total[2] / total[0] - 1):.2f} %)")


def jobs():
    for n in (100, 216, 500, 1000, 5000):
        generator = np.random.default_rng(1)
        width = generator.normal(780.0, 150.0, n)
        depth = width * generator.uniform(0.8, 1.5, n)
        height = 60.0 + generator.gamma(2.0, 60.0, n)
        sizes = np.clip(np.column_stack([width, depth, height]), 50.0, [1170.0, 3900.0, 900.0])
        began = time.perf_counter()
        packing = pack(sizes, [(4000.0, 1200.0, 1000.0, None, None)], 3.0, 10.0)
        took = time.perf_counter() - began
        show(
            f"{n} billets: {packing.n_blocks} blocks, bound {packing.lower_bound}, {packing.moves} moves, {took:.2f} s"
        )


if __name__ == "__main__":
    jobs()
    classes(float(sys.argv[1]) if len(sys.argv) > 1 else 1.0, int(sys.argv[2]) if len(sys.argv) > 2 else 3)
