"""Offers stacks: the job planned as far as its speeds, and what nesting similar shells in depth would save.

The plan itself stays as it is. Every shell is cut by its panel's own sweep, as it is before panels share cuts; foam is
counted in whole billets on both sides, and in blocks by packing both.
"""

import math
from collections import Counter
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import CheckFailed, InputError, StockError
from cutblock.base.progress import Progress, part_of, silent
from cutblock.base.units import length_text
from cutblock.pairing.stacks import Attempt, Nest, Rails, StackRule, group_stacks
from cutblock.records.block import Block
from cutblock.records.duties import DutyLock
from cutblock.records.job import Job
from cutblock.records.piece import Piece
from cutblock.records.plan import Plan, Settings
from cutblock.records.stack import Stack, StackMember, StackOffer, StackTry
from cutblock.records.sweep import Sweep
from cutblock.records.words import Duty, Half

LEAST_SHELL_MM = 20.0  # thinner ones break in handling; common practice, no source
_THICKNESS_MM = 1e-3  # a measured thickness under the wanted one by more is an error of ours

_Half = tuple[str, int]  # a panel and its strip


def offer_stacks(
    job: Job,
    shell_mm: float | None = None,
    *,
    is_even: bool = False,
    settings: Settings | None = None,
    progress: Progress = silent,
) -> StackOffer:
    """Return the stacks that save foam in a job, with what they cost and save.

    The lowest shell keeps a flat back, so that k shells take k sweeps; else it is cut off below as well, with k + 1.

    Args:
        job: From `read_job`.
        shell_mm: Least thickness of a shell along the normal; None: the job's wall.
        is_even: Whether the lowest shell is cut off below too.
        settings: Seed and effort of the packing search, for both packings.
        progress: Called several times a second; may raise `Cancelled`.

    Raises:
        InputError: Shells so thin would break, or so thick that no block holds two.
        CutblockError: No plan can be made as the job stands.
    """
    from cutblock.flow import steps
    from cutblock.flow.chain import start_plan

    shell = job.wall_mm if shell_mm is None else shell_mm
    _refuse_thin(job, shell)
    plan = start_plan(job, settings or Settings())
    for step, start, end in ((steps.take_form, 0.0, 0.08), (steps.divide, 0.08, 0.2), (steps.fit, 0.2, 0.6)):
        plan = step(plan, part_of(progress, start, end))
    own = steps.set_speeds(plan, part_of(progress, 0.6, 0.64))
    now = steps.set_speeds(steps.pair(plan, part_of(progress, 0.64, 0.7)), part_of(progress, 0.7, 0.74))
    rule = _rule(own, shell, is_even)
    reasons = _reasons(own)
    units = _units(own.sweeps, now.sweeps)
    foam, seconds = _present(now, units, len(own.sweeps))
    is_free = np.array([not reason for reason in reasons]) & (foam > 0.0)
    nests, nearest = group_stacks(own.sweeps, list(units.values()), foam, is_free, rule, part_of(progress, 0.74, 0.84))
    taken = {number for nest in nests for number in nest.members}
    gone = {sweep for sweep, unit in units.items() if taken.issuperset(unit)}
    lost = Counter(piece.duty for piece in now.pieces if piece.half is Half.UPPER and piece.sweep in gone)
    stacks = []
    for number, nest in enumerate(nests):
        report = part_of(progress, 0.84 + 0.06 * number / len(nests), 0.84 + 0.06 * (number + 1) / len(nests))
        stacks.append(_stack(own, nest, rule, f"{job.id}-S{number + 1:02d}", foam, seconds, report))
    offer = StackOffer(
        shell_mm=shell,
        is_even=is_even,
        stacks=tuple(stacks),
        n_sweeps=len(own.sweeps),
        n_panels=len({sweep.serving[0].panel for sweep in own.sweeps}),
        n_stacked=_n_stacked(own.sweeps, taken),
        foam_now_mm3=sum(sweep.length_mm * sweep.width_mm * sweep.height_mm for sweep in now.sweeps),
        n_blocks_now=0,
        n_blocks=0,
        price_now=None,
        price=None,
        lost=tuple((duty, lost[duty]) for duty in (Duty.COUNTER_MOULD, Duty.CRADLE, Duty.FILLER) if lost[duty]),
        left_out=tuple(Counter(reason for reason in reasons if reason).items()),
        nearest=_try(own.sweeps, nearest),
    )
    return _packed(offer, now, own, nests, gone, part_of(progress, 0.9, 1.0))


def _refuse_thin(job: Job, shell_mm: float) -> None:
    if not shell_mm >= LEAST_SHELL_MM:
        raise InputError(
            f"a shell of {length_text(shell_mm, job.units)} would break in handling; "
            f"at least {length_text(LEAST_SHELL_MM, job.units)} are wanted",
            "--shell",
            "Ask for thicker shells.",
        )


def _rule(own: Plan, shell_mm: float, is_even: bool) -> StackRule:
    """Return what stacks must keep; raises InputError where no block holds two shells."""
    from cutblock.packing.kinds import kinds_of_stock

    job = own.job
    sizes = np.array([(sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in own.sweeps]).reshape(-1, 3)
    kinds = [kind for kind in kinds_of_stock(job, own.machine, sizes).kinds if not kind.spec.is_offcut]
    rooms = []
    for kind in kinds:
        length, width, height = (side - 2.0 * kind.spec.skin_mm for side in kind.size_mm)
        rooms.append((length, width, height))
    rule = StackRule(
        shell_mm=shell_mm,
        kerf_mm=max(max(sweep.kerf_mm) for sweep in own.sweeps),
        is_even=is_even,
        rooms_mm=tuple(rooms),
        machine=own.machine,
    )
    highest = max((height for _, _, height in rooms), default=math.inf)
    if 2.0 * shell_mm + rule.kerf_mm > highest:
        raise InputError(
            f"two shells of {length_text(shell_mm, job.units)} one above the other do not fit into a block: without "
            f"its skin the highest has {length_text(highest, job.units)}",
            "--shell",
            "Ask for thinner shells, or give a higher block in the job.",
        )
    return rule


def _reasons(own: Plan) -> list[str]:
    """Return why each sweep of the plan is not to be stacked; empty where it may be."""
    job = own.job
    faces = {panel.id: panel.face for panel in own.panels}
    closed = {face.name for face in job.faces if face.is_closed}
    held = {panel for lock in job.locks if not isinstance(lock, DutyLock) for panel in lock.panels}
    pieces = [lock.piece for lock in job.locks if isinstance(lock, DutyLock)]
    pinned = {sweep for pin in job.pins for sweep in pin.sweeps}
    reasons = []
    for sweep in own.sweeps:
        panel = sweep.serving[0].panel
        if faces[panel] in closed:
            reasons.append("cast closed, so the half above each cut is needed")
        elif panel in held or any(piece.startswith(f"{sweep.id}-") for piece in pieces):
            reasons.append("set by hand in the job")
        elif sweep.id in pinned:
            reasons.append("pinned to a block")
        else:
            reasons.append("")
    return reasons


def _units(own: Sequence[Sweep], now: Sequence[Sweep]) -> dict[str, tuple[int, ...]]:
    """Return for each sweep that is cut now the numbers of the own sweeps it stands for."""
    numbers: dict[_Half, int] = {
        (sweep.serving[0].panel, sweep.serving[0].strip): number for number, sweep in enumerate(own)
    }
    units = {}
    for sweep in now:
        unit = tuple(numbers[serving.panel, serving.strip] for serving in sweep.serving if serving.is_mould)
        if unit:  # else a counter-mould's own, which stays
            units[sweep.id] = tuple(sorted(set(unit)))
    return units


def _present(now: Plan, units: dict[str, tuple[int, ...]], n_own: int) -> tuple[Floats, Floats]:
    """Return the foam (mm3) and the cutting time (s) that each own sweep's panel takes now, half of what it shares."""
    foam, seconds = np.zeros(n_own), np.zeros(n_own)
    sweeps = {sweep.id: sweep for sweep in now.sweeps}
    times = {timing.sweep: timing.seconds for timing in now.timings}
    for name, unit in units.items():
        sweep = sweeps[name]
        for number in unit:
            foam[number] = sweep.length_mm * sweep.width_mm * sweep.height_mm / len(unit)
            seconds[number] = times[name] / len(unit)
    return foam, seconds


def _n_stacked(own: Sequence[Sweep], taken: set[int]) -> int:
    loose = {sweep.serving[0].panel for number, sweep in enumerate(own) if number not in taken}
    return len({sweep.serving[0].panel for sweep in own} - loose)


def _try(own: Sequence[Sweep], nearest: Attempt | None) -> StackTry | None:
    if nearest is None:
        return None
    return StackTry(
        sweeps=tuple(own[number].id for number in nearest.members),
        foam_now_mm3=nearest.now_mm3,
        foam_mm3=nearest.stacked_mm3,
        fits=nearest.fits,
    )


def _stack(
    own: Plan, nest: Nest, rule: StackRule, name: str, foam: Floats, seconds: Floats, progress: Progress
) -> Stack:
    """Return the record of one stack, its shells measured.

    Raises:
        CheckFailed: A shell is thinner than wanted, or the wire leaves the billet: an error of ours.
    """
    from cutblock.geometry.nest_volumes import nest_volumes

    sweeps = [own.sweeps[number] for number in nest.members]
    turns = zip(sweeps, nest.is_turned, strict=True)
    kerfs = [(sweep.kerf_mm[1], sweep.kerf_mm[0]) if is_turned else sweep.kerf_mm for sweep, is_turned in turns]
    rails = list(nest.rails)
    cut = list(sweeps)
    if rule.is_even:
        rails.insert(0, (rails[0][0] - [0.0, nest.base_mm], rails[0][1] - [0.0, nest.base_mm]))
        kerfs.insert(0, kerfs[0])
        cut.append(sweeps[0])
    leasts = _proved_leasts(nest, rails, kerfs, rule, name, progress)
    insides = [(sweep.length_mm, sweep.width_mm) for sweep in sweeps]
    volumes = nest_volumes(rails, kerfs, nest.size_mm, insides, has_back=not rule.is_even)
    rises = [nest.base_mm, *np.diff(nest.levels_mm).tolist()]
    times = {timing.sweep: timing.seconds for timing in own.timings}
    length, width, height = nest.size_mm
    return Stack(
        id=name,
        members=tuple(
            StackMember(
                sweep=sweep.id,
                panel=sweep.serving[0].panel,
                is_turned=nest.is_turned[place],
                level_mm=nest.levels_mm[place],
                spacing_mm=rises[place],
                least_mm=leasts[place],
                volume_mm3=volumes.shells_mm3[place],
            )
            for place, sweep in enumerate(sweeps)
        ),
        length_mm=length,
        width_mm=width,
        height_mm=height,
        foam_now_mm3=math.fsum(foam[list(nest.members)]),
        kerf_mm3=volumes.kerf_mm3,
        rest_mm3=volumes.rest_mm3,
        rounding_mm3=volumes.rounding_mm3,
        seconds_now=math.fsum(seconds[list(nest.members)]),
        seconds=math.fsum(times[sweep.id] for sweep in cut),
    )


def _proved_leasts(
    nest: Nest,
    rails: Sequence[Rails],
    kerfs_mm: Sequence[tuple[float, float]],
    rule: StackRule,
    name: str,
    progress: Progress,
) -> list[float]:
    """Return how thick every shell is where it is thinnest, from below, looked for point by point.

    Args:
        nest: The stack.
        rails: Of every cut, from below.
        kerfs_mm: Of every cut, at its ends.
        rule: What was asked for.
        name: Of the stack.
        progress: Told shell by shell.

    Raises:
        CheckFailed: A shell is too thin, or the wire leaves the billet.
    """
    from cutblock.geometry.apart import least_distance
    from cutblock.geometry.rails import sheet_range

    length, width, height = nest.size_mm
    halves = [max(kerf) / 2.0 for kerf in kerfs_mm]
    low = sheet_range(*rails[0], width, length)[0] - halves[0]
    high = sheet_range(*rails[-1], width, length)[1] + halves[-1]
    if low < 0.0 or high > height:
        raise CheckFailed(f"the wire would leave the billet: {low:.3f} to {high:.3f} of {height:.3f} mm", name)
    leasts = [] if rule.is_even else [low]
    for place in range(1, len(rails)):
        progress(place / len(rails), "Measuring shells")
        apart = least_distance(rails[place - 1], rails[place], length, width)
        leasts.append(apart - halves[place - 1] - halves[place])
    if min(leasts) < rule.shell_mm - _THICKNESS_MM:
        raise CheckFailed(f"a shell is {min(leasts):.3f} mm thick, not {rule.shell_mm:.3f} mm", name)
    return leasts


def _packed(
    offer: StackOffer, now: Plan, own: Plan, nests: Sequence[Nest], gone: set[str], progress: Progress
) -> StackOffer:
    """Return the offer with the blocks of the job as it is and with the stacks, each packed as one billet."""
    from cutblock.packing.blocks import pack_sweeps

    job, conditions, settings = replace(now.job, takes_up_slack=False), now.conditions, now.settings
    before = pack_sweeps(job, now.sweeps, now.pieces, conditions, settings, part_of(progress, 0.0, 0.5))
    offer = replace(offer, n_blocks_now=len(before.blocks), price_now=_price(before.blocks))
    if not nests:
        return replace(offer, n_blocks=offer.n_blocks_now, price=offer.price_now)
    billets = [
        replace(own.sweeps[nest.members[0]], id=stack.id, length_mm=length, width_mm=width, height_mm=height)
        for stack, nest in zip(offer.stacks, nests, strict=True)
        for length, width, height in (nest.size_mm,)
    ]
    sweeps = (*(sweep for sweep in now.sweeps if sweep.id not in gone), *billets)
    pieces = (*(piece for piece in now.pieces if piece.sweep not in gone), *_pieces(billets))
    job = replace(job, no_turn=_unturned(job, sweeps, offer.stacks, own.sweeps))
    try:
        after = pack_sweeps(job, sweeps, pieces, conditions, settings, part_of(progress, 0.5, 1.0))
    except StockError as error:
        return replace(offer, refusal=str(error))
    return replace(offer, n_blocks=len(after.blocks), price=_price(after.blocks))


def _unturned(job: Job, sweeps: Sequence[Sweep], stacks: Sequence[Stack], own: Sequence[Sweep]) -> tuple[str, ...]:
    """Return the sweeps and stacks whose billets keep their length along the block: a stack if a member does."""
    from cutblock.packing.asked import locked

    rest = [sweep for sweep in sweeps if sweep.id not in {stack.id for stack in stacks}]
    is_locked = locked(job, (*rest, *own)).tolist()
    held = {sweep.id for sweep, is_held in zip(own, is_locked[len(rest) :], strict=True) if is_held}
    return (
        *(sweep.id for sweep, is_held in zip(rest, is_locked, strict=False) if is_held),
        *(stack.id for stack in stacks if any(member.sweep in held for member in stack.members)),
    )


def _pieces(billets: Sequence[Sweep]) -> list[Piece]:
    """Return stand-ins for the halves of stacks, which packing wants by name."""
    return [
        Piece(id=f"{billet.id}-{half}", partner="", sweep=billet.id, half=half, duty=Duty.SURPLUS, code="")
        for billet in billets
        for half in Half
    ]


def _price(blocks: Sequence[Block]) -> float | None:
    prices = [0.0 if block.price is None and block.from_offcut else block.price for block in blocks]
    known = [price for price in prices if price is not None]
    return math.fsum(known) if len(known) == len(prices) else None
