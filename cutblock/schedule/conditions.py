"""What the wire does in the job's foam at the job's power: kerf rate, speed window and planned speed."""

import numpy as np

from cutblock.base.errors import InputError
from cutblock.catalog import load as catalog
from cutblock.records.job import Job
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions, Wire
from cutblock.records.words import Severity
from cutblock.wire.air import air_power, free_air_temperature
from cutblock.wire.electrics import wire_resistance, wire_voltage
from cutblock.wire.kerf import LARGEST_KERF_M, LEAST_KERF_M, is_extrapolated, kerf_rate, power_for_rate
from cutblock.wire.speed import WIDEST_KERF_M, contact_kerf
from cutblock.wire.warnings import air_cautions, law_cautions, voltage_cautions

AIR_MOVE_C = 300.0  # what the wire may be in air: hot enough to enter foam, far below ignition
DENSITY_RANGE_KG_M3 = (8.0, 60.0)

_LEAST_SPEED_MM_S = 0.1  # a contact limit below this is no cutting
# The widest kerf is moved out so far beyond a wanted or a narrowest kerf, in kerf beyond w0.
_BEYOND_WANTED = 1.25
_BEYOND_CONTACT = 1.5
_MM = 1e3
_MM2 = 1e6


def cutting_conditions(job: Job, wire: Wire) -> tuple[Conditions, tuple[Finding, ...]]:
    """Return the cutting conditions of a job.

    The narrowest kerf is the wire and its clearance on both sides. The widest is 2 mm, or where a wider kerf is wanted
    a quarter more than that beyond w0, but no more than 4 mm; a wire too thick for that gets half as much again as its
    narrowest kerf. Where no kerf is wanted the planned speed is the geometric mean of the two limits: the
    uncalibrated kerf rate may then be wrong by the same factor either way, about 1.5, before a limit is passed.

    Args:
        job: Its density, power, wanted kerf and machine.
        wire: The job's wire.

    Returns:
        The conditions, planned within the window, and findings: always that they are uncalibrated; that the kerf law
        is stretched beyond what it was made for; that the wanted kerf is outside the window, in which case the nearest
        limit is planned; and cautions about heat and voltage.

    Raises:
        InputError: Density or power are out of range, the power melts too little to cut, or the wanted kerf is no
            wider than the wire.
    """
    _check(job, wire)
    contact_mm = float(contact_kerf(wire.diameter_mm / _MM, wire.clearance_mm / _MM)) * _MM
    least_mm = LEAST_KERF_M * _MM
    rate = float(kerf_rate(job.power_w_m, job.density_kg_m3)) * _MM2
    _check_melting(job, rate, contact_mm - least_mm)
    widest_mm = widest_kerf_mm(job.kerf_mm, contact_mm)
    low, high = rate / (widest_mm - least_mm), rate / (contact_mm - least_mm)
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
    )
    return conditions, _window_findings(job, conditions, wanted, contact_mm) + _cautions(job, wire, conditions)


def _check(job: Job, wire: Wire) -> None:
    low, high = DENSITY_RANGE_KG_M3
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
    narrowest = max(LEAST_KERF_M * _MM, wire.diameter_mm)
    if job.kerf_mm is not None and not job.kerf_mm > narrowest:
        raise InputError(
            f"kerf {job.kerf_mm:g} mm is no wider than {narrowest:g} mm, which {wire.name} leaves at any speed.",
            job.id,
            f"Ask for more than {wire.diameter_mm + 2.0 * wire.clearance_mm:g} mm, or take a thinner wire.",
        )


def _check_melting(job: Job, rate: float, contact_excess_mm: float) -> None:
    """Refuse a power at which the wire would have to crawl."""
    if rate / contact_excess_mm >= _LEAST_SPEED_MM_S:
        return
    needed = float(power_for_rate(_LEAST_SPEED_MM_S * contact_excess_mm / _MM2, job.density_kg_m3))
    raise InputError(
        f"{job.power_w_m:g} W/m melts too little of {job.density_kg_m3:g} kg/m3 foam to cut it.",
        job.id,
        f"Give at least {np.ceil(needed):.0f} W/m; 30 to 120 W/m is usual.",
    )


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


def _cautions(job: Job, wire: Wire, conditions: Conditions) -> tuple[Finding, ...]:
    diameter_m = wire.diameter_mm / _MM
    contact_m = float(contact_kerf(diameter_m, wire.clearance_mm / _MM))
    is_outside = bool(
        is_extrapolated(job.power_w_m, job.density_kg_m3, diameter_m, conditions.kerf_mm / _MM, contact_m)
    )
    free_air_c = float(free_air_temperature(job.power_w_m, diameter_m))
    hot = float(wire_resistance(diameter_m, wire.resistivity_ohm_m, wire.alloy, AIR_MOVE_C))
    voltage = float(wire_voltage(job.power_w_m, hot)) * catalog.machine(job.machine).span_mm / _MM
    groups = (
        (("uncalibrated", "extrapolated"), law_cautions(job.power_w_m, job.density_kg_m3, is_outside=is_outside)),
        (("hot-in-air",), air_cautions(free_air_c, float(air_power(AIR_MOVE_C, diameter_m)), job.power_w_m)),
        (("high-voltage",), voltage_cautions(voltage)),
    )
    return tuple(
        Finding(severity=Severity(caution.severity), code=code, subject=job.id, text=caution.text)
        for codes, cautions in groups
        for code, caution in zip(codes, cautions, strict=False)
    )
