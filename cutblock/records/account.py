"""What a plan costs in foam, time and money."""

import math
from dataclasses import dataclass

from cutblock.records.record import Record

_MM3_PER_ML = 1000.0
LEDGER_PARTS = (
    "trim", "kerf", "mould", "counter_mould", "cradle", "filler", "surplus", "thickened", "offcut", "scrap",
)  # fmt: skip


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
    thickened_mm3: float = 0.0  # backs of halves thicker than needed, which took up slack

    @property
    def used_mm3(self) -> float:
        """Every half with a duty other than surplus."""
        return self.mould_mm3 + self.counter_mould_mm3 + self.cradle_mm3 + self.filler_mm3

    @property
    def waste_mm3(self) -> float:
        """Skin trim, kerf, surplus, scrap and thickened backs: foam in a back that needs none is no saving."""
        return self.trim_mm3 + self.kerf_mm3 + self.surplus_mm3 + self.scrap_mm3 + self.thickened_mm3

    @property
    def used_percent(self) -> float:
        """Used foam of the foam bought."""
        return 100.0 * self.used_mm3 / self.bought_mm3 if self.bought_mm3 else 0.0

    @property
    def waste_percent(self) -> float:
        """Wasted foam of the foam bought."""
        return 100.0 * self.waste_mm3 / self.bought_mm3 if self.bought_mm3 else 0.0

    @property
    def bought_ml(self) -> int:
        """What was bought in whole thousandths of a litre."""
        return round(self.bought_mm3 / _MM3_PER_ML)

    @property
    def parts_ml(self) -> dict[str, int]:
        """The parts in whole thousandths of a litre, by name, summing to `bought_ml` (largest remainders)."""
        exact = {name: getattr(self, f"{name}_mm3") / _MM3_PER_ML for name in LEDGER_PARTS}
        parts = {name: math.floor(value) for name, value in exact.items()}
        missing = self.bought_ml - sum(parts.values())
        largest_first = sorted(LEDGER_PARTS, key=lambda name: parts[name] - exact[name])
        for name in largest_first[: max(0, missing)]:
            parts[name] += 1
        if missing < 0:
            parts[max(parts, key=lambda name: parts[name])] += missing
        return parts

    @property
    def waste_words(self) -> str:
        """The waste figure in one sentence: what it is made of and what it leaves out."""
        named = (
            ("skin trim", self.trim_mm3),
            ("kerf", self.kerf_mm3),
            ("halves without a use", self.surplus_mm3),
            ("scrap", self.scrap_mm3),
            ("backs thicker than needed", self.thickened_mm3),
        )
        share = 100.0 / self.bought_mm3 if self.bought_mm3 else 0.0
        parts = [f"{name} {volume * share:.1f} %" for name, volume in named if volume * share >= 0.05]
        made_of = f": {', '.join(parts)}" if parts else ""
        kept = f"; the {self.offcut_mm3 * share:.1f} % kept as offcuts is not in it" if self.offcut_mm3 > 0.0 else ""
        waste = f"the {self.waste_percent:.1f} % of the foam bought that goes into no half with a duty"
        return f"Waste is {waste}{made_of}{kept}."


@dataclass(frozen=True, slots=True, kw_only=True)
class Hours(Record):
    """Machine time of the job, s."""

    cutting_s: float  # sweeps, trims and through cuts
    setup_s: float  # clampings
    by_block_s: tuple[tuple[str, float], ...]  # (block id, s)
    air_s: float = 0.0  # moves in air between cuts
    turn_s: float = 0.0  # turning parts between clampings
    handling_s: float = 0.0  # fetching blocks and taking pieces away

    @property
    def total_s(self) -> float:
        """All parts together."""
        return self.cutting_s + self.air_s + self.setup_s + self.turn_s + self.handling_s


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
