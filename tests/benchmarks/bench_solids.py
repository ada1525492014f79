"""Times for splitting, measuring and pairing; run `python tests/benchmarks/bench_solids.py`."""

import sys
import time
from collections.abc import Callable
from functools import partial
from pathlib import Path

import manifold3d
import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from kit.sample import sample_conditions, sample_job, sample_panel, sample_sweep

from cutblock.geometry.fan import fan_connectivity, fan_vertices, sheet_grid
from cutblock.geometry.mitre import cut_to_sides
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


def report(name: str, work: Callable[[], object], n_times: int = 5) -> float:
    """Write and return the shortest of some runs."""
    times = []
    for _ in range(n_times):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    sys.stdout.write(f"{name:<52} {1e3 * min(times):10.2f} ms\n")
    return min(times)


def compare_with_modeller(n: int, n_across: int) -> None:
    """Write how much faster the direct build is than a solid modeller's split of the same block by the same facets."""
    near, far = rails(n, 0.0)
    split = partial(split_billet, near, far, SIZE, n_across=n_across, facet_mm=10.0)
    # The cutter stands a twentieth out of the block on every side; flush faces are the modeller's weak place.
    spare = 0.05 * SIZE[0]
    along = np.array([spare, 0.0])
    out = [np.concatenate([rail[:1] - along, rail, rail[-1:] + along]) for rail in (near, far)]
    grid = sheet_grid(*out, SIZE[1], n_across, 10.0)
    aside = np.array([0.0, spare, 0.0, 0.0])
    grid = np.concatenate([grid[:, :1] - aside, grid, grid[:, -1:] + aside], axis=1)
    top = fan_vertices(grid)[:, :3]
    vertices = np.concatenate([top, top * [1.0, 1.0, 0.0] - [0.0, 0.0, spare]])
    triangles = fan_connectivity(*grid.shape[:2]).closed.astype(np.uint64)

    def modelled() -> list[manifold3d.Mesh64]:
        cutter = manifold3d.Manifold(manifold3d.Mesh64(vert_properties=vertices, tri_verts=triangles))
        return [half.to_mesh64() for half in manifold3d.Manifold.cube(SIZE).split(cutter)]

    own = report(f"both halves, {n} x {n_across + 1} grid", split)
    fan_connectivity.cache_clear()
    first = report("  the first of its counts (connectivity made)", split, 1)
    other = report("  split by manifold3d, cutter built and halves read", modelled)
    closed, modeller = volume_below(near, far, SIZE[1]), manifold3d.Manifold(modelled()[0]).volume()
    ours = mesh_volume(split()[0])
    sys.stdout.write(
        f"  times faster {other / own:.0f} (first {other / first:.0f}); volume off the closed form by "
        f"{ours / closed - 1.0:.1e}, manifold3d's off ours by {modeller / ours - 1.0:.1e}\n"
    )


def compare_mitres() -> None:
    """Write how four leaning sides on the lower half of a 121 x 41 grid compare with the modeller's own trims."""
    half = split_billet(*rails(121, 0.0), SIZE, n_across=40, facet_mm=10.0)[0]
    corners = np.array([[60, 50, 250], [1140, 50, 250], [1140, 950, 250], [60, 950, 250]], dtype=float)
    lean = np.radians(8.0)
    level = np.array([[0, 1], [-1, 0], [0, -1], [1, 0]], dtype=float)
    normals = np.column_stack([np.cos(lean) * level, np.full(4, np.sin(lean))])
    planes = np.column_stack([normals, (normals * corners).sum(axis=1)])
    own = report("four mitred sides, 121 x 41 grid", lambda: cut_to_sides(half, planes, corners))

    def modelled() -> manifold3d.Mesh64:
        mesh = manifold3d.Mesh64(vert_properties=half.vertices, tri_verts=half.triangles.astype(np.uint64))
        solid = manifold3d.Manifold(mesh)
        for *normal, distance in planes.tolist():
            solid = solid.trim_by_plane(normal, distance)
        return solid.to_mesh64()

    other = report("  trimmed by manifold3d, half built and read", modelled)
    ours, theirs = mesh_volume(cut_to_sides(half, planes, corners)), manifold3d.Manifold(modelled()).volume()
    sys.stdout.write(f"  times faster {other / own:.1f}; volumes differ by {ours / theirs - 1.0:.1e}\n")


def main() -> None:
    """Run all."""
    for n, n_across in ((31, 10), (61, 20), (121, 40), (241, 80)):
        compare_with_modeller(n, n_across)
    compare_mitres()
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
