"""Two sweeps whose panels one sweep might serve, and what tries it."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.base.progress import Progress
from cutblock.records.job import Job
from cutblock.records.record import Record
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Sweep


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Couple(Record):
    """A sweep whose upper half, turned over, nearly moulds the panel of another one.

    Points of the upper half, measured from the middle of the lower sweep's billet, lie at `point @ turn` from the
    middle of the other's: a half turn about x, y or a diagonal, its own inverse.
    """

    lower: Sweep
    upper: Sweep
    turn: Floats  # (3, 3)

    def __post_init__(self) -> None:
        object.__setattr__(self, "turn", frozen_floats(self.turn, (3, 3), "turn"))


def shared_tolerance_mm(job: Job, conditions: Conditions) -> float:
    """Return how far the finished faces of a sweep fitted to two panels may be off at the planned speed.

    A fiftieth of the kerf is kept: where a tower's axis is at its limit the wire goes slower than planned, and wider.
    """
    return job.tolerance_mm - 0.02 * conditions.kerf_mm


# One sweep for each couple, serving the lower one's panel with its lower half; None where no wire comes close enough
# to both.
SharedFit = Callable[[Sequence[Couple], Progress], tuple[Sweep | None, ...]]
