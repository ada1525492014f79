"""A panel: one cell of a face, in a frame of its own."""

from dataclasses import dataclass

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.records.record import Record


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class PanelEdge(Record):
    """One side of a panel's outer ring, all of it in form coordinates, counter-clockwise seen out of the mould."""

    name: str  # "west", "east", "south" or "north", numbered from the second on; "free 1" where the face is trimmed
    start_mm: Floats  # (3,)
    end_mm: Floats  # (3,)
    normal: Floats  # (3,) unit mean of the form's normals along it, out of the mould
    bow_mm: float  # how far the edge reaches outwards of the plane through its chord and that normal

    def __post_init__(self) -> None:
        for name in ("start_mm", "end_mm", "normal"):
            object.__setattr__(self, name, frozen_floats(getattr(self, name), (3,), name))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Panel(Record):
    """One cell of a face's division; needs one mould.

    The panel frame is a right-handed rigid frame: z points out of the mould (up on the bed), and the panel's plan
    outline touches x = 0, x = length, y = 0 and y = width. A point p of the panel frame is at
    `origin_mm + p @ axes` in the form; the rows of `axes` are the unit x, y, z of the panel frame in form coordinates.
    `heights_mm` is the wanted surface as a height field on a uniform grid over [0, length] x [0, width], smoothly
    continued where the rectangle reaches beyond the outline; `samples_mm` and `normals` are points and unit upward
    normals of the wanted surface inside the outline, each standing for `areas_mm2` of it, and on its edges, where they
    stand for none.
    """

    id: str
    face: str
    copy: int  # 1 to the face's count
    row: int  # cell index along v, from 1
    column: int  # cell index along u, from 1
    length_mm: float
    width_mm: float
    origin_mm: Floats  # (3,)
    axes: Floats  # (3, 3)
    outline: tuple[Floats, ...]  # rings (n, 2) in the panel's plan, not closed: first the outer one, then holes
    is_rectangle: bool  # the outline is the whole rectangle
    heights_mm: Floats  # (n_x, n_y)
    samples_mm: Floats  # (m, 3)
    normals: Floats  # (m, 3)
    areas_mm2: Floats  # (m,)
    neighbours: tuple[tuple[str, str], ...] = ()  # (edge "west" x=0 | "east" | "south" y=0 | "north", panel id)
    edges: tuple[PanelEdge, ...] = ()  # round the outer ring

    def __post_init__(self) -> None:
        object.__setattr__(self, "origin_mm", frozen_floats(self.origin_mm, (3,), "origin_mm"))
        object.__setattr__(self, "axes", frozen_floats(self.axes, (3, 3), "axes"))
        object.__setattr__(self, "outline", tuple(frozen_floats(ring, (None, 2), "outline") for ring in self.outline))
        object.__setattr__(self, "heights_mm", frozen_floats(self.heights_mm, (None, None), "heights_mm"))
        object.__setattr__(self, "samples_mm", frozen_floats(self.samples_mm, (None, 3), "samples_mm"))
        object.__setattr__(self, "normals", frozen_floats(self.normals, (None, 3), "normals"))
        object.__setattr__(self, "areas_mm2", frozen_floats(self.areas_mm2, (None,), "areas_mm2"))
