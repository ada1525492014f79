"""The usual cautions about a hot wire in polystyrene foam, with how much each matters here."""

from typing import NamedTuple

from cutblock.wire.kerf import DENSITY_RANGE_KG_M3, POWER_RANGE_W_M, UNCALIBRATED_SPREAD

HOT_IN_AIR_C = 400.0  # vapours of polystyrene catch fire from 350 to 490 degC
IGNITION_C = 450.0
GLOWING_C = 550.0
LARGEST_SAG_M = 1e-3  # mid-wire, under its own weight
EXTRA_LOW_VOLTAGE_V = 50.0  # alternating; the usual limit below which a touch is taken to be harmless in dry rooms


class Caution(NamedTuple):
    """One caution."""

    severity: str  # "info", "warning" or "error"
    text: str


def air_cautions(free_air_c: float, air_power_w_m: float, power_w_m: float) -> tuple[Caution, ...]:
    """Return what to say of the wire's temperature in free air.

    Ignition of vapours from 350 degC and of the foam at 450 to 490 degC: makers' fire sheets, ASTM D1929 tests.

    Args:
        free_air_c: Temperature the wire takes in still air at the cutting power.
        air_power_w_m: Power that keeps it cool enough in air.
        power_w_m: Cutting power.
    """
    if free_air_c <= HOT_IN_AIR_C:
        return ()
    drop = f"turn it down to {air_power_w_m:.0f} W/m in air moves (cutting takes {power_w_m:g} W/m)"
    seen = f"In free air the wire reaches about {free_air_c:.0f} degC"
    if free_air_c <= IGNITION_C:
        return (Caution("warning", f"{seen}, near where foam vapours catch fire: {drop}."),)
    if free_air_c <= GLOWING_C:
        return (Caution("warning", f"{seen}; foam and its vapours catch fire at that: {drop}."),)
    text = f"{seen} and glows: far too hot. Take less power or a thicker wire, and {drop}."
    return (Caution("error", text),)


def voltage_cautions(voltage_v: float) -> tuple[Caution, ...]:
    """Return what to say of the voltage over the whole wire; extra-low voltage ends at 50 V (IEC 61140)."""
    if voltage_v <= EXTRA_LOW_VOLTAGE_V:
        return ()
    text = (
        f"{voltage_v:.0f} V over the wire is above extra-low voltage (50 V AC): guard the wire, use an isolating"
        " supply, and have a licensed electrician look at it. A thicker wire needs less."
    )
    return (Caution("warning", text),)


def law_cautions(
    power_w_m: float, density_kg_m3: float, *, is_outside: bool, is_calibrated: bool = False
) -> tuple[Caution, ...]:
    """Return what to say of how sure the numbers are."""
    percent = 100.0 * UNCALIBRATED_SPREAD
    cautions = []
    if not is_calibrated:
        text = f"Uncalibrated: kerf and speeds are good to +-{percent:.0f} %. Cut test coupons first."
        cautions.append(Caution("info", text))
    if is_outside:
        text = (
            f"{power_w_m:g} W/m in {density_kg_m3:g} kg/m3 with this wire and kerf lies outside what the kerf law"
            f" was made for ({DENSITY_RANGE_KG_M3[0]:g} to {DENSITY_RANGE_KG_M3[1]:g} kg/m3, {POWER_RANGE_W_M[0]:g} to"
            f" {POWER_RANGE_W_M[1]:g} W/m, wires of 0.2 to 0.8 mm, kerfs up to 4 mm): take the numbers as a guess."
        )
        cautions.append(Caution("warning", text))
    return tuple(cautions)


def tension_cautions(
    tension_n: float, limit_n: float, length_m: float, sag_m: float, slack_sag_m: float
) -> tuple[Caution, ...]:
    """Return what to say of the wire's tension, its sag, and what it would do between fixed ends.

    Args:
        tension_n: As the springs or weights give it.
        limit_n: What the hot wire bears for long.
        length_m: Between the wire's ends.
        sag_m: Under its own weight at that tension.
        slack_sag_m: What the warm wire would sag between fixed ends.
    """
    cautions = []
    if tension_n > limit_n * (1.0 + 1e-9):
        text = (
            f"{tension_n:.1f} N is more than the {limit_n:.1f} N the hot wire bears for long: it creeps and breaks."
            " Take a thicker wire, less power or less tension."
        )
        cautions.append(Caution("error", text))
    if sag_m > LARGEST_SAG_M:
        text = (
            f"{length_m:g} m of wire is too long for its tension: at {tension_n:.1f} N it sags {sag_m * 1e3:.1f} mm,"
            f" which goes into the cut. Tighten it up to {limit_n:.1f} N, shorten it, or take less power: a cooler wire"
            " bears more."
        )
        cautions.append(Caution("warning", text))
    text = (
        f"Keep the tension with a weight or a long spring: between fixed ends the hot wire would sag"
        f" {slack_sag_m * 1e3:.0f} mm."
    )
    return (*cautions, Caution("info", text))


def melting_cautions(power_w_m: float, needed_w_m: float, collapse_temperature_c: float) -> tuple[Caution, ...]:
    """Return what to say of a power too small to bring foam to collapse at any speed of use."""
    if power_w_m >= needed_w_m:
        return ()
    text = (
        f"{power_w_m:g} W/m does not bring the foam to its collapse at {collapse_temperature_c:.0f} degC at any speed"
        f" of use: give at least {needed_w_m:.0f} W/m."
    )
    return (Caution("error", text),)


def usual_cautions() -> tuple[Caution, ...]:
    """Return the cautions that hold at every hot wire."""
    texts = (
        "Cut polystyrene foam only. Polyurethane and PVC foams give off cyanide, isocyanates and acid when melted.",
        "Extract the fumes (styrene) at the wire and air the room; keep within the exposure limits where you work.",
        "Never let a hot wire stand in or over foam: off when the feed stops. Keep an extinguisher at hand.",
        "Let fresh blocks air out: pentane left from moulding can form an explosive mixture in a closed room or van.",
        "The wire is hot and taut, and whips when it breaks: guards, eye protection, no hands near it under power.",
        "Set the power by current and voltage; the resistance of nickel-chromium tells nothing about its temperature.",
        "Local rules on machines, electricity, fire and work places come first; have licensed people check the set-up.",
    )
    return tuple(Caution("info", text) for text in texts)


def wire_cautions(
    *,
    power_w_m: float,
    density_kg_m3: float,
    free_air_c: float,
    air_power_w_m: float,
    voltage_v: float,
    is_outside: bool,
    is_calibrated: bool = False,
) -> tuple[Caution, ...]:
    """Return every caution for a wire at work, the gravest first.

    Args:
        power_w_m: Cutting power per metre of wire.
        density_kg_m3: Of the foam.
        free_air_c: Temperature of the wire in still air at that power.
        air_power_w_m: Power that keeps it cool enough in air.
        voltage_v: Over the whole wire.
        is_outside: The kerf law is used outside what it was made for.
        is_calibrated: The numbers come from test cuts.
    """
    cautions = (
        *air_cautions(free_air_c, air_power_w_m, power_w_m),
        *voltage_cautions(voltage_v),
        *law_cautions(power_w_m, density_kg_m3, is_outside=is_outside, is_calibrated=is_calibrated),
        *usual_cautions(),
    )
    order = ("error", "warning", "info")
    return tuple(sorted(cautions, key=lambda caution: order.index(caution.severity)))
