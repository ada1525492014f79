"""Speed of the ruled fits, run by hand: python tests/benchmarks/bench_fit.py (with tests/ on PYTHONPATH).

Every figure is a ratio of two processor times of the same run, because machines and their load differ: how many plain
matrix products (of one fixed size) one panel costs, and how the cost grows with the number of panels.
"""

import time

import numpy as np
from kit.sample import sample_conditions, sample_job
from kit.shapes import panel_of

from cutblock.records.words import Favour
from cutblock.sweeps.fitting import fit_panels


def free_form(seed):
    """A mixed surface: mostly saddle-shaped, partly domed, no two alike."""
    a = np.random.default_rng(seed).normal(size=6)

    def height(x, y):
        saddle = a[0] * x * y / 3e5 + 0.09 * a[1] * (x**2 - 1.4 * y**2) / 3.6e5
        cubic = 0.05 * (a[2] * x**3 / 2e8 + a[3] * y**3 / 1.2e8 + a[4] * x**2 * y / 2e8)
        return 40.0 * (saddle + cubic) + 5.0 * a[5] * np.sin(x / 900.0 + y / 700.0)

    return height


def ruled(seed):
    """A hypar of its own twist and turn."""
    a = np.random.default_rng(seed).normal(size=2)
    turn = 0.2 * a[1]
    return lambda x, y: 2e-4 * a[0] * (np.cos(turn) * x + np.sin(turn) * y) * (np.cos(turn) * y - np.sin(turn) * x)


def processor_seconds(task):
    """Processor time of one call."""
    start = time.process_time()
    task()
    return time.process_time() - start


def main():
    """Print the table."""
    square = np.random.default_rng(0).normal(size=(256, 256))
    unit = processor_seconds(lambda: [square @ square for _ in range(200)]) / 200
    job = sample_job(favour=Favour.LOWER)
    conditions = sample_conditions()
    fit_panels(job, [panel_of(ruled(0))], conditions)
    print(f"unit: one 256 x 256 matrix product, {1e3 * unit:.2f} ms")  # noqa: T201 - a benchmark prints
    for name, surface in (("hypars", ruled), ("free form", free_form)):
        for count in (25, 100):
            panels = [panel_of(surface(seed), f"S-{seed:04d}", counts=(31, 26)) for seed in range(count)]
            spent = processor_seconds(lambda panels=panels: fit_panels(job, panels, conditions))
            each = spent / count
            rate = f"{each / unit:7.1f} units and {1e3 * each:6.2f} ms a panel, {1.0 / each:6.1f} a second"
            print(f"{name:10s} {count:4d} panels: {rate}")  # noqa: T201


if __name__ == "__main__":
    main()
