import re
import xml.etree.ElementTree as ET

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from kit.coupon_sheets import sheet_text
from kit.coupons import HEAT_J_KG, THRESHOLD_W_M

from cutblock.base.errors import InputError
from cutblock.catalog import load
from cutblock.flow.coupon_fit import check_name, fit_sheet, fitted_values, plain_name, store_calibration


@pytest.fixture(autouse=True)
def own_folder(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path / "config"))
    return tmp_path / "config" / "cutblock" / "calibrations"


@pytest.fixture
def fitted(tmp_path):
    def fit(text, name="shop", today="2030-01-01", **names):
        path = tmp_path / "coupons.csv"
        path.write_text(text)
        return fit_sheet(path, name, today, **names)

    return fit


def codes(found):
    return [doubt.code for doubt in found.doubts]


def test_noise_free_cuts_give_the_law_they_were_made_by(fitted):
    found = fitted(sheet_text(scatter_mm=np.zeros(11))).calibration
    assert found.least_kerf_mm == pytest.approx(0.15, rel=1e-6)
    assert found.heat_kj_kg == pytest.approx(HEAT_J_KG * 1e-3, rel=1e-6)
    assert found.threshold_w_m == pytest.approx(THRESHOLD_W_M, rel=1e-6)
    assert (found.wire, found.alloy, found.diameter_mm, found.machine) == (
        "NiCr80 0.40", "NiCr80", 0.4, "four-axis-2600"
    )  # fmt: skip
    assert (found.grade, found.date, found.n_coupons) == ("EPS 100", "2026-03-02", 11)
    assert found.density_kg_m3 == (20.0, 25.0)
    assert found.power_w_m == (40.0, 90.0)


def test_a_stored_calibration_is_found_by_its_name_and_is_the_same(fitted, own_folder):
    found = fitted(sheet_text(onset_mm_s=4.0))
    stored, picture = store_calibration(found)
    assert stored == own_folder / "shop.toml"
    assert sorted(path.name for path in own_folder.iterdir()) == ["shop.svg", "shop.toml"]
    again = load.calibration("shop")
    np.testing.assert_array_equal(again.covariance, found.calibration.covariance)
    assert again.heat_kj_kg == found.calibration.heat_kj_kg
    assert again.clearance_mm == found.calibration.clearance_mm
    assert ET.fromstring(picture.read_text()).tag.endswith("svg")


def test_the_result_depends_on_neither_clock_nor_folder(fitted, tmp_path, monkeypatch):
    first = fitted(sheet_text(), today="2030-01-01")
    monkeypatch.chdir(tmp_path)
    second = fitted(sheet_text(), today="2031-12-31")
    assert fitted_values(first) == fitted_values(second)
    assert first.picture == second.picture


def test_a_day_that_is_told_comes_before_the_sheet_and_the_sheet_before_today(fitted):
    undated = sheet_text().replace("2026-03-02", "")
    assert fitted(undated).calibration.date == "2030-01-01"
    assert fitted(sheet_text(), day="2026-05-05").calibration.date == "2026-05-05"
    assert fitted(sheet_text().replace("C03,cut", "C03,", 1)).calibration.date == "2026-03-02"
    with pytest.raises(InputError, match="is no day"):
        fitted(sheet_text(), day="5.5.2026")


def test_the_sheet_says_wire_and_machine_or_the_caller_does(fitted):
    silent = sheet_text().replace("NiCr80 0.40,four-axis-2600", ",")
    with pytest.raises(InputError, match=r"--wire NAME"):
        fitted(silent)
    with pytest.raises(InputError, match=r"--machine NAME"):
        fitted(silent, wire_name="NiCr80 0.40")
    found = fitted(silent, wire_name="NiCr80 0.40", machine_name="four-axis-1300", grade_name="EPS 150")
    assert (found.calibration.machine, found.calibration.grade) == ("four-axis-1300", "EPS 150")
    with pytest.raises(InputError, match=r'coupons.csv:2: says wire "NiCr80 0.40", not "NiCr80 0.50"'):
        fitted(sheet_text(), wire_name="NiCr80 0.50")


def test_two_wires_in_one_sheet_are_refused_by_line(fitted):
    lines = sheet_text().splitlines()
    lines[6] = lines[6].replace("NiCr80 0.40", "NiCr80 0.50")
    with pytest.raises(InputError, match=r'coupons.csv:7: says wire "NiCr80 0.50", others "NiCr80 0.40"'):
        fitted("\n".join(lines))


def test_a_wire_that_is_in_no_catalogue_is_refused(fitted):
    with pytest.raises(InputError, match="no wire called"):
        fitted(sheet_text(wire="steel 0.4"))


def changed(line, column, value):
    lines = sheet_text().splitlines()
    cells = lines[line - 1].split(",")
    cells[column] = value
    lines[line - 1] = ",".join(cells)
    return "\n".join(lines)


def test_a_speed_in_another_unit_is_found_by_the_heat_it_would_take(fitted):
    with pytest.raises(InputError, match=r"coupons.csv:5: C04: .* takes at least .* W/m") as refused:
        fitted(changed(5, 3, "5400"))
    assert "mm/s or mm/min" in refused.value.remedy
    with pytest.raises(InputError, match=r"coupons.csv:5: C04: .* far too little"):
        fitted(changed(5, 3, "3.9"))


def test_two_coupons_are_refused_and_named(fitted):
    with pytest.raises(InputError, match=r"coupons.csv: 2 test cuts are too few"):
        fitted(sheet_text(n_cuts=2))


def test_four_coupons_fit_the_heat_only_and_say_so(fitted):
    found = fitted(sheet_text(n_cuts=4))
    assert "few-coupons" in codes(found)
    assert found.calibration.least_kerf_mm == pytest.approx(0.1)
    assert found.is_sound
    assert any("too few" in doubt for doubt in found.calibration.doubts)


def test_an_onset_coupon_gives_the_clearance(fitted):
    speed = (60.0 - 13.0) / (20.0 * 800e3) / (0.8e-3 - 0.15e-3) * 1e3
    found = fitted(sheet_text(scatter_mm=np.zeros(11), onset_mm_s=speed))
    assert found.calibration.clearance_mm == pytest.approx(0.2, rel=1e-6)
    assert found.calibration.n_coupons == 11
    assert "onset" in codes(found)
    assert fitted(sheet_text()).calibration.clearance_mm is None


def test_an_onset_inside_the_wire_is_left_out_and_told(fitted):
    found = fitted(sheet_text(onset_mm_s=30.0))
    assert found.calibration.clearance_mm is None
    assert "onset-outside" in codes(found)


def test_a_weighed_coupon_counts_like_a_measured_one(fitted):
    """0.4 kg of a block 0.3 x 0.3 m: the same kerf once by gauge and once by weight."""
    gauge = sheet_text()
    lines = gauge.splitlines()
    weighed = [lines[0].replace("kerf mm", "mass loss g,cut area cm2")]
    for line in lines[1:]:
        cells = line.split(",")
        mass = float(cells[5]) * 1e-3 * float(cells[4]) * 0.09 * 1e3
        weighed.append(",".join([*cells[:5], repr(mass), "900", *cells[6:]]))
    by_gauge, by_weight = fitted(gauge).calibration, fitted("\n".join(weighed)).calibration
    assert by_weight.heat_kj_kg == pytest.approx(by_gauge.heat_kj_kg, rel=1e-9)
    assert by_weight.chi_square == pytest.approx(by_gauge.chi_square, rel=1e-6)


def test_a_weight_that_disagrees_with_the_gauge_is_told(fitted):
    lines = sheet_text().splitlines()
    head = lines[0] + ",mass loss g,cut area cm2"
    cells = [line + ",," for line in lines[1:]]
    cells[2] = lines[3] + ",1.0,900"
    found = fitted("\n".join([head, *cells]))
    assert "weight-differs" in codes(found)
    assert "C03" in next(doubt.text for doubt in found.doubts if doubt.code == "weight-differs")


def test_a_smaller_stated_error_weighs_more(fitted):
    lines = sheet_text().splitlines()
    scattered = [lines[0] + ",kerf error mm", *(line + ",0.06" for line in lines[1:])]
    trusted = [*scattered[:4], scattered[4].replace(",0.06", ",0.005"), *scattered[5:]]
    loose, tight = fitted("\n".join(scattered)), fitted("\n".join(trusted))
    assert fitted_values(loose)["heat_kj_kg"] == pytest.approx(fitted_values(fitted(sheet_text()))["heat_kj_kg"])
    assert abs(tight.residual_mm[3]) < 0.3 * abs(loose.residual_mm[3])


def test_a_heat_that_cannot_be_is_not_stored(fitted, own_folder):
    found = fitted(sheet_text_of_heat(1.9e6))
    assert not found.is_sound
    with pytest.raises(InputError, match="nothing was written"):
        store_calibration(found)
    assert not own_folder.exists()


def sheet_text_of_heat(heat):
    lines = sheet_text(scatter_mm=np.zeros(11)).splitlines()
    out = [lines[0]]
    for line in lines[1:]:
        cells = line.split(",")
        cells[5] = repr(0.15 + (float(cells[5]) - 0.15) * HEAT_J_KG / heat)
        out.append(",".join(cells))
    return "\n".join(out)


def test_wild_cuts_leave_no_sure_speed_and_are_not_stored(fitted):
    found = fitted(sheet_text(scatter_mm=np.array([0.2, -0.3, 0.7, -0.3, 0.6, -1.1, 0.3, -0.4, 0.9, 0.6, -0.5])))
    assert codes(found)[:2] == ["no-sure-speed", "scatter"]
    assert not found.is_sound
    assert found.limits == ()


def test_a_folder_that_cannot_be_written_leaves_nothing_half(fitted, tmp_path):
    (tmp_path / "file").write_text("x")
    with pytest.raises(InputError, match="cannot be made a folder"):
        store_calibration(fitted(sheet_text()), tmp_path / "file")


@pytest.mark.parametrize("earlier", [None, b"<svg/>"])
def test_a_calibration_that_cannot_be_written_leaves_no_picture_of_it(fitted, tmp_path, earlier):
    (tmp_path / "out" / "shop.toml").mkdir(parents=True)
    if earlier is not None:
        (tmp_path / "out" / "shop.svg").write_bytes(earlier)
    with pytest.raises(InputError, match="cannot be written"):
        store_calibration(fitted(sheet_text()), tmp_path / "out")
    left = sorted(path.name for path in (tmp_path / "out").iterdir())
    assert left == (["shop.toml"] if earlier is None else ["shop.svg", "shop.toml"])
    assert earlier is None or (tmp_path / "out" / "shop.svg").read_bytes() == earlier


@given(
    edits=st.lists(
        st.tuples(st.integers(0, 800), st.integers(0, 12), st.text(st.characters(codec="utf-8"), max_size=4)),
        min_size=1,
        max_size=4,
    )
)
@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_a_sheet_damaged_anyhow_is_fitted_or_refused(tmp_path, edits):
    text = sheet_text(onset_mm_s=4.0)
    for place, length, put in edits:
        text = text[:place] + put + text[place + length :]
    path = tmp_path / "damaged.csv"
    path.write_text(text, encoding="utf-8", newline="")
    try:
        found = fit_sheet(path, "shop", "2030-01-01")
    except InputError:
        return
    assert np.isfinite(found.calibration.covariance).all()
    ET.fromstring(found.picture)


@pytest.mark.parametrize("name", ["", "a/b", "..", "x.toml", " x", "a" * 61, "naïve", "a\nb"])
def test_a_name_that_makes_no_file_is_refused(name):
    with pytest.raises(InputError):
        check_name(name)


@pytest.mark.parametrize(
    ("stem", "name"), [("EPS 100, März", "EPS-100--M-rz"), ("...", "coupons"), ("shop_2", "shop-2")]
)
def test_a_file_lends_its_name(stem, name):
    assert plain_name(stem) == name
    check_name(plain_name(stem))


def test_the_picture_shows_every_cut_and_both_limits(fitted):
    picture = fitted(sheet_text()).picture
    for number in range(1, 12):
        assert f">C{number:02d}<" in picture
    assert "the wire touches" in picture
    assert "melts too far" in picture
    for power in ("40 W/m", "60 W/m", "90 W/m"):
        assert power in picture
    numbers = [float(value) for value in re.findall(r'[xy][12]="(-?[\d.]+)"', picture)]
    assert 0.0 <= min(numbers) <= max(numbers) <= 180.0
