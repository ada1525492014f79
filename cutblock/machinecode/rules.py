"""The distances and names every program keeps; the writer and the reader both hold to them.

The order of one program, without which a hot wire would stand in foam or a tower would run into a part:

1. The wire goes straight up, wherever it stands, until it is clear of the part.
2. For each cut: over the part to where the cut starts, down in front of it (for a cut down a vertical plane: to just
   above it), heater on, the cut without a stop, heater off, up until clear.
3. A cut down a vertical plane ends below the part, so the program pauses with the heater off before the cold wire is
   lifted through the slot it has cut. Every other cut ends in the air behind the part, the wire is lifted first, and
   the program pauses only where more follows in the same clamping.
4. Over the part to the towers' zero, and the machine's own end words.

The first `CLEARANCE_MM` of a cut lie in air and are run at the cutting speed: time for the wire to come up to heat
(a 0.4 mm wire in air needs a few seconds; common practice, no source).
"""

from cutblock.base.units import mm_per_minute
from cutblock.records.block import Block
from cutblock.records.plan import Plan

CLEARANCE_MM = 20.0  # between the wire and foam it must not touch
BELOW_MM = 5.0  # how far below the part a vertical cut ends, in the sacrificial slats the part lies on
LEAST_TABLE_HEIGHT_MM = 10.0  # of the slats' top above the towers' zero, so that the wire can go below the part
LONGEST_LINE = 255  # characters; controllers refuse 256
STANDING_MM = 1e-9  # a move shorter than this is none


def program_name(block_id: str, setup: int) -> str:
    """Return the file name of the program of one set-up."""
    return f"{block_id}-S{setup:02d}.ngc"


def heater_words(plan: Plan) -> str:
    """Return the machine's words that heat the wire between the towers with the job's power per metre."""
    total_w = plan.job.power_w_m * plan.machine.span_mm / 1000.0
    return plan.machine.heater_on.format(power=f"{total_w:.1f}")


def planned_mm_min(plan: Plan) -> float:
    """Return the planned speed as people set it at the machine."""
    return mm_per_minute(plan.conditions.planned_mm_s)


def opening(plan: Plan) -> tuple[str, ...]:
    """Return the lines that stand before the header comment; a controller that wants `%` wants it first."""
    return ("%",) if plan.machine.header[:1] == ("%",) else ()


def mode_lines(plan: Plan) -> tuple[str, ...]:
    """Return the machine's own words and inverse-time feed, the one feed whose times no controller reads otherwise."""
    return (*plan.machine.header[len(opening(plan)) :], "G93")


def find_block(plan: Plan, name: str) -> tuple[Block, int] | None:
    """Return the block and the set-up a program is for, or None where the plan has none of that name."""
    for block in plan.blocks:
        if name.startswith(block.id):
            for setup in sorted({cut.setup for cut in block.cuts}):
                if program_name(block.id, setup) == name:
                    return block, setup
    return None
