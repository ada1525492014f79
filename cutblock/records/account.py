"""What a plan costs in foam, time and money."""

from dataclasses import dataclass

from cutblock.records.record import Record


@dataclass(frozen=True, slots=True, kw_only=True)
class Ledger(Record):
    """The volume account of a block or a job, mm3; every part sums to `bought_mm3`."""

    bought_mm3: float
    trim_mm3: float
    kerf_mm3: float
    mould_mm3: float
    counter_mould_mm3: float
    cradle_mm3: float
    filler_mm3: float
    surplus_mm3: float
    offcut_mm3: float
    scrap_mm3: float
    n_blocks: int
    n_blocks_bound: int  # no packing can need fewer

    @property
    def used_mm3(self) -> float:
        """Every half with a duty other than surplus."""
        return self.mould_mm3 + self.counter_mould_mm3 + self.cradle_mm3 + self.filler_mm3

    @property
    def waste_mm3(self) -> float:
        """Skin trim, kerf, surplus and scrap."""
        return self.trim_mm3 + self.kerf_mm3 + self.surplus_mm3 + self.scrap_mm3

    @property
    def used_percent(self) -> float:
        """Used foam of the foam bought."""
        return 100.0 * self.used_mm3 / self.bought_mm3 if self.bought_mm3 else 0.0

    @property
    def waste_percent(self) -> float:
        """Wasted foam of the foam bought."""
        return 100.0 * self.waste_mm3 / self.bought_mm3 if self.bought_mm3 else 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Hours(Record):
    """Machine time of the job, s."""

    cutting_s: float
    setup_s: float
    by_block_s: tuple[tuple[str, float], ...]  # (block id, s)

    @property
    def total_s(self) -> float:
        """Cutting and set-ups together."""
        return self.cutting_s + self.setup_s


@dataclass(frozen=True, slots=True, kw_only=True)
class Cost(Record):
    """Money; None where no price was given."""

    currency: str
    foam: float | None
    machine: float | None
    foam_bound: float | None = None  # no packing can cost less

    @property
    def total(self) -> float | None:
        """The sum of what is known; None where nothing is."""
        known = [part for part in (self.foam, self.machine) if part is not None]
        return sum(known) if known else None
