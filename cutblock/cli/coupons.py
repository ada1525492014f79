"""`cutblock coupons plan` and `cutblock coupons fit`."""

import argparse
import json
from datetime import datetime
from pathlib import Path

from cutblock.base.units import mm_per_minute
from cutblock.flow.coupon_fit import FittedCoupons, fit_sheet, fitted_values, plain_name, store_calibration
from cutblock.flow.coupon_plan import CouponPlan, plan_coupons, write_coupon_sheet


def run_coupons(chosen: argparse.Namespace) -> int:
    """Plan test cuts, or fit the kerf law to them.

    Returns:
        0, or 1 when the fit has an error and is not stored.
    """
    return _run_plan(chosen) if chosen.step == "plan" else _run_fit(chosen)


def _run_plan(chosen: argparse.Namespace) -> int:
    plan = plan_coupons(chosen.wire, chosen.machine, chosen.power, chosen.density, chosen.grade, chosen.other)
    written = write_coupon_sheet(plan, chosen.out) if chosen.out is not None else None
    if chosen.json:
        print(json.dumps([cut._asdict() for cut in plan.cuts], indent=1))
        return 0
    _print_plan(plan)
    if written is None:
        print("Nothing written; add --out DIR for the sheet to fill in.")
    else:
        print(f"Print {written[1]}, fill in {written[0]}, then: cutblock coupons fit {written[0]} --name NAME")
    return 0


def _print_plan(plan: CouponPlan) -> None:
    print(f"Test cuts with {plan.wire.name} on {plan.machine.name}; kerfs expected are uncalibrated, +-50 %")
    print("coupon   W/m  mm/min  kg/m3  kerf mm  for")
    for number, cut in enumerate(plan.cuts, start=1):
        speed, kerf = f"{mm_per_minute(cut.speed_m_s * 1e3):.1f}", f"{cut.kerf_m * 1e3:.2f}"
        if cut.kind == "onset":
            speed, kerf = f">{mm_per_minute(cut.speed_m_s * 1e3):.0f}", ""
        print(f"C{number:02d}     {cut.power_w_m:5.0f}  {speed:>6}  {cut.density_kg_m3:5.1f}  {kerf:>7}  {cut.purpose}")


def _run_fit(chosen: argparse.Namespace) -> int:
    # The one place that knows the day: a sheet without dates was cut today, unless --date says otherwise.
    today = datetime.now().astimezone().date().isoformat()
    name = chosen.name if chosen.name is not None else plain_name(Path(chosen.file).stem)
    fitted = fit_sheet(chosen.file, name, today, chosen.wire, chosen.machine, chosen.grade, chosen.date)
    is_kept = fitted.is_sound and (chosen.name is not None or chosen.out is not None)
    stored = store_calibration(fitted, chosen.out) if is_kept else None
    if chosen.json:
        paths = {
            "stored": None if stored is None else str(stored[0]),
            "picture": None if stored is None else str(stored[1]),
        }
        print(json.dumps(fitted_values(fitted) | paths, indent=1, allow_nan=False))
    else:
        _print_fit(fitted)
        _print_storing(fitted, stored, is_own=chosen.out is None)
    return 0 if fitted.is_sound else 1


def _print_fit(fitted: FittedCoupons) -> None:
    found, errors = fitted.calibration, fitted.standard_errors
    foam = f", {found.grade}" if found.grade else ""
    print(f"{found.name}: {found.n_coupons} test cuts of {found.date}, {found.wire} on {found.machine}{foam}")
    print(f"  w0 (kerf at great speed)  {found.least_kerf_mm:8.3f} +- {errors[0]:.3f} mm")
    print(f"  H (heat per kg of foam)   {found.heat_kj_kg:8.0f} +- {errors[1]:.0f} kJ/kg")
    print(f"  q0 (power that melts none){found.threshold_w_m:8.1f} +- {errors[2]:.1f} W/m")
    print(f"  reduced chi-square {found.chi_square:.2f}, condition number {fitted.condition:.0f}")
    for name, kerf, residual in zip(fitted.names, fitted.kerf_mm, fitted.residual_mm, strict=True):
        print(f"  {name:<8} kerf {kerf:.2f} mm, {residual:+.3f} mm off the law")
    for power, low, high in fitted.limits:
        span = f"{mm_per_minute(low):.0f} to {mm_per_minute(high):.0f} mm/min ({low:.2f} to {high:.2f} mm/s)"
        print(f"  speeds at {power:g} W/m in {fitted.density_kg_m3:.4g} kg/m3, 95 % sure at each end: {span}")
    for doubt in fitted.doubts:
        print(f"{doubt.severity}: {doubt.text}")


def _print_storing(fitted: FittedCoupons, stored: tuple[Path, Path] | None, *, is_own: bool) -> None:
    if not fitted.is_sound:
        print("Not stored: look at the error.")
    elif stored is None:
        print("Not stored; add --name NAME to keep it for jobs.")
    else:
        key = fitted.calibration.name if is_own else stored[0].name
        print(f"Stored: {stored[0]}, picture {stored[1].name}")
        print(f'In a job: [cutting] calibration = "{key}"{"" if is_own else ", the file beside the job"}')
