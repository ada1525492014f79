"""The speed limits and the picture that a calibration gives at the powers of its test cuts."""

from collections.abc import Sequence

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.records.coupons import CouponChart, CouponCurve, CouponPoint, CouponRow
from cutblock.records.shop import Calibration, Wire
from cutblock.schedule.conditions import widest_kerf_mm
from cutblock.schedule.window import contact_kerf_mm, kerf_law, speed_limits
from cutblock.wire.calibration import kerf_range
from cutblock.wire.coupons import Doubt

_N_CURVE = 60
_MOST_CURVES = 4
_MM = 1e3


def coupon_limits(
    calibration: Calibration, wire: Wire, power: Floats, density: float
) -> tuple[tuple[tuple[float, float, float], ...], tuple[Doubt, ...]]:
    """Return the speed limits at the powers of the cuts, and what to say where there are none."""
    contact = contact_kerf_mm(wire, calibration)
    rows = []
    for value in _few(power):
        low, high = speed_limits(value, density, contact, widest_kerf_mm(None, contact), calibration)
        if 0.0 < float(low) < float(high):
            rows.append((value, float(low), float(high)))
    if rows:
        return tuple(rows), ()
    text = (
        "At none of the powers is there a speed that surely keeps both kerf limits: the cuts scatter too much, or are"
        " too few. Jobs cannot use this; cut more coupons."
    )
    return (), (Doubt("error", "no-sure-speed", text),)


def _few(power: Floats) -> list[float]:
    """Return the different powers, or where there are many the least, the middle one and the most."""
    different = sorted({round(value, 1) for value in power.tolist()})
    return (
        different if len(different) <= _MOST_CURVES else [different[0], different[len(different) // 2], different[-1]]
    )


def coupon_chart(
    calibration: Calibration,
    wire: Wire,
    cuts: Sequence[CouponRow],
    kerfs: Floats,
    errors: Floats,
    density: float,
) -> CouponChart:
    """Return the cuts, kerfs and errors in m, with the law at a few powers in foam of one density, for a picture."""
    power, speed, densities = (
        np.array([getattr(row, name) for row in cuts], dtype=np.float64)
        for name in ("power_w_m", "speed_mm_s", "density_kg_m3")
    )
    speed = speed / _MM
    alike = speed * densities / density
    law = kerf_law(calibration)
    powers = np.array(_few(power))
    nearest = np.argmin(np.abs(power[:, None] - powers), axis=1)
    speeds = np.geomspace(0.85 * alike.min(), 1.1 * alike.max(), _N_CURVE)
    curves = []
    for value in powers.tolist():
        low, high = kerf_range(law, value, density, speeds)
        kerf = law.least_kerf_m + law.rate(value, density) / speeds
        curves.append(
            CouponCurve(
                power_w_m=value, speed_mm_s=speeds * _MM, kerf_mm=kerf * _MM, low_mm=low * _MM, high_mm=high * _MM
            )
        )
    points = tuple(
        CouponPoint(name=row.name, curve=int(curve), speed_mm_s=at * _MM, kerf_mm=kerf * _MM, error_mm=error * _MM)
        for row, curve, at, kerf, error in zip(
            cuts, nearest.tolist(), alike.tolist(), kerfs.tolist(), errors.tolist(), strict=True
        )
    )
    contact = contact_kerf_mm(wire, calibration)
    return CouponChart(
        title=f"{calibration.name}: {calibration.wire}, {calibration.date}",
        density_kg_m3=density,
        curves=tuple(curves),
        points=points,
        contact_kerf_mm=contact,
        widest_kerf_mm=widest_kerf_mm(None, contact),
    )
