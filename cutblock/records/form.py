"""The form: faces as smooth surfaces in one frame."""

from dataclasses import dataclass

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.records.record import Record


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Patch(Record):
    """A tensor-product B-spline surface r(u, v) in form coordinates; u and v run in mm."""

    knots_u: Floats  # (n_u + degree_u + 1,)
    knots_v: Floats
    coefficients: Floats  # (n_u, n_v, 3) mm
    degree_u: int
    degree_v: int

    def __post_init__(self) -> None:
        object.__setattr__(self, "knots_u", frozen_floats(self.knots_u, (None,), "knots_u"))
        object.__setattr__(self, "knots_v", frozen_floats(self.knots_v, (None,), "knots_v"))
        object.__setattr__(self, "coefficients", frozen_floats(self.coefficients, (None, None, 3), "coefficients"))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Face(Record):
    """One smooth patch of the form.

    The face lies over u in [0, length], v in [0, width]. Where `outline` is given only what lies inside its first
    ring and outside its other rings belongs to the face (a trimmed mesh, with holes).
    """

    name: str
    patch: Patch
    length_mm: float
    width_mm: float
    outline: tuple[Floats, ...] | None = None  # rings (n, 2) of (u, v), not closed
    noise_mm: float | None = None  # rms distance of a mesh's vertices from the patch; None: not from a mesh

    def __post_init__(self) -> None:
        if self.outline is not None:
            rings = tuple(frozen_floats(ring, (None, 2), "outline") for ring in self.outline)
            object.__setattr__(self, "outline", rings)
