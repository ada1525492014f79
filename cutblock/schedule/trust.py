"""What to say of a calibration that a job or a wire is asked about with."""

from collections.abc import Iterator

from cutblock.records.plan import Finding
from cutblock.records.shop import Calibration, Wire
from cutblock.records.words import Severity
from cutblock.schedule.window import is_same_wire

_SLACK = 1e-9  # forgives the last digit of a unit's conversion


def calibration_findings(
    calibration: Calibration,
    subject: str,
    *,
    wire: Wire,
    density_kg_m3: float,
    power_w_m: float,
    machine: str = "",
    grade: str = "",
) -> tuple[Finding, ...]:
    """Return whose test cuts the numbers rest on, and where they were made for something else.

    Args:
        calibration: In use.
        subject: Whom the findings are about.
        wire: In use.
        density_kg_m3: Of the foam.
        power_w_m: In use.
        machine: Name of the machine in use; "" where none is asked about.
        grade: Name of the foam's grade, likewise.
    """
    warnings = [("calibration-differs", text) for text in _differences(calibration, wire, machine, grade)]
    warnings += [("extrapolated", text) for text in _stretches(calibration, density_kg_m3, power_w_m)]
    if calibration.doubts:
        text = f'Calibration "{calibration.name}" is in doubt. {" ".join(calibration.doubts)}'
        warnings.append(("calibration-doubts", text))
    return (
        Finding(severity=Severity.INFO, code="calibrated", subject=subject, text=_basis(calibration)),
        *(Finding(severity=Severity.WARNING, code=code, subject=subject, text=text) for code, text in warnings),
    )


def _basis(calibration: Calibration) -> str:
    foam = f", {calibration.grade}" if calibration.grade else ""
    return (
        f'Calibrated by "{calibration.name}": {calibration.n_coupons} test cuts of {calibration.date} with'
        f" {calibration.wire} on {calibration.machine}{foam}. Each speed limit holds with 95 % confidence."
    )


def _differences(calibration: Calibration, wire: Wire, machine: str, grade: str) -> Iterator[str]:
    made = f'Calibration "{calibration.name}" was made'
    if not is_same_wire(wire, calibration):
        yield (
            f"{made} with {calibration.alloy} wire of {calibration.diameter_mm:g} mm; here it is {wire.alloy} of"
            f" {wire.diameter_mm:g} mm. Cut coupons with this wire."
        )
    if machine and calibration.machine != machine:
        yield f"{made} on machine {calibration.machine}; here it is {machine}. Cut coupons on this machine."
    if grade and calibration.grade and calibration.grade != grade:
        yield (
            f"{made} in {calibration.grade}; here it is {grade}. The law allows for the density, not for another make"
            " of foam: cut coupons in this foam."
        )


def _stretches(calibration: Calibration, density_kg_m3: float, power_w_m: float) -> Iterator[str]:
    for value, (low, high), word, unit in (
        (density_kg_m3, calibration.density_kg_m3, "density", "kg/m3"),
        (power_w_m, calibration.power_w_m, "power", "W/m"),
    ):
        if not low * (1.0 - _SLACK) <= value <= high * (1.0 + _SLACK):
            span = f"{low:.4g} to {high:.4g}" if high > low else f"{low:.4g}"
            yield (
                f'{word.capitalize()} {value:.4g} {unit} is outside what the coupons of "{calibration.name}" spanned'
                f" ({span} {unit}): the limits are extrapolated. Cut a coupon there."
            )
