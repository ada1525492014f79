"""The wire's way through each sweep of a plan, for whoever shows it."""

from typing import NamedTuple

from cutblock.machinecode.backplot import WireMoment, WireTrack, track_wire, wire_at
from cutblock.records.plan import Plan
from cutblock.records.sweep import Sweep
from cutblock.records.words import CutKind

__all__ = ["SweepPlace", "WireMoment", "WireTrack", "sweep_places", "sweep_track", "wire_at"]


class SweepPlace(NamedTuple):
    """Where a sweep is cut."""

    block: str
    setup: int
    sweep: str


def sweep_places(plan: Plan) -> tuple[SweepPlace, ...]:
    """Return every sweep of the blocks in the order they are cut."""
    return tuple(
        SweepPlace(block.id, cut.setup, cut.sweep)
        for block in plan.blocks
        for cut in sorted(block.cuts, key=lambda cut: cut.order)
        if cut.kind is CutKind.SWEEP and cut.sweep is not None
    )


def sweep_track(plan: Plan, sweep_id: str) -> tuple[Sweep, WireTrack] | None:
    """Return a sweep and the wire's track through it; None where the plan has no such sweep or no times for it.

    Raises:
        GeometryError: Its times do not fit its rulings.
    """
    sweep = next((sweep for sweep in plan.sweeps if sweep.id == sweep_id), None)
    timing = next((timing for timing in plan.timings if timing.sweep == sweep_id), None)
    if sweep is None or timing is None:
        return None
    return sweep, track_wire(sweep, timing, plan.conditions)
