"""What each half of a sweep is trimmed to in the plan of its billet."""

from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.sweep import Serving, Sweep
from cutblock.records.words import Duty, Half, Layup

Region = tuple[Floats, ...]  # an outer ring (k, 2), then its holes, billet frame, mm

# A half with one of these duties follows the outline of the panel it supports.
_FOLLOWING = (Duty.COUNTER_MOULD, Duty.CRADLE)

_LEAST_MM2 = 1e-3  # where outline and billet only touch, rounding may leave such a region


class Footprints(NamedTuple):
    """The regions each half of a sweep is trimmed to; None where it keeps the whole plan of the billet."""

    lower: tuple[Region, ...] | None = None
    upper: tuple[Region, ...] | None = None


def find_footprints(
    layup: Layup, panels: Sequence[Panel], sweeps: Sequence[Sweep], pieces: Sequence[Piece]
) -> tuple[Footprints, ...]:
    """Return the footprints of the halves of every sweep.

    On the bed a half whose panel is no rectangle is trimmed to the panel's outline; a counter-mould or cradle follows
    the panel it supports. On the bench every half keeps the foam round its panel.

    Args:
        layup: How the moulds lie.
        panels: Every panel the sweeps serve.
        sweeps: Any.
        pieces: Two for each sweep.
    """
    if layup is not Layup.BED:
        return (Footprints(),) * len(sweeps)
    by_id = {panel.id: panel for panel in panels}
    duties = {(piece.sweep, piece.half): piece.duty for piece in pieces}
    return tuple(_footprints(sweep, by_id, duties) for sweep in sweeps)


def _footprints(sweep: Sweep, panels: Mapping[str, Panel], duties: Mapping[tuple[str, Half], Duty]) -> Footprints:
    servings = {serving.half: serving for serving in sweep.serving}
    plans: dict[Half, tuple[Region, ...] | None] = {Half.LOWER: None, Half.UPPER: None}
    for half in plans:
        serving = servings.get(half)
        if serving is None and duties.get((sweep.id, half)) in _FOLLOWING:
            serving = sweep.serving[0]
        if serving is not None and not panels[serving.panel].is_rectangle:
            plans[half] = outline_in_billet(panels[serving.panel], serving, sweep)
    return Footprints(plans[Half.LOWER], plans[Half.UPPER])


def outline_in_billet(panel: Panel, serving: Serving, sweep: Sweep) -> tuple[Region, ...]:
    """Return the regions of a panel's outline that lie over a sweep's billet, in the billet's plan."""
    import shapely

    # p = b R' + shift gives b = (p - shift) R; the turn keeps plan and height apart, so the plan part stands alone.
    plan_turn, plan_shift = serving.rotation[:2, :2], serving.shift_mm[:2]
    rings = [(ring - plan_shift) @ plan_turn for ring in panel.outline]
    region = shapely.Polygon(rings[0], rings[1:]).intersection(shapely.box(0.0, 0.0, sweep.length_mm, sweep.width_mm))
    return tuple(
        tuple(np.asarray(ring.coords)[:-1] for ring in (part.exterior, *part.interiors))
        for part in shapely.get_parts(region)
        if part.geom_type == "Polygon" and part.area > _LEAST_MM2
    )
