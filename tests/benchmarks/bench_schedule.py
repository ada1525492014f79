"""Speed of the schedule, run by hand: python tests/benchmarks/bench_schedule.py (with tests/ on PYTHONPATH).

Every figure comes from one run, because machines and their load differ: seconds of a core for 1,000 sweeps of 300
rulings, how many times faster their reachability is than a plain loop over sweeps, stages and rows, and how far the
times lie above those of twenty times the nodes.
"""

import time

import numpy as np
from kit.sample import sample_conditions, sample_machine, sample_sweep

from cutblock.schedule import stages as stage_grid
from cutblock.schedule.passes import sweep_steps
from cutblock.schedule.times import step_times, time_sweeps
from cutblock.wire.reachability import Stages, fastest_squares

N_SWEEPS, N_RULINGS, N_PLAIN = 1000, 300, 3
TINY = 1e-12


def wavy_sweep(seed):
    """A sweep whose two rails are unlike sums of waves."""
    rng = np.random.default_rng(seed)
    x = np.linspace(-20.0, 1220.0, N_RULINGS)

    def rail():
        waves = rng.uniform(0, 40, (2, 1)) * np.sin(
            x * 2 * np.pi / rng.uniform(500, 3000, (2, 1)) + rng.uniform(0, 6, (2, 1))
        )
        return np.stack([x, 150.0 + waves.sum(axis=0)], axis=1)

    return sample_sweep(near=rail(), far=rail())


def plain_squares(lengths, starts, ends, bends, caps, limit):
    """The same reachability for one path, (n - 1, k) rates and bends, row after row."""
    n_stages = len(bends)
    rows = []
    for stage in range(n_stages):
        doubled = 2.0 * lengths[stage]
        rates = [*starts[stage], *(ends[stage] + doubled * bends[stage])]
        rows.append(
            [(abs(rate), bend if rate >= 0.0 else -bend) for rate, bend in zip(rates, [*bends[stage]] * 2, strict=True)]
        )
    highest = [float(cap) for cap in caps]
    for stage in range(n_stages - 1, -1, -1):
        doubled = 2.0 * lengths[stage]
        best = highest[stage]
        for number, (size, lean) in enumerate(rows[stage]):
            if size <= doubled * abs(lean) and lean:
                best = min(best, limit / abs(lean))
            if doubled * lean > size:
                best = min(best, doubled * limit / (doubled * lean - size))
            if size - doubled * lean > TINY:
                best = min(best, (highest[stage + 1] * size + doubled * limit) / (size - doubled * lean))
            for other_size, other_lean in rows[stage][:number]:
                slope = abs(lean * other_size - other_lean * size)
                if slope > 0.0:
                    best = min(best, limit * (size + other_size) / slope)
        highest[stage] = best
    squares = [highest[0]]
    for stage in range(n_stages):
        doubled = 2.0 * lengths[stage]
        gain = min(
            (doubled * (limit - lean * squares[-1]) / size for size, lean in rows[stage] if size > TINY), default=np.inf
        )
        squares.append(min(max(squares[-1] + gain, 0.0), highest[stage + 1]))
    return np.array(squares)


def grid_of(sweeps, machine, conditions):
    """Return the stages, the caps and the acceleration the schedule works with."""
    kept = {}

    def keep(stages, caps, acceleration):
        kept.update(stages=stages, caps=caps.copy(), acceleration=acceleration)
        return fastest_squares(stages, caps, acceleration)

    stage_grid.fastest_squares, before = keep, stage_grid.fastest_squares
    step_times(sweep_steps(sweeps, machine), conditions, machine)
    stage_grid.fastest_squares = before
    return kept["stages"], kept["caps"], kept["acceleration"]


def finer_kinds(times):
    """Return the nodes of every kind of step, each interval cut into so many."""
    kinds = [np.append(kind, 1.0) for kind in stage_grid._KINDS]
    return tuple(np.unique(kind[:-1] + np.arange(times)[:, None] / times * np.diff(kind)) for kind in kinds)


def main():
    conditions = sample_conditions()
    sweeps = [wavy_sweep(seed) for seed in range(N_SWEEPS)]
    for acceleration in (200.0, 0.5):
        machine = sample_machine(acceleration_mm_s2=acceleration)
        start = time.process_time()
        time_sweeps(sweeps, conditions, machine)
        print(  # noqa: T201
            f"{acceleration:g} mm/s2: {N_SWEEPS} sweeps of {N_RULINGS} rulings in {time.process_time() - start:.2f} s"
        )

        stages, caps, limit = grid_of(sweeps[:100], machine, conditions)
        start = time.process_time()
        together = fastest_squares(stages, caps, limit)
        batched = (time.process_time() - start) / 100
        start = time.process_time()
        for path in range(N_PLAIN):
            own = Stages(*(array[..., path] for array in stages))
            alone = plain_squares(*own, caps[:, path], limit)
            np.testing.assert_allclose(alone, together[:, path], rtol=1e-9, atol=1e-12)
        plain = (time.process_time() - start) / N_PLAIN
        print(f"  {len(caps)} nodes: {plain * 1e3:.0f} ms a sweep row by row, {plain / batched:.0f} times the batch")  # noqa: T201

        steps = sweep_steps(sweeps[:20], machine)
        coarse = np.add.reduceat(step_times(steps, conditions, machine), steps.firsts[:-1])
        usual, stage_grid._KINDS = stage_grid._KINDS, finer_kinds(20)
        fine = np.add.reduceat(step_times(steps, conditions, machine), steps.firsts[:-1])
        stage_grid._KINDS = usual
        losses = coarse / fine - 1.0
        print(f"  above 20 times the nodes: mean {losses.mean():.1e}, at most {losses.max():.1e}")  # noqa: T201


if __name__ == "__main__":
    main()
