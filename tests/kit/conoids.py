"""Panels whose complement is known, with the sweeps that cut them exactly."""

from dataclasses import replace

import numpy as np
from kit.sample import sample_panel, sample_sweep

LENGTH, WIDTH = 1200.0, 1000.0


def make(name, height, slope_x, slope_y, length=LENGTH, width=WIDTH, **changes):
    """A panel z = height(x, y), straight along y, with the sweep that cuts it exactly."""
    x, y = np.meshgrid(np.linspace(0.0, length, 25), np.linspace(0.0, width, 21), indexing="ij")
    slopes_x, slopes_y = slope_x(x, y) + 0 * x, slope_y(x, y) + 0 * x
    normals = np.stack([-slopes_x, -slopes_y, np.ones_like(x)], axis=-1)
    normals /= np.linalg.norm(normals, axis=-1, keepdims=True)
    z = height(x, y) + 0 * x
    values = {
        "length_mm": length,
        "width_mm": width,
        "outline": (np.array([[0.0, 0.0], [length, 0.0], [length, width], [0.0, width]]),),
    }
    panel = sample_panel(
        name,
        heights_mm=z,
        samples_mm=np.stack([x, y, z], axis=-1).reshape(-1, 3),
        normals=normals.reshape(-1, 3),
        areas_mm2=np.full(x.size, length * width / x.size),
        **(values | changes),
    )
    along = np.linspace(-20.0, length + 20.0, 249)
    middle = 150.0 - (z.max() + z.min()) / 2.0
    near = np.column_stack([along, height(along, 0.0) + middle + 0 * along])
    far = np.column_stack([along, height(along, width) + middle + 0 * along])
    sweep = sample_sweep(f"SM-{name}", (name,), near=near, far=far, length_mm=length, width_mm=width)
    lower = replace(sweep.serving[0], shift_mm=np.array([0.0, 0.0, -middle]))
    return panel, replace(sweep, serving=(lower,))


def conoid(name, bulge, is_turned=False, shift_mm=0.0, is_mirrored=False, **changes):
    """A sine arch that grows from one side to the other: turned about x it is the complement, mirrored it is not."""

    def side(y):
        grown = 1.0 + y / WIDTH
        return (3.0 - grown if is_turned else grown) * (-1.0 if is_turned else 1.0)

    rate = -1.0 if is_mirrored else 1.0

    def height(x, y):
        return shift_mm + bulge * side(y) * (np.sin(np.pi * x / LENGTH) + rate * 0.4 * np.sin(2 * np.pi * x / LENGTH))

    def slope_x(x, y):
        k = np.pi / LENGTH
        return bulge * side(y) * (k * np.cos(k * x) + rate * 0.8 * k * np.cos(2 * k * x))

    def slope_y(x, y):
        return (height(x, WIDTH) - height(x, 0.0)) / WIDTH + 0 * y

    return make(name, height, slope_x, slope_y, **changes)


def hypar(name, corners, size=(LENGTH, WIDTH)):
    """The panel through the heights (z00, z10, z11, z01) of its corners, straight along both sides."""
    z00, z10, z11, z01 = corners
    length, width = size
    twist = (z00 + z11 - z10 - z01) / (length * width)
    rise_x, rise_y = (z10 - z00) / length, (z01 - z00) / width

    def height(x, y):
        return z00 + rise_x * x + rise_y * y + twist * x * y

    return make(
        name, height, lambda x, y: rise_x + twist * y, lambda x, y: rise_y + twist * x, length=length, width=width
    )
