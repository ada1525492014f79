"""Named bodies of a plan, to be written to mesh files."""

from collections.abc import Iterator, Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.errors import InputError
from cutblock.geometry.fan import fan_connectivity
from cutblock.geometry.solids import Mesh, joined
from cutblock.halves.footprints import find_footprints
from cutblock.halves.meshes import finished_face, half_meshes
from cutblock.records.block import Block, Size
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.sweep import Sweep
from cutblock.records.words import Half, Layup

BLOCK_GAP_MM = 200.0  # between blocks that stand in a row


class Body(NamedTuple):
    """A mesh and what it is called."""

    name: str
    mesh: Mesh
    is_closed: bool = True


def half_bodies(
    layup: Layup, panels: Sequence[Panel], sweeps: Sequence[Sweep], pieces: Sequence[Piece]
) -> Iterator[Body]:
    """Yield every piece under its id, in the frame of its billet; a piece of which nothing is left is passed over.

    Raises:
        GeometryError: See `half_meshes`.
        InputError: A half has no piece; a plan that was edited by hand.
    """
    names = {(piece.sweep, piece.half): piece.id for piece in pieces}
    for sweep, footprints in zip(sweeps, find_footprints(layup, panels, sweeps, pieces), strict=True):
        lower, upper, _ = half_meshes(sweep, footprints)
        for half, mesh in ((Half.LOWER, lower), (Half.UPPER, upper)):
            if (sweep.id, half) not in names:
                raise InputError(f"its {half} half is missing from the pieces.", sweep.id, "Make the plan again.")
            if len(mesh.triangles):
                yield Body(names[sweep.id, half], mesh)


def kerf_bodies(sweeps: Sequence[Sweep]) -> Iterator[Body]:
    """Yield the foam each sweep melts, under the sweep's id, in the frame of its billet; none where the kerf is 0.

    Raises:
        GeometryError: See `half_meshes`.
    """
    for sweep in sweeps:
        if max(sweep.kerf_mm) > 0.0:
            yield Body(sweep.id, half_meshes(sweep)[2])


def billet_bodies(blocks: Sequence[Block]) -> Iterator[Body]:
    """Yield every billet as a box where it lies in its block, under block and sweep id.

    The blocks stand in a row along y, in their order, `BLOCK_GAP_MM` apart; the first in its own frame.
    """
    aside = 0.0
    for block in blocks:
        for billet in block.billets:
            x, y, z = billet.at_mm
            yield Body(f"{block.id}_{billet.sweep}", _box((x, y + aside, z), billet.size_mm))
        aside += block.width_mm + BLOCK_GAP_MM


def form_bodies(panels: Sequence[Panel], sweeps: Sequence[Sweep], coat_mm: float) -> Iterator[Body]:
    """Yield the finished mould face of every panel under the panel's id, in the form frame.

    Of panels made several times the first copy stands for all, as they lie in the same place.

    Raises:
        GeometryError: See `finished_face`.
    """
    serving = [(serving, sweep) for sweep in sweeps for serving in sweep.serving if serving.is_mould]
    for panel in panels:
        if panel.copy == 1:
            faces = [finished_face(sweep, one, panel, coat_mm) for one, sweep in serving if one.panel == panel.id]
            mesh = joined(faces)
            if len(mesh.triangles):
                yield Body(panel.id, mesh, is_closed=False)


def _box(at_mm: Size, size_mm: Size) -> Mesh:
    """Return a box as a closed mesh."""
    plan = np.array([[0, 0], [0, 1], [1, 0], [1, 1], [0.5, 0.5]])
    corners = np.concatenate([np.column_stack([plan, np.full(5, z)]) for z in (1.0, 0.0)])
    return Mesh(np.array(at_mm) + corners * size_mm, fan_connectivity(2, 2).closed)
