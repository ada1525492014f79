"""Motions of surfaces onto themselves upside down."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cutblock.geometry.symmetry import N_SAMPLES, find_glides, is_evenly_twisted, is_translation_surface

LENGTH, WIDTH = 9600.0, 6000.0
N = N_SAMPLES


def form(height):
    """Second derivatives of z = height(x, y), taken by differences."""
    x, y = np.meshgrid(np.linspace(0.0, LENGTH, N), np.linspace(0.0, WIDTH, N), indexing="ij")
    h = 5.0
    bends = [
        height(x + h, y) - 2.0 * height(x, y) + height(x - h, y),
        (height(x + h, y + h) - height(x + h, y - h) - height(x - h, y + h) + height(x - h, y - h)) / 4.0,
        height(x, y + h) - 2.0 * height(x, y) + height(x, y - h),
    ]
    return np.stack(bends) / h**2


def in_mm(glide, along=LENGTH, aside=WIDTH):
    return glide.shift * along / (N - 1), glide.axis * aside / (N - 1)


@settings(max_examples=4)
@given(period=st.floats(3000.0, 6000.0), middle=st.floats(2000.0, 4000.0))
def test_a_glide_is_found_with_its_shift_and_its_axis(period, middle):
    """sin(2 pi x / p) cos(2 pi (y - m) / 11 m): half a period on it is upside down, and even about y = m."""
    glides = find_glides(
        form(lambda x, y: 50.0 * np.sin(2 * np.pi * x / period) * np.cos(2 * np.pi * (y - middle) / 11000.0)), 0.995
    )

    found = [in_mm(glide) for glide in glides]
    assert any(abs(s - period / 2.0) < 2.0 and abs(v - middle) < 2.0 for s, v in found)
    assert all(glide.likeness >= 0.995 for glide in glides)


def test_a_line_on_a_surface_that_is_odd_about_it_is_a_two_fold_axis():
    (first, *_) = find_glides(form(lambda x, y: 1e-8 * (x + 900.0) ** 2 * (y - 2500.0)), 0.995)

    assert in_mm(first) == pytest.approx((0.0, 2500.0), abs=2.0)


def test_crossed_waves_are_upside_down_half_a_period_on():
    tide = form(lambda x, y: 60 * np.sin(2 * np.pi * x / 4800) + 25 * np.cos(2 * np.pi * y / 6000))

    assert is_translation_surface(tide, 0.995)
    assert {tuple(np.round(in_mm(glide), -1)) for glide in find_glides(tide, 0.995)} == {(2400, 1500), (2400, 4500)}
    across = find_glides(tide[::-1].transpose(0, 2, 1), 0.995)
    assert in_mm(across[0], WIDTH, LENGTH) == pytest.approx((3000.0, 4800.0), abs=2.0)


@pytest.mark.parametrize(
    "height",
    [
        lambda x, y: -(x**2) / 2e4 - y**2 / 3e4,
        lambda x, y: 40 * np.sin(x / 900 + 0.3) * np.cos(y / 700) + 0.001 * (x - 1500) ** 2 + y**3 / 1e7,
    ],
)
def test_a_dome_and_a_free_form_have_no_such_motion(height):
    assert find_glides(form(height), 0.995) == []
    assert not is_evenly_twisted(form(height), 0.995)


def test_a_mirror_symmetric_surface_is_not_taken_for_one_that_is_upside_down():
    """Even about y = 3000 and of one period along x: mirrored, not turned."""
    wave = form(
        lambda x, y: 50.0 * (1.3 + np.cos(2 * np.pi * (y - 3000.0) / 7000.0)) * np.exp(-(((x - 5000) / 3000) ** 2))
    )

    assert find_glides(wave, 0.995) == []


def test_a_hypar_is_told_by_its_even_twist():
    assert is_evenly_twisted(form(lambda x, y: 3e-5 * (x - 3000) * (y - 1000) + 0.1 * x), 0.995)
    assert not is_evenly_twisted(form(lambda x, y: 3e-5 * (x - 3000) * (y - 1000) + 1e-5 * x**2), 0.995)
    assert not is_evenly_twisted(np.zeros((3, 8, 8)), 0.995)
