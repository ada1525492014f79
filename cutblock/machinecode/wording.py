"""The comments of a program: what the person at the machine reads before the start and at each pause.

Only letters, digits, blank, underscore, full stop and hyphen stand in a comment: a bracket in a name would end the
comment and turn the rest of the name into motion, and some controllers act on comments that begin with a word of
theirs and a comma (RS274/NGC as controllers extend it).
"""

import re

from cutblock.base.tolerances import PLAN_MM
from cutblock.base.units import mm_per_minute
from cutblock.machinecode.clamping import Clamping, cut_subject
from cutblock.machinecode.placing import Place
from cutblock.machinecode.rules import BELOW_MM, LONGEST_LINE, planned_mm_min
from cutblock.records.block import Cut
from cutblock.records.plan import Plan
from cutblock.records.shop import Machine
from cutblock.records.words import CutKind

_UNSAFE = re.compile(r"[^A-Za-z0-9 _.-]")

CAUTIONS = (
    "CAUTION hot wire. Keep hands off. Keep guards closed and wear eye protection. A wire that breaks whips.",
    "CAUTION fumes. Extract the air at the wire. Cut polystyrene foam only. Keep a fire extinguisher at hand.",
    "CAUTION never leave a hot wire standing in foam. Heater off first when you stop.",
    "CAUTION the feed override stays at 100 per cent or below.",
    "CAUTION local rules for electrical and fire safety come before this program.",
)


def comment(text: str) -> str:
    """Return `text` as a comment line; what a comment may not hold becomes a hyphen, what is too long is left off."""
    return f"({_UNSAFE.sub('-', text)[: LONGEST_LINE - 2]})"


def header_comments(plan: Plan, clamping: Clamping, place: Place) -> tuple[str, ...]:
    """Return the comment lines at the head of a program."""
    job, machine, block = plan.job, plan.machine, clamping.block
    part = clamping.part
    total_w = job.power_w_m * machine.span_mm / 1000.0
    n_setups = len({cut.setup for cut in block.cuts})
    lying = "turned a quarter. Block y along the travel. Block x against the wire from near to far"
    texts = (
        f"Program of cutblock for machine {machine.name}",
        f"Job {job.id} {job.title}",
        f"Revision {job.revision}",
        f"Block {block.id} set-up {clamping.number} of {n_setups}",
        *_standing(clamping),
        f"Part {part.length_mm:.1f} mm along travel {part.width_mm:.1f} mm along wire {part.height_mm:.1f} mm up",
        f"Part lies {lying if clamping.is_turned else 'as in the block. Block x along the travel'}",
        f"Clamp the near face {_setback(place)} the near edge of the table. Start at {place.start_mm:.1f} mm of travel",
        f"The part lies {_stand(place, machine)}sacrificial slats. The wire goes {BELOW_MM:.0f} mm below it",
        f"Foam {block.grade} {block.density_kg_m3 or plan.conditions.density_kg_m3:.1f} kg per m3",
        f"Wire {plan.wire.name} diameter {plan.wire.diameter_mm:.2f} mm",
        f"Power {job.power_w_m:.1f} W per m of wire. {total_w:.1f} W between the towers",
        f"Planned speed {planned_mm_min(plan):.1f} mm per min at mid-wire",
        _limits(plan),
        "Before the start home the machine and park the wire at the zero of the towers clear of the part",
        "Look that the wire clears the table and the clamps over its whole way",
        *CAUTIONS,
    )
    return tuple(comment(text) for text in texts)


def _limits(plan: Plan) -> str:
    """Return the speed limits and how far they can be trusted."""
    conditions = plan.conditions
    low, high = mm_per_minute(conditions.low_mm_s), mm_per_minute(conditions.high_mm_s)
    trust = "not calibrated and true within 50 per cent only"
    if conditions.calibration is not None:
        trust = f"calibrated by {conditions.calibration.name} of {conditions.calibration.date}"
    return f"Speed limits {low:.1f} to {high:.1f} mm per min {trust}"


def _standing(clamping: Clamping) -> tuple[str, ...]:
    """Return how a block is stood before its first set-up, where that is not as it was bought."""
    block = clamping.block
    if block.bought_mm is None or clamping.number != 1:
        return ()
    return (f"First stand the block on its {block.length_mm:.0f} x {block.width_mm:.0f} mm face",)


def _setback(place: Place) -> str:
    return f"{place.setback_mm:.1f} mm behind" if place.setback_mm else "on"


def _stand(place: Place, machine: Machine) -> str:
    stand_mm = place.bottom_mm - machine.table_height_mm
    return f"on a stand of scrap foam {stand_mm:.1f} mm high on the " if stand_mm else "on "


def cut_comment(clamping: Clamping, cut: Cut) -> str:
    """Return the comment line before a cut."""
    block = clamping.block
    if cut.kind is CutKind.SWEEP:
        return comment(f"Cut {cut.order} of {len(block.cuts)} sweep {cut.sweep}")
    slab = f"{cut.axis} from {cut.at_mm:.2f} to {cut.at_mm + block.kerf_mm:.2f} mm of the block"
    return comment(f"Cut {cut.order} of {len(block.cuts)} {cut.kind.value} {slab}")


def pause_comment(clamping: Clamping, cut: Cut) -> str | None:
    """Return what the person does at the pause after a cut, or None where there is no pause.

    What is taken away depends on which side of the slot the later cuts of the clamping need.
    """
    low, high = _needed_sides(clamping, cut)
    if cut.kind is CutKind.SWEEP:
        return (
            comment(f"Pause. Take away both halves of {cut_subject(clamping.block, cut)}. Then go on")
            if high or low
            else None
        )
    if cut.axis == "z":
        return _horizontal_pause(clamping, is_low_needed=low, is_high_needed=high)
    if low and high:
        doing = "Hold both parts where they are"
    elif high:
        doing = "Take away the freed part on the start side"
    elif low:
        doing = "Take away the freed part on the end side"
    else:
        doing = "Draw the two parts apart"
    return comment(
        f"Pause. Heater off and wire at the foot of the slot. {doing}. Then go on and the cold wire is lifted"
    )


def _horizontal_pause(clamping: Clamping, *, is_low_needed: bool, is_high_needed: bool) -> str | None:
    if is_high_needed:
        kerf = f"{clamping.block.kerf_mm:.2f} mm"
        return comment(f"Pause. Put shims of {kerf} in the slot so that the upper part keeps its height. Then go on")
    if is_low_needed:
        return comment("Pause. Take off the freed upper part. Then go on")
    return None


def _needed_sides(clamping: Clamping, cut: Cut) -> tuple[bool, bool]:
    """Return whether a later cut of the clamping needs what lies below or before the slot, and above or behind it."""
    later = clamping.cuts[clamping.cuts.index(cut) + 1 :]
    if cut.kind is CutKind.SWEEP:
        return bool(later), bool(later)
    index = "xyz".index(cut.axis)
    end = cut.at_mm + clamping.block.kerf_mm
    low = any(other.part_at_mm[index] < cut.at_mm - PLAN_MM for other in later)
    high = any(other.part_at_mm[index] + other.part_size_mm[index] > end + PLAN_MM for other in later)
    return low, high
