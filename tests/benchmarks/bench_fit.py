"""Speed of the ruled fits, run by hand: python tests/benchmarks/bench_fit.py (with tests/ on PYTHONPATH).

Every figure comes from one run, because machines and their load differ: how many plain matrix products (of one fixed
size) one panel costs, and how many times faster a batch is than scipy.optimize.least_squares on the same unknowns,
started at the same place, to the same residual.
"""

import time

import numpy as np
from kit.sample import sample_conditions, sample_job
from kit.shapes import (
    catenoid,
    conoid,
    dome,
    helicoid,
    hypar,
    hyperboloid,
    monkey_saddle,
    over,
    panel_of,
    scherk,
    turned,
)
from scipy.optimize import least_squares

from cutblock.geometry.fit import fit_patches
from cutblock.geometry.fit_refine import N_CONTROLS, Fits, evaluate, refine, spline_stations
from cutblock.geometry.fit_start import best_paths
from cutblock.geometry.fit_target import Patch, make_target
from cutblock.records.words import Favour
from cutblock.sweeps.fitting import fit_panels

LENGTH, WIDTH = 1200.0, 1000.0
SURFACES = (hypar, hyperboloid, conoid, helicoid, monkey_saddle, dome, scherk, catenoid)


def mixed_patches(count):
    """The named surfaces in turn, each turned in plan by an angle of its own."""
    angles = np.random.default_rng(0).uniform(-30.0, 30.0, count)
    x, y = np.linspace(0.0, LENGTH, 61), np.linspace(0.0, WIDTH, 51)
    return [
        Patch(
            heights_mm=over(turned(SURFACES[number % len(SURFACES)], angle))(x[:, None], y),
            low_x_mm=0.0,
            high_x_mm=LENGTH,
            low_y_mm=0.0,
            high_y_mm=WIDTH,
            width_mm=WIDTH,
            strip_low_y_mm=0.0,
            strip_high_y_mm=WIDTH,
        )
        for number, angle in enumerate(angles)
    ]


def free_form(seed):
    """A mixed surface: mostly saddle-shaped, partly domed, no two alike."""
    a = np.random.default_rng(seed).normal(size=6)

    def height(x, y):
        saddle = a[0] * x * y / 3e5 + 0.09 * a[1] * (x**2 - 1.4 * y**2) / 3.6e5
        cubic = 0.05 * (a[2] * x**3 / 2e8 + a[3] * y**3 / 1.2e8 + a[4] * x**2 * y / 2e8)
        return 40.0 * (saddle + cubic) + 5.0 * a[5] * np.sin(x / 900.0 + y / 700.0)

    return height


def processor_seconds(task):
    """Processor time of one call, and what it gave."""
    start = time.process_time()
    result = task()
    return time.process_time() - start, result


def peer_fit(target, start, enough):
    """Fit one patch with scipy's least squares until its squared residual is down to `enough`; return its cost."""
    basis = spline_stations(N_CONTROLS)
    ends = (start.start, start.end)
    none = np.zeros(1)

    def residuals(controls):
        state = evaluate(target, Fits(controls.reshape(1, 3, -1), *ends, none, none), basis)
        return (np.sqrt(np.maximum(state.weights, 0.0)) * state.residuals).ravel()

    def is_enough(intermediate_result):
        if 2.0 * intermediate_result.cost <= enough:
            raise StopIteration

    found = least_squares(residuals, start.controls.ravel(), x_scale="jac", max_nfev=30, callback=is_enough)
    return 2.0 * found.cost


def compare_with_peer(count):
    """Print how many times faster the batch is than the peer, on starts where dynamic programming left them."""
    target = make_target(mixed_patches(count))
    paths = best_paths(target)[0]
    rough = refine(target, paths, n_rounds=1, n_steps=0)
    refine(target, paths, n_rounds=1)
    spent, fits = processor_seconds(lambda: refine(target, paths, n_rounds=1))
    basis = spline_stations(N_CONTROLS)
    costs = evaluate(target, fits, basis).cost
    peer, reached = 0.0, 0
    for number in range(count):
        index = np.array([number])
        task = (target.take(index), rough.take(index), 1.001 * costs[number] + 1e-9)
        seconds, cost = processor_seconds(lambda task=task: peer_fit(*task))
        peer += seconds
        reached += cost <= task[2]
    print(  # noqa: T201 - a benchmark prints
        f"refinement {1e3 * spent / count:.2f} ms a panel, scipy.optimize.least_squares {1e3 * peer / count:.0f} ms "
        f"({reached} of {count} got as close): {peer / spent:.0f} times faster"
    )


def main():
    """Print the table."""
    square = np.random.default_rng(0).normal(size=(256, 256))
    unit = processor_seconds(lambda: [square @ square for _ in range(200)])[0] / 200
    print(f"unit: one 256 x 256 matrix product, {1e3 * unit:.2f} ms")  # noqa: T201
    patches = mixed_patches(1000)
    fit_patches(patches[:16], 2.0, is_polished=False)
    for count in (1, 100, 1000):
        spent, _ = processor_seconds(lambda count=count: fit_patches(patches[:count], 2.0, is_polished=False))
        rate = (
            f"{spent / count / unit:6.1f} units, {1e3 * spent / count:5.2f} ms a panel, {count / spent:5.0f} a second"
        )
        print(f"least squares, one wire direction, {count:4d} named surfaces: {rate}")  # noqa: T201
    compare_with_peer(16)
    job, conditions = sample_job(favour=Favour.LOWER), sample_conditions()
    panels = [panel_of(free_form(seed), f"S-{seed:04d}", counts=(31, 26)) for seed in range(100)]
    spent, _ = processor_seconds(lambda: fit_panels(job, panels, conditions))
    print(f"whole fit of 100 free forms: {1e1 * spent:.1f} ms a panel, {100.0 / spent:.0f} a second")  # noqa: T201


if __name__ == "__main__":
    main()
