"""What the workshop has: foam grades, wires, machines, label sheets."""

from dataclasses import dataclass

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.records.record import Record

EPS_DENSITY_KG_M3 = (8.0, 60.0)  # lighter or heavier is no expanded polystyrene


@dataclass(frozen=True, slots=True, kw_only=True)
class Grade(Record):
    """A class of EPS to EN 13163 with its typical density."""

    name: str
    density_kg_m3: float
    density_low_kg_m3: float
    density_high_kg_m3: float
    strength_kpa: float  # compressive stress at 10 % strain, EN 826
    bending_kpa: float
    stand: bool = False  # whether blocks of it may be stood on any of their faces


@dataclass(frozen=True, slots=True, kw_only=True)
class Wire(Record):
    """A cutting wire."""

    name: str
    alloy: str
    diameter_mm: float
    resistivity_ohm_m: float  # at 20 degC
    density_kg_m3: float
    clearance_mm: float  # per side between wire and foam, for the contact limit


@dataclass(frozen=True, slots=True, kw_only=True)
class Machine(Record):
    """A four-axis machine: two towers carry the wire's ends, near in (x, y), far in (u, v); all in mm and s.

    The near tower's plane lies `near_gap_mm` before the table's near edge, the far tower's `span_mm` behind it. A part
    is clamped with its near face on the table's near edge and its start `table_offset_mm` along the travel, unless the
    head of its program says otherwise.
    """

    name: str
    title: str
    travel_mm: float  # horizontal
    lift_mm: float  # vertical
    span_mm: float  # between the towers' planes
    near_gap_mm: float
    table_offset_mm: float
    table_height_mm: float  # of the table's top above the towers' zero
    speed_mm_s: float  # largest of any axis
    acceleration_mm_s2: float
    air_speed_mm_s: float  # of moves in air
    longest_wire_mm: float  # between the towers' planes, before the springs run out
    setup_s: float  # one clamping
    turn_s: float  # turning a part between clampings
    axes: tuple[str, str, str, str]  # near horizontal, near vertical, far horizontal, far vertical
    decimals: int
    header: tuple[str, ...]  # words of the controller before the first move
    footer: tuple[str, ...]
    heater_on: str  # with {power} in W
    heater_off: str
    block_handling_s: float = 0.0  # fetching one block and lifting it on
    piece_handling_s: float = 0.0  # taking one piece off, tagging and stacking it


@dataclass(frozen=True, slots=True, kw_only=True)
class BlockSize(Record):
    """A usual size of stock block."""

    name: str
    length_mm: float
    width_mm: float
    height_mm: float


@dataclass(frozen=True, slots=True, kw_only=True)
class LabelSheet(Record):
    """A sheet of labels; lengths in mm."""

    name: str
    title: str
    page_width_mm: float
    page_height_mm: float
    columns: int
    rows: int
    label_width_mm: float
    label_height_mm: float
    left_mm: float  # to the first label
    top_mm: float
    pitch_x_mm: float
    pitch_y_mm: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Calibration(Record):
    """The straight-line kerf law w0 + (q' - q0) / (rho H v), fitted to test cuts of one wire on one machine."""

    name: str
    wire: str
    alloy: str
    diameter_mm: float
    machine: str
    grade: str  # of the foam; "" where it was not told
    date: str  # year-month-day of the last cut
    least_kerf_mm: float  # w0
    heat_kj_kg: float  # H
    threshold_w_m: float  # q0
    covariance: Floats  # (3, 3) of (w0 mm, H kJ/kg, q0 W/m)
    degrees_of_freedom: int
    n_coupons: int
    chi_square: float  # reduced
    density_kg_m3: tuple[float, float]  # least and most of the cuts
    power_w_m: tuple[float, float]
    speed_mm_s: tuple[float, float]
    clearance_mm: float | None = None  # on each side where the wire began to touch; None: not tried
    doubts: tuple[str, ...] = ()  # what spoke against the fit

    def __post_init__(self) -> None:
        object.__setattr__(self, "covariance", frozen_floats(self.covariance, (3, 3), "covariance"))


@dataclass(frozen=True, slots=True, kw_only=True)
class Conditions(Record):
    """The cutting conditions of a job: what the wire does in this foam at this power."""

    density_kg_m3: float
    power_w_m: float
    kerf_rate_mm2_s: float  # G: kerf = w0 + G / speed
    least_kerf_mm: float  # w0
    low_mm_s: float  # over-melt limit
    high_mm_s: float  # contact limit
    planned_mm_s: float  # at mid-wire
    kerf_mm: float  # at the planned speed
    widest_kerf_mm: float  # the kerf at the over-melt limit
    is_calibrated: bool = False
    calibration: Calibration | None = None  # by whose test cuts; the limits then hold with 95 % confidence each
