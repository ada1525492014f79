"""How long a face of 500,000 triangles takes until its 100 panels are fitted, and how much memory; run it on demand.

python tests/benchmarks/bench_mesh.py; times are of the processor, so that a busy machine does not count.
"""

import argparse
import resource
import struct
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

from cutblock.base.progress import silent
from cutblock.flow import steps
from cutblock.flow.chain import start_plan
from cutblock.flow.jobfile import read_job
from cutblock.records.plan import Settings

JOB = """\
format = 1
[job]
id = "BM"
title = "Large mesh"
units = "mm"
[form]
layup = "bed"
tolerance = 2.0
[[form.face]]
name = "S"
mesh = "surface.stl"
panels = { length = 1200, width = 1000 }
[foam]
grade = "EPS 100"
[[foam.block]]
length = 5000
width = 1250
height = 1000
[cutting]
machine = "four-axis-2600"
wire = "NiCr80 0.40"
power = 60
wall = 60
favour = "lower"
"""
LIMIT_S, LIMIT_MB = 20.0, 2000.0


def height(x, y):
    """A free form over 12 x 10 m."""
    return 600 + 250 * np.sin(x / 3500) * np.sin(y / 4200) + 120 * np.sin((x + y) / 5200)


def write_mesh(path, n_side):
    """Write a binary STL of 2 n_side^2 triangles."""
    x, y = np.meshgrid(np.linspace(0, 12_000, n_side + 1), np.linspace(0, 10_000, n_side + 1), indexing="ij")
    points = np.stack([x, y, height(x, y)], axis=-1).reshape(-1, 3)
    number = np.arange(len(points)).reshape(x.shape)
    a, b, c, d = (part.ravel() for part in (number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]))
    triangles = np.concatenate([np.stack([a, b, c], axis=1), np.stack([a, c, d], axis=1)])
    rows = np.zeros(len(triangles), dtype=[("normal", "<f4", 3), ("corners", "<f4", (3, 3)), ("rest", "<u2")])
    rows["corners"] = points[triangles]
    path.write_bytes(bytes(80) + struct.pack("<I", len(triangles)) + rows.tobytes())
    return len(triangles)


def main():
    """Print the time of each step, the peak of memory, and how far the panels' samples lie from the true surface."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--side", type=int, default=500, help="cells a side; twice its square triangles")
    chosen = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        n_triangles = write_mesh(Path(folder) / "surface.stl", chosen.side)
        (Path(folder) / "job.toml").write_text(JOB)
        start = time.process_time()
        plan = start_plan(read_job(Path(folder) / "job.toml"), Settings())
        sys.stdout.write(f"{n_triangles} triangles\n")
        for step in (steps.take_form, steps.divide, steps.fit):
            before = time.process_time()
            plan = step(plan, silent)
            sys.stdout.write(f"  {step.__name__:10s} {time.process_time() - before:6.2f} s\n")
        spent = time.process_time() - start
    peak_mb = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0
    off = []
    for panel in plan.panels:
        points = panel.origin_mm + panel.samples_mm @ panel.axes
        off.append(float(np.abs((points[:, 2] - height(points[:, 0], points[:, 1])) * panel.normals[:, 2]).max()))
    sys.stdout.write(f"  {len(plan.panels)} panels, {len(plan.sweeps)} sweeps, {spent:.2f} s, peak {peak_mb:.0f} MB\n")
    sys.stdout.write(
        f"  samples at most {max(off):.1e} mm from the true surface; noise told {plan.faces[0].noise_mm:.1e} mm\n"
    )
    return 0 if spent < LIMIT_S and peak_mb < LIMIT_MB else 1


if __name__ == "__main__":
    sys.exit(main())
