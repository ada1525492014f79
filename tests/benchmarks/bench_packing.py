"""Measure the packing against published instances and made-up jobs; run by hand, one part at a time.

    python tests/benchmarks/bench_packing.py jobs
    python tests/benchmarks/bench_packing.py boxes [SECONDS [EVERY]]        Martello, Pisinger and Vigo (2000)
    python tests/benchmarks/bench_packing.py rectangles [SECONDS [EVERY]]   Berkey and Wang (1987)
    python tests/benchmarks/bench_packing.py prices [SECONDS]               Cintra and others (2008)
    python tests/benchmarks/bench_packing.py perfect [SECONDS]              blocks cut up without waste, made here

EVERY thins the instances out. The published ones are read from the folder named by `PACKING_INSTANCES`, by default the
one the tests read. The loops are compiled before anything is timed.
"""

import json
import os
import resource
import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from kit.boxes import box_class, cut_up_blocks, made_up_job

from cutblock.packing import pack
from cutblock.packing.compiled import compiled

FOLDER = Path(os.environ.get("PACKING_INSTANCES", Path(__file__).parents[2] / ".." / "shared" / "data" / "packing"))
JOB_BLOCK = (4000.0, 1200.0, 1000.0, None, None)


def show(line):
    sys.stdout.write(line + "\n")
    sys.stdout.flush()


def published(name):
    return json.loads((FOLDER / f"{name}.json").read_text(encoding="utf-8"))["instances"]


def jobs():
    for n in (50, 500, 5000, 50_000):
        sizes = made_up_job(n)
        for moves in (0, None):
            began = time.perf_counter()
            packing = pack(sizes, [JOB_BLOCK], 3.0, 10.0, moves=moves)
            took = time.perf_counter() - began
            text = f"{packing.n_blocks} blocks, bound {packing.lower_bound}, {packing.moves} moves, {took:.2f} s"
            show(f"{n} billets, moves {moves}: {text}")
    show(f"memory {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:.0f} MB")


def boxes(seconds=1.0, every=1):
    total = np.zeros(3, dtype=int)
    for number in (1, 4, 5, 6, 7, 8):
        for n in (50, 100, 150, 200):
            row, moves = np.zeros(3, dtype=int), 0
            for version in range(1, 11, int(every)):
                side, sizes = box_class(number, n, version)
                stock = [(side, side, side, None, None)]
                first = pack(sizes, stock, 0.0, may_turn=False, moves=0)
                found = pack(sizes, stock, 0.0, may_turn=False, seconds=float(seconds))
                row += (found.lower_bound, first.n_blocks, found.n_blocks)
                moves += found.moves
            total += row
            show(f"class {number}  n {n:3d}  bound {row[0]:4d}  first {row[1]:4d}  searched {row[2]:4d}  moves {moves}")
    show(f"in all  bound {total[0]}  first {total[1]}  searched {total[2]} (+{100 * (total[2] / total[0] - 1):.2f} %)")


def shelves(sizes, floor, may_turn):
    """The best of three ways of rectpack, a public library of heuristics without the guillotine rule."""
    import rectpack

    best = None
    for algorithm in (rectpack.MaxRectsBssf, rectpack.GuillotineBssfSas, rectpack.GuillotineBafMinas):
        packer = rectpack.newPacker(pack_algo=algorithm, rotation=may_turn)
        packer.add_bin(*floor, count=len(sizes))
        for width, depth in sizes:
            packer.add_rect(width, depth)
        packer.pack()
        best = len(packer) if best is None else min(best, len(packer))
    return best


def rectangles(seconds=1.0, every=1):
    for kind in ("oriented", "rotated"):
        row, worse = np.zeros(5, dtype=int), 0
        for instance in published("rectangles_class_01_06")[:: int(every)]:
            sizes = [(w, d) for w, d, copies in instance["items"] for _ in range(copies)]
            stock = [(*instance["bin"], 1, None, None)]
            may_turn = kind == "rotated"
            found = pack([(*size, 1) for size in sizes], stock, 0.0, may_turn=may_turn, seconds=float(seconds))
            other = shelves(sizes, instance["bin"], may_turn)
            best = instance["best_known"]
            row += (found.lower_bound, best[f"free_{kind}"], best[f"guillotine3_{kind}"], found.n_blocks, other)
            worse += other < found.n_blocks
            if found.lower_bound > best[f"free_{kind}"]:
                show(f"BOUND ABOVE THE BEST KNOWN: {instance['name']}")
        text = f"bound {row[0]}  best free {row[1]}  best three-stage {row[2]}  searched {row[3]}"
        show(f"{kind}  {text} (+{100 * (row[3] / row[2] - 1):.2f} %)  rectpack {row[4]}, better on {worse}")


def prices(seconds=10.0):
    for instance in published("gcut_1_8_several_bins"):
        sizes = [(int(w), int(h), 1) for _, w, h, copies in instance["items"] for _ in range(int(copies))]
        stock = [(int(b["WIDTH"]), int(b["HEIGHT"]), 1, None, float(b["COST"])) for b in instance["bins"]]
        for kind in ("oriented", "rotated"):
            best = instance["best_known_2_stage"][kind]
            found = pack(sizes, stock, 0.0, may_turn=kind == "rotated", seconds=float(seconds))
            ratios = found.cost / float(best["cost"]), found.cost_lower_bound / float(best["cost"])
            show(f"{instance['name']} {kind}: cost {ratios[0]:.4f}, bound {ratios[1]:.4f} of the best known")


def perfect(seconds=10.0):
    counts = []
    for seed in range(6):
        sizes = cut_up_blocks(10, 8, seed)
        found = pack(sizes, [(1000, 800, 600, None, None)], 0.0, seed=seed, seconds=float(seconds))
        counts.append(found.n_blocks)
        show(f"seed {seed}: {found.n_blocks} blocks, bound {found.lower_bound}, {found.moves} moves")
    show(f"mean {np.mean(counts):.2f}")


if __name__ == "__main__":
    compiled()
    parts = {"jobs": jobs, "boxes": boxes, "rectangles": rectangles, "prices": prices, "perfect": perfect}
    parts[sys.argv[1] if len(sys.argv) > 1 else "jobs"](*sys.argv[2:])
