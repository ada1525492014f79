"""A sweep: one pass of the wire through a billet, and what its halves serve."""

from dataclasses import dataclass

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.records.record import Record
from cutblock.records.words import Half


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Serving(Record):
    """One half of a sweep as the mould of a panel, or of one strip of it, or as the counter-mould that closes it.

    A point p of the billet frame lies at `p @ rotation.T + shift_mm` in the panel frame; for an upper half that is a
    mould the rotation turns it over, as a counter-mould it stays face down. Deviations are of the finished face (kerf
    and coat taken into account) from the wanted one, along its normal, over the panel's samples that the strip covers.
    """

    panel: str
    half: Half
    rotation: Floats  # (3, 3), proper
    shift_mm: Floats  # (3,)
    max_mm: float
    rms_mm: float
    p95_mm: float
    fit_max_mm: float = 0.0  # the same without the offset that kerf and coat leave on purpose: the ruled fit alone
    fit_rms_mm: float = 0.0
    strip: int = 1  # from 1
    n_strips: int = 1
    offset_mm: float = 0.0  # of the wanted face above the panel's: 0 for a mould, the concrete's thickness to close it

    @property
    def is_mould(self) -> bool:
        """Whether the half moulds its panel; else it is cut by a sweep of its own to close the panel's mould."""
        return self.offset_mm == 0.0

    def __post_init__(self) -> None:
        object.__setattr__(self, "rotation", frozen_floats(self.rotation, (3, 3), "rotation"))
        object.__setattr__(self, "shift_mm", frozen_floats(self.shift_mm, (3,), "shift_mm"))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Sweep(Record):
    """One pass of the wire through a billet; row i of `near` and `far` is ruling i.

    Rails are the wire's centreline from the air before the billet to the air behind it, x rising strictly.
    """

    id: str
    length_mm: float  # of the billet, along the travel
    width_mm: float  # along the wire
    height_mm: float
    near: Floats  # (n, 2) x and z, mm, billet frame, y = 0
    far: Floats  # (n, 2) x and z, mm, billet frame, y = width
    wire_along: str  # "x" or "y": the axis of the lower half's panel frame the wire lies along
    serving: tuple[Serving, ...]  # lower half first
    kerf_mm: tuple[float, float]  # at the near and the far billet face
    fit_max_mm: float  # residual of the ruled fit to the surface it was fitted to
    fit_rms_mm: float
    skew_mm: float = 0.0  # largest |x far - x near|
    thickened_mm: float = 0.0  # of the height: added to the back of the upper half to take up slack in the block

    def __post_init__(self) -> None:
        object.__setattr__(self, "near", frozen_floats(self.near, (None, 2), "near"))
        object.__setattr__(self, "far", frozen_floats(self.far, (None, 2), "far"))

    @property
    def serves(self) -> tuple[str, ...]:
        """The panels its halves are moulds of, lower half first."""
        return tuple(serving.panel for serving in self.serving if serving.is_mould)

    @property
    def panels(self) -> tuple[str, ...]:
        """The panels its halves are moulds or counter-moulds of, lower half first."""
        return tuple(serving.panel for serving in self.serving)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class SweepVolumes(Record):
    """Volumes of one sweep in its billet: lower + upper + kerf + trimmed = length x width x height."""

    sweep: str
    lower_mm3: float
    upper_mm3: float
    kerf_mm3: float
    face_mm2: float  # area of the cut surface
    trimmed_mm3: float = 0.0  # cut away outside the outline of the panel (bed lay-up)
    thickened_mm3: float = 0.0  # of the upper half: what took up slack in the block
    lower_centre_mm: tuple[float, float, float] | None = None  # centre of mass, billet frame
    upper_centre_mm: tuple[float, float, float] | None = None


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class SweepTiming(Record):
    """How fast one sweep may and will be cut; speeds are wire-normal, at mid-wire unless said."""

    sweep: str
    low_mm_s: float  # over-melt limit
    high_mm_s: float  # contact limit
    planned_mm_s: float
    seconds: float  # of the whole pass, run-in and run-out included
    step_seconds: Floats  # (n - 1,) time from each ruling to the next
    end_speed_ratio: float  # largest faster end / slower end over the rulings in foam
    twist_deg_per_m: float  # largest turn of the wire per metre of travel

    def __post_init__(self) -> None:
        object.__setattr__(self, "step_seconds", frozen_floats(self.step_seconds, (None,), "step_seconds"))
