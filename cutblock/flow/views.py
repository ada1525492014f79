"""What the window shows besides the plan itself, worked out by the rooms that know how."""

from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.flow.outputs import LABEL_SHEET, block_drawings, tag_drawings, tag_sheets
from cutblock.records.plan import Plan
from cutblock.records.record import Record
from cutblock.reports.summary import summary_lines

__all__ = ["LABEL_SHEET", "SpeedChart", "block_drawings", "speed_chart", "summary", "tag_drawings", "tags_pdf"]

_LIGHTEST_KG_M3, _HEAVIEST_KG_M3 = 10.0, 40.0


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class SpeedChart(Record):
    """The speed window of the job's wire and power against the foam's density."""

    densities_kg_m3: Floats  # (n,)
    low_mm_s: Floats  # (n,) over-melt limit
    high_mm_s: Floats  # (n,) contact limit
    density_kg_m3: float  # of the job's foam
    planned_mm_s: float
    is_calibrated: bool

    def __post_init__(self) -> None:
        for name in ("densities_kg_m3", "low_mm_s", "high_mm_s"):
            object.__setattr__(self, name, frozen_floats(getattr(self, name), (None,), name))


def summary(plan: Plan) -> tuple[tuple[str, str], ...]:
    """Return the plan in a few (label, value) lines."""
    return summary_lines(plan)


def tags_pdf(plan: Plan, sheet_name: str = LABEL_SHEET, start: int = 1) -> bytes:
    """Return the tags as a PDF; see `tag_sheets`."""
    return tag_sheets(plan, sheet_name, start)


def speed_chart(plan: Plan) -> SpeedChart:
    """Return the speed window for densities around those of EPS, at the plan's wire and power."""
    from cutblock.schedule.window import contact_kerf_mm, speed_limits

    densities = np.linspace(_LIGHTEST_KG_M3, _HEAVIEST_KG_M3, 61)
    conditions = plan.conditions
    contact_mm = contact_kerf_mm(plan.wire, conditions.calibration)
    low, high = speed_limits(
        conditions.power_w_m, densities, contact_mm, conditions.widest_kerf_mm, conditions.calibration
    )
    return SpeedChart(
        densities_kg_m3=densities,
        low_mm_s=low,
        high_mm_s=high,
        density_kg_m3=plan.conditions.density_kg_m3,
        planned_mm_s=plan.conditions.planned_mm_s,
        is_calibrated=plan.conditions.is_calibrated,
    )
