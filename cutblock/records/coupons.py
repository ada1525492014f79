"""Test cuts: a sheet that was filled in, and the picture of a law through them."""

from dataclasses import dataclass

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.records.record import Record


@dataclass(frozen=True, slots=True, kw_only=True)
class CouponRow(Record):
    """One row of a sheet that was filled in."""

    place: str  # file and line
    name: str
    is_onset: bool  # the speed is where the wire began to touch; else a cut whose kerf was measured
    power_w_m: float
    speed_mm_s: float
    density_kg_m3: float
    kerf_mm: float | None
    kerf_error_mm: float | None
    mass_loss_g: float | None
    cut_area_cm2: float | None
    wire: str
    machine: str
    grade: str
    date: str


@dataclass(frozen=True, slots=True, kw_only=True)
class CouponSheet(Record):
    """A sheet as read."""

    rows: tuple[CouponRow, ...]
    empty: tuple[str, ...]  # names of coupons that are planned but not measured
    unused: tuple[str, ...]  # headings that mean nothing here


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class CouponCurve(Record):
    """The kerf at one power over speed, as fitted, and the 5 % and 95 % bounds of it."""

    power_w_m: float
    speed_mm_s: Floats  # (n,)
    kerf_mm: Floats  # (n,)
    low_mm: Floats  # (n,)
    high_mm: Floats  # (n,)

    def __post_init__(self) -> None:
        for name in ("speed_mm_s", "kerf_mm", "low_mm", "high_mm"):
            object.__setattr__(self, name, frozen_floats(getattr(self, name), (None,), name))


@dataclass(frozen=True, slots=True, kw_only=True)
class CouponPoint(Record):
    """One measured cut; foam of another density stands at the speed that would cut alike in the chart's density."""

    name: str
    curve: int  # number of the curve with the nearest power
    speed_mm_s: float
    kerf_mm: float
    error_mm: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class CouponChart(Record):
    """Test cuts and the law fitted to them."""

    title: str
    density_kg_m3: float
    curves: tuple[CouponCurve, ...]
    points: tuple[CouponPoint, ...]
    contact_kerf_mm: float
    widest_kerf_mm: float
