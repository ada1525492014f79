"""The wire's ends at the towers for every cut of a set-up.

A straight wire through a point at the near and one at the far face of the billet meets a tower's plane where the line
through the two points, affinely extended, does.
"""

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError, NotCuttable
from cutblock.base.tolerances import PLAN_MM, POSITION_MM
from cutblock.machinecode.clamping import ClampedBox, Clamping, cut_subject, lowest_mm
from cutblock.machinecode.placing import Place, middle_setback_mm, moved_into_reach, plain_place
from cutblock.machinecode.rules import BELOW_MM, CLEARANCE_MM
from cutblock.records.block import Cut, PlacedBillet
from cutblock.records.plan import Plan
from cutblock.records.shop import Machine
from cutblock.records.sweep import Sweep, SweepTiming
from cutblock.records.words import CutKind


class Pass(NamedTuple):
    """One cut at the towers; columns near horizontal, near vertical, far horizontal, far vertical, mm."""

    cut: Cut
    subject: str  # for messages
    positions: Floats  # (n, 4), the first in air before the foam
    seconds: Floats  # (n - 1,)
    ends_in_slot: bool


class Sources(NamedTuple):
    """What the passes of a plan are made from, by id."""

    sweeps: Mapping[str, Sweep]
    timings: Mapping[str, SweepTiming]
    billets: Mapping[str, PlacedBillet]


def plan_sources(plan: Plan) -> Sources:
    """Return the sweeps, timings and placed billets of a plan by sweep id."""
    return Sources(
        {sweep.id: sweep for sweep in plan.sweeps},
        {timing.sweep: timing for timing in plan.timings},
        {billet.sweep: billet for block in plan.blocks for billet in block.billets},
    )


def tower_positions(near: Floats, far: Floats, box: ClampedBox, place: Place, machine: Machine) -> Floats:
    """Return where rails at the two faces of a clamped box have the wire's ends at the towers.

    Args:
        near: Travel and height at the near face of the box, from its start and bottom, (n, 2), mm.
        far: The same at the far face, (n, 2), mm.
        box: In the clamped frame.
        place: Where the clamped part stands.
        machine: Of the shop.

    Returns:
        (n, 4) near horizontal, near vertical, far horizontal, far vertical in machine coordinates, mm.
    """
    origin = np.array([place.start_mm + box.travel_mm, place.bottom_mm + box.up_mm])
    slope = (far - near) / box.width_mm
    from_near_mm = machine.near_gap_mm + place.setback_mm + box.wire_mm
    at_near = near - slope * from_near_mm
    at_far = near + slope * (machine.span_mm - from_near_mm)
    return np.concatenate([origin + at_near, origin + at_far], axis=1)


def choose_place(plan: Plan, clamping: Clamping, sources: Sources) -> Place:
    """Return where the part of a set-up is clamped: plainly, unless a sweep of it can be reached elsewhere only.

    Raises:
        GeometryError: The plan lacks a sweep, its timing or its place, or they do not belong together.
        NotCuttable: A sweep does not begin and end in air.
    """
    machine, part = plan.machine, clamping.part
    plain = plain_place(machine)
    sweeps = [cut for cut in clamping.cuts if cut.kind is CutKind.SWEEP]
    for setback_mm in (0.0, middle_setback_mm(machine, part.width_mm)) if sweeps else ():
        here = plain._replace(setback_mm=setback_mm)
        rails = [sweep_pass(plan, clamping, cut, here, sources).positions for cut in sweeps]
        place = moved_into_reach(np.concatenate(rails), setback_mm, part[3:], machine)
        if place is not None:
            return place
    return plain


def clamping_passes(plan: Plan, clamping: Clamping, place: Place, sources: Sources) -> tuple[Pass, ...]:
    """Return the passes of a set-up in order; raises like `sweep_pass`."""
    return tuple(
        sweep_pass(plan, clamping, cut, place, sources)
        if cut.kind is CutKind.SWEEP
        else plane_pass(plan, clamping, cut, place)
        for cut in clamping.cuts
    )


def plane_pass(plan: Plan, clamping: Clamping, cut: Cut, place: Place) -> Pass:
    """Return a trim or through cut at the planned speed, the wire level and square to the travel."""
    box = clamping.box(cut.part_at_mm, cut.part_size_mm)
    middle = clamping.plane_mm(cut)
    if cut.axis == "z":
        ends = [(box.travel_mm - CLEARANCE_MM, middle), (box.travel_mm + box.length_mm + CLEARANCE_MM, middle)]
    else:
        lowest = lowest_mm(clamping, cut)
        top = box.up_mm + box.height_mm + CLEARANCE_MM
        ends = [(middle, top), (middle, -BELOW_MM if lowest is None else lowest)]
    rail = np.array(ends) + np.array([place.start_mm, place.bottom_mm])
    length_mm = float(np.abs(rail[1] - rail[0]).sum())
    seconds = np.array([length_mm / plan.conditions.planned_mm_s])
    subject = cut_subject(clamping.block, cut)
    return Pass(cut, subject, np.concatenate([rail, rail], axis=1), seconds, ends_in_slot=cut.axis != "z")


def sweep_pass(plan: Plan, clamping: Clamping, cut: Cut, place: Place, sources: Sources) -> Pass:
    """Return a sweep with the times of its timing.

    Raises:
        GeometryError: The plan lacks the sweep, its timing or its place, or they do not belong together.
        NotCuttable: The sweep does not begin and end in air.
    """
    name = cut_subject(clamping.block, cut)
    if name not in sources.sweeps or name not in sources.timings or name not in sources.billets:
        raise GeometryError("the plan has no sweep, no timing or no billet of this name", name, "Make the plan anew.")
    sweep, timing, billet = sources.sweeps[name], sources.timings[name], sources.billets[name]
    box = clamping.box(cut.part_at_mm, cut.part_size_mm)
    if billet.turned != clamping.is_turned:
        lying = "turned" if billet.turned else "not turned"
        raise GeometryError(
            f"the billet lies {lying} in {clamping.block.id} but set-up {clamping.number} clamps it the other way",
            name,
            "Clamp a billet so that its length lies along the travel.",
        )
    wanted = (sweep.length_mm, sweep.width_mm, sweep.height_mm)
    if not np.allclose(box[3:], wanted, rtol=0.0, atol=POSITION_MM + PLAN_MM):
        raise GeometryError(
            f"the part clamped is {box[3]:.2f} x {box[4]:.2f} x {box[5]:.2f} mm, "
            f"the billet {wanted[0]:.2f} x {wanted[1]:.2f} x {wanted[2]:.2f} mm",
            name,
            "Cut the billet to size before its sweep.",
        )
    seconds = timing.step_seconds
    if len(seconds) != len(sweep.near) - 1 or not (seconds > 0.0).all():
        raise GeometryError(
            f"has {len(sweep.near)} rulings and {len(seconds)} times, which must be one fewer and above 0",
            name,
            "Work out the speeds anew.",
        )
    first, last = max(sweep.near[0, 0], sweep.far[0, 0]), min(sweep.near[-1, 0], sweep.far[-1, 0])
    half_kerf_mm = 0.5 * max(sweep.kerf_mm)
    if first > -half_kerf_mm or last < sweep.length_mm + half_kerf_mm:
        raise NotCuttable(
            f"its wire begins at {first:.2f} mm and ends at {last:.2f} mm along a billet of {sweep.length_mm:.2f} mm, "
            "so it would be heated or lifted in foam",
            name,
            "Begin and end at least half a kerf outside the billet at both ends of the wire.",
        )
    # The packing may have rounded the box up; the billet's near face lies on that of the box.
    billet_box = box._replace(width_mm=sweep.width_mm)
    positions = tower_positions(sweep.near, sweep.far, billet_box, place, plan.machine)
    return Pass(cut, name, positions, seconds, ends_in_slot=False)
