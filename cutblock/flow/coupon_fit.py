"""The kerf law fitted to a sheet of test cuts, as a calibration that jobs can name."""

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date
from pathlib import Path

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import InputError
from cutblock.catalog import load as catalog
from cutblock.catalog.calibrations import calibration_toml
from cutblock.flow.coupon_file import read_coupons
from cutblock.flow.coupon_limits import coupon_chart, coupon_limits
from cutblock.flow.coupon_plan import made_folder
from cutblock.flow.folder import replace_file
from cutblock.records.coupons import CouponRow, CouponSheet
from cutblock.records.record import Record
from cutblock.records.shop import Calibration, Wire
from cutblock.reports.coupon_chart import coupon_drawing
from cutblock.reports.svg import svg_text
from cutblock.wire.calibration import KERF_ERROR_M, CouponFit, fit_coupons, weighed_kerf
from cutblock.wire.coupons import Doubt, coupon_doubts, needed_power, onset_clearance
from cutblock.wire.kerf import energy_bound

_MOST_HEAT_J_KG = 16e6  # ten times what foam can take: a unit is wrong
_WEIGHT_AGREES = 0.2
_MM = 1e3


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class FittedCoupons(Record):
    """A calibration and how it came about."""

    calibration: Calibration
    doubts: tuple[Doubt, ...]
    standard_errors: tuple[float, float, float]  # of w0 mm, H kJ/kg, q0 W/m
    condition: float
    names: tuple[str, ...]
    kerf_mm: tuple[float, ...]  # measured
    residual_mm: tuple[float, ...]  # measured less fitted
    limits: tuple[tuple[float, float, float], ...]  # power W/m, least and most speed mm/s, at the usual density
    density_kg_m3: float  # the usual one
    picture: str  # SVG

    @property
    def is_sound(self) -> bool:
        """Whether jobs may use it."""
        return not any(doubt.severity == "error" for doubt in self.doubts)


def fit_sheet(
    path: str | Path,
    name: str,
    today: str,
    wire_name: str | None = None,
    machine_name: str | None = None,
    grade_name: str | None = None,
    day: str | None = None,
) -> FittedCoupons:
    """Fit the kerf law to a sheet of test cuts.

    Args:
        path: The sheet.
        name: Of the calibration.
        today: Year-month-day, for a sheet without dates.
        wire_name: Of the catalogue, where the sheet does not say.
        machine_name: Likewise.
        grade_name: Likewise.
        day: Of the cuts; None: the last of the sheet.

    Raises:
        InputError: The sheet cannot be used, or says too little; names file, line and column.
    """
    check_name(name)
    sheet = read_coupons(path)
    file = Path(path).name
    wire = catalog.wire(_agreed(sheet.rows, "wire", wire_name, file))
    machine = catalog.machine(_agreed(sheet.rows, "machine", machine_name, file))
    cuts = tuple(row for row in sheet.rows if not row.is_onset)
    power, speed, density = _columns(cuts)
    kerfs = np.array([_kerf_mm(row) for row in cuts]) / _MM
    errors = np.array([row.kerf_error_mm or KERF_ERROR_M * _MM for row in cuts]) / _MM
    _check_energy(cuts, kerfs)
    try:
        fit = fit_coupons(power, speed, density, kerfs, errors)
    except InputError as error:
        raise InputError(error.message, file, error.remedy) from error
    names = tuple(row.name for row in cuts)
    clearance, notes = _clearance(sheet.rows, fit, wire)
    doubts = (*coupon_doubts(fit, power, speed, errors, names), *notes, *_sheet_notes(sheet))
    scale = np.array([_MM, 1.0 / _MM, 1.0])
    covariance = np.vectorize(_digits)(fit.law.covariance * np.outer(scale, scale))
    calibration = Calibration(
        name=name,
        wire=wire.name,
        alloy=wire.alloy,
        diameter_mm=wire.diameter_mm,
        machine=machine.name,
        grade=_grade(cuts, grade_name),
        date=_day(cuts, day, today),
        least_kerf_mm=_digits(fit.law.least_kerf_m * _MM),
        heat_kj_kg=_digits(fit.law.heat_j_kg / _MM),
        threshold_w_m=_digits(fit.law.threshold_w_m),
        covariance=covariance,
        degrees_of_freedom=fit.law.degrees_of_freedom,
        n_coupons=len(cuts),
        chi_square=_digits(fit.chi_square),
        density_kg_m3=(float(density.min()), float(density.max())),
        power_w_m=(float(power.min()), float(power.max())),
        speed_mm_s=(_digits(speed.min() * _MM), _digits(speed.max() * _MM)),
        clearance_mm=None if clearance is None else _digits(clearance),
        doubts=tuple(doubt.text for doubt in doubts if doubt.severity != "info"),
    )
    usual = float(np.median(density))
    limits, unsure = coupon_limits(calibration, wire, power, usual)
    chart = coupon_chart(calibration, wire, cuts, kerfs, errors, usual)
    return FittedCoupons(
        calibration=calibration,
        doubts=tuple(sorted(doubts + unsure, key=lambda doubt: ("error", "warning", "info").index(doubt.severity))),
        standard_errors=_three(np.sqrt(np.diag(covariance))),
        condition=fit.condition,
        names=names,
        kerf_mm=tuple((kerfs * _MM).tolist()),
        residual_mm=tuple((fit.residuals_m * _MM).tolist()),
        limits=limits,
        density_kg_m3=usual,
        picture=svg_text(coupon_drawing(chart)) + "\n",
    )


def store_calibration(fitted: FittedCoupons, folder: str | Path | None = None) -> tuple[Path, Path]:
    """Write a calibration and its picture, replacing one of the same name.

    Args:
        fitted: A sound fit.
        folder: Where to; None: the user's own calibrations, where jobs find it by its name.

    Returns:
        The paths of the two files.

    Raises:
        InputError: The fit has an error, or the folder cannot be written.
    """
    if not fitted.is_sound:
        raise InputError(
            "has an error and is not stored; nothing was written.",
            f"calibration {fitted.calibration.name}",
            next(doubt.text for doubt in fitted.doubts if doubt.severity == "error"),
        )
    target = made_folder(catalog.calibrations_folder() if folder is None else folder)
    stored, picture = (target / f"{fitted.calibration.name}.{end}" for end in ("toml", "svg"))
    earlier = picture.read_bytes() if picture.is_file() else None
    replace_file(picture, fitted.picture.encode())
    try:
        replace_file(stored, calibration_toml(fitted.calibration).encode())
    except InputError:
        # Both or neither: the picture goes back to what it was.
        picture.unlink(missing_ok=True)
        if earlier is not None:
            picture.write_bytes(earlier)
        raise
    return stored, picture


def check_name(name: str) -> None:
    """Refuse a name that makes no file name on every system.

    Raises:
        InputError: It is refused.
    """
    is_plain = all(letter.isascii() and (letter.isalnum() or letter in " ._-") for letter in name)
    if not (is_plain and 1 <= len(name) <= 60 and name[0].isalnum() and name[-1].isalnum()):
        raise InputError(
            f'"{name}" is no name for a calibration', "name", "Take letters, digits, spaces, points and hyphens."
        )
    if name.endswith(".toml"):
        raise InputError(f'"{name}" is a file name', "name", f'Leave the end off: "{name.removesuffix(".toml")}".')


def plain_name(text: str) -> str:
    """Return a name for a calibration from that of a file."""
    return (
        "".join(letter if letter.isascii() and letter.isalnum() else "-" for letter in text).strip("-")[:60]
        or "coupons"
    )


def fitted_values(fitted: FittedCoupons) -> dict[str, object]:
    """Return a fit as plain numbers, text, lists and dictionaries, for JSON."""
    found, least_error = fitted.calibration, fitted.standard_errors
    return {
        "name": found.name,
        "wire": found.wire,
        "machine": found.machine,
        "grade": found.grade,
        "date": found.date,
        "n_coupons": found.n_coupons,
        "least_kerf_mm": found.least_kerf_mm,
        "heat_kj_kg": found.heat_kj_kg,
        "threshold_w_m": found.threshold_w_m,
        "standard_errors": list(least_error),
        "covariance": found.covariance.tolist(),
        "degrees_of_freedom": found.degrees_of_freedom,
        "chi_square": found.chi_square,
        "condition": fitted.condition,
        "clearance_mm": found.clearance_mm,
        "density_kg_m3": list(found.density_kg_m3),
        "power_w_m": list(found.power_w_m),
        "speed_mm_s": list(found.speed_mm_s),
        "usual_density_kg_m3": fitted.density_kg_m3,
        "limits": [dict(zip(("power_w_m", "low_mm_s", "high_mm_s"), row, strict=True)) for row in fitted.limits],
        "coupons": [
            {"name": name, "kerf_mm": kerf, "residual_mm": residual}
            for name, kerf, residual in zip(fitted.names, fitted.kerf_mm, fitted.residual_mm, strict=True)
        ],
        "doubts": [doubt._asdict() for doubt in fitted.doubts],
        "is_sound": fitted.is_sound,
    }


def _agreed(rows: Sequence[CouponRow], key: str, given: str | None, file: str) -> str:
    """Return the one name that all rows, and the command line, give."""
    first = next((row for row in rows if getattr(row, key)), None)
    if first is None:
        if given is None:
            raise InputError(f"does not say with which {key} it was cut", file, f"Add --{key} NAME.")
        return given
    name: str = getattr(first, key)
    if given is not None and given != name:
        raise InputError(
            f'says {key} "{name}", not "{given}"', first.place, f"Leave --{key} out, or correct the sheet."
        )
    for row in rows:
        other = getattr(row, key)
        if other and other != name:
            raise InputError(
                f'says {key} "{other}", others "{name}"', row.place, f"One calibration is for one {key}: part the file."
            )
    return name


def _columns(cuts: Sequence[CouponRow]) -> tuple[Floats, Floats, Floats]:
    """Return power, speed in m/s and density of the cuts."""
    power, speed, density = (
        np.array([getattr(row, name) for row in cuts], dtype=np.float64)
        for name in ("power_w_m", "speed_mm_s", "density_kg_m3")
    )
    return power, speed / _MM, density


def _kerf_mm(row: CouponRow) -> float:
    """Return the kerf as measured, else as weighed."""
    weighed = _weighed_mm(row)
    kerf = row.kerf_mm if row.kerf_mm is not None else weighed
    assert kerf is not None  # the reader takes no cut without either
    return kerf


def _weighed_mm(row: CouponRow) -> float | None:
    if row.mass_loss_g is None or row.cut_area_cm2 is None:
        return None
    return float(weighed_kerf(row.mass_loss_g * 1e-3, row.density_kg_m3, row.cut_area_cm2 * 1e-4)) * _MM


def _check_energy(cuts: Sequence[CouponRow], kerfs: Floats) -> None:
    """Refuse a cut that melts more than its power can, or hardly any of it: a unit is wrong there."""
    remedy = "Check the units: speed in mm/s or mm/min as its heading says, kerf in mm, power in W per metre of wire."
    for row, kerf_m in zip(cuts, kerfs.tolist(), strict=True):
        speed_m_s = row.speed_mm_s / _MM
        needed = float(needed_power(kerf_m, row.density_kg_m3, speed_m_s))
        seen = f"{row.name}: {kerf_m * _MM:.2f} mm at {row.speed_mm_s:.3g} mm/s in {row.density_kg_m3:g} kg/m3"
        if needed > row.power_w_m:
            text = f"{seen} takes at least {needed:.0f} W/m, and there were {row.power_w_m:g}"
            raise InputError(text, row.place, remedy)
        collapse_j_kg = 1.0 / float(energy_bound(1.0, 1.0))
        if row.power_w_m / needed * collapse_j_kg > _MOST_HEAT_J_KG:
            text = f"{seen} takes {needed:.2g} W/m to melt, of {row.power_w_m:g} W/m: far too little"
            raise InputError(text, row.place, remedy)


def _clearance(rows: Sequence[CouponRow], fit: CouponFit, wire: Wire) -> tuple[float | None, tuple[Doubt, ...]]:
    """Return the least clearance at which the wire began to touch, where that was tried, and what to say of it."""
    found = [
        onset_clearance(fit, row.power_w_m, row.density_kg_m3, row.speed_mm_s / _MM, wire.diameter_mm / _MM) * _MM
        for row in rows
        if row.is_onset
    ]
    if not found:
        text = f"No onset coupon: the wire is taken to touch at {wire.clearance_mm:g} mm of clearance on each side."
        return None, (Doubt("info", "no-onset", text),)
    # The widest at which it touched is the safe one.
    clearance = max(found)
    if 0.0 < clearance <= 2.0:
        text = f"The wire began to touch at {clearance:.2f} mm of clearance on each side; the contact limit follows it."
        return clearance, (Doubt("info", "onset", text),)
    text = (
        f"The onset coupon gives a clearance of {clearance:.2f} mm, which cannot be: it is left out, and"
        f" {wire.clearance_mm:g} mm taken. Cut it again, the speed rising until the wire begins to bow or crackle."
    )
    return None, (Doubt("warning", "onset-outside", text),)


def _sheet_notes(sheet: CouponSheet) -> tuple[Doubt, ...]:
    notes = []
    if sheet.empty:
        notes.append(Doubt("info", "not-measured", f"Left out, not measured: {', '.join(sheet.empty)}."))
    if sheet.unused:
        notes.append(Doubt("info", "unused-columns", f"Columns without a use: {', '.join(sheet.unused)}."))
    weighed = [
        f"{row.name} {row.kerf_mm:.2f} and {other:.2f} mm"
        for row in sheet.rows
        for other in (_weighed_mm(row),)
        if row.kerf_mm is not None and other is not None and abs(other / row.kerf_mm - 1.0) > _WEIGHT_AGREES
    ]
    if weighed:
        text = (
            f"Measured and weighed kerfs differ by more than 20 % ({'; '.join(weighed)}); the measured ones count. Foam"
            " that melts and sets as a skin weighs as if it were never cut."
        )
        notes.append(Doubt("warning", "weight-differs", text))
    return tuple(notes)


def _grade(cuts: Sequence[CouponRow], given: str | None) -> str:
    """Return the grade given, else that of most cuts; one coupon is of other foam."""
    named = Counter(row.grade for row in cuts if row.grade)
    if given is not None:
        return catalog.grade(given).name
    return named.most_common(1)[0][0] if named else ""


def _day(cuts: Sequence[CouponRow], given: str | None, today: str) -> str:
    if given is None:
        return max((row.date for row in cuts), default="") or today
    try:
        return date.fromisoformat(given).isoformat()
    except ValueError:
        raise InputError(f'"{given}" is no day', "date", "Write year-month-day, such as 2026-03-02.") from None


def _digits(value: float) -> float:
    """Return a number to 12 digits: what follows differs from one processor to another."""
    return float(f"{value:.12g}")


def _three(values: Floats) -> tuple[float, float, float]:
    first, second, third = values.tolist()
    return first, second, third
