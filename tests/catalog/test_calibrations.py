from dataclasses import fields, replace

import numpy as np
import pytest
from kit.coupons import sample_calibration

from cutblock.base.errors import InputError
from cutblock.catalog import load
from cutblock.catalog.calibrations import calibration_toml


@pytest.fixture(autouse=True)
def own_folder(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    folder = tmp_path / "cutblock" / "calibrations"
    folder.mkdir(parents=True)
    return folder


def stored(folder, **changes):
    calibration = sample_calibration(**changes)
    (folder / f"{calibration.name}.toml").write_text(calibration_toml(calibration), encoding="utf-8")
    return calibration


@pytest.mark.parametrize(
    "changes",
    [{}, {"clearance_mm": 0.21, "doubts": ("too few", 'a "quoted" \\ word'), "grade": "", "machine": "Größe\x7f 2"}],
)
def test_a_calibration_comes_back_as_it_was_written(own_folder, changes):
    written = stored(own_folder, **changes)
    found = load.calibration("shop")
    for field in fields(written):
        if field.name == "covariance":
            np.testing.assert_array_equal(found.covariance, written.covariance)
        else:
            assert getattr(found, field.name) == getattr(written, field.name), field.name


def test_a_file_beside_the_job_is_found_by_its_path(tmp_path):
    path = tmp_path / "ours.toml"
    path.write_text(calibration_toml(sample_calibration()))
    assert load.calibration(str(path)).name == "ours"


def test_an_unknown_name_lists_the_nearest(own_folder):
    with pytest.raises(InputError, match="none is stored yet"):
        load.calibration("shop")
    stored(own_folder)
    with pytest.raises(InputError, match='"shop"'):
        load.calibration("shops")


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ('date = "2026-03-02"', 'date = "2026-02-30"', "no day of the calendar"),
        ('date = "2026-03-02"', "date = 2026-03-02", "text in quotes"),
        ("power_w_m = [40.0, 90.0]", "power_w_m = [90.0, 40.0]", "90 is above 40"),
        ("heat_kj_kg = ", "heat_kj_kg = 1700.0 # ", "1600"),
        ("n_coupons = 11", "n_coupons = 2", "3"),
        ("doubts = []", "doubts = []\nweather = 1", "no such key"),
        ("degrees_of_freedom = 8\n", "", "is missing"),
    ],
)
def test_a_damaged_calibration_is_refused_by_line(own_folder, old, new, words):
    text = calibration_toml(sample_calibration())
    assert old in text
    (own_folder / "shop.toml").write_text(text.replace(old, new))
    with pytest.raises(InputError) as refused:
        load.calibration("shop")
    assert words in str(refused.value)
    assert "shop.toml:" in str(refused.value)


@pytest.mark.parametrize("change", ["uneven", "negative", "too alike"])
def test_a_covariance_that_is_none_is_refused(own_folder, change):
    covariance = sample_calibration().covariance.copy()
    if change == "uneven":
        covariance[0, 1] *= 1.1
    elif change == "negative":
        covariance[1, 1] = -1.0
    else:
        covariance[0, 1] = covariance[1, 0] = 2.0 * np.sqrt(covariance[0, 0] * covariance[1, 1])
    calibration = replace(sample_calibration(), covariance=covariance)
    (own_folder / "shop.toml").write_text(calibration_toml(calibration))
    with pytest.raises(InputError, match="not the covariance"):
        load.calibration("shop")
