"""Stacks as a table (RFC 4180)."""

import csv
import io

from cutblock.base.units import hours, litres, mm_per
from cutblock.records.stack import StackOffer


def stacks_csv(offer: StackOffer, unit: str) -> str:
    """Return a row for every shell, stack by stack from below; lengths in the unit people read.

    The figures of a stack stand in the row of its lowest shell, so that a column sums to the job.
    """
    text = io.StringIO()
    table = csv.writer(text, lineterminator="\n")
    table.writerow(
        (
            "stack", "from_below", "sweep", "panel", "turned", f"level_{unit}", f"spacing_{unit}", f"least_{unit}",
            "shell_litres", f"length_{unit}", f"width_{unit}", f"height_{unit}", "foam_now_litres", "foam_litres",
            "kerf_litres", "rest_litres", "rounding_litres", "cutting_now_hours", "cutting_hours",
        )
    )  # fmt: skip
    scale = mm_per(unit)
    for stack in offer.stacks:
        lengths = (stack.length_mm, stack.width_mm, stack.height_mm)
        volumes = (stack.foam_now_mm3, stack.foam_mm3, stack.kerf_mm3, stack.rest_mm3, stack.rounding_mm3)
        whole = (
            *(f"{value / scale:.6g}" for value in lengths),
            *(f"{litres(value):.6f}" for value in volumes),
            *(f"{hours(value):.4f}" for value in (stack.seconds_now, stack.seconds)),
        )
        for number, member in enumerate(stack.members, 1):
            places = (member.level_mm, member.spacing_mm, member.least_mm)
            table.writerow(
                (
                    stack.id,
                    number,
                    member.sweep,
                    member.panel,
                    "yes" if member.is_turned else "",
                    *(f"{value / scale:.6g}" for value in places),
                    f"{litres(member.volume_mm3):.6f}",
                    *(whole if number == 1 else ("",) * len(whole)),
                )
            )
    return text.getvalue()
