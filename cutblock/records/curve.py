"""What a job would need with another tolerance or other panels."""

from dataclasses import dataclass

from cutblock.records.record import Record


@dataclass(frozen=True, slots=True, kw_only=True)
class CurvePoint(Record):
    """The figures of one plan; those after `refusal` are 0 where no plan can be made."""

    tolerance_mm: float
    cell_mm: tuple[float, float] | None  # of the first face that is divided into cells; None where none is
    is_job: bool = False  # as the job stands
    refusal: str = ""  # why there is no plan
    n_panels: int = 0
    n_uncut: int = 0  # panels that no sweep makes
    n_paired: int = 0  # panels that share their cut
    n_sweeps: int = 0
    n_blocks: int = 0
    used_percent: float = 0.0
    waste_percent: float = 0.0
    hours_s: float = 0.0
    cost: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class WasteCurves(Record):
    """Two series of plans, the job as it stands in both."""

    by_tolerance: tuple[CurvePoint, ...]  # rising
    by_size: tuple[CurvePoint, ...]  # cells growing; empty where no face has cells
