"""Grids of panels that were tried for one face."""

from dataclasses import dataclass

from cutblock.records.record import Record


@dataclass(frozen=True, slots=True, kw_only=True)
class GridCandidate(Record):
    """One way to lay the grid of panels over a face, divided and fitted as a plan would."""

    angle_deg: float | None  # counter-clockwise from the face's x; None: evenly over the face, as without an angle
    phase_mm: tuple[float, float]  # how far the grid is shifted along its own two directions
    cell_mm: tuple[float, float]
    n_panels: int
    n_sweeps: int  # of the panels that can be cut; one a panel where none needs strips
    n_uncut: int  # panels that no sweep within the tolerance makes
    worst_mm: float  # largest deviation of a finished face, of the panels that can be cut
    skew_mm: float  # largest of any sweep
    n_paired: int | None = None  # panels that share a cut; None: not looked at
    billet_litres: float | None = None  # of all billets, after pairing
    reason: str = ""  # why panels of this grid pair up

    @property
    def n_strips(self) -> int:
        """Sweeps over the one that each panel needs anyway."""
        return self.n_sweeps - (self.n_panels - self.n_uncut)


@dataclass(frozen=True, slots=True, kw_only=True)
class GridSearch(Record):
    """What a search found, the best first; the grid of the job is among the candidates."""

    face: str
    candidates: tuple[GridCandidate, ...]
    present: GridCandidate  # of the job as it is
    n_angles: int  # angles tried
    n_trials: int  # trial panels fitted on the way
