"""What the machine can reach and how fast, held against every pass before a line is written."""

import numpy as np

from cutblock.base.errors import InputError, NotCuttable
from cutblock.base.tolerances import PLAN_MM
from cutblock.machinecode.clamping import Clamping
from cutblock.machinecode.passes import Pass
from cutblock.machinecode.placing import Place
from cutblock.machinecode.rules import CLEARANCE_MM, LEAST_TABLE_HEIGHT_MM
from cutblock.records.shop import Machine

AXIS_NAMES = ("near horizontal", "near vertical", "far horizontal", "far vertical")
_SPEED_RELATIVE = 1e-6  # a schedule that runs an axis at its very limit is within it


def check_machine(machine: Machine) -> None:
    """Refuse a machine whose words or table no safe program can be written for.

    Raises:
        InputError: The table lies too low, four axes are not named, a needed word is missing or a move stands in it.
    """
    subject = f"machine {machine.name}"
    if machine.table_height_mm < LEAST_TABLE_HEIGHT_MM:
        raise InputError(
            f"table_height_mm is {machine.table_height_mm:g} and must be at least {LEAST_TABLE_HEIGHT_MM:g}: "
            "the wire goes below the part",
            subject,
            "Lay the parts on slats and give the height of their top.",
        )
    if machine.table_offset_mm < CLEARANCE_MM:
        raise InputError(
            f"table_offset_mm is {machine.table_offset_mm:g} and must be at least {CLEARANCE_MM:g}: "
            "the wire goes down before the part",
            subject,
            "Clamp the parts further along the travel.",
        )
    if len(set(machine.axes)) != 4 or not set(machine.axes) <= set("ABCUVWXYZ"):
        raise InputError(f"axes {machine.axes} are not four letters of A B C U V W X Y Z", subject, "Name each axis.")
    words = set(" ".join(machine.header).split())
    missing = [word for word in ("G21", "G90", "G61") if word not in words]
    if missing or words & {"G0", "G1", "G00", "G01"}:
        raise InputError(
            f"header must have G21, G90 and G61 and no move; {' '.join(missing) or 'a move'} is the trouble",
            subject,
            "Write millimetres, absolute positions and exact path into the header.",
        )
    if not machine.footer or machine.footer[-1] not in {"M2", "M02", "M30", "%"}:
        raise InputError("footer must end with M2, M30 or %", subject, "Write the end word of the controller.")


def check_part(clamping: Clamping, place: Place, machine: Machine) -> None:
    """Refuse a part that does not fit between the towers or under the lifted wire.

    Raises:
        NotCuttable: Naming the part, the limit and both values.
    """
    part = clamping.part
    subject = f"{clamping.block.id} set-up {clamping.number}"
    if machine.near_gap_mm + part.width_mm > machine.span_mm + PLAN_MM:
        raise NotCuttable(
            f"the part is {part.width_mm:.1f} mm along the wire; with the near gap of {machine.near_gap_mm:.1f} mm "
            f"that is more than the {machine.span_mm:.1f} mm between the towers",
            subject,
            "Cut the block across its length first, turn it the other way, or use a wider machine.",
        )
    top_mm = place.bottom_mm + part.height_mm + CLEARANCE_MM
    if top_mm > machine.lift_mm + PLAN_MM:
        raise NotCuttable(
            f"clear of the part the wire is at {top_mm:.1f} mm; the near and far vertical axes reach "
            f"{machine.lift_mm:.1f} mm",
            subject,
            "Use a lower block or a machine with more lift.",
        )


def check_pass(wire_pass: Pass, machine: Machine) -> None:
    """Refuse a pass that leaves the machine's reach, overstretches the wire or drives an axis too fast.

    Raises:
        NotCuttable: Naming the piece, the ruling, the axis, the limit and the value.
    """
    positions, subject = wire_pass.positions, wire_pass.subject
    reach = np.array([machine.travel_mm, machine.lift_mm] * 2)
    outside = np.maximum(-positions, positions - reach)
    ruling, axis = divmod(int(np.argmax(outside)), 4)
    if outside[ruling, axis] > PLAN_MM:
        raise NotCuttable(
            f"at ruling {ruling + 1} the {AXIS_NAMES[axis]} axis {machine.axes[axis]} would be at "
            f"{positions[ruling, axis]:.2f} mm; it reaches 0 to {reach[axis]:.1f} mm",
            subject,
            "Move the table, use a smaller billet or a flatter sweep, or a machine that reaches further.",
        )
    lengths = np.hypot(machine.span_mm, np.hypot(*(positions[:, 2:] - positions[:, :2]).T))
    ruling = int(np.argmax(lengths))
    if lengths[ruling] > machine.longest_wire_mm + PLAN_MM:
        raise NotCuttable(
            f"at ruling {ruling + 1} the wire between the towers would be {lengths[ruling]:.1f} mm long; "
            f"its springs allow {machine.longest_wire_mm:.1f} mm",
            subject,
            "Use a sweep with less skew and slope, or springs with more travel.",
        )
    speeds = np.abs(np.diff(positions, axis=0)) / wire_pass.seconds[:, None]
    ruling, axis = divmod(int(np.argmax(speeds)), 4)
    if speeds[ruling, axis] > machine.speed_mm_s * (1.0 + _SPEED_RELATIVE):
        raise NotCuttable(
            f"after ruling {ruling + 1} the {AXIS_NAMES[axis]} axis {machine.axes[axis]} would run at "
            f"{speeds[ruling, axis]:.2f} mm/s; it can run {machine.speed_mm_s:.2f} mm/s",
            subject,
            "Plan the sweep slower, or with less twist.",
        )
