"""What the window shows besides the plan itself, worked out by the rooms that know how."""

from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.base.errors import InputError
from cutblock.flow.face_speeds import block_speeds
from cutblock.flow.outputs import LABEL_SHEET, block_drawings, tag_drawings, tag_sheets
from cutblock.flow.weighing import block_density
from cutblock.records.plan import Plan
from cutblock.records.record import Record
from cutblock.reports.summary import summary_lines

__all__ = [
    "LABEL_SHEET",
    "SpeedChart",
    "WeighedBlock",
    "block_drawings",
    "block_speeds",
    "speed_chart",
    "summary",
    "tag_drawings",
    "tags_pdf",
    "weigh_block",
]

_LIGHTEST_KG_M3, _HEAVIEST_KG_M3 = 10.0, 40.0
_SPEED_SLACK = 1e-3  # far less than a controller's speed holds


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

    def limits_at(self, density_kg_m3: float) -> tuple[float, float] | None:
        """Return the two limits in foam of a density, mm/s; None outside the chart."""
        densities = self.densities_kg_m3
        if not densities[0] <= density_kg_m3 <= densities[-1]:
            return None
        # Speed times density hardly changes with the density, so that straight lines between its values are exact
        # enough: to 3e-5 over half a kg/m3.
        low, high = (
            float(np.interp(density_kg_m3, densities, densities * speeds)) / density_kg_m3
            for speeds in (self.low_mm_s, self.high_mm_s)
        )
        return low, high


@dataclass(frozen=True, slots=True, kw_only=True)
class WeighedBlock(Record):
    """What a block on the table may be cut at, by its own density."""

    density_kg_m3: float
    low_mm_s: float
    high_mm_s: float
    feed_percent: int | None  # the feed that brings the planned speeds inside; 100 as planned, None where none does

    @property
    def is_inside(self) -> bool:
        """Whether the speeds as planned keep the limits."""
        return self.feed_percent == 100


def weigh_block(
    chart: SpeedChart, mass_kg: float, size_mm: tuple[float, float, float], planned_mm_s: tuple[float, float]
) -> WeighedBlock:
    """Return the speed limits for a block as weighed, and whether the planned speeds are inside.

    Args:
        chart: Of the plan.
        mass_kg: Of the block.
        size_mm: Its sides.
        planned_mm_s: Least and most speed of its cuts, see `block_speeds`.

    Raises:
        InputError: No EPS weighs that, or it is lighter or heavier than the chart.
    """
    density = block_density(mass_kg, size_mm)
    limits = chart.limits_at(density)
    if limits is None:
        least, most = float(chart.densities_kg_m3[0]), float(chart.densities_kg_m3[-1])
        raise InputError(
            f"{density:.1f} kg/m3 is outside {least:g} to {most:g} kg/m3, for which the wire is known",
            "weighed block",
            "Weigh and measure it again.",
        )
    low, high = limits
    slowest, fastest = planned_mm_s
    percent = 100 if fastest <= high * (1.0 + _SPEED_SLACK) else int(100.0 * high / fastest)
    keeps_low = slowest * percent / 100.0 >= low * (1.0 - _SPEED_SLACK)
    return WeighedBlock(
        density_kg_m3=density, low_mm_s=low, high_mm_s=high, feed_percent=percent if keeps_low else None
    )


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
