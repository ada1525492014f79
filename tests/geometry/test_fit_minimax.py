import numpy as np
import pytest
from kit.shapes import catenoid, dome, hypar, over, scherk, turned

from cutblock.geometry.fit import fit_patches
from cutblock.geometry.fit_target import Patch

L, W = 1200.0, 1000.0


def patch_of(height, **changes):
    x, y = np.linspace(0.0, L, 61), np.linspace(0.0, W, 51)
    values = {
        "heights_mm": over(height)(x[:, None], y),
        "low_x_mm": 0.0,
        "high_x_mm": L,
        "low_y_mm": 0.0,
        "high_y_mm": W,
        "width_mm": W,
        "strip_low_y_mm": 0.0,
        "strip_high_y_mm": W,
    }
    return Patch(**(values | changes))


@pytest.mark.parametrize(
    ("surface", "degrees", "largest"), [(dome, 0.0, 15.65), (scherk, 45.0, 0.96), (catenoid, 40.0, 0.185)]
)
def test_programmes_come_closer_than_weights_alone(surface, degrees, largest):
    patch = patch_of(turned(surface, degrees))
    reweighted = fit_patches([patch], 1e-3, polish_until=0.0, has_programmes=False)[0]
    least = fit_patches([patch], 1e-3, polish_until=0.0)[0]
    assert least.max_mm < largest
    # Reweighting looks at fewer points, so its own figure may be a little too good.
    assert least.max_mm < 1.07 * reweighted.max_mm


def test_programmes_keep_the_limits_of_the_wire():
    least = 0.6
    patch = patch_of(turned(scherk, 30.0), skew_limit_mm=150.0, least_advance=least)
    fit = fit_patches([patch], 1e-3, polish_until=0.0)[0]
    near, far = fit.rails_at(np.linspace(fit.start_mm, fit.end_mm, 301))
    step = (fit.end_mm - fit.start_mm) / 300
    assert fit.skew_mm <= 150.01
    for rail in (near, far):
        assert (np.diff(rail[:, 0]) >= (least - 1e-6) * step).all()


def test_a_sheet_fitted_before_is_polished_as_if_fitted_anew():
    patch = patch_of(turned(scherk, 30.0))
    rough = fit_patches([patch], 1.0, is_polished=False)
    resumed = fit_patches([patch], 1.0, starts=rough)[0]
    anew = fit_patches([patch], 1.0)[0]
    np.testing.assert_allclose(resumed.controls, anew.controls, atol=1e-6)


def test_the_squarest_sheet_is_kept_when_squareness_is_worth_more():
    # Turned by half a right angle the hypar's own rulings lie far askew; a square wire cuts it badly.
    patch = patch_of(turned(lambda x, y: 0.05 * hypar(x, y), 40.0))
    closest = fit_patches([patch], 10.0, is_polished=False, squareness=0.0)[0]
    squarest = fit_patches([patch], 10.0, is_polished=False, squareness=1.0)[0]
    assert closest.max_mm < 1e-3
    assert squarest.skew_mm < 1.0 < closest.skew_mm
    assert closest.max_mm < squarest.max_mm < 10.0


def test_no_squareness_is_worth_leaving_the_tolerance():
    """Straight rulings miss this catenoid by 5.88 mm, its own lie up to 106 mm askew and miss it by 0.33 mm."""
    patch = patch_of(turned(catenoid, 40.0))
    square, askew = (fit_patches([patch], value, is_polished=False, squareness=1.0)[0] for value in (6.0, 5.8))
    assert square.skew_mm < 1.0
    assert 5.8 < square.max_mm < 6.0
    assert askew.skew_mm > 100.0
    assert askew.max_mm < 0.4
