"""A plan with views for the window: the sample plan with small stand-ins for what the rooms draw."""

from dataclasses import replace

import numpy as np
from kit.sample import sample_panel, sample_pieces, sample_plan, sample_sweep

from cutblock.flow.views import SpeedChart
from cutblock.records.drawing import Drawing, Modules, Polygon, Text
from cutblock.records.shop import LabelSheet
from cutblock.worker.requests import ShownPlan, Views


def sample_shown(**changes):
    return shown_of(replace(sample_plan(), **changes))


def grid_plan(n_rows, n_columns, worst_mm):
    """A plan of one face; `worst_mm` maps a panel id to its deviation, or to None where it has no sweep."""
    panels, sweeps, pieces = [], [], []
    for row in range(n_rows):
        for column in range(n_columns):
            panel_id = f"S-{chr(65 + row)}{column + 1:02d}"
            origin = np.array([1200.0 * column, 1000.0 * row, 0.0])
            panels.append(sample_panel(panel_id, row=row + 1, column=column + 1, origin_mm=origin))
            deviation = worst_mm.get(panel_id, 0.5)
            if deviation is not None:
                sweep = sample_sweep(f"SM-{panel_id}", (panel_id,))
                sweeps.append(replace(sweep, serving=(replace(sweep.serving[0], max_mm=deviation),)))
                pieces += sample_pieces(sweeps[-1])
    return replace(sample_plan(), panels=tuple(panels), sweeps=tuple(sweeps), pieces=tuple(pieces))


def shown_of(plan):
    views = Views(
        tags=tuple(_tag(piece) for piece in reversed(plan.pieces)),
        blocks=tuple(_block(block) for block in plan.blocks),
        summary=(("Blocks", "1 (at least 1)"), ("Machine time", "1.30 h")),
        chart=sample_chart(),
        sheet="a4-2x4",
        sheets=(sample_sheet("a4-2x4", 2, 4), sample_sheet("a4-3x8", 3, 8)),
    )
    return ShownPlan(plan=plan, views=views)


def sample_chart(**changes):
    densities = np.linspace(10.0, 40.0, 31)
    values = {
        "densities_kg_m3": densities,
        "low_mm_s": 30.0 / densities,
        "high_mm_s": 72.0 / densities,
        "density_kg_m3": 20.0,
        "planned_mm_s": 2.6458,
        "is_calibrated": False,
    }
    return SpeedChart(**(values | changes))


def sample_sheet(name, columns, rows):
    return LabelSheet(
        name=name,
        title=f"A4, {columns} by {rows}",
        page_width_mm=210.0,
        page_height_mm=297.0,
        columns=columns,
        rows=rows,
        label_width_mm=200.0 / columns,
        label_height_mm=280.0 / rows,
        left_mm=5.0,
        top_mm=8.5,
        pitch_x_mm=200.0 / columns,
        pitch_y_mm=280.0 / rows,
    )


def _tag(piece):
    return Drawing(
        width_mm=80.0,
        height_mm=50.0,
        title=piece.code,
        marks=(
            Modules(x_mm=4.0, y_mm=4.0, side_mm=20.0, rows=("101", "010", "101")),
            Text(x_mm=30.0, y_mm=14.0, text=piece.id, size_mm=5.0, room_mm=46.0, is_bold=True),
        ),
    )


def _block(block):
    corners = np.array([[0, 0], [block.length_mm, 0], [block.length_mm, block.height_mm], [0, block.height_mm]])
    outline = Polygon(points_mm=corners * 0.1, fill="#56B4E9", hatch="/", title=block.id)
    return Drawing(
        width_mm=block.length_mm * 0.1, height_mm=block.height_mm * 0.1, marks=(outline,), title=f"Block {block.id}"
    )
