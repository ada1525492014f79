"""Sides of bench moulds that lean with the joints of the form, so that neighbours meet without a wedge.

The side at an edge of a panel is the plane through the edge's chord and the mean of the form's normals along it. At a
joint that is the plane that bisects the two panels, one and the same for both; where two faces meet at an angle the
normals of both are taken together.
"""

import math
from collections.abc import Iterable, Iterator, Mapping, Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError, InputError
from cutblock.base.units import length_text
from cutblock.geometry.mitre import cut_to_sides, side_corners
from cutblock.geometry.sheet import sheet_heights
from cutblock.geometry.solids import is_convex
from cutblock.halves.bodies import Body
from cutblock.halves.footprints import outline_in_billet
from cutblock.halves.joints import SidePlanes, side_planes
from cutblock.halves.places import lift_mm, serving_of
from cutblock.records.job import Job
from cutblock.records.panel import Panel, PanelEdge
from cutblock.records.piece import Piece
from cutblock.records.sweep import Serving, Sweep
from cutblock.records.words import Duty, Half, Layup

MOST_LEAN_DEG = 45.0
_WITH_SIDES = (Duty.MOULD, Duty.COUNTER_MOULD, Duty.CRADLE)
_OFF_MM = 0.01  # a cut this far out of the billet still runs along its side
_LEAST_MM = 1.0  # a shorter part of an edge is none of a strip's
_REMEDY = "Export it with square edges, or divide the face into smaller panels."


class Side(NamedTuple):
    """One side of a piece, for the hand that sets the saw."""

    piece: str
    panel: str
    edge: str
    joins: str  # the panel beyond it; empty at a free edge
    mitre_deg: float  # off square; over 0 where the piece widens towards its flat back
    length_mm: float  # of the edge
    back_mm: tuple[float, float, float, float]  # x, y and x, y of the cut's line on the back, billet frame
    is_whole: bool  # that line lies in the billet; else the side runs out of the billet's before it


class Mitre(NamedTuple):
    """The sides of a piece in its billet's frame."""

    planes: Floats  # (k, 4) inward unit normal and distance, in their order round the panel
    corners: Floats  # (k, 3) where each begins on the wanted face
    sides: tuple[Side, ...]


def find_mitres(
    job: Job, panels: Sequence[Panel], sweeps: Sequence[Sweep], pieces: Sequence[Piece]
) -> dict[str, Mitre]:
    """Return the leaning sides of every mould, counter-mould and cradle by the piece's id.

    Args:
        job: Its lay-up, tolerance, thickness of the concrete and units.
        panels: With their edges.
        sweeps: Any that serve these panels.
        pieces: Two for each sweep.

    Raises:
        InputError: The lay-up is a bed, or the plan says nothing of the panels' edges.
        GeometryError: A side leans by more than `MOST_LEAN_DEG`, or would cut off more of a mould's face than the
            tolerance; names panel and edge.
    """
    if job.layup is Layup.BED:
        raise InputError(
            "the moulds of a bed stand side by side as one surface, with upright joints; a side that leans would leave"
            " a wedge under it",
            "--edges",
            "Export square edges, or plan the job with the bench lay-up.",
        )
    if not all(panel.edges for panel in panels):
        raise InputError(
            "the plan says nothing of the edges of its panels; an earlier program made it.",
            "plan.json",
            "Make the plan again.",
        )
    by_sweep = {sweep.id: sweep for sweep in sweeps}
    wanted = [piece for piece in pieces if piece.duty in _WITH_SIDES and piece.panel is not None]
    served = {serving_of(by_sweep[piece.sweep], piece.half).panel for piece in wanted}
    planes = side_planes(panels)
    by_panel = {panel.id: panel for panel in panels}
    for panel in panels:  # in their order, so that it is always the same one that is named
        if panel.id in served:
            _refuse_lean(panel, planes[panel.id].normals, job)
    return {piece.id: _mitre(piece, by_sweep[piece.sweep], by_panel, planes, job) for piece in wanted}


def mitred(bodies: Iterable[Body], mitres: Mapping[str, Mitre]) -> Iterator[Body]:
    """Yield bodies cut to their leaning sides, by their names; those without any stay as they are.

    Raises:
        GeometryError: The sides of a piece leave nothing of it or cross in it; names the piece.
    """
    for body in bodies:
        mitre = mitres.get(body.name)
        if mitre is None:
            yield body
            continue
        try:
            mesh = cut_to_sides(body.mesh, mitre.planes, mitre.corners)
        except GeometryError as error:
            raise GeometryError(error.message, body.name, _REMEDY) from error
        yield body._replace(mesh=mesh)


def _refuse_lean(panel: Panel, normals: Floats, job: Job) -> None:
    """Refuse a side that no saw is set to, or an edge that no straight cut follows."""
    leans = np.degrees(np.arcsin(np.clip(normals @ panel.axes[2], -1.0, 1.0)))
    for edge, lean in zip(panel.edges, np.abs(leans).tolist(), strict=True):
        if lean > MOST_LEAN_DEG:
            raise GeometryError(
                f"its {edge.name} edge leans {lean:.1f} degrees off square; a mitre takes at most {MOST_LEAN_DEG:.0f}",
                panel.id,
                _REMEDY,
            )
        if edge.bow_mm > job.tolerance_mm:
            raise _cuts_face(panel, edge, edge.bow_mm, job)


def _cuts_face(panel: Panel, edge: PanelEdge, depth_mm: float, job: Job) -> GeometryError:
    # The sagitta of an arc goes with the square of its chord.
    fitting_mm = _length_mm(edge) * math.sqrt(job.tolerance_mm / depth_mm)
    return GeometryError(
        f"a straight mitre through the ends of its {edge.name} edge would cut {length_text(depth_mm, job.units, 2)}"
        f" into its own mould face; the tolerance is {length_text(job.tolerance_mm, job.units, 2)}",
        panel.id,
        f"Export it with square edges, or make that edge no longer than about {length_text(fitting_mm, job.units)}.",
    )


def _length_mm(edge: PanelEdge) -> float:
    return math.dist(edge.start_mm.tolist(), edge.end_mm.tolist())


def _mitre(
    piece: Piece, sweep: Sweep, panels: Mapping[str, Panel], planes: Mapping[str, SidePlanes], job: Job
) -> Mitre:
    serving = serving_of(sweep, piece.half)
    panel, sides = panels[serving.panel], planes[serving.panel]
    shift = serving.shift_mm + np.array([0.0, 0.0, lift_mm(piece, sweep, job.thickness_mm)])
    # Form to panel to billet: p_form = origin + (p R' + shift) axes, and a plane keeps its points.
    in_panel = sides.normals @ panel.axes.T
    distances = sides.distances_mm - sides.normals @ panel.origin_mm - in_panel @ shift
    normals = in_panel @ serving.rotation
    starts = np.array([edge.start_mm for edge in panel.edges])
    corners = ((starts - panel.origin_mm) @ panel.axes.T - shift) @ serving.rotation
    found = np.column_stack([normals, distances])
    if piece.duty is Duty.MOULD and is_convex(corners[:, :2]):
        _refuse_cut_face(panel, serving, sweep, found, job)
    return Mitre(found, corners, tuple(_sides(piece, sweep, panel, sides.joins, found, corners)))


def _refuse_cut_face(panel: Panel, serving: Serving, sweep: Sweep, planes: Floats, job: Job) -> None:
    """Refuse sides that would cut into the face whose edges they stand on."""
    rings = [ring for region in outline_in_billet(panel, serving, sweep) for ring in region]
    if not rings:
        return
    x, y = np.concatenate(rings).T
    points = np.column_stack([x, y, sheet_heights(sweep.near, sweep.far, sweep.width_mm, x, y)])
    depths = planes[:, 3] - (points @ planes[:, :3].T).min(axis=0)
    worst = int(np.argmax(depths))
    if depths[worst] > job.tolerance_mm:
        raise _cuts_face(panel, panel.edges[worst], float(depths[worst]), job)


def _sides(
    piece: Piece, sweep: Sweep, panel: Panel, joins: Sequence[str], planes: Floats, corners: Floats
) -> Iterator[Side]:
    """Yield the sides whose edge lies over the billet; of a panel in strips a strip has some of them only."""
    import shapely

    is_lower = piece.half is Half.LOWER
    backs = side_corners(planes, corners, 0.0 if is_lower else sweep.height_mm)
    mitres = np.degrees(np.arcsin(planes[:, 2])) * (-1.0 if is_lower else 1.0)
    box = shapely.box(0.0, 0.0, sweep.length_mm, sweep.width_mm)
    for row, edge in enumerate(panel.edges):
        after = (row + 1) % len(panel.edges)
        chord = shapely.LineString([corners[row, :2], corners[after, :2]])
        over = shapely.intersection(chord, box)
        if over.length < _LEAST_MM:
            continue
        # Where a quarter and three quarters of what lies over the billet meet the back.
        shares = [chord.project(over.interpolate(share, normalized=True), normalized=True) for share in (0.25, 0.75)]
        points = backs[row] + np.array(shares)[:, None] * (backs[after] - backs[row])
        is_in = (points > -_OFF_MM) & (points < np.array([sweep.length_mm, sweep.width_mm]) + _OFF_MM)
        yield Side(
            piece=piece.id,
            panel=panel.id,
            edge=edge.name,
            joins=joins[row],
            mitre_deg=float(mitres[row]),
            length_mm=_length_mm(edge),
            back_mm=(*backs[row].tolist(), *backs[after].tolist()),
            is_whole=bool(is_in.all()),
        )
