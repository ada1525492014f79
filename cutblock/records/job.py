"""A job as the user wrote it, every length in mm."""

from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.records.duties import Filler, Lock
from cutblock.records.record import Record
from cutblock.records.words import Closing, Duty, Favour, Layup


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class CornersSource(Record):
    """A hypar patch with straight edges through four corners in order round the patch."""

    corners_mm: Floats  # (4, 3)

    def __post_init__(self) -> None:
        object.__setattr__(self, "corners_mm", frozen_floats(self.corners_mm, (4, 3), "corners"))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class RailsSource(Record):
    """Two curves (CSV rows x, y, z; same count) whose rows are joined by straight lines."""

    near_path: str  # absolute
    far_path: str


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class HeightsSource(Record):
    """A CSV file of x, y, z rows that form a regular grid over the bed."""

    path: str  # absolute


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class MeshSource(Record):
    """A triangle mesh file: STL, OBJ, PLY or 3MF."""

    path: str  # absolute


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class WavesSource(Record):
    """z = base + sum of a sin(2 pi x / period + phase) along x + the same along y, over [0, length] x [0, width]."""

    length_mm: float
    width_mm: float
    base_mm: float
    along_x: Floats  # (k, 3) amplitude mm, period mm, phase rad
    along_y: Floats  # (m, 3) likewise

    def __post_init__(self) -> None:
        for name in ("along_x", "along_y"):
            rows = np.asarray(getattr(self, name), dtype=np.float64).reshape(-1, 3)
            object.__setattr__(self, name, frozen_floats(rows, (None, 3), name))


Source = CornersSource | RailsSource | HeightsSource | MeshSource | WavesSource


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class FaceSpec(Record):
    """One `[[form.face]]`: where its surface comes from and how it is divided."""

    name: str
    source: Source
    place: str  # file and line of the table, for messages
    cell_mm: tuple[float, float] | None = None  # wanted length and width of a cell, else the cuts
    cuts_x_mm: tuple[float, ...] | None = None
    cuts_y_mm: tuple[float, ...] | None = None
    count: int = 1
    is_closed: bool = False  # cast between mould and counter-mould: its panels share no cut
    # Of the grid of cells, counter-clockwise from the face's x, and how far it is shifted from the face's corner along
    # its own two directions; with either, cells have their wanted size exactly and the face's edges trim them.
    angle_rad: float | None = None
    phase_mm: tuple[float, float] | None = None

    @property
    def is_grid_set(self) -> bool:
        """Whether the grid lies where the job says, not evenly on the face."""
        return self.angle_rad is not None or self.phase_mm is not None


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class StockSpec(Record):
    """One `[[foam.block]]`, or an offcut kept from an earlier job."""

    length_mm: float
    width_mm: float
    height_mm: float
    skin_mm: float
    grade: str
    place: str
    count: int | None = None  # None: as many as needed
    price: float | None = None
    stands: bool = False  # whether it may be stood on any of its faces
    substitutes: bool = False  # whether it may take billets of the job's grade though its own is a better one
    density_kg_m3: float | None = None  # None: the job's
    is_offcut: bool = False
    source: str = ""  # of an offcut: the block and plan it was kept from


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Pin(Record):
    """One `[[pin]]`: the sweeps whose billets, and no others, are cut from one block."""

    block: str
    sweeps: tuple[str, ...]
    place: str = ""  # file and line, for messages


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Job(Record):
    """One job file, checked for types, ranges and files, all lengths in mm."""

    id: str
    title: str
    units: str  # the unit people read
    revision: str
    path: str  # absolute path of the job file; never enters an output
    layup: Layup
    tolerance_mm: float
    coat_mm: float
    margin_mm: float  # foam round a bench panel for its edge battens; 0 on the bed
    faces: tuple[FaceSpec, ...]
    grade: str  # name of the grade, or "" where only the density is given
    density_kg_m3: float
    stock: tuple[StockSpec, ...]
    least_offcut_mm: tuple[float, float, float]  # sorted least sizes of a leftover box worth keeping, largest first
    machine: str  # catalogue name, or the absolute path of a TOML file
    wire: str
    power_w_m: float
    kerf_mm: float | None  # wanted at mid-wire; None: from the planned speed
    wall_mm: float
    favour: Favour
    unpaired: Duty
    thickness_mm: float  # of the concrete between mould and counter-mould
    closing: Closing = Closing.BEST
    locks: tuple[Lock, ...] = ()  # what is set by hand
    fillers: tuple[Filler, ...] = ()
    currency: str = ""
    hour_rate: float | None = None  # money per machine hour
    calibration: str = ""  # name of the user's own, or the absolute path of a TOML file; "": none
    takes_up_slack: bool = False  # leftover height below the least useful offcut thickens backs
    most_setups: int | None = None  # that a block may need
    no_turn: tuple[str, ...] = ()  # faces, panels or sweeps whose billets keep their length along the block
    pins: tuple[Pin, ...] = ()
    squareness: float = 0.1  # what a squarer wire is worth in deviation, as a share of the tolerance
    inputs: tuple[tuple[str, str], ...] = ()  # (path as written in the job, sha256) of the job and every file it names
