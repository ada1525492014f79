"""The usual cautions about a hot wire in polystyrene foam, with how much each matters here."""

from typing import NamedTuple

from cutblock.wire.kerf import DENSITY_RANGE_KG_M3, POWER_RANGE_W_M, UNCALIBRATED_SPREAD

HOT_IN_AIR_C = 400.0  # vapours of polystyrene catch fire from 350 to 490 degC
IGNITION_C = 450.0
GLOWING_C = 550.0
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


def law_cautions(power_w_m: float, density_kg_m3: float, *, is_outside: bool) -> tuple[Caution, ...]:
    """Return what to say of how sure the numbers are."""
    percent = 100.0 * UNCALIBRATED_SPREAD
    cautions = [
        Caution("info", f"Uncalibrated: kerf and speeds are good to +-{percent:.0f} %. Cut test coupons first.")
    ]
    if is_outside:
        text = (
            f"{power_w_m:g} W/m in {density_kg_m3:g} kg/m3 with this wire and kerf lies outside what the kerf law"
            f" was made for ({DENSITY_RANGE_KG_M3[0]:g} to {DENSITY_RANGE_KG_M3[1]:g} kg/m3, {POWER_RANGE_W_M[0]:g} to"
            f" {POWER_RANGE_W_M[1]:g} W/m, wires of 0.2 to 0.8 mm, kerfs up to 4 mm): take the numbers as a guess."
        )
        cautions.append(Caution("warning", text))
    return tuple(cautions)


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
) -> tuple[Caution, ...]:
    """Return every caution for a wire at work, the gravest first.

    Args:
        power_w_m: Cutting power per metre of wire.
        density_kg_m3: Of the foam.
        free_air_c: Temperature of the wire in still air at that power.
        air_power_w_m: Power that keeps it cool enough in air.
        voltage_v: Over the whole wire.
        is_outside: The kerf law is used outside what it was made for.
    """
    cautions = (
        *air_cautions(free_air_c, air_power_w_m, power_w_m),
        *voltage_cautions(voltage_v),
        *law_cautions(power_w_m, density_kg_m3, is_outside=is_outside),
        *usual_cautions(),
    )
    order = ("error", "warning", "info")
    return tuple(sorted(cautions, key=lambda caution: order.index(caution.severity)))
