"""Job files over height functions, on a machine whose springs give little unless said otherwise."""

import re

import numpy as np

from cutblock.base.assets import assets_folder

JOB = """\
format = 1
[job]
id = "GS"
title = "Grid search"
units = "mm"
[form]
layup = "{layup}"
tolerance = {tolerance}
[[form.face]]
name = "S"
heights = "heights.csv"
panels = {{ length = {length}, width = {width} }}
[foam]
grade = "EPS 100"
[[foam.block]]
length = 5000
width = 1250
height = 1000
[cutting]
machine = "short-springs.toml"
wire = "NiCr80 0.40"
power = 60
kerf = 1.2
wall = 60
favour = "lower"
"""


def job_over(folder, height, size, step=100.0, *, cell=(1200, 1000), layup="bed", tolerance=2.0, longest_wire=2680):
    """A job of a height function centred in its face, z over 0."""
    x, y = (np.arange(0.0, extent + step / 2, step) for extent in size)
    grid_x, grid_y = np.meshgrid(x, y, indexing="ij")
    z = height(grid_x - size[0] / 2, grid_y - size[1] / 2)
    rows = np.stack([grid_x.ravel(), grid_y.ravel(), (z - z.min() + 200.0).ravel()], axis=1)
    np.savetxt(folder / "heights.csv", rows, fmt="%.9f", delimiter=",")
    machine = (assets_folder() / "machines" / "four-axis-2600.toml").read_text()
    (folder / "short-springs.toml").write_text(
        re.sub(r"longest_wire_mm = .*", f"longest_wire_mm = {longest_wire}", machine)
    )
    path = folder / "job.toml"
    path.write_text(JOB.format(layup=layup, tolerance=tolerance, length=cell[0], width=cell[1]))
    return path
