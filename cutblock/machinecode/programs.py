"""Writes one program for every clamping of every block, and hands out none that does not read back as planned."""

import math
from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import CutblockError
from cutblock.base.progress import Progress, silent
from cutblock.machinecode.check import check_program
from cutblock.machinecode.clamping import Clamping, clampings
from cutblock.machinecode.expected import AIR, expected_steps
from cutblock.machinecode.limits import check_machine, check_part, check_pass
from cutblock.machinecode.passes import Pass, Sources, choose_place, clamping_passes, plan_sources
from cutblock.machinecode.placing import Place
from cutblock.machinecode.rules import CLEARANCE_MM, STANDING_MM, heater_words, mode_lines, opening, program_name
from cutblock.machinecode.wording import cut_comment, header_comments, pause_comment
from cutblock.records.block import Block
from cutblock.records.plan import Finding, Plan
from cutblock.records.record import Record
from cutblock.records.shop import Machine
from cutblock.records.words import Severity
from cutblock.wire.reachability import rest_to_rest


@dataclass(frozen=True, slots=True, kw_only=True)
class Program(Record):
    """The text of one program: one clamping of one part."""

    name: str  # of its file
    text: str
    block: str
    setup: int


def write_programs(plan: Plan, progress: Progress = silent, *, leave_out: bool = False) -> tuple[Program, ...]:
    """Return the programs of every block, set-up after set-up, each read back and compared with the plan.

    Args:
        plan: With its sweeps timed and its blocks packed.
        progress: Told after every program.
        leave_out: Leave out the set-ups this machine cannot cut instead of raising; `find_uncuttable` names them.

    Raises:
        NotCuttable: The machine cannot reach a position, run an axis so fast or hold a part; the message names it.
        GeometryError: The cuts of the plan do not belong together.
        InputError: The machine's own words or table allow no safe program.
        CheckFailed: A program does not read back as planned; a fault of this program.
    """
    check_machine(plan.machine)
    sources = plan_sources(plan)
    programs = []
    for index, block in enumerate(plan.blocks):
        for clamping in clampings(block):
            if leave_out and _trouble(plan, clamping, sources) is not None:
                continue
            program = _write(plan, clamping, sources)
            check_program(plan, program.name, program.text)
            programs.append(program)
            progress(index / len(plan.blocks), f"Wrote {program.name}")
    progress(1.0, "Wrote the machine code")
    return tuple(programs)


def program_names(plan: Plan) -> tuple[str, ...]:
    """Return the names of the programs of every set-up this machine can cut, in the order of `write_programs`."""
    sources = plan_sources(plan)
    return tuple(
        program_name(block.id, clamping.number)
        for block in plan.blocks
        for clamping in clampings(block)
        if _trouble(plan, clamping, sources) is None
    )


def find_uncuttable(plan: Plan) -> tuple[Finding, ...]:
    """Return an error for each set-up that this machine cannot cut as planned; none where `write_programs` succeeds."""
    try:
        check_machine(plan.machine)
    except CutblockError as error:
        return (_finding(plan.machine.name, error),)
    sources = plan_sources(plan)
    return tuple(
        _finding(block.id, error) for block in plan.blocks for error in block_troubles(plan, block, sources).values()
    )


def air_seconds(plan: Plan) -> dict[tuple[str, int], float]:
    """Return the time of all moves in air of every set-up this machine can cut, s, by block and set-up.

    Args:
        plan: With its sweeps timed and its blocks packed.
    """
    sources = plan_sources(plan)
    found = {}
    for block in plan.blocks:
        troubles = block_troubles(plan, block, sources)
        for clamping in clampings(block) if 0 not in troubles else ():
            if clamping.number not in troubles:
                place = choose_place(plan, clamping, sources)
                steps, _ = expected_steps(plan, block, clamping, place)
                found[block.id, clamping.number] = sum(step.seconds for step in steps if step.subject == AIR)
    return found


def block_troubles(plan: Plan, block: Block, sources: Sources) -> dict[int, CutblockError]:
    """Return why the machine cannot cut them, for each set-up of a block that it cannot; 0 stands for all of them.

    Args:
        plan: Its job, machine and cutting conditions.
        block: Of the plan, or one of its own with its cuts in other set-ups.
        sources: From `plan_sources`.
    """
    try:
        setups = clampings(block)
    except CutblockError as error:
        return {0: error}
    troubles = {clamping.number: _trouble(plan, clamping, sources) for clamping in setups}
    return {number: error for number, error in troubles.items() if error is not None}


def _trouble(plan: Plan, clamping: Clamping, sources: Sources) -> CutblockError | None:
    """Return why the machine cannot cut a set-up, or None where it can."""
    try:
        _checked_passes(plan, clamping, sources)
    except CutblockError as error:
        return error
    return None


def _finding(subject: str, error: CutblockError) -> Finding:
    return Finding(
        severity=Severity.ERROR,
        code="machine-cannot-cut",
        subject=error.subject or subject,
        text=f"{error.message}. {error.remedy}".strip(),
    )


def _checked_passes(plan: Plan, clamping: Clamping, sources: Sources) -> tuple[Place, tuple[Pass, ...]]:
    place = choose_place(plan, clamping, sources)
    check_part(clamping, place, plan.machine)
    passes = clamping_passes(plan, clamping, place, sources)
    for wire_pass in passes:
        check_pass(wire_pass, plan.machine)
    return place, passes


def _write(plan: Plan, clamping: Clamping, sources: Sources) -> Program:
    machine = plan.machine
    place, passes = _checked_passes(plan, clamping, sources)
    lift_mm = place.bottom_mm + clamping.part.height_mm + CLEARANCE_MM
    text = _Text(machine)
    text.add(*opening(plan), *header_comments(plan, clamping, place), *mode_lines(plan))
    text.lift_from_anywhere(lift_mm)
    for wire_pass in passes:
        _write_cut(plan, clamping, wire_pass, text, lift_mm)
    text.air_to(np.array([0.0, lift_mm, 0.0, lift_mm]))
    text.add(*machine.footer)
    name = program_name(clamping.block.id, clamping.number)
    return Program(name=name, text=text.joined(), block=clamping.block.id, setup=clamping.number)


def _write_cut(plan: Plan, clamping: Clamping, wire_pass: Pass, text: "_Text", lift_mm: float) -> None:
    machine = plan.machine
    start, end = wire_pass.positions[0], wire_pass.positions[-1]
    text.add(cut_comment(clamping, wire_pass.cut))
    text.air_to(_lifted(start, lift_mm))
    text.air_to(start)
    text.add(heater_words(plan))
    text.cut_along(wire_pass.positions[1:], wire_pass.seconds)
    text.add(machine.heater_off)
    pause = pause_comment(clamping, wire_pass.cut)
    pause_lines = () if pause is None else (pause, "M0")
    if wire_pass.ends_in_slot:
        text.add(*pause_lines)
        text.air_to(_lifted(end, lift_mm))
    else:
        text.air_to(_lifted(end, lift_mm))
        text.add(*pause_lines)


def _lifted(position: Floats, lift_mm: float) -> Floats:
    lifted = position.copy()
    lifted[1::2] = lift_mm
    return lifted


class _Text:
    """The lines of a program under way, and where the wire is after them."""

    def __init__(self, machine: Machine) -> None:
        self._lines: list[str] = []
        self._machine = machine
        self._position = np.zeros(4)
        axes = " ".join(f"{axis}{{:.{machine.decimals}f}}" for axis in machine.axes)
        self._move = f"G1 {axes} F{{}}"

    def add(self, *lines: str) -> None:
        """Add lines as they are."""
        self._lines += lines

    def lift_from_anywhere(self, lift_mm: float) -> None:
        """Add the first move: straight up at both towers, wherever they stand."""
        _, near, _, far = self._machine.axes
        decimals = self._machine.decimals
        self._lines.append(f"G0 {near}{lift_mm:.{decimals}f} {far}{lift_mm:.{decimals}f}")
        self._position[1::2] = lift_mm

    def air_to(self, position: Floats) -> None:
        """Add a move in air from rest to rest: timed, so that the two towers arrive together on any controller."""
        travel = np.abs(position - self._position)
        longest_mm = max(math.hypot(travel[0], travel[1]), math.hypot(travel[2], travel[3]))
        if longest_mm < STANDING_MM:
            return
        speed_mm_s = min(self._machine.air_speed_mm_s, self._machine.speed_mm_s)
        seconds = rest_to_rest([longest_mm], speed_mm_s, self._machine.acceleration_mm_s2)
        self.cut_along(position[None, :], seconds)

    def cut_along(self, positions: Floats, seconds: Floats) -> None:
        """Add one timed move to each position."""
        # Adding 0.0 turns a rounded -0.0 into 0.0, which no controller could read otherwise.
        rows = (np.round(positions, self._machine.decimals) + 0.0).tolist()
        feeds = (60.0 / seconds).tolist()
        move = self._move.format
        self._lines += [move(*row, feed_word(feed)) for row, feed in zip(rows, feeds, strict=True)]
        self._position = positions[-1].copy()

    def joined(self) -> str:
        """Return the whole text."""
        return "\n".join(self._lines) + "\n"


def feed_word(feed: float) -> str:
    """Return an inverse-time feed, 1/min, as plain decimals with at least seven significant digits."""
    decimals = max(3, 6 - math.floor(math.log10(feed)))
    return f"{feed:.{decimals}f}"
