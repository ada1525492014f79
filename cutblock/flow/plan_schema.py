"""The shape of plan.json; its keys are a contract with whoever reads plan folders."""

from typing import Final, Literal

import msgspec

Vector = tuple[float, float, float]
Pair = tuple[float, float]
FORMAT: Final = 1


class _Entry(msgspec.Struct, frozen=True, kw_only=True):
    """An object of plan.json; keys of later programs are passed over."""


class PinEntry(_Entry, frozen=True):
    """A block that keeps the billets of these sweeps and no others."""

    block: str
    sweeps: list[str]


class JobEntry(_Entry, frozen=True):
    """What the job was, lengths in mm."""

    id: str
    title: str
    revision: str
    units: str
    layup: Literal["bed", "bench"]
    tolerance_mm: float
    coat_mm: float
    margin_mm: float
    wall_mm: float
    grade: str
    favour: Literal["lower", "upper", "share"]
    unpaired: str
    thickness_mm: float
    least_offcut_mm: Vector
    currency: str
    hour_rate: float | None
    counter: Literal["best", "lift", "offset"] = "best"
    slack: Literal["scrap", "backs"] = "scrap"
    squareness: float = 0.1
    setups: int | None = None  # most that a block may need
    no_turn: list[str] = []  # faces, panels or sweeps whose billets keep their length along the block
    pins: list[PinEntry] = []


class InputEntry(_Entry, frozen=True):
    """A file the plan was made from, as the job names it."""

    path: str
    sha256: str


class SettingsEntry(_Entry, frozen=True):
    """How hard the packing searched."""

    seed: int
    seconds: float | None
    moves: int | None


class EdgeEntry(_Entry, frozen=True):
    """One side of a panel, in form coordinates, counter-clockwise seen out of the mould."""

    name: str
    start_mm: Vector
    end_mm: Vector
    normal: Vector  # mean of the form's along it
    bow_mm: float  # outwards of the plane through its ends and that normal


class PanelEntry(_Entry, frozen=True):
    """One panel; its frame is `origin_mm` and `axes` (rows x, y, z) in form coordinates."""

    id: str
    face: str
    copy: int
    row: int
    column: int
    length_mm: float
    width_mm: float
    fit_max_mm: float | None  # None: the wire cannot make it, see the findings
    fit_rms_mm: float | None
    finished_max_mm: float | None
    finished_rms_mm: float | None
    paired_with: str | None
    area_mm2: float
    origin_mm: Vector
    axes: tuple[Vector, Vector, Vector]
    outline_mm: list[list[Pair]]
    neighbours: list[tuple[str, str]]
    finished_p95_mm: float | None = None  # 95 of 100 parts of the area are no farther off
    worst_mm: float | None = None  # signed: over 0 where foam stands above the form; kerf as the speeds leave it
    worst_at_mm: Vector | None = None  # where, in form coordinates
    samples_per_m2: float | None = None  # that it was measured at
    edges: list[EdgeEntry] = []


class FaceEntry(_Entry, frozen=True):
    """One face of the form, all copies alike."""

    name: str
    area_mm2: float
    domed_percent: float  # curved the same way in all directions, which a straight wire only follows in strips
    noise_mm: float | None = None  # rms distance of a mesh's vertices from the smooth face


class ServingEntry(_Entry, frozen=True):
    """A half as the mould or the counter-mould of a panel: billet point p lies at rotation p + shift in its frame."""

    panel: str
    half: Literal["lower", "upper"]
    rotation: tuple[Vector, Vector, Vector]
    shift_mm: Vector
    max_mm: float
    rms_mm: float
    p95_mm: float
    fit_max_mm: float
    fit_rms_mm: float
    strip: int
    n_strips: int
    offset_mm: float = 0.0  # of the wanted face above the panel's; 0 for a mould


class SpeedEntry(_Entry, frozen=True):
    """Wire-normal speeds at mid-wire, mm/s."""

    low: float
    high: float
    planned: float


class SweepEntry(_Entry, frozen=True):
    """One pass of the wire through a billet; row i of near and far is ruling i."""

    id: str
    length_mm: float
    width_mm: float
    height_mm: float
    near_mm: list[Pair]
    far_mm: list[Pair]
    wire_along: Literal["x", "y"]
    serves: list[str]
    lower_litres: float
    upper_litres: float
    kerf_litres: float
    trimmed_litres: float  # outside the panel's outline
    kerf_mm: Pair
    speed_mm_s: SpeedEntry
    seconds: float
    end_speed_ratio: float
    twist_deg_per_m: float
    fit_max_mm: float
    fit_rms_mm: float
    skew_mm: float
    face_mm2: float
    step_seconds: list[float]
    serving: list[ServingEntry]
    thickened_mm: float = 0.0  # of the height: added to the upper half's back to take up slack in the block
    thickened_litres: float = 0.0  # of upper_litres


class PieceEntry(_Entry, frozen=True):
    """One half of one sweep."""

    id: str
    partner: str
    sweep: str
    half: Literal["lower", "upper"]
    duty: Literal["mould", "counter-mould", "cradle", "filler", "surplus"]
    panel: str | None
    block: str | None
    litres: float
    mass_kg: float
    code: str
    centre_mm: Vector | None = None  # of mass, billet frame
    filler: str = ""  # which boxes come out of it, and how many
    set_by_hand: bool = False  # its duty


class BilletEntry(_Entry, frozen=True):
    """Where a billet lies in its block."""

    sweep: str
    at_mm: Vector
    size_mm: Vector
    turned: bool


class FreedEntry(_Entry, frozen=True):
    """A part that comes free and must be supported before the wire is through; `side` as the part is clamped."""

    side: Literal["start", "end", "top", "bottom"]
    at_mm: Vector
    size_mm: Vector


class CutEntry(_Entry, frozen=True):
    """One pass of the wire, in order; a trim or through cut melts `position_mm` to `position_mm` + the block's kerf."""

    order: int
    kind: Literal["trim", "through", "sweep"]
    setup: int
    part_at_mm: Vector
    part_size_mm: Vector
    axis: str
    position_mm: float
    sweep: str | None
    turn: bool
    frees: list[FreedEntry] = []


class OffcutEntry(_Entry, frozen=True):
    """A leftover box worth keeping."""

    size_mm: Vector
    at_mm: Vector


class BlockEntry(_Entry, frozen=True):
    """One stock block."""

    id: str
    length_mm: float
    width_mm: float
    height_mm: float
    grade: str
    skin_mm: float
    kerf_mm: float
    price: float | None
    from_offcut: bool
    billets: list[BilletEntry]
    cuts: list[CutEntry]
    offcuts: list[OffcutEntry]
    bought_mm: Vector | None = None  # as the stock lists it, where it stands on another face
    stock: int | None = None  # place in the list `stock`, from 0
    density_kg_m3: float | None = None  # of a better grade; null: the job's
    source: str = ""  # of an offcut: where it was kept


class StockEntry(_Entry, frozen=True):
    """A row of the job's stock: blocks to buy, or an offcut kept from an earlier job."""

    length_mm: float
    width_mm: float
    height_mm: float
    skin_mm: float
    grade: str
    place: str
    count: int | None
    price: float | None
    stands: bool
    substitutes: bool
    density_kg_m3: float | None
    is_offcut: bool
    source: str


class LedgerEntry(_Entry, frozen=True):
    """The volume account; every key ending in _litres but bought_litres sums to bought_litres."""

    bought_litres: float
    trim_litres: float
    kerf_litres: float
    mould_litres: float
    counter_mould_litres: float
    cradle_litres: float
    filler_litres: float
    surplus_litres: float
    offcut_litres: float
    scrap_litres: float
    used_percent: float
    waste_percent: float
    blocks: int
    blocks_lower_bound: int
    thickened_litres: float = 0.0  # backs thicker than needed, which took up slack; counts as waste


class AccountEntry(_Entry, frozen=True):
    """The account of a block, a grade or the job in whole thousandths of a litre; the parts sum to `bought`."""

    name: str
    grade: str
    blocks: int
    bought: int
    trim: int
    kerf: int
    mould: int
    counter_mould: int
    cradle: int
    filler: int
    surplus: int
    thickened: int
    offcut: int
    scrap: int
    scrap_clean: int  # of scrap
    scrap_coated: int  # of scrap: cut off a piece that already had its coat
    coated_later: int  # of the halves: coated, so no clean waste once they are used up
    bought_kg: float
    scrap_kg: float


class AccountsEntry(_Entry, frozen=True):
    """The account block by block, grade by grade and of the job; each line is the sum of those before it."""

    blocks: list[AccountEntry]
    grades: list[AccountEntry]
    job: AccountEntry


class TimeEntry(_Entry, frozen=True):
    """Machine time, hours."""

    cutting_h: float
    setup_h: float
    total_h: float
    blocks_h: dict[str, float]
    air_h: float = 0.0
    turn_h: float = 0.0
    handling_h: float = 0.0


class CostEntry(_Entry, frozen=True):
    """Money; null where no price was given."""

    currency: str
    foam: float | None
    machine: float | None
    total: float | None
    foam_lower_bound: float | None


class FindingEntry(_Entry, frozen=True):
    """Something someone must look at."""

    severity: Literal["info", "warning", "error"]
    code: str
    subject: str
    text: str


class CalibrationEntry(_Entry, frozen=True):
    """The test cuts that the conditions rest on; `covariance` is of (least_kerf_mm, heat_kj_kg, threshold_w_m)."""

    name: str
    wire: str
    alloy: str
    diameter_mm: float
    machine: str
    grade: str
    date: str
    least_kerf_mm: float
    heat_kj_kg: float
    threshold_w_m: float
    covariance: tuple[Vector, Vector, Vector]
    degrees_of_freedom: int
    n_coupons: int
    chi_square: float
    density_kg_m3: Pair
    power_w_m: Pair
    speed_mm_s: Pair
    clearance_mm: float | None
    doubts: tuple[str, ...]


class ConditionsEntry(_Entry, frozen=True):
    """What the wire does in this foam at this power."""

    density_kg_m3: float
    power_w_m: float
    kerf_rate_mm2_s: float
    least_kerf_mm: float
    low_mm_s: float
    high_mm_s: float
    planned_mm_s: float
    kerf_mm: float
    widest_kerf_mm: float
    is_calibrated: bool
    calibration: CalibrationEntry | None = None


class WireEntry(_Entry, frozen=True):
    """The wire the plan was made for."""

    name: str
    alloy: str
    diameter_mm: float
    resistivity_ohm_m: float
    density_kg_m3: float
    clearance_mm: float


class MachineEntry(_Entry, frozen=True):
    """The machine the code was written for."""

    name: str
    title: str
    travel_mm: float
    lift_mm: float
    span_mm: float
    near_gap_mm: float
    table_offset_mm: float
    table_height_mm: float
    speed_mm_s: float
    acceleration_mm_s2: float
    air_speed_mm_s: float
    longest_wire_mm: float
    setup_s: float
    turn_s: float
    axes: tuple[str, str, str, str]
    decimals: int
    header: tuple[str, ...]
    footer: tuple[str, ...]
    heater_on: str
    heater_off: str
    block_handling_s: float = 0.0
    piece_handling_s: float = 0.0


class PlanFile(_Entry, frozen=True):
    """The whole file."""

    format: Literal[1]
    program: str
    job: JobEntry
    inputs: list[InputEntry]
    settings: SettingsEntry
    conditions: ConditionsEntry
    wire: WireEntry
    machine: MachineEntry
    panels: list[PanelEntry]
    sweeps: list[SweepEntry]
    pieces: list[PieceEntry]
    blocks: list[BlockEntry]
    ledger: LedgerEntry
    bound_proof: str
    time: TimeEntry
    cost: CostEntry
    findings: list[FindingEntry]
    faces: list[FaceEntry] = []
    stock: list[StockEntry] = []
    ledger_parts: AccountsEntry | None = None
    seals: dict[str, str | list[str]] = {}  # a checksum of every value, by section and entry, see `seals`
