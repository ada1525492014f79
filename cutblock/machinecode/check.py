"""Reads a program back and holds every line of it against the plan."""

import itertools

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import CheckFailed, CutblockError
from cutblock.machinecode.clamping import clampings
from cutblock.machinecode.expected import AIR, Boxes, Step, expected_steps
from cutblock.machinecode.passes import choose_place, plan_sources
from cutblock.machinecode.reader import Line, read_program
from cutblock.machinecode.rules import find_block, heater_words
from cutblock.records.plan import Plan
from cutblock.records.shop import Machine

_TIME_RELATIVE = 1e-5
_POSITION_MM = 1e-9  # beside half of the last digit
_SPEED_RELATIVE = 1e-3  # rounded positions over short times
_REMEDY = "Do not run this file; write the programs anew."


def check_program(plan: Plan, name: str, text: str) -> None:
    """Prove that a program does what the plan says, no more and no less.

    Args:
        plan: With its sweeps timed and its blocks packed.
        name: The program's file name.
        text: The whole text of the file.

    Raises:
        CheckFailed: Naming file and line, what the line says and what the plan says.
    """
    found = find_block(plan, name)
    if found is None:
        raise CheckFailed("the plan has no set-up of this name", name, "Remove the file or plan the job anew.")
    block, setup = found
    try:
        clamping = next(clamping for clamping in clampings(block) if clamping.number == setup)
        place = choose_place(plan, clamping, plan_sources(plan))
    except CutblockError as error:
        raise CheckFailed(f"the plan cannot be cut: {error}", name, "Plan the job anew.") from error
    steps, boxes = expected_steps(plan, block, clamping, place)
    lines = _read_lines(plan, name, text, steps)
    for line, step in zip(lines, steps, strict=False):
        _check_line(line, step, plan.machine, name)
    if len(lines) != len(steps):
        shorter = min(len(lines), len(steps))
        says = f'says "{lines[shorter].text}"' if len(lines) > shorter else "ends"
        wants = f'wants "{_describe(steps[shorter])}"' if len(steps) > shorter else "has ended"
        raise _failure(name, shorter + 1, f"the file {says} where the plan {wants}")
    moves = [(line, step) for line, step in zip(lines, steps, strict=True) if line.motion == "1"]
    _check_limits(moves, plan.machine, name)
    _check_accelerations(moves, plan.machine, name)
    _check_cold_moves(lines, steps, boxes, plan, name)


def _read_lines(plan: Plan, name: str, text: str, steps: tuple[Step, ...]) -> tuple[Line, ...]:
    """Return the lines as read; where they cannot be read, an earlier line that is no move and differs is named."""
    try:
        return read_program(text, name, plan.machine.axes)
    except CheckFailed:
        for number, (row, step) in enumerate(zip(text.split("\n"), steps, strict=False), start=1):
            if row.startswith(("G0 ", "G1 ")) or step.position:
                break
            if row != step.text:
                raise _failure(name, number, f'the file says "{row}", the plan "{step.text}"') from None
        raise


def _failure(name: str, number: int, message: str) -> CheckFailed:
    return CheckFailed(message, f"{name}:{number}", _REMEDY)


def _describe(step: Step) -> str:
    if step.text:
        return step.text
    position = " ".join(f"{value:.4f}" for value in step.position)
    return f"{step.subject}: to {position}" + (f" in {step.seconds:.6g} s" if step.seconds else "")


def _check_line(line: Line, step: Step, machine: Machine, name: str) -> None:
    if not step.position:
        if line.text != step.text:
            raise _failure(name, line.number, f'the file says "{line.text}", the plan "{step.text}"')
        return
    is_rapid = step.seconds == 0.0
    axes = machine.axes[1::2] if is_rapid else machine.axes
    if line.motion != ("0" if is_rapid else "1") or line.letters != axes:
        raise _failure(name, line.number, f'the file says "{line.text}", the plan "{_describe(step)}"')
    allowed = 0.5 * 10.0**-machine.decimals + _POSITION_MM
    for axis, value, wanted, decimals in zip(axes, line.values, step.position, line.decimals, strict=True):
        # Written so that a value that is not a number fails too.
        if not abs(value - wanted) <= allowed or decimals != machine.decimals:
            raise _failure(
                name,
                line.number,
                f'"{line.text}" has {axis} at {value:.{decimals}f} mm, the plan at {wanted:.6f} mm ({step.subject})',
            )
    if not is_rapid:
        _check_time(line, step, name)


def _check_time(line: Line, step: Step, name: str) -> None:
    seconds = 60.0 / line.feed
    wanted = 60.0 / step.seconds
    last_digit = 10.0**-line.feed_decimals
    is_rounded = abs(line.feed - wanted) <= 0.5 * last_digit * (1.0 + 1e-6)
    if not is_rounded or not abs(seconds - step.seconds) <= _TIME_RELATIVE * step.seconds:
        raise _failure(
            name,
            line.number,
            f'"{line.text}" takes {seconds:.7g} s, in the plan {step.seconds:.7g} s ({step.subject})',
        )


def _check_limits(moves: list[tuple[Line, Step]], machine: Machine, name: str) -> None:
    """Hold the positions and speeds as read against the machine, whatever the plan says."""
    positions = np.array([line.values for line, _ in moves])
    seconds = 60.0 / np.array([line.feed for line, _ in moves])
    reach = np.array([machine.travel_mm, machine.lift_mm] * 2)
    digit = 10.0**-machine.decimals
    outside = ((positions < -digit) | (positions > reach + digit)).any(axis=1)
    lengths = np.sqrt(machine.span_mm**2 + np.sum((positions[:, 2:] - positions[:, :2]) ** 2, axis=1))
    speeds = np.abs(np.diff(positions, axis=0)).max(axis=1, initial=0.0) / seconds[1:]
    fastest = machine.speed_mm_s * (1.0 + _SPEED_RELATIVE) + 2.0 * digit / seconds[1:]
    for bad, trouble in (
        (outside, "leaves the reach of the machine"),
        (lengths > machine.longest_wire_mm + digit, "stretches the wire beyond its springs"),
        (np.r_[False, speeds > fastest], "drives an axis faster than it can run"),
    ):
        if bad.any():
            line = moves[int(np.argmax(bad))][0]
            raise _failure(name, line.number, f'"{line.text}" {trouble}')


def _check_accelerations(moves: list[tuple[Line, Step]], machine: Machine, name: str) -> None:
    """Hold the changes of speed within every sweep against the machine, each spread over half of both steps."""
    positions = np.array([line.values for line, _ in moves])
    seconds = 60.0 / np.array([line.feed for line, _ in moves])
    cuts = [-1 if step.subject == AIR else step.cut_index for _, step in moves]
    # Of three positions in a row the two steps between belong to one sweep where the last two moves do.
    is_joint = np.array([one == other >= 0 for one, other in itertools.pairwise(cuts[1:])], dtype=np.bool_)
    speeds = np.diff(positions, axis=0) / seconds[1:, None]
    changes = np.abs(np.diff(speeds, axis=0)).max(axis=1, initial=0.0)
    digit = 10.0**-machine.decimals
    shortest = np.minimum(seconds[1:-1], seconds[2:])
    most = machine.acceleration_mm_s2 * 0.5 * (seconds[1:-1] + seconds[2:]) * (1.0 + _SPEED_RELATIVE)
    bad = is_joint & (changes > most + 2.0 * digit / shortest)
    if bad.any():
        line = moves[int(np.argmax(bad)) + 2][0]
        raise _failure(name, line.number, f'"{line.text}" changes the speed of an axis faster than it can')


def _check_cold_moves(lines: tuple[Line, ...], steps: tuple[Step, ...], boxes: Boxes, plan: Plan, name: str) -> None:
    """Prove that a cold wire goes through no foam but straight up the slot it has just cut, after a pause."""
    heater_on, heater_off = heater_words(plan), plan.machine.heater_off
    is_hot = has_paused = False
    position: Floats | None = None  # unknown until the first full position
    for line, step in zip(lines, steps, strict=True):
        if line.motion == "1":
            target = np.array(line.values)
            if (
                not is_hot
                and position is not None
                and not (step.is_lift and has_paused and _is_straight_up(position, target))
            ):
                remaining = Boxes(boxes.low[step.cut_index :], boxes.high[step.cut_index :])
                if not _is_clear(np.stack([position, target]), remaining, plan.machine):
                    raise _failure(name, line.number, f'"{line.text}" leads a cold wire through foam')
            position, has_paused = target, False
        elif line.text == heater_on:
            is_hot = True
        elif line.text == heater_off:
            is_hot = False
        elif line.text == "M0":
            if is_hot:
                raise _failure(name, line.number, "the program pauses with a hot wire")
            has_paused = True
    if is_hot:
        raise _failure(name, len(lines), "the program ends with a hot wire")


def _is_straight_up(start: Floats, end: Floats) -> bool:
    return bool((start[::2] == end[::2]).all() and (start[1::2] <= end[1::2]).all())


def _is_clear(ends: Floats, boxes: Boxes, machine: Machine) -> bool:
    """Return whether a move surely keeps off the boxes: before, behind or above each with all four ends of the wire.

    What the wire sweeps in a straight move is inside the hull of its four ends at the faces of the box, so that one
    plane with all four on its far side proves it.

    Args:
        ends: (2, 4) positions of the towers before and after the move.
        boxes: What stands on the machine.
        machine: Of the shop.
    """
    shares = (np.stack([boxes.low[:, 1], boxes.high[:, 1]]) + machine.near_gap_mm) / machine.span_mm  # (2, n)
    near, far = ends[:, None, None, :2], ends[:, None, None, 2:]
    points = near + shares[None, :, :, None] * (far - near)  # (2 ends of the move, 2 faces, n boxes, travel and up)
    before = (points[..., 0] < boxes.low[:, 0]).all(axis=(0, 1))
    behind = (points[..., 0] > boxes.high[:, 0]).all(axis=(0, 1))
    above = (points[..., 1] > boxes.high[:, 2]).all(axis=(0, 1))
    return bool((before | behind | above).all())
