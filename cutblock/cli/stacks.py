"""`cutblock stacks`."""

import argparse
import json
from pathlib import Path

from cutblock.base.errors import InputError
from cutblock.base.units import hours, length_text, litres, mm_per
from cutblock.cli.plan import job_path
from cutblock.cli.progress import terminal_progress
from cutblock.records.job import Job
from cutblock.records.stack import Stack, StackOffer
from cutblock.records.words import Duty

_HEAD = ("stack", "shells", "billet", "foam now", "stacked", "saved", "", "cutting now", "then")
_LOST = {Duty.COUNTER_MOULD: "counter-mould", Duty.CRADLE: "cradle", Duty.FILLER: "filler"}


def run_stacks(chosen: argparse.Namespace) -> int:
    """Look for stacks and print what they save and what is given up for it, or JSON; write a table if asked.

    Returns:
        0; where no stack saves foam that is told, with what came nearest.
    """
    from cutblock.flow.jobfile import read_job
    from cutblock.flow.stacks import offer_stacks

    job = read_job(job_path(chosen.job))
    shell = None if chosen.shell is None else chosen.shell * mm_per(job.units)
    offer = offer_stacks(job, shell, is_even=chosen.even, progress=terminal_progress())
    if chosen.out is not None:
        _write(Path(chosen.out), offer, job.units)
    if chosen.json:
        print(json.dumps(_values(offer), indent=1))
        return 0
    _print_offer(offer, job)
    if chosen.out is not None:
        print(f"  Table: {Path(chosen.out) / 'stacks.csv'}")
    return 0


def _write(folder: Path, offer: StackOffer, unit: str) -> None:
    from cutblock.flow.folder import replace_file
    from cutblock.reports.stacks import stacks_csv

    try:
        folder.mkdir(exist_ok=True)
    except OSError as error:
        reason = error.strerror or type(error).__name__
        raise InputError(f"cannot be made ({reason}).", str(folder), "Choose another folder with --out.") from error
    replace_file(folder / "stacks.csv", stacks_csv(offer, unit).encode())


def _values(offer: StackOffer) -> dict[str, object]:
    nearest = offer.nearest
    return {
        "shell_mm": _rounded(offer.shell_mm),
        "is_even": offer.is_even,
        "panels": offer.n_panels,
        "panels_stacked": offer.n_stacked,
        "foam_now_l": _litres(offer.foam_now_mm3),
        "foam_l": _litres(offer.foam_now_mm3 - offer.saved_mm3),
        "saved_l": _litres(offer.saved_mm3),
        "saved_percent": _share(offer.saved_mm3, offer.foam_now_mm3),
        "blocks_now": offer.n_blocks_now,
        "blocks": None if offer.refusal else offer.n_blocks,
        "price_now": offer.price_now,
        "price": offer.price,
        "refusal": offer.refusal,
        "lost": {str(duty): count for duty, count in offer.lost},
        "left_out": [{"why": why, "sweeps": count} for why, count in offer.left_out],
        "stacks": [_stack_values(stack) for stack in offer.stacks],
        "nearest": None
        if nearest is None
        else {
            "sweeps": list(nearest.sweeps),
            "foam_now_l": _litres(nearest.foam_now_mm3),
            "foam_l": _litres(nearest.foam_mm3),
            "fits": nearest.fits,
        },
    }


def _stack_values(stack: Stack) -> dict[str, object]:
    return {
        "stack": stack.id,
        "length_mm": _rounded(stack.length_mm),
        "width_mm": _rounded(stack.width_mm),
        "height_mm": _rounded(stack.height_mm),
        "foam_now_l": _litres(stack.foam_now_mm3),
        "foam_l": _litres(stack.foam_mm3),
        "saved_l": _litres(stack.saved_mm3),
        "saved_percent": _share(stack.saved_mm3, stack.foam_now_mm3),
        "shells_l": _litres(stack.shells_mm3),
        "kerf_l": _litres(stack.kerf_mm3),
        "rest_l": _litres(stack.rest_mm3),
        "rounding_l": _litres(stack.rounding_mm3),
        "cutting_now_h": _rounded(hours(stack.seconds_now)),
        "cutting_h": _rounded(hours(stack.seconds)),
        "from_below": [
            {
                "sweep": member.sweep,
                "panel": member.panel,
                "is_turned": member.is_turned,
                "level_mm": _rounded(member.level_mm),
                "spacing_mm": _rounded(member.spacing_mm),
                "least_mm": _rounded(member.least_mm),
                "volume_l": _litres(member.volume_mm3),
            }
            for member in stack.members
        ],
    }


def _rounded(value: float) -> float:
    return round(value, 6) + 0.0


def _litres(volume_mm3: float) -> float:
    return _rounded(litres(volume_mm3))


def _share(part: float, whole: float) -> float:
    return _rounded(100.0 * part / whole) if whole else 0.0


def _print_offer(offer: StackOffer, job: Job) -> None:
    shell = length_text(offer.shell_mm, job.units)
    print(f"{job.id}  {job.title}: shells {shell} thick, nested in depth. An offer; the plan stays as it is.")
    if not offer.stacks:
        print(f"  {_none_text(offer, shell)}")
        _print_left_out(offer)
        return
    rows = [_HEAD, *(_row(stack, job.units) for stack in offer.stacks)]
    widths = [max(len(row[column]) for row in rows) for column in range(len(_HEAD))]
    for row, stack in zip(rows, (None, *offer.stacks), strict=True):
        print("  " + "  ".join(text.rjust(width) for text, width in zip(row, widths, strict=True)).rstrip())
        if stack is not None:
            print(f"      from below: {_members_text(stack, job.units)}")
    print(f"  {_job_text(offer)}")
    _print_given_up(offer, job)
    _print_left_out(offer)


def _row(stack: Stack, unit: str) -> tuple[str, ...]:
    length, width = (length_text(value, unit).split(" ")[0] for value in (stack.length_mm, stack.width_mm))
    return (
        stack.id,
        str(len(stack.members)),
        f"{length} x {width} x {length_text(stack.height_mm, unit)}",
        f"{litres(stack.foam_now_mm3):.1f} L",
        f"{litres(stack.foam_mm3):.1f} L",
        f"{litres(stack.saved_mm3):.1f} L",
        f"{_share(stack.saved_mm3, stack.foam_now_mm3):.1f} %",
        f"{hours(stack.seconds_now):.2f} h",
        f"{hours(stack.seconds):.2f} h",
    )


def _members_text(stack: Stack, unit: str) -> str:
    """Return the members with the spacing of each over what is below it."""
    return ", ".join(
        f"{member.sweep}{' turned' if member.is_turned else ''} +{length_text(member.spacing_mm, unit, 1)}"
        for member in stack.members
    )


def _job_text(offer: StackOffer) -> str:
    now, saved = litres(offer.foam_now_mm3), litres(offer.saved_mm3)
    seconds_now = sum(stack.seconds_now for stack in offer.stacks)
    seconds = sum(stack.seconds for stack in offer.stacks)
    text = (
        f"{offer.n_stacked} of {offer.n_panels} panels in stacks. Billets of the whole job: {now:.1f} L now, "
        f"{now - saved:.1f} L with stacks, {saved:.1f} L ({_share(saved, now):.1f} %) less. "
    )
    if offer.refusal:
        text += f"The blocks do not do with the stacks: {offer.refusal} "
    else:
        text += f"Blocks: {offer.n_blocks_now} now, {offer.n_blocks} with stacks{_price_text(offer)}"
        text += ". " if offer.n_blocks < offer.n_blocks_now else ", so no less foam is bought. "
    return text + (
        f"Cutting the stacked panels takes {hours(seconds_now):.2f} h now and {hours(seconds):.2f} h stacked; "
        "through cuts and set-ups are in neither."
    )


def _price_text(offer: StackOffer) -> str:
    if offer.price_now is None or offer.price is None:
        return ""
    return f", at {offer.price_now:.2f} and {offer.price:.2f}"


def _print_given_up(offer: StackOffer, job: Job) -> None:
    shell = length_text(offer.shell_mm, job.units)
    n_shells = sum(len(stack.members) for stack in offer.stacks)
    n_backs = 0 if offer.is_even else len(offer.stacks)
    rest, rounding, kerf = (
        litres(sum(getattr(stack, f"{name}_mm3") for stack in offer.stacks)) for name in ("rest", "rounding", "kerf")
    )
    backs = f"; the lowest of each stack, {n_backs} in all, keeps a flat back" if n_backs else ""
    print("  What is given up for it:")
    print(
        f"    {n_shells - n_backs} moulds become shells at least {shell} thick along the normal, without a flat back"
        f"{backs}. A shell does not stand or carry concrete and people by itself: leave what supports it to a "
        "licensed engineer and the local codes."
    )
    lost = " and ".join(f"{count} {_LOST[duty]}{'s' if count > 1 else ''}" for duty, count in offer.lost)
    if offer.shell_mm < job.wall_mm:
        print(f"    The job keeps a wall of {length_text(job.wall_mm, job.units)}; part of the saving is thinner foam.")
    print(f"    {f'{lost} cut now would be missing.' if lost else 'No half that has a duty now.'}")
    print(
        f"    Scrap in the stacks: {rest:.1f} L over and under the shells, {rounding:.1f} L for rounding footprints up "
        f"to one rectangle; kerf {kerf:.1f} L."
    )
    print("    Cut from the top down, or shim every slot: what lies over a cut sinks by the kerf.")


def _print_left_out(offer: StackOffer) -> None:
    for why, count in offer.left_out:
        print(f"  Left out, {why}: {count} sweep{'s' if count > 1 else ''}.")


def _none_text(offer: StackOffer, shell: str) -> str:
    nearest = offer.nearest
    if nearest is None and offer.n_free < 2:
        return f"No stack: {offer.n_free} of {offer.n_sweeps} sweeps may be stacked at all."
    if nearest is None:
        return (
            "No stack: no two billets are alike. Their footprints must be equal to 2 % in area and their wire lie "
            "along the same axis of the panel."
        )
    numbers = f"{litres(nearest.foam_mm3):.1f} L stacked, {litres(nearest.foam_now_mm3):.1f} L as they are cut now"
    names = " and ".join(nearest.sweeps) if len(nearest.sweeps) == 2 else f"{len(nearest.sweeps)} sweeps"
    if not nearest.fits:
        return (
            f"No stack: two shells {shell} thick are too high for the blocks or the machine's lift; the nearest, "
            f"{names}: {numbers}. Try thinner shells, or a higher block."
        )
    if nearest.foam_mm3 >= nearest.foam_now_mm3:
        return f"No stack saves foam; the nearest, {names}: {numbers}. Thinner shells may, or panels more alike."
    return (
        f"No stack saves foam: {names} would ({numbers}), but they share their cuts with panels that cannot be "
        "stacked, which would have to be cut anyway."
    )
