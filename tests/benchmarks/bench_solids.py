"""Times for splitting, measuring and pairing; run `python tests/benchmarks/bench_solids.py`."""

import sys
import time
from collections.abc import Callable
from functools import partial
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from kit.sample import sample_conditions, sample_job, sample_panel, sample_sweep

from cutblock.geometry.solids import mesh_volume, split_billet
from cutblock.geometry.volume import kerf_volume, volume_below, volume_below_within
from cutblock.pairing.match import pair_sweeps

SIZE = (1200.0, 1000.0, 500.0)
PENTAGON = np.array([[100.0, 0.0], [1200.0, 50.0], [1200.0, 500.0], [700.0, 1000.0], [0.0, 800.0]])
L_SHAPE = np.array([[0, 0], [1200, 0], [1200, 500], [600, 500], [600, 1000], [0, 1000]], dtype=float)


def rails(n: int, run_out_mm: float):
    """Return wavy rails, skewed where they run out."""
    x = np.linspace(-run_out_mm, SIZE[0] + run_out_mm, n)
    near = np.column_stack([x - run_out_mm / 3.0, 250.0 + 60.0 * np.sin(x / 300.0)])
    return near, np.column_stack([x + run_out_mm / 3.0, 250.0 + 80.0 * np.cos(x / 260.0)])


def report(name: str, work: Callable[[], object], n_times: int = 5) -> None:
    """Write the shortest of some runs."""
    times = []
    for _ in range(n_times):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    sys.stdout.write(f"{name:<52} {1e3 * min(times):10.2f} ms\n")


def main() -> None:
    """Run all."""
    for n, n_across in ((31, 10), (61, 20), (121, 40), (241, 80)):
        near, far = rails(n, 0.0)
        split = partial(split_billet, near, far, SIZE, n_across=n_across, facet_mm=10.0)
        report(f"both halves, {n} x {n_across + 1} grid", split)
        error = mesh_volume(split()[0]) / volume_below(near, far, SIZE[1]) - 1.0
        sys.stdout.write(f"{'  volume off by':<52} {error:10.1e}\n")
    near, far = rails(121, 150.0)
    report("both halves, skewed run-out", lambda: split_billet(near, far, SIZE))
    report("both halves, pentagon", lambda: split_billet(near, far, SIZE, PENTAGON))
    report("both halves, L-shape", lambda: split_billet(near, far, SIZE, L_SHAPE))
    report("volume below, skewed run-out", lambda: volume_below_within(near, far, *SIZE[:2]))
    report("volume below, pentagon", lambda: volume_below_within(near, far, *SIZE[:2], [PENTAGON]))
    report("kerf, skewed run-out", lambda: kerf_volume(near, far, *SIZE[:2], (1.0, 1.5)))
    panels = [sample_panel(f"P{k}") for k in range(200)]
    sweeps = [sample_sweep(f"SM-P{k}", (f"P{k}",)) for k in range(200)]
    report("pairing 200 equal panels", lambda: pair_sweeps(sample_job(), panels, sweeps, sample_conditions()), 2)


if __name__ == "__main__":
    main()
