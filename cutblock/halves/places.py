"""Where the bodies of billets lie outside their own frames: in the form they shape, or in the block they come from."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.geometry.solids import Mesh
from cutblock.halves.bodies import BLOCK_GAP_MM, Body
from cutblock.records.block import Block, PlacedBillet
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.sweep import Serving, Sweep
from cutblock.records.words import Duty, Half

# Of a billet that lies turned: its x along the block's y, its y against the block's x.
_QUARTER = np.array([[0.0, -1.0, 0.0], [1.0, 0.0, 0.0], [0.0, 0.0, 1.0]])


class Pose(NamedTuple):
    """A rigid motion: a point p of the billet frame lies at `p @ rotation.T + shift_mm`."""

    rotation: Floats  # (3, 3), proper
    shift_mm: Floats  # (3,)

    def moved(self, mesh: Mesh) -> Mesh:
        """Return a mesh of the billet frame where it lies."""
        return Mesh(mesh.vertices @ self.rotation.T + self.shift_mm, mesh.triangles)


def serving_of(sweep: Sweep, half: Half) -> Serving:
    """Return how a half lies under its panel: a half that serves none of its own goes with the first that does."""
    own = (serving for serving in sweep.serving if serving.half is half)
    return next(own, sweep.serving[0])


def lift_mm(piece: Piece, sweep: Sweep, thickness_mm: float) -> float:
    """Return how far a half is lifted, along the panel's z, off where the cut leaves it to where it is used.

    A counter-mould that is the upper half of its panel's own sweep closes the mould the concrete's thickness above it.

    Args:
        piece: The half.
        sweep: Its sweep.
        thickness_mm: Of the concrete.
    """
    is_cut_alone = any(serving.half is piece.half for serving in sweep.serving)
    return thickness_mm if piece.duty is Duty.COUNTER_MOULD and not is_cut_alone else 0.0


def poses_in_form(
    panels: Sequence[Panel], sweeps: Sequence[Sweep], pieces: Sequence[Piece], thickness_mm: float
) -> dict[str, Pose]:
    """Return by the ids of pieces and of sweeps where they lie in the form.

    A mould lies where its face is the form's; a counter-mould closes it at the concrete's thickness. Every other half,
    and the foam a sweep melts, lies as cut, with the half of its sweep that is served first. Copies of a face lie in
    the same place.

    Args:
        panels: Every panel that is served.
        sweeps: Any.
        pieces: Of these sweeps.
        thickness_mm: Of the concrete between mould and counter-mould.
    """
    by_panel = {panel.id: panel for panel in panels}
    by_sweep = {sweep.id: sweep for sweep in sweeps}
    poses = {sweep.id: _in_form(sweep.serving[0], by_panel, 0.0) for sweep in sweeps}
    for piece in pieces:
        sweep = by_sweep[piece.sweep]
        serving = serving_of(sweep, piece.half)
        poses[piece.id] = _in_form(serving, by_panel, lift_mm(piece, sweep, thickness_mm))
    return poses


def _in_form(serving: Serving, panels: Mapping[str, Panel], lifted_mm: float) -> Pose:
    panel = panels[serving.panel]
    shift = serving.shift_mm + np.array([0.0, 0.0, lifted_mm])
    return Pose(panel.axes.T @ serving.rotation, shift @ panel.axes + panel.origin_mm)


def poses_in_blocks(blocks: Sequence[Block], pieces: Sequence[Piece]) -> dict[str, Pose]:
    """Return by the ids of pieces and of sweeps where they lie before the block is cut.

    The blocks stand in a row along y, in their order, as `billet_bodies` shows them.

    Args:
        blocks: With their billets.
        pieces: Of these billets.
    """
    poses: dict[str, Pose] = {}
    aside = 0.0
    for block in blocks:
        for billet in block.billets:
            poses[billet.sweep] = _in_block(billet, aside)
        aside += block.width_mm + BLOCK_GAP_MM
    return poses | {piece.id: poses[piece.sweep] for piece in pieces if piece.sweep in poses}


def _in_block(billet: PlacedBillet, aside_mm: float) -> Pose:
    x, y, z = billet.at_mm
    if not billet.turned:
        return Pose(np.eye(3), np.array([x, y + aside_mm, z]))
    return Pose(_QUARTER, np.array([x + billet.size_mm[0], y + aside_mm, z]))


def placed(bodies: Iterable[Body], poses: Mapping[str, Pose]) -> Iterator[Body]:
    """Yield bodies where they lie, by their names; one that lies nowhere is passed over."""
    for body in bodies:
        if body.name in poses:
            yield body._replace(mesh=poses[body.name].moved(body.mesh))
