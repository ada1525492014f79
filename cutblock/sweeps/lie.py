"""How a panel lies in its billet: with the wire along its y or its x, whole or as one of several strips."""

from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.geometry.fit_target import Patch
from cutblock.geometry.outline import is_inside
from cutblock.records.panel import Panel

# A quarter turn about z: the billet's x lies along the panel's +y, its y along the panel's -x.
QUARTER = np.array([[0.0, -1.0, 0.0], [1.0, 0.0, 0.0], [0.0, 0.0, 1.0]])
N_MASK = 65
SPARE = 0.995  # share of the wire's stretch that is used
END_SPEED_RATIO = 1.9  # in plan, of one end of the wire to the other; over 2 along the sheet the kerf differs visibly
LEAST_LEAN = 0.05  # skew by width that is tried whatever the machine


@dataclass(frozen=True, slots=True, eq=False)
class Lie:
    """A panel in the plan of an undivided billet; z stays the panel's.

    A point p of this frame is at `p @ rotation.T + shift` in the panel frame.
    """

    wire_along: str
    rotation: Floats
    shift_mm: Floats
    heights_mm: Floats  # (n_x, n_y) what the centreline is fitted to, over the panel's rectangle
    corner_mm: tuple[float, float]  # where the panel's rectangle begins in the billet
    extent_mm: tuple[float, float]  # of the rectangle
    size_mm: tuple[float, float]  # length and width of the billet
    samples: Floats  # (m, 3)
    normals: Floats
    areas_mm2: Floats
    outline: tuple[Floats, ...] | None  # rings in this frame; None where the outline is the rectangle


def lie_of(panel: Panel, heights_mm: Floats, wire_along: str, margin_mm: float) -> Lie:
    """Return how a panel lies with the wire along "x" or "y".

    With a margin the billet is rounded up to whole mm, and what that adds lies alike on both sides.

    Args:
        panel: The panel.
        heights_mm: What the centreline is fitted to, on the grid of the panel's heights.
        wire_along: The panel axis the wire lies along.
        margin_mm: Foam round the outline's rectangle.
    """
    is_turned = wire_along == "x"
    extent = (panel.width_mm, panel.length_mm) if is_turned else (panel.length_mm, panel.width_mm)
    size = tuple(_billet_extent(value, margin_mm) for value in extent)
    corner = ((size[0] - extent[0]) / 2.0, (size[1] - extent[1]) / 2.0)
    rotation = QUARTER if is_turned else np.eye(3)
    if is_turned:
        shift = np.array([panel.length_mm + corner[1], -corner[0], 0.0])
        heights = heights_mm.T[:, ::-1]
    else:
        shift = np.array([-corner[0], -corner[1], 0.0])
        heights = heights_mm
    outline = None
    if not panel.is_rectangle:
        outline = tuple((ring - shift[:2]) @ rotation[:2, :2] for ring in panel.outline)
    return Lie(
        wire_along=wire_along,
        rotation=rotation,
        shift_mm=shift,
        heights_mm=heights,
        corner_mm=corner,
        extent_mm=extent,
        size_mm=(size[0], size[1]),
        samples=(panel.samples_mm - shift) @ rotation,
        normals=panel.normals @ rotation,
        areas_mm2=panel.areas_mm2,
        outline=outline,
    )


def _billet_extent(extent_mm: float, margin_mm: float) -> float:
    if margin_mm <= 0.0:
        return extent_mm
    return float(np.ceil(extent_mm + 2.0 * margin_mm - 1e-6))


@dataclass(frozen=True, slots=True, eq=False)
class Strip:
    """One of n strips of a panel across the wire; on the bench the outermost ones carry the margin."""

    lie: Lie
    number: int  # from 1
    n_strips: int
    joints_mm: tuple[float, ...] = ()  # y of the lie where the strips meet; empty: all about equally wide

    @property
    def panel_span_mm(self) -> tuple[float, float]:
        """From where to where in y of the lie the strip's part of the panel runs."""
        return self._joint_mm(self.number - 1), self._joint_mm(self.number)

    def _joint_mm(self, number: int) -> float:
        """Return where joint `number` lies, 0 and the number of strips being the panel's edges."""
        low, extent = self.lie.corner_mm[1], self.lie.extent_mm[1]
        if number in (0, self.n_strips):
            return low if number == 0 else low + extent
        # Joints lie on tenths of a mm, which a workshop can measure and files hold exactly.
        return round(self.joints_mm[number - 1] if self.joints_mm else low + extent * number / self.n_strips, 1)

    @property
    def billet_span_mm(self) -> tuple[float, float]:
        """From where to where in y of the lie its billet runs."""
        low, high = self.panel_span_mm
        return 0.0 if self.number == 1 else low, self.lie.size_mm[1] if self.number == self.n_strips else high

    @property
    def width_mm(self) -> float:
        """Of its billet, along the wire."""
        low, high = self.billet_span_mm
        return high - low

    def patch(self, stretch: float) -> Patch:
        """Return what its sheet is fitted to, in the frame of its billet.

        Args:
            stretch: Longest wire between the machine's towers by their distance; rulings keep within it.
        """
        lie, start = self.lie, self.billet_span_mm[0]
        low, high = self.panel_span_mm
        spread_limit = self._spread_limit_mm(stretch)
        patch = Patch(
            heights_mm=lie.heights_mm,
            low_x_mm=lie.corner_mm[0],
            high_x_mm=lie.corner_mm[0] + lie.extent_mm[0],
            low_y_mm=lie.corner_mm[1] - start,
            high_y_mm=lie.corner_mm[1] + lie.extent_mm[1] - start,
            width_mm=self.width_mm,
            strip_low_y_mm=low - start,
            strip_high_y_mm=high - start,
            skew_limit_mm=spread_limit,
            spread_limit_mm=spread_limit,
            least_advance=2.0 / (1.0 + END_SPEED_RATIO),
        )
        return patch if lie.outline is None else _masked(patch, lie.outline, start)

    def _spread_limit_mm(self, stretch: float) -> float:
        """Return how far apart the ends of a ruling may lie in x and z together before the springs run out."""
        return SPARE * self.width_mm * float(np.sqrt(max(stretch**2 - 1.0, LEAST_LEAN**2)))

    def samples(self) -> tuple[Floats, Floats, Floats]:
        """Return the panel's samples, normals and areas within it, in the frame of its billet."""
        lie, start = self.lie, self.billet_span_mm[0]
        low, high = self.panel_span_mm
        y = lie.samples[:, 1]
        is_in = (y >= low - 1e-9) & (y <= high + 1e-9)
        is_in |= (self.number == 1) & (y < low) | (self.number == self.n_strips) & (y > high)
        return lie.samples[is_in] - [0.0, start, 0.0], lie.normals[is_in], lie.areas_mm2[is_in]


def _masked(patch: Patch, outline: tuple[Floats, ...], start_mm: float) -> Patch:
    """Return the patch with points outside the outline left out, a little beyond it kept."""
    x = np.linspace(patch.low_x_mm, patch.high_x_mm, N_MASK)
    y = patch.node_y_mm + start_mm
    points = np.stack(np.broadcast_arrays(x[:, None], y), axis=-1).reshape(-1, 2)
    reach = (patch.high_x_mm - patch.low_x_mm) / (N_MASK - 1)
    weights = is_inside(outline, points, reach).reshape(N_MASK, len(y)).astype(np.float64)
    values = {name: getattr(patch, name) for name in Patch.__slots__}
    return Patch(**(values | {"weights": weights}))
