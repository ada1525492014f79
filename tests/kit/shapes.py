"""Height functions with known geometry, centred on x = y = 0, and panels made of them."""

import numpy as np
from kit.sample import LENGTH, WIDTH, sample_panel

from cutblock.geometry.heights import height_field


def turned(height, degrees):
    """The same surface turned in plan."""
    cosine, sine = np.cos(np.radians(degrees)), np.sin(np.radians(degrees))
    return lambda x, y: height(cosine * x + sine * y, cosine * y - sine * x)


def over(height, length=LENGTH, width=WIDTH):
    """The surface over [0, length] x [0, width], its middle in the rectangle's middle."""
    return lambda x, y: height(x - length / 2, y - width / 2)


def hypar(x, y):
    """Hyperbolic paraboloid, corners of a 1200 x 1000 panel 120 mm up and down."""
    return 120.0 * x * y / (600.0 * 500.0)


def hyperboloid(x, y):
    """The top of a hyperboloid of one sheet lying along y: waist radius 3 m, c = 9 m."""
    return np.sqrt(3000.0**2 * (1.0 + (y / 9000.0) ** 2) - x**2) - 2800.0


def conoid(x, y):
    """A conoid: a straight edge at y = -500, a half sine 150 mm high at y = 500."""
    return (y + 500.0) / 1000.0 * 150.0 * np.sin(np.pi * (x + 600.0) / 1200.0)


def helicoid(x, y):
    """A helicoid about the x axis turning 40 degrees in 1200 mm."""
    return y * np.tan(np.radians(40.0) / 1200.0 * x)


def monkey_saddle(x, y):
    return 120.0 * ((x / 600.0) ** 3 - 3.0 * (x / 600.0) * (y / 600.0) ** 2)


def dome(x, y):
    """An elliptic paraboloid: radius 4 m along y, 6 m along x, at the top."""
    return -(y**2) / 8000.0 - x**2 / 12000.0


def scherk(x, y):
    """Scherk's first minimal surface, a = 1.5 m."""
    return 1500.0 * np.log(np.cos(x / 1500.0) / np.cos(y / 1500.0))


def catenoid(x, y):
    """The top of a catenoid about the y axis, a = 2.5 m."""
    radius = 2500.0 * np.cosh(y / 2500.0)
    return np.sqrt(radius**2 - x**2) - 2500.0


def panel_of(height, panel_id="S-A01", length=LENGTH, width=WIDTH, counts=(41, 35), **changes):
    """A panel whose wanted surface is a centred height function."""
    x, y = np.linspace(0.0, length, counts[0]), np.linspace(0.0, width, counts[1])
    grid_x, grid_y = np.meshgrid(x, y, indexing="ij")
    heights = over(height, length, width)(grid_x, grid_y) + 0.0 * grid_x
    normals = height_field(heights, length, width).normals(grid_x, grid_y)[1]
    values = {
        "length_mm": length,
        "width_mm": width,
        "heights_mm": heights,
        "samples_mm": np.stack([grid_x, grid_y, heights], axis=-1).reshape(-1, 3),
        "normals": normals.reshape(-1, 3),
        "areas_mm2": np.full(heights.size, length * width / heights.size),
        "outline": (np.array([[0.0, 0.0], [length, 0.0], [length, width], [0.0, width]]),),
    }
    return sample_panel(panel_id, **(values | changes))
