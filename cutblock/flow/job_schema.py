"""The shape of a job file: every key, its type and its default, as people write them (in the job's own unit)."""

from typing import Annotated, Literal

import msgspec

Positive = Annotated[float, msgspec.Meta(gt=0.0)]
NotNegative = Annotated[float, msgspec.Meta(ge=0.0)]
Share = Annotated[float, msgspec.Meta(ge=0.0, le=1.0)]
Point = tuple[float, float, float]


class _Table(msgspec.Struct, forbid_unknown_fields=True, frozen=True, kw_only=True):
    """A TOML table in which every key must be known."""


class JobTable(_Table, frozen=True):
    """`[job]`."""

    id: Annotated[str, msgspec.Meta(pattern="^[A-Z0-9]{1,4}$")]
    title: str
    units: str
    revision: Annotated[str, msgspec.Meta(pattern="^[A-Z0-9]{1,4}$")] = "A"
    currency: str = ""


class RailsTable(_Table, frozen=True):
    """`rails = { near, far }`."""

    near: str
    far: str


class WavesTable(_Table, frozen=True):
    """`waves = { ... }`; rows are amplitude, period, phase in degrees."""

    length: Positive
    width: Positive
    base: float = 0.0
    along_x: list[Point] = []
    along_y: list[Point] = []


class PanelsTable(_Table, frozen=True):
    """`panels = { length, width }`, or the cuts; `angle` (degrees) and `phase` turn and shift the grid of cells."""

    length: Positive | None = None
    width: Positive | None = None
    angle: Annotated[float, msgspec.Meta(ge=-180.0, le=180.0)] | None = None
    phase: tuple[float, float] | None = None
    cuts_x: list[float] | None = None
    cuts_y: list[float] | None = None


class FaceTable(_Table, frozen=True):
    """`[[form.face]]`."""

    name: Annotated[str, msgspec.Meta(pattern="^[A-Za-z0-9][A-Za-z0-9 _-]{0,23}$")]
    corners: Annotated[list[Point], msgspec.Meta(min_length=4, max_length=4)] | None = None
    rails: RailsTable | None = None
    heights: str | None = None
    mesh: str | None = None
    waves: WavesTable | None = None
    panels: PanelsTable | None = None
    cuts_x: list[float] | None = None
    cuts_y: list[float] | None = None
    count: Annotated[int, msgspec.Meta(ge=1, le=10_000)] = 1
    closed: bool = False


class FormTable(_Table, frozen=True):
    """`[form]`."""

    layup: Literal["bed", "bench"]
    tolerance: Positive
    face: Annotated[list[FaceTable], msgspec.Meta(min_length=1)]
    coat: NotNegative = 0.0
    margin: NotNegative | None = None


class BlockTable(_Table, frozen=True):
    """`[[foam.block]]`."""

    length: Positive
    width: Positive
    height: Positive
    count: Annotated[int, msgspec.Meta(ge=0)] | None = None
    price: NotNegative | None = None
    skin: NotNegative = 0.0
    grade: str | None = None
    stand: bool | None = None
    substitute: bool = False


class OffcutTable(_Table, frozen=True):
    """`[[foam.offcuts]]`: a leftover kept from an earlier job; `value` is the money it counts for."""

    length: Positive
    width: Positive
    height: Positive
    count: Annotated[int, msgspec.Meta(ge=1)] = 1
    value: NotNegative = 0.0
    grade: str | None = None
    stand: bool | None = None


class FoamTable(_Table, frozen=True):
    """`[foam]`."""

    block: Annotated[list[BlockTable], msgspec.Meta(min_length=1)]
    grade: str | None = None
    density: Positive | None = None
    offcut: tuple[Positive, Positive, Positive] | None = None
    offcuts: str | list[str | OffcutTable] = []
    slack: Literal["scrap", "backs"] = "scrap"


class CuttingTable(_Table, frozen=True):
    """`[cutting]`."""

    machine: str
    wire: str
    power: Positive
    wall: Positive
    kerf: Positive | None = None
    calibration: str | None = None
    favour: Literal["lower", "upper", "share"] = "share"
    squareness: Share = 0.1
    setups: Annotated[int, msgspec.Meta(ge=1)] | None = None
    no_turn: list[str] = []


class PinTable(_Table, frozen=True):
    """`[[pin]]`: one block of the plan and the sweeps whose billets, and no others, are cut from it."""

    block: str
    sweeps: Annotated[list[str], msgspec.Meta(min_length=1)]


class SetTable(_Table, frozen=True):
    """`[[duties.set]]`: a piece with its duty, or two panels that share a cut, or panels that share none."""

    piece: str | None = None
    duty: Literal["counter-mould", "cradle", "filler", "surplus"] | None = None
    pair: tuple[str, str] | None = None
    single: Annotated[list[str], msgspec.Meta(min_length=1)] | None = None


class FillerTable(_Table, frozen=True):
    """`[[filler]]`: boxes of foam needed for something else."""

    name: Annotated[str, msgspec.Meta(pattern="^[^\\x00-\\x1f]{1,40}$")]
    length: Positive
    width: Positive
    height: Positive
    count: Annotated[int, msgspec.Meta(ge=1, le=100_000)] = 1


class DutiesTable(_Table, frozen=True):
    """`[duties]`."""

    unpaired: Literal["counter-mould", "cradle", "filler", "surplus"] = "surplus"
    thickness: NotNegative = 0.0
    counter: Literal["best", "lift", "offset"] = "best"
    set: list[SetTable] = []


class CostTable(_Table, frozen=True):
    """`[cost]`."""

    machine_hour: NotNegative | None = None


class JobFile(_Table, frozen=True):
    """The whole file."""

    format: Literal[1]
    job: JobTable
    form: FormTable
    foam: FoamTable
    cutting: CuttingTable
    duties: DutiesTable = DutiesTable()
    filler: list[FillerTable] = []
    cost: CostTable = CostTable()
    pin: list[PinTable] = []
