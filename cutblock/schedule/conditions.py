"""What the wire does in the job's foam at the job's power: kerf rate, speed window and planned speed."""

import numpy as np

from cutblock.base.errors import InputError
from cutblock.catalog import load as catalog
from cutblock.records.job import Job
from cutblock.records.plan import Finding
from cutblock.records.shop import EPS_DENSITY_KG_M3, Calibration, Conditions, Wire
from cutblock.records.words import Severity
from cutblock.schedule.trust import calibration_findings
from cutblock.schedule.window import CONTACT_SHARE, contact_kerf_mm, law_at, needed_power, speed_limits
from cutblock.wire.air import air_power, free_air_temperature
from cutblock.wire.electrics import wire_resistance, wire_voltage
from cutblock.wire.kerf import LARGEST_KERF_M, LEAST_KERF_M, is_extrapolated
from cutblock.wire.mechanics import mass_per_metre, tension_limit, wire_sag
from cutblock.wire.speed import WIDEST_KERF_M
from cutblock.wire.warnings import air_cautions, law_cautions, voltage_cautions

AIR_MOVE_C = 300.0  # what the wire may be in air: hot enough to enter foam, far below ignition
LEAST_SPEED_MM_S = 0.1  # a contact limit below this is no cutting

# The widest kerf is moved out so far beyond a wanted or a narrowest kerf, in kerf beyond w0.
_BEYOND_WANTED = 1.25
_BEYOND_CONTACT = 1.5
_SAG_SHARE = 0.5  # of the tolerance that the wire's own sag may take before it is told
_MM = 1e3


def cutting_conditions(job: Job, wire: Wire) -> tuple[Conditions, tuple[Finding, ...]]:
    """Return the cutting conditions of a job.

    The narrowest kerf is the wire and its clearance on both sides. The widest is 2 mm, or where a wider kerf is wanted
    a quarter more than that beyond w0, but no more than 4 mm; a wire too thick for that gets half as much again as its
    narrowest kerf. Where no kerf is wanted the planned speed is the geometric mean of the two limits: the
    uncalibrated kerf rate may then be wrong by the same factor either way, about 1.5, before a limit is passed. Where
    the job names a calibration, kerf and limits follow from its test cuts, see `speed_limits`.

    Args:
        job: Its density, power, wanted kerf, machine and calibration.
        wire: The job's wire.

    Returns:
        The conditions, planned within the window, and findings: whether they are calibrated, and by test cuts of
        another wire, machine, density or power; that the kerf law is stretched beyond what it was made for; that the
        wanted kerf is outside the window, in which case the nearest limit is planned; a weighed density that its grade
        does not have; and cautions about heat and voltage.

    Raises:
        InputError: Density or power are out of range, the power melts too little to cut, the wanted kerf is no
            wider than the wire, or the calibration is missing or leaves no sure speed.
    """
    calibration = catalog.calibration(job.calibration) if job.calibration else None
    _check(job, wire, calibration)
    contact_mm = contact_kerf_mm(wire, calibration)
    law = law_at(job.power_w_m, job.density_kg_m3, calibration)
    rate, least_mm = float(law.rate_mm2_s), law.least_kerf_mm
    _check_melting(job, rate, contact_mm - least_mm, calibration)
    widest_mm = widest_kerf_mm(job.kerf_mm, contact_mm)
    limits = speed_limits(job.power_w_m, job.density_kg_m3, contact_mm, widest_mm, calibration)
    low, high = float(limits[0]), float(limits[1])
    if calibration is not None:
        check_window(calibration, low, high)
    wanted = float(np.sqrt(low * high)) if job.kerf_mm is None else rate / (job.kerf_mm - least_mm)
    planned = min(max(wanted, low), high)
    conditions = Conditions(
        density_kg_m3=job.density_kg_m3,
        power_w_m=job.power_w_m,
        kerf_rate_mm2_s=rate,
        least_kerf_mm=least_mm,
        low_mm_s=low,
        high_mm_s=high,
        planned_mm_s=planned,
        kerf_mm=job.kerf_mm if job.kerf_mm is not None and planned == wanted else least_mm + rate / planned,
        widest_kerf_mm=widest_mm,
        is_calibrated=calibration is not None,
        calibration=calibration,
    )
    findings = _window_findings(job, conditions, wanted, contact_mm)
    if calibration is not None:
        findings += calibration_findings(
            calibration,
            job.id,
            wire=wire,
            density_kg_m3=job.density_kg_m3,
            power_w_m=job.power_w_m,
            machine=catalog.machine(job.machine).name,
            grade=job.grade,
        )
    return conditions, findings + _grade_findings(job) + _cautions(job, wire, conditions, contact_mm)


def _check(job: Job, wire: Wire, calibration: Calibration | None) -> None:
    low, high = EPS_DENSITY_KG_M3
    if not low <= job.density_kg_m3 <= high:
        raise InputError(
            f"density {job.density_kg_m3:g} kg/m3 is outside {low:g} to {high:g} kg/m3, the range of EPS.",
            job.id,
            "Weigh the block and give its mass over its volume.",
        )
    if not 0.0 < job.power_w_m < np.inf:
        raise InputError(
            f"power {job.power_w_m:g} W/m does not heat the wire.",
            job.id,
            "Give W per metre of wire, usually 30 to 120.",
        )
    narrowest = max(LEAST_KERF_M * _MM if calibration is None else calibration.least_kerf_mm, wire.diameter_mm)
    if job.kerf_mm is not None and not job.kerf_mm > narrowest:
        raise InputError(
            f"kerf {job.kerf_mm:g} mm is no wider than {narrowest:.3g} mm, which {wire.name} leaves at any speed.",
            job.id,
            f"Ask for more than {wire.diameter_mm + 2.0 * wire.clearance_mm:g} mm, or take a thinner wire.",
        )


def _check_melting(job: Job, rate: float, contact_excess_mm: float, calibration: Calibration | None) -> None:
    """Refuse a power at which the wire would have to crawl."""
    if contact_excess_mm <= 0.0 or rate / contact_excess_mm >= LEAST_SPEED_MM_S:
        return
    needed = needed_power(LEAST_SPEED_MM_S * contact_excess_mm, job.density_kg_m3, calibration)
    raise InputError(
        f"{job.power_w_m:g} W/m melts too little of {job.density_kg_m3:g} kg/m3 foam to cut it.",
        job.id,
        f"Give at least {np.ceil(needed):.0f} W/m; 30 to 120 W/m is usual.",
    )


def check_window(calibration: Calibration, low: float, high: float) -> None:
    """Refuse a calibration whose test cuts leave no speed that surely keeps both limits."""
    if high > low:
        return
    raise InputError(
        f"its {calibration.n_coupons} test cuts leave no speed that surely keeps both kerf limits: against too wide a"
        f" kerf it takes {low:.2f} mm/s and more, against touching {high:.2f} mm/s and less"
        f" ({100.0 * CONTACT_SHARE:.0f} % of the lower 95 % bound).",
        f"calibration {calibration.name}",
        "Cut more coupons, near the density and power of the job; or leave the calibration out of the job.",
    )


def _grade_findings(job: Job) -> tuple[Finding, ...]:
    """Return what to say of a density given beside a grade that does not have it."""
    if not job.grade:
        return ()
    grade = catalog.grade(job.grade)
    low, high = grade.density_low_kg_m3, grade.density_high_kg_m3
    if low <= job.density_kg_m3 <= high:
        return ()
    text = (
        f"{job.density_kg_m3:g} kg/m3 is not what {grade.name} usually weighs ({low:g} to {high:g} kg/m3). Speeds and"
        f" masses follow the {job.density_kg_m3:g} kg/m3; the strength named by the grade may not hold. Weigh the block"
        " again, or ask for what was delivered."
    )
    return (Finding(severity=Severity.WARNING, code="density-outside-grade", subject=job.id, text=text),)


def widest_kerf_mm(wanted_mm: float | None, contact_mm: float) -> float:
    """Return the kerf at the over-melt limit, as `cutting_conditions` explains it."""
    least = LEAST_KERF_M * _MM
    widest = WIDEST_KERF_M * _MM
    if wanted_mm is not None:
        widest = max(widest, min(least + _BEYOND_WANTED * (wanted_mm - least), LARGEST_KERF_M * _MM))
    return max(widest, least + _BEYOND_CONTACT * (contact_mm - least))


def _window_findings(job: Job, conditions: Conditions, wanted: float, contact_mm: float) -> tuple[Finding, ...]:
    """Return what to say of a wanted kerf that the window does not allow."""
    low, high = conditions.low_mm_s, conditions.high_mm_s
    if job.kerf_mm is None or low <= wanted <= high:
        return ()
    reason = (
        f"over {high:.2f} mm/s, where the wire starts to touch the foam (kerf {contact_mm:g} mm)"
        if wanted > high
        else f"under {low:.2f} mm/s, where it melts {conditions.widest_kerf_mm:g} mm and more"
    )
    text = (
        f"A kerf of {job.kerf_mm:g} mm asks for {wanted:.2f} mm/s, {reason}. Planned at"
        f" {conditions.planned_mm_s:.2f} mm/s with a kerf of {conditions.kerf_mm:.2f} mm instead; change the kerf or"
        " the wire."
    )
    return (Finding(severity=Severity.WARNING, code="kerf-outside-window", subject=job.id, text=text),)


def _sag_findings(job: Job, wire: Wire, hottest_c: float) -> tuple[Finding, ...]:
    """Return what to say of a wire that sags over the machine's span, at the most tension it bears hot."""
    length_m, diameter_m = catalog.machine(job.machine).span_mm / _MM, wire.diameter_mm / _MM
    tension = float(tension_limit(diameter_m, hottest_c))
    sag_mm = float(wire_sag(mass_per_metre(diameter_m, wire.density_kg_m3), length_m, tension)) * _MM
    if sag_mm <= _SAG_SHARE * job.tolerance_mm:
        return ()
    text = (
        f"{length_m:g} m of wire is long for its tension: even at the {tension:.0f} N it bears at {hottest_c:.0f} degC"
        f" it sags {sag_mm:.2f} mm. Level faces come out lower by that, of a tolerance of {job.tolerance_mm:g} mm, and"
        " the plan does not count it. Take a machine with less span, or less power: a cooler wire bears more."
    )
    return (Finding(severity=Severity.WARNING, code="wire-sag", subject=job.id, text=text),)


def _cautions(job: Job, wire: Wire, conditions: Conditions, contact_mm: float) -> tuple[Finding, ...]:
    diameter_m = wire.diameter_mm / _MM
    is_outside = bool(
        is_extrapolated(job.power_w_m, job.density_kg_m3, diameter_m, conditions.kerf_mm / _MM, contact_mm / _MM)
    )
    law = law_cautions(job.power_w_m, job.density_kg_m3, is_outside=is_outside, is_calibrated=conditions.is_calibrated)
    free_air_c = float(free_air_temperature(job.power_w_m, diameter_m))
    hot = float(wire_resistance(diameter_m, wire.resistivity_ohm_m, wire.alloy, AIR_MOVE_C))
    voltage = float(wire_voltage(job.power_w_m, hot)) * catalog.machine(job.machine).span_mm / _MM
    law_codes = ("extrapolated",) if conditions.is_calibrated else ("uncalibrated", "extrapolated")
    groups = (
        (law_codes, law),
        (("hot-in-air",), air_cautions(free_air_c, float(air_power(AIR_MOVE_C, diameter_m)), job.power_w_m)),
        (("high-voltage",), voltage_cautions(voltage)),
    )
    return (
        *(
            Finding(severity=Severity(caution.severity), code=code, subject=job.id, text=caution.text)
            for codes, cautions in groups
            for code, caution in zip(codes, cautions, strict=False)
        ),
        *_sag_findings(job, wire, free_air_c),
    )
